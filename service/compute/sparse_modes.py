"""The lowest modes of a large sparse pencil, with a count that none was missed.

Shift-invert Lanczos (Ericsson and Ruhe 1980) with a shift just below zero, so that a free system
needs no special case. A count by the inertia of K − σM above the last wanted mode says whether any
was missed; a Lanczos process from one vector may miss copies of a repeated root, which are then
searched for with what is found projected out.
"""

from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from scipy.sparse import csc_array, diags_array
from scipy.sparse.linalg import LinearOperator, eigsh

from service.compute.clusters import settle, settle_space
from service.compute.constraints import Ties
from service.compute.machine import Floats, Unsound
from service.compute.pencil import EPS
from service.compute.real_modes import ELSE, Modes, Wanted, largest_cross, largest_residual
from service.compute.sparse_factor import Factor, count_below, factor

SHIFT = 1e-7  # of a typical diagonal quotient of K and M: how far below zero
MOST_MODES = 2000
MOST_SEARCHES = 6


@dataclass(frozen=True, slots=True)
class SparsePencil:
    """K − λM of n coordinates, some of which may carry no mass.

    Attributes
    ----------
    K, M : (n, n) symmetric, sparse
    R : all motions from the coordinates, sparse, or None for the identity
    names : of the coordinates
    ties : how rigid ties were eliminated
    """

    K: csc_array[Any]
    M: csc_array[Any]
    R: Any
    names: tuple[str, ...]
    ties: Ties

    J: None = None
    empty: None = None
    massless: tuple[str, ...] = ()

    @property
    def size(self) -> int:
        """Number of coordinates n."""
        return int(self.M.shape[0])

    def full(self, coordinates: Any) -> Any:
        """All motions from (n, …) coordinates."""
        return coordinates if self.R is None else self.R @ coordinates

    def tied(self, motions: Any) -> Any:
        """All motions from those that the ties leave."""
        return self.full(motions)

    def mass_norms(self, columns: Floats) -> Floats:
        """bᵀM⁻¹b of each column b."""
        diagonal = self.M.diagonal()
        borne = diagonal > 0.0
        scaled = columns[borne] / np.sqrt(diagonal[borne])[:, None]
        if self.M.nnz == np.count_nonzero(diagonal):
            norms: Floats = (scaled**2).sum(axis=0)
            return norms
        rows = np.flatnonzero(borne)
        inner = csc_array(csc_array(self.M[rows])[:, rows])
        solved = factor(inner).solve(columns[borne])
        exact: Floats = (columns[borne] * solved).sum(axis=0)
        return exact


def sparse_modes(pencil: SparsePencil, wanted: Wanted) -> Modes:
    """The wanted modes of a sparse pencil.

    Raises
    ------
    Unsound
        A massless motion has no stiffness, or more modes are asked for than can be listed.
    """
    _check_massless(pencil)
    below, shift = _below_all(pencil)
    number = _how_many(pencil, wanted)
    values, shapes = _lanczos(pencil, below, shift, min(number + 2, pencil.size - 1))
    modes, reach, found = _checked(pencil, values, shapes), None, 0
    for search in range(MOST_SEARCHES):
        modes = _checked(pencil, values, shapes)
        reach = _reach(modes, wanted)
        if reach is None:
            more = min(2 * len(values) + 2, pencil.size - 1)
            values, shapes = _lanczos(pencil, below, shift, more)
            continue
        found = count_below(pencil.K, pencil.M, reach)
        missed = found - int(np.count_nonzero(modes.values < reach))
        if missed <= 0:
            break
        values, shapes = _with_missed(pencil, below, shift, modes, missed, search)
    kept = _kept(modes, wanted)
    counted = 0 if reach is None else int(np.count_nonzero(modes.values < reach))
    return replace(
        modes,
        values=modes.values[:kept],
        shapes=modes.shapes[:, :kept],
        bounds=modes.bounds[:kept],
        rigid=modes.rigid[:kept],
        found=found,
        below=reach or 0.0,
        complete=reach is not None and found == counted,
        cut=counted > kept and wanted.spare == 0 and wanted.limit is None,
    )


def _check_massless(pencil: SparsePencil) -> None:
    """A motion without mass and stiffness has no place to be."""
    bare = np.flatnonzero((pencil.M.diagonal() == 0.0) & (pencil.K.diagonal() == 0.0))
    if bare.size:
        name = pencil.names[int(bare[0])]
        raise Unsound(
            f"{name} has neither inertia nor stiffness: give it one of them, or leave that motion "
            "out",
            "degree of freedom",
            name,
        )
    if not pencil.M.diagonal().any():
        raise Unsound("nothing that can move has mass or inertia", "bodies")


def _below_all(pencil: SparsePencil) -> tuple[Factor, float]:
    """A factorization of K − σM with σ below every eigenvalue."""
    k, m = np.abs(pencil.K.diagonal()), pencil.M.diagonal()
    borne = (m > 0.0) & (k > 0.0)
    shift = -SHIFT * float(np.median(k[borne] / m[borne])) if borne.any() else -1.0
    for _ in range(14):
        try:
            found = factor(csc_array(pencil.K - shift * pencil.M))
        except RuntimeError:
            found = None
        if found is not None and found.negative == 0:
            return found, shift
        shift *= 10.0
    raise Unsound("the stiffness is too indefinite for a sparse solution", "stiffness")


def _how_many(pencil: SparsePencil, wanted: Wanted) -> int:
    number = wanted.count or ELSE
    if wanted.limit is not None:
        number = count_below(pencil.K, pencil.M, wanted.limit)
    number = min(number + wanted.spare, pencil.size - 1)
    if number > MOST_MODES:
        raise Unsound(
            f"{number} modes are more than the {MOST_MODES} that one answer may hold", "modes"
        )
    return number


def _kept(modes: Modes, wanted: Wanted) -> int:
    number = wanted.count or ELSE
    if wanted.limit is not None:
        number = int(np.count_nonzero(modes.values <= wanted.limit + modes.bounds))
    return min(len(modes.values), number + wanted.spare)


def _reach(modes: Modes, wanted: Wanted) -> float | None:
    """A shift in the gap above the last wanted mode, or None where more modes are needed."""
    last = _kept(modes, wanted) - 1
    if last < 0:
        return wanted.limit
    values, bounds = modes.values, modes.bounds
    for place in range(last, len(values) - 1):
        gap = values[place + 1] - values[place]
        if gap > 1e-8 * abs(values[place + 1]) + 4 * (bounds[place] + bounds[place + 1]):
            return float(values[place] + gap / 2)
    return None


def _lanczos(
    pencil: SparsePencil, below: Factor, shift: float, number: int, known: Floats | None = None
) -> tuple[Floats, Floats]:
    """`number` modes nearest above the shift, others than the `known` ones."""
    size = pencil.size
    pushed = None if known is None else pencil.M @ known

    def apply(right: Floats) -> Floats:
        solved = below.solve(right)
        if known is not None and pushed is not None:
            solved -= known @ (pushed.T @ solved)
        return solved

    start = np.random.default_rng(20_011 + (0 if known is None else known.shape[1]))
    values, shapes = eigsh(
        pencil.K,
        k=max(1, min(number, size - 1)),
        M=pencil.M,
        sigma=shift,
        OPinv=LinearOperator((size, size), matvec=apply, dtype=float),
        v0=start.standard_normal(size),
        tol=0,
    )
    order = np.argsort(values)
    return values[order], shapes[:, order]


def _with_missed(
    pencil: SparsePencil, below: Factor, shift: float, modes: Modes, missed: int, search: int
) -> tuple[Floats, Floats]:
    """What was found and what was missed, as Ritz vectors of their common space."""
    number = min(missed + 2 + search, pencil.size - 1 - len(modes.values))
    _, more = _lanczos(pencil, below, shift, max(number, 1), modes.shapes)
    space = np.hstack([modes.shapes, more])
    return _ritz(pencil, space)


def _ritz(pencil: SparsePencil, space: Floats) -> tuple[Floats, Floats]:
    """Rayleigh–Ritz on the columns of `space`."""
    MX = pencil.M @ space
    weight = np.sqrt(np.maximum((space * MX).sum(axis=0), 0.0))
    space = space[:, weight > 0.0] / weight[weight > 0.0]
    gram, vectors = np.linalg.eigh(space.T @ (pencil.M @ space))
    good = gram > 1e-8
    space = space @ (vectors[:, good] / np.sqrt(gram[good]))
    values, turned = np.linalg.eigh(space.T @ (pencil.K @ space))
    return values, space @ turned


def _checked(pencil: SparsePencil, values: Floats, shapes: Floats) -> Modes:
    """Settle the shapes, then take Rayleigh quotients, residuals and bounds from K and M."""
    shapes = _massless_follow(pencil, shapes)
    weight = np.sqrt(np.maximum(pencil.M.diagonal(), 0.0))
    KX, MX = pencil.K @ shapes, pencil.M @ shapes
    norm = np.sqrt((shapes * MX).sum(axis=0))
    values = (shapes * KX).sum(axis=0) / norm**2
    shapes = shapes / norm
    still = np.abs(values) <= 1e3 * _bounds(pencil, shapes, values)
    slack = np.full(len(values), 4 * EPS * float(np.abs(values).max(initial=0.0)))
    moving = settle(values[~still], shapes[:, ~still], weight, slack[~still])
    shapes = np.hstack([settle_space(shapes[:, still], weight), moving])
    rigid = np.arange(shapes.shape[1]) < int(still.sum())
    KX, MX = pencil.K @ shapes, pencil.M @ shapes
    norm = np.sqrt((shapes * MX).sum(axis=0))
    shapes, KX, MX = shapes / norm, KX / norm, MX / norm
    values = np.where(rigid, 0.0, (shapes * KX).sum(axis=0))
    bounds = _bounds(pencil, shapes, values)
    order = np.argsort(values, kind="stable")
    return Modes(
        values=values[order],
        shapes=shapes[:, order],
        bounds=bounds[order],
        rigid=rigid[order],
        found=0,
        below=0.0,
        complete=False,
        cut=False,
        residual=largest_residual(KX, MX, values, rigid),
        cross=largest_cross(shapes, MX),
        method="shift-invert Lanczos on a sparse minimum-degree factorization; count by the "
        "inertia of another one",
    )


def _massless_follow(pencil: SparsePencil, shapes: Floats) -> Floats:
    """Massless motions exactly where the others put them: q₀ = −K₀₀⁻¹K₀₁q₁."""
    bare = pencil.M.diagonal() == 0.0
    if not bare.any():
        return shapes
    rows = csc_array(pencil.K[np.flatnonzero(bare)])
    inner = csc_array(rows[:, np.flatnonzero(bare)])
    pushed = rows[:, np.flatnonzero(~bare)] @ shapes[~bare]
    try:
        followed = -factor(inner).solve(np.asarray(pushed))
    except RuntimeError:
        name = pencil.names[int(np.flatnonzero(bare)[0])]
        raise Unsound(
            "some massless motions have no stiffness of their own", "degree of freedom", name
        ) from None
    shapes = shapes.copy()
    shapes[bare] = followed
    return shapes


def _bounds(pencil: SparsePencil, shapes: Floats, values: Floats) -> Floats:
    """As in `real_modes`: the residual in the norm of M⁻¹ and the largest roundoff in it.

    With D the diagonal of M and μ the smallest eigenvalue of D^-½MD^-½, ‖r‖ in that norm is at most
    ‖D^-½r‖/√μ. Massless motions have no residual but roundoff: they follow exactly.
    """
    diagonal = pencil.M.diagonal()
    borne = diagonal > 0.0
    K_size, M_size = abs(pencil.K), abs(pencil.M)
    terms = int(np.diff(pencil.K.indptr).max()) + 8
    size = np.abs(shapes)
    roundoff = terms * EPS * (K_size @ size + (M_size @ size) * np.abs(values))
    residual = pencil.K @ shapes - (pencil.M @ shapes) * values
    weight = np.sqrt(diagonal[borne])[:, None]
    smallest = np.sqrt(_smallest_share(pencil, borne))
    bounds: Floats = (
        np.linalg.norm(residual[borne] / weight, axis=0)
        + np.linalg.norm(roundoff[borne] / weight, axis=0)
    ) / smallest
    return bounds


def _smallest_share(pencil: SparsePencil, borne: Any) -> float:
    """μ, nine tenths of a Ritz value that approaches it from above; 1 for a diagonal M."""
    diagonal = pencil.M.diagonal()
    if pencil.M.nnz == np.count_nonzero(diagonal):
        return 1.0
    D = diags_array(1.0 / np.sqrt(diagonal[borne]))
    rows = np.flatnonzero(borne)
    scaled = D @ csc_array(pencil.M[rows][:, rows]) @ D
    start = np.random.default_rng(7).standard_normal(len(rows))
    values = eigsh(scaled, k=1, which="SA", v0=start, tol=1e-2, return_eigenvectors=False)
    return max(0.9 * float(values[0]), 1e-12)
