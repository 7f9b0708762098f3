"""A block of items: each row is an object, each column one of its fields."""

from collections.abc import Iterator
from dataclasses import dataclass, field
from itertools import pairwise
from typing import Any

from schemas.quantities import unit_factor
from schemas.sheet.blocks import Block
from schemas.sheet.cells import CellReader, Unreadable, is_blank, plain
from schemas.sheet.columns import Content, find
from schemas.sheet.places import Findings, Path, Place

MOST_COLUMNS = 16_384  # the widest sheet of a spreadsheet program
_NO_UNIT = ("", "-", "1")
Raw = dict[Any, Any]


@dataclass(frozen=True, slots=True)
class Column:
    """A column: its index from 0, its title without the unit, the path of its field.

    `inward` are the keys on the way to the field, each with the kind of what stands there.
    """

    index: int
    title: str
    path: Path
    reader: CellReader
    inward: tuple[tuple[str | int, type], ...]


@dataclass(slots=True)
class Table:
    """A block as objects; `path` is where they stand in the document."""

    block: Block
    path: Path
    columns: list[Column]
    items: list[Raw] = field(default_factory=list)
    _by_path: dict[tuple[str, ...], list[Column]] = field(default_factory=dict)

    def has(self, name: str) -> bool:
        """Whether there is a column for the field `name`."""
        return any(column.path[0] == name for column in self.columns)

    def place(self, item: int, rest: tuple[str, ...] = ()) -> Place:
        """The cell of an item's field, or what comes nearest."""
        if not 0 <= item < len(self.block.rows):
            return self.block.place
        number, cells = self.block.rows[item]
        for length in range(len(rest), 0, -1):
            columns = self._columns_of(rest[:length])
            if columns:
                column = next((c for c in columns if _cell(cells, c)), columns[0])
                return Place(number, column.index + 1, column.title)
        first = next((i for i, cell in enumerate(cells) if not is_blank(cell)), 0)
        return Place(number, first + 1, " ".join((self.block.place.title, ".".join(rest))).strip())

    def _columns_of(self, path: tuple[str, ...]) -> list[Column]:
        """Columns of a field, or of a field within it."""
        if not self._by_path:
            for column in self.columns:
                keys = tuple(map(str, column.path))
                for length in range(1, len(keys) + 1):
                    self._by_path.setdefault(keys[:length], []).append(column)
        return self._by_path.get(path, [])


def _cell(cells: list[str], column: Column) -> str:
    """The cell of a row in a column, "" where the row is shorter or the cell blank."""
    cell = cells[column.index] if column.index < len(cells) else ""
    return "" if is_blank(cell) else cell


def read_table(
    block: Block, path: Path, content: Content, decimal_comma: bool, findings: Findings
) -> Table:
    """The items of a block whose fields `content` describes."""
    table = Table(block, path, _columns(block, path, content, decimal_comma, findings))
    for item in range(len(block.rows)):
        if findings.full:
            break
        table.items.append(_item(table, item, findings))
    return table


def _columns(
    block: Block, path: Path, content: Content, decimal_comma: bool, findings: Findings
) -> list[Column]:
    columns: list[Column] = []
    seen: dict[Path, Place] = {}
    if len(block.header) > MOST_COLUMNS:
        place = Place(block.header_row, MOST_COLUMNS + 1)
        findings.add(place, f"a block has at most {MOST_COLUMNS:,} columns", path)
    for index, cell in enumerate(block.header[:MOST_COLUMNS]):
        if is_blank(cell):
            continue
        title, unit = split_unit(plain(cell)[0])
        place = Place(block.header_row, index + 1, title)
        found = find(content, title)
        if found is None:
            findings.add(place, f"[{block.name}] has no field '{title[:64]}'", path)
        elif found[0] in seen:
            first = seen[found[0]]
            findings.add(place, f"this field stands already in column {first.column}", path)
        else:
            seen[found[0]] = place
            unit = _fitting(unit, found[1], place, path, findings)
            reader = CellReader(found[1], decimal_comma, unit)
            columns.append(Column(index, title, found[0], reader, _inward(found[0])))
    return columns


def _inward(path: Path) -> tuple[tuple[str | int, type], ...]:
    return tuple((key, list if isinstance(inner, int) else dict) for key, inner in pairwise(path))


def split_unit(header: str) -> tuple[str, str | None]:
    """The title of a column and the unit that stands behind it in brackets.

    >>> split_unit("mass [lb]"), split_unit("name")
    (('mass', 'lb'), ('name', None))
    """
    if not header.endswith("]"):
        return header, None
    title, bracket, unit = header[:-1].rpartition("[")
    return (title.strip(), unit.strip()) if bracket else (header, None)


def _fitting(
    unit: str | None, content: Content, place: Place, path: Path, findings: Findings
) -> str | None:
    """The unit of a header, or None where there is none or it doesn't belong there."""
    if unit is None:
        return None
    quantities = content.quantities or (content.items.quantities if content.items else [])
    dimensions = [d for q in quantities for d in (q.dimension, q.or_dimension) if d]
    if unit in _NO_UNIT and (not dimensions or "ratio" in dimensions):
        return None
    if not dimensions:
        findings.add(place, f"no unit belongs here, but '{unit[:48]}' is given", path)
        return None
    message = ""
    for dimension in dimensions:
        try:
            unit_factor(unit, dimension)
        except ValueError as error:
            message = message or str(error)
        else:
            return unit
    findings.add(place, message, path)
    return None


def _item(table: Table, item: int, findings: Findings) -> Raw:
    number, cells = table.block.rows[item]
    found = _Item()
    for column in table.columns:
        if column.index >= len(cells):
            break
        cell = cells[column.index]
        if is_blank(cell):
            continue
        try:
            value = column.reader.read(cell)
        except Unreadable as error:
            value = None  # keeps its place, so that nothing else seems to be wrong
            place = Place(number, column.index + 1, column.title)
            findings.add(place, str(error), (*table.path, item, *column.path))
        if not found.put(column, value):
            place = Place(number, column.index + 1, column.title)
            findings.add(place, "another column gives this field a value too", table.path)
    if found.holes:
        for path in _filled_holes(found.fields):
            place = table.place(item, tuple(map(str, path)))
            detail = f"item {path[-1]} of the list is missing, but a later one is there"
            findings.add(place, detail, (*table.path, item, *path))
    return found.fields


_HOLE = object()


class _Item:
    """An object that fills, and how many items its lists still lack."""

    def __init__(self) -> None:
        self.fields: Raw = {}
        self.holes = 0

    def put(self, column: Column, value: object) -> bool:
        """Write `value` at the field of `column`; False where something else stands there."""
        node: Any = self.fields
        last = column.path[-1]
        if not column.inward:
            free = last not in node
            node.setdefault(last, value)
            return free
        for key, kind in column.inward:
            child = _at(node, key)
            if child is _HOLE:
                child = kind()
                self._write(node, key, child)
            elif type(child) is not kind:
                return False
            node = child
        if _at(node, last) is not _HOLE:
            return False
        self._write(node, last, value)
        return True

    def _write(self, node: Any, key: Any, value: object) -> None:
        if isinstance(node, dict):
            node[key] = value
        elif key < len(node):
            self.holes -= 1
            node[key] = value
        else:
            self.holes += key - len(node)
            node.extend([_HOLE] * (key - len(node)))
            node.append(value)


def _at(node: Any, key: Any) -> Any:
    if isinstance(node, dict):
        return node.get(key, _HOLE)
    return node[key] if key < len(node) else _HOLE


def _filled_holes(node: Any, path: Path = ()) -> Iterator[Path]:
    """The paths of items that are missing; null takes their place."""
    for key, value in node.items() if isinstance(node, dict) else enumerate(node):
        if value is _HOLE:
            node[key] = None
            yield (*path, key)
        elif isinstance(value, list | dict):
            yield from _filled_holes(value, (*path, key))
