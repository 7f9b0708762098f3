"""A posted system made ready to respond."""

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from schemas.connections import Pendulum
from schemas.faults import Fault, Invalid
from schemas.quantities import Motion
from schemas.system import AnySystem, BodiesSystem
from service.compute import machine as m
from service.compute.assembly import Matrix
from service.compute.couplings import (
    couplings_of,
    couplings_of_matrices,
    couplings_of_sparse,
    touched_by,
)
from service.compute.damped_system import Damping
from service.compute.excitation import Base, Dissipation, base_of, base_of_matrices
from service.compute.normal_coordinates import (
    NormalCoordinates,
    diagonal_machine,
    normal_coordinates,
)
from service.compute.real_modes import Modes, Wanted, real_modes
from service.compute.reduced import REACH, reduced
from service.compute.solve import lowest_modes
from service.compute.space_machine import SpaceMachine, space_machine
from service.compute.sparse_modes import SparsePencil
from service.tasks.damping import damping_of, stiffness_of
from service.tasks.machines import Analysed, analyse
from service.tasks.translation import NUMBER_OF, machine_of

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
