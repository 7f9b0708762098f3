"""Laws that hold for any machine."""

from copy import deepcopy
from math import cos, sin
from random import Random
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.properties.random_machines import FAMILIES, line, plane, space
from tests.tasks.asking import hertz, modes

Raw = dict[str, Any]
ALL = 2000
POUND, INCH, POUND_FORCE = 0.45359237, 0.0254, 4.4482216152605  # exact by definition (NIST SP 811)

seeds = st.integers(min_value=0, max_value=2**32)
some = settings(max_examples=40)
makers = st.sampled_from([line, plane, space])


def mounted(draw: Random) -> Raw:
    """One to three bodies on mounts that hold every motion, as in a real installation."""
    bodies: list[Raw] = [
        {
            "name": f"b{number}",
            "at": [draw.uniform(-1, 1), draw.uniform(-1, 1), draw.uniform(0.2, 1)],
            "mass": draw.uniform(100, 2000),
            "inertia": {"xx": draw.uniform(20, 90), "yy": draw.uniform(60, 120)}
            | {"zz": draw.uniform(80, 140), "xy": draw.uniform(-5, 5), "xz": draw.uniform(-5, 5)}
            | {"yz": draw.uniform(-5, 5)},
        }
        for number in range(draw.randint(1, 3))
    ]
    parts: list[Raw] = []
    for number, body in enumerate(bodies):
        for foot in range(4):
            stiffness = {axis: draw.uniform(2e5, 4e6) for axis in ("x", "y", "z", "rx")}
            at = [draw.uniform(-1, 1), draw.uniform(-1, 1), 0.0]
            end = "ground" if not number or foot < 2 else f"b{number - 1}"
            parts.append(_spring(f"foot {number}.{foot}", body["name"], end, stiffness, at))
        stay = _spring(f"stay {number}", body["name"], "ground", draw.uniform(1e5, 1e6), [0, 0, 1])
        parts.append({**stay, "along": [1.0, draw.uniform(0, 2), draw.uniform(-2, 2)]})
    return {"kind": "bodies", "bodies": bodies, "connections": parts}


def _spring(name: str, body: str, end: str, stiffness: object, at: list[float]) -> Raw:
    between = [body, end]
    return {"kind": "spring", "name": name, "between": between, "stiffness": stiffness, "at": at}


def eigenvalues(system: Raw) -> tuple[np.ndarray[Any, Any], float]:
    """All ω² with their signs, up to a common factor, and how far roundoff may move them."""
    answer = modes(system, count=ALL)["modes"]
    signed = [m["frequency_hz"] ** 2 * (-1 if m["kind"] == "diverging" else 1) for m in answer]
    values = np.array(signed)
    return values, 1e-11 * float(np.abs(values).max(initial=1.0))


@some
@given(seeds, makers)
def test_effective_masses_add_up_to_the_mass_that_moves(seed: int, make: Any) -> None:
    system = make(Random(seed))
    system["connections"] = [part for part in system["connections"] if part["kind"] != "link"]
    for body in system["bodies"]:
        body.pop("held", None)
    answer = modes(system, count=ALL)["modes"]
    for direction in answer[0]["effective_mass"]:
        parts = [mode["effective_mass"][direction] for mode in answer]
        assert sum(part["share"] for part in parts) == pytest.approx(1.0, abs=1e-9)
        if len(direction) == 1:
            total = sum(
                body.get("mass", 0.0)
                for body in system["bodies"]
                if direction in body.get("motions", system["motions"])
            )
            assert sum(part["kg"] for part in parts) == pytest.approx(total, rel=1e-9)


@some
@given(seeds, makers)
def test_adding_stiffness_never_lowers_a_frequency(seed: int, make: Any) -> None:
    # Rayleigh, Theory of Sound, §88.
    draw = Random(seed)
    system = make(draw)
    stiffer = deepcopy(system)
    springs = [part for part in stiffer["connections"] if part["kind"] == "spring"]
    for part in springs:
        if isinstance(part["stiffness"], dict):
            axis = draw.choice(sorted(part["stiffness"]))
            part["stiffness"][axis] *= 1 + draw.random()
        else:
            part["stiffness"] *= 1 + draw.random()
    before, slack = eigenvalues(system)
    after, more = eigenvalues(stiffer)
    assert (after >= before - max(slack, more)).all()


@some
@given(seeds)
def test_adding_mass_never_raises_a_frequency(seed: int) -> None:
    draw = Random(seed)
    system = space(draw)
    heavier = deepcopy(system)
    draw.choice(heavier["bodies"])["mass"] *= 1 + draw.random()
    before, slack = eigenvalues(system)
    after, more = eigenvalues(heavier)
    assert (after <= before + max(slack, more)).all()


@some
@given(seeds)
def test_holding_one_motion_interlaces_the_frequencies(seed: int) -> None:
    # Cauchy's interlacing: λᵢ ≤ λ′ᵢ ≤ λᵢ₊₁ for one constraint.
    draw = Random(seed)
    system = space(draw)
    tied = deepcopy(system)
    draw.choice(tied["bodies"])["held"] = [draw.choice(system["motions"])]
    before, slack = eigenvalues(system)
    after, more = eigenvalues(tied)
    allowed = max(slack, more)
    assert len(after) == len(before) - 1
    assert (before[:-1] - allowed <= after).all()
    assert (after <= before[1:] + allowed).all()


@some
@given(seeds)
def test_a_link_in_one_motion_interlaces_the_frequencies(seed: int) -> None:
    draw = Random(seed)
    system = mounted(draw)
    link = {"kind": "link", "name": "tie", "between": ["b0", "ground"], "at": [0.4, 0.1, -0.3]}
    tied = {
        **system,
        "connections": [
            *system["connections"],
            {**link, "motions": [draw.choice(["x", "y", "z"])]},
        ],
    }
    before, slack = eigenvalues(system)
    after, more = eigenvalues(tied)
    assert len(after) == len(before) - 1
    assert (before[:-1] - slack <= after).all()
    assert (after <= before[1:] + more).all()


def in_pounds_and_inches(system: Raw) -> Raw:
    """The same machine with every number written in lb, in and lbf."""
    other = deepcopy(system)
    for body in other["bodies"]:
        body["at"] = [f"{value / INCH!r} in" for value in body["at"]]
        body["mass"] = f"{body['mass'] / POUND!r} lb"
        tensor = body["inertia"]
        body["inertia"] = {axis: f"{v / (POUND * INCH**2)!r} lb in^2" for axis, v in tensor.items()}
    for part in other["connections"]:
        part["at"] = [f"{value / INCH!r} in" for value in part["at"]]
        along, about = POUND_FORCE / INCH, POUND_FORCE * INCH
        if isinstance(part["stiffness"], dict):
            part["stiffness"] = {
                axis: f"{v / about!r} lbf·in/rad" if axis[0] == "r" else f"{v / along!r} lbf/in"
                for axis, v in part["stiffness"].items()
            }
        else:
            part["stiffness"] = f"{part['stiffness'] / along!r} lbf/in"
    return other


@some
@given(seeds)
def test_the_same_machine_in_pounds_and_inches_gives_the_same_hertz(seed: int) -> None:
    system = mounted(Random(seed))
    assert hertz(in_pounds_and_inches(system)) == pytest.approx(hertz(system), rel=1e-12, abs=0)


def turned(system: Raw, Q: np.ndarray[Any, Any], shift: np.ndarray[Any, Any]) -> Raw:
    """The same machine turned by the rotation Q about the origin and then moved by `shift`."""
    other = deepcopy(system)
    for body in other["bodies"]:
        t = body["inertia"]
        tensor = np.array(
            [
                [t["xx"], t["xy"], t["xz"]],
                [t["xy"], t["yy"], t["yz"]],
                [t["xz"], t["yz"], t["zz"]],
            ]
        )
        new = Q @ tensor @ Q.T
        body["inertia"] = {
            a + b: float(new[i, j])
            for a, b, i, j in (
                ("x", "x", 0, 0), ("y", "y", 1, 1), ("z", "z", 2, 2),
                ("x", "y", 0, 1), ("y", "z", 1, 2), ("x", "z", 0, 2),
            )
        }  # fmt: skip
        body["at"] = (Q @ body["at"] + shift).tolist()
    for part in other["connections"]:
        part["at"] = (Q @ part["at"] + shift).tolist()
        if "along" in part:
            part["along"] = (Q @ part["along"]).tolist()
        elif isinstance(part["stiffness"], dict):
            part["axes"] = Q.tolist()
    return other


def rotation(draw: Random) -> np.ndarray[Any, Any]:
    a, b, c = (draw.uniform(-3.2, 3.2) for _ in range(3))
    about_x = np.array([[1, 0, 0], [0, cos(a), -sin(a)], [0, sin(a), cos(a)]])
    about_y = np.array([[cos(b), 0, sin(b)], [0, 1, 0], [-sin(b), 0, cos(b)]])
    about_z = np.array([[cos(c), -sin(c), 0], [sin(c), cos(c), 0], [0, 0, 1]])
    product: np.ndarray[Any, Any] = about_x @ about_y @ about_z
    return product


@some
@given(seeds)
def test_the_same_machine_turned_and_moved_in_space_gives_the_same_hertz(seed: int) -> None:
    draw = Random(seed)
    system = mounted(draw)
    shift = np.array([draw.uniform(-3, 3) for _ in range(3)])
    other = turned(system, rotation(draw), shift)
    assert hertz(other) == pytest.approx(hertz(system), rel=1e-12, abs=0)


@some
@given(seeds)
def test_turning_changes_no_share_of_energy(seed: int) -> None:
    draw = Random(seed)
    system = mounted(draw)
    other = turned(system, rotation(draw), np.zeros(3))
    for one, two in zip(
        modes(system, count=3)["modes"], modes(other, count=3)["modes"], strict=True
    ):
        shares = [
            {(part["kind"], part["of"]): part["share"] for part in mode["energy"]}
            for mode in (one, two)
        ]
        for part in shares[0].keys() & shares[1].keys():
            assert shares[0][part] == pytest.approx(shares[1][part], abs=1e-5)


@some
@given(seeds, makers)
def test_the_order_of_bodies_and_connections_changes_only_the_order_of_the_shapes(
    seed: int, make: Any
) -> None:
    draw = Random(seed)
    system = make(draw)
    other = deepcopy(system)
    draw.shuffle(other["bodies"])
    draw.shuffle(other["connections"])
    one, two = modes(system, count=ALL), modes(other, count=ALL)
    assert sorted(one["degrees_of_freedom"]) == sorted(two["degrees_of_freedom"])
    for first, second in zip(one["modes"], two["modes"], strict=True):
        bounds = first["frequency_bound_hz"] + second["frequency_bound_hz"]
        assert abs(first["frequency_hz"] - second["frequency_hz"]) <= bounds
        assert first["kind"] == second["kind"]


@some
@given(seeds, makers)
def test_other_names_change_nothing_but_the_names(seed: int, make: Any) -> None:
    system = make(Random(seed))
    other = deepcopy(system)
    for item in (*other["bodies"], *other["connections"]):
        item["name"] = f"part {item['name']}"
    for part in other["connections"]:
        if "between" in part:
            part["between"] = [end if end == "ground" else f"part {end}" for end in part["between"]]
        if "body" in part:
            part["body"] = f"part {part['body']}"
    one, two = modes(system, count=ALL), modes(other, count=ALL)
    assert two["degrees_of_freedom"] == [f"part {name}" for name in one["degrees_of_freedom"]]
    for field in ("frequency_hz", "frequency_bound_hz", "shape", "effective_mass"):
        assert [mode[field] for mode in one["modes"]] == [mode[field] for mode in two["modes"]]


@some
@given(seeds)
def test_shapes_are_orthonormal_in_the_mass(seed: int) -> None:
    draw = Random(seed)
    system = line(draw)
    masses = [body.get("mass", body.get("inertia", 0.0)) for body in system["bodies"]]
    shapes = np.array([mode["shape"] for mode in modes(system, count=ALL)["modes"]])
    products = shapes * masses @ shapes.T
    assert np.abs(products - np.eye(len(shapes))).max() < 1e-8


@some
@given(seeds, st.sampled_from(sorted(FAMILIES)))
def test_a_count_or_a_limit_gives_the_beginning_of_the_whole_list(seed: int, family: str) -> None:
    draw = Random(seed)
    system = FAMILIES[family](draw)
    whole = modes(system, count=ALL)["modes"]
    count = draw.randint(1, len(whole))
    few = modes(system, count=count)["modes"]
    assert len(few) == count
    for one, two in zip(few, whole, strict=False):
        bounds = one["frequency_bound_hz"] + two["frequency_bound_hz"]
        assert abs(one["frequency_hz"] - two["frequency_hz"]) <= bounds
    last = whole[count - 1]
    limit = last["frequency_hz"] * (1 + 1e-9) + 2 * last["frequency_bound_hz"] + 1e-3
    below = modes(system, below_hz=limit)["modes"]
    expected = sum(mode["frequency_hz"] <= limit or mode["kind"] == "diverging" for mode in whole)
    assert len(below) == expected
