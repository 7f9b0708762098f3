"""The task `response/harmonic`: excitation, base motion, forces carried, peaks, faults."""

from cmath import exp
from math import pi, sqrt
from typing import Any

import numpy as np
import pytest

from schemas.faults import Invalid
from tests.tasks.asking import Raw, ask, bodies, matrices, spring

BLOCK: Raw = {
    "name": "block",
    "mass": 120.0,
    "at": [0.1, -0.05, 0.4],
    "inertia": {"xx": 6.0, "yy": 9.0, "zz": 11.0, "xy": 0.4, "xz": -0.3},
}
CORNERS = [[0.5, 0.4, 0.1], [0.5, -0.4, 0.1], [-0.5, 0.4, 0.1], [-0.5, -0.4, 0.15]]


def mounts(end: str) -> list[Raw]:
    return [
        spring(
            f"mount {number}",
            "block",
            end,
            {"x": 2e5, "y": 3e5, "z": 6e5 + 1e4 * number, "rz": 900.0},
            at=at,
            damping={"x": 300.0, "z": 800.0},
        )
        for number, at in enumerate(CORNERS)
    ]


def harmonic(system: Raw, *excite: Raw, **options: object) -> Raw:
    return ask("response/harmonic", {"system": system, "excite": list(excite), **options})


def amplitudes(answer: Raw) -> dict[str, complex]:
    """Complex amplitudes at the first place of the axis."""
    return {
        series["at"]: series["amplitude"][0] * exp(1j * np.deg2rad(series["phase_deg"][0]))
        for series in answer["series"]
    }


@pytest.mark.parametrize("motion", ["x", "y", "z", "rx", "ry", "rz"])
def test_a_moving_base_acts_like_a_floor_too_heavy_to_feel_the_machine(motion: str) -> None:
    """The same mounts on a body of 1e13 kg that a force drives: u = −F/(m·ω²). No formula of base
    motion takes part in it."""
    hz, heavy = 7.0, 1e13
    frequencies = {"list_hz": [hz]}
    based = harmonic(
        bodies(BLOCK, *mounts("ground")), {"base": motion, "displacement": 1.0},
        frequencies=frequencies,
    )  # fmt: skip
    floor = {"name": "floor", "mass": heavy, "inertia": {"xx": heavy, "yy": heavy, "zz": heavy}}
    force = -heavy * (2 * pi * hz) ** 2
    driven = harmonic(
        bodies(BLOCK, floor, *mounts("floor")),
        {"at": f"floor/{motion}", "moment" if motion[0] == "r" else "force": force},
        frequencies=frequencies,
    )
    expected = amplitudes(driven)
    for at, value in amplitudes(based).items():
        assert value == pytest.approx(expected[at], abs=1e-8)


def test_a_turn_about_a_point_is_a_turn_about_the_origin_and_a_shift() -> None:
    system = bodies(BLOCK, *mounts("ground"))
    options: Raw = {"frequencies": {"list_hz": [5.0]}}
    about = harmonic(
        system, {"base": "ry", "displacement": 0.01, "about": [0.3, 0.0, 0.7]}, **options
    )
    both = harmonic(
        system,
        {"base": "ry", "displacement": 0.01},
        {"base": "x", "displacement": -0.01 * 0.7},
        {"base": "z", "displacement": 0.01 * 0.3},
        **options,
    )
    expected = amplitudes(both)
    for at, value in amplitudes(about).items():
        assert value == pytest.approx(expected[at], abs=1e-15)


@pytest.mark.parametrize(("quantity", "power"), [("velocity", 1), ("acceleration", 2)])
def test_base_velocity_and_acceleration_are_those_of_its_displacement(
    quantity: str, power: int
) -> None:
    system, w = bodies(BLOCK, *mounts("ground")), 2 * pi * 6.0
    options: Raw = {"frequencies": {"list_hz": [6.0]}, "observe": ["block/x"]}
    given = amplitudes(harmonic(system, {"base": "x", quantity: 1.0}, **options))["block/x"]
    shifted = amplitudes(harmonic(system, {"base": "x", "displacement": 1.0}, **options))["block/x"]
    assert given == pytest.approx(shifted / (1j * w) ** power, rel=1e-12)


HANGING = bodies(
    {"name": "bob", "mass": 3.0, "at": [0.0, 0.0, -0.2]},
    {"kind": "pendulum", "name": "rod", "body": "bob", "length": 0.7},
    motions=["x", "y"],
)


@pytest.mark.parametrize(
    ("base", "observed", "pivot"),
    [("x", "bob/x", 1.0), ("ry", "bob/x", 0.5), ("rx", "bob/y", -0.5)],
)
def test_a_pendulum_follows_its_pivot(base: str, observed: str, pivot: float) -> None:
    """x/u = 1/(1 − ω²l/g) of a pendulum whose pivot moves by u; turning the ground about the
    origin moves the pivot, 0.5 m above it, along x or against y."""
    answer = harmonic(
        HANGING, {"base": base, "displacement": 0.01},
        frequencies={"list_hz": [0.4]}, observe=[observed], forces_in=["rod"],
    )  # fmt: skip
    ratio = 1 / (1 - (2 * pi * 0.4) ** 2 * 0.7 / 9.80665)
    found = amplitudes(answer)
    assert found[observed] == pytest.approx(0.01 * pivot * ratio, rel=1e-12)
    pulled = 3.0 * 9.80665 / 0.7 * 0.01 * pivot * (ratio - 1)
    assert found[f"rod/{observed[-1]}"] == pytest.approx(pulled, rel=1e-12)


def test_what_is_held_moves_with_the_ground() -> None:
    held = bodies(
        {"name": "m", "mass": 2.0},
        {"name": "post", "mass": 5.0, "held": ["z"]},
        spring("k", "m", "post", 800.0, damping=4.0),
        motions=["z"],
    )
    grounded = bodies(
        {"name": "m", "mass": 2.0}, spring("k", "m", "ground", 800.0, damping=4.0), motions=["z"]
    )
    found, expected = (
        amplitudes(
            harmonic(system, {"base": "z", "displacement": 1.0}, frequencies={"list_hz": [2.0]},
                     observe=["m/z"])
        )["m/z"]
        for system in (held, grounded)
    )  # fmt: skip
    assert found == pytest.approx(expected, rel=1e-14)


def test_geared_wheels_turn_with_their_housing() -> None:
    """θ₂ − θ = ρ(θ₁ − θ) on ground that turns by θ; with y = θ₁ − θ the closed form is
    y = ω²(J₁ + ρJ₂)θ/(k − ω²(J₁ + ρ²J₂))."""
    J1, J2, rho, k, w = 0.5, 0.2, -2.5, 4e3, 2 * pi * 4.0
    system = bodies(
        {"name": "pinion", "inertia": J1},
        {"name": "wheel", "inertia": J2},
        {"kind": "gear", "name": "mesh", "between": ["pinion", "wheel"], "ratio": rho},
        {"kind": "shaft", "name": "shaft", "between": ["pinion", "ground"], "stiffness": k},
        motions=["rx"],
    )
    answer = harmonic(
        system, {"base": "rx", "displacement": 0.02}, frequencies={"list_hz": [4.0]},
        forces_in=["shaft"], observe=["pinion/rx", "wheel/rx"],
    )  # fmt: skip
    y = w * w * (J1 + rho * J2) * 0.02 / (k - w * w * (J1 + rho**2 * J2))
    found = amplitudes(answer)
    assert found["pinion/rx"] == pytest.approx(0.02 + y, rel=1e-12)
    assert found["wheel/rx"] == pytest.approx(0.02 + rho * y, rel=1e-12)
    assert found["shaft/rx"] == pytest.approx(k * y, rel=1e-12)
    assert [s["unit"] for s in answer["series"]] == ["rad", "rad", "N·m"]


def test_a_gear_with_a_soft_mesh_tends_to_the_rigid_one_on_a_turning_base() -> None:
    def answer(**mesh: object) -> dict[str, complex]:
        system = bodies(
            {"name": "pinion", "inertia": 0.5},
            {"name": "wheel", "inertia": 0.2},
            {"kind": "gear", "name": "mesh", "between": ["pinion", "wheel"], "ratio": -2.5, **mesh},
            {"kind": "shaft", "name": "shaft", "between": ["pinion", "ground"], "stiffness": 4e3},
            motions=["rx"],
        )
        excite = {"base": "rx", "displacement": 0.02}
        return amplitudes(harmonic(system, excite, frequencies={"list_hz": [4.0]}))

    rigid, stiff = answer(), answer(mesh_stiffness=1e13, pitch_radius=[0.25, 0.1])
    for at, value in rigid.items():
        assert stiff[at] == pytest.approx(value, rel=1e-6)


def test_forces_on_the_floor_balance_the_load_and_the_inertia() -> None:
    """Newton's law for the whole machine: the floor receives F + ω²Σmx, and moments likewise."""
    w = 2 * pi * 9.0
    system = bodies(BLOCK, *mounts("ground"))
    names = [f"mount {number}" for number in range(4)]
    found = amplitudes(
        harmonic(
            system, {"at": "block/y", "force": 50.0, "phase_deg": 30.0},
            {"at": "block/rx", "moment": 8.0}, frequencies={"list_hz": [9.0]},
            observe=[f"block/{m}" for m in ("x", "y", "z", "rx", "ry", "rz")], forces_in=names,
        )
    )  # fmt: skip
    load = {"y": 50.0 * exp(1j * pi / 6)}
    for axis in "xyz":
        carried = sum(found[f"{name}/{axis}"] for name in names)
        assert carried == pytest.approx(
            load.get(axis, 0.0) + w * w * 120.0 * found[f"block/{axis}"]
        )
    centre = np.array(BLOCK["at"])
    tensor = np.array([[6.0, 0.4, -0.3], [0.4, 9.0, 0.0], [-0.3, 0.0, 11.0]])
    turned = np.array([found[f"block/r{axis}"] for axis in "xyz"])
    moment = sum(
        np.cross(np.array(at) - centre, [found[f"{name}/{axis}"] for axis in "xyz"])
        + np.array([0.0, 0.0, found[f"{name}/rz"]])
        for name, at in zip(names, CORNERS, strict=True)
    )
    assert moment == pytest.approx(np.array([8.0, 0, 0]) + w * w * tensor @ turned, abs=1e-9)
    assert not {f"{name}/rx" for name in names} & found.keys()


def test_a_beam_carries_shear_and_moment_to_its_wall() -> None:
    """Statics of a cantilever, load F at length L: shear F, moment F·L (at 0.01 Hz)."""
    system = bodies(
        {"name": "tip", "mass": 1.0, "at": [2.0, 0.0, 0.0]},
        {"name": "wall", "held": ["x", "y", "z", "rx", "ry", "rz"]},
        {
            "kind": "beam",
            "name": "arm",
            "between": ["tip", "wall"],
            "section": {"kind": "round", "diameter": 0.05},
            "material": "steel",
        },
    )
    found = amplitudes(
        harmonic(
            system, {"at": "tip/z", "force": 100.0}, frequencies={"list_hz": [0.01]},
            observe=["tip/z"], forces_in=["arm"],
        )
    )  # fmt: skip
    assert found["arm/z"].real == pytest.approx(100.0, rel=1e-5)
    assert found["arm/ry"].real == pytest.approx(-200.0, rel=1e-5)
    stiffness = 3 * 210e9 * pi * 0.05**4 / 64 / 8.0
    assert found["tip/z"].real == pytest.approx(100.0 / stiffness, rel=1e-5)


def test_a_damper_at_a_massless_point_makes_a_relaxing_mount() -> None:
    """Maxwell element beside a spring: Z = k − mω² + k₁·icω/(k₁ + icω)."""
    system = bodies(
        {"name": "m", "mass": 5.0},
        {"name": "joint"},
        spring("k", "m", "ground", 2000.0),
        spring("k1", "m", "joint", 900.0),
        {"kind": "damper", "name": "c", "between": ["joint", "ground"], "damping": 30.0},
        motions=["z"],
    )
    answer = harmonic(
        system, {"at": "m/z", "force": 7.0}, frequencies={"list_hz": [3.0, 3.1831, 9.0]},
        observe=["m/z"], forces_in=["c"],
    )  # fmt: skip
    for k, hz in enumerate([3.0, 3.1831, 9.0]):
        w = 2 * pi * hz
        relaxing = 900.0 * 30j * w / (900.0 + 30j * w)
        x = 7.0 / (2000.0 - 5 * w * w + relaxing)
        motion, force = answer["series"]
        assert motion["amplitude"][k] == pytest.approx(abs(x), rel=1e-12)
        assert force["amplitude"][k] == pytest.approx(abs(relaxing * x), rel=1e-12)


ROTOR = bodies(
    {
        "name": "disk",
        "mass": 20.0,
        "inertia": {"xx": 0.8, "yy": 0.5, "zz": 0.5},
        "spin": {"axis": "x"},
        "motions": ["y", "z", "ry", "rz"],
    },
    *(
        {
            "kind": "bearing",
            "name": name,
            "between": ["disk", "ground"],
            "at": [place, 0, 0],
            "points": [
                {
                    "rpm": rpm,
                    "stiffness": [[1e6 + 200 * rpm, 1e5], [-2e5, 2e6]],
                    "damping": [[900.0, 0.0], [0.0, 400.0 + rpm / 10]],
                }
                for rpm in (500, 3000, 6000)
            ],
        }
        for name, place in (("front", -0.2), ("rear", 0.35))
    ),
)


def test_over_speeds_the_machine_is_at_each_speed_what_it_is_at_that_speed_alone() -> None:
    """Bearing tables and gyroscopic terms: one run over speeds against one question for each."""
    unbalance = {"at": "disk/y", "unbalance": {"mass_eccentricity": 1e-3}}
    across = {**unbalance, "at": "disk/z", "phase_deg": -90}
    options: Raw = {"observe": ["disk/y", "disk/rz"], "forces_in": ["front"]}
    speeds = [700.0, 2500.0, 5900.0]
    together = harmonic(ROTOR, unbalance, across, speeds={"list_rpm": speeds}, **options)
    assert together["axis"]["frequency_hz"] == pytest.approx([rpm / 60 for rpm in speeds])
    for k, rpm in enumerate(speeds):
        alone = harmonic(
            ROTOR, unbalance, across, frequencies={"list_hz": [rpm / 60]}, at_rpm=rpm, **options
        )
        for first, second in zip(together["series"], alone["series"], strict=True):
            assert first["amplitude"][k] == pytest.approx(second["amplitude"][0], rel=1e-11)
            assert first["phase_deg"][k] == pytest.approx(second["phase_deg"][0], abs=1e-8)
    assert together["evidence"]["largest_relative_residual"] < 1e-12


def test_resolved_spacing_puts_points_on_narrow_resonances() -> None:
    system = bodies(
        {"name": "a", "mass": 1.0}, {"name": "b", "mass": 1.0},
        spring("k", "a", "ground", 1e4, damping=0.02), spring("l", "a", "b", 1e4, damping=0.02),
        motions=["x"],
    )  # fmt: skip
    frequencies = {"from_hz": 1, "to_hz": 100, "points": 60}
    answer = harmonic(system, {"at": "a/x", "force": 1.0}, frequencies=frequencies)
    values = answer["axis"]["values"]
    assert len(values) == 60
    assert (values[0], values[-1]) == (1, 100)
    assert not any("further apart" in warning for warning in answer["warnings"])
    peaks = [peak for peak in answer["peaks"] if peak["at"] == "a/x"]
    golden = [100 * sqrt((3 - sign * sqrt(5)) / 2) / (2 * pi) for sign in (1, -1)]
    assert [peak["frequency_hz"] for peak in peaks] == pytest.approx(golden, rel=1e-6)
    even = harmonic(
        system, {"at": "a/x", "force": 1.0}, frequencies={**frequencies, "spacing": "linear"}
    )
    assert any("further apart" in warning for warning in even["warnings"])


def test_thinning_keeps_the_peaks() -> None:
    system = bodies({"name": "a", "mass": 1.0}, spring("k", "a", "ground", 1e4, damping=1.0),
                    motions=["x"])  # fmt: skip
    options: Raw = {"frequencies": {"from_hz": 1, "to_hz": 100, "points": 5000, "spacing": "log"}}
    whole, thin = (
        harmonic(system, {"at": "a/x", "force": 1.0}, **options, **more)
        for more in ({}, {"max_points": 40})
    )
    assert len(thin["axis"]["values"]) == len(thin["series"][0]["amplitude"]) <= 40
    assert max(thin["series"][0]["amplitude"]) == max(whole["series"][0]["amplitude"])
    assert thin["peaks"] == whole["peaks"]


def test_an_undamped_machine_has_peaks_without_bound() -> None:
    system = bodies({"name": "a", "mass": 1.0}, spring("k", "a", "ground", 1e4), motions=["x"])
    answer = harmonic(system, {"at": "a/x", "force": 1.0}, frequencies={"from_hz": 5, "to_hz": 50})
    (peak,) = answer["peaks"]
    assert peak["amplitude"] is None
    assert peak["amplification_factor"] is None
    assert peak["frequency_hz"] == pytest.approx(100 / (2 * pi), rel=1e-6)
    assert any("no bound" in warning for warning in answer["warnings"])


def test_a_base_under_matrices_moves_all_of_its_axis() -> None:
    """Equal to springs to ground at the row sums of K: here one, so transmissibility."""
    system = matrices(
        [[2.0, 0], [0, 1.0]], [[900.0, -300.0], [-300.0, 300.0]], damping=[[5.0, 0], [0, 0.0]]
    )
    answer = harmonic(system, {"base": "x", "displacement": 1.0}, frequencies={"list_hz": [2.5]})
    w = 5 * pi
    Z = np.array([[900 - 2 * w * w + 5j * w, -300], [-300, 300 - w * w]])
    expected = np.linalg.solve(Z, [600 + 5j * w, 0])
    assert list(amplitudes(answer).values()) == pytest.approx(list(expected), rel=1e-12)
    assert answer["evidence"]["reciprocity_difference"] < 1e-13


def test_severity_gives_the_zone_of_the_worst_frequency() -> None:
    system = bodies({"name": "a", "mass": 1.0}, spring("k", "a", "ground", 1e4), motions=["x"])
    w = 2 * pi * 10.0
    force = 5e-3 * sqrt(2.0) * (1e4 - w * w) / w  # 5 mm/s r.m.s.
    answer = harmonic(
        system, {"at": "a/x", "force": force}, frequencies={"list_hz": [10.0]},
        severity={"machine": "large", "support": "rigid"},
    )  # fmt: skip
    (zone,) = answer["severity"]
    assert zone["rms_velocity_mm_s"] == pytest.approx(5.0, rel=1e-12)
    assert zone["zone"] == "C"
    assert "check against your copy" in zone["source"]


SIMPLE = bodies(
    {"name": "a", "mass": 1.0, "motions": ["x", "rz"], "inertia": 1.0},
    {"name": "b", "mass": 1.0, "motions": ["x"], "held": []},
    spring("k", "a", "ground", {"x": 1e4, "rz": 10.0}),
    {"kind": "link", "name": "tie", "between": ["a", "b"]},
)
PUSH = {"at": "a/x", "force": 1.0}
AT = {"frequencies": {"list_hz": [10.0]}}


@pytest.mark.parametrize(
    ("excite", "options", "pointers"),
    [
        ([PUSH], {}, {"/frequencies"}),
        ([PUSH], {**AT, "speeds": {"list_rpm": [600]}}, {"/frequencies"}),
        ([PUSH], {"frequencies": {"from_hz": 10, "to_hz": 5}}, {"/frequencies/to_hz"}),
        ([PUSH], {"frequencies": {"from_hz": 10}}, {"/frequencies/to_hz"}),
        ([PUSH], {"frequencies": {"list_hz": [1], "points": 3}}, {"/frequencies/points"}),
        ([PUSH], {"frequencies": {"list_hz": [1, 0]}}, {"/frequencies/list_hz/1"}),
        ([{"at": "a/z", "force": 1.0}, {"at": "c/x", "force": 1}], AT,
         {"/excite/0/at", "/excite/1/at"}),
        ([{"at": "a/rz", "force": 1.0}], AT, {"/excite/0/force"}),
        ([{"at": "a/x", "moment": 1.0}], AT, {"/excite/0/moment"}),
        ([{"at": "a/x"}], AT, {"/excite/0/force"}),
        ([{**PUSH, "base": "x"}], AT, {"/excite/0/base"}),
        ([{"base": "x"}], AT, {"/excite/0/displacement"}),
        ([{"base": "x", "displacement": 1, "at": "a/x"}], AT, {"/excite/0/at"}),
        ([{"base": "x", "displacement": 1, "about": [0, 0, 0]}], AT, {"/excite/0/about"}),
        ([{"at": "a/x", "unbalance": {}}], AT, {"/excite/0/unbalance/mass_eccentricity"}),
        ([{"at": "a/x", "unbalance": {"balance_grade_mm_s": 2.5}}], AT,
         {"/excite/0/unbalance/rotor_mass"}),
        ([{"at": "a/x", "unbalance": {"balance_grade_mm_s": 2.5, "rotor_mass": 1}}], AT,
         {"/excite/0/unbalance/service_rpm"}),
        ([PUSH, {**PUSH, "order": 2}], {"speeds": {"list_rpm": [600]}}, {"/excite/1/order"}),
        ([{**PUSH, "order": 2}], AT, {"/excite/0/order"}),
        ([PUSH], {**AT, "observe": ["a/x", "b/rz"]}, {"/observe/1"}),
        ([PUSH], {**AT, "forces_in": ["k", "tie", "spring"]}, {"/forces_in/1", "/forces_in/2"}),
        ([PUSH], {**AT, "relative_to_base": True}, {"/relative_to_base"}),
        ([{**PUSH, "force": "3 kg"}], AT, {"/excite/0/force"}),
        ([], AT, {"/excite"}),
    ],
)  # fmt: skip
def test_a_faulty_question_is_refused_where_it_is_wrong(
    excite: list[Raw], options: Raw, pointers: set[str]
) -> None:
    with pytest.raises(Invalid) as caught:
        harmonic(SIMPLE, *excite, **options)
    assert {fault.pointer for fault in caught.value.faults} == pointers


def test_a_question_on_matrices_cannot_ask_for_forces() -> None:
    options: Any = {**AT, "forces_in": ["k"]}
    with pytest.raises(Invalid) as caught:
        harmonic(matrices([[1.0]], [[1.0]]), {"at": "1/x", "force": 1.0}, **options)
    assert [fault.pointer for fault in caught.value.faults] == ["/forces_in"]
