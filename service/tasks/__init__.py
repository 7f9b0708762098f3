"""The table of tasks: the only list of what the service can do."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

from pydantic import BaseModel

from schemas.modes import ModesAnswer, ModesQuestion
from schemas.separation import SeparationAnswer, SeparationQuestion
from service.tasks.get_forms import GET_FORMS, GetForm, QueryParameter
from service.tasks.machines import degrees_of_freedom
from service.tasks.modes import modes
from service.tasks.separation import separation
from service.tasks.summary import summarize
from service.tasks.tabulated import MODES_TABLES, SEPARATION_TABLES, Table

COMPUTATION = "1"
"""Part of every answer's id: raised whenever an upgrade may change a number."""


@dataclass(frozen=True)
class Task:
    """What the service can be asked: POST /v1/NAME.

    `run` takes the system and the question and gives the answer without `id`, `task` and
    `system_id`. It raises `schemas.faults.Invalid` with pointers into the question.
    """

    name: str
    summary: str
    description: str
    question: type[BaseModel]
    answer: type[BaseModel]
    run: Callable[..., dict[str, Any]]
    tables: Mapping[str, Table]
    example: Mapping[str, Any]


HUNG: dict[str, Any] = {
    "kind": "bodies",
    "name": "two hung cylinders",
    "motions": ["x"],
    "bodies": [{"name": "left", "mass": 2.0}, {"name": "right", "mass": 3.0}],
    "connections": [
        {"kind": "pendulum", "name": "left rod", "body": "left", "length": 0.5},
        {"kind": "pendulum", "name": "right rod", "body": "right", "length": 0.5},
        {"kind": "spring", "name": "tie", "between": ["left", "right"], "stiffness": 40.0},
    ],
}
FAN_ON_SPRINGS: dict[str, Any] = {
    "kind": "bodies",
    "name": "fan on springs",
    "motions": ["z"],
    "bodies": [{"name": "fan", "mass": "440 lb"}],
    "connections": [
        {"kind": "spring", "name": "mounts", "between": ["fan", "ground"], "stiffness": "3.2 kN/mm"}
    ],
}

TASKS: Mapping[str, Task] = {
    task.name: task
    for task in (
        Task(
            "modes",
            "Natural frequencies and mode shapes",
            "The lowest undamped natural frequencies with their shapes, effective masses, energy "
            "shares and bounds, and the evidence that none was missed.",
            ModesQuestion,
            ModesAnswer,
            modes,
            MODES_TABLES,
            {"system": HUNG, "count": 2},
        ),
        Task(
            "separation",
            "Separation of every mode from what excites the machine",
            "Every mode that an excitation can reach, against every excitation in every range of "
            "operation: its margin, what is required, the speed where they meet, and the speeds "
            "at which all is clear.",
            SeparationQuestion,
            SeparationAnswer,
            separation,
            SEPARATION_TABLES,
            {
                "system": FAN_ON_SPRINGS,
                "operation": [{"name": "run", "min_rpm": 900, "max_rpm": 1100}],
                "excitations": [{"name": "unbalance", "order": 1}],
                "rule": {"kind": "fraction", "mode_above": 0.2, "mode_below": 0.2},
            },
        ),
    )
}

__all__ = [
    "COMPUTATION",
    "GET_FORMS",
    "TASKS",
    "GetForm",
    "QueryParameter",
    "Table",
    "Task",
    "degrees_of_freedom",
    "summarize",
]
