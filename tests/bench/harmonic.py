"""Steady response against general solvers: python -m tests.bench.harmonic

1000 frequencies on 300 dense degrees of freedom with ten dampers, against a loop of
`numpy.linalg.solve`: goal 10 times as fast, agreement 1e-8; the same with damping everywhere, for
the choice of method. Then 20 000 sparse degrees of freedom, 200 frequencies, modes with static
correction against one `scipy.sparse.linalg.splu` per frequency with its default ordering: goal 5
times, agreement 1e-6. Preparation (modes, factorization) is timed with each answer.
"""

from collections.abc import Callable
from time import perf_counter
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csc_array, diags_array, eye_array, kron
from scipy.sparse.linalg import splu
from threadpoolctl import threadpool_limits

from service.compute.constraints import Ties
from service.compute.couplings import couplings_of_sparse, touched_by
from service.compute.damped_system import Damping
from service.compute.harmonic import Load, responder
from service.compute.normal_coordinates import diagonal_machine
from service.compute.real_modes import Wanted
from service.compute.reduced import REACH, reduced
from service.compute.sparse_modes import SparsePencil, sparse_modes
from tests.compute.test_harmonic import drawn, machine

Floats = NDArray[np.float64]
Complexes = NDArray[np.complexfloating[Any, Any]]
SIZE, DAMPERS, FREQUENCIES = 300, 10, 1000
GRID = (200, 100)
BETA = 1e-5  # s, C = βK everywhere besides the dampers


def timed(call: Callable[[], Any]) -> tuple[float, Any]:
    """Seconds, and what came out."""
    start = perf_counter()
    found = call()
    return perf_counter() - start, found


def dense(M: Floats, K: Floats, C: Floats, f: Floats, omega: Floats) -> Complexes:
    """Our answer, from the matrices on."""
    own = machine(M, K, C)
    still = np.zeros(len(omega))
    load = Load((0,), f[None].astype(complex)).onto(own.B)
    q = responder(own, len(omega), still).coordinates(load, omega, still)
    return np.asarray(q @ own.B.T)


def looped(M: Floats, K: Floats, C: Floats, f: Floats, omega: Floats) -> Complexes:
    """A general solver at each frequency."""
    return np.array([np.linalg.solve(K + 1j * w * C - w * w * M, f) for w in omega])


def compare_dense(dampers: int) -> str:
    """One line: both times, their ratio and the largest difference."""
    M, K, C = drawn(SIZE, dampers)
    omega = np.linspace(10.0, 800.0, FREQUENCIES)
    f = np.zeros(SIZE)
    f[7] = 1.0
    dense(M, K, C, f, omega[:40])
    ours, found = timed(lambda: dense(M, K, C, f, omega))
    theirs, expected = timed(lambda: looped(M, K, C, f, omega))
    size = np.abs(expected).max(axis=1)
    difference = float((np.abs(found - expected).max(axis=1) / size).max())
    return (
        f"{SIZE} dense, {dampers} dampers, {FREQUENCIES} frequencies: {ours:.3f} s against "
        f"{theirs:.3f} s, {theirs / ours:.1f} times as fast, agreement {difference:.1e}"
    )


def plate() -> tuple[csc_array[Any], csc_array[Any], Floats, Floats]:
    """A lattice of 200 × 100 points, held along its edges: K, M, and ten dampers in rows."""
    across, along = (diags_array([-1.0, 2.0, -1.0], offsets=[-1, 0, 1], shape=(n, n)) for n in GRID)
    lattice = kron(across, eye_array(GRID[1])) + kron(eye_array(GRID[0]), along)
    size = GRID[0] * GRID[1]
    K = csc_array(1e6 * lattice + 10.0 * eye_array(size))
    M = csc_array(diags_array(np.random.default_rng(5).uniform(0.5, 1.5, size)))
    rows = np.zeros((10, size))
    rows[range(10), np.random.default_rng(6).choice(size, 10, replace=False)] = 1.0
    return K, M, rows, np.full(10, 40.0)


def sparse(
    K: csc_array[Any], M: csc_array[Any], local: csc_array[Any], seen: list[int], omega: Floats
) -> Complexes:
    """Our answer to a unit force at the first of the places seen, from the matrices on."""
    size, top = K.shape[0], float(omega[-1])
    ties = Ties(None, np.arange(size), (), ())
    pencil = SparsePencil(K, M, None, tuple(map(str, range(size))), ties)
    modes = sparse_modes(pencil, Wanted(limit=(REACH * top) ** 2))
    none = csc_array((size, size))
    damping = Damping(local, none, none, beta=BETA)
    places = np.unique(np.concatenate([seen, touched_by(local)]))
    units = np.zeros((size, len(places)))
    units[places, range(len(places))] = 1.0
    found = reduced(pencil, modes, units, top)
    parts = (found.B, found.mass, found.stiffness, found.rigid)
    couplings = couplings_of_sparse(damping, found.B, 0.0)
    own = diagonal_machine(parts, len(modes.values), damping, couplings)
    load = Load((0,), found.B[seen[:1]].astype(complex))
    still = np.zeros(len(omega))
    q = responder(own, len(omega), still).coordinates(load, omega, still)
    return np.asarray(q @ found.B[seen].T)


def compare_sparse(frequencies: int = 200) -> str:
    """One line: both times, their ratio and the largest difference."""
    K, M, rows, c = plate()
    omega = np.linspace(5.0, 130.0, frequencies)
    seen = [4321, 9999, 15000]
    local = csc_array(rows.T @ (c[:, None] * rows))
    C = BETA * K + local
    f = np.zeros(K.shape[0], dtype=complex)
    f[seen[0]] = 1.0

    def theirs() -> Complexes:
        return np.array([
            splu(csc_array(K + 1j * w * C - w * w * M)).solve(f)[seen] for w in omega
        ])  # fmt: skip

    taken, found = timed(lambda: sparse(K, M, local, seen, omega))
    reference, expected = timed(theirs)
    difference = float((np.abs(found - expected) / np.abs(expected)).max())
    return (
        f"{len(f)} sparse, {frequencies} frequencies: {taken:.2f} s against {reference:.2f} s, "
        f"{reference / taken:.1f} times as fast, agreement {difference:.1e}"
    )


def main() -> None:
    """Print one line per comparison, on one thread."""
    with threadpool_limits(1):
        print(compare_dense(DAMPERS))
        print(compare_dense(SIZE))
        print(compare_sparse())


if __name__ == "__main__":
    main()
