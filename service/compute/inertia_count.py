"""How many eigenvalues lie below a shift, without computing one.

Sylvester's law of inertia: K − σM has as many negative eigenvalues as the pencil K − λM has
eigenvalues below σ, where M is positive definite. The signs of the pivots of a symmetric
indefinite factorization (Bunch and Kaufman 1977) count them.
"""

import numpy as np
from scipy.linalg import lapack

from service.compute.machine import Floats

UNEVEN = 1e4  # square root of the spread of the diagonal from which it is evened out first
BLOCK = 32  # columns at a time: with less workspace the factorization takes three times as long


def count_below(K: Floats, M: Floats, shift: float) -> int:
    """Number of eigenvalues of (n, n) K − λM below `shift` (rad²/s²)."""
    A = K - shift * M
    size = np.sqrt(np.abs(K.diagonal()) + abs(shift) * np.abs(M.diagonal()))
    size = np.where(size > 0.0, size, 1.0)
    if size.max() > UNEVEN * size.min():
        A /= size[:, None] * size
    D, pivots, _ = lapack.dsytrf(A.T, lower=1, lwork=BLOCK * len(A), overwrite_a=1)
    single = pivots > 0
    # A 2×2 block is written as a pair of negative pivots; its determinant is negative.
    return int(np.count_nonzero(D.diagonal()[single] < 0)) + int((~single).sum()) // 2
