"""A posted system made ready to respond, and where one looks at it."""

from dataclasses import dataclass, replace
from functools import cached_property
from math import pi
from typing import Any

import numpy as np

from schemas.connections import Pendulum
from schemas.faults import Fault, Invalid, pointer
from schemas.quantities import Motion
from schemas.system import AnySystem, BodiesSystem
from service.compute import machine as m
from service.compute.assembly import Matrix
from service.compute.damped_system import Damping
from service.compute.excitation import (
    Base,
    Carried,
    Dissipation,
    base_of,
    base_of_matrices,
    carried,
    deformations,
)
from service.compute.normal_coordinates import (
    Complexes,
    NormalCoordinates,
    couplings_of,
    couplings_of_matrices,
    couplings_of_sparse,
    diagonal_machine,
    normal_coordinates,
    touched_by,
)
from service.compute.real_modes import Modes, Wanted, real_modes
from service.compute.reduced import REACH, reduced
from service.compute.solve import lowest_modes
from service.compute.space_machine import SpaceMachine, space_machine
from service.compute.sparse_modes import SparsePencil
from service.tasks.damping import damping_of, stiffness_of
from service.tasks.machines import Analysed, analyse
from service.tasks.translation import NUMBER_OF, machine_of

UNITS = {"displacement": ("m", "rad"), "velocity": ("m/s", "rad/s"),
         "acceleration": ("m/s²", "rad/s²")}  # fmt: skip
ORDERS = {"displacement": 0, "velocity": 1, "acceleration": 2}
ALL_UP_TO = 50
FEW = 60  # motions that dampers touch: so many get correction vectors of their own
ORIGIN = (0.0, 0.0, 0.0)


@dataclass(frozen=True)
class Dynamics:
    """A system in its normal coordinates.

    Attributes
    ----------
    rpm : shaft speed of the reference stiffness
    K : (n, n) symmetric stiffness at that speed
    modes : all undamped modes at that speed
    machine : the normal coordinates
    """

    system: AnySystem
    analysed: Analysed
    damping: Damping
    rpm: float
    K: Matrix
    modes: Modes
    machine: NormalCoordinates

    @cached_property
    def place(self) -> dict[str, int]:
        """Row of each degree of freedom."""
        return {name: row for row, name in enumerate(self.analysed.names)}

    @cached_property
    def dissipation(self) -> Dissipation:
        """What damps besides connections and matrices."""
        shapes = self.machine.B[:, : len(self.modes.values)]
        pushed = self.analysed.M @ shapes
        own = 2 * self.damping.ratio * np.sqrt(np.maximum(self.modes.values, 0.0))
        return Dissipation(self.damping.alpha, self.damping.beta, pushed, own)

    def viscous(self, rpm: float) -> Matrix:
        """(n, n) all viscous and gyroscopic terms but a damping ratio of the modes."""
        K = stiffness_of(self.system, self.analysed, rpm)
        d = self.damping
        return d.viscous(rpm) + d.alpha * self.analysed.M + d.beta * K

    def elastic(self, rpm: float) -> Matrix:
        """(n, n) stiffness with cross-coupling and loss factors."""
        K = stiffness_of(self.system, self.analysed, rpm)
        return K + self.damping.circulatory(rpm) + 1j * self.damping.H

    def space(self, about: m.Vector = ORIGIN) -> SpaceMachine:
        """The machine with its ground, for a system of bodies."""
        assert isinstance(self.system, BodiesSystem)
        levers = {
            part.name: part.length for part in self.system.connections if isinstance(part, Pendulum)
        }
        return space_machine(machine_of(self.system), self.analysed.names, levers, about)

    def base(self, motion: Motion, about: list[float] | None, rpm: float, at: str) -> Base:
        """How a motion of the base acts.

        Raises
        ------
        Invalid
            It can't; the pointer is `at`.
        """
        axis = NUMBER_OF[motion]
        if not isinstance(self.system, BodiesSystem):
            rigid = (self.analysed.axes == axis).astype(float)
            if not rigid.any():
                raise Invalid([Fault(at, f"no degree of freedom moves in {motion}")])
            found = base_of_matrices(self.elastic(0.0), self.damping.viscous(0.0), rigid)
            found.forces[1] += self.dissipation.modal(rigid)
            return found
        x, y, z = about or ORIGIN
        try:
            return base_of(self.space((x, y, z)), self.analysed.M, self.dissipation, axis, rpm)
        except m.Unsound as fault:
            raise Invalid([Fault(at, f"{fault.part[-1]}: {fault.detail}")]) from None


def dynamics_of(system: AnySystem, rpm: float, top: float | None = None) -> Dynamics:
    """The undamped modes of a system at one speed, and what damps and couples them.

    All modes of a dense system; of a sparse one those that matter up to `top` (rad/s).

    Raises
    ------
    Invalid
        The system can't be computed; pointers start at the question.
    """
    try:
        analysed = analyse(system, rpm)
        if isinstance(analysed.pencil, SparsePencil):
            return _of_sparse(system, analysed, rpm, top)
        damping = damping_of(system, analysed)
    except Invalid as fault:
        raise fault.under("/system") from None
    K = stiffness_of(system, analysed, rpm)
    modes = real_modes(analysed.pencil, Wanted(count=analysed.pencil.size))
    if analysed.assembly is None:
        couplings = couplings_of_matrices(damping)
    else:
        part = analysed.assembly
        couplings = couplings_of(damping, part.J, part.c, part.h, rpm)
    machine = normal_coordinates(analysed.pencil, modes, damping, couplings, K)
    return Dynamics(system, analysed, damping, rpm, K, modes, machine)


def _of_sparse(system: AnySystem, analysed: Analysed, rpm: float, top: float | None) -> Dynamics:
    """The lowest modes alone; `corrected` adds what the others do."""
    pencil = analysed.pencil
    assert isinstance(pencil, SparsePencil)
    place = "/bodies" if isinstance(system, BodiesSystem) else "/degrees_of_freedom"
    if top is None:
        size = len(analysed.names)
        raise Invalid([Fault(place, f"{size} degrees of freedom are too many to follow in time")])
    try:
        modes = lowest_modes(pencil, Wanted(limit=(REACH * top) ** 2))
    except m.Unsound as fault:
        raise Invalid([Fault(place, fault.detail)]) from None
    damping, K = damping_of(system, analysed), stiffness_of(system, analysed, rpm)
    B, number = pencil.full(modes.shapes), len(modes.values)
    values = np.where(modes.rigid, 0.0, modes.values)
    parts = (B, np.ones(number), values, modes.rigid)
    machine = diagonal_machine(parts, number, damping, couplings_of_sparse(damping, B, rpm))
    return Dynamics(system, analysed, damping, rpm, K, modes, machine)


def corrected(dynamics: Dynamics, places: m.Floats, top: float) -> Dynamics:
    """A sparse machine with the flexibility of all modes at `places` (n, p) and its dampers."""
    pencil, damping = dynamics.analysed.pencil, dynamics.damping
    if not isinstance(pencil, SparsePencil):
        return dynamics
    touched = [touched_by(A) for A in (damping.C, damping.H, damping.G)]
    few = np.unique(np.concatenate([own for own in touched if len(own) <= FEW]).astype(int))
    dampers = np.zeros((len(dynamics.analysed.names), len(few)))
    dampers[few, range(len(few))] = 1.0
    bearings = [np.asarray(part.T.todense()) for _, part in damping.bearings]
    every = np.hstack([places, dampers, *bearings])
    if pencil.R is not None:
        every = pencil.R.T @ every
    found = reduced(pencil, dynamics.modes, every, top)
    B = pencil.full(found.B)
    couplings = couplings_of_sparse(damping, B, dynamics.rpm)
    parts = (B, found.mass, found.stiffness, found.rigid)
    machine = diagonal_machine(parts, len(dynamics.modes.values), damping, couplings)
    return replace(dynamics, machine=machine)


@dataclass(frozen=True, slots=True)
class View:
    """What is looked at: Σ over powers of d/dt of rows·q, and of the bases' own motion.

    Attributes
    ----------
    labels : (at, quantity, unit) of each
    powers : of d/dt (or of iω)
    rows : (k, o, n) per power
    grounds : per moving base (k, o)
    """

    labels: tuple[tuple[str, str, str], ...]
    powers: tuple[int, ...]
    rows: Complexes
    grounds: tuple[Complexes, ...]


Moving = tuple[Motion, list[float] | None, Base]


def view_of(dynamics: Dynamics, question: Any, bases: list[Moving], rpm: float) -> View:
    """The observed degrees of freedom and the forces carried.

    Raises
    ------
    Invalid
        A name that the system doesn't have, or a connection whose force can't be told.
    """
    faults: list[Fault] = []
    views = [_motions(dynamics, question, bases, faults)]
    if question.forces_in:
        views += _forces(dynamics, question.forces_in, bases, rpm, faults)
    if faults:
        raise Invalid(faults)
    return _joined(views)


def _motions(dynamics: Dynamics, question: Any, bases: list[Moving], faults: list[Fault]) -> View:
    names = list(dynamics.analysed.names)
    wanted = question.observe
    if wanted is None:
        wanted = [] if question.forces_in else names
        if len(wanted) > ALL_UP_TO:
            faults.append(Fault("/observe", f"say which of {len(names)} degrees of freedom"))
            wanted = []
    places = []
    for index, name in enumerate(wanted):
        if name in dynamics.place:
            places.append(dynamics.place[name])
        else:
            faults.append(Fault(pointer(("observe", index)), unknown(dynamics, name)))
    rows = np.zeros((1, len(places), len(names)), dtype=complex)
    rows[0, range(len(places)), places] = 1.0
    grounds = [
        -base.rigid[places][None] if question.relative_to_base else np.zeros((1, len(places)))
        for _, _, base in bases
    ]
    units = UNITS[question.quantity]
    labels = tuple(
        (names[row], question.quantity, units[int(dynamics.analysed.axes[row] >= 3)])
        for row in places
    )
    power = ORDERS[question.quantity]
    return View(labels, (power,), rows, tuple(ground.astype(complex) for ground in grounds))


def unknown(dynamics: Dynamics, name: str) -> str:
    """Why there is no such degree of freedom."""
    body = name.rpartition("/")[0]
    if isinstance(dynamics.system, BodiesSystem):
        found = [item for item in dynamics.system.bodies if item.name == body]
        if found and name.rpartition("/")[2] in found[0].held:
            return f"'{name}' is held, so it doesn't move"
        if found:
            return f"'{body}' has no motion '{name.rpartition('/')[2]}'"
    return f"there is no degree of freedom '{name}'"


def _forces(
    dynamics: Dynamics, names: list[str], bases: list[Moving], rpm: float, faults: list[Fault]
) -> list[View]:
    if not isinstance(dynamics.system, BodiesSystem):
        faults.append(Fault("/forces_in", "a system of matrices has no connections"))
        return []
    if isinstance(dynamics.analysed.pencil, SparsePencil):
        faults.append(Fault("/forces_in", "forces carried aren't computed for so large a system"))
        return []
    space = dynamics.space()
    moved = [
        deformations(dynamics.space(_vector(about)), NUMBER_OF[motion])[1]
        for motion, about, _ in bases
    ]
    views = []
    for index, name in enumerate(names):
        place = pointer(("forces_in", index))
        if name not in space.whole.connection_names:
            faults.append(Fault(place, f"there is no connection '{name}'"))
            continue
        part = carried(space, name, rpm, dynamics.damping.beta)
        if part is None:
            faults.append(Fault(place, "the force in a rigid tie isn't computed: give it a "
                                       "stiffness, or ask for what is beside it"))  # fmt: skip
            continue
        views.append(_force_view(name, part, moved))
    return views


def _vector(about: list[float] | None) -> m.Vector:
    x, y, z = about or ORIGIN
    return (x, y, z)


def _force_view(name: str, part: Carried, moved: list[m.Floats]) -> View:
    labels = tuple(
        (f"{name}/{m.AXES[axis]}", *(("force", "N") if axis < 3 else ("moment", "N·m")))
        for axis in part.axes
    )
    return View(labels, (0, 1), part.rows, tuple(part.by_ground(own) for own in moved))


def _joined(views: list[View]) -> View:
    """One view of all, with the powers that any of them has."""
    powers = tuple(sorted({power for view in views for power in view.powers}))
    return View(
        tuple(label for view in views for label in view.labels),
        powers,
        np.concatenate([_spread(view.powers, view.rows, powers) for view in views], axis=1),
        tuple(
            np.concatenate(
                [_spread(view.powers, view.grounds[base], powers) for view in views], axis=1
            )
            for base in range(len(views[0].grounds))
        ),
    )


def _spread(own: tuple[int, ...], parts: Complexes, powers: tuple[int, ...]) -> Complexes:
    found = np.zeros((len(powers), *parts.shape[1:]), dtype=complex)
    for power, part in zip(own, parts, strict=True):
        found[powers.index(power)] = part
    return found


def speed_of(rpm: float) -> float:
    """rad/s of a speed in rpm."""
    return rpm * pi / 30.0
