"""The same content has the same id, however it was written."""

import re
from copy import deepcopy
from typing import Any

import pytest

from schemas.identity import answer_id, canonical, options, system_id
from schemas.modes import ModesQuestion
from schemas.reading import parse_json, read, read_system
from tests.tasks.asking import bodies, matrices, spring

Raw = dict[str, Any]


def identity(system: Raw) -> str:
    return system_id(canonical(read_system(deepcopy(system))))


SHORT = bodies(
    {"name": "a", "mass": 2.0, "at": [0, 0, 1]},
    spring("s", "a", "ground", {"x": 4e6, "z": 12e6}),
)


def test_an_id_is_a_letter_and_forty_digits() -> None:
    assert re.fullmatch(r"s[0-9a-f]{40}", identity(SHORT))
    assert re.fullmatch(r"a[0-9a-f]{40}", answer_id("modes", identity(SHORT), b"{}", "1"))


def test_defaults_written_out_change_no_id() -> None:
    full = deepcopy(SHORT)
    full |= {"motions": ["x", "y", "z", "rx", "ry", "rz"], "gravity": 9.80665}
    full["bodies"][0] |= {"motions": ["rz", "x", "y", "z", "rx", "ry"], "held": []}
    full["connections"][0] |= {"at": [0.0, 0, 1.0], "destabilising": False}
    full["connections"][0]["stiffness"] |= {"y": 0, "rx": 0}
    assert identity(full) == identity(SHORT)


def test_the_order_of_keys_and_the_kind_of_number_change_no_id() -> None:
    text = b"""{"connections": [{"stiffness": {"z": 12000000, "x": 4E6}, "name": "s",
        "between": ["a", "ground"], "kind": "spring"}],
        "bodies": [{"at": [0, -0.0, 1], "mass": 2, "name": "a"}], "kind": "bodies"}"""
    assert identity(parse_json(text)) == identity(SHORT)


def test_units_that_convert_exactly_change_no_id() -> None:
    other = deepcopy(SHORT)
    other["bodies"][0] |= {"mass": "2000 g", "at": [0, 0, "1000 mm"]}
    other["connections"][0]["stiffness"] = {"x": "4 kN/mm", "z": "12 MN/m"}
    assert identity(other) == identity(SHORT)


@pytest.mark.parametrize(
    "change",
    [
        {"name": "other"},
        {"gravity": 9.81},
        {"note": "as built"},
        {"damping": {"kind": "modal", "ratio": 0.02}},
    ],
)
def test_other_content_has_another_id(change: Raw) -> None:
    assert identity({**SHORT, **change}) != identity(SHORT)


def test_the_order_of_bodies_is_content_because_shapes_follow_it() -> None:
    one, two = {"name": "a", "mass": 1.0}, {"name": "b", "mass": 2.0}
    assert identity(bodies(one, two)) != identity(bodies(two, one))


def test_the_id_of_an_answer_hangs_on_task_system_options_and_computation() -> None:
    ids = {
        answer_id(task, system, option, computation)
        for task in ("modes", "separation")
        for system in ("s1", "s2")
        for option in (b"{}", b"{1}")
        for computation in ("1", "2")
    }
    assert len(ids) == 16


def test_parts_of_a_digest_cannot_run_into_each_other() -> None:
    assert answer_id("ab", "c", b"", "1") != answer_id("a", "bc", b"", "1")


def test_options_hold_no_system() -> None:
    one = read(ModesQuestion, {"system": matrices([[1.0]], [[1.0]]), "count": 3})
    two = read(ModesQuestion, {"system_id": "s" + 40 * "0", "count": 3})
    three = read(ModesQuestion, {"system_id": "s" + 40 * "0", "count": 4})
    assert options(one) == options(two) != options(three)


def test_an_id_stays_the_same_from_one_version_to_the_next() -> None:
    # Of this project: a change here makes every stored system and link unknown.
    assert identity(SHORT) == "seda1da5d8ee116f323c7cf3804352a37faa97dfb"
