"""The record: schema, entry, amendment, journal, queries, exchange folder. The only room that knows SQL."""
