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
        "damping_ratio", "damped_frequency_hz", "growth_rate_per_s", "whirl",
        "frequency_bound_hz", "reading",
    ),
    "shapes": Table("Mode shapes", ("mode", "degree_of_freedom", "value"), _shape_rows),
    "effective_mass": Table(
        "Effective masses", ("mode", "direction", "kg", "kg_m2", "share"), _mass_rows
    ),
    "energy": Table("Energy shares", ("mode", "kind", "of", "share"), _energy_rows),
}  # fmt: skip


def _map_rows(answer: Mapping[str, Any]) -> Iterable[Sequence[object]]:
    for mode in answer["modes"]:
        for place, rpm in enumerate(answer["rpm"]):
            yield (
                mode["number"],
                rpm,
                mode["frequency_hz"][place],
                mode["damping_ratio"][place],
                mode["growth_rate_per_s"][place],
                mode["whirl"][place],
            )


SPEEDMAP_TABLES: Mapping[str, Table] = {
    "crossings": _table(
        "Crossings", "crossings", "mode", "excitation", "rpm", "frequency_hz", "damping_ratio",
        "amplification_factor", "whirl", "reading",
    ),
    "modes": Table(
        "Modes over speed",
        ("mode", "rpm", "frequency_hz", "damping_ratio", "growth_rate_per_s", "whirl"),
        _map_rows,
    ),
}  # fmt: skip

SEPARATION_TABLES: Mapping[str, Table] = {
    "findings": _table(
        "Findings, worst first", "findings", "mode", "frequency_hz", "excitation", "operation",
        "excitation_min_hz", "excitation_max_hz", "margin", "required", "verdict",
        "coincidence_rpm", "damping_ratio", "participation", "reading",
    ),
    "coincidences": _table(
        "Coincidences up to the highest speed", "coincidences", "mode", "excitation", "rpm",
        "operation",
    ),
    "clear_speeds": _table("Clear speeds", "clear_speeds", "min_rpm", "max_rpm"),
}  # fmt: skip


def _harmonic_rows(answer: Mapping[str, Any]) -> Iterable[Sequence[object]]:
    axis = answer["axis"]
    for series in answer["series"]:
        yield from (
            (
                place if axis["quantity"] == "speed" else None,
                frequency,
                series["at"],
                series["quantity"],
                series["unit"],
                amplitude,
                phase,
            )
            for place, frequency, amplitude, phase in zip(
                axis["values"],
                axis["frequency_hz"],
                series["amplitude"],
                series["phase_deg"],
                strict=True,
            )
        )


def _transient_rows(answer: Mapping[str, Any]) -> Iterable[Sequence[object]]:
    for series in answer["series"]:
        for time, value in zip(answer["time_s"], series["values"], strict=True):
            yield time, series["at"], series["quantity"], series["unit"], value


def _term_rows(answer: Mapping[str, Any]) -> Iterable[Sequence[object]]:
    for mode in answer["modal_terms"]:
        head = (mode["mode"], mode["frequency_hz"], mode["damped_frequency_hz"])
        for term in mode["terms"]:
            yield *head, mode["decay_per_s"], term["at"], term["cosine"], term["sine"]


def _severity_rows(answer: Mapping[str, Any]) -> Iterable[Sequence[object]]:
    for item in answer.get("severity") or ():
        yield item["at"], item["rms_velocity_mm_s"], item["zone"], item["source"]


def _spectrum_rows(answer: Mapping[str, Any]) -> Iterable[Sequence[object]]:
    for item in answer.get("shock_spectrum") or ():
        columns = (
            "frequency_hz", "absolute_acceleration_m_s2", "relative_displacement_m",
            "pseudo_velocity_m_s",
        )  # fmt: skip
        for row in zip(*(item[column] for column in columns), strict=True):
            yield item["motion"], item["damping_ratio"], *row


SEVERITY_TABLE = Table(
    "Vibration severity", ("at", "rms_velocity_mm_s", "zone", "source"), _severity_rows
)
HARMONIC_TABLES: Mapping[str, Table] = {
    "series": Table(
        "Steady response",
        ("rpm", "frequency_hz", "at", "quantity", "unit", "amplitude", "phase_deg"),
        _harmonic_rows,
    ),
    "peaks": _table(
        "Peaks", "peaks", "at", "quantity", "frequency_hz", "rpm", "amplitude",
        "amplification_factor",
    ),
    "severity": SEVERITY_TABLE,
}  # fmt: skip
TRANSIENT_TABLES: Mapping[str, Table] = {
    "series": Table(
        "Response over time", ("time_s", "at", "quantity", "unit", "value"), _transient_rows
    ),
    "largest": _table("Largest values", "largest", "at", "quantity", "unit", "value", "time_s"),
    "modal_terms": Table(
        "Modes of the free motion",
        ("mode", "frequency_hz", "damped_frequency_hz", "decay_per_s", "at", "cosine", "sine"),
        _term_rows,
    ),
    "severity": SEVERITY_TABLE,
    "shock_spectrum": Table(
        "Shock response spectrum",
        (
            "motion", "damping_ratio", "frequency_hz", "absolute_acceleration_m_s2",
            "relative_displacement_m", "pseudo_velocity_m_s",
        ),
        _spectrum_rows,
    ),
}  # fmt: skip
