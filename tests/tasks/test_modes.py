"""The task `modes`: what an answer says, and that it says it in the contract's form."""

from itertools import pairwise
from math import pi
from typing import Any

import pytest

from schemas.modes import ModesAnswer
from tests.tasks.asking import bodies, matrices, modes, spring

Raw = dict[str, Any]

SKID = bodies(
    {"name": "motor", "mass": 400.0, "at": [0.0, 0.0, 0.9], "motions": ["x", "z"]},
    {"name": "skid", "mass": 900.0, "inertia": 150.0, "at": [0.1, 0.0, 0.3]},
    spring("feet", "motor", "skid", {"x": 8e7, "z": 2e8}, at=[0.0, 0.0, 0.6]),
    spring("left mount", "skid", "ground", {"x": 6e5, "z": 1.1e6}, at=[-0.8, 0.0, 0.0]),
    spring("right mount", "skid", "ground", {"x": 6e5, "z": 1.4e6}, at=[0.9, 0.0, 0.0]),
    motions=["x", "z", "ry"],
)


def test_an_answer_keeps_the_form_of_the_contract() -> None:
    for system in (SKID, matrices([[1.0, 0.0], [0.0, 2.0]], [[3.0, -3.0], [-3.0, 3.0]])):
        answer = {"id": "a0", "task": "modes", "system_id": "s0", **modes(system)}
        ModesAnswer.model_validate(answer)


def test_modes_are_numbered_from_one_lowest_first() -> None:
    found = modes(SKID)["modes"]
    assert [mode["number"] for mode in found] == [1, 2, 3, 4, 5]
    frequencies = [mode["frequency_hz"] for mode in found]
    assert frequencies == sorted(frequencies)


def test_the_forms_of_one_frequency_agree() -> None:
    for mode in modes(SKID)["modes"]:
        hz = mode["frequency_hz"]
        assert mode["frequency_rad_s"] == pytest.approx(2 * pi * hz, rel=1e-15)
        assert mode["period_s"] == pytest.approx(1 / hz, rel=1e-15)
        assert mode["speed_rpm"] == pytest.approx(60 * hz, rel=1e-15)


def test_shapes_follow_the_listed_degrees_of_freedom() -> None:
    answer = modes(SKID)
    assert answer["degrees_of_freedom"] == ["motor/x", "motor/z", "skid/x", "skid/z", "skid/ry"]
    assert all(len(mode["shape"]) == 5 for mode in answer["modes"])


def test_shapes_are_scaled_to_the_mass_or_to_their_largest_entry() -> None:
    by_mass = modes(SKID)["modes"]
    by_largest = modes(SKID, shape_scale="largest")["modes"]
    masses = [400.0, 400.0, 900.0, 900.0, 150.0]
    for one, two in zip(by_mass, by_largest, strict=True):
        modal = sum(m * v * v for m, v in zip(masses, one["shape"], strict=True))
        assert modal == pytest.approx(1.0, rel=1e-12)
        assert max(two["shape"], key=abs) == 1.0
        largest = max(one["shape"], key=abs)
        assert two["shape"] == pytest.approx([value / largest for value in one["shape"]])


def test_energy_shares_add_up_and_name_what_carries_them() -> None:
    for mode in modes(SKID)["modes"]:
        for kind, names in (
            ("strain", {"feet", "left mount", "right mount"}),
            ("kinetic", {"motor", "skid"}),
        ):
            parts = [part for part in mode["energy"] if part["kind"] == kind]
            assert {part["of"] for part in parts} <= names
            assert sum(part["share"] for part in parts) == pytest.approx(1.0, abs=0.015)
            shares = [part["share"] for part in parts]
            assert shares == sorted(shares, reverse=True)


def test_the_reading_names_the_body_that_moves_and_the_connection_that_gives() -> None:
    # A heavy block on a soft mount with a light part on a stiff one: two modes that are apart.
    system = bodies(
        {"name": "block", "mass": 5000.0},
        {"name": "valve", "mass": 1.0},
        spring("mount", "block", "ground", 1e6),
        spring("stem", "valve", "block", 4e5),
        motions=["z"],
    )
    first, second = (mode["reading"] for mode in modes(system)["modes"])
    assert first.startswith("At 2.251 Hz block moves along z")
    assert "mount (100 %)" in first
    assert second.startswith("At 100.7 Hz valve moves along z")
    assert "stem (100 %)" in second


def test_readings_of_still_and_unstable_modes_say_so() -> None:
    free = modes(bodies({"name": "sled", "mass": 5.0}, motions=["x"]))["modes"][0]["reading"]
    assert "0 Hz" in free
    assert "sled moves along x" in free
    push = spring("push", "mast", "ground", -5.0, destabilising=True)
    falling = modes(bodies({"name": "mast", "mass": 5.0}, push, motions=["x"]))["modes"][0]
    assert falling["reading"].startswith("Statically unstable, grows e-fold in 1 s: mast")


def test_opposed_and_common_motion_are_told_apart() -> None:
    pair = bodies(
        {"name": "a", "mass": 1.0},
        {"name": "b", "mass": 1.0},
        spring("left", "a", "ground", 1e3),
        spring("right", "b", "ground", 1e3),
        spring("tie", "a", "b", 5e2),
        motions=["x"],
    )
    together, against = (mode["reading"] for mode in modes(pair)["modes"])
    assert "a and b move along x together" in together
    assert "a and b move along x against each other" in against


@pytest.mark.parametrize(
    ("options", "expected"), [({}, 20), ({"count": 3}, 3), ({"count": 60}, 60), ({"count": 99}, 60)]
)
def test_large_systems_give_twenty_modes_unless_asked(options: Raw, expected: int) -> None:
    masses = [{"name": f"m{i}", "mass": 1.0} for i in range(60)]
    springs = [spring(f"s{i}", f"m{i}", f"m{i - 1}" if i else "ground", 1e4) for i in range(60)]
    answer = modes(bodies(*masses, *springs, motions=["x"]), **options)
    assert len(answer["modes"]) == expected == answer["evidence"]["modes_returned"]
    assert answer["evidence"]["sturm_count"] == expected
    assert any("only" in warning for warning in answer["warnings"]) == (
        options != {"count": 60}
    ) - (options == {"count": 3})


def test_a_limit_gives_every_mode_below_it() -> None:
    frequencies = [mode["frequency_hz"] for mode in modes(SKID)["modes"]]
    for place, (low, high) in enumerate(pairwise(frequencies)):
        found = modes(SKID, below_hz=(low + high) / 2)["modes"]
        assert [mode["frequency_hz"] for mode in found] == pytest.approx(frequencies[: place + 1])
    assert modes(SKID, below_hz=f"{frequencies[0] * 60 * 0.9} rpm")["modes"] == []


@pytest.mark.parametrize(
    "system",
    [
        {**SKID, "damping": {"kind": "modal", "ratio": 0.02}},
        {**SKID, "damping": {"kind": "rayleigh", "alpha": 0.1, "beta": "0.1 ms"}},
        matrices([[1.0]], [[5.0]], damping=[[0.1]]),
        matrices([[1.0]], [[5.0]], structural=[[0.1]]),
        bodies(
            {"name": "a", "mass": 1.0},
            spring("s", "a", "ground", 5.0, loss_factor=0.1),
            motions=["x"],
        ),
    ],
)
def test_damping_that_is_given_but_not_used_is_said(system: Raw) -> None:
    assert any("damping isn't used" in warning for warning in modes(system)["warnings"])


def test_a_plain_machine_draws_no_warning() -> None:
    answer = modes(SKID)
    assert answer["warnings"] == []
    assert "licensed engineer" in answer["caution"]


def test_what_a_careful_engineer_would_question_is_said() -> None:
    impossible = {"xx": 1.0, "yy": 1.0, "zz": 5.0}
    idle = spring("idle", "a", "ground", {"rx": 3.0})
    stay = spring("stay", "a", "ground", {"x": 3.0, "y": 3.0, "z": 3.0})
    part = {"name": "a", "mass": 1.0, "motions": ["x", "y", "z"]}
    said = modes(bodies({**part, "inertia": impossible}, idle, stay))["warnings"]
    assert any(
        "no rigid body has such an inertia" in warning and "a" in warning for warning in said
    )
    assert any("act on no motion" in warning and "idle" in warning for warning in said)


def test_evidence_holds_on_a_stiff_and_soft_machine() -> None:
    evidence = modes(SKID)["evidence"]
    assert evidence["complete"]
    assert evidence["sturm_count"] == evidence["modes_returned"] == 5
    assert evidence["largest_relative_residual"] < 1e-9
    assert evidence["largest_cross_product"] < 1e-9
    assert "Cholesky" in evidence["method"]
