"""Machines whose frequencies are known in closed form, each with its source beside it."""

from math import cos, hypot, pi, sin, sqrt
from random import Random
from typing import Any

import mpmath
import pytest

from tests.tasks.asking import bodies, hertz, matrices, modes, spring

G = 9.80665


def roots_of_two(k11: float, k12: float, k22: float, m1: float, m2: float) -> list[float]:
    """Hz of two degrees of freedom: the quadratic of their determinant.

    Two-degree systems, e.g. Meirovitch, Elements of Vibration Analysis (section from memory).
    Solved at 50 digits, so that the closed form adds no roundoff of its own.
    """
    with mpmath.workdps(50):
        a, b = mpmath.mpf(k11) / m1, mpmath.mpf(k22) / m2
        c = mpmath.mpf(k12) ** 2 / (mpmath.mpf(m1) * m2)
        half, spread = (a + b) / 2, mpmath.sqrt(((a - b) / 2) ** 2 + c)
        high = half + spread
        low = (a * b - c) / high
        return [float(mpmath.sqrt(value) / (2 * mpmath.pi)) for value in (low, high)]


def hung(m1: float, m2: float, l1: float, l2: float, k: float) -> dict[str, Any]:
    return bodies(
        {"name": "left", "mass": m1},
        {"name": "right", "mass": m2},
        {"kind": "pendulum", "name": "a", "body": "left", "length": l1},
        {"kind": "pendulum", "name": "b", "body": "right", "length": l2},
        spring("tie", "left", "right", k),
        motions=["x"],
    )


@pytest.mark.parametrize("masses", ["equal", "unequal"])
@pytest.mark.parametrize("lengths", ["equal", "unequal"])
def test_two_hung_masses_have_the_frequencies_of_their_quadratic(masses: str, lengths: str) -> None:
    draw = Random(f"{masses} {lengths}")
    for _ in range(200):
        m1, l1 = 10 ** draw.uniform(-2, 3), 10 ** draw.uniform(-1, 1)
        m2 = m1 if masses == "equal" else 10 ** draw.uniform(-2, 3)
        l2 = l1 if lengths == "equal" else 10 ** draw.uniform(-1, 1)
        # From a tie that is hardly felt to one ten times as stiff as the hanging.
        k = min(m1 * G / l1, m2 * G / l2) * 10 ** draw.uniform(-6, 1)
        with mpmath.workdps(50):
            hang = [
                mpmath.mpf(m) * mpmath.mpf(G) / mpmath.mpf(rod) for m, rod in ((m1, l1), (m2, l2))
            ]
            expected = roots_of_two(hang[0] + k, -k, hang[1] + k, m1, m2)
        assert hertz(hung(m1, m2, l1, l2, k)) == pytest.approx(expected, rel=1e-12, abs=0)


def test_equal_hung_masses_swing_together_as_one_pendulum_and_against_each_other() -> None:
    # Rayleigh, Theory of Sound, on coupled pendulums (from memory): g/l, and g/l + 2k/m.
    answer = modes(hung(2.0, 2.0, 0.5, 0.5, 30.0))["modes"]
    assert answer[0]["frequency_hz"] == pytest.approx(sqrt(G / 0.5) / (2 * pi), rel=1e-14)
    assert answer[1]["frequency_hz"] == pytest.approx(sqrt(G / 0.5 + 30.0) / (2 * pi), rel=1e-14)
    assert answer[0]["shape"] == pytest.approx([0.5, 0.5])
    assert answer[1]["shape"] == pytest.approx([0.5, -0.5])


@pytest.mark.parametrize("stories", [1, 2, 5, 20, 50])
def test_a_uniform_shear_building_has_the_frequencies_of_the_fixed_free_chain(stories: int) -> None:
    # ω = 2√(k/m)·sin((2i − 1)π/(2(2n + 1))): Rayleigh, Theory of Sound, ch. 6; Blevins, Formulas
    # for Natural Frequency and Mode Shape (1979), spring-mass chains (from memory).
    m, k = 12_500.0, 4.2e7
    floors = [{"name": f"floor {i}", "mass": m} for i in range(stories)]
    columns = [
        spring(f"story {i}", f"floor {i}", f"floor {i - 1}" if i else "ground", k)
        for i in range(stories)
    ]
    expected = [
        2 * sqrt(k / m) * sin((2 * i - 1) * pi / (2 * (2 * stories + 1))) / (2 * pi)
        for i in range(1, stories + 1)
    ]
    found = hertz(bodies(*floors, *columns, motions=["x"]), count=stories)
    assert found == pytest.approx(expected, rel=1e-11)


def torsional_line(inertias: list[float], stiffnesses: list[float]) -> dict[str, Any]:
    disks = [{"name": f"disk {i}", "inertia": value} for i, value in enumerate(inertias)]
    shafts = [
        spring(f"shaft {i}", f"disk {i}", f"disk {i + 1}", value)
        for i, value in enumerate(stiffnesses)
    ]
    return bodies(*disks, *shafts, motions=["rx"])


def test_two_disks_twist_against_each_other() -> None:
    # √(k(J₁ + J₂)/(J₁J₂)): Den Hartog, Mechanical Vibrations, torsional vibration (from memory).
    found = hertz(torsional_line([3.0, 0.7], [5.2e5]))
    expected = sqrt(5.2e5 * (3.0 + 0.7) / (3.0 * 0.7)) / (2 * pi)
    assert found == [0.0, pytest.approx(expected, rel=1e-14)]


@pytest.mark.parametrize("seed", range(20))
def test_three_disks_have_the_two_roots_of_their_quadratic(seed: int) -> None:
    # ω⁴ − ω²(k₁/J₁ + (k₁ + k₂)/J₂ + k₂/J₃) + k₁k₂(J₁ + J₂ + J₃)/(J₁J₂J₃) = 0: Timoshenko, Vibration
    # Problems in Engineering, torsional vibration (section from memory).
    draw = Random(seed)
    j = [10 ** draw.uniform(-1, 2) for _ in range(3)]
    k = [10 ** draw.uniform(4, 6) for _ in range(2)]
    with mpmath.workdps(50):
        J, (k1, k2) = [mpmath.mpf(v) for v in j], [mpmath.mpf(v) for v in k]
        b = k1 / J[0] + (k1 + k2) / J[1] + k2 / J[2]
        c = k1 * k2 * sum(J) / (J[0] * J[1] * J[2])
        high = (b + mpmath.sqrt(b * b - 4 * c)) / 2
        expected = [float(mpmath.sqrt(v) / (2 * mpmath.pi)) for v in (c / high, high)]
    assert hertz(torsional_line(j, k)) == [
        0.0,
        pytest.approx(expected[0], rel=1e-12),
        pytest.approx(expected[1], rel=1e-12),
    ]


def block(height: float) -> dict[str, Any]:
    """800 kg on four equal mounts at the corners of 2 m × 1.2 m, `height` below the centre."""
    mounts = [
        spring(
            f"mount at {x} {y}",
            "block",
            "ground",
            {"x": 3e5, "y": 2e5, "z": 9e5},
            at=[x, y, -height],
        )
        for x in (-1.0, 1.0)
        for y in (-0.6, 0.6)
    ]
    inertia = {"xx": 110.0, "yy": 250.0, "zz": 310.0}
    return bodies({"name": "block", "mass": 800.0, "inertia": inertia}, *mounts)


def test_a_block_on_mounts_level_with_its_centre_has_six_modes_apart() -> None:
    # Harris, Shock and Vibration Handbook, rigid body on resilient supports (from memory).
    kx, ky, kz = 4 * 3e5, 4 * 2e5, 4 * 9e5
    squares = [
        kx / 800.0,
        ky / 800.0,
        kz / 800.0,
        kz * 0.6**2 / 110.0,
        kz * 1.0**2 / 250.0,
        (kx * 0.6**2 + ky * 1.0**2) / 310.0,
    ]
    expected = sorted(sqrt(value) / (2 * pi) for value in squares)
    assert hertz(block(0.0)) == pytest.approx(expected, rel=1e-13)


@pytest.mark.parametrize("height", [0.05, 0.35, 1.4])
def test_a_block_above_its_mounts_sways_and_rocks_in_two_pairs(height: float) -> None:
    # Harris (from memory): in each vertical plane k·x and the rocking stiffness couple by k·height.
    kx, ky, kz = 4 * 3e5, 4 * 2e5, 4 * 9e5
    expected = sorted(
        [
            *roots_of_two(kx, -kx * height, kz * 1.0**2 + kx * height**2, 800.0, 250.0),
            *roots_of_two(ky, ky * height, kz * 0.6**2 + ky * height**2, 800.0, 110.0),
            sqrt(kz / 800.0) / (2 * pi),
            sqrt((kx * 0.6**2 + ky * 1.0**2) / 310.0) / (2 * pi),
        ]
    )
    assert hertz(block(height)) == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize("degrees", [0.0, 20.0, 45.0, 70.0])
def test_inclined_mounts_have_the_stiffness_of_their_projection(degrees: float) -> None:
    # k cos² + k′ sin² along each axis: Harris, inclined resilient supports (from memory).
    a = degrees * pi / 180
    ahead = [[cos(a), 0.0, sin(a)], [0.0, 1.0, 0.0], [-sin(a), 0.0, cos(a)]]
    behind = [[cos(a), 0.0, -sin(a)], [0.0, 1.0, 0.0], [sin(a), 0.0, cos(a)]]
    pair = [
        spring(f"mount {i}", "block", "ground", {"x": 2e5, "z": 8e5}, axes=axes)
        for i, axes in enumerate((ahead, behind))
    ]
    system = bodies({"name": "block", "mass": 100.0}, *pair, motions=["x", "z"])
    along_x = 2 * (2e5 * cos(a) ** 2 + 8e5 * sin(a) ** 2)
    along_z = 2 * (8e5 * cos(a) ** 2 + 2e5 * sin(a) ** 2)
    expected = sorted(sqrt(k / 100.0) / (2 * pi) for k in (along_x, along_z))
    assert hertz(system) == pytest.approx(expected, rel=1e-13)


def test_a_spring_along_a_direction_acts_with_the_square_of_its_cosine() -> None:
    # k·n nᵀ with n the unit vector of (3, 4): one motion with all of k, one with none.
    strut = spring("strut", "mass", "ground", 5e4, along=[3, 0, 4])
    answer = modes(bodies({"name": "mass", "mass": 2.0}, strut, motions=["x", "z"]))["modes"]
    assert [mode["frequency_hz"] for mode in answer] == [
        0.0,
        pytest.approx(sqrt(5e4 / 2.0) / (2 * pi), rel=1e-14),
    ]
    assert answer[1]["shape"] == pytest.approx([0.6 / sqrt(2.0), 0.8 / sqrt(2.0)])


def test_a_pendulum_swings_the_same_in_both_horizontal_directions() -> None:
    # √(g/l), whatever the mass: Huygens 1673, Horologium oscillatorium.
    rod = {"kind": "pendulum", "name": "rod", "body": "bob", "length": 0.25}
    answer = modes(bodies({"name": "bob", "mass": 7.0}, rod, motions=["x", "y"]))["modes"]
    expected = pytest.approx(sqrt(G / 0.25) / (2 * pi), rel=1e-14)
    assert [mode["frequency_hz"] for mode in answer] == [expected, expected]
    assert answer[0]["shape"] == pytest.approx([1 / sqrt(7.0), 0.0])
    assert answer[1]["shape"] == pytest.approx([0.0, 1 / sqrt(7.0)])


@pytest.mark.parametrize("seed", range(5))
def test_full_matrices_agree_with_fifty_digit_eigenvalues(seed: int) -> None:
    # `mpmath.eigsy` on L⁻¹KL⁻ᵀ at 50 digits.
    draw = Random(seed)
    size = 6
    B = [[draw.uniform(-1, 1) for _ in range(size)] for _ in range(size)]
    C = [[draw.uniform(-1, 1) * 10 ** draw.uniform(0, 3) for _ in range(size)] for _ in range(size)]
    mass, stiffness = (
        [[sum(r[i] * r[j] for r in A) + (i == j) for j in range(size)] for i in range(size)]
        for A in (B, C)
    )
    with mpmath.workdps(50):
        inverse = mpmath.inverse(mpmath.cholesky(mpmath.matrix(mass)))
        values = mpmath.eigsy(inverse * mpmath.matrix(stiffness) * inverse.T, eigvals_only=True)
        expected = sorted(float(mpmath.sqrt(value) / (2 * mpmath.pi)) for value in values)
    answer = modes(matrices(mass, stiffness))["modes"]
    for mode, value in zip(answer, expected, strict=True):
        assert abs(mode["frequency_hz"] - value) <= mode["frequency_bound_hz"] + 1e-15 * value
        assert mode["frequency_hz"] == pytest.approx(value, rel=1e-9)


def test_an_inverted_pendulum_falls_at_the_rate_of_its_closed_form() -> None:
    # A rod end pushed aside by m·g/l and held by k < m·g/l grows as e^√(g/l − k/m)·t: Meirovitch,
    # on stability of equilibrium (from memory).
    m, length, k = 3.0, 0.8, 20.0
    push = spring("gravity", "bob", "ground", -m * G / length, destabilising=True)
    answer = modes(
        bodies({"name": "bob", "mass": m}, push, spring("stay", "bob", "ground", k), motions=["x"])
    )
    (mode,) = answer["modes"]
    rate = sqrt(G / length - k / m)
    assert mode["kind"] == "diverging"
    assert mode["growth_rate_per_s"] == pytest.approx(rate, rel=1e-13)
    assert mode["frequency_hz"] == pytest.approx(rate / (2 * pi), rel=1e-13)
    assert mode["period_s"] is None
    assert mode["speed_rpm"] is None
    assert any("unstable" in warning for warning in answer["warnings"])


def test_an_arm_of_any_direction_adds_its_square_to_the_inertia() -> None:
    # A body turning about a fixed point: J + m·r² (Huygens–Steiner), on a torsional spring.
    arm = [0.3, -0.4]
    pin = {"kind": "link", "name": "pin", "between": ["arm", "ground"], "motions": ["x", "z"]}
    system = bodies(
        {"name": "arm", "mass": 4.0, "inertia": 0.5, "at": [arm[0], 0.0, arm[1]]},
        {**pin, "at": [0.0, 0.0, 0.0]},
        spring("coil", "arm", "ground", {"ry": 900.0}),
        motions=["x", "z", "ry"],
    )
    expected = sqrt(900.0 / (0.5 + 4.0 * hypot(*arm) ** 2)) / (2 * pi)
    assert hertz(system) == [pytest.approx(expected, rel=1e-13)]
