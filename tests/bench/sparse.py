"""Twenty modes of large lattices with their certificate against plain shift-invert Lanczos.

Run: python -m tests.bench.sparse
"""

import statistics
import time

import numpy as np
from scipy.sparse import csc_array, diags_array
from scipy.sparse.linalg import eigsh
from threadpoolctl import threadpool_limits

from service.compute.real_modes import Wanted
from service.compute.sparse_modes import sparse_modes
from tests.compute.test_large_sparse import lattice, pencil

ROUNDS = 3


def measure(*sizes: int) -> tuple[float, float]:
    """Median seconds of ours and of the plain way."""
    K = csc_array(1e4 * lattice(*sizes))
    M = csc_array(diags_array(1.0 + np.random.default_rng(1).random(K.shape[0])))
    ours, plain = [], []
    for _ in range(ROUNDS):
        start = time.perf_counter()
        found = sparse_modes(pencil(K, M), Wanted(count=20))
        middle = time.perf_counter()
        values, _ = eigsh(K, 20, M, sigma=0)
        end = time.perf_counter()
        ours.append(middle - start)
        plain.append(end - middle)
        if not found.complete or np.abs(np.sort(values) - found.values).max() > 1e-8 * values.max():
            raise RuntimeError("the two don't agree")
    return statistics.median(ours), statistics.median(plain)


def main() -> None:
    """Print seconds, ratio and cost per degree of freedom."""
    with threadpool_limits(1):
        for sizes in ((100, 100), (173, 173), (316, 317)):
            ours, plain = measure(*sizes)
            size = int(np.prod(sizes))
            print(
                f"{size:>7} degrees of freedom: {ours:.2f} s, {ours / plain:.2f} x eigsh, "
                f"{1e6 * ours / size:.1f} µs each"
            )


if __name__ == "__main__":
    main()
