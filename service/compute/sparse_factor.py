"""Sparse symmetric factorization, and the count of eigenvalues that its pivots give."""

from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy.sparse import csc_array, diags_array
from scipy.sparse.linalg import SuperLU, splu

from service.compute.machine import Floats


@dataclass(frozen=True, slots=True)
class Factor:
    """K − σM = factored, scaled by `scale` on both sides.

    `negative` is the number of its negative eigenvalues (Sylvester's law of inertia), or None where
    the pivots were exchanged and their signs say nothing.
    """

    lu: SuperLU
    scale: Floats
    negative: int | None

    def solve(self, right: Floats) -> Floats:
        """(K − σM)⁻¹ of a vector or of columns."""
        scale = self.scale if right.ndim == 1 else self.scale[:, None]
        return scale * self.lu.solve(scale * right)


def factor(A: csc_array[Any]) -> Factor:
    """Factorize a symmetric matrix without exchanging pivots, on a minimum-degree ordering.

    Raises
    ------
    RuntimeError
        A is singular.
    """
    size = np.sqrt(np.asarray(abs(A).max(axis=0).todense()).ravel())
    scale = 1.0 / np.where(size > 0.0, size, 1.0)
    D = diags_array(scale)
    lu = splu(
        csc_array(D @ A @ D),
        permc_spec="MMD_AT_PLUS_A",
        diag_pivot_thresh=0.0,
        options={"SymmetricMode": True},
    )
    kept = np.array_equal(lu.perm_r, lu.perm_c)
    negative = int(np.count_nonzero(lu.U.diagonal() < 0.0)) if kept else None
    return Factor(lu, scale, negative)


def count_below(K: csc_array[Any], M: csc_array[Any], shift: float) -> int:
    """Eigenvalues of K − λM below `shift`; where pivots had to be exchanged, at a shift close by.

    Raises
    ------
    RuntimeError
        At no shift nearby could the pivots be kept in place.
    """
    for nudge in (0.0, 1e-9, -1e-9, 1e-7, -1e-7, 1e-5):
        try:
            found = factor(csc_array(K - shift * (1.0 + nudge) * M)).negative
        except RuntimeError:
            continue
        if found is not None:
            return found
    raise RuntimeError("the pivots of K − σM can't be kept in place")
