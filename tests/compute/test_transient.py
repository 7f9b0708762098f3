"""Motion over time against general integrators and the matrix exponential."""

from itertools import pairwise

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.integrate import solve_ivp
from scipy.linalg import expm

from service.compute.normal_coordinates import NormalCoordinates
from service.compute.signals import Signal, samples
from service.compute.state_space import state_space
from service.compute.transient import Input, TimeHistory, time_history
from tests.compute.test_harmonic import drawn, machine

Floats = NDArray[np.float64]


def moved(own: NormalCoordinates, found: TimeHistory, times: Floats, power: int = 0) -> Floats:
    return found.seen([(power, own.B)], times)


def started(own: NormalCoordinates, M: Floats, q: Floats, v: Floats, *inputs: Input) -> TimeHistory:
    initial = (own.B.T @ M @ q, own.B.T @ M @ v)
    return time_history(own, state_space(own, 0.0), initial, list(inputs))


def exponential(M: Floats, C: Floats, K: Floats, q: Floats, v: Floats, t: float) -> Floats:
    """q after t by `scipy.linalg.expm` of the first-order form."""
    size = len(M)
    A = np.block([[np.zeros((size, size)), np.eye(size)],
                  [-np.linalg.solve(M, K), -np.linalg.solve(M, C)]])  # fmt: skip
    x: Floats = (expm(A * t) @ np.concatenate([q, v]))[:size]
    return x


@pytest.mark.parametrize("dampers", [0, 2, 5])
def test_free_motion_agrees_with_the_matrix_exponential(dampers: int) -> None:
    M, K, C = drawn(5, dampers)
    own = machine(M, K, C)
    q, v = np.linspace(-1, 1, 5), np.array([0.0, 30.0, 0, -50.0, 10.0])
    found = started(own, M, q, v)
    times = np.array([0.0, 0.013, 0.21])
    values = moved(own, found, times)
    for k, t in enumerate(times):
        assert values[:, k] == pytest.approx(exponential(M, C, K, q, v, t), abs=2e-12)


@pytest.mark.parametrize("damped", [True, False])
def test_a_defective_machine_agrees_with_the_matrix_exponential(damped: bool) -> None:
    """Two equal masses whose damping makes a double root: critical, and coupled so that no
    proportional form has it."""
    M, K = np.eye(2), np.array([[3.0, -1.0], [-1.0, 3.0]])
    C = np.array([[2 * np.sqrt(2.0), 0.0], [0.0, 0.5]]) if damped else np.zeros((2, 2))
    C = C + np.array([[0.0, 0.6], [-0.6, 0.0]])
    own = machine(M, K, C)
    q, v = np.array([1.0, 0.0]), np.array([0.0, -1.0])
    times = np.linspace(0.0, 6.0, 7)
    values = moved(own, started(own, M, q, v), times)
    for k, t in enumerate(times):
        assert values[:, k] == pytest.approx(exponential(M, C, K, q, v, t), abs=1e-9)


def test_a_fourfold_defective_root_keeps_seven_digits() -> None:
    """Two critically damped masses, one driving the other: a fourfold root with one shape."""
    M, K = np.eye(2), np.diag([1.0, 1.0])
    C = np.array([[2.0, 1.0], [0.0, 2.0]])
    own = machine(M, K, C)
    q, v = np.array([1.0, 1.0]), np.array([0.5, 0.0])
    times = np.linspace(0.0, 8.0, 5)
    values = moved(own, started(own, M, q, v), times)
    for k, t in enumerate(times):
        assert values[:, k] == pytest.approx(exponential(M, C, K, q, v, t), abs=1e-7)


@pytest.mark.parametrize("step", [0.01, 0.037])
@pytest.mark.parametrize("dampers", [0, 3])
def test_a_piecewise_linear_force_agrees_with_a_general_integrator(
    step: float, dampers: int
) -> None:
    """`scipy.integrate.solve_ivp`, rtol 1e-12, restarted at each corner of the force."""
    M, K, C = drawn(4, dampers, 8)
    K = K / 50
    own = machine(M, K, C)
    corners, heights = np.array([0.0, 0.1, 0.15, 0.4]), np.array([3.0, -2.0, 5.0, 0.0])
    b = np.array([1.0, 0.0, -0.5, 2.0])
    found = started(own, M, np.zeros(4), np.zeros(4), Input(samples(corners, heights), b @ own.B))
    times = np.arange(0.0, 0.6, step)
    values, rates = moved(own, found, times), moved(own, found, times, 1)

    def rate(t: float, x: Floats) -> Floats:
        force = b * np.interp(t, corners, heights, right=0.0)
        return np.concatenate([x[4:], np.linalg.solve(M, force - K @ x[:4] - C @ x[4:])])

    state = np.zeros(8)
    ends = [*corners, 0.6]
    expected = np.zeros((8, len(times)))
    for first, last in pairwise(ends):
        inside = (times >= first) & (times < last)
        run = solve_ivp(rate, (first, last), state, "DOP853", np.append(times[inside], last),
                        rtol=1e-12, atol=1e-15)  # fmt: skip
        expected[:, inside] = run.y[:, :-1]
        state = run.y[:, -1]
    size = np.abs(expected).max(axis=1)
    assert (np.abs(values - expected[:4]) < 1e-10 * size[:4, None]).all()
    assert (np.abs(rates - expected[4:]) < 1e-10 * size[4:, None]).all()


def test_the_step_has_no_influence() -> None:
    M, K, C = drawn(4, 2)
    own = machine(M, K, C)
    signal = samples(np.array([0.0, 0.05, 0.05, 0.2]), np.array([1.0, 2.0, -1.0, 0.5]))
    found = started(own, M, np.zeros(4), np.zeros(4), Input(signal, np.ones(4)))
    fine = moved(own, found, np.arange(0.0, 0.3, 0.001))
    coarse = moved(own, found, np.arange(0.0, 0.3, 0.05))
    odd = moved(own, found, np.array([0.0, 0.05, 0.1, 0.15, 0.2, 0.25]) + 1e-5)
    size = np.abs(fine).max()
    assert np.abs(fine[:, ::50] - coarse).max() < 1e-12 * size
    shifted = moved(own, found, np.arange(0.0, 0.3, 0.001) + 1e-5)[:, ::50]
    assert np.abs(shifted - odd).max() < 1e-12 * size


def test_a_signal_is_cut_and_integrated_without_changing() -> None:
    signal = samples(np.array([0.0, 1.0, 3.0]), np.array([2.0, 0.0, 4.0]))
    cut = signal.cut_at(np.array([-0.5, 0.0, 0.25, 1.0, 2.0, 3.0, 3.5]))
    at = np.array([-0.2, 0.1, 0.9, 1.7, 2.99, 3.2])
    assert cut.at(at) == pytest.approx(signal.at(at), abs=1e-15)
    assert signal.integral().at(np.array([3.0]))[0] == pytest.approx(1.0 + 4.0)
    assert signal.derivative().at(np.array([0.5, 2.0])) == pytest.approx([-2.0, 2.0])
    assert isinstance(cut, Signal)
