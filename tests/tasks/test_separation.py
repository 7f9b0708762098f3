"""The task `separation`, against its definitions in the contract."""

from math import pi
from random import Random
from typing import Any

import pytest

from schemas.faults import Invalid
from schemas.separation import SeparationAnswer
from tests.tasks.asking import ask, bodies, modes, spring

Raw = dict[str, Any]


def on_springs(*frequencies_hz: float) -> Raw:
    """Masses of 1 kg, each on its own spring: modes at just these frequencies."""
    masses = [{"name": f"m{i}", "mass": 1.0} for i in range(len(frequencies_hz))]
    springs = [
        spring(f"s{i}", f"m{i}", "ground", (2 * pi * hz) ** 2)
        for i, hz in enumerate(frequencies_hz)
    ]
    return bodies(*masses, *springs, motions=["x"])


def separation(
    system: Raw, operation: list[tuple[float, float]], *excitations: Raw, **fields: object
) -> Raw:
    body = {
        "system": system,
        "operation": [
            {"name": f"run {i}", "min_rpm": low, "max_rpm": high}
            for i, (low, high) in enumerate(operation)
        ],
        "excitations": list(excitations),
        **fields,
    }
    return ask("separation", body)


ONCE: Raw = {"name": "once", "order": 1}
TWICE: Raw = {"name": "twice", "order": 2}


def rule(above: float, below: float) -> Raw:
    return {"kind": "fraction", "mode_above": above, "mode_below": below}


def test_an_answer_keeps_the_form_of_the_contract() -> None:
    answer = separation(on_springs(8.0, 20.0, 31.0), [(900, 1200)], ONCE, TWICE)
    SeparationAnswer.model_validate({"id": "a0", "task": "separation", "system_id": "s0", **answer})
    with_places = separation(
        on_springs(8.0, 20.0), [(900, 1200)], ONCE, forces_at={"once": ["m0/x"]}
    )
    SeparationAnswer.model_validate(
        {"id": "a0", "task": "separation", "system_id": "s0", **with_places}
    )


@pytest.mark.parametrize(
    ("frequency", "verdict", "margin", "required"),
    [
        (30.0, "clear", 0.5, 0.2),  # 20 Hz is the nearer edge: (30 − 20)/20
        (24.0, "clear", 0.2, 0.2),
        (23.0, "short", 0.15, 0.2),
        (20.0, "coincident", 0.0, 0.2),
        (17.0, "coincident", 0.0, None),
        (15.0, "coincident", 0.0, 0.1),
        (14.0, "short", 1 / 15, 0.1),  # (15 − 14)/15
        (13.5, "clear", 0.1, 0.1),
        (3.0, "clear", 0.8, 0.1),
    ],
)
def test_one_mode_against_one_band_by_hand(
    frequency: float, verdict: str, margin: float, required: float | None
) -> None:
    # 900 to 1200 rpm at order 1 is 15 to 20 Hz.
    answer = separation(on_springs(frequency), [(900, 1200)], ONCE, rule=rule(0.2, 0.1))
    (finding,) = answer["findings"]
    assert answer["verdict"] == finding["verdict"] == verdict
    assert finding["margin"] == pytest.approx(margin, abs=1e-12)
    if required is not None:
        assert finding["required"] == required
    assert finding["excitation_min_hz"] == 15.0
    assert finding["excitation_max_hz"] == 20.0
    assert finding["coincidence_rpm"] == pytest.approx(60 * frequency)


def test_the_torsional_rule_asks_for_ten_per_cent_on_both_sides() -> None:
    # API 617, torsional analysis (from memory): 10 % above and below.
    for frequency, verdict in ((22.1, "clear"), (21.9, "short"), (13.4, "clear"), (13.6, "short")):
        answer = separation(on_springs(frequency), [(900, 1200)], ONCE, rule={"kind": "torsional"})
        assert answer["verdict"] == verdict
        assert answer["findings"][0]["required"] == 0.1


def test_twenty_per_cent_on_both_sides_is_required_unless_said_otherwise() -> None:
    (finding,) = separation(on_springs(30.0), [(900, 1200)], ONCE)["findings"]
    assert finding["required"] == 0.2


def test_every_reachable_mode_is_held_against_every_excitation_and_operation_worst_first() -> None:
    system = on_springs(8.0, 17.0, 26.0, 90.0, 200.0)
    answer = separation(system, [(900, 1200), (300, 400)], ONCE, TWICE)
    # The highest excitation is 40 Hz, 48 Hz with its margin: three modes are reached.
    assert {finding["mode"] for finding in answer["findings"]} == {1, 2, 3}
    assert len(answer["findings"]) == 3 * 2 * 2
    rank = {"coincident": 0, "short": 1, "clear": 2}
    order = [rank[finding["verdict"]] for finding in answer["findings"]]
    assert order == sorted(order)
    assert answer["verdict"] == "coincident"
    assert answer["findings"][0]["verdict"] == "coincident"


def test_the_mode_nearest_to_an_excitation_is_always_reported() -> None:
    answer = separation(on_springs(90.0, 200.0), [(900, 1200)], ONCE)
    assert [finding["mode"] for finding in answer["findings"]] == [1]
    assert answer["verdict"] == "clear"


def test_rigid_body_motions_are_left_out() -> None:
    free = bodies(
        {"name": "a", "mass": 1.0},
        {"name": "b", "mass": 1.0},
        spring("s", "a", "b", 2e4),
        motions=["x"],
    )
    answer = separation(free, [(900, 1200)], ONCE)
    assert [finding["mode"] for finding in answer["findings"]] == [2]


def test_a_machine_without_an_oscillating_mode_has_nothing_to_keep_clear_of() -> None:
    answer = separation(bodies({"name": "a", "mass": 1.0}, motions=["x"]), [(900, 1200)], ONCE)
    assert answer["findings"] == []
    assert answer["verdict"] == "clear"
    assert answer["clear_speeds"] == [{"min_rpm": 900.0, "max_rpm": 1200.0}]
    assert any("no oscillating mode" in warning for warning in answer["warnings"])


def test_a_fixed_line_is_a_band_of_no_width_and_meets_no_speed() -> None:
    line = {"name": "line", "frequency_hz": 100.0}
    (finding,) = separation(on_springs(110.0), [(900, 1200)], line)["findings"]
    assert (finding["excitation_min_hz"], finding["excitation_max_hz"]) == (100.0, 100.0)
    assert finding["margin"] == pytest.approx(0.1)
    assert finding["coincidence_rpm"] is None


def test_a_fixed_line_that_is_not_clear_leaves_no_clear_speed() -> None:
    line = {"name": "line", "frequency_hz": 100.0}
    short = separation(on_springs(110.0), [(900, 1200)], line, ONCE)
    assert short["clear_speeds"] == []
    assert short["coincidences"] == []
    assert any("line" in warning for warning in short["warnings"])
    clear = separation(on_springs(130.0), [(900, 1200)], line, ONCE)
    assert clear["clear_speeds"] == [{"min_rpm": 900.0, "max_rpm": 1200.0}]


def test_an_excitation_on_a_geared_shaft_turns_at_its_ratio() -> None:
    fast = {"name": "fast", "order": 3, "shaft_ratio": 2.5}
    (finding,) = separation(on_springs(30.0), [(900, 1200)], fast)["findings"]
    assert finding["excitation_min_hz"] == pytest.approx(3 * 2.5 * 15.0)
    assert finding["coincidence_rpm"] == pytest.approx(30.0 * 60 / 7.5)


def test_coincidences_are_listed_from_rest_to_the_highest_speed() -> None:
    answer = separation(on_springs(8.0, 17.0, 26.0), [(900, 1200)], ONCE, TWICE)
    expected: list[tuple[Any, ...]] = [
        (1, "twice", 240.0, None),
        (1, "once", 480.0, None),
        (2, "twice", 510.0, None),
        (3, "twice", 780.0, None),
        (2, "once", 1020.0, "run 0"),
    ]
    assert [
        (item["mode"], item["excitation"], pytest.approx(item["rpm"]), item["operation"])
        for item in answer["coincidences"]
    ] == expected


def symmetric() -> Raw:
    """Three masses on a line, mirror-symmetric: the middle one stands still in the second mode."""
    return bodies(
        {"name": "left", "mass": 2.0},
        {"name": "middle", "mass": 3.0},
        {"name": "right", "mass": 2.0},
        spring("a", "left", "ground", 3e4),
        spring("b", "left", "middle", 2e4),
        spring("c", "middle", "right", 2e4),
        spring("d", "right", "ground", 3e4),
        motions=["x"],
    )


def test_a_force_at_a_node_of_a_mode_does_not_excite_it() -> None:
    frequencies = [mode["frequency_hz"] for mode in modes(symmetric())["modes"]]
    at = 60 * frequencies[1]
    answer = separation(symmetric(), [(at, at)], ONCE, forces_at={"once": ["middle/x"]})
    by_mode = {finding["mode"]: finding for finding in answer["findings"]}
    assert by_mode[2]["verdict"] == "unexcited"
    assert by_mode[2]["participation"] < 1e-20
    assert answer["findings"][-1]["mode"] == 2
    assert answer["verdict"] != "coincident"
    assert all(item["mode"] != 2 for item in answer["coincidences"])
    elsewhere = separation(symmetric(), [(at, at)], ONCE, forces_at={"once": ["left/x"]})
    assert elsewhere["verdict"] == "coincident"


def test_participation_is_the_share_of_the_mobility_where_the_force_acts() -> None:
    # Σφᵢ² over all modes is 1/m at a mass, so φᵢ²·m adds up to 1.
    answer = separation(symmetric(), [(60, 60_000)], ONCE, forces_at={"once": ["middle/x"]})
    shares = {finding["mode"]: finding["participation"] for finding in answer["findings"]}
    shapes = [mode["shape"][1] for mode in modes(symmetric())["modes"]]
    assert [shares[mode] for mode in (1, 2, 3)] == pytest.approx([3.0 * v * v for v in shapes])
    assert sum(shares.values()) == pytest.approx(1.0)


def test_an_excitation_without_places_reaches_every_mode() -> None:
    answer = separation(symmetric(), [(900, 1200)], ONCE, TWICE, forces_at={"once": ["middle/x"]})
    for finding in answer["findings"]:
        assert ("participation" in finding) == (finding["excitation"] == "once")


def test_a_place_that_is_no_motion_of_the_machine_is_refused() -> None:
    held = symmetric()
    held["bodies"][1]["held"] = ["x"]
    for place in ("left/z", "nobody/x", "middle/x"):
        with pytest.raises(Invalid) as caught:
            separation(held, [(900, 1200)], ONCE, forces_at={"once": ["left/x", place]})
        assert [fault.pointer for fault in caught.value.faults] == ["/forces_at/once/1"]


def is_clear(
    frequencies: list[float], orders: list[float], rpm: float, above: float, below: float
) -> bool:
    """Every mode's margin at one speed, from the definition."""
    for f in frequencies:
        for order in orders:
            e = order * rpm / 60
            if (f > e and (f - e) / e < above) or (f < e and (e - f) / e < below) or f == e:
                return False
    return True


@pytest.mark.parametrize("seed", range(25))
def test_clear_speeds_are_those_at_which_every_finding_is_clear(seed: int) -> None:
    draw = Random(seed)
    frequencies = [draw.uniform(2, 120) for _ in range(draw.randint(1, 6))]
    orders = [draw.choice([0.5, 1, 2, 3, 7]) for _ in range(draw.randint(1, 3))]
    above, below = draw.uniform(0.02, 0.3), draw.uniform(0.02, 0.3)
    low = draw.uniform(300, 2000)
    operation = [(low, low + draw.uniform(0, 1500)), (low + draw.uniform(0, 2500), low + 3000)]
    excitations = [{"name": f"e{i}", "order": order} for i, order in enumerate(orders)]
    answer = separation(on_springs(*frequencies), operation, *excitations, rule=rule(above, below))
    ranges = [(item["min_rpm"], item["max_rpm"]) for item in answer["clear_speeds"]]
    for start, end in operation:
        for step in range(301):
            rpm = start + (end - start) * step / 300
            if any(abs(rpm - edge) < 1e-6 for limits in ranges for edge in limits):
                continue
            expected = is_clear(frequencies, orders, rpm, above, below)
            assert any(a <= rpm <= b for a, b in ranges) == expected, rpm
    for a, b in ranges:
        assert (
            any(start <= a and b <= end for start, end in operation)
            or operation[1][0] <= operation[0][1]
        )


def test_the_edge_of_a_clear_range_is_itself_clear() -> None:
    answer = separation(on_springs(17.3), [(300, 3000)], ONCE, rule=rule(0.2, 0.15))
    for item in answer["clear_speeds"]:
        for rpm in (item["min_rpm"], item["max_rpm"]):
            assert (
                separation(on_springs(17.3), [(rpm, rpm)], ONCE, rule=rule(0.2, 0.15))["verdict"]
                == "clear"
            )


def test_readings_say_which_side_how_far_and_how_much_is_required() -> None:
    above = separation(on_springs(23.0), [(900, 1200)], ONCE)
    reading = above["findings"][0]["reading"]
    assert reading.startswith("Mode 1 at 23 Hz lies 15 % above once (15 to 20 Hz in run 0)")
    assert "20 % is required: short" in reading
    assert "1,380 rpm" in reading
    assert "short: mode 1 with once" in above["reading"]
    inside = separation(on_springs(18.0), [(900, 1200)], ONCE)["findings"][0]["reading"]
    assert "coincident" in inside


def test_an_unstable_machine_is_warned_of() -> None:
    push = spring("push", "m1", "ground", -1e3, destabilising=True)
    system = on_springs(18.0)
    system["bodies"].append({"name": "m1", "mass": 1.0})
    system["connections"].append(push)
    answer = separation(system, [(900, 1200)], ONCE)
    assert any("statically unstable" in warning for warning in answer["warnings"])
    assert [finding["mode"] for finding in answer["findings"]] == [2]


def test_the_verdict_does_not_hang_on_the_units_of_the_machine() -> None:
    # Exactly at the required margin in SI; in pounds and inches within roundoff of it.
    k = (2 * pi * 24.0) ** 2
    pounds, per_inch = 1 / 0.45359237, 0.0254 / 4.4482216152605
    other = bodies(
        {"name": "m0", "mass": f"{pounds!r} lb"},
        spring("s0", "m0", "ground", f"{k * per_inch!r} lbf/in"),
        motions=["x"],
    )
    for system in (on_springs(24.0), other):
        assert separation(system, [(900, 1200)], ONCE)["verdict"] == "clear"


def test_evidence_covers_the_modes_that_were_judged() -> None:
    answer = separation(on_springs(8.0, 17.0, 26.0, 90.0), [(900, 1200)], ONCE, TWICE)
    assert answer["evidence"]["complete"]
    assert answer["evidence"]["sturm_count"] >= 3
    assert answer["evidence"]["largest_relative_residual"] < 1e-9
    assert "licensed engineer" in answer["caution"]
