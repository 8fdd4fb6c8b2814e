"""Operators that map panel charges to panel potentials, behind one interface."""
