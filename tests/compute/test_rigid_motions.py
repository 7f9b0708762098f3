"""Rigid-body motions: found from the geometry, so that 0 Hz is exactly 0."""

from typing import Any

import numpy as np
import pytest

from schemas.reading import read_system
from service.tasks import summarize
from tests.tasks.asking import bodies, matrices, modes, spring

Raw = dict[str, Any]
INERTIA = {"xx": 3.0, "yy": 4.0, "zz": 5.0, "xy": 0.3, "yz": 0.2, "xz": -0.4}


def still(answer: Raw) -> list[Raw]:
    return [mode for mode in answer["modes"] if mode["kind"] == "rigid-body"]


@pytest.mark.parametrize("scale", [1e-6, 1.0, 1e9])
def test_a_free_body_has_six_at_exactly_zero(scale: float) -> None:
    tensor = {axis: scale * value for axis, value in INERTIA.items()}
    answer = modes(bodies({"name": "a", "mass": scale, "at": [3, 2, 1], "inertia": tensor}))
    assert [mode["frequency_hz"] for mode in answer["modes"]] == [0.0] * 6
    assert [mode["frequency_bound_hz"] for mode in answer["modes"]] == [0.0] * 6
    assert all(mode["period_s"] is None and mode["speed_rpm"] is None for mode in answer["modes"])
    assert answer["evidence"]["complete"]
    assert any("no connection reaches ground" in warning for warning in answer["warnings"])


@pytest.mark.parametrize("spread", [0, 4, 8])
def test_bodies_that_only_hold_each_other_have_six_whatever_their_springs(spread: int) -> None:
    draw = np.random.default_rng(spread)
    places = draw.uniform(-2, 2, (4, 3)).round(3).tolist()
    parts = [
        {"name": f"b{i}", "mass": 5.0, "inertia": INERTIA, "at": place}
        for i, place in enumerate(places)
    ]
    springs = [
        spring(
            f"s{i}{j}",
            f"b{i}",
            f"b{j}",
            {
                axis: float(10 ** (2 + spread * draw.random()))
                for axis in ("x", "y", "z", "rx", "ry", "rz")
            },
            at=draw.uniform(-2, 2, 3).tolist(),
        )
        for i in range(4)
        for j in range(i)
    ]
    system = bodies(*parts, *springs)
    answer = modes(system)
    assert [mode["frequency_hz"] for mode in still(answer)] == [0.0] * 6
    assert len(answer["modes"]) == 24
    assert summarize(read_system(system))["rigid_body_motions"] == 6


def test_a_body_on_one_spring_keeps_what_the_spring_leaves_free() -> None:
    part = {"name": "a", "mass": 5.0, "inertia": INERTIA}
    answer = modes(bodies(part, spring("s", "a", "ground", 1e4, along=[1, 2, 2], at=[0.3, 0, 1])))
    assert len(still(answer)) == 5
    assert answer["modes"][5]["frequency_hz"] > 1.0


def test_a_damper_alone_brings_nothing_back() -> None:
    damper = {"kind": "damper", "name": "d", "between": ["a", "ground"], "damping": 40.0}
    system = bodies(
        {"name": "a", "mass": 1.3},
        {"name": "b", "mass": 0.7},
        spring("s", "a", "b", 1.1e5),
        damper,
        motions=["x"],
    )
    answer = modes(system)
    first, second = answer["modes"]
    assert (first["kind"], first["frequency_hz"], first["frequency_bound_hz"]) == (
        "rigid-body",
        0.0,
        0.0,
    )
    assert second["kind"] == "oscillating"
    assert not any("can't be told" in warning for warning in answer["warnings"])
    assert summarize(read_system(system))["rigid_body_motions"] == 1


def test_free_matrices_are_singular_only_up_to_roundoff_and_the_bound_says_so() -> None:
    # 0.1 + 0.2 isn't 0.3 in doubles: exactly, the lower mode is at √(2.8e-17)/2π = 8.4e-10 Hz.
    answer = modes(matrices([[1.0, 0.0], [0.0, 1.0]], [[0.1 + 0.2, -0.3], [-0.3, 0.3]]))
    first = answer["modes"][0]
    assert (first["kind"], first["frequency_hz"]) == ("rigid-body", 0.0)
    assert 8.4e-10 < first["frequency_bound_hz"] < 1e-7


def test_a_mode_that_cannot_be_told_from_zero_has_a_bound_that_reaches_it() -> None:
    # k = 1e-7 beside 1e8: exactly √(5e-8)/2π = 3.6e-5 Hz or so (as far as doubles hold it).
    answer = modes(matrices([[1.0, 0.0], [0.0, 1.0]], [[1e8, -1e8], [-1e8, 1e8 + 1e-7]]))
    first = answer["modes"][0]
    assert first["frequency_hz"] <= 4e-5
    assert first["frequency_hz"] + first["frequency_bound_hz"] >= 3.4e-5


def test_the_shapes_of_rigid_body_motions_strain_nothing_and_are_orthonormal() -> None:
    part = {"inertia": INERTIA}
    system = bodies(
        {"name": "a", "mass": 5.0, **part},
        {"name": "b", "mass": 2.0, "at": [1.0, 0.5, -0.2], **part},
        spring("s", "a", "b", dict.fromkeys(("x", "y", "z", "rx", "ry", "rz"), 1e5)),
    )
    answer = modes(system)
    shapes = np.array([mode["shape"] for mode in still(answer)])
    arm = np.array([1.0, 0.5, -0.2])
    moved = shapes[:, 0:3] + np.cross(shapes[:, 3:6], arm)
    assert np.abs(shapes[:, 6:9] - moved).max() < 1e-12
    assert np.abs(shapes[:, 9:12] - shapes[:, 3:6]).max() < 1e-12
    assert answer["evidence"]["largest_cross_product"] < 1e-10


def test_a_free_machine_that_is_also_unstable_keeps_its_zero() -> None:
    push = spring("push", "a", "b", -50.0, destabilising=True)
    system = bodies({"name": "a", "mass": 1.0}, {"name": "b", "mass": 1.0}, push, motions=["x"])
    kinds = [(mode["kind"], mode["frequency_hz"] == 0.0) for mode in modes(system)["modes"]]
    assert kinds == [("diverging", False), ("rigid-body", True)]
