"""Options and fixtures that more than one folder of tests uses."""
