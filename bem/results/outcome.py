"""Why an extraction stopped, and what its user can do about it."""

from __future__ import annotations

STOPPED_BY = {
    "tolerance": "everything that was asked was reached",
    "max-panels": "the limit on panels was met; raise max-panels or the tolerance",
    "memory": "the memory limit was met; allow more memory or raise the tolerance",
    "rounds": "further rounds no longer shrink the bars; raise the tolerance or simplify the mesh",
    "breakdown": "the equations could not be solved on a finer mesh; raise the tolerance, or mend "
    "very thin gaps and slivers (bem inspect shows them)",
    "input-rounding": "the numbers of the input files are rounded too coarsely for this tolerance; "
    "export them with more digits, or nearer to the origin, or raise the tolerance",
    "faceting": "facets in a file seem to stand for a curve and are too coarse for this tolerance; "
    "give the conductor smooth = true, or smooth = false if the facets are the shape; finer facets "
    "if smooth is true already",
    "interrupt": "interrupted; this is the best result so far, run again to reach the tolerance",
}
"""Every value of ``CapacitanceResult.stopped_by``, with the remedy in words."""

_WIDENED = "the audit widened the bars afterwards; raise the tolerance, and see the warnings"


def remedy(stopped_by: str, converged: bool) -> str:
    """Return the words for ``stopped_by``; a reason that is not listed stands for itself."""
    if stopped_by == "tolerance" and not converged:
        return _WIDENED
    return STOPPED_BY.get(stopped_by, stopped_by)
