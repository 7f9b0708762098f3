"""From a sheet to what JSON would have given, every fault with its row and column."""

from collections.abc import Callable, Iterable
from dataclasses import dataclass, replace
from typing import Any, TypeVar

from pydantic import BaseModel

from schemas.faults import Fault, Invalid, Malformed
from schemas.matrix import EntryList
from schemas.sheet.blocks import Block, split_blocks
from schemas.sheet.columns import Content, fields
from schemas.sheet.matrices import ForceAt, ForcesAt, NamedMotion, Names, Part, read_matrix
from schemas.sheet.places import MOST_FAULTS, Findings, Path, Place
from schemas.sheet.rows import read_rows
from schemas.sheet.tables import Raw, Table, read_table
from schemas.system import BodiesSystem, MatricesSystem

M = TypeVar("M")
_KINDS: dict[str, type[BaseModel]] = {"bodies": BodiesSystem, "matrices": MatricesSystem}
_ANY_SYSTEM = Content(models=list(_KINDS.values()))


@dataclass(slots=True)
class Items:
    """A block with one object a row."""

    table: Table

    @property
    def block(self) -> Block:
        return self.table.block

    @property
    def value(self) -> list[Raw]:
        return self.table.items

    def find(self, rest: tuple[str, ...]) -> Place:
        if rest and rest[0].isdecimal():
            return self.table.place(int(rest[0]), rest[1:])
        return self.block.place


@dataclass(slots=True)
class Single:
    """A block that is one object, in one row."""

    table: Table

    @property
    def block(self) -> Block:
        return self.table.block

    @property
    def value(self) -> Raw:
        return self.table.items[0] if self.table.items else {}

    def find(self, rest: tuple[str, ...]) -> Place:
        return self.table.place(0, rest) if rest and self.table.items else self.block.place


@dataclass(frozen=True, slots=True)
class Sheet:
    """A sheet that was read.

    Attributes
    ----------
    raw : the object that JSON would have given: a question, or a system where none was asked
    faults : of the sheet itself, each with row and column
    """

    raw: dict[str, Any]
    faults: list[Fault]
    _parts: dict[Path, Part]
    _within: Path

    def validated(self, read: Callable[[Any], M]) -> M:
        """What `read` makes of `raw`.

        Raises
        ------
        Invalid
            With the faults of the sheet and those that `read` finds, in the order of the sheet.
        """
        try:
            found = read(self.raw)
        except Invalid as fault:
            raise Invalid(self._with(fault.faults)) from None
        if self.faults:
            raise Invalid(self._with([]))
        return found

    def located(self, faults: Iterable[Fault]) -> list[Fault]:
        """`faults` of `raw`, with row and column where they aren't known yet."""
        return [fault if fault.row else self._located(fault) for fault in faults]

    def place(self, pointer: str) -> tuple[int, int] | None:
        """Row and column of what `pointer` points at, or of what is nearest around it."""
        place = self._place(pointer)
        return (place.row, place.column) if place else None

    def _located(self, fault: Fault) -> Fault:
        place = self._place(fault.pointer)
        if place is not None:
            return place.locate(fault)
        return replace(fault, detail=f"{fault.detail} (no block or column of the sheet gives it)")

    def _place(self, pointer: str) -> Place | None:
        tokens = tuple(
            token.replace("~1", "/").replace("~0", "~") for token in pointer.split("/")[1:]
        )
        path = (*map(str, self._within), *tokens)
        for length in range(len(path), -1, -1):
            part = self._parts.get(path[:length])
            if part is not None and (length or _stands_in(part, path)):
                return part.find(path[length:])
        return None

    def _with(self, others: list[Fault]) -> list[Fault]:
        """All faults by row and column; of a cell that can't be read no other is reported."""
        taken = {(fault.row, fault.column) for fault in self.faults}
        found = self.located(others[:MOST_FAULTS])
        faults = self.faults + [f for f in found if not f.row or (f.row, f.column) not in taken]
        in_order = sorted(faults, key=lambda fault: (fault.row or 0, fault.column or 0))
        return in_order + others[MOST_FAULTS:]


def _stands_in(options: Part, path: tuple[str, ...]) -> bool:
    return isinstance(options, Single) and bool(path) and options.table.has(path[0])


def read_sheet(data: bytes, content_type: str, question: type[BaseModel] | None = None) -> Sheet:
    """A sheet as the object that JSON would have given.

    Parameters
    ----------
    data : UTF-8, or UTF-16 with its byte order mark
    content_type : text/csv or text/tab-separated-values, perhaps with a charset
    question : the task's question; None where the sheet is a system

    Raises
    ------
    Malformed
        It can't be taken apart into rows and cells. Other faults are kept in `Sheet.faults`.
    """
    rows, separator = read_rows(data, content_type)
    return _Assembly(question, separator != ",").sheet(rows)


class _Assembly:
    """Puts the blocks of a sheet together."""

    def __init__(self, question: type[BaseModel] | None, decimal_comma: bool) -> None:
        self.question = question
        self.decimal_comma = decimal_comma
        self.findings = Findings()
        self.parts: dict[Path, Part] = {}

    def sheet(self, rows: list[list[str]]) -> Sheet:
        blocks = split_blocks(rows, self.findings)
        if not blocks:
            raise Malformed(self.findings.faults or [Fault("", "the sheet is blank")])
        system = self._system(blocks)
        if self.question is not None:
            question = self._question(blocks, system)
            return Sheet(question, self.findings.faults, self.parts, ())
        for name, block in blocks.items():
            self.findings.add(block.place, f"a system has no block [{name[:64]}]")
        faults = [_outside(fault) for fault in self.findings.faults]
        return Sheet(system, faults, self.parts, ("system",))

    def _system(self, blocks: dict[str, Block]) -> Raw:
        """The system, of all blocks that describe it; they are taken out of `blocks`."""
        path: Path = ("system",)
        system: Raw = {}
        if "system" in blocks:
            system = self._keep(path, self._single(blocks.pop("system"), path, _ANY_SYSTEM))
        if "kind" not in system:
            system |= _default_kind(blocks)
        known = fields(_KINDS.get(str(system.get("kind")), BodiesSystem))
        both = {name for model in _KINDS.values() for name in fields(model)}
        # The names of the degrees of freedom first: the columns of matrices are in their order.
        for name in sorted(both & blocks.keys(), key=lambda name: name != "degrees_of_freedom"):
            block = blocks.pop(name)
            if name not in known:
                self.findings.add(block.place, "a system of this kind has no such block", path)
            elif name in system:
                self.findings.add(block.place, "this stands in [system] already", (*path, name))
            else:
                part = self._part_of_system(block, (*path, name), known[name], system)
                if part is not None:
                    system[name] = self._keep((*path, name), part)
        return system

    def _part_of_system(
        self, block: Block, path: Path, content: Content, system: Raw
    ) -> Part | None:
        if EntryList in content.models:
            names = system.get("degrees_of_freedom", [])
            return read_matrix(block, path, names, self.decimal_comma, self.findings)
        if block.name == "degrees_of_freedom":
            return Names(self._table(block, path, Content(models=[NamedMotion])))
        return self._part(block, path, content, "system")

    def _question(self, blocks: dict[str, Block], system: Raw) -> Raw:
        assert self.question is not None
        content = Content(models=[self.question])
        question: Raw = {}
        if "options" in blocks:
            part = self._single(blocks.pop("options"), (), content)
            question = self._keep((), part)
            if question.pop("system", None) is not None:
                self.findings.add(part.block.place, "the system has blocks of its own, [system] …")
        known = fields(self.question)
        for name, block in blocks.items():
            if name not in known:
                self.findings.add(block.place, "there is no such block for this task", (name,))
            elif name in question:
                self.findings.add(block.place, "this stands in [options] already", (name,))
            else:
                found = self._part(block, (name,), known[name], "options")
                if found is not None:
                    question[name] = self._keep((name,), found)
        return question | ({"system": system} if system else {})

    def _part(self, block: Block, path: Path, content: Content, otherwise: str) -> Part | None:
        if block.name == "forces_at":
            return ForcesAt(self._table(block, path, Content(models=[ForceAt])))
        if content.items is not None and content.items.models:
            return Items(self._table(block, path, content.items))
        if content.models:
            return self._single(block, path, content)
        self.findings.add(block.place, f"this isn't a block but a column of [{otherwise}]", path)
        return None

    def _table(self, block: Block, path: Path, content: Content) -> Table:
        return read_table(block, path, content, self.decimal_comma, self.findings)

    def _single(self, block: Block, path: Path, content: Content) -> Single:
        if block.header and not block.rows:
            self.findings.add(block.place, "a row with the values is missing", path)
        for number, _ in block.rows[1 : MOST_FAULTS + 1]:
            place = Place(number, 1, block.place.title)
            self.findings.add(place, "this block has one row of values", path)
        del block.rows[1:]
        return Single(self._table(block, path, content))

    def _keep(self, path: Path, part: Part) -> Any:
        self.parts[path] = part
        return part.value


def _default_kind(blocks: dict[str, Block]) -> Raw:
    if blocks.keys() & {"bodies", "connections"}:
        return {"kind": "bodies"}
    return {"kind": "matrices"} if blocks.keys() & {"degrees_of_freedom", "mass"} else {}


def _outside(fault: Fault) -> Fault:
    """A fault of a system that isn't part of a question."""
    return Fault(fault.pointer.removeprefix("/system"), fault.detail, fault.row, fault.column)
