"""A machine under harmonic excitation: from the question to amplitudes at any place of its axis."""

from dataclasses import dataclass, field
from math import pi
from typing import Any

import numpy as np

from schemas.faults import pointer
from schemas.response.harmonic import HarmonicExcitation, HarmonicQuestion
from service.compute.couplings import Complexes
from service.compute.harmonic import Load, Responder
from service.compute.machine import Floats
from service.compute.sparse_modes import SparsePencil
from service.tasks.dynamics import Dynamics
from service.tasks.view import ORDERS, Moving, view_of


@dataclass(frozen=True, slots=True)
class Frame:
    """Load and view at one shaft speed.

    Attributes
    ----------
    labels : (at, quantity, unit) of what is seen
    load : on all motions; pushed : the same on normal coordinates
    powers : of iω; seen : (k, o, t) per power what the normal coordinates give
    direct : what the moving bases add: power of iω, and (o,) amplitudes
    """

    labels: tuple[tuple[str, str, str], ...]
    load: Load
    pushed: Load
    powers: tuple[int, ...]
    seen: Complexes
    direct: tuple[tuple[int, Complexes], ...]

    def response(self, q: Complexes, omega: Floats) -> Complexes:
        """(o, f) what is seen of normal coordinates (f, t)."""
        iw = 1j * omega
        found = np.zeros((len(self.labels), len(omega)), dtype=complex)
        with np.errstate(invalid="ignore"):
            for power, rows in zip(self.powers, self.seen, strict=True):
                found += (rows @ q.T) * iw**power
        for power, size in self.direct:
            found += size[:, None] * iw**power
        return found


@dataclass(frozen=True)
class Steady:
    """A machine under its excitation.

    Attributes
    ----------
    order : cycles per turn where the axis is speed, else None
    at_rpm : shaft speed where the axis is frequency, else that of the reference
    highest_rpm : of the axis, where it is speed
    """

    dynamics: Dynamics
    question: HarmonicQuestion
    responder: Responder
    order: float | None
    at_rpm: float
    highest_rpm: float | None
    frames: dict[float, Frame] = field(default_factory=dict)

    def omega(self, places: Floats) -> Floats:
        """Angular frequency of excitation at places of the axis (Hz or rpm)."""
        if self.order is None:
            return 2 * pi * places
        return places * (pi / 30.0) * self.order

    def rpm(self, places: Floats) -> Floats:
        """Shaft speed at places of the axis."""
        return np.full(len(places), self.at_rpm) if self.order is None else places

    def response(self, places: Floats) -> Complexes:
        """(o, f) amplitudes of what is observed."""
        if not self._frame_changes():
            return self._response(places, self.frame(self.at_rpm))
        parts = [self._response(places[i : i + 1], self.frame(float(places[i])))
                 for i in range(len(places))]  # fmt: skip
        return np.hstack(parts)

    def _response(self, places: Floats, frame: Frame) -> Complexes:
        omega = self.omega(places)
        q = self.responder.coordinates(frame.pushed, omega, self.rpm(places))
        return frame.response(q, omega)

    def _frame_changes(self) -> bool:
        """Whether load or view, not only the machine, depend on speed: bearings at the ground."""
        varied = any(len(bearing.rpm) > 1 for bearing, _ in self.dynamics.damping.bearings)
        base = any(item.base for item in self.question.excite)
        return self.order is not None and varied and (base or bool(self.question.forces_in))

    def frame(self, rpm: float) -> Frame:
        """Load and view at one speed; all speeds share one where they don't depend on it."""
        key = rpm if self._frame_changes() else self.at_rpm
        if key not in self.frames:
            self.frames[key] = self._frame(key)
        return self.frames[key]

    def _frame(self, rpm: float) -> Frame:
        bases = self._bases(rpm)
        view = view_of(self.dynamics, self.question, bases, rpm)
        load = self._load(bases)
        B = self.dynamics.machine.B
        direct = []
        moving = [item for item in self.question.excite if item.base]
        for item, (_, _, base), own in zip(moving, bases, view.grounds, strict=True):
            moved = (own + view.rows @ base.carried) * amplitude_of_base(item)
            direct += [
                (power - base_order(item), part)
                for power, part in zip(view.powers, moved, strict=True)
                if part.any()
            ]
        return Frame(view.labels, load, load.onto(B), view.powers, view.rows @ B, tuple(direct))

    def _bases(self, rpm: float) -> list[Moving]:
        return [
            (
                item.base,
                item.about,
                self.dynamics.base(item.base, item.about, rpm, pointer(("excite", index, "base"))),
            )
            for index, item in enumerate(self.question.excite)
            if item.base is not None
        ]

    def _load(self, bases: list[Moving]) -> Load:
        """All excitations together."""
        terms: list[tuple[int, Any]] = []
        moving = iter(bases)
        for item in self.question.excite:
            if item.base is not None:
                forces = amplitude_of_base(item) * next(moving)[2].forces
                terms += [(power - base_order(item), part) for power, part in enumerate(forces)]
            else:
                terms.append(self._force(item))
        acting = [term for term in terms if term[1].any()] or terms[:1]
        return Load(tuple(power for power, _ in acting), np.array([part for _, part in acting]))

    def _force(self, item: HarmonicExcitation) -> tuple[int, Complexes]:
        """Power of iω, and amplitudes with their phase. U·ω² = −U·(iω)²."""
        vector = np.zeros(len(self.dynamics.analysed.names), dtype=complex)
        if item.unbalance is not None:
            power, size = 2, -mass_eccentricity(item, self.order, self.highest_rpm)
        else:
            power, size = 0, item.force if item.force is not None else item.moment or 0.0
        vector[self.dynamics.place[str(item.at)]] = size * _turn(item)
        return power, vector


def places_of(dynamics: Dynamics, question: HarmonicQuestion, rpm: float) -> Floats:
    """(n, p) where a large machine is excited and observed; nothing for one that isn't sparse."""
    if not isinstance(dynamics.analysed.pencil, SparsePencil):
        return np.zeros((0, 0))
    names = [item.at for item in question.excite if item.at is not None]
    rows = [dynamics.place[name] for name in dict.fromkeys([*names, *(question.observe or [])])]
    units = np.zeros((len(dynamics.analysed.names), len(rows)))
    units[rows, range(len(rows))] = 1.0
    pushes = [
        part
        for item in question.excite
        if item.base is not None
        for force in dynamics.base(item.base, item.about, rpm, "/excite").forces
        for part in (force.real, force.imag)
        if part.any()
    ]
    return np.column_stack([units, *pushes])


def mass_eccentricity(
    item: HarmonicExcitation, order: float | None, highest_rpm: float | None
) -> float:
    """Mass times eccentricity, kg·m.

    A grade G is e·Ω at the highest service speed (ISO 21940-11, from memory): U = G·m/Ω.
    """
    given = item.unbalance
    assert given is not None
    if given.mass_eccentricity is not None:
        return given.mass_eccentricity
    service = given.service_rpm or (highest_rpm or 0.0) * (order or 1.0)
    grade = (given.balance_grade_mm_s or 0.0) / 1000.0
    return grade * (given.rotor_mass or 0.0) / (service * pi / 30.0)


def _turn(item: HarmonicExcitation) -> complex:
    return complex(np.exp(1j * np.deg2rad(item.phase_deg)))


def amplitude_of_base(item: HarmonicExcitation) -> complex:
    """Amplitude of the base's motion with its phase."""
    given = (item.displacement, item.velocity, item.acceleration)
    return next((value for value in given if value is not None), 0.0) * _turn(item)


def base_order(item: HarmonicExcitation) -> int:
    """Which derivative of the base's displacement is given."""
    return next(order for name, order in ORDERS.items() if getattr(item, name) is not None)
