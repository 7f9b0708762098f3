"""From rows to blocks: each with its header and the rows below it."""

import re
from collections.abc import Iterator
from dataclasses import dataclass, field

from schemas.sheet.cells import is_blank
from schemas.sheet.places import Findings, Place

_BLOCK = re.compile(r"\[([^\[\]]{1,80})\]")


@dataclass(slots=True)
class Block:
    """A block of a sheet; rows come with their number, blank ones are left out."""

    name: str
    row: int
    header_row: int = 0
    header: list[str] = field(default_factory=list)
    rows: list[tuple[int, list[str]]] = field(default_factory=list)

    @property
    def place(self) -> Place:
        """Where the block opens."""
        return Place(self.row, 1, f"[{self.name}]")


def split_blocks(rows: list[list[str]], findings: Findings) -> dict[str, Block]:
    """The blocks of a sheet by their names."""
    blocks: dict[str, Block] = {}
    block: Block | None = None
    for number, cells in enumerate(rows, 1):
        if all(map(is_blank, cells)):
            continue
        first = cells[0].strip()
        opened = _BLOCK.fullmatch(first) if first.startswith("[") else None
        if opened:
            block = _opened(opened[1].strip(), number, cells, blocks, findings)
        elif block is None:
            place = Place(number, _first(cells) + 1)
            findings.add(place, "a sheet begins with a block, like [system], in its first column")
            block = Block("", number)  # one fault for all that stands before the first block
        elif not block.header:
            block.header, block.header_row = _without_blank_end(cells), number
        else:
            block.rows.append((number, cells))
    for block in blocks.values():
        _check_shape(block, findings)
    return blocks


def _opened(
    name: str, number: int, cells: list[str], blocks: dict[str, Block], findings: Findings
) -> Block:
    block = Block(name, number)
    if name in blocks:
        findings.add(block.place, f"this block stands already in row {blocks[name].row}")
    beside = next((i for i in range(1, len(cells)) if not is_blank(cells[i])), None)
    if beside is not None:
        findings.add(Place(number, beside + 1), f"nothing may stand beside [{name}]")
    blocks.setdefault(name, block)
    return block


def _first(cells: list[str]) -> int:
    return next(index for index, cell in enumerate(cells) if not is_blank(cell))


def _without_blank_end(cells: list[str]) -> list[str]:
    end = len(cells)
    while is_blank(cells[end - 1]):
        end -= 1
    return cells[:end]


def _check_shape(block: Block, findings: Findings) -> None:
    """Every cell stands below a title."""
    unnamed = [index for index, title in enumerate(block.header) if is_blank(title)]
    width = len(block.header)
    for number, cells in block.rows:
        for index in _filled(cells, unnamed) if unnamed else ():
            findings.add(
                Place(block.header_row, index + 1),
                f"the column has no title, but row {number} has a value in it",
            )
        if len(cells) > width:
            for index in _filled(cells, range(width, len(cells))):
                findings.add(
                    Place(number, index + 1),
                    f"no column of the header in row {block.header_row} reaches here",
                )


def _filled(cells: list[str], wanted: list[int] | range) -> Iterator[int]:
    for index in wanted:
        if index >= len(cells):
            return
        if not is_blank(cells[index]):
            yield index
