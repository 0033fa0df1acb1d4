"""The life of every carbon-fibre microelectrode: its record, a forecast of its fouling, a verdict before a run."""
