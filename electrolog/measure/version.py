"""The version stored beside every derived figure: it tells by which method an old figure was made."""

METHOD = "line-3"
