"""One question per file: reads the record, calls measure, fouling and judge, returns dataclasses."""
