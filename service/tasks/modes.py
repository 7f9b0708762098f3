"""The task `modes`: natural frequencies and mode shapes of a system."""

from math import pi, sqrt
from typing import Any

import numpy as np

from schemas.faults import Fault, Invalid, pointer
from schemas.modes import ModesQuestion
from schemas.system import AnySystem
from service.compute.machine import AXES, Floats, Shapes
from service.compute.participation import (
    Direction,
    effective_masses,
    kinetic_shares,
    strain_shares,
)
from service.compute.real_modes import Modes, Wanted
from service.tasks.machines import Analysed, analyse, solved
from service.tasks.readings import mode_readings
from service.tasks.wary import modes_warnings, system_warnings

CAUTION = (
    "A screening result on a model: check it against measurement on the machine; local codes and "
    "the licensed engineer decide."
)
LEAST_SHARE, MOST_SHARES = 0.005, 12


def undamped_modes(system: AnySystem, question: ModesQuestion) -> dict[str, Any]:
    """Answer a question on modes.

    Raises
    ------
    Invalid
        The system can't be computed; pointers start at the question.
    """
    try:
        analysed = analyse(system)
        limit = None if question.below_hz is None else (2 * pi * question.below_hz) ** 2
        found = solved(system, analysed.pencil, Wanted(question.count, limit))
    except Invalid as fault:
        raise fault.under("/system") from None
    rows = shape_rows(analysed, question)
    return {
        "degrees_of_freedom": question.shapes_of or list(analysed.names),
        "modes": mode_list(analysed, found, question.shape_scale, rows),
        "warnings": [
            *system_warnings(system, analysed, found),
            *modes_warnings(system, analysed, found, question),
        ],
        "evidence": evidence(found),
        "caution": CAUTION,
    }


def shape_rows(analysed: Analysed, question: ModesQuestion) -> list[int] | slice:
    """Rows of the shapes that are asked for.

    Raises
    ------
    Invalid
        One names no motion of the system.
    """
    if question.shapes_of is None:
        return slice(None)
    row_of = {name: row for row, name in enumerate(analysed.names)}
    faults = [
        Fault(
            pointer(("shapes_of", index)),
            f"the system has no degree of freedom '{name}' that can move",
        )
        for index, name in enumerate(question.shapes_of)
        if name not in row_of
    ]
    if faults:
        raise Invalid(faults)
    return [row_of[name] for name in question.shapes_of]


def hertz(value: float) -> float:
    """|ω|/2π of an eigenvalue ω² in rad²/s²."""
    return sqrt(abs(value)) / (2 * pi)


def frequency_bounds(found: Modes) -> list[float]:
    """Bounds on each frequency in Hz from those on the eigenvalues.

    √v − √(v − b) = b/(√v + √(v − b)) is the wider side; nothing cancels when it is written so.
    What can't be told from 0 is given as 0 Hz, and lies within √(v + b) of that.
    """
    values = np.abs(found.values)
    bounds = np.minimum(found.bounds, values)
    roots = np.sqrt(values) + np.sqrt(values - bounds)
    from_value = bounds / np.where(roots > 0.0, roots, 1.0)
    above = np.sqrt(values + found.bounds) - np.sqrt(values)
    from_zero = np.where(values <= found.bounds, np.sqrt(values + found.bounds), 0.0)
    widest = np.maximum(from_zero, np.maximum(from_value, above))
    result: list[float] = (widest / (2 * pi)).tolist()
    return result


def kind_of(value: float, bound: float, rigid: bool) -> str:
    """rigid-body, oscillating or diverging; what can't be told from 0 counts as rigid-body."""
    if rigid or abs(value) <= bound:
        return "rigid-body"
    return "oscillating" if value > 0.0 else "diverging"


def kinds(found: Modes) -> list[str]:
    """The kind of each mode."""
    return [
        kind_of(value, bound, rigid)
        for value, bound, rigid in zip(
            found.values.tolist(), found.bounds.tolist(), found.rigid.tolist(), strict=True
        )
    ]


def mode_list(
    analysed: Analysed, found: Modes, scale: str, rows: list[int] | slice
) -> list[dict[str, Any]]:
    """The modes as the contract writes them."""
    shapes = analysed.pencil.full(found.shapes)
    masses = masses_of(analysed, shapes)
    kinetic, strain = energy_shares(analysed, shapes)
    kind_list, bounds = kinds(found), frequency_bounds(found)
    frequencies = [
        _frequencies(value, kind)
        for value, kind in zip(found.values.tolist(), kind_list, strict=True)
    ]
    shares = named_shares(analysed, kinetic, strain, kind_list)
    hz = [float(frequency["frequency_hz"] or 0.0) for frequency in frequencies]
    readings = mode_readings(analysed, shapes, hz, kind_list, shares)
    shown = scaled(shapes, scale)[rows].T.tolist()
    return [
        {
            "number": index + 1,
            "kind": kind,
            **frequencies[index],
            "frequency_bound_hz": bounds[index],
            "shape": shown[index],
            "effective_mass": effective_mass(masses, index),
            "energy": shares[index],
            "reading": readings[index],
        }
        for index, kind in enumerate(kind_list)
    ]


def masses_of(analysed: Analysed, shapes: Shapes) -> list[Direction]:
    """Effective masses of the (n, m) shapes in every direction."""
    return effective_masses(analysed.M, analysed.pencil, shapes, analysed.directions)


def effective_mass(masses: list[Direction], index: int) -> dict[str, dict[str, float]]:
    return {
        AXES[part.axis]: {
            "kg" if part.axis < 3 else "kg_m2": part.effective[index],
            "share": part.effective[index] / part.total,
        }
        for part in masses
    }


def energy_shares(analysed: Analysed, shapes: Shapes, rpm: float = 0.0) -> tuple[Floats, Floats]:
    """Kinetic shares per body and strain shares per connection, (parts, modes)."""
    kinetic = kinetic_shares(analysed.masses, len(analysed.carriers), shapes)
    if analysed.assembly is None:
        return kinetic, np.zeros((0, shapes.shape[1]))
    return kinetic, strain_shares(analysed.assembly, shapes, rpm)


def _frequencies(value: float, kind: str) -> dict[str, float | None]:
    omega = 0.0 if kind == "rigid-body" else sqrt(abs(value))
    frequency = omega / (2 * pi)
    if kind == "oscillating":
        return {
            "frequency_hz": frequency,
            "frequency_rad_s": omega,
            "period_s": 1.0 / frequency,
            "speed_rpm": 60.0 * frequency,
        }
    still: dict[str, float | None] = {
        "frequency_hz": frequency,
        "frequency_rad_s": omega,
        "period_s": None,
        "speed_rpm": None,
    }
    if kind == "diverging":
        still["growth_rate_per_s"] = omega
    return still


def scaled(shapes: Shapes, scale: str) -> Shapes:
    if scale == "mass":
        return shapes
    largest = np.abs(shapes).argmax(axis=0)
    scaled: Shapes = shapes / shapes[largest, np.arange(shapes.shape[1])]
    return scaled


def named_shares(
    analysed: Analysed, kinetic: Floats, strain: Floats, kind_list: list[str]
) -> list[list[dict[str, Any]]]:
    """Per mode the shares worth naming, strain first; a rigid-body motion strains nothing."""
    names = analysed.assembly.connection_names if analysed.assembly else ()
    return [
        ([] if kind == "rigid-body" else _largest("strain", names, strained))
        + _largest("kinetic", analysed.carriers, moving)
        for kind, strained, moving in zip(
            kind_list, strain.T.tolist(), kinetic.T.tolist(), strict=True
        )
    ]


def _largest(kind: str, names: tuple[str, ...], shares: list[float]) -> list[dict[str, Any]]:
    """Largest first, equal ones (to six digits) in the order of the machine."""
    found = sorted(
        (-round(abs(share), 6), place, share)
        for place, share in enumerate(shares)
        if share >= LEAST_SHARE or share <= -LEAST_SHARE
    )
    return [
        {"of": names[place], "kind": kind, "share": share}
        for _, place, share in found[:MOST_SHARES]
    ]


def evidence(found: Modes) -> dict[str, Any]:
    """What the modes rest on."""
    return {
        "method": found.method,
        "sturm_count": found.found,
        "sturm_below_hz": hertz(found.below) if found.below > 0.0 else -hertz(found.below),
        "modes_returned": len(found.values),
        "complete": found.complete,
        "largest_relative_residual": found.residual,
        "largest_cross_product": found.cross,
    }
