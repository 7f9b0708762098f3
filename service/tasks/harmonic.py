"""The task `response/harmonic`: steady response to harmonic excitation."""

from functools import partial
from math import pi, sqrt
from typing import Any

import numpy as np

from schemas.faults import Fault, Invalid, pointer
from schemas.response.harmonic import HarmonicQuestion
from schemas.system import AnySystem
from service.compute.couplings import Complexes
from service.compute.harmonic import responder
from service.compute.machine import Floats
from service.compute.peaks import Peak, peaks, resolved, too_coarse
from service.compute.resonances import crossings, resonances
from service.compute.thinning import kept_points
from service.tasks.dynamics import Dynamics, corrected, dynamics_of, unknown
from service.tasks.harmonic_evidence import evidence
from service.tasks.modes import CAUTION
from service.tasks.readings import number
from service.tasks.severity import zone
from service.tasks.steady import Steady, places_of
from service.tasks.view import ORDERS
from service.tasks.wary import geometry_warnings

MOST_PEAKS = 200
NOTABLE_RESIDUAL = 1e-6
MOST_VALUES = 4_000_000


def harmonic(system: AnySystem, question: HarmonicQuestion) -> dict[str, Any]:
    """Answer a question on the steady response.

    Raises
    ------
    Invalid
        The system can't be computed, or the question names what it doesn't have; pointers start at
        the question.
    """
    axis = question.frequencies or question.speeds
    low, high, listed = _range(question)
    reference = (question.at_rpm or 0.0) if question.speeds is None else sqrt(low * high)
    order = None if question.speeds is None else question.excite[0].order or 1.0
    top = 2 * pi * high if order is None else high * order * pi / 30.0
    dynamics = dynamics_of(system, reference, top)
    _check_places(dynamics, question)
    dynamics = corrected(dynamics, places_of(dynamics, question, reference), top)
    centres, widths = _resonances(dynamics, order, low, high, reference)
    places = np.array(listed) if listed else _places(axis, low, high, centres, widths)
    rpm = places if order is not None else np.full(len(places), reference)
    steady = Steady(
        dynamics, question, responder(dynamics.machine, len(places), rpm), order, reference,
        high if order is not None else None,
    )  # fmt: skip
    found = steady.response(places)
    labels = steady.frame(reference).labels
    _check_size(found, question)
    with np.errstate(invalid="ignore"):
        amplitudes = np.where(np.isfinite(found), np.abs(found), np.inf)
    kept = kept_points(amplitudes, question.max_points or len(places))
    if question.max_points and 2 * len(found) + 2 > question.max_points:
        raise Invalid([Fault("/max_points", f"too few to keep the peaks of {len(found)} series")])
    tops = _peaks(steady, places, amplitudes, labels)
    sorted_places = np.sort(places)
    rests_on = evidence(steady, sorted_places, centres)
    return {
        "axis": {
            "quantity": "frequency" if order is None else "speed",
            "unit": "Hz" if order is None else "rpm",
            "values": places[kept].tolist(),
            "frequency_hz": (steady.omega(places[kept]) / (2 * pi)).tolist(),
        },
        "series": _series(labels, found[:, kept]),
        "peaks": tops,
        "reading": _reading(labels, amplitudes, places, order, tops),
        **_severity(question, labels, amplitudes, steady.omega(places)),
        "warnings": [
            *geometry_warnings(system, dynamics.analysed, int(dynamics.modes.rigid.sum())),
            *_warnings(steady, sorted_places, found, centres, widths),
            *_residual_warning(rests_on),
        ],
        "evidence": rests_on,
        "caution": CAUTION,
    }


def _range(question: HarmonicQuestion) -> tuple[float, float, list[float] | None]:
    """Lowest and highest place of the axis, and the list where one is given."""
    if question.frequencies is not None:
        given = question.frequencies
        low, high, listed = given.from_hz, given.to_hz, given.list_hz
    else:
        assert question.speeds is not None
        speeds = question.speeds
        low, high, listed = speeds.from_rpm, speeds.to_rpm, speeds.list_rpm
    if listed:
        return min(listed), max(listed), listed
    return low or 0.0, high or 0.0, None


def _places(axis: Any, low: float, high: float, centres: Floats, widths: Floats) -> Floats:
    if axis.spacing == "linear":
        return np.linspace(low, high, axis.points)
    if axis.spacing == "log":
        places = np.geomspace(low, high, axis.points)
        places[0], places[-1] = low, high
        return places
    return resolved(low, high, axis.points, centres, widths)


def _resonances(
    dynamics: Dynamics, order: float | None, low: float, high: float, rpm: float
) -> tuple[Floats, Floats]:
    """Resonances in units of the axis, and half their half-power widths."""
    if order is None:
        omega, half = resonances(dynamics.machine, rpm)
        return omega / (2 * pi), half / (2 * pi)
    return crossings(dynamics.machine, order, low, high)


def _check_places(dynamics: Dynamics, question: HarmonicQuestion) -> None:
    faults = [
        Fault(pointer(("excite", index, "at")), unknown(dynamics, item.at))
        for index, item in enumerate(question.excite)
        if item.at is not None and item.at not in dynamics.place
    ]
    for index, name in enumerate(question.observe or []):
        if name not in dynamics.place:
            faults.append(Fault(pointer(("observe", index)), unknown(dynamics, name)))
    if faults:
        raise Invalid(faults)


def _check_size(found: Complexes, question: HarmonicQuestion) -> None:
    if found.size > MOST_VALUES and question.max_points is None:
        raise Invalid([Fault("/max_points", f"{found.size:,} values: observe less or thin them")])


def _series(labels: tuple[tuple[str, str, str], ...], found: Complexes) -> list[dict[str, Any]]:
    amplitudes = np.abs(found)
    phases = np.rad2deg(np.angle(found))
    return [
        {
            "at": at,
            "quantity": quantity,
            "unit": unit,
            "amplitude": _finite(amplitude),
            "phase_deg": _finite(np.where(np.isfinite(amplitude), phase, np.inf)),
        }
        for (at, quantity, unit), amplitude, phase in zip(labels, amplitudes, phases, strict=True)
    ]


def _finite(values: Floats) -> list[float | None]:
    if np.isfinite(values).all():
        plain: list[float | None] = values.tolist()
        return plain
    return [float(value) if np.isfinite(value) else None for value in values]


def _peaks(
    steady: Steady, places: Floats, amplitudes: Floats, labels: tuple[tuple[str, str, str], ...]
) -> list[dict[str, Any]]:
    ascending, first = np.unique(places, return_index=True)
    found = []
    for row, (at, quantity, _) in enumerate(labels):
        tops = peaks(ascending, amplitudes[row, first], partial(_size, steady, row))
        found += [_peak(steady, top, at, quantity) for top in tops]
    found.sort(key=lambda item: (item["frequency_hz"], item["at"]))
    return found[:MOST_PEAKS]


def _size(steady: Steady, row: int, place: float) -> float:
    value = abs(complex(steady.response(np.array([place]))[row, 0]))
    return value if np.isfinite(value) else 1e300


def _peak(steady: Steady, top: Peak, at: str, quantity: str) -> dict[str, Any]:
    bounded = steady.dynamics.machine.damped and top.amplitude < 1e299
    frequency = float(steady.omega(np.array([top.place]))[0]) / (2 * pi)
    factor = top.place / top.width if bounded and top.width else None
    return {
        "at": at,
        "quantity": quantity,
        "frequency_hz": frequency,
        "rpm": 60.0 * frequency if steady.order is None else top.place,
        "amplitude": top.amplitude if bounded else None,
        "amplification_factor": factor,
    }


def _severity(
    question: HarmonicQuestion,
    labels: tuple[tuple[str, str, str], ...],
    amplitudes: Floats,
    omega: Floats,
) -> dict[str, Any]:
    """At its worst frequency, each translation that is observed."""
    if question.severity is None:
        return {}
    found = []
    for (at, quantity, unit), own in zip(labels, amplitudes, strict=True):
        if quantity in ORDERS and not unit.startswith("rad"):
            speed = float((own * omega ** (1 - ORDERS[quantity])).max()) / sqrt(2.0)
            found.append(zone(at, speed if np.isfinite(speed) else None, question.severity))
    return {"severity": found}


def _warnings(
    steady: Steady, places: Floats, found: Complexes, centres: Floats, widths: Floats
) -> list[str]:
    warnings = []
    unit = "Hz" if steady.order is None else "rpm"
    if not steady.dynamics.machine.damped:
        warnings.append("nothing damps the machine: at a resonance the response has no bound.")
    if not np.isfinite(found).all():
        warnings.append("at an undamped resonance: the response is without bound and left out.")
    if not np.abs(found).any():
        warnings.append("the excitation doesn't reach what is observed.")
    coarse = too_coarse(places, centres, widths) if len(places) > 1 else []
    if coarse and steady.dynamics.machine.damped:
        listed = ", ".join(f"{number(float(centres[i]))} {unit}" for i in coarse[:8])
        warnings.append(
            f"points lie further apart than half a resonance is wide, near {listed}: peaks there "
            'may be missed; use the spacing "resolved" or more points.'
        )
    if steady.order is not None:
        warnings += _speed_warnings(steady, places)
    return warnings


def _residual_warning(rests_on: dict[str, Any]) -> list[str]:
    residual = rests_on["largest_relative_residual"]
    if residual is None or residual < NOTABLE_RESIDUAL:
        return []
    return [
        f"the equation of motion holds to {number(residual, 2)} of its terms only: the modes left "
        "out take part in the damping."
    ]


def _speed_warnings(steady: Steady, places: Floats) -> list[str]:
    warnings = []
    low, high = float(places[0]), float(places[-1])
    left = [
        bearing.name
        for bearing, _ in steady.dynamics.damping.bearings
        if not (bearing.covers(low) and bearing.covers(high))
    ]
    if left:
        warnings.append(
            f"speeds lie outside the table of {', '.join(left[:8])}: its outermost values are used."
        )
    if steady.dynamics.damping.ratio and steady.dynamics.damping.bearings:
        warnings.append("the damping ratio is that of the modes in the middle of the speeds.")
    return warnings


def _reading(
    labels: tuple[tuple[str, str, str], ...],
    amplitudes: Floats,
    places: Floats,
    order: float | None,
    tops: list[dict[str, Any]],
) -> str:
    unit = "Hz" if order is None else "rpm"
    row, column = np.unravel_index(int(np.argmax(amplitudes)), amplitudes.shape)
    at, quantity, own = labels[int(row)]
    largest = float(amplitudes[row, column])
    if not np.isfinite(largest):
        return f"{at} responds without bound at {number(float(places[column]))} {unit}."
    sentence = (
        f"The largest {quantity} at a point of the axis is {number(largest)} {own} at {at}, at "
        f"{number(float(places[column]))} {unit}"
    )
    higher = [top for top in tops if top["at"] == at and (top["amplitude"] or 0.0) > largest]
    if higher:
        top = max(higher, key=lambda item: item["amplitude"])
        where = top["frequency_hz"] if order is None else top["rpm"]
        sentence += f"; its peak is {number(top['amplitude'])} {own} at {number(where)} {unit}"
    return sentence + "."
