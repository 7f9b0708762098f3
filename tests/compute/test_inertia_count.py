"""The count of eigenvalues below a shift, against NumPy's eigenvalues."""

import numpy as np
import pytest

from service.compute.inertia_count import count_below


@pytest.mark.parametrize("seed", range(40))
def test_the_count_is_that_of_the_eigenvalues_below(seed: int) -> None:
    draw = np.random.default_rng(seed)
    size = int(draw.integers(1, 40))
    A = draw.normal(size=(size, size)) * 10 ** draw.uniform(-3, 3, size)
    B = draw.normal(size=(size, size))
    K = A @ A.T - draw.integers(0, 2) * np.eye(size) * np.trace(A @ A.T) / size
    M = B @ B.T + size * np.eye(size)
    inverse = np.linalg.inv(np.linalg.cholesky(M))
    values = np.linalg.eigvalsh(inverse @ K @ inverse.T)
    for place in range(size - 1):
        gap = values[place + 1] - values[place]
        if gap > 1e-9 * np.abs(values).max():
            assert count_below(K, M, values[place] + gap / 2) == place + 1
    span = np.abs(values).max() + 1.0
    assert count_below(K, M, values[0] - span) == 0
    assert count_below(K, M, values[-1] + span) == size


@pytest.mark.parametrize("scale", [1e-12, 1.0, 1e15])
def test_the_size_of_the_numbers_has_no_say(scale: float) -> None:
    K = scale * np.array([[2.0, -1.0], [-1.0, 2.0]])
    M = np.eye(2)
    assert [count_below(K, M, scale * shift) for shift in (0.5, 2.0, 3.5)] == [0, 1, 2]


def test_motions_of_very_different_size_are_counted_alike() -> None:
    K, M = np.diag([1e-8, 1e12, 1.0]), np.diag([1e-8, 1.0, 1e6])
    assert [count_below(K, M, shift) for shift in (1e-7, 0.5, 1e6, 1e13)] == [0, 1, 2, 3]
