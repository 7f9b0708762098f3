"""From bytes to models: every fault at once, each at its place."""

from typing import Any

import pytest

from schemas.faults import Faulty, Invalid, Malformed
from schemas.modes import ModesQuestion
from schemas.reading import parse_json, read, read_system
from schemas.separation import SeparationQuestion
from tests.tasks.asking import bodies, matrices, spring

Raw = dict[str, Any]


def malformed(data: bytes) -> dict[str, str]:
    with pytest.raises(Malformed) as caught:
        parse_json(data)
    return {fault.pointer: fault.detail for fault in caught.value.faults}


def faults(raw: object, model: Any = ModesQuestion) -> dict[str, str]:
    with pytest.raises(Invalid) as caught:
        read(model, raw)
    return {fault.pointer: fault.detail for fault in caught.value.faults}


def system_faults(raw: object) -> dict[str, str]:
    with pytest.raises(Invalid) as caught:
        read_system(raw)
    return {fault.pointer: fault.detail for fault in caught.value.faults}


def test_a_json_text_is_parsed() -> None:
    assert parse_json('{"a": [1, 2.5, "ü", null, true]}'.encode()) == {
        "a": [1, 2.5, "ü", None, True]
    }


def test_keys_that_stand_twice_are_all_named() -> None:
    text = b'{"a": 1, "a": 2, "b": [{"c/d": 1, "c/d": 1}], "e": {"f": 1}}'
    assert set(malformed(text)) == {"/a", "/b/0/c~1d"}


def test_numbers_that_json_does_not_have_are_named() -> None:
    found = malformed(b'{"a": NaN, "b": [1, -Infinity]}')
    assert found == {
        "/a": "NaN isn't a number that JSON knows",
        "/b/1": "-Infinity isn't a number that JSON knows",
    }


@pytest.mark.parametrize(
    "data",
    [
        b"",
        b"  \n",
        b"{",
        b'{"a": 1,}',
        b"{'a': 1}",
        b'{"a": 1} x',
        b'{"a": 01}',
        b"\xff\xfe{\x00}\x00",
        b'{"a": "\xc3\x28"}',
        b'{"a": "\\ud800"}',
        b"[" * 100_000,
        b'{"a":' * 50_000,
        b'{"a": ' + b"9" * 5000 + b"}",
    ],
)
def test_what_is_not_json_is_malformed(data: bytes) -> None:
    assert set(malformed(data)) == {""}


def test_all_faults_of_a_system_are_found_in_one_round() -> None:
    system: Raw = {
        "kind": "bodies",
        "motions": ["x", "z"],
        "bodies": [
            {"name": "a/b", "mass": -1, "colour": "red"},
            {"name": "c", "mass": True, "at": [1, 2]},
            {"name": "c", "mass": "12"},
            {"name": "d", "mass": "3 m", "held": ["ry"]},
            {"name": "e", "mass": float("nan")},
        ],
        "connections": [
            {"kind": "sprig", "name": "p"},
            {"kind": "spring", "name": "q", "between": ["zz", "ground"], "stiffness": {"x": 1}},
            {"kind": "spring", "name": "r", "between": ["c", "c"], "stiffness": {"z": "-5 lbf/in"}},
            {"kind": "spring", "name": "s", "between": ["c", "ground"], "stiffness": {"z": "5 lb"}},
            {"kind": "spring", "name": "t", "between": ["d", "ground"], "stiffness": 4.0},
            {"kind": "pendulum", "name": "u", "body": "d", "length": 0},
            {"kind": "damper", "name": "v", "between": ["d", "ground"]},
        ],
        "gravity": "1 kg",
    }
    assert set(faults({"system": system, "count": 0, "deep": 1})) == {
        "/deep",
        "/count",
        "/system/gravity",
        "/system/bodies/0/name",
        "/system/bodies/0/mass",
        "/system/bodies/0/colour",
        "/system/bodies/1/mass",
        "/system/bodies/1/at",
        "/system/bodies/2/name",
        "/system/bodies/2/mass",
        "/system/bodies/3/mass",
        "/system/bodies/3/held/0",
        "/system/bodies/4/mass",
        "/system/connections/0/kind",
        "/system/connections/1/between/0",
        "/system/connections/2/between",
        "/system/connections/2/stiffness/z",
        "/system/connections/3/stiffness/z",
        "/system/connections/4/stiffness",
        "/system/connections/5/length",
        "/system/connections/6/damping",
    }


def test_every_fault_has_a_sentence() -> None:
    found = faults({"system": {"kind": "bodies", "bodies": [{}], "connections": [{}, 3]}})
    assert found["/system/bodies/0/name"] == "this field is needed"
    assert found["/system/connections/0/kind"] == "this field is needed"
    assert all(detail[0].islower() or detail[0] in "'`" for detail in found.values())


@pytest.mark.parametrize("raw", [None, [], "text", 3, True, {}, {"system": None}, {"system": 3}])
def test_what_is_no_question_is_refused(raw: object) -> None:
    assert faults(raw)


def test_a_system_and_the_id_of_one_exclude_each_other() -> None:
    system = bodies({"name": "a", "mass": 1})
    assert set(faults({"system": system, "system_id": "s" + 40 * "0"})) == {"/system"}
    assert set(faults({"system_id": "../etc"})) == {"/system_id"}


def test_options_that_exclude_each_other_are_named() -> None:
    system = bodies({"name": "a", "mass": 1})
    assert set(faults({"system": system, "count": 2, "below_hz": 3.0})) == {"/below_hz"}
    assert set(faults({"system": system, "count": True})) == {"/count"}
    assert set(faults({"system": system, "count": 2.5})) == {"/count"}
    assert set(faults({"system": system, "below_hz": "3"})) == {"/below_hz"}
    assert set(faults({"system": system, "below_hz": -3})) == {"/below_hz"}


def test_names_are_unique_over_bodies_and_connections_together() -> None:
    twice = bodies({"name": "a", "mass": 1}, spring("a", "a", "ground", 1.0), motions=["x"])
    assert set(system_faults(twice)) == {"/connections/0/name"}


def test_one_name_written_with_and_without_combining_accents_is_one_name() -> None:
    composed, apart = "café", "cafe\u0301"
    twice = bodies({"name": composed, "mass": 1}, {"name": apart, "mass": 1}, motions=["x"])
    assert set(system_faults(twice)) == {"/bodies/1/name"}
    tied = bodies({"name": composed, "mass": 1}, spring("s", apart, "ground", 1.0), motions=["x"])
    same = bodies({"name": apart, "mass": 1}, spring("s", composed, "ground", 1.0), motions=["x"])
    assert read_system(tied) == read_system(same)


def test_a_spring_needs_a_stiffness() -> None:
    for stiffness in (0, 0.0, "0 N/m", "-0.0 kN/mm", {"x": 0}, {}):
        system = bodies(
            {"name": "a", "mass": 1}, spring("s", "a", "ground", stiffness), motions=["x"]
        )
        assert set(system_faults(system)) == {"/connections/0/stiffness"}


def test_a_negative_stiffness_needs_its_word() -> None:
    for stiffness, place in ((-3.0, ""), ("-3 N/m", ""), ({"x": -3.0}, "/x")):
        part = spring("s", "a", "ground", stiffness)
        wrong = bodies({"name": "a", "mass": 1}, part, motions=["x"])
        assert set(system_faults(wrong)) == {f"/connections/0/stiffness{place}"}
        meant = bodies({"name": "a", "mass": 1}, {**part, "destabilising": True}, motions=["x"])
        assert read_system(meant).kind == "bodies"


def test_a_single_number_must_say_where_it_acts() -> None:
    for motions in (["x", "z"], ["x", "ry"]):
        system = bodies({"name": "a", "mass": 1}, spring("s", "a", "ground", 1.0), motions=motions)
        assert set(system_faults(system)) == {"/connections/0/stiffness"}


def test_a_single_number_about_an_axis_is_torsional() -> None:
    for stiffness, motion in (("3 N/m", "rx"), ("3 N·m/rad", "x")):
        system = bodies(
            {"name": "a", "mass": 1}, spring("s", "a", "ground", stiffness), motions=[motion]
        )
        assert set(system_faults(system)) == {"/connections/0/stiffness"}


@pytest.mark.parametrize(
    "axes",
    [
        [[1, 0, 0], [0, 1, 0], [0, 0, -1]],
        [[1, 0, 0], [0, 1, 0], [0, 0, 0]],
        [[2, 0, 0], [0, 1, 0], [0, 0, 1]],
        [[1, 0.1, 0], [0, 1, 0], [0, 0, 1]],
        [[1, 1, 1], [1, 1, 1], [1, 1, 1]],
    ],
)
def test_axes_must_be_a_rotation(axes: object) -> None:
    part = spring("s", "a", "ground", {"x": 1}, axes=axes)
    assert set(system_faults(bodies({"name": "a", "mass": 1}, part))) == {"/connections/0/axes"}


@pytest.mark.parametrize("field", ["axes", "along"])
def test_directions_are_bare_numbers(field: str) -> None:
    row = ["0 m", "0 m", "0 m"]
    value, stiffness = ([row] * 3, {"x": 1}) if field == "axes" else (row, 1.0)
    part = spring("s", "a", "ground", stiffness, **{field: value})
    found = system_faults(bodies({"name": "a", "mass": 1}, part))
    assert all(pointer.startswith(f"/connections/0/{field}/") for pointer in found)


def test_a_direction_is_not_zero_and_not_given_twice() -> None:
    zero = spring("s", "a", "ground", 1.0, along=[0, 0, 0])
    both = spring("s", "a", "ground", 1.0, along=[0, 0, 1], axes=[[1, 0, 0], [0, 1, 0], [0, 0, 1]])
    per_axis = spring("s", "a", "ground", {"x": 1}, along=[0, 0, 1])
    for part in (zero, both, per_axis):
        assert set(system_faults(bodies({"name": "a", "mass": 1}, part))) == {
            "/connections/0/along"
        }


def test_a_coordinate_that_roundoff_made_tiny_is_read() -> None:
    # sin(π) twice multiplied: what a rotation matrix of two half turns holds.
    tiny = 1.2246467991473532e-16**2
    axes = [[-1.0, 0.0, tiny], [0.0, -1.0, 0.0], [tiny, 0.0, 1.0]]
    part = spring("s", "a", "ground", {"x": 1}, axes=axes, at=[tiny, 0, 0])
    assert read_system(bodies({"name": "a", "mass": 1}, part)).kind == "bodies"


@pytest.mark.parametrize(
    "inertia",
    [
        {"xx": 1, "yy": 1, "zz": 1, "xy": 1.1},
        {"xx": 1, "yy": 1, "zz": 1, "xy": 0.9, "yz": 0.9, "xz": -0.9},
        {"xy": 1e-9},
        {"xx": 1e-6, "yy": 1e6, "zz": 1e6, "xy": 1.2},
        {"xx": -1},
    ],
)
def test_an_inertia_that_is_not_positive_is_refused_at_its_place(inertia: object) -> None:
    found = system_faults(bodies({"name": "a", "mass": 1, "inertia": inertia}))
    assert all(pointer.startswith("/bodies/0/inertia") for pointer in found)


def test_one_number_says_nothing_about_three_rotations() -> None:
    assert set(system_faults(bodies({"name": "a", "mass": 1, "inertia": 3.0}))) == {
        "/bodies/0/inertia"
    }


def test_matrices_must_fit_their_degrees_of_freedom() -> None:
    raw = matrices([[1.0, 0.0], [0.0, 1.0]], [[1.0, 0.0, 0.0], [0.0]])
    assert {"/stiffness/0", "/stiffness/1"} <= set(system_faults(raw))
    raw = matrices([[1.0, 0.0]], [[1.0, 0.0], [0.0, 1.0]])
    raw["degrees_of_freedom"] = ["a/x", "a/x"]
    assert set(system_faults(raw)) == {"/mass", "/degrees_of_freedom/1"}


@pytest.mark.parametrize("entry", [True, "1", "1 kg", None, float("nan"), float("inf"), 1e31])
def test_an_entry_of_a_matrix_is_a_number(entry: object) -> None:
    raw: Raw = matrices([[1.0]], [[1.0]])
    raw["mass"] = [[entry]]
    assert set(system_faults(raw)) == {"/mass/0/0"}


def separation(**fields: object) -> Raw:
    return {
        "system": bodies({"name": "a", "mass": 1}, spring("s", "a", "ground", 1.0), motions=["x"]),
        "operation": [{"name": "run", "min_rpm": 900, "max_rpm": 1000}],
        "excitations": [{"name": "1x", "order": 1}],
        **fields,
    }


def test_faults_of_a_separation_question_are_at_their_places() -> None:
    wrong = separation(
        operation=[
            {"name": "run", "min_rpm": 900, "max_rpm": 100},
            {"name": "slow", "min_rpm": "3 m", "max_rpm": 0},
        ],
        excitations=[
            {"name": "1x"},
            {"name": "2x", "order": 2, "frequency_hz": 3},
            {"name": "3x", "frequency_hz": 3, "shaft_ratio": 2},
            {"name": "4x", "order": -4},
        ],
        rule={"kind": "fraction", "mode_below": 1.0},
        forces_at={"1x": ["a"], "2x": []},
    )
    assert set(faults(wrong, SeparationQuestion)) == {
        "/operation/0/min_rpm",
        "/operation/1/min_rpm",
        "/operation/1/max_rpm",
        "/excitations/0/order",
        "/excitations/1/order",
        "/excitations/2/shaft_ratio",
        "/excitations/3/order",
        "/rule/mode_below",
        "/forces_at/1x/0",
        "/forces_at/2x",
    }


def test_names_in_a_separation_question_are_unique_and_known() -> None:
    twice = [{"name": "1x", "order": 1}, {"name": "1x", "order": 2}]
    assert set(faults(separation(excitations=twice), SeparationQuestion)) == {"/excitations/1/name"}
    unknown = faults(separation(forces_at={"9x": ["a/x"]}), SeparationQuestion)
    assert set(unknown) == {"/forces_at/9x"}


@pytest.mark.parametrize("field", ["operation", "excitations"])
def test_a_separation_question_needs_something_to_keep_clear_of(field: str) -> None:
    assert set(faults(separation(**{field: []}), SeparationQuestion)) == {f"/{field}"}


def test_faults_can_be_seen_from_further_out() -> None:
    found = Invalid(Invalid([]).faults)
    assert found.faults == []
    with pytest.raises(Faulty) as caught:
        read_system({"kind": "bodies", "bodies": [{"name": "a", "mass": -1}]})
    moved = caught.value.under("/items/3")
    assert type(moved) is Invalid
    assert [fault.pointer for fault in moved.faults] == ["/items/3/bodies/0/mass"]
