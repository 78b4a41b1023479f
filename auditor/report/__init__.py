"""The statement on paper and for other programs: the only room with wording and display units."""
