"""The command line: one file a command; parses, calls, prints; imports heavy things late."""
