"""The command line: one file a command, what is heavy imported inside it."""
