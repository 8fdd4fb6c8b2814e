"""Why an extraction stopped, and what its user can do about it."""

from __future__ import annotations

STOPPED_BY = {
    "tolerance": "everything that was asked was reached",
    "max-panels": "the limit on panels was met; raise max-panels or the tolerance",
    "memory": "the memory limit was met; allow more memory or raise the tolerance",
    "rounds": "further rounds no longer shrink the bars; raise the tolerance or simplify the mesh",
    "interrupt": "interrupted; this is the best result so far, run again to reach the tolerance",
}
"""Every value of ``CapacitanceResult.stopped_by``, with the remedy in words."""


def remedy(stopped_by: str) -> str:
    """Return the words for ``stopped_by``; a reason that is not listed stands for itself."""
    return STOPPED_BY.get(stopped_by, stopped_by)
