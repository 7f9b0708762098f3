"""Responses against closed forms; each check names where its formula comes from."""

import json
from math import cos, pi, sin, sqrt
from pathlib import Path
from typing import Any

import mpmath
import numpy as np
import pytest

from tests.published.test_cases import picked
from tests.tasks.asking import Raw, ask, bodies, spring

CASES: list[dict[str, Any]] = json.loads(
    Path(__file__).with_name("response_cases.json").read_text(encoding="utf-8")
)
G = 9.80665


@pytest.mark.parametrize("case", CASES, ids=[case["id"] for case in CASES])
def test_the_response_agrees_with_its_source(case: dict[str, Any]) -> None:
    answer = ask(case["task"], case["body"])
    for expected in case["expect"]:
        value, wanted = picked(answer, expected["pointer"]), expected["value"]
        tolerance = expected.get("atol", expected.get("rtol", 0.0) * abs(wanted))
        assert abs(value - wanted) <= tolerance, expected["pointer"]


def test_every_case_names_its_source() -> None:
    assert len(CASES) == 5
    assert all(case["source"] and case["provenance"] and case["expect"] for case in CASES)


def hung(mass: tuple[float, float], length: float, stiffness: float) -> Raw:
    return bodies(
        {"name": "left", "mass": mass[0]},
        {"name": "right", "mass": mass[1]},
        {"kind": "pendulum", "name": "rod a", "body": "left", "length": length},
        {"kind": "pendulum", "name": "rod b", "body": "right", "length": length},
        spring("tie", "left", "right", stiffness),
        motions=["x"],
    )


@pytest.mark.parametrize(("first", "second"), [(0.0, 0.01), (0.02, -0.005), (-0.003, 0.0)])
def test_hung_masses_follow_two_cosines_over_a_hundred_beats(first: float, second: float) -> None:
    """Coupled pendulums: x = (m₁a + m₂b)/(m₁ + m₂) swings at √(g/l), x₂ − x₁ at √(g/l + k/m₁ +
    k/m₂); closed form, any text on two-degree systems."""
    m1, m2, k, length = 2.0, 3.0, 4.0, 0.5
    slow, fast = sqrt(G / length), sqrt(G / length + k / m1 + k / m2)
    beat = 2 * pi / (fast - slow)
    answer = ask(
        "response/transient",
        {
            "system": hung((m1, m2), length, k),
            "initial": {"displacement": {"left/x": first, "right/x": second}},
            "duration_s": 100 * beat,
            "time_step_s": beat / 40,
            "observe": ["left/x", "right/x"],
        },
    )
    centre, apart = (m1 * first + m2 * second) / (m1 + m2), second - first
    with mpmath.workdps(30):
        for k_th in (1, 777, 2500, 3999, 4000):
            t = mpmath.mpf(answer["time_s"][k_th])
            together = centre * mpmath.cos(mpmath.sqrt(mpmath.mpf(G) / length) * t)
            split = mpmath.mpf(k) / m1 + mpmath.mpf(k) / m2
            relative = apart * mpmath.cos(mpmath.sqrt(mpmath.mpf(G) / length + split) * t)
            left, right = (series["values"][k_th] for series in answer["series"])
            scale = abs(first) + abs(second)
            assert abs(left - (together - relative * m2 / (m1 + m2))) < 1e-10 * scale
            assert abs(right - (together + relative * m1 / (m1 + m2))) < 1e-10 * scale
    terms = [mode["terms"] for mode in answer["modal_terms"]]
    assert [t["cosine"] for t in terms[0]] == pytest.approx([centre, centre], rel=1e-12, abs=1e-16)
    expected = [-apart * m2 / (m1 + m2), apart * m1 / (m1 + m2)]
    assert [t["cosine"] for t in terms[1]] == pytest.approx(expected, rel=1e-12, abs=1e-16)
    assert all(abs(t["sine"]) < 1e-17 for mode in terms for t in mode)
    assert answer["evidence"]["energy_balance"] == pytest.approx(0.0, abs=1e-12)


def one(mass: float, k: float, c: float = 0.0, **fields: object) -> Raw:
    damping = {"damping": c} if c else {}
    return bodies(
        {"name": "m", "mass": mass},
        spring("k", "m", "ground", k, **damping, **fields),
        motions=["z"],
    )


def harmonic(system: Raw, excite: list[Raw], **options: object) -> Raw:
    return ask("response/harmonic", {"system": system, "excite": excite, **options})


def test_a_step_on_an_undamped_mass_reaches_twice_the_static_deflection() -> None:
    """x = F/k·(1 − cos ωt); Den Hartog, Mechanical Vibrations."""
    answer = ask(
        "response/transient",
        {
            "system": one(2.0, 800.0),
            "forces": [{"at": "m/z", "shape": "step", "peak": 16.0}],
            "duration_s": 1.0,
            "time_step_s": 0.01,
            "observe": ["m/z"],
        },
    )
    for t, value in zip(answer["time_s"], answer["series"][0]["values"], strict=True):
        assert value == pytest.approx(0.02 * (1 - cos(20.0 * t)), abs=1e-15)
    assert answer["largest"][0]["value"] == pytest.approx(0.04, rel=1e-6)


@pytest.mark.parametrize("ratio", [0.0, 0.02, 0.999, 0.99999999, 1.0, 1.00000001, 1.001, 3.0])
def test_a_released_mass_follows_its_closed_form_around_critical_damping(ratio: float) -> None:
    """Free vibration below, at and above critical damping; Den Hartog. 40 digits by mpmath."""
    mass, omega = 2.0, 20.0
    body = {
        "system": one(mass, mass * omega**2, 2 * ratio * omega * mass),
        "initial": {"displacement": {"m/z": 0.01}, "velocity": {"m/z": -0.3}},
        "duration_s": 2.0,
        "time_step_s": 0.125,
        "observe": ["m/z"],
    }
    answer = ask("response/transient", body)
    for t, value in zip(answer["time_s"], answer["series"][0]["values"], strict=True):
        assert abs(value - float(released(ratio, omega, 0.01, -0.3, t))) < 2e-14 * 0.02
    assert abs(answer["evidence"]["energy_balance"]) < 1e-11


def released(zeta: float, omega: float, x: float, v: float, t: float) -> Any:
    with mpmath.workdps(40):
        z, w = mpmath.mpf(2 * zeta * omega * 2.0) / (2 * omega * 2), mpmath.mpf(omega)
        spread = mpmath.sqrt(mpmath.mpc(z * z - 1)) * w
        kernel = t if spread == 0 else mpmath.sinh(spread * t) / spread
        decay = mpmath.exp(-z * w * t)
        return mpmath.re(decay * (x * mpmath.cosh(spread * t) + (v + z * w * x) * kernel))


def test_the_peak_of_a_lightly_damped_mass_has_its_closed_form() -> None:
    """Largest receptance 1/(2kζ√(1 − ζ²)) at ω√(1 − 2ζ²); half-power width by solving the quadratic
    for |H|² (ISO 2041, amplification by half power)."""
    mass, k, zeta = 200.0, 3.2e6, 0.05
    omega = sqrt(k / mass)
    answer = harmonic(
        one(mass, k, 2 * zeta * sqrt(k * mass)),
        [{"at": "m/z", "force": 1.0}],
        frequencies={"from_hz": 5, "to_hz": 60, "points": 80},
    )
    (peak,) = answer["peaks"]
    resonance = omega * sqrt(1 - 2 * zeta**2)
    assert peak["frequency_hz"] == pytest.approx(resonance / (2 * pi), rel=1e-8)
    assert peak["amplitude"] == pytest.approx(1 / (2 * k * zeta * sqrt(1 - zeta**2)), rel=1e-12)
    width = 2 * zeta * sqrt(1 - zeta**2)
    high, low = (omega * sqrt(1 - 2 * zeta**2 + sign * width) for sign in (1, -1))
    assert peak["amplification_factor"] == pytest.approx(resonance / (high - low), rel=1e-7)
    assert answer["evidence"]["largest_relative_residual"] < 1e-14


@pytest.mark.parametrize("hz", [5.0, 20.0, 45.0])
def test_the_force_on_the_floor_follows_the_transmissibility(hz: float) -> None:
    """|k + icω|/|k − mω² + icω|, the same for force as for motion of the base; Den Hartog."""
    mass, k, c = 200.0, 3.2e6, 1600.0
    w = 2 * pi * hz
    expected = (k + 1j * c * w) / (k - mass * w * w + 1j * c * w)
    answer = harmonic(
        one(mass, k, c),
        [{"at": "m/z", "force": 10.0}],
        frequencies={"list_hz": [hz]},
        forces_in=["k"],
    )
    (force,) = answer["series"]
    assert (force["at"], force["quantity"], force["unit"]) == ("k/z", "force", "N")
    assert force["amplitude"][0] == pytest.approx(10 * abs(expected), rel=1e-13)
    assert force["phase_deg"][0] == pytest.approx(np.rad2deg(np.angle(expected)), rel=1e-12)


def test_a_balance_grade_is_worth_its_mass_eccentricity() -> None:
    """ISO 21940-11: e·Ω = G. A rotor of 60 kg balanced to G 6.3 for 1500 rpm: 2406 g·mm."""
    unbalance = {"balance_grade_mm_s": 6.3, "rotor_mass": 60.0, "service_rpm": 1500}
    same = {"mass_eccentricity": 60.0 * 6.3e-3 / (1500 * 2 * pi / 60)}
    assert same["mass_eccentricity"] == pytest.approx(2406e-6, rel=1e-3)
    answers = [
        harmonic(
            one(200.0, 3.2e6, 1600.0),
            [{"at": "m/z", "unbalance": given}],
            speeds={"list_rpm": [700, 1100]},
        )["series"][0]["amplitude"]
        for given in (unbalance, same)
    ]
    assert answers[0] == pytest.approx(answers[1], rel=1e-14)


def test_a_grade_without_a_service_speed_takes_the_highest_speed_asked_for() -> None:
    grade = {"balance_grade_mm_s": 6.3, "rotor_mass": 60.0}
    given, assumed = (
        harmonic(
            one(200.0, 3.2e6, 1600.0),
            [{"at": "m/z", "unbalance": unbalance}],
            speeds={"list_rpm": [700, 1100]},
        )["series"][0]["amplitude"]
        for unbalance in ({**grade, "service_rpm": 1100}, grade)
    )
    assert given == assumed


@pytest.mark.parametrize("ratio", [0.25, 0.5, 0.8])
def test_the_shock_spectrum_of_a_half_sine_has_its_closed_form(ratio: float) -> None:
    """Undamped, a pulse shorter than half a period, ratio = 2·duration/period < 1: the largest
    response comes after it, A = 2r/(r² − 1)·cos(π/(2r)) with r = 1/ratio; Harris, Shock and
    Vibration Handbook, response to pulses (from memory), re-derived."""
    duration, peak = 0.01, 50.0
    hz = ratio / (2 * duration)
    answer = ask(
        "response/transient",
        {
            "system": one(1.0, 1e4),
            "base": {
                "motion": "z",
                "shape": "half-sine",
                "peak": peak,
                "duration_s": duration,
            },
            "duration_s": 0.1,
            "time_step_s": 0.01,
            "observe": ["m/z"],
            "shock_spectrum": {"from_hz": hz, "to_hz": 40 * hz, "points": 2, "damping_ratios": [0]},
        },
    )
    (spectrum,) = answer["shock_spectrum"]
    r = 1 / ratio
    expected = 2 * r / (r * r - 1) * cos(pi * ratio / 2)
    assert spectrum["absolute_acceleration_m_s2"][0] == pytest.approx(expected * peak, rel=1e-7)
    omega = 2 * pi * hz
    assert spectrum["relative_displacement_m"][0] == pytest.approx(
        expected * peak / omega**2, rel=1e-7
    )


def test_a_stiff_oscillator_follows_the_largest_acceleration_of_the_base() -> None:
    """The spectrum tends to the record's own peak at high frequency (Biot); by 2 % here."""
    answer = ask(
        "response/transient",
        {
            "system": one(1.0, 1e4),
            "base": {"motion": "z", "time_s": [0, 0.1, 0.2], "acceleration": [0, 3.0, 0]},
            "duration_s": 0.3,
            "time_step_s": 0.01,
            "observe": ["m/z"],
            "shock_spectrum": {"from_hz": 1, "to_hz": 900, "points": 3},
        },
    )
    (spectrum,) = answer["shock_spectrum"]
    assert spectrum["damping_ratio"] == 0.05
    assert spectrum["absolute_acceleration_m_s2"][-1] == pytest.approx(3.0, rel=0.02)


def test_a_constant_acceleration_of_the_base_swings_a_mass_to_twice_its_sag() -> None:
    """Relative motion −a/ω²·(1 − cos ωt), as of a step; absolute motion a·t²/2 more."""
    a, omega = 2.0, 10.0
    body = {
        "system": one(1.0, omega**2),
        "base": {"motion": "z", "shape": "step", "peak": a},
        "duration_s": 1.0,
        "time_step_s": 0.1,
        "observe": ["m/z"],
    }
    absolute = ask("response/transient", body)
    relative = ask("response/transient", {**body, "relative_to_base": True})
    for k, t in enumerate(absolute["time_s"]):
        swing = -a / omega**2 * (1 - cos(omega * t))
        assert relative["series"][0]["values"][k] == pytest.approx(swing, abs=1e-14)
        assert absolute["series"][0]["values"][k] == pytest.approx(swing + a * t * t / 2, abs=1e-14)


def test_a_free_mass_under_a_ramp_follows_its_double_integral() -> None:
    """x = F·t³/(6·m·T) while the ramp rises, and on at constant acceleration."""
    system = bodies({"name": "m", "mass": 2.0}, motions=["x"])
    answer = ask(
        "response/transient",
        {
            "system": system,
            "forces": [{"at": "m/x", "shape": "ramp", "peak": 6.0, "duration_s": 2.0}],
            "initial": {"velocity": {"m/x": 0.5}},
            "duration_s": 3.0,
            "time_step_s": 0.7,
            "observe": ["m/x"],
        },
    )
    for t, value in zip(answer["time_s"], answer["series"][0]["values"], strict=True):
        s = max(0.0, t - 2.0)
        rising = min(t, 2.0)
        pushed = 6.0 * rising**3 / (6 * 2.0 * 2.0) + 3.0 * s + 6.0 * s * s / (2 * 2.0)
        assert value == pytest.approx(pushed + 0.5 * t, rel=1e-13)


def test_loss_factor_at_resonance_limits_the_response_to_one_over_eta() -> None:
    """Structural damping: |H| = 1/(ηk) at √(k/m), 90° behind; ISO 2041."""
    answer = harmonic(
        one(4.0, 1600.0, loss_factor=0.04),
        [{"at": "m/z", "force": 8.0}],
        frequencies={"list_hz": [20.0 / (2 * pi)]},
    )
    assert answer["series"][0]["amplitude"][0] == pytest.approx(8 / (0.04 * 1600), rel=1e-12)
    assert answer["series"][0]["phase_deg"][0] == pytest.approx(-90.0, abs=1e-9)


def test_a_run_up_integrates_its_phase() -> None:
    """Force sin(∫ω dt) on a free mass: the second integral by mpmath at 30 digits, through the
    acceleration that is the force itself over the mass."""
    system = bodies({"name": "m", "mass": 2.0}, motions=["x"])
    body = {
        "system": system,
        "forces": [
            {
                "at": "m/x",
                "shape": "chirp",
                "mass_eccentricity": 0.01,
                "from_rpm": 60,
                "to_rpm": 600,
                "duration_s": 4.0,
            }
        ],
        "duration_s": 4.0,
        "time_step_s": 0.25,
        "observe": ["m/x"],
        "quantity": "acceleration",
    }
    answer = ask("response/transient", body)
    for t, value in zip(answer["time_s"][:-1], answer["series"][0]["values"][:-1], strict=True):
        speed = 2 * pi * (1 + 9 * t / 4)
        phase = 2 * pi * (t + 9 * t * t / 8)
        assert value == pytest.approx(0.005 * speed**2 * sin(phase), abs=1e-10)
    velocity = ask("response/transient", {**body, "quantity": "velocity"})
    with mpmath.workdps(30):
        grid = mpmath.linspace(0, 3, 25)
        expected = mpmath.quad(
            lambda t: (
                mpmath.mpf("0.005")
                * (2 * mpmath.pi * (1 + 9 * t / 4)) ** 2
                * mpmath.sin(2 * mpmath.pi * (t + 9 * t * t / 8))
            ),
            grid,
        )
    assert velocity["series"][0]["values"][12] == pytest.approx(float(expected), abs=1e-10)
