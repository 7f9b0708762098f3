"""How the tests put a question to a task: through the same reading and table as a request."""

import json
from copy import deepcopy
from typing import Any

import orjson

from schemas.reading import read
from service.tasks import TASKS

Raw = dict[str, Any]


def ask(task: str, body: Raw) -> Raw:
    """The answer to `body` as a caller would parse it."""
    question: Any = read(TASKS[task].question, deepcopy(body))
    answer = TASKS[task].run(question.system, question)
    parsed: Raw = json.loads(orjson.dumps(answer, option=orjson.OPT_SERIALIZE_NUMPY))
    return parsed


def modes(system: Raw, **options: object) -> Raw:
    """The answer of `modes` on a system."""
    return ask("modes", {"system": system, **options})


def hertz(system: Raw, **options: object) -> list[float]:
    """The natural frequencies of a system in Hz, lowest first."""
    return [mode["frequency_hz"] for mode in modes(system, **options)["modes"]]


def bodies(*parts: Raw, motions: list[str] | None = None, **fields: object) -> Raw:
    """A system of bodies and connections: what has a `kind` is a connection."""
    system: Raw = {
        "kind": "bodies",
        "bodies": [part for part in parts if "kind" not in part],
        "connections": [part for part in parts if "kind" in part],
        **fields,
    }
    return system if motions is None else {**system, "motions": motions}


def spring(name: str, first: str, second: str, stiffness: object, **fields: object) -> Raw:
    """A spring between two ends."""
    return {
        "kind": "spring",
        "name": name,
        "between": [first, second],
        "stiffness": stiffness,
        **fields,
    }


def matrices(mass: list[list[float]], stiffness: list[list[float]], **fields: object) -> Raw:
    """A system of explicit matrices, its motions along x of bodies 1, 2, …"""
    names = [f"{number + 1}/x" for number in range(len(mass))]
    return {
        "kind": "matrices",
        "degrees_of_freedom": names,
        "mass": mass,
        "stiffness": stiffness,
        **fields,
    }
