"""What a person reads: text for the shell, HTML for notebooks."""
