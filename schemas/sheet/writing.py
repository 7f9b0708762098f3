"""A system or a question as a sheet, which reads back as the same."""

from collections.abc import Iterable, Iterator, Sequence
from typing import Any

from pydantic import BaseModel

from schemas.matrix import EntryList, MatrixMarket
from schemas.question import Question
from schemas.sheet.cells import LIST, protected
from schemas.sheet.columns import AXES, Content, fields
from schemas.sheet.matrices import ForceAt
from schemas.system import AnySystem, BodiesSystem, Body, MatricesSystem

_QUOTED = frozenset(',"\r\n')
_MATRICES = ("mass", "stiffness", "damping", "gyroscopic", "structural")
Row = Sequence[str]
Block = tuple[str, Iterable[Row]]


def write_sheet(system: AnySystem) -> str:
    """A system as CSV (RFC 4180), separated by commas; fields that have their default are left out.

    Text that a spreadsheet would run as a formula gets an apostrophe, which reading takes off.
    """
    return _text(_blocks_of(system))


def write_question(question: Question) -> str:
    """A question as CSV: the blocks of its system, then those of what is asked."""
    system = [] if question.system is None else _blocks_of(question.system)
    return _text([*system, *_asked(question)])


def _text(blocks: Iterable[Block]) -> str:
    lines = []
    for name, rows in blocks:
        lines += [f"[{name}]", *(",".join(map(_quoted, row)) for row in rows), ""]
    return "\r\n".join(lines)


def _blocks_of(system: AnySystem) -> Iterator[Block]:
    return _bodies(system) if isinstance(system, BodiesSystem) else _matrices(system)


def _asked(question: Question) -> Iterator[Block]:
    """Lists of objects as blocks of their own, everything else as options."""
    options = _shown(question, ("system",))
    if "forces_at" in options:
        places = options.pop("forces_at").items()
        yield "forces_at", _table([{"excitation": key, "at": at} for key, at in places], [ForceAt])
    for name, content in fields(type(question)).items():
        if name in options and content.items is not None and content.items.models:
            yield name, _table(options.pop(name), content.items.models)
    if options:
        yield "options", _table([options], [type(question)])


def _quoted(cell: str) -> str:
    return '"' + cell.replace('"', '""') + '"' if not _QUOTED.isdisjoint(cell) else cell


def _bodies(system: BodiesSystem) -> Iterator[Block]:
    yield "system", _table([_shown(system, ("bodies", "connections"))], [BodiesSystem])
    bodies = [_shown(body, _as_the_system(body, system)) for body in system.bodies]
    yield "bodies", _table(bodies, [Body])
    if system.connections:
        kinds = [type(part) for part in system.connections]
        yield "connections", _table(list(map(_shown, system.connections)), kinds)


def _as_the_system(body: Body, system: BodiesSystem) -> Sequence[str]:
    return ("motions",) if body.motions == system.motions else ()


def _table(items: Sequence[Any], models: Sequence[type[BaseModel]]) -> Iterator[Row]:
    """The header, then a row for each item; items of long lists are the last columns."""
    content = Content(models=list(dict.fromkeys(models)))
    flat = [dict(_leaves(item, content)) for item in items]
    titles = sorted(dict.fromkeys(title for cells in flat for title in cells), key=_is_listed)
    columns = {title: column for column, title in enumerate(titles)}
    yield titles
    for cells in flat:
        row = [""] * (1 + max(columns[title] for title in cells))
        for title, cell in cells.items():
            row[columns[title]] = cell
        yield row


def _is_listed(title: str) -> bool:
    return any(key.isdigit() for key in title.split("."))


def _shown(value: Any, without: Sequence[str] = ()) -> Any:
    """`value` as plain lists and objects without what has its default.

    An object keeps at least one field, so that it is there when it is read.
    """
    if isinstance(value, list):
        return [_shown(item) for item in value]
    if isinstance(value, dict):
        return {key: _shown(item) for key, item in value.items()}
    if not isinstance(value, BaseModel):
        return value
    given = {
        name: (getattr(value, name), field.default)
        for name, field in type(value).model_fields.items()
        if name not in without and getattr(value, name) is not None
    }
    shown = {name: _shown(item) for name, (item, default) in given.items() if item != default}
    return shown or {name: item for name, (item, _) in list(given.items())[:1]}


def _leaves(value: Any, content: Content, title: str = "") -> Iterator[tuple[str, str]]:
    """Title and cell of every value in an object or a list."""
    if isinstance(value, dict):
        for name, item in value.items():
            inner = Content()
            for alternative in _inside(content, name):
                inner.join(alternative)
            yield from _leaves(item, inner, f"{title}.{name}" if title else name)
    elif isinstance(value, list) and content.items is not None and not _in_one_cell(value):
        named = AXES if content.length == len(AXES) else None
        for index, item in enumerate(value):
            key = named[index] if named else index
            yield from _leaves(item, content.items, f"{title}.{key}")
    elif isinstance(value, list):
        yield title, protected(LIST.join(value))
    else:
        yield title, _cell(value)


def _inside(content: Content, name: str) -> Iterator[Content]:
    """What the field `name` of an object may hold."""
    if content.values is not None:
        yield content.values
    yield from (fields(model)[name] for model in content.models if name in fields(model))


def _in_one_cell(value: list[Any]) -> bool:
    return all(isinstance(item, str) for item in value)


def _cell(value: object) -> str:
    if isinstance(value, bool):
        return str(value).upper()
    return protected(value) if isinstance(value, str) else repr(value)


def _matrices(system: MatricesSystem) -> Iterator[Block]:
    given = {name: getattr(system, name) for name in _MATRICES if getattr(system, name) is not None}
    names = system.degrees_of_freedom
    yield "system", _table([_shown(system, ("degrees_of_freedom", *_MATRICES))], [MatricesSystem])
    yield "degrees_of_freedom", [["name"], *([name] for name in names)]
    for name, matrix in given.items():
        yield name, _matrix(matrix, names)


def _matrix(matrix: Any, names: Sequence[str]) -> Iterator[Row]:
    if isinstance(matrix, MatrixMarket):
        yield ["matrix_market"]
        yield from ([protected(line)] for line in matrix.matrix_market.split("\n"))
    elif isinstance(matrix, EntryList):
        yield from _entries(matrix)
    else:
        yield names
        yield from (list(map(repr, row)) for row in matrix)


def _entries(matrix: EntryList) -> Iterator[Row]:
    said = ["TRUE"] if matrix.symmetric else []
    yield ["row", "column", "value", *(["symmetric"] if said else [])]
    if said and not matrix.values:
        yield ["", "", "", *said]
    for row, column, value in zip(matrix.rows, matrix.columns, matrix.values, strict=True):
        yield [repr(row), repr(column), repr(value), *said]
        said = []
