"""Undamped natural frequencies and mode shapes of K − λM, and what they rest on.

M = LLᵀ turns the pencil into the standard symmetric problem of L⁻¹KL⁻ᵀ (Martin and Wilkinson 1968),
which LAPACK solves: all modes by divide and conquer, a few by relatively robust representations.
Rigid-body motions are projected out first, so that 0 Hz is exactly 0.
"""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import eigh, lapack

from service.compute.clusters import clusters, settle, settle_space
from service.compute.inertia_count import count_below
from service.compute.machine import Floats
from service.compute.pencil import EPS, Pencil
from service.compute.rigid_motions import rigid_motions

ALL_UP_TO, ELSE = 50, 20
INVERTED_UP_TO = 300  # coordinates: above, roundoff is bounded by a norm of L⁻¹
FEW = 0.35  # of all modes: below this the subset driver is the quicker one


@dataclass(frozen=True, slots=True)
class Wanted:
    """How many of the lowest modes, or all with an eigenvalue up to `limit` (rad²/s²).

    `spare` modes above the last wanted one are returned too.
    """

    count: int | None = None
    limit: float | None = None
    spare: int = 0


@dataclass(frozen=True, slots=True)
class Modes:
    """The lowest m modes, ascending.

    Attributes
    ----------
    values : (m,) eigenvalues λ = ω², rad²/s²
    shapes : (r, m) mass-normalized shapes
    bounds : (m,) how far each eigenvalue may be off, rad²/s²
    rigid : (m,) whether the mode is a rigid-body motion
    found, below : the count of eigenvalues below `below` (rad²/s²)
    complete : whether the count agrees with the modes computed
    cut : whether a repeated root is only partly among the modes
    residual, cross : largest relative residual and cross product
    method : how it was done
    """

    values: Floats
    shapes: Floats
    bounds: Floats
    rigid: np.ndarray[tuple[int, ...], np.dtype[np.bool_]]
    found: int
    below: float
    complete: bool
    cut: bool
    residual: float
    cross: float
    method: str


def real_modes(pencil: Pencil, wanted: Wanted) -> Modes:
    """The wanted modes with their bounds, checked against a count that is made apart from them."""
    A = _standard(pencil)
    number = _how_many(pencil, wanted)
    while True:
        modes = _solve(pencil, A, min(number + 1, pencil.size))
        reach = _reach(modes, pencil, wanted)
        if reach is not None:
            break
        number = min(2 * number + 8, pencil.size)
    found = count_below(pencil.K, pencil.M, reach)
    below = int(np.count_nonzero(modes.values < reach))
    kept = _kept(modes, wanted)
    return replace(
        _first(modes, kept),
        found=found,
        below=reach,
        complete=found == below,
        cut=below > kept and wanted.spare == 0 and wanted.limit is None,
    )


def _standard(pencil: Pencil) -> Floats:
    """L⁻¹KL⁻ᵀ: its lower triangle, which is all that the eigensolvers read."""
    diagonal = pencil.L.diagonal()
    if np.count_nonzero(pencil.M) == pencil.size:
        scaled: Floats = pencil.K / diagonal[:, None] / diagonal
        return scaled
    # Symmetric arrays are handed over transposed: that is the order LAPACK keeps them in.
    A: Floats
    A, _ = lapack.dsygst(pencil.K.T, pencil.L, itype=1, lower=1)
    return A


def _how_many(pencil: Pencil, wanted: Wanted) -> int:
    size = pencil.size
    if wanted.limit is not None:
        return min(size, count_below(pencil.K, pencil.M, wanted.limit) + wanted.spare)
    if wanted.count is not None:
        return min(size, wanted.count + wanted.spare)
    return size if size <= ALL_UP_TO else ELSE


def _kept(modes: Modes, wanted: Wanted) -> int:
    total = len(modes.values)
    if wanted.limit is not None:
        within = int(np.count_nonzero(modes.values <= wanted.limit + modes.bounds))
        return min(total, within + wanted.spare)
    if wanted.count is not None:
        return min(total, wanted.count + wanted.spare)
    return total if total <= ALL_UP_TO else ELSE


def _reach(modes: Modes, pencil: Pencil, wanted: Wanted) -> float | None:
    """A shift in the gap above the last wanted mode, or None where more modes are needed for it."""
    values, bounds = modes.values, modes.bounds
    last = _kept(modes, wanted) - 1
    if last < 0:
        return wanted.limit
    for place in range(last, len(values) - 1):
        gap = values[place + 1] - values[place]
        if gap > 1e-10 * abs(values[place + 1]) + 4 * (bounds[place] + bounds[place + 1]):
            return float(values[place] + gap / 2)
    if len(values) < pencil.size:
        return None
    above = values[-1] + 8 * bounds[-1] + 1e-6 * np.abs(values).max()
    # Of a system that nothing holds any shift above 0 will do.
    return float(max(values[-1] * 1.01, above, np.finfo(float).tiny if values.any() else 1.0))


def _solve(pencil: Pencil, A: Floats, number: int) -> Modes:
    values, Y, method = _lowest(A, number)
    modes = _checked(pencil, values, _back(pencil, Y), Y[:, :0], method)
    near_zero = np.abs(modes.values) <= 1e4 * modes.bounds
    if not near_zero.any():
        return modes
    free = rigid_motions(pencil)
    if not free.shape[1]:
        return modes
    U = pencil.L.T @ free
    A = np.tril(A) + np.tril(A, -1).T
    values, Y, method = _lowest(_without(A, U), number)
    away = values < 2 * _height(A)
    return _checked(pencil, values[away], _back(pencil, Y[:, away]), free, method)


def _height(A: Floats) -> float:
    """Above every eigenvalue of A (the largest row sum)."""
    return float(np.abs(A).sum(axis=1).max()) or 1.0


def _without(A: Floats, U: Floats) -> Floats:
    """A with the space of the orthonormal U projected out, and put far above all other modes."""
    AU = A @ U
    projected = A - AU @ U.T - U @ AU.T + U @ (U.T @ AU) @ U.T
    return (projected + projected.T) / 2 + 4 * _height(A) * (U @ U.T)


def _lowest(A: Floats, number: int) -> tuple[Floats, Floats, str]:
    if number > FEW * len(A):
        values, Y = np.linalg.eigh(A)
        return values[:number], Y[:, :number], "divide and conquer"
    values, Y = eigh(
        A, lower=True, subset_by_index=(0, number - 1), driver="evr", check_finite=False
    )
    return values, Y, "relatively robust representations"


def _back(pencil: Pencil, Y: Floats) -> Floats:
    """L⁻ᵀY."""
    if not Y.shape[1]:
        return Y
    shapes, _ = lapack.dtrtrs(pencil.L, Y, lower=1, trans=1)
    result: Floats = shapes
    return result


def _checked(pencil: Pencil, values: Floats, shapes: Floats, free: Floats, method: str) -> Modes:
    """Settle the shapes, then take Rayleigh quotients, residuals and bounds from K and M."""
    weight = np.sqrt(pencil.M.diagonal())
    slack = np.full(len(values), 4 * EPS * float(np.abs(values).max(initial=0.0)))
    shapes = np.hstack([settle(values, shapes, weight, slack), settle_space(free, weight)])
    is_rigid = np.arange(shapes.shape[1]) >= len(values)
    MX, KX = pencil.M @ shapes, pencil.K @ shapes
    norm = np.sqrt((shapes * MX).sum(axis=0))
    shapes, MX, KX = shapes / norm, MX / norm, KX / norm
    roots = clusters(values, slack)
    values = np.where(is_rigid, 0.0, (shapes * KX).sum(axis=0))
    residual = KX - MX * values
    for first, last in roots:
        values[first:last].sort()  # so that roundoff doesn't reorder what has been settled
    exact = is_rigid & (pencil.J is not None)  # explicit matrices are singular up to roundoff only
    bounds = np.where(exact, 0.0, _bounds(pencil, residual, shapes, values))
    order = np.argsort(values, kind="stable")
    return Modes(
        values=values[order],
        shapes=shapes[:, order],
        bounds=_together(values[order], bounds[order]),
        rigid=is_rigid[order],
        found=0,
        below=0.0,
        complete=False,
        cut=False,
        residual=largest_residual(KX, MX, values, is_rigid),
        cross=largest_cross(shapes, MX),
        method=f"Cholesky reduction, dense symmetric eigenproblem ({method}); count by the "
        "inertia of a Bunch–Kaufman factorization",
    )


def largest_residual(KX: Floats, MX: Floats, values: Floats, rigid: NDArray[np.bool_]) -> float:
    """The largest ‖Kφ − λMφ‖/(‖Kφ‖ + |λ|‖Mφ‖) over modes that strain something."""
    scale = np.linalg.norm(KX, axis=0) + np.abs(values) * np.linalg.norm(MX, axis=0)
    strained = ~rigid & (scale > 0.0)
    relative = np.linalg.norm(KX - MX * values, axis=0)[strained] / scale[strained]
    return float(relative.max(initial=0.0))


def largest_cross(shapes: Floats, MX: Floats) -> float:
    """The largest |φᵢᵀMφⱼ| of different shapes."""
    cross = shapes.T @ MX
    np.fill_diagonal(cross, 0.0)
    return float(np.abs(cross).max(initial=0.0))


def _bounds(pencil: Pencil, residual: Floats, shapes: Floats, values: Floats) -> Floats:
    """|λ − λ̃| ≤ ‖Kφ − λ̃Mφ‖ in the norm of M⁻¹ (Krylov–Weinstein; Parlett 1980, §4.5 and §15.9).

    Added is the same norm of the largest roundoff that the residual, and the sums in K and M,
    can hold: γ(|K||φ| + |λ̃||M||φ|), γ = (p + 8)ε for rows of p entries.
    """
    terms = max(_row_terms(pencil.K_size), _row_terms(pencil.M_size)) + 8
    size = np.abs(shapes)
    roundoff = terms * EPS * (pencil.K_size @ size + (pencil.M_size @ size) * np.abs(values))
    if np.count_nonzero(pencil.L) == pencil.size:
        both = np.stack([residual, roundoff]) / pencil.L.diagonal()[:, None]
        alone: Floats = np.linalg.norm(both, axis=1).sum(axis=0)
        return alone
    left, _ = lapack.dtrtrs(pencil.L, residual, lower=1)
    return np.asarray(np.linalg.norm(left, axis=0) + _roundoff_norm(pencil, roundoff))


def _roundoff_norm(pencil: Pencil, size: Floats) -> Floats:
    """The largest ‖L⁻¹e‖ over |e| ≤ `size`, column by column.

    ‖|L⁻¹||e|‖ exactly, or for large systems ‖D^-½e‖·√r·‖(D^-½L)⁻¹‖₁ with LAPACK's estimate of that
    norm (Higham 1988), three times which is never reached in practice.
    """
    if pencil.size <= INVERTED_UP_TO:
        inverse, _ = lapack.dtrtri(pencil.L, lower=1)
        exact: Floats = np.linalg.norm(np.abs(inverse) @ size, axis=0)
        return exact
    root = np.sqrt(pencil.M.diagonal())[:, None]
    scaled = pencil.L / root
    reciprocal, _ = lapack.dtrcon(scaled, norm="1", uplo="L")
    inverse_norm = 3.0 / (reciprocal * float(np.abs(scaled).sum(axis=0).max()))
    estimate: Floats = np.linalg.norm(size / root, axis=0) * np.sqrt(pencil.size) * inverse_norm
    return estimate


def _together(values: Floats, bounds: Floats) -> Floats:
    """Bounds that hold mode by mode: those that overlap are taken together, as one block.

    The k values of a block lie within ‖R‖ of k eigenvalues, in order (Kahan 1967; Parlett 1980,
    §11.5), while the residual of one vector alone only says that some eigenvalue is near.
    """
    apart = values[1:] - bounds[1:] > np.maximum.accumulate(values + bounds)[:-1]
    if apart.all():
        return bounds
    block = np.concatenate([[0], np.cumsum(apart)])
    together: Floats = np.sqrt(np.bincount(block, bounds**2))[block]
    return together


def _row_terms(A: Floats) -> int:
    return len(A) if len(A) > INVERTED_UP_TO else int(np.count_nonzero(A, axis=1).max())


def _first(modes: Modes, number: int) -> Modes:
    """The lowest `number` of the modes."""
    return replace(
        modes,
        values=modes.values[:number],
        shapes=modes.shapes[:, :number],
        bounds=modes.bounds[:number],
        rigid=modes.rigid[:number],
    )
