"""The task `response/transient`: inputs, base motion, terms, evidence, faults."""

from itertools import pairwise
from math import pi, sqrt
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.integrate import solve_ivp

from schemas.faults import Invalid
from tests.tasks.asking import Raw, ask, bodies, matrices, spring

Floats = NDArray[np.float64]


def transient(system: Raw, **options: object) -> Raw:
    return ask("response/transient", {"system": system, **options})


def values(answer: Raw) -> Floats:
    return np.array([series["values"] for series in answer["series"]])


PAIR = bodies(
    {"name": "a", "mass": 2.0},
    {"name": "b", "mass": 1.0},
    spring("k", "a", "ground", 900.0, damping=3.0),
    spring("l", "a", "b", 400.0, damping=0.4),
    motions=["x"],
)
M, K = np.diag([2.0, 1.0]), np.array([[1300.0, -400.0], [-400.0, 400.0]])
C = np.array([[3.4, -0.4], [-0.4, 0.4]])


def integrated(push: Any, times: Floats, corners: list[float]) -> Floats:
    """x and x′ by `scipy.integrate.solve_ivp` at rtol 1e-12, restarted at each corner."""

    def rate(t: float, x: Floats) -> Floats:
        return np.concatenate([x[2:], np.linalg.solve(M, push(t) - K @ x[:2] - C @ x[2:])])

    state, found = np.zeros(4), np.zeros((4, len(times)))
    for first, last in pairwise(corners):
        inside = (times >= first) & (times < last)
        run = solve_ivp(rate, (first, last), state, "DOP853", np.append(times[inside], last),
                        rtol=1e-12, atol=1e-15)  # fmt: skip
        found[:, inside] = run.y[:, :-1]
        state = run.y[:, -1]
    return found


def test_samples_of_force_agree_with_a_general_integrator() -> None:
    corners, heights = [0.0, 0.13, 0.3, 0.9], [0.0, 40.0, -10.0, 0.0]
    times: Floats = np.arange(24.0) * 0.05
    answer = transient(
        PAIR, forces=[{"at": "b/x", "time_s": corners, "force": heights}], duration_s=1.15,
        time_step_s=0.05, forces_in=["k"], observe=["a/x", "b/x"],
    )  # fmt: skip
    expected = integrated(
        lambda t: np.array([0.0, np.interp(t, corners, heights)]), times, [*corners, 1.2]
    )
    found, carried = values(answer), 900 * expected[0] + 3 * expected[2]
    # Ten times the tolerance of each step: the integrator's error adds up over them.
    assert np.abs(found[:2] - expected[:2]).max() < 1e-11 * np.abs(expected[:2]).max()
    assert np.abs(found[2] - carried).max() < 1e-11 * np.abs(carried).max()
    assert answer["evidence"]["largest_relative_residual"] < 1e-13
    assert answer["modal_terms"] == []


@pytest.mark.parametrize("quantity", ["displacement", "velocity", "acceleration"])
def test_a_base_record_of_any_quantity_agrees_with_a_general_integrator(quantity: str) -> None:
    """The same ground motion, integrated once or twice by hand, drives spring and damper of a."""
    corners = [0.0, 0.2, 0.5]
    heights = [0.0, 0.03, 0.0] if quantity != "acceleration" else [2.0, -1.5, 0.5]
    order = ["displacement", "velocity", "acceleration"].index(quantity)

    def ground(t: float) -> tuple[float, float]:
        u, v = _integrals(corners, heights, t, order)
        return u, v

    times: Floats = np.arange(17.0) * 0.05
    answer = transient(
        PAIR, base={"motion": "x", "time_s": corners, quantity: heights}, duration_s=0.8,
        time_step_s=0.05, observe=["a/x", "b/x"],
    )  # fmt: skip
    expected = integrated(
        lambda t: np.array([900 * ground(t)[0] + 3 * ground(t)[1], 0.0]), times, [*corners, 0.85]
    )
    size = np.abs(expected[:2]).max()
    assert np.abs(values(answer) - expected[:2]).max() < 1e-11 * size


def _integrals(
    corners: list[float], heights: list[float], t: float, order: int
) -> tuple[float, float]:
    """Displacement and velocity of the ground from its piecewise-linear derivative `order`."""
    s = t0 = v = u = 0.0
    for (t0, t1), (h0, h1) in zip(pairwise(corners), pairwise(heights), strict=True):
        if t < t0:
            break
        s, slope = min(t, t1) - t0, (h1 - h0) / (t1 - t0)
        if order == 0:
            u, v = h0 + slope * s, slope if t < t1 else 0.0
        elif order == 1:
            u, v = u + h0 * s + slope * s**2 / 2, h0 + slope * s
        else:
            u += v * s + h0 * s**2 / 2 + slope * s**3 / 6
            v += h0 * s + slope * s**2 / 2
    if t > corners[-1] and order:
        u += v * (t - corners[-1]) if order == 2 else 0.0
        v = 0.0 if order == 1 else v
    return u, v


def test_a_relaxing_mount_agrees_with_a_general_integrator() -> None:
    """A massless joint on a damper: m·x″ = f − kx − k₁(x − y), c·y′ = k₁(x − y)."""
    system = bodies(
        {"name": "m", "mass": 5.0},
        {"name": "joint"},
        spring("k", "m", "ground", 2000.0),
        spring("k1", "m", "joint", 900.0),
        {"kind": "damper", "name": "c", "between": ["joint", "ground"], "damping": 30.0},
        motions=["z"],
    )
    answer = transient(
        system, forces=[{"at": "m/z", "shape": "step", "peak": 10.0},
                        {"at": "joint/z", "shape": "ramp", "peak": 4.0, "duration_s": 2.0}],
        initial={"displacement": {"m/z": 0.01, "joint/z": -0.002}}, duration_s=1.0,
        time_step_s=0.1, observe=["m/z", "joint/z"],
    )  # fmt: skip

    def rate(t: float, x: Floats) -> list[float]:
        z, y, v = x
        return [v, (900 * (z - y) + 2 * t) / 30, (10 - 2000 * z - 900 * (z - y)) / 5]

    run = solve_ivp(rate, (0, 1.0), [0.01, -0.002, 0.0], "DOP853", np.arange(11) * 0.1,
                    rtol=1e-12, atol=1e-15)  # fmt: skip
    assert values(answer) == pytest.approx(run.y[:2], abs=1e-13)


def test_a_point_without_inertia_and_damping_follows_at_once() -> None:
    """Two springs in series with a force between them: y = (k₂x + f)/(k₁ + k₂)."""
    system = bodies(
        {"name": "m", "mass": 5.0}, {"name": "joint"},
        spring("k1", "joint", "ground", 700.0), spring("k2", "m", "joint", 900.0), motions=["z"],
    )  # fmt: skip
    answer = transient(
        system, forces=[{"at": "joint/z", "time_s": [0, 1], "force": [3, 5]}], duration_s=0.9,
        time_step_s=0.1, observe=["m/z", "joint/z"],
    )  # fmt: skip
    x, y = values(answer)
    force = 3 + 2 * np.array(answer["time_s"])
    assert y == pytest.approx((900 * x + force) / 1600, abs=1e-15)
    k = 700 * 900 / 1600
    w, given = sqrt(k / 5), 900 / 1600  # x″ + w²x = given·f/m, a step and a ramp
    t = np.array(answer["time_s"])
    expected = given / k * (3 * (1 - np.cos(w * t)) + 2 * (t - np.sin(w * t) / w))
    assert x == pytest.approx(expected, abs=1e-15)


def test_two_masses_on_a_damper_alone_drift_and_settle() -> None:
    """Free in space: the centre moves on at v/2, the difference decays as e^(−2ct/m)."""
    system = bodies(
        {"name": "a", "mass": 2.0}, {"name": "b", "mass": 2.0},
        {"kind": "damper", "name": "c", "between": ["a", "b"], "damping": 3.0}, motions=["x"],
    )  # fmt: skip
    answer = transient(
        system, initial={"velocity": {"a/x": 1.0}}, duration_s=100.0, time_step_s=20.0,
        observe=["a/x", "b/x"],
    )  # fmt: skip
    t = np.array(answer["time_s"])
    apart = (1 - np.exp(-3 * t)) / 3
    assert values(answer)[0] == pytest.approx(t / 2 + apart / 2, rel=1e-12)
    assert values(answer)[1] == pytest.approx(t / 2 - apart / 2, rel=1e-12)
    drifts = [t["drift_per_s"] for t in answer["modal_terms"][0]["terms"]]
    assert drifts == pytest.approx([0.5, 0.5], rel=1e-12)


def test_the_modal_terms_add_up_to_the_motion() -> None:
    """The contract: the displacement is Σ e^(−decay·t)(cosine·cos ω_d t + sine·sin ω_d t)."""
    answer = transient(
        PAIR, initial={"displacement": {"b/x": 0.01}, "velocity": {"a/x": -0.4}}, duration_s=2.0,
        time_step_s=0.1, observe=["b/x", "a/x"],
    )  # fmt: skip
    t = np.array(answer["time_s"])
    for place in range(2):
        total = sum(
            np.exp(-mode["decay_per_s"] * t)
            * (
                mode["terms"][place]["cosine"] * np.cos(2 * pi * mode["damped_frequency_hz"] * t)
                + mode["terms"][place]["sine"] * np.sin(2 * pi * mode["damped_frequency_hz"] * t)
            )
            for mode in answer["modal_terms"]
        )
        assert total == pytest.approx(values(answer)[place], abs=1e-15)
    assert abs(answer["evidence"]["energy_balance"]) < 1e-12


def test_the_largest_value_is_found_between_the_steps() -> None:
    system = bodies({"name": "m", "mass": 1.0}, spring("k", "m", "ground", 100.0), motions=["x"])
    answer = transient(
        system, initial={"velocity": {"m/x": -2.0}}, duration_s=0.3, time_step_s=0.1,
        observe=["m/x"],
    )  # fmt: skip
    (largest,) = answer["largest"]
    assert largest["value"] == pytest.approx(-0.2, rel=1e-5)
    assert largest["time_s"] == pytest.approx(pi / 20, abs=1e-3)


def test_quantities_are_derivatives_of_each_other() -> None:
    """Central differences of the finer answer, to their own error."""
    options: Raw = {
        "forces": [{"at": "a/x", "shape": "half-sine", "peak": 9.0, "duration_s": 1.0}],
        "duration_s": 0.8, "time_step_s": 1e-4, "observe": ["b/x"],
    }  # fmt: skip
    x, v, a = (
        values(transient(PAIR, quantity=quantity, **options))[0]
        for quantity in ("displacement", "velocity", "acceleration")
    )
    assert (x[2:] - x[:-2]) / 2e-4 == pytest.approx(v[1:-1], abs=1e-6 * np.abs(v).max())
    assert (v[2:] - v[:-2]) / 2e-4 == pytest.approx(a[1:-1], abs=1e-6 * np.abs(a).max())


def test_a_chirp_through_a_resonance_agrees_with_a_general_integrator() -> None:
    answer = transient(
        PAIR, forces=[{"at": "a/x", "shape": "chirp", "peak": 5.0, "from_rpm": 30, "to_rpm": 400,
                       "duration_s": 3.0, "order": 2}],
        duration_s=2.9, time_step_s=0.1, observe=["a/x", "b/x"],
    )  # fmt: skip
    first, last = 2 * pi * 1.0, 2 * pi * 400 / 30

    def push(t: float) -> Floats:
        return np.array([5.0 * np.sin(first * t + (last - first) * t * t / 6), 0.0])

    expected = integrated(push, np.linspace(0.0, 2.9, 30), [0.0, 3.0])
    assert values(answer) == pytest.approx(expected[:2], abs=1e-11)


def test_thinning_keeps_the_largest_values_of_every_series() -> None:
    options: Raw = {
        "initial": {"displacement": {"a/x": 0.01}}, "duration_s": 20, "time_step_s": 0.001,
        "observe": ["a/x", "b/x"],
    }  # fmt: skip
    whole, thin = transient(PAIR, **options), transient(PAIR, **options, max_points=100)
    assert len(thin["time_s"]) <= 100
    assert np.abs(values(thin)).max(axis=1).tolist() == np.abs(values(whole)).max(axis=1).tolist()


def test_severity_takes_the_root_mean_square_velocity() -> None:
    system = bodies({"name": "m", "mass": 1.0}, spring("k", "m", "ground", 400.0), motions=["x"])
    answer = transient(
        system, initial={"velocity": {"m/x": 2e-3 * sqrt(2)}}, duration_s=2 * pi * 10,
        time_step_s=pi / 1000, observe=["m/x"], severity={"machine": "medium", "support": "rigid"},
    )  # fmt: skip
    (zone,) = answer["severity"]
    assert zone["rms_velocity_mm_s"] == pytest.approx(2.0, rel=1e-4)
    assert zone["zone"] == "B"


TIED = bodies(
    {"name": "a", "mass": 1.0}, {"name": "b", "mass": 1.0}, {"name": "p"},
    spring("k", "a", "ground", 1e4), spring("l", "a", "p", 1e4),
    {"kind": "link", "name": "tie", "between": ["a", "b"]}, motions=["x"],
)  # fmt: skip
STEP = {"at": "a/x", "shape": "step", "peak": 1.0}
RUN: Raw = {"duration_s": 1.0, "time_step_s": 0.1}


@pytest.mark.parametrize(
    ("options", "pointers"),
    [
        (RUN, {"/forces"}),
        ({"forces": [STEP], "duration_s": 0.1, "time_step_s": 1.0}, {"/time_step_s"}),
        ({"forces": [STEP], "duration_s": 1e3, "time_step_s": 1e-6}, {"/time_step_s"}),
        ({**RUN, "forces": [{"at": "a/y", "shape": "step", "peak": 1.0}]}, {"/forces/0/at"}),
        ({**RUN, "forces": [{"at": "a/x", "shape": "step"}]}, {"/forces/0/peak"}),
        ({**RUN, "forces": [{"at": "a/x", "shape": "half-sine", "peak": 1}]},
         {"/forces/0/duration_s"}),
        ({**RUN, "forces": [{"at": "a/x", "time_s": [0, 1], "force": [1]}]}, {"/forces/0/force"}),
        ({**RUN, "forces": [{"at": "a/x", "time_s": [1, 0], "force": [1, 2]}]},
         {"/forces/0/time_s/1"}),
        ({**RUN, "forces": [{"at": "a/x", "time_s": [0, 1], "moment": [1, 2]}]},
         {"/forces/0/moment"}),
        ({**RUN, "forces": [{**STEP, "time_s": [0, 1]}]}, {"/forces/0/time_s"}),
        ({**RUN, "forces": [{**STEP, "from_rpm": 3}]}, {"/forces/0/from_rpm"}),
        ({**RUN, "forces": [{"at": "a/x", "shape": "chirp", "peak": 1, "duration_s": 1}]},
         {"/forces/0/from_rpm"}),
        ({**RUN, "forces": [{"at": "a/x", "shape": "chirp", "peak": 1, "duration_s": 1e9,
                             "from_rpm": 0, "to_rpm": 1e18}]}, {"/forces/0/to_rpm"}),
        ({**RUN, "initial": {"displacement": {"a/x": 0.1}}}, {"/initial/displacement/a~1x"}),
        ({**RUN, "initial": {"displacement": {"c/x": 0.1}}}, {"/initial/displacement/c~1x"}),
        ({**RUN, "base": {"motion": "x", "time_s": [0, 1], "displacement": [0, 1],
                          "velocity": [0, 1]}}, {"/base/velocity"}),
        ({**RUN, "base": {"motion": "x", "time_s": [0, 1]}}, {"/base/displacement"}),
        ({**RUN, "forces": [STEP], "shock_spectrum": {"from_hz": 1, "to_hz": 2}},
         {"/shock_spectrum"}),
        ({**RUN, "forces": [STEP], "observe": ["a/x", "q/x"]}, {"/observe/1"}),
        ({**RUN, "forces": [STEP], "forces_in": ["tie"]}, {"/forces_in/0"}),
        ({**RUN, "forces": [STEP], "max_points": 5}, {"/max_points"}),
    ],
)  # fmt: skip
def test_a_faulty_question_is_refused_where_it_is_wrong(options: Raw, pointers: set[str]) -> None:
    with pytest.raises(Invalid) as caught:
        transient(TIED, **options)
    assert {fault.pointer for fault in caught.value.faults} == pointers


def test_what_is_tied_moves_together_from_the_start() -> None:
    together = {"a/x": 0.1, "b/x": 0.1, "p/x": 0.1}
    answer = transient(TIED, initial={"displacement": together}, **RUN, observe=["b/x"])
    t = np.array(answer["time_s"])
    assert values(answer)[0] == pytest.approx(0.1 * np.cos(sqrt(5e3) * t), abs=1e-14)


def test_a_jump_of_the_base_under_a_damper_is_refused() -> None:
    base = {"motion": "x", "time_s": [0, 1], "displacement": [0.1, 0.1]}
    with pytest.raises(Invalid) as caught:
        transient(PAIR, base=base, **RUN)
    assert [fault.pointer for fault in caught.value.faults] == ["/base/0"]


def test_an_unstable_machine_is_not_followed_out_of_the_range_of_numbers() -> None:
    system = matrices([[1.0]], [[-100.0]])
    with pytest.raises(Invalid) as caught:
        transient(system, initial={"displacement": {"1/x": 1}}, duration_s=1e3, time_step_s=1)
    assert [fault.pointer for fault in caught.value.faults] == ["/duration_s"]
    grown = transient(
        system, initial={"displacement": {"1/x": 1}}, duration_s=2, time_step_s=1, observe=["1/x"]
    )
    assert values(grown)[0] == pytest.approx(np.cosh([0.0, 10.0, 20.0]), rel=1e-13)
    assert any("unstable" in warning for warning in grown["warnings"])


def test_a_loss_factor_becomes_viscous_damping_of_the_mode() -> None:
    """η = 2ζ at resonance (ISO 2041): decay ηω/2."""
    system = bodies(
        {"name": "m", "mass": 1.0}, spring("k", "m", "ground", 400.0, loss_factor=0.04),
        motions=["x"],
    )  # fmt: skip
    answer = transient(system, initial={"displacement": {"m/x": 1}}, **RUN)
    assert answer["modal_terms"][0]["decay_per_s"] == pytest.approx(0.4, rel=1e-12)
    assert any("loss factors" in warning for warning in answer["warnings"])
