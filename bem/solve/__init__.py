"""Densities from potentials: the linear solve for all right-hand sides together."""
