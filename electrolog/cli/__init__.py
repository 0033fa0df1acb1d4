"""The terminal: one file per thing a person does; parses, calls, prints; no arithmetic, no SQL."""
