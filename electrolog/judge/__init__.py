"""From a forecast to a decision: limits, verdict, what would change it."""
