"""The modes that may meet an excitation: fixed ones, and ones that change with speed."""

from collections.abc import Callable
from dataclasses import dataclass
from itertools import pairwise
from math import inf, pi
from typing import Any, Protocol

import numpy as np

from schemas.faults import Fault, Invalid, pointer
from schemas.separation import AmplificationRule, SeparationQuestion
from schemas.system import AnySystem
from service.compute.machine import Floats, Shapes
from service.compute.participation import mobility_shares
from service.compute.real_modes import Wanted
from service.compute.separation import Excitation, Required, barred, coincidence_rpm, margin
from service.compute.speed_map import Map, crossings, follow
from service.tasks.damped import damped_evidence, kind_of_root, solve_damped, table_warnings
from service.tasks.damping import damping_of, is_damped, speed_matters
from service.tasks.machines import Analysed, analyse, solved
from service.tasks.modes import evidence, hertz, kinds
from service.tasks.speedmap import Turned, map_evidence, turned
from service.tasks.wary import geometry_warnings, solution_warnings, system_warnings

UNDRIVEN = 1e-12  # of the driving-point mobility: a mode with less is at a node of its shape
SPEEDS, BEYOND = 49, 1.5  # of a map for separation, and how far it reaches past the operation


@dataclass(frozen=True, slots=True)
class Met:
    """Where a mode is taken against an excitation: Hz, the speed where they meet, damping ratio."""

    frequency: float
    rpm: float | None
    damping_ratio: float


class Candidate(Protocol):
    """A mode that may meet an excitation."""

    @property
    def number(self) -> int: ...
    @property
    def frequency(self) -> float: ...
    @property
    def damped(self) -> bool: ...
    @property
    def participation(self) -> dict[str, float]: ...
    def undriven_by(self, excitation: str) -> bool:
        """Whether the excitation acts only where this mode doesn't move."""

    def meet(self, excitation: Excitation, low_rpm: float, high_rpm: float) -> Met:
        """Where it matters for an operation from `low_rpm` to `high_rpm`."""

    def meetings(self, excitation: Excitation) -> list[float]:
        """Speeds (rpm) at which the excitation meets it."""

    def barred(
        self, excitation: Excitation, required: Callable[[float], Required]
    ) -> list[tuple[float, float]]:
        """Open ranges of speed (rpm) at which its margin is too small."""


@dataclass(frozen=True, slots=True)
class Fixed:
    """A mode that doesn't change with speed."""

    number: int
    frequency: float
    damping_ratio: float
    damped: bool
    participation: dict[str, float]

    def undriven_by(self, excitation: str) -> bool:
        return self.participation.get(excitation, 1.0) < UNDRIVEN

    def meet(self, excitation: Excitation, low_rpm: float, high_rpm: float) -> Met:
        del low_rpm, high_rpm
        return Met(self.frequency, coincidence_rpm(self.frequency, excitation), self.damping_ratio)

    def meetings(self, excitation: Excitation) -> list[float]:
        rpm = coincidence_rpm(self.frequency, excitation)
        return [] if rpm is None else [rpm]

    def barred(
        self, excitation: Excitation, required: Callable[[float], Required]
    ) -> list[tuple[float, float]]:
        asked = required(self.damping_ratio)
        if excitation.order is not None:
            return [barred(self.frequency, excitation, asked)]
        assert excitation.frequency is not None
        kept = margin(self.frequency, excitation.frequency, excitation.frequency, asked)
        return [] if kept.is_kept else [(-inf, inf)]


@dataclass(frozen=True, slots=True)
class Followed:
    """A mode that changes with speed, followed through a map."""

    number: int
    damped: bool
    participation: dict[str, float]
    machine: Turned
    found: Map
    index: int

    @property
    def frequency(self) -> float:
        """The lowest over the map, Hz: by it a mode counts as within reach."""
        return float(np.abs(self.found.roots[:, self.index]).min()) / (2 * pi)

    def undriven_by(self, excitation: str) -> bool:
        return self.participation.get(excitation, 1.0) < UNDRIVEN

    def at(self, rpm: float) -> tuple[float, float]:
        """Frequency in Hz and damping ratio at `rpm`, between the speeds of the map."""
        roots = self.found.roots[:, self.index]
        size = float(np.interp(rpm, self.found.rpm, np.abs(roots)))
        decay = float(np.interp(rpm, self.found.rpm, -roots.real))
        return size / (2 * pi), decay / size if size > 0.0 else 0.0

    def crossings(
        self, order: float | None, frequency: float | None
    ) -> list[tuple[float, complex]]:
        """Speed and root where it equals an order of the speed or a frequency."""
        alone = Map(
            self.found.rpm,
            self.found.roots[:, [self.index]],
            self.found.states[:, :, [self.index]],
            self.found.least_alike[[self.index]],
            0,
        )
        met = crossings(self.machine.problem, alone, order, frequency)
        return [(rpm, root) for _, rpm, root in met]

    def meet(self, excitation: Excitation, low_rpm: float, high_rpm: float) -> Met:
        """At the nearest crossing; where there is none, at the nearer edge of the operation."""
        met = self.crossings(excitation.order, excitation.frequency)
        if met:
            rpm, root = min(met, key=lambda item: max(low_rpm - item[0], item[0] - high_rpm, 0.0))
            if excitation.order is not None or low_rpm <= rpm <= high_rpm:
                size = abs(root)
                return Met(size / (2 * pi), rpm, -root.real / size)
        return self._nearest_edge(excitation, low_rpm, high_rpm)

    def _nearest_edge(self, excitation: Excitation, low_rpm: float, high_rpm: float) -> Met:
        nearest = Met(*_away(self.at(high_rpm)))
        least = inf
        for rpm in np.linspace(low_rpm, high_rpm, SPEEDS):
            frequency, ratio = self.at(float(rpm))
            excited = excitation.band(float(rpm), float(rpm))[0]
            distance = abs(frequency - excited) / max(excited, 1e-300)
            if distance < least:
                least, nearest = distance, Met(frequency, None, ratio)
        return nearest

    def meetings(self, excitation: Excitation) -> list[float]:
        return [rpm for rpm, _ in self.crossings(excitation.order, excitation.frequency)]

    def barred(
        self, excitation: Excitation, required: Callable[[float], Required]
    ) -> list[tuple[float, float]]:
        """Between solved speeds where the margin is just as required, by what holds inside."""
        met = self.crossings(excitation.order, excitation.frequency)
        root = met[0][1] if met else complex(self.found.roots[-1, self.index])
        asked = required(-root.real / abs(root))
        edges = {float(self.found.rpm[0]), float(self.found.rpm[-1])}
        for factor in (1.0 + asked.above, 1.0 - asked.below):
            order = None if excitation.order is None else factor * excitation.order
            line = None if excitation.frequency is None else factor * excitation.frequency
            edges.update(rpm for rpm, _ in self.crossings(order, line))
        ordered = sorted(edges)
        closed = []
        for low, high in pairwise(ordered):
            middle = (low + high) / 2
            excited = excitation.band(middle, middle)[0]
            frequency, _ = self.at(middle)
            if excited * (1.0 - asked.below) < frequency < excited * (1.0 + asked.above):
                closed.append((low, high))
        return closed


def _away(place: tuple[float, float]) -> tuple[float, None, float]:
    return place[0], None, place[1]


@dataclass(frozen=True, slots=True)
class Candidates:
    """The oscillating modes, whether damping was counted, and what they rest on."""

    modes: list[Any]
    damped: bool
    warnings: list[str]
    evidence: dict[str, Any]


def candidates_of(system: AnySystem, question: SeparationQuestion, top: float) -> Candidates:
    """The oscillating modes up to `top` (Hz) and one above; pointers start at the system.

    Modes that change with speed are followed over it; others are solved once.
    """
    analysed = analyse(system)
    damping = damping_of(system, analysed)
    places = places_of(analysed, question)
    damped = question.damped or isinstance(question.rule, AmplificationRule)
    if speed_matters(damping):
        return _followed(system, question, top, places, damped and is_damped(damping))
    if damped and is_damped(damping):
        return _damped(system, top, places)
    return _undamped(system, analysed, top, places)


def _undamped(
    system: AnySystem, analysed: Analysed, top: float, places: dict[str, list[int]]
) -> Candidates:
    found = solved(system, analysed.pencil, Wanted(limit=(2 * pi * top) ** 2, spare=1))
    shares = _participations(analysed, analysed.pencil.full(found.shapes), places)
    modes = [
        Fixed(index + 1, hertz(float(found.values[index])), 0.0, False, _of(shares, index))
        for index, kind in enumerate(kinds(found))
        if kind == "oscillating"
    ]
    warnings = [*system_warnings(system, analysed, found), *solution_warnings(found)]
    return Candidates(modes, False, warnings, evidence(found))


def _damped(system: AnySystem, top: float, places: dict[str, list[int]]) -> Candidates:
    solved = solve_damped(system, 0.0, dissipation=True, count=40)
    size = np.abs(solved.modes.values)
    within = int(np.count_nonzero(size <= 2 * pi * top)) + 1
    shares = _participations(solved.analysed, solved.modes.shapes, places)
    modes = [
        Fixed(index + 1, abs(root) / (2 * pi), -root.real / abs(root), True, _of(shares, index))
        for index, root in enumerate(solved.modes.values[:within].tolist())
        if kind_of_root(root, float(solved.modes.bounds[index])) == "oscillating"
    ]
    still = int(np.sum(size <= solved.modes.bounds))
    warnings = geometry_warnings(system, solved.analysed, still)
    shown = list(range(min(within, len(size))))
    return Candidates(modes, True, warnings, damped_evidence(solved, shown))


def _followed(
    system: AnySystem,
    question: SeparationQuestion,
    top: float,
    places: dict[str, list[int]],
    damped: bool,
) -> Candidates:
    highest = BEYOND * max(operation.max_rpm for operation in question.operation)
    machine = turned(system, 0.0, dissipation=damped)
    speeds = np.linspace(1e-3 * highest, highest, SPEEDS)  # at rest a pair may have no direction
    found = follow(machine.problem, speeds, len(machine.problem.values))
    lowest = np.abs(found.roots).min(axis=0) / (2 * pi)
    near = np.flatnonzero(lowest <= BEYOND * top)
    chosen = near.tolist() or [int(lowest.argmin())]
    middle = int(np.searchsorted(speeds, question.operation[0].min_rpm).clip(0, SPEEDS - 1))
    shapes = np.stack([machine.shape(found.states[middle][:, i]) for i in chosen], axis=1)
    norm = np.sqrt(np.einsum("ij,ij->j", shapes.conj(), machine.analysed.M @ shapes).real)
    shares = _participations(machine.analysed, shapes / norm, places)
    modes = [
        Followed(index + 1, damped, _of(shares, place), machine, found, index)
        for place, index in enumerate(chosen)
    ]
    warnings = [
        *geometry_warnings(system, machine.analysed, 0),
        "the modes change with speed: each finding is taken where mode and excitation meet.",
        *table_warnings(machine.damping, [0.0, highest / BEYOND]),
    ]
    return Candidates(modes, damped, warnings, map_evidence(machine, found))


def _of(shares: dict[str, Floats], index: int) -> dict[str, float]:
    return {name: float(share[index]) for name, share in shares.items()}


def places_of(analysed: Analysed, question: SeparationQuestion) -> dict[str, list[int]]:
    """Per excitation, the rows of the shapes where it acts.

    Raises
    ------
    Invalid
        A name isn't one of a motion; pointers start at the system, one level below the question.
    """
    row_of = {name: row for row, name in enumerate(analysed.names)}
    faults = [
        Fault(
            pointer(("forces_at", excitation, index)),
            f"the system has no degree of freedom '{name}' that can move",
        )
        for excitation, names in (question.forces_at or {}).items()
        for index, name in enumerate(names)
        if name not in row_of
    ]
    if faults:
        raise Misplaced(faults)
    return {
        excitation: [row_of[name] for name in names]
        for excitation, names in (question.forces_at or {}).items()
    }


class Misplaced(Invalid):
    """Faults whose pointers start at the question already."""

    def under(self, prefix: str) -> "Misplaced":
        del prefix
        return self


def _participations(
    analysed: Analysed, shapes: Shapes, places: dict[str, list[int]]
) -> dict[str, Floats]:
    return {
        name: np.asarray(mobility_shares(analysed.pencil, shapes, rows).max(axis=0))
        for name, rows in places.items()
    }
