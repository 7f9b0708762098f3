"""Problem details for HTTP APIs (RFC 9457)."""

from schemas.base import Answer


class FaultAt(Answer):
    """One fault in what was posted."""

    pointer: str
    """Where: an RFC 6901 pointer into what was posted."""
    detail: str
    """What is wrong there."""
    row: int | None = None
    """In a sheet: the row, from 1 (no unit)."""
    column: int | None = None
    """In a sheet: the column, from 1 (no unit)."""


class Problem(Answer):
    """What went wrong with a request (RFC 9457)."""

    type: str
    """Which kind of problem: a stable path under /problems/ that this service serves."""
    title: str
    """The kind of problem in words."""
    status: int
    """The HTTP status (no unit)."""
    detail: str
    """What went wrong this time."""
    instance: str
    """The path that was asked."""
    errors: list[FaultAt] = []
    """Every fault that was found in what was posted."""
