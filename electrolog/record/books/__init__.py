"""A lab's own spreadsheets: read as they are, understood by a mapping, taken into the record row by row."""
