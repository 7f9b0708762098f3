"""Normal coordinates of a large sparse machine: its lowest modes, and static correction.

Beyond the modes, the machine's flexibility at the places of load, of observation and of dampers is
kept by the vectors A⁻¹P, A⁻¹MA⁻¹P, … (A = K − σM, modes taken out; P the places). A Rayleigh–Ritz
projection on both matches twice as many terms of the response's series in frequency as there are
blocks of such vectors (static correction and its higher terms; Krylov reduction, Su and Craig 1991,
from memory), and is again a machine with diagonal mass and stiffness.
"""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csc_array

from service.compute.machine import Floats
from service.compute.real_modes import Modes
from service.compute.sparse_factor import factor
from service.compute.sparse_modes import SparsePencil

REACH = 1.5  # modes are taken up to this times the highest frequency
BLOCKS = 6  # of correction vectors per place
BELOW = 1e-3  # of the square of the highest frequency: how far σ lies below zero
INDEPENDENT = 1e-11  # of the largest: a direction with less is a combination of others
WITHOUT_MASS = 1e-13  # of the largest M-norm in the A-norm: a motion with less has none


@dataclass(frozen=True, slots=True)
class Reduced:
    """t coordinates of a machine of n.

    Attributes
    ----------
    B : (n, t) motions per unit of coordinate, the modes first
    mass : (t,) 1, or 0 for a motion without inertia
    stiffness : (t,) rad²/s², or 1 for a motion without inertia
    rigid : (t,) whether it is a rigid-body motion
    """

    B: Floats
    mass: Floats
    stiffness: Floats
    rigid: NDArray[np.bool_]


def reduced(pencil: SparsePencil, modes: Modes, places: Floats, top: float) -> Reduced:
    """Modes and correction vectors for `places` (n, p), good up to `top` (rad/s)."""
    shift = -BELOW * top**2
    space = _correction(pencil, modes, places, shift)
    B, mass, stiffness = _diagonalized(pencil, space, shift)
    number = len(modes.values)
    return Reduced(
        np.hstack([modes.shapes, B]),
        np.concatenate([np.ones(number), mass]),
        np.concatenate([np.where(modes.rigid, 0.0, modes.values), stiffness]),
        np.concatenate([modes.rigid, np.zeros(len(mass), dtype=bool)]),
    )


def _correction(pencil: SparsePencil, modes: Modes, places: Floats, shift: float) -> Floats:
    """Blocks of A⁻¹P, A⁻¹MA⁻¹P, … with the modes taken out, columns of one size."""
    A = factor(csc_array(pencil.K - shift * pencil.M))
    moved = pencil.M @ modes.shapes
    blocks, pushed = [], places
    for _ in range(BLOCKS):
        x = A.solve(np.ascontiguousarray(pushed))
        for _ in range(2):
            x = x - modes.shapes @ (moved.T @ x)
        x = _independent(x)
        blocks.append(x)
        pushed = pencil.M @ x
    return np.hstack(blocks)


def _independent(x: Floats) -> Floats:
    """An orthonormal basis of the columns."""
    size: Floats = np.linalg.norm(x, axis=0)
    left, sizes, _ = np.linalg.svd(x[:, size > 0.0] / size[size > 0.0], full_matrices=False)
    basis: Floats = left[:, sizes > INDEPENDENT * sizes.max(initial=0.0)]
    return basis


def _diagonalized(
    pencil: SparsePencil, space: Floats, shift: float
) -> tuple[Floats, Floats, Floats]:
    """Directions of a space in which M and K are diagonal, those without mass last."""
    gram: Any = space.T @ (pencil.K @ space) - shift * (space.T @ (pencil.M @ space))
    scale = 1.0 / np.sqrt(gram.diagonal())
    values, vectors = np.linalg.eigh(gram * scale[:, None] * scale)
    good = values > INDEPENDENT * values.max(initial=0.0)
    basis = space @ (scale[:, None] * vectors[:, good] / np.sqrt(values[good]))
    masses, turn = np.linalg.eigh(basis.T @ (pencil.M @ basis))
    masses, turn = masses[::-1], turn[:, ::-1]
    heavy = masses > WITHOUT_MASS * masses.max(initial=0.0)
    size = np.where(heavy, np.sqrt(np.where(heavy, masses, 1.0)), 1.0)
    stiffness = np.where(heavy, 1.0 / np.where(heavy, masses, 1.0) + shift, 1.0)
    return basis @ turn / size, heavy.astype(float), stiffness
