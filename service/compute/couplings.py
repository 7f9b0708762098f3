"""What couples the motions of a machine besides mass and stiffness.

Dampers, loss factors, bearings and gyroscopic terms are deformation rows with a small matrix
between them, so that what a few of them do stays of low rank.
"""

from dataclasses import dataclass
from typing import Any, TypeAlias

import numpy as np
from numpy.typing import NDArray

from service.compute.assembly import Matrix
from service.compute.damped_system import Damping
from service.compute.machine import Bearing, Floats, Integers
from service.compute.pencil import EPS

Complexes: TypeAlias = NDArray[np.complexfloating[Any, Any]]
WORTH_COMPRESSING = 8  # motions


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
