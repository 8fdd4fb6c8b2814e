"""Repair of one body: what is safe is done and counted; ``repair.py`` tells the order."""
