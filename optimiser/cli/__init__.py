"""The command line: one file a command, no physics, no file formats."""
