"""Modes of damped and turning systems."""

from dataclasses import dataclass
from math import pi
from typing import Any

import numpy as np

from schemas.faults import Invalid
from schemas.modes import ModesQuestion
from schemas.system import AnySystem, BodiesSystem
from service.compute.damped_modes import NEARLY_DEFECTIVE
from service.compute.damped_system import DampedModes, Damping, damped_modes
from service.compute.real_modes import ALL_UP_TO, ELSE, Modes, Wanted
from service.compute.whirl import whirl
from service.tasks.damping import damping_of, speed_matters, stiffness_of
from service.tasks.machines import Analysed, analyse, solved
from service.tasks.modes import (
    CAUTION,
    effective_mass,
    energy_shares,
    masses_of,
    named_shares,
    scaled,
    shape_rows,
    undamped_modes,
)
from service.tasks.readings import mode_readings, number, percent
from service.tasks.wary import geometry_warnings, mesh_warnings

PROJECTED_FROM = 400  # independent motions: above, the problem is projected on undamped modes
PROJECTED_ON = 120


@dataclass(frozen=True, slots=True)
class Damped:
    """A system with its damped modes at one speed."""

    analysed: Analysed
    damping: Damping
    undamped: Modes
    modes: DampedModes
    rpm: float
    expected: int

    @property
    def is_projected(self) -> bool:
        """Whether the modes were found in the space of some undamped modes only."""
        return len(self.undamped.values) < self.analysed.pencil.size


def solve_damped(system: AnySystem, rpm: float, *, dissipation: bool, count: int) -> Damped:
    """The damped modes of a system at a speed; without `dissipation` only what turns is kept.

    Raises
    ------
    Invalid
        The system can't be computed; pointers start at the system.
    """
    analysed = analyse(system, rpm)
    damping = damping_of(system, analysed)
    if not dissipation:
        damping = damping.without_dissipation()
    size = analysed.pencil.size
    used = size if size <= PROJECTED_FROM else min(size, max(PROJECTED_ON, 3 * count))
    undamped = solved(system, analysed.pencil, Wanted(count=used))
    found = damped_modes(
        analysed.pencil, undamped, damping, analysed.M, stiffness_of(system, analysed, rpm), rpm
    )
    return Damped(analysed, damping, undamped, found, rpm, _expected(analysed, damping, rpm))


def _expected(analysed: Analysed, damping: Damping, rpm: float) -> int:
    """Two roots for each motion with inertia, one for each damped motion without."""
    pencil = analysed.pencil
    roots = 2 * pencil.size
    if pencil.empty is not None:
        empty = pencil.tied(pencil.empty)
        C = empty.T @ damping.viscous(rpm) @ empty
        values = np.abs(np.linalg.eigvalsh((C + C.T) / 2))
        roots += int((values > 1e-12 * max(float(values.max()), 1e-300)).sum())
    return roots


def modes(system: AnySystem, question: ModesQuestion) -> dict[str, Any]:
    """The task `modes`: undamped ones, or damped ones or those of a turning machine where asked.

    Raises
    ------
    Invalid
        The system can't be computed; pointers start at the question.
    """
    if not question.damped and question.at_rpm is None:
        return undamped_modes(system, question)
    rpm = question.at_rpm or 0.0
    try:
        solved = solve_damped(
            system, rpm, dissipation=question.damped, count=question.count or ELSE
        )
    except Invalid as fault:
        raise fault.under("/system") from None
    chosen = _chosen(solved, question)
    return {
        "degrees_of_freedom": question.shapes_of or list(solved.analysed.names),
        "modes": damped_list(system, solved, chosen, question),
        "warnings": _warnings(system, solved, question, chosen),
        "evidence": damped_evidence(solved, chosen),
        "caution": CAUTION,
    }


def _chosen(solved: Damped, question: ModesQuestion) -> list[int]:
    """Indices of the modes asked for, lowest |λ| first."""
    values = solved.modes.values
    if question.below_hz is not None:
        return np.flatnonzero(np.abs(values) <= 2 * pi * question.below_hz).tolist()
    count = question.count or (len(values) if len(values) <= ALL_UP_TO else ELSE)
    return list(range(min(count, len(values))))


def kind_of_root(root: complex, bound: float) -> str:
    """rigid-body, oscillating, overdamped or diverging."""
    if abs(root) <= bound:
        return "rigid-body"
    if root.real > max(bound, 1e-12 * abs(root)):
        return "diverging"
    return "oscillating" if root.imag > 0.0 else "overdamped"


def damped_list(
    system: AnySystem, solved: Damped, chosen: list[int], question: ModesQuestion
) -> list[dict[str, Any]]:
    """The modes as the contract writes them."""
    analysed, found = solved.analysed, solved.modes
    shapes = found.shapes[:, chosen]
    roots = [complex(found.values[index]) for index in chosen]
    bounds = [float(found.bounds[index]) for index in chosen]
    kinds = [kind_of_root(root, bound) for root, bound in zip(roots, bounds, strict=True)]
    masses = masses_of(analysed, shapes)
    shares = named_shares(analysed, *energy_shares(analysed, shapes, solved.rpm), kinds)
    readings = _readings(solved, shapes, roots, kinds, shares)
    spins = spins_of(system)
    weight = np.sqrt(np.maximum(np.asarray(analysed.M.diagonal()), 0.0))
    rows = shape_rows(analysed, question)
    shown = scaled(shapes, question.shape_scale)[rows].T
    return [
        {
            "number": place + 1,
            "kind": kind,
            **_frequencies(root, kind),
            "frequency_bound_hz": bounds[place] / (2 * pi),
            "whirl": whirl(shapes[:, place], weight, analysed.owners, analysed.axes, spins),
            "shape": {"real": shown[place].real.tolist(), "imaginary": shown[place].imag.tolist()},
            "effective_mass": effective_mass(masses, place),
            "energy": shares[place],
            "reading": readings[place],
        }
        for place, (root, kind) in enumerate(zip(roots, kinds, strict=True))
    ]


def spins_of(system: AnySystem) -> dict[int, tuple[int, float]]:
    """For each body that turns, its axis (0 to 2) and the sign of its speed."""
    if not isinstance(system, BodiesSystem):
        return {}
    return {
        index: ("xyz".index(body.spin.axis), float(np.sign(body.spin.ratio)))
        for index, body in enumerate(system.bodies)
        if body.spin is not None
    }


def _frequencies(root: complex, kind: str) -> dict[str, float | None]:
    size = abs(root)
    turning = kind == "oscillating" or (kind == "diverging" and root.imag > 0.0)
    return {
        "frequency_hz": size / (2 * pi),
        "frequency_rad_s": size,
        "period_s": 2 * pi / root.imag if turning else None,
        "speed_rpm": 60 * size / (2 * pi) if turning else None,
        "damping_ratio": -root.real / size if size > 0.0 else 0.0,
        "damped_frequency_hz": root.imag / (2 * pi),
        "growth_rate_per_s": root.real,
    }


def _readings(
    solved: Damped,
    shapes: np.ndarray[Any, Any],
    roots: list[complex],
    kinds: list[str],
    shares: list[list[dict[str, Any]]],
) -> list[str]:
    frequencies = [abs(root) / (2 * pi) for root in roots]
    plain = mode_readings(solved.analysed, shapes.real, frequencies, kinds, shares)
    readings = []
    for text, root, kind in zip(plain, roots, kinds, strict=True):
        if kind == "oscillating":
            ratio = -root.real / abs(root)
            readings.append(f"{text[:-1]}; damping ratio {percent(ratio, 2)}.")
        elif kind == "diverging" and root.imag > 0.0:
            readings.append(f"{text[:-1]}; it oscillates at {number(root.imag / (2 * pi))} Hz.")
        else:
            readings.append(text)
    return readings


def _warnings(
    system: AnySystem, solved: Damped, question: ModesQuestion, chosen: list[int]
) -> list[str]:
    still = int(np.sum(np.abs(solved.modes.values) <= solved.modes.bounds))
    warnings = geometry_warnings(system, solved.analysed, still)
    if speed_matters(solved.damping) and question.at_rpm is None:
        warnings.append("the modes change with speed; these are at rest: ask with `at_rpm`.")
    warnings += table_warnings(solved.damping, [solved.rpm])
    if solved.is_projected:
        warnings.append(
            f"projected on the lowest {len(solved.undamped.values)} undamped modes: the residual "
            "in the evidence is that of the full problem."
        )
    if (
        question.count is None
        and question.below_hz is None
        and len(chosen) < len(solved.modes.values)
    ):
        warnings.append(
            f"only the lowest {len(chosen)} of {len(solved.modes.values)} modes: ask with `count` "
            "or `below_hz` for more."
        )
    if any(
        kind_of_root(complex(v), float(b)) == "diverging"
        for v, b in zip(solved.modes.values, solved.modes.bounds, strict=True)
    ):
        warnings.append("the machine is unstable: some modes grow instead of dying out.")
    highest = float(np.abs(solved.modes.values[chosen]).max(initial=0.0)) / (2 * pi)
    warnings += mesh_warnings(system, highest)
    defective = _nearly_defective(solved, chosen)
    if defective:
        warnings.append(
            f"poorly determined, nearly defective: modes {', '.join(map(str, defective))}."
        )
    return warnings


def table_warnings(damping: Damping, speeds: list[float]) -> list[str]:
    """Bearings whose tables don't reach the speeds asked for."""
    left = [
        bearing.name
        for bearing, _ in damping.bearings
        if not all(bearing.covers(rpm) for rpm in speeds)
    ]
    if not left:
        return []
    return [f"outside their tables, taken as constant there: {', '.join(left)}."]


def _nearly_defective(solved: Damped, chosen: list[int]) -> list[int]:
    return [
        place + 1
        for place, index in enumerate(chosen)
        if solved.modes.conditions[index] > NEARLY_DEFECTIVE
    ]


def damped_evidence(solved: Damped, chosen: list[int]) -> dict[str, Any]:
    """What the chosen modes rest on."""
    found = solved.modes
    roots = sum(2 if root.imag > 0.0 or root == 0.0 else 1 for root in found.values.tolist())
    conditions = found.conditions[chosen]
    return {
        "method": found.method,
        "roots_found": roots,
        "roots_expected": solved.expected,
        "modes_returned": len(chosen),
        "complete": roots == solved.expected,
        "largest_relative_residual": found.residual,
        "largest_condition": float(conditions.max(initial=1.0)),
        "nearly_defective": _nearly_defective(solved, chosen),
    }
