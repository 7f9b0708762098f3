"""Modes over speed: whirl, crossings, veering, onset of instability."""

from math import pi, sqrt
from typing import Any

import numpy as np
import pytest

from schemas.faults import Invalid
from tests.tasks.asking import ask, modes

Raw = dict[str, Any]
POLAR, DIAMETRAL, TILT = 6.8, 4.2, 2 * 3e6 * 0.35**2
RIGID_ROTOR: Raw = {
    "kind": "bodies",
    "motions": ["y", "z", "ry", "rz"],
    "bodies": [
        {
            "name": "rotor",
            "mass": 120.0,
            "inertia": {"xx": POLAR, "yy": DIAMETRAL, "zz": DIAMETRAL},
            "spin": {"axis": "x"},
        }
    ],
    "connections": [
        {
            "kind": "spring",
            "name": f"support {place}",
            "between": ["rotor", "ground"],
            "at": [at, 0, 0],
            "stiffness": {"y": 3e6, "z": 3e6},
        }
        for place, at in enumerate((0.35, -0.35))
    ],
}


def conical(rpm: float) -> tuple[float, float]:
    """Backward and forward whirl in Hz: Id·ω² ∓ Ip·Ω·ω − k = 0 (Genta, from memory)."""
    spin = POLAR * rpm * pi / 30
    root = sqrt(spin**2 + 4 * DIAMETRAL * TILT)
    return (root - spin) / (4 * pi * DIAMETRAL), (root + spin) / (4 * pi * DIAMETRAL)


def speedmap(system: Raw, **options: object) -> Raw:
    """The answer of `speedmap`."""
    return ask("speedmap", {"system": system, **options})


@pytest.mark.parametrize("points", [3, 40])
def test_conical_whirl_follows_its_closed_form_at_every_speed(points: int) -> None:
    answer = speedmap(RIGID_ROTOR, from_rpm=600, to_rpm=9000, points=points)
    by_way = {
        mode["whirl"][-1]: mode
        for mode in answer["modes"]
        if abs(mode["frequency_hz"][-1] - sqrt(6e6 / 120) / (2 * pi)) > 1e-6
    }
    for place, rpm in enumerate(answer["rpm"]):
        backward, forward = conical(rpm)
        assert by_way["backward"]["frequency_hz"][place] == pytest.approx(backward, rel=1e-11)
        assert by_way["forward"]["frequency_hz"][place] == pytest.approx(forward, rel=1e-11)
        assert by_way["forward"]["whirl"][place] == "forward"


def test_crossings_with_unbalance_meet_the_closed_form_critical_speeds() -> None:
    answer = speedmap(
        RIGID_ROTOR,
        from_rpm=100,
        to_rpm=9000,
        points=30,
        excitations=[{"name": "unbalance", "order": 1}],
    )
    # Ω = ω: cylindrical √(k/m) twice, backward conical √(k/(Id + Ip)); Id < Ip has no forward one.
    expected = sorted([sqrt(6e6 / 120), sqrt(6e6 / 120), sqrt(TILT / (DIAMETRAL + POLAR))])
    found = [meeting["rpm"] * pi / 30 for meeting in answer["crossings"]]
    assert found == pytest.approx(expected, rel=1e-10)


def cross_coupled(cross_per_rpm: float) -> Raw:
    """One disk on a film whose cross-coupled stiffness grows with speed."""
    points = [
        {
            "rpm": rpm,
            "stiffness": [[5e6, cross_per_rpm * rpm], [-cross_per_rpm * rpm, 5e6]],
            "damping": [[420.0, 0.0], [0.0, 420.0]],
        }
        for rpm in (0.0, 12000.0)
    ]
    return {
        "kind": "bodies",
        "motions": ["y", "z"],
        "bodies": [{"name": "disk", "mass": 35.0, "spin": {"axis": "x"}}],
        "connections": [
            {"kind": "bearing", "name": "film", "between": ["disk", "ground"], "points": points}
        ],
    }


def test_the_onset_of_instability_is_where_cross_stiffness_exceeds_c_omega() -> None:
    # Unstable when the cross stiffness exceeds c·ω_n (Childs, Turbomachinery Rotordynamics,
    # from memory); here it grows as 30 N/m per rpm.
    answer = speedmap(cross_coupled(30.0), from_rpm=0, to_rpm=12000, points=25)
    onset = 420.0 * sqrt(5e6 / 35.0) / 30.0
    assert answer["instability"]["rpm"] == pytest.approx(onset, rel=1e-8)
    assert answer["instability"]["frequency_hz"] == pytest.approx(
        sqrt(5e6 / 35.0) / (2 * pi), rel=1e-8
    )


def test_a_stable_machine_has_no_onset() -> None:
    assert speedmap(cross_coupled(5.0), to_rpm=12000, points=9)["instability"] is None


def two_oscillators(coupling: float) -> Raw:
    """One mass whose bearing stiffens with speed, another that doesn't, lightly tied."""
    points = [
        {"rpm": rpm, "stiffness": [[k, 0.0], [0.0, k]]} for rpm, k in ((0.0, 1e6), (10000.0, 3e6))
    ]
    tie = {
        "kind": "spring",
        "name": "tie",
        "between": ["a", "b"],
        "stiffness": {"y": coupling},
    }
    return {
        "kind": "bodies",
        "motions": ["y"],
        "bodies": [{"name": "a", "mass": 10.0}, {"name": "b", "mass": 10.0}],
        "connections": [
            {"kind": "bearing", "name": "film", "between": ["a", "ground"], "points": points},
            {"kind": "spring", "name": "s", "between": ["b", "ground"], "stiffness": 2e6},
            *([tie] if coupling else []),
        ],
    }


@pytest.mark.parametrize("points", [2, 20, 1000])
@pytest.mark.parametrize("coupling", [20.0, 2e3, 1e5])
def test_lightly_coupled_modes_veer_however_many_steps_there_are(
    points: int, coupling: float
) -> None:
    answer = speedmap(two_oscillators(coupling), to_rpm=10000, points=points, count=2)
    K = np.array([[3e6 + coupling, -coupling], [-coupling, 2e6 + coupling]])
    expected = np.sqrt(np.linalg.eigvalsh(K / 10.0)) / (2 * pi)
    last = [mode["frequency_hz"][-1] for mode in answer["modes"]]
    assert last == pytest.approx(expected, rel=1e-10)


@pytest.mark.parametrize("points", [2, 20, 1000])
def test_uncoupled_modes_cross_however_many_steps_there_are(points: int) -> None:
    answer = speedmap(two_oscillators(0.0), to_rpm=10000, points=points, count=2)
    last = [mode["frequency_hz"][-1] for mode in answer["modes"]]
    assert last == pytest.approx([sqrt(3e5) / (2 * pi), sqrt(2e5) / (2 * pi)], rel=1e-10)


def test_at_rest_the_spin_changes_nothing() -> None:
    still = {
        **RIGID_ROTOR,
        "bodies": [{k: v for k, v in RIGID_ROTOR["bodies"][0].items() if k != "spin"}],
    }
    turning = modes(RIGID_ROTOR, damped=True, at_rpm=0)["modes"]
    fixed = modes(still, damped=True)["modes"]
    plain = modes(still)["modes"]
    for a, b, c in zip(turning, fixed, plain, strict=True):
        assert a["frequency_hz"] == pytest.approx(b["frequency_hz"], rel=1e-12)
        assert b["frequency_hz"] == pytest.approx(c["frequency_hz"], rel=1e-10)


def test_separation_of_a_turning_machine_is_taken_at_the_coincidence() -> None:
    # Backward conical whirl meets order 1 at √(k/(Id + Ip)): above the operation by
    # (Ω* − Ω_max)/Ω_max, not by what the mode's frequency is at rest or at one edge.
    meeting = sqrt(TILT / (DIAMETRAL + POLAR)) * 30 / pi
    answer = ask(
        "separation",
        {
            "system": RIGID_ROTOR,
            "operation": [{"name": "run", "min_rpm": 1200, "max_rpm": 2000}],
            "excitations": [{"name": "unbalance", "order": 1}],
        },
    )
    by_speed = {
        round(finding["coincidence_rpm"] or 0.0, 3): finding for finding in answer["findings"]
    }
    cylindrical = sqrt(6e6 / 120) * 30 / pi
    assert by_speed[round(cylindrical, 3)]["margin"] == pytest.approx(
        (cylindrical - 2000) / 2000, rel=1e-9
    )
    found = by_speed[round(meeting, 3)]
    expected = max((meeting - 2000) / 2000, 0.0) if meeting > 2000 else 0.0
    assert found["margin"] == pytest.approx(expected, rel=1e-9, abs=1e-12)
    assert answer["findings"][0]["verdict"] in ("short", "coincident")


def one_mass(damping: float) -> Raw:
    """200 kg on 3.2 MN/m: 20.13 Hz."""
    spring = {
        "kind": "spring",
        "name": "k",
        "between": ["m", "ground"],
        "stiffness": 3.2e6,
        "damping": damping,
    }
    return {
        "kind": "bodies",
        "motions": ["z"],
        "bodies": [{"name": "m", "mass": 200.0}],
        "connections": [spring],
    }


@pytest.mark.parametrize("ratio", [0.01, 0.05, 0.15])
def test_the_amplification_rule_asks_more_of_a_lightly_damped_mode(ratio: float) -> None:
    # API 617 (from memory): 17(1 − 1/(AF − 1.5)) % below, 10 % more above.
    question = {
        "system": one_mass(2 * ratio * sqrt(3.2e6 * 200)),
        "operation": [{"name": "run", "min_rpm": 600, "max_rpm": 1000}],
        "excitations": [{"name": "unbalance", "order": 1}],
        "rule": {"kind": "amplification"},
    }
    finding = ask("separation", question)["findings"][0]
    factor = 1 / (2 * ratio)
    assert finding["amplification_factor"] == pytest.approx(factor, rel=1e-12)
    assert finding["required"] == pytest.approx(0.10 + 0.17 * (1 - 1 / (factor - 1.5)), rel=1e-12)
    assert finding["frequency_hz"] == pytest.approx(sqrt(3.2e6 / 200) / (2 * pi), rel=1e-12)


def test_a_heavily_damped_mode_needs_no_separation() -> None:
    question = {
        "system": one_mass(2 * 0.25 * sqrt(3.2e6 * 200)),
        "operation": [{"name": "run", "min_rpm": 600, "max_rpm": 1400}],
        "excitations": [{"name": "unbalance", "order": 1}],
        "rule": {"kind": "amplification"},
    }
    answer = ask("separation", question)
    assert answer["verdict"] == "clear"
    assert answer["findings"][0]["required"] == 0.0


def test_the_amplification_rule_refuses_a_system_without_damping() -> None:
    question = {
        "system": one_mass(0.0),
        "operation": [{"name": "run", "min_rpm": 600, "max_rpm": 1400}],
        "excitations": [{"name": "unbalance", "order": 1}],
        "rule": {"kind": "amplification"},
    }
    with pytest.raises(Invalid) as caught:
        ask("separation", question)
    assert [fault.pointer for fault in caught.value.faults] == ["/rule"]


def test_clear_speeds_of_a_turning_machine_hold_at_every_speed_between() -> None:
    answer = ask(
        "separation",
        {
            "system": RIGID_ROTOR,
            "operation": [{"name": "run", "min_rpm": 500, "max_rpm": 6000}],
            "excitations": [{"name": "unbalance", "order": 1}, {"name": "second", "order": 2}],
        },
    )
    assert answer["clear_speeds"]
    for rpm in np.linspace(500, 6000, 400):
        frequencies = [sqrt(6e6 / 120) / (2 * pi), *conical(float(rpm))]
        clear = all(
            not 0.8 * order * rpm / 60 < frequency < 1.2 * order * rpm / 60
            for frequency in frequencies
            for order in (1, 2)
        )
        inside = any(r["min_rpm"] <= rpm <= r["max_rpm"] for r in answer["clear_speeds"])
        near = any(
            abs(rpm - edge) < 1.0
            for r in answer["clear_speeds"]
            for edge in (r["min_rpm"], r["max_rpm"])
        )
        assert near or clear == inside, rpm
