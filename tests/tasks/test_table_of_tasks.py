"""The table of tasks: what it promises of every task holds for each of them."""

from typing import Any

import pytest

from schemas.faults import Invalid
from schemas.reading import read, read_system
from service.tasks import GET_FORMS, TASKS, degrees_of_freedom, summarize
from tests.tasks.asking import ask, bodies, matrices, spring

Raw = dict[str, Any]


@pytest.mark.parametrize("name", TASKS)
def test_the_example_of_a_task_is_answered_in_its_form(name: str) -> None:
    task = TASKS[name]
    answer = ask(name, dict(task.example))
    task.answer.model_validate({"id": "a0", "task": name, "system_id": "s0", **answer})
    assert {"warnings", "evidence", "caution"} <= answer.keys()


@pytest.mark.parametrize("name", TASKS)
def test_every_table_of_an_answer_has_a_cell_for_every_column(name: str) -> None:
    answer = ask(name, dict(TASKS[name].example))
    tables = [
        (table, [list(row) for row in table.rows(answer)]) for table in TASKS[name].tables.values()
    ]
    assert tables[0][1]
    for table, rows in tables:
        assert all(len(row) == len(table.columns) for row in rows)


@pytest.mark.parametrize("name", TASKS)
def test_every_field_of_an_answer_is_described(name: str) -> None:
    definitions = TASKS[name].answer.model_json_schema()
    parts = [definitions, *definitions.get("$defs", {}).values()]
    bare = [
        f"{part['title']}.{field}"
        for part in parts
        for field, schema in part.get("properties", {}).items()
        if not schema.get("description")
    ]
    assert bare == []


QUERIES: list[tuple[str, dict[str, str]]] = [
    ("modes", {}),
    ("modes", {"count": "1", "shape_scale": "largest"}),
    ("modes", {"below_hz": "60"}),
    ("separation", {"rpm": "1487", "orders": "1"}),
    ("separation", {"min_rpm": "1440", "max_rpm": "1500", "orders": "1,2,7", "lines_hz": "100"}),
    ("separation", {"rpm": "1487", "lines_hz": "50,100", "fraction": "0.1"}),
]


@pytest.mark.parametrize(("form", "query"), QUERIES)
def test_a_question_in_an_address_is_answered(form: str, query: dict[str, str]) -> None:
    get = GET_FORMS[form]
    assert set(query) <= {parameter.name for parameter in get.parameters}
    system = matrices([[1.0, 0.0], [0.0, 2.0]], [[3e4, -1e4], [-1e4, 3e4]])
    assert ask(get.task, {**get.question(query), "system": system})["evidence"]["complete"]


@pytest.mark.parametrize(
    ("form", "query", "names"),
    [
        ("modes", {"count": "nan"}, {"/count"}),
        ("modes", {"count": "inf"}, {"/count"}),
        ("modes", {"count": "1e400"}, {"/count"}),
        ("modes", {"count": "many", "below_hz": "x"}, {"/count", "/below_hz"}),
        ("modes", {"count": ""}, {"/count"}),
        ("modes", {"count": "1,2"}, {"/count"}),
        ("separation", {}, {"/min_rpm", "/max_rpm"}),
        ("separation", {"rpm": "100"}, {"/orders"}),
        ("separation", {"rpm": "100", "min_rpm": "1", "max_rpm": "2", "orders": "1"}, {"/rpm"}),
        ("separation", {"rpm": "100", "orders": "1,two"}, {"/orders"}),
        ("separation", {"rpm": "nan", "orders": "1,inf"}, {"/rpm", "/orders"}),
    ],
)
def test_a_wrong_parameter_is_named(form: str, query: dict[str, str], names: set[str]) -> None:
    with pytest.raises(Invalid) as caught:
        GET_FORMS[form].question(query)
    assert {fault.pointer for fault in caught.value.faults} == names


def test_a_number_of_modes_that_is_not_whole_is_refused_where_it_is_read() -> None:
    question = GET_FORMS["modes"].question({"count": "2.5"})
    with pytest.raises(Invalid) as caught:
        read(TASKS["modes"].question, {**question, "system": matrices([[1.0]], [[1.0]])})
    assert [fault.pointer for fault in caught.value.faults] == ["/count"]


MACHINE = bodies(
    {"name": "a", "mass": 3.0, "inertia": {"xx": 1, "yy": 1, "zz": 1}, "at": [1, 0, 0]},
    {"name": "b", "mass": "1 kg", "motions": ["x", "z"], "held": ["z"], "at": [0, 0, "400 mm"]},
    spring("s", "a", "b", {"x": 1e3}),
)


def test_a_system_is_summed_up() -> None:
    summary = summarize(read_system(MACHINE))
    assert summary["degrees_of_freedom"] == 7
    assert summary["total_mass_kg"] == 4.0
    assert summary["centre_of_mass_m"] == pytest.approx([0.75, 0.0, 0.1])
    assert summary["rigid_body_motions"] == 6
    assert summary["warnings"]


def test_degrees_of_freedom_are_counted_before_anything_is_computed() -> None:
    assert degrees_of_freedom(read_system(MACHINE)) == 7
    assert (
        degrees_of_freedom(read_system(matrices([[1.0, 0.0], [0.0, 1.0]], [[1.0, 0], [0, 1.0]])))
        == 2
    )


def test_a_system_that_cannot_be_computed_is_refused_at_its_own_place() -> None:
    with pytest.raises(Invalid) as caught:
        summarize(read_system(bodies({"name": "a", "mass": 1.0}, {"name": "b"}, motions=["x"])))
    assert [fault.pointer for fault in caught.value.faults] == ["/bodies/1"]
