"""Charts of the report as data and layout for the plotting script, at most 2 000 points a line."""
