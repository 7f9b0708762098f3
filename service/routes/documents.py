"""The OpenAPI 3.1 document, made from the table of tasks and the models of the contract."""

from functools import cache
from typing import Any

import orjson
from pydantic import BaseModel, TypeAdapter
from pydantic.json_schema import models_json_schema

from schemas.problem import Problem
from schemas.reading import read, read_system
from schemas.sheet import MEDIA_TYPES, write_question, write_sheet
from schemas.stored import StoredSystem, SystemSummary
from schemas.system import BodiesSystem, MatricesSystem, System
from service import __version__, failures
from service.forms import FORMS, METRICS
from service.tasks import GET_FORMS, TASKS, QueryParameter, Task, summarize

Document = dict[str, Any]
REFERENCE = "#/components/schemas/{model}"
ALWAYS = (400, 404, 405, 500)
FORMAT = QueryParameter("format", "Form of the answer, instead of Accept (no unit).", "json")
PICK = QueryParameter("pick", "An RFC 6901 pointer: its value alone, as text (no unit).", "/id")
TABLE = QueryParameter("table", "Which table, for csv, html and text (no unit).", "")
PROBLEMS = QueryParameter(
    "problems", "`table`: a fault comes back as 200 text/csv, for macros (no unit).", "table"
)
ALL_FORMS = (FORMAT, PICK, TABLE, PROBLEMS)
SHEET = (
    "A spreadsheet's used range. A row whose first cell is [system], [bodies], [connections], "
    "[operation], [excitations], [options] or the like opens a block; the next row is its header, "
    "then comes one row per item. Columns are the fields of the JSON, `.` leads inwards, a unit "
    "may stand in the header (`mass [lb]`) or in the cell, several names in a cell are separated "
    "by |. Cells are separated by commas, semicolons or tabs; a decimal comma is read with the "
    "latter two."
)
DESCRIPTION = (
    "Natural frequencies, mode shapes and separation margins of machines on their supports. "
    "Numbers are SI; a string may carry its unit. Answers are screening results on a model: check "
    "them against measurement; local codes and the licensed engineer decide."
)


@cache
def openapi() -> Document:
    """The whole document."""
    return {
        "openapi": "3.1.0",
        "info": {"title": "Wideberth", "version": __version__, "description": DESCRIPTION},
        "paths": _paths(),
        "components": {"schemas": _schemas()},
    }


def _schemas() -> Document:
    models: list[type[BaseModel]] = [
        BodiesSystem, MatricesSystem, Problem, StoredSystem, SystemSummary,
        *(task.question for task in TASKS.values()), *(task.answer for task in TASKS.values()),
    ]  # fmt: skip
    _, document = models_json_schema(
        [(model, "validation") for model in models], ref_template=REFERENCE
    )
    schemas: Document = document["$defs"]
    system = TypeAdapter[Any](System).json_schema(ref_template=REFERENCE)
    system.pop("$defs")
    return {**schemas, "System": {"description": "A machine.", **system}}


def _paths() -> Document:
    paths: Document = {f"/v1/{task.name}": {"post": _task(task)} for task in TASKS.values()}
    paths["/v1/systems"] = {"post": _post_system()}
    paths["/v1/systems/{identity}"] = {"get": _get_system()}
    for name, form in GET_FORMS.items():
        task = TASKS[form.task]
        paths[f"/v1/systems/{{identity}}/{name}"] = {
            "get": {
                "summary": f"{task.summary}, asked by address",
                "description": "For callers that cannot post.",
                "parameters": [
                    _identity(),
                    *_queries(*form.parameters, *ALL_FORMS),
                ],
                "responses": _responses(task, (406, 422), metrics=name == "separation"),
            }
        }
    paths["/v1/results/{identity}"] = {"get": _get_result()}
    for path, summary in (
        ("/health/live", "The process answers"),
        ("/health/ready", "The store answers too"),
    ):
        paths[path] = {"get": _plain(summary)}
    return paths


def _task(task: Task) -> Document:
    content = {
        "application/json": {"schema": _reference(task.question), "example": task.example},
        **_sheets(_question_sheet(task)),
    }
    return {
        "summary": task.summary,
        "description": task.description,
        "parameters": _queries(*ALL_FORMS),
        "requestBody": {"required": True, "content": content},
        "responses": _responses(task, (406, 413, 415, 422)),
    }


def _post_system() -> Document:
    example = next(iter(TASKS.values())).example["system"]
    created = _json(SystemSummary, _stored_example())
    created["description"] = "The system is stored; Location says where."
    faults: Document = {
        "description": "With `?problems=table`: the faults as a table.",
        "content": {"text/csv": {"schema": {"type": "string"}}},
    }
    return {
        "summary": "Store a system",
        "description": "Every task can then ask about it by its id.",
        "parameters": _queries(PROBLEMS),
        "requestBody": {
            "required": True,
            "content": {
                "application/json": {
                    "schema": {"$ref": REFERENCE.format(model="System")},
                    "example": example,
                },
                **_sheets(write_sheet(read_system(_own(example)))),
            },
        },
        "responses": {"200": faults, "201": created, **_problems(413, 415, 422)},
    }


def _get_system() -> Document:
    answer = _json(StoredSystem, None)
    answer["description"] = "The system in its canonical form."
    answer["content"]["text/csv"] = {"schema": {"type": "string", "description": SHEET}}
    return {
        "summary": "A stored system",
        "description": "In SI, with every default filled in, and a summary; or as a sheet (`csv`), "
        "which gives the same id when it is posted.",
        "parameters": [_identity(), *_queries(FORMAT, PROBLEMS)],
        "responses": {"200": answer, "304": {"description": "Not changed."}, **_problems(406)},
    }


def _get_result() -> Document:
    responses: Document = {
        "200": {
            "description": "The answer.",
            "content": {
                "application/json": {
                    "schema": {"anyOf": [_reference(task.answer) for task in TASKS.values()]}
                },
                **_other_forms(),
            },
        },
        **_problems(406),
    }
    return {
        "summary": "A stored answer",
        "description": "In any of its forms, or one value of it with `pick`.",
        "parameters": [_identity(), *_queries(*ALL_FORMS)],
        "responses": responses,
    }


def _plain(summary: str) -> Document:
    schema = {"type": "object", "description": "`status` in a word."}
    return {
        "summary": summary,
        "description": "For supervisors and load balancers.",
        "responses": {
            "200": {"description": "Yes.", "content": {"application/json": {"schema": schema}}},
            **_problems(),
        },
    }


def _responses(task: Task, statuses: tuple[int, ...], *, metrics: bool = False) -> Document:
    found = _json(task.answer, _answer_example(task))
    found["description"] = "The answer."
    found["headers"] = {
        name: {"description": text, "schema": {"type": "string"}}
        for name, text in (
            ("Content-Location", "Where the answer is stored."),
            ("ETag", "Identity of this form of the answer."),
            ("Cache-Status", "Whether it came from the store (RFC 9211)."),
        )
    }
    found["content"] |= _other_forms()
    if metrics:
        found["content"][METRICS.media_type] = {"schema": {"type": "string"}}
    return {"200": found, "304": {"description": "Not changed."}, **_problems(*statuses)}


def _sheets(example: str) -> Document:
    """The media types of a sheet, with one as an example."""
    commas, tabs = MEDIA_TYPES
    return {
        commas: {"schema": {"type": "string", "description": SHEET}, "example": example},
        tabs: {"schema": {"type": "string", "description": f"{SHEET} Separated by tabs."}},
    }


def _other_forms() -> Document:
    return {form.media_type: {"schema": {"type": "string"}} for form in FORMS.values()}


def _json(model: type[BaseModel], example: Any) -> Document:
    """The object, or with `?problems=table` the table of its faults."""
    content: Document = {"schema": _reference(model)}
    if example is not None:
        content["example"] = example
    return {"content": {"application/json": content, "text/csv": {"schema": {"type": "string"}}}}


def _reference(model: type[BaseModel]) -> Document:
    return {"$ref": REFERENCE.format(model=model.__name__)}


def _problems(*statuses: int) -> Document:
    return {
        str(status): {
            "description": failures.from_status(status, "").title() + ".",
            "content": {"application/problem+json": {"schema": _reference(Problem)}},
        }
        for status in sorted({*ALWAYS, *statuses})
    }


def _identity() -> Document:
    return {
        "name": "identity",
        "in": "path",
        "required": True,
        "description": "The id that the service gave (no unit).",
        "schema": {"type": "string"},
    }


def _queries(*parameters: QueryParameter) -> list[Document]:
    return [
        {
            "name": parameter.name,
            "in": "query",
            "required": False,
            "description": parameter.description,
            "schema": {"type": "string"},
            **({"example": parameter.example} if parameter.example else {}),
        }
        for parameter in parameters
    ]


def _answer_example(task: Task) -> Any:
    """The real answer to the task's example, without the digests that name it."""
    question = read(task.question, _own(task.example))
    answer = task.run(question.system, question)  # type: ignore[attr-defined]
    head = {"id": "a" + "0" * 40, "task": task.name, "system_id": "s" + "0" * 40}
    return orjson.loads(orjson.dumps(head | answer, option=orjson.OPT_SERIALIZE_NUMPY))


def _question_sheet(task: Task) -> str:
    """The task's example as a sheet."""
    question: Any = read(task.question, _own(task.example))
    return write_question(question)


def _own(example: Any) -> Any:
    """A copy that its reader may change."""
    return orjson.loads(orjson.dumps(example))


def _stored_example() -> Any:
    system = read_system(_own(next(iter(TASKS.values())).example["system"]))
    return {"id": "s" + "0" * 40, **summarize(system)}
