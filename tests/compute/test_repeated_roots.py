"""A repeated root has one basis, whatever the threads of the linear algebra and its roundoff."""

from random import Random
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray
from threadpoolctl import threadpool_limits

from service.compute.pencil import pencil_of_matrices
from service.compute.real_modes import Modes, Wanted, real_modes
from tests.tasks.asking import bodies, modes, spring

Raw = dict[str, Any]
Floats = NDArray[np.float64]


def ring(size: int) -> Raw:
    masses = [{"name": f"m{i}", "mass": 1.5} for i in range(size)]
    springs = [spring(f"s{i}", f"m{i}", f"m{(i + 1) % size}", 4e4) for i in range(size)]
    return bodies(*masses, *springs, motions=["x"])


def square_plate(size: int) -> Floats:
    """Stiffness of a square lattice of springs: most of its roots are repeated."""
    line = 2 * np.eye(size) - np.eye(size, k=1) - np.eye(size, k=-1)
    lattice: Floats = np.kron(line, np.eye(size)) + np.kron(np.eye(size), line)
    return 1e5 * lattice


def solved(K: Floats, M: Floats, count: int) -> Modes:
    names = tuple(f"b{i}/x" for i in range(len(K)))
    return real_modes(pencil_of_matrices(K, M, names), Wanted(count))


@pytest.mark.parametrize("count", [12, 100])
def test_one_and_two_threads_give_the_same_shapes(count: int) -> None:
    K, M = square_plate(16), np.eye(256)
    found = []
    for threads in (1, 2):
        with threadpool_limits(threads):
            found.append(solved(K, M, count))
    assert np.abs(found[0].shapes - found[1].shapes).max() < 1e-7
    assert np.abs(found[0].values - found[1].values).max() <= 1e-12 * found[0].values.max()


def test_roundoff_in_the_matrices_moves_no_basis() -> None:
    K, M = square_plate(12), np.eye(144)
    draw = np.random.default_rng(1)
    noise = 1 + 1e-16 * draw.integers(-1, 2, K.shape)
    shaken = K * (noise + noise.T) / 2
    assert np.abs(solved(K, M, 30).shapes - solved(shaken, M, 30).shapes).max() < 1e-6


def test_two_equal_machines_side_by_side_move_one_at_a_time() -> None:
    draw = Random(3)
    k = [draw.uniform(1e3, 1e5) for _ in range(3)]
    parts: list[Raw] = []
    for side in ("left", "right"):
        parts += [{"name": f"{side} {i}", "mass": 2.0 + i} for i in range(3)]
        parts += [
            spring(f"{side} s{i}", f"{side} {i}", f"{side} {i - 1}" if i else "ground", k[i])
            for i in range(3)
        ]
    system = bodies(*parts, motions=["x"])
    for place, mode in enumerate(modes(system)["modes"]):
        sides = np.abs(mode["shape"]).reshape(2, 3)
        assert sides[1 - place % 2].max() < 1e-9
        # Weighted by mass, so that metres and radians compare.
        assert max(mode["shape"] * np.sqrt([2.0, 3.0, 4.0] * 2), key=abs) > 0


def test_the_basis_of_a_ring_begins_where_the_ring_does() -> None:
    answer = modes(ring(9))["modes"]
    pairs = [(answer[i], answer[i + 1]) for i in (1, 3, 5, 7)]
    for first, second in pairs:
        assert first["frequency_hz"] == pytest.approx(second["frequency_hz"], rel=1e-13)
        # Cosine and sine about the first mass: every mass moves as much as every other on average,
        # so the first shape is the one that moves most at the first of them.
        assert first["shape"][0] == pytest.approx(np.sqrt(2 / (9 * 1.5)), rel=1e-9)
        assert second["shape"][0] == pytest.approx(0.0, abs=1e-9)


def test_the_order_in_which_connections_are_listed_moves_no_basis() -> None:
    system = ring(12)
    shuffled = {**system, "connections": Random(5).sample(system["connections"], 12)}
    for one, two in zip(modes(system)["modes"], modes(shuffled)["modes"], strict=True):
        assert one["shape"] == pytest.approx(two["shape"], abs=1e-7)


def test_the_same_question_gives_the_same_answer_to_the_last_bit() -> None:
    assert modes(ring(20)) == modes(ring(20))


def test_a_count_that_cuts_a_repeated_root_is_said() -> None:
    cut = modes(ring(9), count=2)
    assert any("repeated root" in warning for warning in cut["warnings"])
    assert cut["evidence"]["sturm_count"] == 3
    assert cut["evidence"]["complete"]
    whole = modes(ring(9), count=3)
    assert not any("repeated root" in warning for warning in whole["warnings"])


def test_nearly_equal_hung_masses_keep_their_two_frequencies_apart() -> None:
    # The tie splits them by 2k/m: 1e-9 of their square, far more than roundoff.
    g_over_l, k = 9.80665 / 0.5, 9.80665 / 0.5 * 0.5e-9
    rods = [
        {"kind": "pendulum", "name": n, "body": n[0], "length": 0.5} for n in ("a rod", "b rod")
    ]
    system = bodies(
        {"name": "a", "mass": 1.0},
        {"name": "b", "mass": 1.0},
        *rods,
        spring("tie", "a", "b", k),
        motions=["x"],
    )
    low, high = (mode["frequency_hz"] for mode in modes(system)["modes"])
    expected = np.sqrt([g_over_l, g_over_l + 2 * k]) / (2 * np.pi)
    assert [low, high] == pytest.approx(expected.tolist(), rel=1e-14)
