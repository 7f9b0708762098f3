"""From an assembly to the pencil K − λM that is solved: ties and massless motions eliminated.

A motion that carries no inertia has no equation of motion of its own: K₀₀q₀ + K₀₁q₁ = 0 gives it
from the others, which is no approximation (static condensation, Guyan 1965, where it is exact).
"""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import lapack
from scipy.sparse import csr_array, vstack

from service.compute.assembly import Assembly, Matrix
from service.compute.constraints import Ties, eliminate
from service.compute.machine import Floats, Unsound

EPS = float(np.finfo(float).eps)


@dataclass(frozen=True, slots=True)
class Pencil:
    """K − λM in r coordinates, M positive definite, and the way back to all n motions.

    Attributes
    ----------
    K, M : (r, r) stiffness (N/m, N/rad, N·m/rad) and mass (kg, kg·m, kg·m²)
    L : (r, r) lower Cholesky factor of M
    K_size, M_size : (r, r) sums of absolute values of what was added up, for roundoff bounds
    R : (n, r) all motions from the coordinates, or None for the identity
    J : (m, t) deformation rows in the t motions left by the ties, or None where not known
    carry : (r, t) P₁ᵀM, by which the coordinates of a motion are M⁻¹P₁ᵀMq, or None for M
    empty : (t, z) basis of the motions without inertia, or None where there is none
    massless : names of motions that were condensed out
    ties : how rigid ties were eliminated
    """

    K: Floats
    M: Floats
    L: Floats
    K_size: Floats
    M_size: Floats
    R: Floats | None
    J: Floats | None
    carry: Floats | None
    empty: Floats | None
    massless: tuple[str, ...]
    ties: Ties

    @property
    def size(self) -> int:
        """Number of coordinates r."""
        return len(self.M)

    def mass_norms(self, columns: Floats) -> Floats:
        """bᵀM⁻¹b of each (r,) column b."""
        solved, _ = lapack.dtrtrs(self.L, columns, lower=1)
        norms: Floats = (solved**2).sum(axis=0)
        return norms

    def full(self, coordinates: Floats) -> Floats:
        """All n motions from (r, …) coordinates."""
        return coordinates if self.R is None else self.R @ coordinates

    def tied(self, motions: NDArray[Any]) -> NDArray[Any]:
        """All n motions from the t that the ties leave."""
        return motions if self.ties.T is None else self.ties.T @ motions


def rows_at(assembly: Assembly, rpm: float) -> tuple[Matrix, Floats]:
    """Deformation rows (m, n) and stiffnesses (m,) with the bearings as they are at `rpm`.

    A bearing comes in by the symmetric part of its stiffness, along its principal directions. A
    damper alone has no row here: it brings nothing back.
    """
    acting = assembly.k != 0.0
    J, k = [assembly.J[acting]], [assembly.k[acting]]
    for bearing, rows in assembly.bearings:
        stiffness, _ = bearing.coefficients(rpm)
        values, vectors = np.linalg.eigh((stiffness + stiffness.T) / 2)
        J.append((vectors.T @ rows)[values != 0.0])
        k.append(values[values != 0.0])
    if len(J) == 1:
        return J[0], k[0]
    stacked = np.vstack(J) if isinstance(J[0], np.ndarray) else csr_array(vstack(J))
    return stacked, np.concatenate(k)


def pencil_of(assembly: Assembly, rpm: float = 0.0) -> Pencil:
    """The pencil of an assembled machine, its bearings as they are at `rpm`.

    Raises
    ------
    Unsound
        Nothing can move, nothing has mass, or a massless motion has no stiffness.
    """
    if not assembly.names:
        raise Unsound("nothing can move: every motion of every body is held", "bodies")
    ties = eliminate(assembly.constraints, len(assembly.names))
    J, k = rows_at(assembly, rpm)
    M = assembly.M
    if ties.T is not None:
        J, M = J @ ties.T, ties.T.T @ M @ ties.T
    J_size, k = np.abs(J), k[:, None]
    return _condense(
        J.T @ (k * J), M, J_size.T @ (np.abs(k) * J_size), np.abs(M), J, ties, assembly.names
    )


def pencil_of_matrices(K: Floats, M: Floats, names: tuple[str, ...]) -> Pencil:
    """The pencil of explicit symmetric (n, n) matrices.

    Raises
    ------
    Unsound
        As `pencil_of`, and where M isn't positive semi-definite.
    """
    ties = Ties(None, np.arange(len(names)), (), ())
    return _condense(K, M, np.abs(K), np.abs(M), None, ties, names)


def _condense(
    K: Floats,
    M: Floats,
    K_size: Floats,
    M_size: Floats,
    J: Floats | None,
    ties: Ties,
    names: tuple[str, ...],
) -> Pencil:
    kept = [names[number] for number in ties.kept]
    L = _cholesky(M)
    if L is not None:
        return Pencil(K, M, L, K_size, M_size, ties.T, J, None, None, (), ties)
    P1, P0 = _with_and_without_mass(M, kept)
    if not P1.shape[1]:
        raise Unsound("nothing that can move has mass or inertia", "bodies")
    b = _follow(K, P0, P1, kept)
    R, R_size = P1 + P0 @ b, np.abs(P1) + np.abs(P0) @ np.abs(b)
    M1 = P1.T @ M @ P1
    L = _cholesky(M1)
    if L is None:
        raise Unsound("the mass matrix can't be told from a singular one", "mass")
    return Pencil(
        _symmetric(R.T @ K @ R),
        M1,
        L,
        R_size.T @ K_size @ R_size,
        np.abs(P1).T @ M_size @ np.abs(P1),
        R if ties.T is None else ties.T @ R,
        J,
        P1.T @ M,
        P0,
        tuple(kept[row] for row in np.flatnonzero(np.abs(P0).max(axis=1) > 0.5)),
        ties,
    )


def _symmetric(A: Floats) -> Floats:
    return (A + A.T) / 2


def _cholesky(M: Floats) -> Floats | None:
    """L with LLᵀ = M, or None where a pivot is lost in roundoff."""
    diagonal = M.diagonal()
    if not diagonal.size or diagonal.min() <= 0.0:
        return None
    if np.count_nonzero(M) == len(M):
        return np.diag(np.sqrt(diagonal))
    L: Floats
    L, info = lapack.dpotrf(M.T, lower=1, clean=1)
    if info or (L.diagonal() ** 2 <= 8 * len(M) * EPS * diagonal).any():
        return None
    return L


def _with_and_without_mass(M: Floats, names: list[str]) -> tuple[Floats, Floats]:
    """Bases of the motions with inertia and without, columns scaled to act like single motions.

    Raises
    ------
    Unsound
        M isn't positive semi-definite.
    """
    identity = np.eye(len(M))
    diagonal = M.diagonal()
    if (diagonal < 0).any():
        worst = int(diagonal.argmin())
        raise Unsound(f"the mass of {names[worst]} is negative", "mass", worst, worst)
    bare = diagonal == 0.0
    loose = np.argwhere(bare[:, None] & (M != 0.0))
    if loose.size:
        row, column = (int(index) for index in loose[0])
        raise Unsound(
            f"not positive semi-definite: {names[row]} has no mass but is coupled by mass to "
            f"{names[column]}",
            "mass",
            row,
            column,
        )
    borne = ~bare
    scale = 1.0 / np.sqrt(diagonal[borne])
    values, vectors = np.linalg.eigh(M[np.ix_(borne, borne)] * scale[:, None] * scale)
    tolerance = 16 * len(M) * EPS
    if values.size and values[0] < -tolerance:
        worst = int(np.flatnonzero(borne)[np.abs(vectors[:, 0]).argmax()])
        raise Unsound(
            f"not positive semi-definite: {names[worst]} takes part in a motion of negative mass",
            "mass",
            worst,
            worst,
        )
    empty = values <= tolerance
    if not empty.any():
        return identity[:, borne], identity[:, bare]
    mixed = np.zeros((len(M), len(values)))
    mixed[borne] = scale[:, None] * vectors
    mixed /= np.abs(mixed).max(axis=0)
    return mixed[:, ~empty], np.hstack([identity[:, bare], mixed[:, empty]])


def _follow(K: Floats, P0: Floats, P1: Floats, names: list[str]) -> Floats:
    """How the massless motions follow the others: −K₀₀⁻¹K₀₁."""
    K00 = P0.T @ K @ P0
    diagonal = np.abs(K00.diagonal())
    scale = np.where(diagonal > 0.0, 1.0 / np.sqrt(np.where(diagonal > 0.0, diagonal, 1.0)), 1.0)
    values, vectors = np.linalg.eigh(K00 * scale[:, None] * scale)
    if np.abs(values).min() <= 64 * len(K00) * EPS:
        motion = P0 @ (scale * vectors[:, int(np.abs(values).argmin())])
        name = names[int(np.abs(motion).argmax())]
        raise Unsound(
            f"{name} has neither inertia nor stiffness: give it one of them, or leave that motion "
            "out",
            "degree of freedom",
            name,
        )
    inverse = (vectors / values) @ vectors.T
    follow: Floats = -scale[:, None] * (inverse @ (scale[:, None] * (P0.T @ K @ P1)))
    return follow
