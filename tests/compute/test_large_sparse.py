"""Large sparse systems: lattices in closed form, no mode missed, memory estimated before."""

from typing import Any

import numpy as np
import pytest
from scipy.sparse import block_diag, csc_array, csr_array, diags_array, eye_array, kron
from threadpoolctl import threadpool_limits

from service.compute.constraints import Ties
from service.compute.machine import Unsound
from service.compute.memory import check_memory, dense_bytes, sparse_bytes
from service.compute.real_modes import Wanted
from service.compute.sparse_factor import factor
from service.compute.sparse_modes import SparsePencil, sparse_modes


def pencil(K: Any, M: Any) -> SparsePencil:
    """K − λM without ties."""
    size = K.shape[0]
    names = tuple(f"p{number}/x" for number in range(size))
    return SparsePencil(
        csc_array(K), csc_array(M), None, names, Ties(None, np.arange(size), (), ())
    )


def tridiagonal(side: Any, middle: Any) -> csr_array[Any]:
    """A symmetric matrix of three diagonals."""
    bands: Any = [side, middle, side]
    return csr_array(diags_array(bands, offsets=[-1, 0, 1]))


def chain(size: int, *, free: bool) -> csr_array[Any]:
    """Second differences, fixed at both ends or free."""
    middle = np.full(size, 2.0)
    if free:
        middle[[0, -1]] = 1.0
    return tridiagonal(-np.ones(size - 1), middle)


def lattice(*sizes: int, free: bool = False) -> csc_array[Any]:
    """Equal masses and springs on a grid, one motion a point."""
    total: Any = csr_array((int(np.prod(sizes)),) * 2)
    for axis, size in enumerate(sizes):
        part: Any = csr_array([[1.0]])
        for other, length in enumerate(sizes):
            part = kron(part, chain(size, free=free) if axis == other else eye_array(length))
        total = total + part
    return csc_array(total)


def lattice_values(*sizes: int, free: bool = False) -> Any:
    """Sums of the uniform chain's 4 sin²; e.g. Rayleigh, Theory of Sound, ch. 6."""
    sums = np.zeros(1)
    for size in sizes:
        angles = np.arange(size) / size if free else np.arange(1, size + 1) / (size + 1)
        sums = (sums[:, None] + 4 * np.sin(np.pi * angles / 2) ** 2).ravel()
    return np.sort(sums)


@pytest.mark.parametrize("sizes", [(5000,), (61, 60), (16, 16, 16)])
def test_lattices_have_their_closed_form_and_their_count(sizes: tuple[int, ...]) -> None:
    K = lattice(*sizes)
    found = sparse_modes(pencil(K, eye_array(K.shape[0])), Wanted(count=20))
    expected = lattice_values(*sizes)[:20]
    assert found.complete
    assert np.all(np.abs(found.values - expected) <= found.bounds)
    assert found.bounds == pytest.approx(0.0, abs=1e-10)


def test_a_free_lattice_has_one_motion_at_exactly_zero() -> None:
    K = lattice(45, 45, free=True)
    found = sparse_modes(pencil(K, eye_array(K.shape[0])), Wanted(count=8))
    assert found.rigid.tolist() == [True] + [False] * 7
    assert found.values[0] == 0.0
    assert found.values == pytest.approx(lattice_values(45, 45, free=True)[:8], abs=1e-12)
    assert found.complete


@pytest.mark.parametrize("seed", range(50))
def test_no_mode_is_missed_with_clusters_and_repeated_roots(seed: int) -> None:
    random = np.random.default_rng(seed)
    copies, size = int(random.integers(2, 7)), int(random.integers(20, 60))
    stiffness = 10.0 ** random.uniform(2, 5, size + 1)
    one = tridiagonal(-stiffness[1:-1], stiffness[:-1] + stiffness[1:])
    mass = random.uniform(0.5, 2.0, size)
    spread = 1.0 + np.repeat(random.choice([0.0, 1e-9, 1e-6, 1e-3], copies), size) * random.random(
        copies * size
    )
    K = csc_array(block_diag([one] * copies))
    M = csc_array(diags_array(np.tile(mass, copies) * spread))
    wanted = int(random.integers(5, 25))
    found = sparse_modes(pencil(K, M), Wanted(count=wanted))
    root = np.sqrt(M.diagonal())
    dense = np.linalg.eigvalsh(K.toarray() / root[:, None] / root)
    slack = 64 * np.finfo(float).eps * dense[-1]
    assert found.complete
    assert np.all(np.abs(found.values - dense[:wanted]) <= found.bounds + slack)


def test_all_modes_below_a_limit_are_found() -> None:
    K = lattice(50, 41)
    expected = lattice_values(50, 41)
    found = sparse_modes(pencil(K, eye_array(K.shape[0])), Wanted(limit=0.09, spare=1))
    assert len(found.values) == np.count_nonzero(expected <= 0.09) + 1
    assert found.complete


def test_massless_points_follow_the_others() -> None:
    # Every second point of a chain without mass: springs in series, k/2 between the others.
    size = 801
    mass = np.where(np.arange(size) % 2, 1.0, 0.0)
    found = sparse_modes(
        pencil(csc_array(chain(size, free=False)), csc_array(diags_array(mass))), Wanted(count=6)
    )
    expected = 0.5 * 4 * np.sin(np.pi * np.arange(1, 7) / 2 / (size // 2 + 1)) ** 2
    assert found.values == pytest.approx(expected, rel=1e-9)
    assert found.complete


def test_a_massless_motion_without_stiffness_is_named() -> None:
    K, M = np.ones(4), np.ones(4)
    K[2] = M[2] = 0.0
    with pytest.raises(Unsound) as caught:
        sparse_modes(pencil(csc_array(diags_array(K)), csc_array(diags_array(M))), Wanted(count=1))
    assert caught.value.part == ("degree of freedom", "p2/x")


def test_a_consistent_mass_is_bounded_too() -> None:
    # Linear rod elements: λ = 6(1 − cos)/(2 + cos) (closed form of the two tridiagonal matrices).
    size = 2000
    side = np.full(size - 1, 1 / 6)
    M = tridiagonal(side, np.full(size, 4 / 6))
    found = sparse_modes(pencil(csc_array(chain(size, free=False)), M), Wanted(count=10))
    cosines = np.cos(np.pi * np.arange(1, 11) / (size + 1))
    assert np.all(np.abs(found.values - 6 * (1 - cosines) / (2 + cosines)) <= found.bounds)


def test_answers_are_the_same_on_every_number_of_threads() -> None:
    K = lattice(40, 40)
    shapes = []
    for threads in (1, 2):
        with threadpool_limits(threads):
            shapes.append(sparse_modes(pencil(K, eye_array(1600)), Wanted(count=9)).shapes)
    assert shapes[0] == pytest.approx(shapes[1], abs=1e-9)


@pytest.mark.parametrize("sizes", [(4000,), (50, 50), (14, 14, 14)])
def test_the_memory_estimate_covers_the_fill(sizes: tuple[int, ...]) -> None:
    K = lattice(*sizes)
    lu = factor(K).lu
    assert sparse_bytes(csr_array(K), 20) >= 12 * (lu.L.nnz + lu.U.nnz)


def test_what_cannot_fit_is_refused_before_it_starts() -> None:
    with pytest.raises(Unsound, match="GB"):
        check_memory(dense_bytes(1_000_000), "mass")
