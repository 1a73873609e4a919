"""bandwright."""
