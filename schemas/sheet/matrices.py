"""Blocks that aren't lists of objects: matrices, names of degrees of freedom, places of forces.

A matrix stands as its rows below the names of the degrees of freedom, as entries (`row`, `column`,
`value`, and `symmetric` in the first of them), or as Matrix Market text, a line in each row
(`matrix_market`).
"""

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any, Protocol

from schemas.base import Strict
from schemas.matrix import Entry, Index
from schemas.quantities import DegreeOfFreedom, Name
from schemas.sheet.blocks import Block
from schemas.sheet.cells import CellReader, Unreadable, is_blank, plain
from schemas.sheet.columns import Content
from schemas.sheet.places import Findings, Path, Place
from schemas.sheet.tables import Table, read_table

_NUMBER = Content(number=True)


class NamedMotion(Strict):
    """A row of [degrees_of_freedom]."""

    name: DegreeOfFreedom


class ForceAt(Strict):
    """A row of [forces_at]."""

    excitation: Name
    at: list[DegreeOfFreedom]


class MatrixEntry(Strict):
    """A row of a matrix that is given by its entries."""

    row: Index
    column: Index
    value: Entry
    symmetric: bool


class Part(Protocol):
    """What a block comes to: a value of the document, and the cells that it stems from."""

    @property
    def block(self) -> Block: ...

    @property
    def value(self) -> Any: ...

    def find(self, rest: tuple[str, ...]) -> Place: ...


@dataclass(slots=True)
class Names:
    """[degrees_of_freedom]: a list of names."""

    table: Table

    @property
    def block(self) -> Block:
        return self.table.block

    @property
    def value(self) -> list[Any]:
        return [item.get("name") for item in self.table.items]

    def find(self, rest: tuple[str, ...]) -> Place:
        return self.table.place(_index(rest), ("name",))


@dataclass(slots=True)
class ForcesAt:
    """[forces_at]: lists of degrees of freedom by excitation; rows of one excitation add up."""

    table: Table

    @property
    def block(self) -> Block:
        return self.table.block

    @property
    def value(self) -> dict[str, Any]:
        found: dict[str, Any] = {}
        for item in self.table.items:
            found.setdefault(str(item.get("excitation", "")), []).extend(item.get("at") or [])
        return found

    def find(self, rest: tuple[str, ...]) -> Place:
        before = 0
        for number, item in enumerate(self.table.items):
            if not rest or str(item.get("excitation", "")) != rest[0]:
                continue
            if len(rest) == 1:
                return self.table.place(number, ("excitation",))
            before += len(item.get("at") or [])
            if _index(rest[1:]) < before:
                return self.table.place(number, ("at",))
        return self.block.place


@dataclass(slots=True)
class Entries:
    """A matrix by its entries."""

    table: Table
    _filled: list[int] = field(default_factory=list)

    @property
    def block(self) -> Block:
        return self.table.block

    def _numbers(self) -> list[int]:
        """Rows that hold an entry: the first may hold no more than `symmetric`."""
        if not self._filled:
            items = self.table.items
            self._filled = [n for n, item in enumerate(items) if item.keys() - {"symmetric"}]
        return self._filled

    @property
    def value(self) -> dict[str, Any]:
        items = [self.table.items[number] for number in self._numbers()]
        found: dict[str, Any] = {
            f"{name}s": [item.get(name) for item in items] for name in ("row", "column", "value")
        }
        said = [item["symmetric"] for item in self.table.items if "symmetric" in item]
        return found | ({"symmetric": said[0]} if said else {})

    def find(self, rest: tuple[str, ...]) -> Place:
        numbers, index = self._numbers(), _index(rest[1:])
        if rest and 0 <= index < len(numbers):
            return self.table.place(numbers[index], (rest[0].removesuffix("s"),))
        return self.table.place(0, rest) if rest == ("symmetric",) else self.block.place


@dataclass(slots=True)
class Lines:
    """A matrix as Matrix Market text."""

    block: Block

    @property
    def value(self) -> dict[str, Any]:
        lines = [plain(_cell(cells, 0))[0] for _, cells in self.block.rows]
        return {"matrix_market": "\n".join(lines)}

    def find(self, _: tuple[str, ...]) -> Place:
        title = self.block.place.title
        return Place(self.block.rows[0][0], 1, title) if self.block.rows else self.block.place


@dataclass(slots=True)
class Dense:
    """A matrix as rows of numbers; `indices` are the columns of the degrees of freedom in order."""

    block: Block
    path: Path
    indices: list[int]
    value: list[list[Any]] = field(default_factory=list)

    def read(self, reader: CellReader, findings: Findings) -> None:
        """Read all entries."""
        for row, (number, cells) in enumerate(self.block.rows):
            if findings.full:
                return
            self.value.append([])
            for column, index in enumerate(self.indices):
                entry = None
                try:
                    entry = reader.read(_filled_cell(cells, index))
                except Unreadable as error:
                    place = Place(number, index + 1, self.block.place.title)
                    findings.add(place, str(error), (*self.path, row, column))
                self.value[row].append(entry)

    def find(self, rest: tuple[str, ...]) -> Place:
        row, column = _index(rest), _index(rest[1:])
        if not 0 <= row < len(self.block.rows):
            return self.block.place
        number, _ = self.block.rows[row]
        known = 0 <= column < len(self.indices)
        return Place(number, self.indices[column] + 1 if known else 1, self.block.place.title)


def _index(rest: Sequence[str]) -> int:
    return int(rest[0]) if rest and rest[0].isdecimal() else -1


def read_matrix(
    block: Block, path: Path, names: list[Any], decimal_comma: bool, findings: Findings
) -> Part:
    """A matrix in any of its forms; `names` are those of the degrees of freedom."""
    titles = [plain(cell)[0] for cell in block.header]
    if not titles:
        findings.add(block.place, "the header and the rows are missing", path)
    if titles == ["matrix_market"]:
        return Lines(block)
    if not titles or set(titles) & set(MatrixEntry.model_fields):
        content = Content(models=[MatrixEntry])
        return Entries(read_table(block, path, content, decimal_comma, findings))
    dense = Dense(block, path, _order(block, titles, names, path, findings))
    dense.read(CellReader(_NUMBER, decimal_comma), findings)
    return dense


def _order(
    block: Block, titles: list[str], names: list[Any], path: Path, findings: Findings
) -> list[int]:
    """Index of each degree of freedom's column; as they stand where the header isn't right."""
    if not names:
        return list(range(len(titles)))
    known, at = set(names), {title: index for index, title in enumerate(titles)}
    for index, title in enumerate(titles):
        place = Place(block.header_row, index + 1, title)
        if title and title not in known:
            findings.add(place, f"there is no degree of freedom '{title[:70]}'", path)
        elif title and at[title] != index:
            findings.add(place, f"this column stands again as column {at[title] + 1}", path)
    missing = [name for name in names if isinstance(name, str) and name not in at]
    if missing:
        findings.add(
            Place(block.header_row, len(titles) + 1, block.place.title),
            f"the column of '{missing[0][:70]}' is missing"
            + (f", and {len(missing) - 1} more" if missing[1:] else ""),
            path,
        )
    if missing or len(titles) != len(names):
        return list(range(len(titles)))
    return [at[name] for name in names]


def _cell(cells: list[str], index: int) -> str:
    return cells[index] if index < len(cells) else ""


def _filled_cell(cells: list[str], index: int) -> str:
    cell = _cell(cells, index)
    if is_blank(cell):
        raise Unreadable("an entry is missing: write 0")
    return cell
