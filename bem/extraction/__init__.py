"""The loop: solve, value, error bar, refine; and the audit of what came out."""
