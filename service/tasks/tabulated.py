"""An answer as tables: what goes into CSV, text and HTML."""

from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any


@dataclass(frozen=True, slots=True)
class Table:
    """A table of an answer: a title, the column names with their units, and the rows."""

    title: str
    columns: tuple[str, ...]
    rows: Callable[[Mapping[str, Any]], Iterable[Sequence[object]]]


def _picked(field: str, *columns: str) -> Callable[[Mapping[str, Any]], list[list[object]]]:
    """Rows of a list of objects: these fields of each, empty where absent."""
    return lambda answer: [[item.get(name) for name in columns] for item in answer[field]]


def _table(title: str, field: str, *columns: str) -> Table:
    return Table(title, columns, _picked(field, *columns))


def _shape_rows(answer: Mapping[str, Any]) -> Iterable[Sequence[object]]:
    for row, name in enumerate(answer["degrees_of_freedom"]):
        for mode in answer["modes"]:
            yield mode["number"], name, mode["shape"][row]


def _mass_rows(answer: Mapping[str, Any]) -> Iterable[Sequence[object]]:
    for mode in answer["modes"]:
        for direction, part in mode["effective_mass"].items():
            yield mode["number"], direction, part.get("kg"), part.get("kg_m2"), part["share"]


def _energy_rows(answer: Mapping[str, Any]) -> Iterable[Sequence[object]]:
    for mode in answer["modes"]:
        for part in mode["energy"]:
            yield mode["number"], part["kind"], part["of"], part["share"]


MODES_TABLES: Mapping[str, Table] = {
    "modes": _table(
        "Modes", "modes", "number", "kind", "frequency_hz", "period_s", "speed_rpm",
        "frequency_bound_hz", "reading",
    ),
    "shapes": Table("Mode shapes", ("mode", "degree_of_freedom", "value"), _shape_rows),
    "effective_mass": Table(
        "Effective masses", ("mode", "direction", "kg", "kg_m2", "share"), _mass_rows
    ),
    "energy": Table("Energy shares", ("mode", "kind", "of", "share"), _energy_rows),
}  # fmt: skip

SEPARATION_TABLES: Mapping[str, Table] = {
    "findings": _table(
        "Findings, worst first", "findings", "mode", "frequency_hz", "excitation", "operation",
        "excitation_min_hz", "excitation_max_hz", "margin", "required", "verdict",
        "coincidence_rpm", "participation", "reading",
    ),
    "coincidences": _table(
        "Coincidences up to the highest speed", "coincidences", "mode", "excitation", "rpm",
        "operation",
    ),
    "clear_speeds": _table("Clear speeds", "clear_speeds", "min_rpm", "max_rpm"),
}  # fmt: skip
