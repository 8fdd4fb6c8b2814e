"""The capacitance matrix with its error bars, and what is saved of a run."""
