"""Damped modes against closed forms and 50-digit eigenvalues."""

from math import pi, sqrt
from typing import Any

import mpmath as mp
import numpy as np
import pytest

from tests.tasks.asking import hertz, modes

Raw = dict[str, Any]


def matrices(M: Any, K: Any, C: Any = None, **more: Any) -> Raw:
    """A system of explicit matrices."""
    size = len(M)
    system: Raw = {
        "kind": "matrices",
        "degrees_of_freedom": [f"p{number}/x" for number in range(size)],
        "mass": np.asarray(M).tolist(),
        "stiffness": np.asarray(K).tolist(),
        **{name: np.asarray(value).tolist() for name, value in more.items()},
    }
    return system if C is None else {**system, "damping": np.asarray(C).tolist()}


def exact_roots(M: Any, C: Any, K: Any) -> list[complex]:
    """Roots of λ²M + λC + K at 50 digits, upper half plane and real ones, by size."""
    size = len(M)
    with mp.workdps(50):
        inverse = mp.inverse(mp.matrix(np.asarray(M).tolist()))
        A = mp.zeros(2 * size)
        left, right = -inverse * mp.matrix(K.tolist()), -inverse * mp.matrix(C.tolist())
        for i in range(size):
            A[i, size + i] = 1
            for j in range(size):
                A[size + i, j], A[size + i, size + j] = left[i, j], right[i, j]
        found = [complex(root) for root in mp.eig(A, left=False, right=False)]
    kept = [root for root in found if root.imag > -1e-25]
    return sorted(kept, key=abs)


@pytest.mark.parametrize("seed", range(12))
def test_random_non_proportional_damping_meets_50_digit_eigenvalues(seed: int) -> None:
    random = np.random.default_rng(seed)
    size = int(random.integers(2, 6))
    B, D, E = (random.standard_normal((size, size)) for _ in range(3))
    M = B @ B.T + size * np.eye(size)
    K = 1e4 * (D @ D.T + np.eye(size))
    C = (5.0, 60.0, 600.0)[seed % 3] * (E @ E.T)
    M, K, C = ((A + A.T) / 2 for A in (M, K, C))
    answer = modes(matrices(M, K, C), damped=True)
    expected = exact_roots(M, C, K)
    assert len(answer["modes"]) == len(expected)
    for mode, root in zip(answer["modes"], expected, strict=True):
        found = complex(mode["growth_rate_per_s"], 2 * pi * mode["damped_frequency_hz"])
        assert abs(found - root) <= max(2 * pi * mode["frequency_bound_hz"], 1e-11 * abs(root))
        assert mode["kind"] == ("oscillating" if root.imag > 1e-20 else "overdamped")
    assert answer["evidence"]["complete"]


@pytest.mark.parametrize("ratio", [0.0, 0.02, 0.7, 0.999])
def test_an_assumed_damping_ratio_comes_back_in_every_mode(ratio: float) -> None:
    system = {
        "kind": "bodies",
        "motions": ["x"],
        "bodies": [{"name": "a", "mass": 2.0}, {"name": "b", "mass": 5.0}],
        "connections": [
            {"kind": "spring", "name": "k", "between": ["ground", "a"], "stiffness": 3e4},
            {"kind": "spring", "name": "l", "between": ["a", "b"], "stiffness": 8e4},
        ],
        "damping": {"kind": "modal", "ratio": ratio},
    }
    for mode, plain in zip(
        modes(system, damped=True)["modes"], hertz({**system, "damping": None}), strict=True
    ):
        assert mode["damping_ratio"] == pytest.approx(ratio, rel=1e-12, abs=1e-15)
        assert mode["frequency_hz"] == pytest.approx(plain, rel=1e-12)


def test_an_overdamped_mass_has_the_two_real_roots_of_its_quadratic() -> None:
    mass, k, c = 3.0, 40.0, 500.0
    answer = modes(matrices([[mass]], [[k]], [[c]]), damped=True)["modes"]
    fast = (-c - sqrt(c * c - 4 * mass * k)) / (2 * mass)
    slow = k / (mass * fast)
    assert [mode["kind"] for mode in answer] == ["overdamped", "overdamped"]
    assert [mode["growth_rate_per_s"] for mode in answer] == pytest.approx([slow, fast], rel=1e-13)
    assert [mode["damping_ratio"] for mode in answer] == [1.0, 1.0]


@pytest.mark.parametrize("loss", [0.05, 0.4])
def test_a_loss_factor_gives_the_root_of_a_complex_stiffness(loss: float) -> None:
    system = {
        "kind": "bodies",
        "motions": ["z"],
        "bodies": [{"name": "m", "mass": 200.0}],
        "connections": [
            {
                "kind": "spring", "name": "k", "between": ["m", "ground"], "stiffness": 3.2e6,
                "loss_factor": loss,
            }
        ],
    }  # fmt: skip
    root = 1j * np.sqrt(3.2e6 * (1 + 1j * loss) / 200.0)
    mode = modes(system, damped=True)["modes"][0]
    assert mode["frequency_rad_s"] == pytest.approx(abs(root), rel=1e-12)
    assert mode["damping_ratio"] == pytest.approx(-root.real / abs(root), rel=1e-12)


def test_a_damped_massless_point_gives_the_cubic_of_a_standard_linear_solid() -> None:
    # m on k, beside a spring l in series with a damper c: (λ²m + k)(l + λc) + λcl = 0.
    mass, k, spring, c = 12.0, 5e4, 9e4, 700.0
    system = {
        "kind": "bodies",
        "motions": ["x"],
        "bodies": [{"name": "m", "mass": mass}, {"name": "joint"}],
        "connections": [
            {"kind": "spring", "name": "k", "between": ["ground", "m"], "stiffness": k},
            {"kind": "spring", "name": "l", "between": ["m", "joint"], "stiffness": spring},
            {"kind": "damper", "name": "c", "between": ["joint", "ground"], "damping": c},
        ],
    }
    with mp.workdps(40):
        exact = mp.polyroots([mass * c, mass * spring, c * (k + spring), k * spring], maxsteps=200)
    expected = sorted(
        (complex(root) for root in exact if complex(root).imag > -1e-20), key=lambda root: abs(root)
    )
    answer = modes(system, damped=True)
    found = [
        complex(mode["growth_rate_per_s"], 2 * pi * mode["damped_frequency_hz"])
        for mode in answer["modes"]
    ]
    assert found == pytest.approx(expected, rel=1e-11)
    assert answer["evidence"]["roots_expected"] == 3
    assert answer["evidence"]["complete"]


def test_a_nearly_defective_pair_is_flagged() -> None:
    # Two equal oscillators coupled by damping alone and one-sidedly: a Jordan block in the limit.
    C = np.array([[0.0, 2.0], [1e-18, 0.0]])
    answer = modes(matrices(np.eye(2), 1e4 * np.eye(2), C), damped=True)
    assert answer["evidence"]["nearly_defective"]
    assert any("defective" in warning for warning in answer["warnings"])


def test_negative_damping_diverges() -> None:
    mode = modes(matrices([[1.0]], [[100.0]], [[-0.4]]), damped=True)["modes"][0]
    assert mode["kind"] == "diverging"
    assert mode["growth_rate_per_s"] == pytest.approx(0.2, rel=1e-12)


def test_undamped_systems_answer_as_without_damping() -> None:
    random = np.random.default_rng(4)
    B = random.standard_normal((9, 9))
    K, M = 1e5 * (B @ B.T + np.eye(9)), np.diag(random.uniform(1, 9, 9))
    K = (K + K.T) / 2
    plain, damped = hertz(matrices(M, K)), hertz(matrices(M, K), damped=True)
    assert damped == pytest.approx(plain, rel=1e-10)


def test_whirl_of_an_overhung_disk_meets_its_quartic() -> None:
    # A disk on a massless cantilever shaft (length L, EI): u″m + k₁u − k₂θ …; Genta (from memory).
    mass, polar, tilt, EI, length, rpm = 30.0, 1.6, 0.9, 6.2e4, 0.45, 4000.0
    k1, k2, k3 = 12 * EI / length**3, 6 * EI / length**2, 4 * EI / length
    section = {
        "kind": "properties", "area": 1e-3, "iy": EI / 2e11, "iz": EI / 2e11, "j": 2 * EI / 2e11,
    }  # fmt: skip
    motions = ["y", "z", "ry", "rz"]
    system = {
        "kind": "bodies",
        "motions": motions,
        "bodies": [
            {"name": "root", "held": motions},
            {
                "name": "disk", "at": [length, 0, 0], "mass": mass,
                "inertia": {"xx": polar, "yy": tilt, "zz": tilt}, "spin": {"axis": "x"},
            },
        ],
        "connections": [
            {
                "kind": "beam", "name": "shaft", "between": ["root", "disk"], "elements": 1,
                "youngs_modulus": 2e11, "density": 1e-9, "section": section,
            }
        ],
    }  # fmt: skip
    spin = rpm * pi / 30
    # Circular whirl at ω (signed): (k₁ − mω²)(k₃ − It·ω² + Ip·Ω·ω) − k₂² = 0.
    quartic = np.polymul([-mass, 0.0, k1], [-tilt, polar * spin, k3])
    quartic[-1] -= k2**2
    expected = sorted(np.abs(np.roots(quartic).real) / (2 * pi))
    answer = modes(system, damped=True, at_rpm=rpm)
    found = sorted(mode["frequency_hz"] for mode in answer["modes"])
    assert found == pytest.approx(expected, rel=1e-8)
    ways = [mode["whirl"] for mode in answer["modes"]]
    assert sorted(way for way in ways if way) == ["backward", "backward", "forward", "forward"]
