"""Files in, surfaces, shapes with a true surface, checks of one body."""
