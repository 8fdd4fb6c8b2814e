"""What an extraction tells while it runs."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Progress:
    """One sign of life from a running extraction.

    Args:
        phase: what is being done now, in plain words for the user.
        round: number of the refinement round, from 1; 0 before the first.
        panels: number of panels of this round; 0 while unknown.
        worst: largest bar over its allowance so far (1 or less: done); NaN while unknown.
        elapsed: seconds since the start of the extraction.
    """

    phase: str
    round: int
    panels: int
    worst: float
    elapsed: float
