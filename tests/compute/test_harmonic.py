"""Steady response of matrices: every method against direct solutions in high precision."""

import mpmath
import numpy as np
import pytest
from numpy.typing import NDArray

from service.compute.couplings import couplings_of_matrices
from service.compute.damped_system import Damping
from service.compute.harmonic import DIRECT, STATES, SUM, UPDATE, Load, Responder, responder
from service.compute.normal_coordinates import (
    NormalCoordinates,
    normal_coordinates,
)
from service.compute.pencil import pencil_of_matrices
from service.compute.real_modes import Wanted, real_modes
from service.compute.state_space import state_space

Floats = NDArray[np.float64]


def machine(
    M: Floats, K: Floats, C: Floats, H: Floats | None = None, G: Floats | None = None
) -> NormalCoordinates:
    none = np.zeros_like(M)
    names = tuple(f"{number}/x" for number in range(len(M)))
    pencil = pencil_of_matrices(K, M, names)
    modes = real_modes(pencil, Wanted(count=len(M)))
    damping = Damping(C, none if H is None else H, none if G is None else G)
    return normal_coordinates(pencil, modes, damping, couplings_of_matrices(damping), K)


def drawn(size: int, dampers: int, seed: int = 3) -> tuple[Floats, Floats, Floats]:
    draw = np.random.default_rng(seed)
    A = draw.normal(size=(size, size))
    K = 1e5 * (A @ A.T / size + 0.2 * np.eye(size))
    B = draw.normal(size=(size, size)) / size
    M = np.diag(draw.uniform(1, 4, size)) + B @ B.T
    R = draw.normal(size=(dampers, size))
    return M, K, R.T @ np.diag(draw.uniform(1, 8, dampers)) @ R


def direct(Z: NDArray[np.complex128], f: Floats) -> NDArray[np.complex128]:
    """50 digits by mpmath."""
    with mpmath.workdps(50):
        found = mpmath.lu_solve(mpmath.matrix(Z.tolist()), mpmath.matrix(f.tolist()))
        return np.array([complex(value) for value in found])


def response(
    found: Responder, f: Floats, omega: Floats, rpm: float = 0.0
) -> NDArray[np.complex128]:
    load = Load((0,), f[None].astype(complex)).onto(found.machine.B)
    q = found.coordinates(load, omega, np.full(len(omega), rpm))
    return np.asarray(q @ found.machine.B.T)


@pytest.mark.parametrize("method", [UPDATE, DIRECT, STATES])
def test_each_method_agrees_with_fifty_digits_on_non_proportional_damping(method: str) -> None:
    M, K, C = drawn(6, 2)
    own = machine(M, K, C)
    states = state_space(own, 0.0, structural=True) if method == STATES else None
    resonance = float(np.sqrt(own.stiffness[2]))
    omega = np.array([3.0, resonance, resonance * (1 + 1e-7), 400.0])
    f = np.arange(1.0, 7.0)
    found = response(Responder(own, method, states), f, omega)
    for w, row in zip(omega, found, strict=True):
        expected = direct(K + 1j * w * C - w * w * M, f)
        assert np.abs(row - expected).max() < 2e-11 * np.abs(expected).max()


def test_loss_factors_and_gyroscopic_terms_agree_with_fifty_digits() -> None:
    M, K, C = drawn(5, 5)
    skew = np.triu(np.full((5, 5), 0.7), 1)
    G, H = skew - skew.T, 0.03 * K + np.diag([500.0, 0, 0, 0, 0])
    own = machine(M, K, C, H, G)
    states = state_space(own, 900.0, structural=True)
    f = np.array([0.0, 1.0, 0, -2.0, 0])
    omega = np.array([50.0, 180.0])
    for method in (Responder(own, DIRECT), Responder(own, STATES, states)):
        found = response(method, f, omega, 900.0)
        for w, row in zip(omega, found, strict=True):
            Z = K + 1j * H + 1j * w * (C + 30 * np.pi * G) - w * w * M
            expected = direct(Z, f)
            assert np.abs(row - expected).max() < 1e-12 * np.abs(expected).max()


def test_the_method_follows_the_structure() -> None:
    M, K, C = drawn(40, 3)
    none = np.zeros_like(C)
    still = np.zeros(100)
    assert responder(machine(M, K, none), 100, still).method == SUM
    assert responder(machine(M, K, 0.3 * M + 1e-4 * K), 100, still).method == SUM
    assert responder(machine(M, K, C), 100, still).method == UPDATE
    everywhere = drawn(40, 40, 5)[2]
    assert responder(machine(M, K, everywhere), 10, still[:10]).method == DIRECT
    assert responder(machine(M, K, everywhere), 2000, np.zeros(2000)).method == STATES


@pytest.mark.parametrize("dampers", [4, 60])
def test_sixty_coordinates_agree_with_a_general_solver_to_nine_digits(dampers: int) -> None:
    """`numpy.linalg.solve` of the dynamic stiffness at each frequency."""
    M, K, C = drawn(60, dampers)
    omega = np.linspace(20.0, 900.0, 900)
    f = np.ones(60)
    found = response(responder(machine(M, K, C), len(omega), np.zeros(900)), f, omega)
    for w, row in zip(omega[::90], found[::90], strict=True):
        expected = np.linalg.solve(K + 1j * w * C - w * w * M, f)
        assert np.abs(row - expected).max() < 1e-9 * np.abs(expected).max()


def test_an_undamped_resonance_is_without_bound() -> None:
    own = machine(np.eye(2), np.diag([4.0, 9.0]), np.zeros((2, 2)))
    load = Load((0,), np.array([[1.0 + 0j, 0.0]]))
    found = Responder(own, SUM).coordinates(load, np.array([2.0, 3.0]), np.zeros(2))
    assert not np.isfinite(found[0, 0])
    assert found[1] == pytest.approx([1 / (4 - 9), 0.0])
