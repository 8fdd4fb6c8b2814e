"""The command line: one short file per command."""
