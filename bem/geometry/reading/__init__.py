"""Files in: a reader for each kind of mesh file; ``files.py`` knows them all."""
