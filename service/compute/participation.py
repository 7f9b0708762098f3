"""What takes part in a mode: mass per direction, energy per part, mobility per place."""

from dataclasses import dataclass

import numpy as np

from service.compute.assembly import Assembly, Entries, Matrix
from service.compute.machine import Floats, Integers, Shapes
from service.compute.solve import AnyPencil


@dataclass(frozen=True, slots=True)
class Direction:
    """Effective masses in one direction of motion of the supports.

    Attributes
    ----------
    axis : 0 to 5
    total : moving mass (kg) or moment of inertia (kg·m²) in that direction
    effective : of each mode; over all modes they add up to `total`
    """

    axis: int
    total: float
    effective: list[float]


def effective_masses(
    M: Matrix, pencil: AnyPencil, shapes: Shapes, directions: tuple[list[int], Floats]
) -> list[Direction]:
    """Γ² of each mode, Γ = φᵀMr, r the rigid-body motion of all supports in one direction.

    Parameters
    ----------
    M : (n, n) mass matrix of all motions
    shapes : (n, m) mass-normalized shapes in all motions
    directions : the d axes and their motions r, (n, d)

    Notes
    -----
    Clough and Penzien, Dynamics of Structures, on effective modal mass (from memory). The total is
    taken over the motions that the ties leave: (RᵀMr)ᵀ(RᵀMR)⁻¹(RᵀMr), which is rᵀMr where
    nothing is tied.
    """
    axes, motions = directions
    pushed = M @ motions
    reduced = pushed if pencil.R is None else pencil.R.T @ pushed
    totals = pencil.mass_norms(reduced).tolist()
    effective = (np.abs(shapes.T @ pushed) ** 2).T.tolist()
    return [
        Direction(axis, total, part)
        for axis, total, part in zip(axes, totals, effective, strict=True)
        if total > 0.0
    ]


def support_motions(assembly: Assembly) -> tuple[list[int], Floats]:
    """The rigid-body motion of all bodies in each direction that some body can move in.

    Rotations are about the centre of mass of the whole: about axis a a point moves by e_a × arm.
    Returns the d axes and an (n, d) array.
    """
    axes = sorted(set(assembly.axes.tolist()))
    motions = (assembly.axes[:, None] == axes).astype(float)
    if axes[-1] < 3:
        return axes, motions
    arms = (assembly.places - centre_of_mass(assembly, motions[:, 0]))[assembly.owners]
    for column, axis in enumerate(axes):
        if axis >= 3:
            ahead, behind = (axis - 2) % 3, (axis - 1) % 3
            for moving, arm, sign in ((ahead, behind, -1.0), (behind, ahead, 1.0)):
                if moving in axes:
                    motions[:, column] += sign * motions[:, axes.index(moving)] * arms[:, arm]
    return axes, motions


def centre_of_mass(assembly: Assembly, along: Floats) -> Floats:
    """(3,) centre in m of what moves, weighed by the (n,) translation `along` one axis."""
    weight = (assembly.M @ along) * along
    total = float(weight.sum())
    if assembly.axes.min() >= 3 or total <= 0.0:
        return np.asarray(assembly.places.mean(axis=0))
    return np.asarray(weight @ assembly.places[assembly.owners] / total)


def strain_shares(assembly: Assembly, shapes: Shapes, rpm: float = 0.0) -> Floats:
    """(connections, m) share of each connection in the strain energy of the (n, m) shapes."""
    energy = assembly.k[:, None] * np.abs(assembly.J @ shapes) ** 2
    owners = assembly.springs_of
    for bearing, rows in assembly.bearings:
        stiffness, _ = bearing.coefficients(rpm)
        moved = rows @ shapes
        energy = np.vstack([energy, (moved.conj() * (stiffness @ moved)).sum(axis=0).real])
        owners = np.append(owners, assembly.connection_names.index(bearing.name))
    return _shares(energy, owners, len(assembly.connection_names))


def kinetic_shares(masses: Entries, carriers: int, shapes: Shapes) -> Floats:
    """(carriers, m) share of each part that has mass in the kinetic energy of the (n, m) shapes."""
    energy = masses.value[:, None] * (shapes[masses.row].conj() * shapes[masses.column]).real
    return _shares(energy, masses.owner, carriers)


def _shares(energy: Floats, owners: Integers, parts: int) -> Floats:
    """Sums over the parts, over the sum of their sizes; 0 where there is no energy."""
    sums = np.zeros((parts, energy.shape[1]))
    np.add.at(sums, owners, energy)
    total = np.abs(sums).sum(axis=0)
    return sums / np.where(total > 0.0, total, 1.0)


def mobility_shares(pencil: AnyPencil, shapes: Shapes, places: list[int]) -> Floats:
    """(places, m) share of each mode in the driving-point mobility at motions of the machine.

    Over all modes Σφᵢ² = (RM⁻¹Rᵀ)ᵢᵢ, so φᵢ² over that lies between 0 and 1 and has no unit.

    Parameters
    ----------
    shapes : (n, m) mass-normalized shapes in all motions
    places : motions of the machine, 0 to n − 1
    """
    chosen = np.zeros((len(places), len(shapes)))
    chosen[range(len(places)), places] = 1.0
    R = chosen if pencil.R is None else chosen @ pencil.R
    total = pencil.mass_norms(R.T)[:, None]
    return np.where(total > 0.0, shapes[places] ** 2 / np.where(total > 0.0, total, 1.0), 0.0)
