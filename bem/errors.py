"""The exceptions of bem, and the exit code that the command line gives each.

    BemError
    +-- UsageError            2   the call itself is off: options, names, units
    +-- InputError            3   a file, a scene or a geometry cannot be used
    |   +-- GeometryError     3   ... because the bodies touch, cross, or are damaged
    +-- ToleranceNotReached   4   only raised on request: the result is normally returned, marked
    +-- MemoryRefused         5   the plan needs more memory than is allowed
    +-- SolutionError         3   the result is unusable, or too uncertain for what is asked of it
    +-- ChangeExceeded        6   only raised on request: a change is, or may be, above its limit

Every message says what was found, what the limit is, and what to do next.
"""

from __future__ import annotations

EXIT_DONE = 0
EXIT_INTERRUPTED = 130


class BemError(Exception):
    """Base of all errors that bem raises on purpose."""

    exit_code = 1


class UsageError(BemError):
    """The call is off: an unknown option, name, or unit."""

    exit_code = 2


class InputError(BemError):
    """A file, a scene or a value in it cannot be used."""

    exit_code = 3


class GeometryError(InputError):
    """The bodies cannot be solved as they are: they touch, cross, or are damaged."""


class SolutionError(BemError):
    """The result is unusable, or too uncertain for what is asked of it."""

    exit_code = 3


class ToleranceNotReached(BemError):
    """The asked tolerance was not reached within the limits; the result is still available."""

    exit_code = 4


class MemoryRefused(BemError):
    """The memory plan exceeds the limit; nothing was allocated."""

    exit_code = 5


class ChangeExceeded(BemError):
    """The change between two scenes is, or may be, larger than the limit that was set."""

    exit_code = 6
