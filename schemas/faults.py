"""What can be wrong with what was posted, each fault at its place."""

from collections.abc import Iterable
from dataclasses import dataclass, replace
from typing import Self


@dataclass(frozen=True)
class Fault:
    """One fault: an RFC 6901 pointer into what was posted, and a sentence about it.

    In a sheet also the row and the column, both counted from 1.
    """

    pointer: str
    detail: str
    row: int | None = None
    column: int | None = None


class Faulty(ValueError):
    """What was posted has faults; all that were found are listed.

    Parameters
    ----------
    faults : at least one `Fault`
    """

    def __init__(self, faults: Iterable[Fault]) -> None:
        self.faults = list(faults)
        super().__init__("; ".join(f"{fault.pointer}: {fault.detail}" for fault in self.faults))

    def under(self, prefix: str) -> Self:
        """The same faults, seen from `prefix` levels further out."""
        return type(self)(replace(fault, pointer=prefix + fault.pointer) for fault in self.faults)


class Malformed(Faulty):
    """The body isn't well-formed JSON, or not a sheet."""


class Invalid(Faulty):
    """The body is well-formed but doesn't describe a valid system or question."""


def pointer(path: Iterable[str | int]) -> str:
    """An RFC 6901 pointer from keys and indices.

    >>> pointer(["bodies", 2, "a/b"])
    '/bodies/2/a~1b'
    """
    return "".join("/" + str(key).replace("~", "~0").replace("/", "~1") for key in path)
