"""The task `speedmap`: modes of a machine over its speed, and what they meet."""

from dataclasses import dataclass
from math import pi
from typing import Any

import numpy as np

from schemas.faults import Fault, Invalid
from schemas.separation import Excitation
from schemas.speedmap import SpeedmapQuestion
from schemas.system import AnySystem
from service.compute.damped_modes import Complexes
from service.compute.damped_system import Damping, has_entries
from service.compute.pencil import Pencil
from service.compute.real_modes import Wanted
from service.compute.speed_map import Map, Turning, crossings, follow, onsets, root_state, turning
from service.compute.whirl import whirl
from service.tasks.damped import spins_of, table_warnings
from service.tasks.damping import damping_of
from service.tasks.machines import Analysed, analyse, solved
from service.tasks.modes import CAUTION
from service.tasks.readings import number, percent
from service.tasks.wary import geometry_warnings

MOST_MOTIONS = 600  # independent ones: a map solves them all at every speed


@dataclass(frozen=True, slots=True)
class Turned:
    """A system ready to be followed over speed."""

    system: AnySystem
    analysed: Analysed
    damping: Damping
    problem: Turning

    def shape(self, state: Complexes) -> Complexes:
        """All motions from a state vector."""
        size = len(self.problem.values)
        return self.problem.shapes @ (state[:size] / self.problem.scale)

    def whirl(self, state: Complexes) -> str | None:
        """Which way the turning bodies orbit."""
        weight = np.sqrt(np.maximum(np.asarray(self.analysed.M.diagonal()), 0.0))
        return whirl(
            self.shape(state),
            weight,
            self.analysed.owners,
            self.analysed.axes,
            spins_of(self.system),
        )


def turned(system: AnySystem, rpm: float, *, dissipation: bool) -> Turned:
    """The problem over speed, its coordinates the undamped modes at `rpm`.

    Raises
    ------
    Invalid
        The system can't be computed, or not over speed; pointers start at the system.
    """
    analysed = analyse(system, rpm)
    damping = damping_of(system, analysed)
    if not dissipation:
        damping = damping.without_dissipation()
    pencil = analysed.pencil
    if not isinstance(pencil, Pencil) or pencil.size > MOST_MOTIONS:
        raise Invalid(
            [Fault("/bodies" if system.kind == "bodies" else "/degrees_of_freedom",
                   f"{pencil.size} independent motions; over speed the limit is {MOST_MOTIONS}")]
        )  # fmt: skip
    if _touches_massless(pencil, damping):
        raise Invalid(
            [Fault("/bodies", "a massless motion is damped or held by a bearing: give that body a "
                   "mass or an inertia to follow the machine over speed")]
        )  # fmt: skip
    undamped = solved(system, pencil, Wanted(count=pencil.size))
    shapes = pencil.full(undamped.shapes)
    return Turned(system, analysed, damping, turning(undamped.values, shapes, damping, rpm))


def _touches_massless(pencil: Pencil, damping: Damping) -> bool:
    if pencil.empty is None:
        return False
    empty = pencil.tied(pencil.empty)
    parts = [damping.C @ empty, damping.H @ empty]
    parts += [rows @ empty for bearing, rows in damping.bearings if len(bearing.rpm) > 1]
    return any(has_entries(np.where(np.abs(part) > 1e-12, part, 0.0)) for part in parts)


def speedmap(system: AnySystem, question: SpeedmapQuestion) -> dict[str, Any]:
    """Answer a question on modes over speed.

    Raises
    ------
    Invalid
        The system can't be computed; pointers start at the question.
    """
    try:
        machine = turned(system, question.from_rpm, dissipation=question.damped)
    except Invalid as fault:
        raise fault.under("/system") from None
    speeds = np.linspace(question.from_rpm, question.to_rpm, question.points)
    found = follow(machine.problem, speeds, question.count)
    meetings = _meetings(machine, found, question.excitations)
    return {
        "rpm": speeds.tolist(),
        "modes": [_mode(machine, found, index) for index in range(found.roots.shape[1])],
        "crossings": meetings,
        "instability": _instability(machine, found),
        "warnings": [
            *geometry_warnings(system, machine.analysed, 0),
            *table_warnings(machine.damping, [question.from_rpm, question.to_rpm]),
            *_unsure(found),
        ],
        "evidence": map_evidence(machine, found),
        "caution": CAUTION,
    }


def map_evidence(machine: Turned, found: Map) -> dict[str, Any]:
    """What a map rests on."""
    return {
        "method": "all roots at every speed by the scaled linearization and QR; modes paired "
        "by shape; crossings by inverse iteration and Brent's method",
        "speeds_added": found.halvings,
        "least_correlation": float(found.least_alike.min(initial=1.0)),
        "largest_relative_residual": _residual(machine, found),
    }


def _mode(machine: Turned, found: Map, index: int) -> dict[str, Any]:
    roots = found.roots[:, index]
    size = np.abs(roots)
    frequencies = (size / (2 * pi)).tolist()
    ratios = np.divide(-roots.real, size, out=np.zeros(len(roots)), where=size > 0.0)
    ways = [machine.whirl(found.states[place][:, index]) for place in range(len(roots))]
    return {
        "number": index + 1,
        "frequency_hz": frequencies,
        "damping_ratio": ratios.tolist(),
        "growth_rate_per_s": roots.real.tolist(),
        "whirl": ways,
        "least_correlation": float(found.least_alike[index]),
        "reading": _reading(index + 1, frequencies, ways, found),
    }


def _reading(mode: int, frequencies: list[float], ways: list[str | None], found: Map) -> str:
    way = f", whirling {ways[-1]}" if ways[-1] in ("forward", "backward") else ""
    first, last = number(frequencies[0]), number(frequencies[-1])
    low, high = number(float(found.rpm[0])), number(float(found.rpm[-1]))
    if first == last:
        return f"Mode {mode} stays at {first} Hz from {low} to {high} rpm{way}."
    verb = "rises" if frequencies[-1] > frequencies[0] else "falls"
    return f"Mode {mode} {verb} from {first} Hz at {low} rpm to {last} Hz at {high} rpm{way}."


def _meetings(machine: Turned, found: Map, excitations: list[Excitation]) -> list[dict[str, Any]]:
    meetings = []
    for excitation in excitations:
        order = (
            None if excitation.order is None else excitation.order * (excitation.shaft_ratio or 1)
        )
        for mode, rpm, root in crossings(machine.problem, found, order, excitation.frequency_hz):
            meetings.append(_meeting(machine, mode, rpm, root, excitation.name))
    return sorted(meetings, key=lambda meeting: (meeting["rpm"], meeting["mode"]))


def _meeting(
    machine: Turned, mode: int, rpm: float, root: complex, excitation: str
) -> dict[str, Any]:
    ratio = -root.real / abs(root)
    way = machine.whirl(root_state(machine.problem, rpm, root))
    frequency = abs(root) / (2 * pi)
    factor = 1.0 / (2.0 * ratio) if ratio > 1e-12 else None
    amplified = "" if factor is None else f", amplification factor {number(factor, 3)}"
    return {
        "mode": mode + 1,
        "excitation": excitation,
        "rpm": rpm,
        "frequency_hz": frequency,
        "damping_ratio": ratio,
        "amplification_factor": factor,
        "whirl": way,
        "reading": f"{excitation} meets mode {mode + 1} at {number(rpm)} rpm "
        f"({number(frequency)} Hz, damping ratio {percent(ratio, 2)}{amplified}).",
    }


def _instability(machine: Turned, found: Map) -> dict[str, Any] | None:
    growing = onsets(machine.problem, found)
    grows_from_start = np.flatnonzero(found.roots[0].real > 1e-9 * np.abs(found.roots[0]))
    if grows_from_start.size:
        mode = int(grows_from_start[0])
        growing = [(mode, float(found.rpm[0]), complex(found.roots[0, mode]))]
    if not growing:
        return None
    mode, rpm, root = growing[0]
    return {
        "rpm": rpm,
        "mode": mode + 1,
        "frequency_hz": abs(root) / (2 * pi),
        "reading": f"Unstable from {number(rpm)} rpm: mode {mode + 1} grows at "
        f"{number(abs(root) / (2 * pi))} Hz.",
    }


def _unsure(found: Map) -> list[str]:
    unsure = [str(index + 1) for index, alike in enumerate(found.least_alike) if alike < 0.5]
    if not unsure:
        return []
    return [f"shapes change so fast that they may be exchanged: modes {', '.join(unsure)}."]


def _residual(machine: Turned, found: Map) -> float:
    """Of the quadratic problem at the last speed."""
    problem = machine.problem
    D, S = problem.terms(float(found.rpm[-1]))
    K = np.diag(problem.values) + S
    x = found.states[-1][: len(problem.values)] / problem.scale[:, None]
    parts = [x * found.roots[-1] ** 2, (D @ x) * found.roots[-1], K @ x]
    scale = sum(np.linalg.norm(part, axis=0) for part in parts)
    residual = np.linalg.norm(sum(parts), axis=0) / np.where(scale > 0.0, scale, 1.0)
    return float(residual.max(initial=0.0))
