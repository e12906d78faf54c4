"""Deviations, verdicts and windows: what the record says about predictions against references."""
