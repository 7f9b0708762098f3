"""Coordinates in which mass and stiffness are both diagonal, and what couples them.

The undamped modes diagonalize M and K; the motions without inertia, made K-orthogonal among
themselves, complete them: every motion that the ties leave is q = Bη with

    BᵀMB = diag(1 or 0),   BᵀKB = diag(ω² or ±1).

Damping of a mode's own (a damping ratio, αM + βK) is diagonal there. All else that acts, dampers,
loss factors, bearings, gyroscopic terms, is kept as deformation rows R (p, n) with a small (p, p)
matrix between them, so that what a few dampers do stays of low rank.
"""

from dataclasses import dataclass, replace
from typing import Any, TypeAlias

import numpy as np
from numpy.typing import NDArray

from service.compute.assembly import Matrix
from service.compute.damped_system import Damping
from service.compute.machine import Bearing, Floats, Integers
from service.compute.pencil import EPS, Pencil
from service.compute.real_modes import Modes

Complexes: TypeAlias = NDArray[np.complexfloating[Any, Any]]
DIAGONAL_WITHIN = 1e-13  # of the diagonal: cross terms below this are roundoff
WORTH_COMPRESSING = 8  # motions
UNTOUCHED = 1e-11  # of a row's length: a rigid-body motion with less doesn't deform it


@dataclass(frozen=True, slots=True)
class Couplings:
    """What acts besides the diagonal terms, through p deformation rows.

    Attributes
    ----------
    rows : (p, t) deformation per unit of normal coordinate
    viscous : (p, p) damping, N·s/m
    gyroscopic : (p, p) per rad/s of shaft speed, kg
    structural : (p, p) imaginary part of stiffness, N/m
    bearings : bearings, each with the place of its two rows and its reference stiffness (2, 2)
    beta : C = βK of what the bearings' stiffness differs from the reference, s
    """

    rows: Floats
    viscous: Floats
    gyroscopic: Floats
    structural: Floats
    bearings: tuple[tuple[Bearing, slice, Floats], ...] = ()
    beta: float = 0.0

    def at(self, omega: Floats, rpm: Floats) -> Complexes:
        """(f, p, p) stiffness-like terms at angular frequencies (f,) and shaft speeds (f,)."""
        w = omega[:, None, None]
        spin = (rpm * np.pi / 30.0)[:, None, None]
        terms: Complexes = 1j * w * (self.viscous + spin * self.gyroscopic) + 1j * self.structural
        for bearing, place, reference in self.bearings:
            speeds, which = np.unique(rpm, return_inverse=True)
            sets = [bearing.coefficients(float(speed)) for speed in speeds]
            extra = np.array([K - reference for K, _ in sets])[which]
            damping = np.array([C for _, C in sets])[which]
            symmetric = (extra + extra.transpose(0, 2, 1)) / 2
            terms[:, place, place] += extra + 1j * w * (damping + self.beta * symmetric)
        return terms

    def fixed(self, rpm: float) -> tuple[Floats, Floats]:
        """(p, p) stiffness and damping at one shaft speed; loss factors apart."""
        stiffness = np.zeros_like(self.viscous)
        damping = self.viscous + (rpm * np.pi / 30.0) * self.gyroscopic
        for bearing, place, reference in self.bearings:
            K, C = bearing.coefficients(rpm)
            extra = K - reference
            stiffness[place, place] += extra
            damping[place, place] += C + self.beta * (extra + extra.T) / 2
        return stiffness, damping


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


def couplings_of(damping: Damping, rows: Floats, c: Floats, h: Floats, rpm: float) -> Couplings:
    """Couplings of an assembled machine whose stiffness is known at `rpm`.

    Parameters
    ----------
    rows : (m, n) deformation rows of all scalar springs
    c, h : (m,) viscous damping and imaginary part of the stiffness of each
    """
    acting = (c != 0.0) | (h != 0.0)
    blocks: list[Any] = [(rows[acting], np.diag(c[acting]), np.diag(h[acting]), None)]
    blocks += [(part, np.zeros((2, 2)), np.zeros((2, 2)), b) for b, part in damping.bearings]
    return _stacked(blocks, low_rank(damping.G), damping, rpm)


def couplings_of_matrices(damping: Damping) -> Couplings:
    """Couplings of explicit damping, gyroscopic and structural matrices."""
    blocks: list[Any] = []
    for field in ("C", "H"):
        rows, core = low_rank(getattr(damping, field))
        none = np.zeros_like(core)
        blocks.append((rows, *((core, none) if field == "C" else (none, core)), None))
    return _stacked(blocks, low_rank(damping.G), damping, 0.0)


def couplings_of_sparse(damping: Damping, B: Floats, rpm: float) -> Couplings:
    """Couplings on the coordinates of B (n, t) of a machine whose matrices are sparse."""
    blocks: list[Any] = []
    for field in ("C", "H"):
        rows, core = _seen(getattr(damping, field), B)
        none = np.zeros_like(core)
        blocks.append((rows, *((core, none) if field == "C" else (none, core)), None))
    none = np.zeros((2, 2))
    blocks += [(part @ B, none, none, bearing) for bearing, part in damping.bearings]
    return _stacked(blocks, _seen(damping.G, B), damping, rpm)


def touched_by(A: Matrix) -> Integers:
    """The motions that a sparse matrix has entries for."""
    places = A.tocoo()
    return np.unique(np.concatenate([places.row, places.col])[np.tile(places.data, 2) != 0.0])


def _seen(A: Matrix, B: Floats) -> tuple[Floats, Floats]:
    """A sparse matrix through the few motions that it touches, or through all coordinates."""
    touched = touched_by(A)
    if len(touched) <= B.shape[1] // 2:
        return B[touched], A.tocsr()[touched][:, touched].toarray()
    return np.eye(B.shape[1]), B.T @ (A @ B)


def _stacked(
    blocks: list[Any], gyroscopic_part: tuple[Floats, Floats], damping: Damping, rpm: float
) -> Couplings:
    turned, momentum = gyroscopic_part
    sizes = [len(block[0]) for block in blocks]
    firsts = np.cumsum([0, *sizes])
    p = int(firsts[-1]) + len(turned)
    viscous, structural, gyroscopic = (np.zeros((p, p)) for _ in range(3))
    bearings = []
    for first, (rows, C, H, bearing) in zip(firsts.tolist(), blocks, strict=False):
        place = slice(first, first + len(rows))
        viscous[place, place], structural[place, place] = C, H
        if bearing is not None:
            K, _ = bearing.coefficients(rpm)
            bearings.append((bearing, place, (K + K.T) / 2))
    gyroscopic[firsts[-1] :, firsts[-1] :] = momentum
    rows = np.vstack([*(block[0] for block in blocks), turned])
    return Couplings(rows, viscous, gyroscopic, structural, tuple(bearings), damping.beta)


def low_rank(A: Floats) -> tuple[Floats, Floats]:
    """Rows R (p, n) and core (p, p) with A = Rᵀ·core·R.

    Motions that A doesn't touch fall away; what is left is compressed where A has a low rank, by
    its eigenvalues where it is symmetric, else by its singular values.
    """
    touched = np.flatnonzero(A.any(axis=0) | A.any(axis=1))
    core = A[np.ix_(touched, touched)]
    rows = np.eye(len(A))[touched]
    if len(core) < WORTH_COMPRESSING:
        return rows, core
    if (np.abs(core - core.T) > 8 * EPS * np.abs(core)).any():
        return _compressed(core, rows)
    core = (core + core.T) / 2
    scale = np.sqrt(np.abs(core.diagonal()))
    scale = np.where(scale > 0.0, scale, 1.0)
    values, vectors = np.linalg.eigh(core / scale[:, None] / scale)
    real = np.abs(values) > 4 * len(core) * EPS * np.abs(values).max()
    if np.count_nonzero(real) > len(core) // 2:
        return rows, core
    spread = (vectors[:, real] * scale[:, None]).T
    return spread @ rows, np.diag(values[real])


def _compressed(core: Floats, rows: Floats) -> tuple[Floats, Floats]:
    """U·Σ·Vᵀ with the rows Uᵀ and Vᵀ, where that is less than half of full size."""
    left, sizes, right = np.linalg.svd(core)
    real = sizes > 4 * len(core) * EPS * sizes[0]
    rank = int(np.count_nonzero(real))
    if 4 * rank > len(core):
        return rows, core
    small = np.zeros((2 * rank, 2 * rank))
    small[:rank, rank:] = np.diag(sizes[real])
    return np.vstack([left[:, real].T, right[real]]) @ rows, small
