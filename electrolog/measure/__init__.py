"""From a signal to a sensitivity: arrays in, dataclasses out; nothing of the database."""
