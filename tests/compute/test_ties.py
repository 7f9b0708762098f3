"""Rigid ties: exact, and named where they say nothing new or hold everything."""

from math import pi, sqrt
from typing import Any

import pytest

from schemas.faults import Invalid
from tests.tasks.asking import bodies, hertz, modes, spring

Raw = dict[str, Any]
PLANE = ["x", "z", "ry"]


def link(name: str, first: str, second: str, **fields: object) -> Raw:
    return {"kind": "link", "name": name, "between": [first, second], **fields}


def mounts(body: str) -> list[Raw]:
    return [
        spring(
            f"mount {number}",
            body,
            "ground",
            {"x": 3e5, "y": 2e5, "z": 8e5},
            at=[x, y, -0.4],
        )
        for number, (x, y) in enumerate([(0.9, 0.5), (0.9, -0.6), (-1.1, 0.5), (-0.8, -0.6)])
    ]


LOWER: Raw = {"mass": 700.0, "at": [0.1, 0.0, 0.0]}
UPPER: Raw = {"mass": 300.0, "at": [-0.3, 0.2, 0.8]}
LOWER["inertia"] = {"xx": 60.0, "yy": 90.0, "zz": 110.0, "xy": 4.0, "yz": -3.0, "xz": 2.0}
UPPER["inertia"] = {"xx": 20.0, "yy": 15.0, "zz": 12.0, "xy": -1.0, "yz": 0.5, "xz": 1.5}


def as_one_body() -> Raw:
    """Both as one: common centre of mass, parallel-axis theorem (Huygens–Steiner)."""
    mass = LOWER["mass"] + UPPER["mass"]
    centre = [
        (LOWER["mass"] * a + UPPER["mass"] * b) / mass
        for a, b in zip(LOWER["at"], UPPER["at"], strict=True)
    ]
    tensor = dict.fromkeys(LOWER["inertia"], 0.0)
    for part in (LOWER, UPPER):
        arm = dict(
            zip("xyz", (a - c for a, c in zip(part["at"], centre, strict=True)), strict=True)
        )
        square = sum(value * value for value in arm.values())
        for entry in tensor:
            first, second = entry
            steiner = (first == second) * square - arm[first] * arm[second]
            tensor[entry] += part["inertia"][entry] + part["mass"] * steiner
    return {"name": "lower", "mass": mass, "at": centre, "inertia": tensor}


@pytest.mark.parametrize("at", [None, [0.0, 0.0, 0.0], [5.0, -3.0, 2.0]])
def test_two_bodies_tied_rigidly_move_as_one_body_of_both(at: list[float] | None) -> None:
    where = {} if at is None else {"at": at}
    tied = bodies(
        {"name": "lower", **LOWER},
        {"name": "upper", **UPPER},
        link("bolts", "lower", "upper", **where),
        *mounts("lower"),
    )
    one = bodies(as_one_body(), *mounts("lower"))
    assert hertz(tied) == pytest.approx(hertz(one), rel=1e-12, abs=0)


def test_the_order_of_the_ends_of_a_tie_has_no_say() -> None:
    systems = [
        bodies(
            {"name": "lower", **LOWER},
            {"name": "upper", **UPPER},
            link("bolts", *ends),
            *mounts("lower"),
        )
        for ends in (("lower", "upper"), ("upper", "lower"))
    ]
    assert hertz(systems[0]) == pytest.approx(hertz(systems[1]), rel=1e-12, abs=0)


def test_a_point_tied_to_a_body_carries_its_springs_to_it() -> None:
    # The same mounts at massless points that are tied to the body by rigid arms.
    direct = bodies({"name": "lower", **LOWER}, *mounts("lower"))
    feet, ties, springs = [], [], []
    for number, mount in enumerate(mounts("lower")):
        foot = f"foot {number}"
        feet.append({"name": foot, "at": mount["at"], "motions": ["x", "y", "z"]})
        ties.append(link(f"leg {number}", "lower", foot))
        springs.append({**mount, "between": [foot, "ground"]})
    through = bodies({"name": "lower", **LOWER}, *feet, *ties, *springs)
    assert hertz(through) == pytest.approx(hertz(direct), rel=1e-12, abs=0)


def test_a_ball_joint_ties_the_translations_of_one_point() -> None:
    # A uniform rod hung at its end by a ball joint to a heavy carriage on a torsional coil:
    # Iθ̈ + κθ = 0 about the joint, I = J + m(l/2)², the carriage held.
    m, half, coil = 2.0, 0.6, 350.0
    j = m * (2 * half) ** 2 / 12
    rod = {"name": "rod", "mass": m, "inertia": j, "at": [0.0, 0.0, -half]}
    carriage = {"name": "carriage", "mass": 9.0, "inertia": 1.0, "held": PLANE}
    joint = link("joint", "carriage", "rod", at=[0.0, 0.0, 0.0], motions=["x", "z"])
    system = bodies(
        rod, carriage, joint, spring("coil", "rod", "carriage", {"ry": coil}), motions=PLANE
    )
    expected = sqrt(coil / (j + m * half**2)) / (2 * pi)
    assert hertz(system) == [pytest.approx(expected, rel=1e-13)]


def test_a_motion_held_by_a_tie_to_ground_is_the_same_as_held() -> None:
    part = {"name": "lower", **LOWER}
    held = bodies({**part, "held": ["y", "rx", "rz"]}, *mounts("lower"))
    at = LOWER["at"]
    tied = bodies(
        part,
        link("guide", "lower", "ground", motions=["y", "rx", "rz"], at=at),
        *mounts("lower"),
    )
    assert hertz(tied) == pytest.approx(hertz(held), rel=1e-13, abs=0)


def test_a_tie_that_says_nothing_new_is_named_and_changes_nothing() -> None:
    masses = [{"name": name, "mass": 1.0} for name in "abc"]
    ties = [link("ab", "a", "b"), link("bc", "b", "c")]
    stay = spring("stay", "a", "ground", 500.0)
    once = modes(bodies(*masses, *ties, stay, motions=["x"]))
    twice = modes(bodies(*masses, *ties, link("ca", "c", "a"), stay, motions=["x"]))
    assert once["modes"][0]["frequency_hz"] == twice["modes"][0]["frequency_hz"]
    assert any(warning == "tied more than once: ca." for warning in twice["warnings"])
    assert not any("tied more than once" in warning for warning in once["warnings"])


def test_ties_that_together_hold_a_motion_still_are_named() -> None:
    # In one plane a body pinned at two places can't turn.
    pins = [link(f"pin {x}", "a", "b", at=[x, 0.0, 0.0], motions=["x", "z"]) for x in (1, 2)]
    system = bodies(
        {"name": "a", "mass": 5.0, "inertia": 1.0, "held": ["x", "z", "ry"]},
        {"name": "b", "mass": 1.0, "inertia": 1.0},
        {"name": "c", "mass": 1.0, "inertia": 1.0},
        *pins,
        spring("s", "c", "ground", {"x": 1e3, "z": 1e3, "ry": 1e3}),
        motions=PLANE,
    )
    answer = modes(system)
    assert len(answer["modes"]) == 3
    assert any("pin 2" in warning for warning in answer["warnings"])


def test_shapes_are_given_in_all_motions_and_obey_the_tie() -> None:
    system = bodies(
        {"name": "a", "mass": 3.0, "inertia": 0.4},
        {"name": "b", "mass": 2.0, "inertia": 0.3, "at": [0.7, 0.0, 0.2]},
        link("tie", "a", "b"),
        spring("s", "a", "ground", {"x": 1e3, "z": 2e3, "ry": 4e2}, at=[0.1, 0.0, -0.3]),
        motions=PLANE,
    )
    for mode in modes(system)["modes"]:
        ax, az, a_turn, bx, bz, b_turn = mode["shape"]
        # About y a point moves by θ × arm: x by θ·z, z by −θ·x.
        assert bx == pytest.approx(ax + a_turn * 0.2, abs=1e-12)
        assert bz == pytest.approx(az - a_turn * 0.7, abs=1e-12)
        assert b_turn == pytest.approx(a_turn, abs=1e-12)


def test_a_machine_that_is_tied_altogether_is_refused() -> None:
    system = bodies({"name": "a", "mass": 1.0}, link("l", "a", "ground"), motions=["x"])
    with pytest.raises(Invalid) as caught:
        modes(system)
    assert [fault.pointer for fault in caught.value.faults] == ["/system/bodies"]
