"""What a motion of the ground does to a machine, and what its connections carry.

The rows of a connection deform by δ = J_q·q + J_g·u, u the motion of the ground. Where rigid ties
reach the ground, q = T·y + p·u with p a motion that satisfies them. The force on the machine is

    f = −J_qᵀ(k + ih)(J_g + J_q·p)u − J_qᵀc(J_g + J_q·p)u′ − M·p·u″.

Damping that is assumed by mode or by mass acts on the motion relative to the ground.
"""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from service.compute.assembly import Matrix
from service.compute.couplings import Complexes
from service.compute.machine import (
    GROUND,
    Bearing,
    Floats,
    Integers,
    Machine,
    Spring,
    Vector,
)
from service.compute.space_machine import SpaceMachine


@dataclass(frozen=True, slots=True)
class Base:
    """A machine on ground that moves, per unit of the ground's displacement.

    Attributes
    ----------
    forces : (3, n) force by u, u′ and u″, complex with loss factors
    carried : (n,) p, the motion that rigid ties to ground impose; 0 where there is none
    rigid : (n,) the motions of the machine moving rigidly with the ground
    """

    forces: Complexes
    carried: Floats
    rigid: Floats


@dataclass(frozen=True, slots=True)
class Dissipation:
    """Damping that isn't of the connections: C = αM + βK, and MΦ·diag(2ζω)·ΦᵀM of the modes.

    Attributes
    ----------
    pushed : (n, m) MΦ
    own : (m,) 2ζω of each mode, 1/s
    """

    alpha: float
    beta: float
    pushed: Floats
    own: Floats

    def modal(self, rate: NDArray[Any]) -> NDArray[Any]:
        """(n, …) force of the modes' damping against the velocities (n, …)."""
        across = self.pushed.T @ rate
        own = self.own if rate.ndim == 1 else self.own[:, None]
        return np.asarray(self.pushed @ (own * across))


def base_of(
    space: SpaceMachine, M: Matrix, dissipation: Dissipation, axis: int, rpm: float
) -> Base:
    """How the ground's motion in one axis acts on a machine of bodies.

    Raises
    ------
    Unsound
        Rigid ties and the ground's motion contradict each other.
    """
    rigid = space.field(axis)[space.own]
    carried = space.carried(axis)
    p = np.zeros(len(rigid)) if carried is None else carried
    J, by_ground = space.scalar_rows(axis)
    strain = by_ground + J @ p
    k, c = space.whole.k, space.whole.c + dissipation.beta * space.whole.k
    elastic = -J.T @ ((k + 1j * space.whole.h) * strain)
    viscous = -J.T @ (c * strain)
    for bearing, rows, own in space.bearing_rows(axis):
        K, C = bearing.coefficients(rpm)
        moved = own + rows @ p
        elastic = elastic - rows.T @ (K @ moved)
        viscous = viscous - rows.T @ ((C + dissipation.beta * (K + K.T) / 2) @ moved)
    lag = p - rigid
    viscous = viscous - dissipation.alpha * (M @ lag) - dissipation.modal(lag)
    return Base(np.array([elastic, viscous, -M @ p]), p, rigid)


def base_of_matrices(K: Matrix, C: Matrix, rigid: Floats) -> Base:
    """How the ground's motion acts on explicit matrices: all of one axis move with the ground.

    Parameters
    ----------
    K, C : (n, n) stiffness with loss factors, and viscous damping
    rigid : (n,) 1 for the degrees of freedom of that axis
    """
    return Base(np.array([K @ rigid, C @ rigid, 0.0 * rigid]), np.zeros(len(rigid)), rigid)


@dataclass(frozen=True, slots=True)
class Carried:
    """Force and moment that a connection exerts on one of its ends.

    Attributes
    ----------
    axes : (o,) which of the six components it can have
    rows : (2, o, n) by q and q′, complex with loss factors: N/m, N·s/m
    strain : (2, o, m) by the deformation of all rows and its rate, bearings' rows last
    """

    axes: tuple[int, ...]
    rows: Complexes
    strain: Complexes

    def by_ground(self, deformation: Floats) -> Complexes:
        """(2, o) by the ground's displacement and velocity, whose rows deform so (m,)."""
        found: Complexes = self.strain @ deformation
        return found


def deformations(space: SpaceMachine, axis: int | None) -> tuple[Floats, Floats]:
    """All rows by q (m, n), and by the ground's motion (m,), bearings' rows last."""
    J, ground = space.scalar_rows(axis)
    bearings = space.bearing_rows(axis)
    rows = np.vstack([J, *(part for _, part, _ in bearings)])
    return rows, np.concatenate([ground, *(own for _, _, own in bearings)])


def carried(space: SpaceMachine, name: str, rpm: float, beta: float) -> Carried | None:
    """What a connection carries, to ground where it reaches it, else to its second end.

    The moment is about the point where the connection attaches. None for a rigid tie.
    """
    found = _end(space.machine, name)
    if found is None:
        return None
    end, at = found
    end = space.whole.bodies - 1 if end == GROUND else end
    columns = np.flatnonzero(space.whole.owners == end)
    rows, _ = deformations(space, None)
    m = len(rows)
    strain = np.zeros((2, 6, m), dtype=complex)
    own = space.named(name)
    c = space.whole.c[own] + beta * space.whole.k[own]
    lever = _moved_to(_rows_at(space, own, columns), space.whole.places[end], at)
    strain[0][:, own] = -lever * (space.whole.k[own] + 1j * space.whole.h[own])
    strain[1][:, own] = -lever * c
    first = len(space.whole.k)
    for bearing, part in space.whole.bearings:
        place = slice(first, first + 2)
        first += 2
        if bearing.name == name:
            K, C = bearing.coefficients(rpm)
            lever = _moved_to(part[:, columns].T, space.whole.places[end], at)
            strain[0][:, place], strain[1][:, place] = -lever @ K, -lever @ C
    size = np.abs(strain).max(axis=(0, 2), initial=0.0)
    axes = np.flatnonzero(size > 1e-12 * max(float(size.max()), 1e-300))
    by_motion: Complexes = np.asarray(strain @ rows, dtype=complex)
    return Carried(tuple(axes.tolist()), by_motion[:, axes], strain[:, axes])


def _rows_at(space: SpaceMachine, rows: Integers, columns: Integers) -> Floats:
    part: Floats = space.whole.J[rows][:, columns].T
    return part


def _moved_to(lever: Floats, origin: Floats, at: Vector | None) -> Floats:
    """(6, m) forces and moments about `origin`, the moments taken about `at` instead."""
    if at is None:
        return lever
    arm = np.array(at) - origin
    moments = lever[3:] - np.cross(arm, lever[:3], axisb=0).T
    return np.vstack(
        [
            lever[:3],
            np.where(np.abs(moments) > 1e-12 * np.abs(lever).max(initial=0.0), moments, 0.0),
        ]
    )


def _end(machine: Machine, name: str) -> tuple[int, Vector | None] | None:
    """The end on which force is taken, and where; the point None where only moments act."""
    parts: tuple[Spring | Bearing, ...] = (*machine.springs, *machine.bearings)
    for part in parts:
        if part.name == name:
            return (GROUND if GROUND in part.ends else part.ends[1]), part.at
    for beam in machine.beams:
        if beam.name == name:
            return beam.ends[1], None
    for gear in machine.gears:
        if gear.name == name and gear.stiffness is not None:
            return gear.driven[0], None
    return None
