"""Work: one log to one report in a process of its own. Knows no HTTP."""
