"""Beams, shafts, gears and footings against tables and closed forms."""

from itertools import pairwise
from math import cos, cosh, pi, sin, sinh, sqrt
from typing import Any

import numpy as np
import pytest
from scipy.optimize import brentq

from schemas.faults import Invalid
from tests.tasks.asking import hertz, modes

Raw = dict[str, Any]
E, RHO, LENGTH = 205e9, 7850.0, 2.4
AREA, SECOND = 1e-3, 1e-7 / 3


def beam(held: tuple[list[str], list[str]], elements: int, **fields: object) -> Raw:
    """A Bernoulli beam along x that bends in z."""
    section = {"kind": "properties", "area": AREA, "iy": SECOND, "iz": SECOND, "j": 2 * SECOND}
    part = {
        "kind": "beam",
        "name": "beam",
        "between": ["A", "B"],
        "elements": elements,
        "youngs_modulus": E,
        "density": RHO,
        "section": section,
        **fields,
    }
    return {
        "kind": "bodies",
        "motions": ["z", "ry"],
        "bodies": [
            {"name": "A", "held": held[0]},
            {"name": "B", "at": [LENGTH, 0, 0], "held": held[1]},
        ],
        "connections": [part],
    }


def table_hertz(eigenvalue: float) -> float:
    """f = λ²/(2πL²)·√(EI/m)."""
    return eigenvalue**2 / (2 * pi * LENGTH**2) * sqrt(E * SECOND / (RHO * AREA))


# Blevins, Formulas for Natural Frequency and Mode Shape (1979), single-span beams: the frequency
# equations, solved anew near the table's values (from memory).
ENDS = {
    "clamped-free": ((["z", "ry"], []), lambda x: cos(x) * cosh(x) + 1, (1.875, 4.694, 7.855), 0),
    "clamped-clamped": (
        (["z", "ry"], ["z", "ry"]), lambda x: cos(x) * cosh(x) - 1, (4.730, 7.853, 10.996), 0,
    ),
    "free-free": (([], []), lambda x: cos(x) * cosh(x) - 1, (4.730, 7.853, 10.996), 2),
    "clamped-pinned": (
        (["z", "ry"], ["z"]), lambda x: cos(x) * sinh(x) - sin(x) * cosh(x),
        (3.927, 7.069, 10.21), 0,
    ),
    "pinned-pinned": ((["z"], ["z"]), sin, (pi, 2 * pi, 3 * pi), 0),
}  # fmt: skip


@pytest.mark.parametrize("name", ENDS)
def test_eight_elements_a_half_wave_meet_the_lambda_tables_to_a_hundredth_of_a_percent(
    name: str,
) -> None:
    held, equation, near, rigid = ENDS[name]
    found = hertz(beam(held, 24), count=rigid + 3)
    assert found[:rigid] == [0.0] * rigid
    for place, guess in enumerate(near):
        eigenvalue = brentq(equation, guess - 0.05, guess + 0.05, xtol=1e-13)
        assert found[rigid + place] == pytest.approx(table_hertz(eigenvalue), rel=1e-4)


def test_the_element_converges_with_the_fourth_power_of_its_length() -> None:
    exact = table_hertz(3 * pi)
    errors = [hertz(beam((["z"], ["z"]), n), count=3)[2] / exact - 1 for n in (6, 12, 24)]
    orders = [np.log2(a / b) for a, b in pairwise(errors)]
    assert orders == pytest.approx([4.0, 4.0], abs=0.1)


def test_a_cantilever_with_a_tip_mass_meets_its_transcendental_equation() -> None:
    # 1 + cos cosh + μx(cos sinh − sin cosh) = 0, μ = m/(mass of the beam); Blevins (1979).
    mass = 0.7 * RHO * AREA * LENGTH
    system = beam((["z", "ry"], []), 16)
    system["bodies"][1]["mass"] = mass
    ratio = mass / (RHO * AREA * LENGTH)

    def equation(x: float) -> float:
        return 1 + cos(x) * cosh(x) + ratio * x * (cos(x) * sinh(x) - sin(x) * cosh(x))

    expected = [table_hertz(brentq(equation, *ends)) for ends in ((0.5, 2.0), (3.5, 4.6))]
    assert hertz(system, count=2) == pytest.approx(expected, rel=2e-5)


def test_a_deep_pinned_beam_meets_timoshenko_s_closed_form() -> None:
    # Timoshenko (1921), pinned ends: a quadratic in ω² for each half-wave number (from memory).
    area, second, shear = 0.015, 1.125e-4, 0.0125
    G = E / 2.6
    system = beam(
        (["z"], ["z"]),
        40,
        theory="timoshenko",
        poissons_ratio=0.3,
        section={
            "kind": "properties", "area": area, "iy": second, "iz": second, "j": 2 * second,
            "shear_area_y": shear, "shear_area_z": shear,
        },
    )  # fmt: skip
    found = hertz(system, count=2)
    for number in (1, 2):
        k = number * pi / LENGTH
        a = RHO * second * RHO * area / (G * shear)
        b = RHO * area + k**2 * (RHO * second + E * second * RHO * area / (G * shear))
        c = E * second * k**4
        omega = sqrt((b - sqrt(b * b - 4 * a * c)) / (2 * a))
        # The shape functions are those of static deflection: second order in the element here.
        assert found[number - 1] == pytest.approx(omega / (2 * pi), rel=2e-4)


@pytest.mark.parametrize("tension", [9000.0, -2000.0])
def test_a_pinned_beam_under_axial_force_meets_its_closed_form(tension: float) -> None:
    # ω² = (nπ/L)⁴EI/m + (nπ/L)²T/m; Timoshenko, Vibration Problems in Engineering (from memory).
    found = hertz(beam((["z"], ["z"]), 24, axial_force=tension), count=2)
    for number in (1, 2):
        k = number * pi / LENGTH
        omega = sqrt((k**4 * E * SECOND + k**2 * tension) / (RHO * AREA))
        assert found[number - 1] == pytest.approx(omega / (2 * pi), rel=2e-5)


def test_a_beam_pressed_beyond_euler_s_load_diverges() -> None:
    euler = pi**2 * E * SECOND / LENGTH**2
    answer = modes(beam((["z"], ["z"]), 16, axial_force=-1.2 * euler), count=1)
    assert answer["modes"][0]["kind"] == "diverging"


def test_a_round_beam_in_space_has_the_same_hertz_in_every_direction() -> None:
    found = []
    for direction in ([1, 0, 0], [0, 1, 0], [0, 0, 1], [0.6, 0.0, 0.8]):
        system = {
            "kind": "bodies",
            "bodies": [
                {"name": "A", "held": ["x", "y", "z", "rx", "ry", "rz"]},
                {"name": "B", "at": [1.7 * c for c in direction], "mass": 3.0},
            ],
            "connections": [
                {
                    "kind": "beam", "name": "column", "between": ["A", "B"], "material": "steel",
                    "section": {"kind": "tube", "outer_diameter": 0.09, "inner_diameter": 0.07},
                }
            ],
        }  # fmt: skip
        found.append(hertz(system, count=6))
    for other in found[1:]:
        assert other == pytest.approx(found[0], rel=1e-9)


def test_a_stubby_rectangle_twists_by_saint_venant_s_constant() -> None:
    # Torsion of a square bar: J = 0.1406 a⁴ (Timoshenko and Goodier, table, from memory).
    a, length, inertia = 0.05, 1.0, 40.0
    system = {
        "kind": "bodies",
        "motions": ["rx"],
        "bodies": [
            {"name": "A", "held": ["rx"]},
            {"name": "B", "at": [length, 0, 0], "inertia": inertia},
        ],
        "connections": [
            {
                "kind": "beam", "name": "bar", "between": ["A", "B"], "elements": 1,
                "youngs_modulus": 200e9, "poissons_ratio": 0.25, "density": 1e-3,
                "section": {"kind": "rectangle", "width": a, "height": a},
            }
        ],
    }  # fmt: skip
    k = 80e9 * 0.1406 * a**4 / length
    assert hertz(system)[0] == pytest.approx(sqrt(k / inertia) / (2 * pi), rel=2e-3)


def train(*parts: Raw, **inertias: float) -> Raw:
    """Disks that turn about x."""
    return {
        "kind": "bodies",
        "motions": ["rx"],
        "bodies": [{"name": name, "inertia": value} for name, value in inertias.items()],
        "connections": list(parts),
    }


def shaft(name: str, first: str, second: str, k: float) -> Raw:
    """A massless shaft."""
    return {"kind": "shaft", "name": name, "between": [first, second], "stiffness": k}


def test_a_branched_geared_train_is_the_same_as_its_reduction_to_one_speed() -> None:
    # Inertia and stiffness behind a gear times the squared ratio; Den Hartog (from memory).
    ratios = {"p": -3.2, "q": 0.4}
    system = train(
        shaft("s1", "motor", "wheel", 4e5),
        {"kind": "gear", "name": "g1", "between": ["wheel", "p"], "ratio": ratios["p"]},
        {"kind": "gear", "name": "g2", "between": ["wheel", "q"], "ratio": ratios["q"]},
        shaft("s2", "p", "fan", 2.2e4),
        shaft("s3", "q", "pump", 9e5),
        motor=12.0, wheel=1.1, p=0.06, q=2.0, fan=0.9, pump=30.0,
    )  # fmt: skip
    wheel = 1.1 + 3.2**2 * 0.06 + 0.4**2 * 2.0
    M = np.diag([12.0, wheel, 3.2**2 * 0.9, 0.4**2 * 30.0])
    k1, k2, k3 = 4e5, 3.2**2 * 2.2e4, 0.4**2 * 9e5
    K = np.array([
        [k1, -k1, 0, 0], [-k1, k1 + k2 + k3, -k2, -k3], [0, -k2, k2, 0], [0, -k3, 0, k3],
    ])  # fmt: skip
    root = np.sqrt(np.linalg.inv(M))
    expected = np.sqrt(np.abs(np.linalg.eigvalsh(root @ K @ root))) / (2 * pi)
    found = hertz(system)
    assert found[0] == 0.0
    assert found[1:] == pytest.approx(expected[1:], rel=1e-12)


def test_a_stiff_mesh_comes_close_to_the_exact_ratio() -> None:
    def geared(**mesh: object) -> Raw:
        gear = {"kind": "gear", "name": "g", "between": ["b", "c"], "ratio": -2.5, **mesh}
        return train(
            shaft("s1", "a", "b", 3e5), gear, shaft("s2", "c", "d", 5e4), a=4.0, b=0.5, c=0.1, d=1.0
        )

    exact = hertz(geared())
    meshed = hertz(geared(mesh_stiffness=1e14, pitch_radius=[0.25, 0.10]), count=3)
    assert meshed[1:] == pytest.approx(exact[1:], rel=1e-5)


def test_gears_in_a_closed_ring_that_disagree_are_named_as_locking() -> None:
    ring = [
        {"kind": "gear", "name": f"g{i}", "between": pair, "ratio": ratio}
        for i, (pair, ratio) in enumerate(
            ((["a", "b"], -2.0), (["b", "c"], -2.0), (["c", "a"], 0.5))
        )
    ]
    with pytest.raises(Invalid):
        modes(train(*ring, a=1.0, b=1.0, c=1.0))
    answer = modes(train(*ring, shaft("s", "c", "d", 1e3), a=1.0, b=1.0, c=1.0, d=2.0))
    assert any("g2" in warning for warning in answer["warnings"])
    assert answer["modes"][0]["frequency_hz"] == pytest.approx(sqrt(500.0) / (2 * pi), rel=1e-12)


def test_a_shaft_s_own_inertia_is_shared_between_its_ends() -> None:
    section = {"length": 1.0, "outer_diameter": 0.1, "material": "steel"}
    polar = pi * 0.1**4 / 32
    own, k = 7850 * polar * 1.0, 210e9 / 2.6 * polar
    system = train(
        {"kind": "shaft", "name": "s", "between": ["a", "b"], "sections": [section]}, a=0.2, b=0.4
    )
    first, second = 0.2 + own / 2, 0.4 + own / 2
    expected = sqrt(k * (first + second) / (first * second)) / (2 * pi)
    assert hertz(system)[1] == pytest.approx(expected, rel=1e-12)


def test_a_footing_has_the_half_space_constants_in_every_motion() -> None:
    # Richart, Hall and Woods (1970), rigid circular footing: constants from memory.
    G, nu, rho, r, mass = 40e6, 0.35, 1800.0, 1.2, 16000.0
    inertia = {"xx": 9000.0, "yy": 9000.0, "zz": 12000.0}
    system = {
        "kind": "bodies",
        "bodies": [{"name": "block", "mass": mass, "inertia": inertia}],
        "connections": [
            {
                "kind": "pad", "name": "soil", "between": ["block", "ground"],
                "footing": {"kind": "circle", "radius": r},
                "shear_modulus": G, "poissons_ratio": nu, "density": rho,
            }
        ],
    }  # fmt: skip
    k = {
        "x": 32 * (1 - nu) * G * r / (7 - 8 * nu),
        "z": 4 * G * r / (1 - nu),
        "rx": 8 * G * r**3 / (3 * (1 - nu)),
        "rz": 16 * G * r**3 / 3,
    }
    ratio = {
        "x": 0.288 / sqrt((7 - 8 * nu) * mass / (32 * (1 - nu) * rho * r**3)),
        "z": 0.425 / sqrt((1 - nu) * mass / (4 * rho * r**3)),
    }
    rocking = 3 * (1 - nu) * 9000.0 / (8 * rho * r**5)
    ratio["rx"] = 0.15 / ((1 + rocking) * sqrt(rocking))
    ratio["rz"] = 0.50 / (1 + 2 * 12000.0 / (rho * r**5))
    expected = sorted(
        [
            (sqrt(k["x"] / mass), ratio["x"]), (sqrt(k["x"] / mass), ratio["x"]),
            (sqrt(k["z"] / mass), ratio["z"]), (sqrt(k["rx"] / 9000.0), ratio["rx"]),
            (sqrt(k["rx"] / 9000.0), ratio["rx"]), (sqrt(k["rz"] / 12000.0), ratio["rz"]),
        ]
    )  # fmt: skip
    answer = modes(system, damped=True)
    for mode, (omega, damping) in zip(answer["modes"], expected, strict=True):
        assert mode["frequency_rad_s"] == pytest.approx(omega, rel=1e-12)
        assert mode["damping_ratio"] == pytest.approx(damping, rel=1e-12)
