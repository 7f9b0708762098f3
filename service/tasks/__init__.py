"""The table of tasks: the only list of what the service can do."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

from pydantic import BaseModel

from schemas.modes import ModesAnswer, ModesQuestion
from schemas.response import (
    HarmonicAnswer,
    HarmonicQuestion,
    TransientAnswer,
    TransientQuestion,
)
from schemas.separation import SeparationAnswer, SeparationQuestion
from schemas.speedmap import SpeedmapAnswer, SpeedmapQuestion
from service.tasks.damped import modes
from service.tasks.get_forms import GET_FORMS, GetForm, QueryParameter
from service.tasks.harmonic import harmonic
from service.tasks.machines import degrees_of_freedom
from service.tasks.separation import separation
from service.tasks.speedmap import speedmap
from service.tasks.summary import summarize
from service.tasks.tabulated import (
    HARMONIC_TABLES,
    MODES_TABLES,
    SEPARATION_TABLES,
    SPEEDMAP_TABLES,
    TRANSIENT_TABLES,
    Table,
)
from service.tasks.transient import transient

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

ROTOR: dict[str, Any] = {
    "kind": "bodies",
    "name": "overhung wheel",
    "motions": ["y", "z", "ry", "rz"],
    "bodies": [
        {
            "name": "wheel",
            "mass": 60.0,
            "inertia": {"xx": 3.4, "yy": 1.8, "zz": 1.8},
            "spin": {"axis": "x"},
        }
    ],
    "connections": [
        {
            "kind": "bearing",
            "name": "near bearing",
            "between": ["wheel", "ground"],
            "at": [-0.12, 0.0, 0.0],
            "stiffness": [["9 kN/mm", 0], [0, "14 kN/mm"]],
            "damping": [["2.4 kN*s/m", 0], [0, "3 kN*s/m"]],
        },
        {
            "kind": "bearing",
            "name": "far bearing",
            "between": ["wheel", "ground"],
            "at": [-0.62, 0.0, 0.0],
            "stiffness": [["9 kN/mm", 0], [0, "14 kN/mm"]],
            "damping": [["2.4 kN*s/m", 0], [0, "3 kN*s/m"]],
        },
    ],
}
DAMPED_FAN: dict[str, Any] = {
    **FAN_ON_SPRINGS,
    "name": "fan on damped springs",
    "connections": [
        {
            "kind": "spring",
            "name": "mounts",
            "between": ["fan", "ground"],
            "stiffness": "3.2 kN/mm",
            "damping": "1.6 kN*s/m",
        }
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
        Task(
            "speedmap",
            "Modes over the speed of a turning machine",
            "Modes followed over speed by their shapes, with whirl and damping; every crossing "
            "with an excitation, and the speed at which the machine becomes unstable, if any.",
            SpeedmapQuestion,
            SpeedmapAnswer,
            speedmap,
            SPEEDMAP_TABLES,
            {
                "system": ROTOR,
                "from_rpm": 0,
                "to_rpm": 6000,
                "points": 13,
                "count": 4,
                "excitations": [{"name": "unbalance", "order": 1}],
            },
        ),
        Task(
            "response/harmonic",
            "Steady response to harmonic excitation",
            "How far the machine vibrates, and what force its connections carry, under forces, "
            "moments, unbalance and motion of its base, over frequencies or speeds: amplitudes and "
            "phases, peaks with amplification factors, residual and reciprocity.",
            HarmonicQuestion,
            HarmonicAnswer,
            harmonic,
            HARMONIC_TABLES,
            {
                "system": DAMPED_FAN,
                "speeds": {"from_rpm": 600, "to_rpm": 2400, "points": 60},
                "excite": [
                    {
                        "at": "fan/z",
                        "unbalance": {
                            "balance_grade_mm_s": 6.3,
                            "rotor_mass": "60 kg",
                            "service_rpm": 1500,
                        },
                    }
                ],
                "observe": ["fan/z"],
                "quantity": "velocity",
                "forces_in": ["mounts"],
            },
        ),
        Task(
            "response/transient",
            "Response over time",
            "What the machine does when it is released, pushed, shaken or run up: values over "
            "time, exact for the stated input, with the modes of a free motion and the largest "
            "values.",
            TransientQuestion,
            TransientAnswer,
            transient,
            TRANSIENT_TABLES,
            {
                "system": HUNG,
                "initial": {"displacement": {"right/x": 0.01}},
                "duration_s": 10,
                "time_step_s": 0.1,
                "observe": ["left/x", "right/x"],
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
