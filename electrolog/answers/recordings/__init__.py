"""Recordings as they lie in a lab's folders: the runs they tell of, and what the record has to say beside them."""
