"""Damped and gyroscopic modes: λ²M + λ(C + ΩG) + K + iH = 0.

The problem is written in the coordinates of the undamped modes of M and the symmetric part of K,
where M is the identity and K diagonal; there

    d/dt [Ση; η'] = [0, Σ; −(Λ + S)Σ⁻¹, −D] [Ση; η']

with Λ = diag(ω²), Σ = diag(ω) (a scale of its own where ω = 0), D = Φᵀ(C + ΩG)Φ and S the rest of
the stiffness. The scale makes displacement and velocity alike, which is what the scaling of Fan,
Lin and Van Dooren (SIAM J. Matrix Anal. Appl. 26, 2004) is for; without damping the matrix is
skew-symmetric. Where D and S are diagonal (proportional damping, Caughey 1960) each mode has its
own quadratic equation and no eigenproblem is solved.
"""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, TypeAlias

import numpy as np
from numpy.typing import NDArray

from service.compute.machine import Floats
from service.compute.pencil import EPS, Pencil

Complexes: TypeAlias = NDArray[Any]  # complex128; float64 where nothing is complex
PROPORTIONAL = 1e-13  # of the diagonal: cross terms below this are roundoff
NEARLY_DEFECTIVE = 1e6  # condition of an eigenvalue from which it is named


@dataclass(frozen=True, slots=True)
class Roots:
    """Roots λ (1/s) and their shapes, sorted by |λ|; of each conjugate pair the upper one.

    Attributes
    ----------
    values : (m,) roots
    shapes : (r, m) in the coordinates of the basis
    conditions : (m,) condition of each root as an eigenvalue
    bounds : (m,) how far each root may be off, 1/s: condition times residual and roundoff
    method : how they were computed
    """

    values: Complexes
    shapes: Complexes
    conditions: Floats
    bounds: Floats
    method: str


def damped_roots(values: Floats, D: Floats, S: Floats | Complexes) -> Roots:
    """All roots of (λ² + λD + Λ + S)η = 0.

    A rigid-body motion that neither D nor S touches has the root 0 and takes no further part.

    Parameters
    ----------
    values : (r,) diagonal of Λ, rad²/s²
    D : (r, r) damping and gyroscopic terms, 1/s
    S : (r, r) stiffness that Λ doesn't hold, rad²/s²; complex with structural damping
    """
    if _is_diagonal(D) and _is_diagonal(S):
        return _own_equations(values, D.diagonal(), S.diagonal())
    free = (values == 0.0) & _untouched(D) & _untouched(S)
    if not free.any():
        return _linearized(values, D, S)
    rest = np.flatnonzero(~free)
    found = _linearized(values[rest], D[np.ix_(rest, rest)], S[np.ix_(rest, rest)])
    number = int(free.sum())
    shapes = np.zeros((len(values), number + len(found.values)), dtype=complex)
    shapes[np.flatnonzero(free), range(number)] = 1.0
    shapes[rest, number:] = found.shapes
    return Roots(
        np.concatenate([np.zeros(number), found.values]),
        shapes,
        np.concatenate([np.ones(number), found.conditions]),
        np.concatenate([np.zeros(number), found.bounds]),
        found.method,
    )


def _untouched(A: Floats | Complexes) -> NDArray[np.bool_]:
    size = np.abs(A)
    largest = np.maximum(size.max(axis=0), size.max(axis=1))
    untouched: NDArray[np.bool_] = largest <= 1e-12 * size.max()
    return untouched


def _is_diagonal(A: Floats | Complexes) -> bool:
    size = np.abs(A)
    own = np.sqrt(np.maximum(np.diag(size), 0.0))
    allowed = PROPORTIONAL * np.outer(own, own)
    np.fill_diagonal(size, 0.0)
    return bool((size <= allowed).all())


def _own_equations(values: Floats, d: Floats, s: Floats | Complexes) -> Roots:
    """λ² + dλ + (ω² + s) = 0, both roots without cancellation; of pairs the upper root."""
    k = values + s
    half = d / 2.0
    spread = np.sqrt((half**2 - k).astype(complex))
    away = np.where(half >= 0.0, -half - spread, -half + spread)
    other = np.divide(k, away, out=np.zeros_like(away), where=away != 0.0)
    roots, places = [], []
    for place, pair in enumerate(zip(away.tolist(), other.tolist(), strict=True)):
        roots.extend(_upper(pair))
        places.extend([place] * len(_upper(pair)))
    found = np.array(roots, dtype=complex)
    order = np.argsort(np.abs(found), kind="stable")
    shapes = np.zeros((len(values), len(found)), dtype=complex)
    shapes[places, range(len(found))] = 1.0
    gap = np.abs(2.0 * found + d[places])
    size = np.abs(found) + np.sqrt(np.abs(k[places]))
    conditions = np.divide(size, gap, out=np.full(len(found), np.inf), where=gap > 0.0)
    conditions[size == 0.0] = 1.0
    return Roots(
        found[order],
        shapes[:, order],
        conditions[order],
        (conditions * 16 * EPS * (np.abs(found) + np.sqrt(np.abs(values).max())))[order],
        "proportional damping: one quadratic equation per undamped mode",
    )


def _upper(pair: tuple[complex, complex]) -> list[complex]:
    """Of an oscillating pair the root with positive imaginary part; of real ones both.

    A double root at 0 is one rigid-body motion.
    """
    if pair[0] == 0.0 and pair[1] == 0.0:
        return [0.0 + 0.0j]
    if all(abs(root.imag) <= 1e-15 * abs(root) for root in pair):
        return [complex(root.real) for root in pair]
    return [max(pair, key=lambda root: root.imag)]


def _linearized(values: Floats, D: Floats, S: Floats | Complexes) -> Roots:
    size = len(values)
    omega = np.sqrt(np.abs(values))
    scale = np.where(omega > 0.0, omega, _typical(omega, D))
    A = np.zeros((2 * size, 2 * size), dtype=S.dtype)
    A[:size, size:] = np.diag(scale)
    A[size:, :size] = -(np.diag(values) + S) / scale
    A[size:, size:] = -D
    return _selected(A, size, bool(np.iscomplexobj(S)), lambda X: X[:size] / scale[:, None])


def _selected(
    A: NDArray[Any],
    size: int,
    structural: bool,
    shapes_of: Callable[[Complexes], Complexes],
) -> Roots:
    """The eigenvalues of a first-order matrix A that stand for modes, sorted by size."""
    roots, vectors = np.linalg.eig(A)
    kept = _one_of_each(roots, structural)
    conditions = _conditions(vectors)[kept]
    roots, vectors = roots[kept], vectors[:, kept]
    residual = np.linalg.norm(A @ vectors - vectors * roots, axis=0)
    roundoff = 4 * EPS * np.sqrt(size) * float(np.linalg.norm(A, 2))
    largest = float(np.abs(roots).max(initial=0.0)) or 1.0
    order = np.lexsort((roots.imag, np.round(np.abs(roots) / largest, 13)))
    return Roots(
        roots[order].astype(complex),
        shapes_of(vectors)[:, order].astype(complex),
        conditions[order],
        (conditions * (residual + roundoff))[order],
        "scaled linearization of the quadratic problem (Fan, Lin and Van Dooren), QR algorithm",
    )


def _typical(omega: Floats, D: Floats) -> float:
    present = omega[omega > 0.0]
    return float(present.min()) if present.size else float(np.abs(D).max()) or 1.0


def _one_of_each(roots: Complexes, structural: bool) -> NDArray[np.intp]:
    """Indices of the roots of the upper half plane, and of real ones.

    With structural damping the roots aren't conjugate, and only those of the upper half plane mean
    anything: the others belong to motion backward in time.
    """
    size = np.abs(roots)
    real = np.abs(roots.imag) <= 1e-13 * np.maximum(size, 1e-3 * size.max(initial=0.0))
    if structural:
        return np.flatnonzero(roots.imag >= -1e-13 * size)
    return np.flatnonzero(real | (roots.imag > 0.0))


def _conditions(X: Complexes) -> Floats:
    """Condition of each root, 1/|yᴴx| of its unit left and right vectors (Wilkinson 1965)."""
    try:
        left = np.linalg.inv(X)
    except np.linalg.LinAlgError:
        return np.full(len(X), np.inf)
    conditions: Floats = np.linalg.norm(left, axis=1) * np.linalg.norm(X, axis=0)
    return conditions


def first_order_roots(pencil: Pencil, M: Floats, C: Floats, K: Complexes) -> Roots:
    """Roots of a machine some of whose massless motions are damped.

    Such a motion b has an equation of first order, C₀₀b′ + … = 0. Massless motions without damping
    are condensed with the whole (complex) stiffness first. The state is (a, a′, b).

    Parameters
    ----------
    M, C, K : (n, n) in all motions
    """
    T = pencil.ties.T
    if T is not None:
        M, C, K = T.T @ M @ T, T.T @ C @ T, T.T @ K @ T
    stiffness: NDArray[Any] = K if K.imag.any() else K.real
    assert pencil.empty is not None
    borne, damped, loose = _three_kinds(pencil, C)
    kept = np.hstack([borne, damped])
    if loose.shape[1]:
        kept = kept - loose @ np.linalg.solve(
            loose.T @ stiffness @ loose, loose.T @ stiffness @ kept
        )
    r, z = borne.shape[1], damped.shape[1]
    M, C, stiffness = kept.T @ M @ kept, kept.T @ C @ kept, kept.T @ stiffness @ kept
    gamma = float(np.sqrt(np.linalg.norm(stiffness[:r, :r]) / np.linalg.norm(M[:r, :r]))) or 1.0
    E = np.zeros((2 * r + z, 2 * r + z), dtype=stiffness.dtype)
    A = np.zeros_like(E)
    E[:r, :r], A[:r, r : 2 * r] = np.eye(r), gamma * np.eye(r)
    E[r : 2 * r, r : 2 * r], E[r : 2 * r, 2 * r :] = gamma * M[:r, :r], C[:r, r:]
    E[2 * r :, 2 * r :] = C[r:, r:]
    A[r : 2 * r, :r], A[r : 2 * r, r : 2 * r], A[r : 2 * r, 2 * r :] = (
        -stiffness[:r, :r], -gamma * C[:r, :r], -stiffness[:r, r:]
    )  # fmt: skip
    A[2 * r :, :r], A[2 * r :, r : 2 * r], A[2 * r :, 2 * r :] = (
        -stiffness[r:, :r], -gamma * C[r:, :r], -stiffness[r:, r:]
    )  # fmt: skip
    places = np.r_[0:r, 2 * r : 2 * r + z]
    return _selected(
        np.linalg.solve(E, A), len(E), bool(np.iscomplexobj(stiffness)), lambda X: kept @ X[places]
    )


def _three_kinds(pencil: Pencil, C: Floats) -> tuple[Floats, Floats, Floats]:
    """Bases of the motions with mass, and of the massless ones with damping and without."""
    assert pencil.empty is not None
    P0 = pencil.empty
    C00 = P0.T @ C @ P0
    values, vectors = np.linalg.eigh((C00 + C00.T) / 2)
    some = np.abs(values) > 1e-12 * max(float(np.abs(values).max()), 1e-300)
    # Any complement of the massless motions will do: M is regular on it.
    left, *_ = np.linalg.svd(P0, full_matrices=True)
    return left[:, P0.shape[1] :], P0 @ vectors[:, some], P0 @ vectors[:, ~some]
