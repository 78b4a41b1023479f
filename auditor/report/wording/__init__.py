"""Every sentence of the program: what codes, words and ways of metering mean to the person who reads."""
