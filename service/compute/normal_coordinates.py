"""Coordinates in which mass and stiffness are both diagonal, and what couples them.

The undamped modes diagonalize M and K; the motions without inertia, made K-orthogonal among
themselves, complete them: every motion that the ties leave is q = Bη with

    BᵀMB = diag(1 or 0),   BᵀKB = diag(ω² or ±1).

Damping of a mode's own (a damping ratio, αM + βK) is diagonal there. All else that acts, dampers,
loss factors, bearings, gyroscopic terms, is kept as deformation rows R (p, n) with a small (p, p)
matrix between them, so that what a few dampers do stays of low rank.
"""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from service.compute.couplings import Complexes, Couplings
from service.compute.damped_system import Damping
from service.compute.machine import Floats
from service.compute.pencil import Pencil
from service.compute.real_modes import Modes

DIAGONAL_WITHIN = 1e-13  # of the diagonal: cross terms below this are roundoff
UNTOUCHED = 1e-11  # of a row's length: a rigid-body motion with less doesn't deform it


@dataclass(frozen=True, slots=True)
class NormalCoordinates:
    """A machine in t normal coordinates: r modes, then its motions without inertia.

    Attributes
    ----------
    B : (n, t) all motions per unit of coordinate; modes mass-normalized, 1/√kg
    mass : (t,) 1 for a mode, 0 for a motion without inertia
    stiffness : (t,) ω² of a mode (rad²/s²), ±1 of a motion without inertia
    damping : (t,) each one's own viscous damping, 1/s
    structural : (t,) each one's own imaginary part of the stiffness
    rigid : (t,) whether it is a rigid-body motion
    couplings : what acts between them
    """

    B: Floats
    mass: Floats
    stiffness: Floats
    damping: Floats
    structural: Floats
    rigid: NDArray[np.bool_]
    couplings: Couplings

    @property
    def modes(self) -> int:
        """How many of the coordinates are modes."""
        return int(np.count_nonzero(self.mass))

    @property
    def damped(self) -> bool:
        """Whether anything takes energy out or puts it in."""
        own = self.damping.any() or self.structural.any()
        return bool(own or len(self.couplings.rows))

    def diagonal(self, omega: Floats) -> Complexes:
        """(f, t) diagonal of the dynamic stiffness at angular frequencies (f,)."""
        w = omega[:, None]
        elastic: Complexes = (
            self.stiffness - w**2 * self.mass + 1j * (w * self.damping + self.structural)
        )
        return elastic


def normal_coordinates(
    pencil: Pencil, modes: Modes, damping: Damping, couplings: Couplings, K: Floats
) -> NormalCoordinates:
    """Normal coordinates of a machine of which all modes are known.

    Parameters
    ----------
    couplings : what acts besides M and K, its rows in all n motions
    K : (n, n) symmetric stiffness in all motions, as it is in the pencil
    """
    shapes = pencil.full(modes.shapes)
    still, signs = _without_inertia(pencil, K)
    values = np.concatenate([np.where(modes.rigid, 0.0, modes.values), signs])
    number = len(modes.values)
    mass = np.concatenate([np.ones(number), np.zeros(len(signs))])
    rigid = np.concatenate([modes.rigid, np.zeros(len(signs), dtype=bool)])
    B = np.hstack([shapes, still])
    turned = replace(couplings, rows=couplings.rows @ B)
    return diagonal_machine((B, mass, values, rigid), number, damping, turned)


def diagonal_machine(
    parts: tuple[Floats, Floats, Floats, NDArray[np.bool_]],
    modes: int,
    damping: Damping,
    couplings: Couplings,
) -> NormalCoordinates:
    """A machine whose mass and stiffness are diagonal already.

    Parameters
    ----------
    parts : B, mass, stiffness and rigid of `NormalCoordinates`
    modes : how many of the coordinates, the first ones, the damping ratio is meant for
    couplings : their rows on the normal coordinates
    """
    B, mass, stiffness, rigid = parts
    own = damping.alpha * mass + damping.beta * stiffness
    own[:modes] += 2 * damping.ratio * np.sqrt(np.maximum(stiffness[:modes], 0.0))
    none = np.zeros(len(mass))
    found = NormalCoordinates(B, mass, stiffness, own, none, rigid, couplings)
    return _uncoupled(_untouched_apart(found))


def _untouched_apart(found: NormalCoordinates) -> NormalCoordinates:
    """Rigid-body motions turned so that those which no coupling touches stand alone.

    Such a motion has a double root 0, which must not get lost among the others.
    """
    rigid = np.flatnonzero(found.rigid)
    rows = found.couplings.rows
    if not len(rigid) or not len(rows):
        return found
    size = np.linalg.norm(rows, axis=1)
    touched = rows[:, rigid] / np.where(size > 0.0, size, 1.0)[:, None]
    _, values, turn = np.linalg.svd(touched, full_matrices=True)
    rank = int(np.count_nonzero(values > UNTOUCHED))
    B, turned = found.B.copy(), rows.copy()
    B[:, rigid] = B[:, rigid] @ turn.T
    turned[:, rigid] = turned[:, rigid] @ turn.T
    turned[:, rigid[rank:]] = 0.0
    return replace(found, B=B, couplings=replace(found.couplings, rows=turned))


def _without_inertia(pencil: Pencil, K: Floats) -> tuple[Floats, Floats]:
    """(n, z) motions without inertia scaled so that their stiffness is ±1, and those signs."""
    if pencil.empty is None:
        return np.zeros((len(K), 0)), np.zeros(0)
    P = pencil.tied(pencil.empty)
    K00 = P.T @ K @ P
    size = np.abs(K00.diagonal())
    scale = 1.0 / np.sqrt(np.where(size > 0.0, size, 1.0))
    values, vectors = np.linalg.eigh(K00 * scale[:, None] * scale)
    return P @ (scale[:, None] * vectors / np.sqrt(np.abs(values))), np.sign(values)


def _uncoupled(found: NormalCoordinates) -> NormalCoordinates:
    """Damping that turns out diagonal (Caughey 1960) becomes each coordinate's own."""
    c = found.couplings
    if not len(c.rows) or c.bearings or c.gyroscopic.any():
        return found
    viscous = c.rows.T @ c.viscous @ c.rows
    structural = c.rows.T @ c.structural @ c.rows
    if not (_is_diagonal(viscous) and _is_diagonal(structural)):
        return found
    none = np.zeros((0, 0))
    return replace(
        found,
        damping=found.damping + viscous.diagonal(),
        structural=found.structural + structural.diagonal(),
        couplings=Couplings(c.rows[:0], none, none, none),
    )


def _is_diagonal(A: Floats) -> bool:
    size = np.abs(A)
    own = np.sqrt(np.diag(size))
    np.fill_diagonal(size, 0.0)
    return bool((size <= DIAGONAL_WITHIN * np.outer(own, own)).all())
