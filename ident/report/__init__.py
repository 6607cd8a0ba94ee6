"""The report: its shape, and the one place that knows the whole order."""
