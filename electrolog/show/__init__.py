"""From answers to something to look at: tables, timelines, JSON and CSV."""
