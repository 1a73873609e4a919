"""Material files of bandwright, read by importlib.resources; there is no code here."""
