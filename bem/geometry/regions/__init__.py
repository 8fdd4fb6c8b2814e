"""The partition of space by bodies: which region lies on each side of every face."""
