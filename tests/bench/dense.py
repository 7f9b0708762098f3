"""The compute stage on dense matrices against SciPy: python -m tests.bench.dense

1000 degrees of freedom, 20 modes with bounds, residuals and the count that certifies them,
against `scipy.linalg.eigh(K, M)` as its documentation shows it: all eigenvalues and vectors. Both
run on the same number of threads, in turn, and the medians are compared. Goal: at most 0.5.
"""

from collections.abc import Callable
from statistics import median
from time import perf_counter
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import eigh
from threadpoolctl import threadpool_limits

from service.compute.pencil import pencil_of_matrices
from service.compute.real_modes import Modes, Wanted, real_modes

Floats = NDArray[np.float64]
SIZE, COUNT, ROUNDS, GOAL = 1000, 20, 5, 0.5


def pair(size: int, full_mass: bool) -> tuple[Floats, Floats]:
    """Positive definite K and M, diagonal or full."""
    draw = np.random.default_rng(7)
    A = draw.normal(size=(size, size))
    K = 1e4 * (A @ A.T) / size + np.diag(draw.uniform(1e2, 1e6, size))
    if not full_mass:
        return K, np.diag(draw.uniform(1.0, 50.0, size))
    B = draw.normal(size=(size, size)) / size**0.5
    return K, B @ B.T + np.diag(draw.uniform(1.0, 50.0, size))


def compute_stage(K: Floats, M: Floats, names: tuple[str, ...]) -> Modes:
    """What the task `modes` asks of the compute layer."""
    return real_modes(pencil_of_matrices(K, M, names), Wanted(COUNT))


def in_turn(*calls: Callable[[], Any]) -> list[float]:
    """Median seconds of each call, taken in turn so that a busy machine slows all alike."""
    taken: list[list[float]] = [[] for _ in calls]
    for call in calls:
        call()
    for _ in range(ROUNDS):
        for times, call in zip(taken, calls, strict=True):
            start = perf_counter()
            call()
            times.append(perf_counter() - start)
    return [median(times) for times in taken]


def compare(full_mass: bool, threads: int) -> str:
    """One line: both medians and their ratio."""
    K, M = pair(SIZE, full_mass)
    names = tuple(f"b{number}/x" for number in range(SIZE))
    with threadpool_limits(threads):
        ours, theirs = in_turn(lambda: compute_stage(K, M, names), lambda: eigh(K, M))
        found, expected = compute_stage(K, M, names), eigh(K, M, eigvals_only=True)
    apart = float(np.abs(found.values / expected[:COUNT] - 1).max())
    assert found.complete
    assert apart < 1e-9
    kind = "full" if full_mass else "diagonal"
    return (
        f"{SIZE} degrees of freedom, {kind} mass, {COUNT} modes, {threads} thread(s): "
        f"{ours:.3f} s against {theirs:.3f} s, ratio {ours / theirs:.2f} (goal ≤ {GOAL}); "
        f"eigenvalues agree to {apart:.0e}"
    )


if __name__ == "__main__":
    for threads in (1, 2):
        for full_mass in (False, True):
            print(compare(full_mass, threads))
