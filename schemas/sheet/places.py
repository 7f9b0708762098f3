"""Where a fault is in a sheet, and the faults that a sheet has on its own."""

from collections.abc import Iterable
from dataclasses import dataclass, replace

from schemas.faults import Fault, pointer

Path = tuple[str | int, ...]
MOST_FAULTS = 1000  # more are found in no sheet that someone will mend


@dataclass(frozen=True, slots=True)
class Place:
    """A cell: row and column, counted from 1, and what the sheet calls it there."""

    row: int
    column: int
    title: str = ""

    def says(self, detail: str) -> str:
        """`detail` with the place in front."""
        title = f" ({self.title[:64]})" if self.title else ""
        return f"row {self.row}, column {letters(self.column)}{title}: {detail}"

    def fault(self, detail: str, path: Iterable[str | int] = ()) -> Fault:
        """A fault at this cell."""
        return Fault(pointer(path), self.says(detail), self.row, self.column)

    def locate(self, fault: Fault) -> Fault:
        """`fault`, placed at this cell."""
        return replace(fault, detail=self.says(fault.detail), row=self.row, column=self.column)


def letters(column: int) -> str:
    """The name that spreadsheets give a column.

    >>> letters(1), letters(26), letters(27), letters(703)
    ('A', 'Z', 'AA', 'AAA')
    """
    name = ""
    while column > 0:
        column, letter = divmod(column - 1, 26)
        name = chr(ord("A") + letter) + name
    return name


class Findings:
    """The faults that were found in a sheet, one for a cell."""

    def __init__(self) -> None:
        self.faults: list[Fault] = []
        self.cells: set[tuple[int, int]] = set()

    @property
    def full(self) -> bool:
        """Whether no more are kept, so that reading on is vain."""
        return len(self.faults) >= MOST_FAULTS

    def add(self, place: Place, detail: str, path: Iterable[str | int] = ()) -> None:
        """Note a fault, unless the cell has one already."""
        cell = (place.row, place.column)
        if cell not in self.cells and not self.full:
            self.faults.append(place.fault(detail, path))
            self.cells.add(cell)
