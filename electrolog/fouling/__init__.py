"""How this lab's probes lose sensitivity: arrays in, dataclasses out; nothing of the database."""
