"""People: one file per command, and the command line itself."""
