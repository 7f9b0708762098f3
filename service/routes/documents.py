"""The OpenAPI 3.1 document, made from the table of tasks and the models of the contract."""

import re
from functools import cache
from typing import Any

import orjson
from pydantic import BaseModel, TypeAdapter
from pydantic.json_schema import models_json_schema

from schemas.problem import Problem
from schemas.reading import read, read_system
from schemas.sheet import write_question, write_sheet
from schemas.stored import StoredSystem, SystemSummary
from schemas.system import BodiesSystem, MatricesSystem, System
from service import __version__
from service.forms import METRICS
from service.routes import document_parts as part
from service.routes.document_parts import Document
from service.tasks import GET_FORMS, TASKS, Task, summarize

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
        [(model, "validation") for model in models], ref_template=part.REFERENCE
    )
    schemas: Document = document["$defs"]
    system = TypeAdapter[Any](System).json_schema(ref_template=part.REFERENCE)
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
                    part.identity(),
                    *part.queries(*form.parameters, *part.ALL_FORMS),
                    part.IF_NONE_MATCH,
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
    for path, summary in (
        ("/", "What this is"),
        ("/docs", "This document as a page"),
        ("/problems/{name}", "What a kind of problem means"),
    ):
        paths[path] = {"get": _page(summary, "{name}" in path)}
    for path, item in paths.items():
        for method, operation in item.items():
            words = re.sub(r"[^a-z0-9]+", "_", path.removeprefix("/v1").lower()).strip("_")
            operation["operationId"] = f"{method}_{words or 'start'}"
    return paths


def _task(task: Task) -> Document:
    content = {
        "application/json": {"schema": part.reference(task.question), "example": task.example},
        **part.sheets(_question_sheet(task)),
    }
    return {
        "summary": task.summary,
        "description": task.description,
        "parameters": [*part.queries(*part.ALL_FORMS), part.IF_NONE_MATCH],
        "requestBody": {"required": True, "content": content},
        "responses": _responses(task, (406, 413, 415, 422)),
    }


def _post_system() -> Document:
    example = next(iter(TASKS.values())).example["system"]
    created = part.json_of_model(SystemSummary, _stored_example())
    created["description"] = "The system is stored; Location says where."
    created["headers"] = part.headers("Location")
    faults: Document = {
        "description": "With `?problems=table`: the faults as a table.",
        "content": {"text/csv": {"schema": {"type": "string"}}},
    }
    return {
        "summary": "Store a system",
        "description": "Every task can then ask about it by its id.",
        "parameters": part.queries(part.PROBLEMS),
        "requestBody": {
            "required": True,
            "content": {
                "application/json": {
                    "schema": {"$ref": part.REFERENCE.format(model="System")},
                    "example": example,
                },
                **part.sheets(write_sheet(read_system(_own(example)))),
            },
        },
        "responses": {"200": faults, "201": created, **part.problems(413, 415, 422)},
    }


def _get_system() -> Document:
    answer = part.json_of_model(StoredSystem, None)
    answer["description"] = "The system in its canonical form."
    answer["headers"] = part.headers("ETag")
    answer["content"]["text/csv"] = {"schema": {"type": "string", "description": part.SHEET}}
    answer["content"]["text/plain"] = {"schema": {"type": "string"}}
    return {
        "summary": "A stored system",
        "description": "In SI, with every default filled in, and a summary; or as a sheet (`csv`), "
        "which gives the same id when it is posted.",
        "parameters": [
            part.identity(),
            *part.queries(part.FORMAT, part.PICK, part.PROBLEMS),
            part.IF_NONE_MATCH,
        ],
        "responses": {"200": answer, **part.NOT_CHANGED, **part.problems(406)},
    }


def _get_result() -> Document:
    responses: Document = {
        "200": {
            "description": "The answer.",
            "headers": part.headers("ETag"),
            "content": {
                "application/json": {
                    "schema": {"anyOf": [part.reference(task.answer) for task in TASKS.values()]}
                },
                **part.other_forms(),
            },
        },
        **part.NOT_CHANGED,
        **part.problems(406),
    }
    return {
        "summary": "A stored answer",
        "description": "In any of its forms, or one value of it with `pick`.",
        "parameters": [part.identity(), *part.queries(*part.ALL_FORMS), part.IF_NONE_MATCH],
        "responses": responses,
    }


def _plain(summary: str) -> Document:
    status = {"type": "string", "description": "`live` or `ready` (no unit)."}
    schema = {"type": "object", "properties": {"status": status}, "required": ["status"]}
    return {
        "summary": summary,
        "description": "For supervisors and load balancers.",
        "responses": {
            "200": {"description": "Yes.", "content": {"application/json": {"schema": schema}}},
            **part.problems(),
        },
    }


def _page(summary: str, with_name: bool) -> Document:
    page = {"description": "A page.", "content": {"text/html": {"schema": {"type": "string"}}}}
    name = {**part.identity(), "name": "name", "description": "The kind of problem (no unit)."}
    return {
        "summary": summary,
        "description": "For people; it needs nothing from elsewhere.",
        "parameters": [name] if with_name else [],
        "responses": {"200": page, **part.problems()},
    }


def _responses(task: Task, statuses: tuple[int, ...], *, metrics: bool = False) -> Document:
    found = part.json_of_model(task.answer, _answer_example(task))
    found["description"] = "The answer."
    found["headers"] = part.headers("Content-Location", "ETag", "Cache-Status")
    found["content"] |= part.other_forms()
    if metrics:
        found["content"][METRICS.media_type] = {"schema": {"type": "string"}}
    return {"200": found, **part.NOT_CHANGED, **part.problems(*statuses)}


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
