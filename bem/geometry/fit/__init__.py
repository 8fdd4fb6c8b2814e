"""Smooth surfaces fitted to facets; ``fit.py`` puts the steps together."""
