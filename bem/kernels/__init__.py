"""Compiled integrals over panels, exact and tiered."""
