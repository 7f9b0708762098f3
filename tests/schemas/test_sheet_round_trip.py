"""A system that is written as a sheet and read back has lost nothing."""

import csv
import json
from copy import deepcopy
from io import StringIO
from pathlib import Path
from random import Random
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from schemas.identity import canonical, options, system_id
from schemas.reading import read, read_system
from schemas.sheet import read_sheet, write_question, write_sheet
from schemas.system import AnySystem
from service.tasks import TASKS, Task
from tests.properties.random_machines import line, plane, space

Raw = dict[str, Any]
EXAMPLES = Path(__file__).parents[2] / "deploy" / "examples"


def survives(raw: Raw) -> str:
    """The sheet of a system, once it has been read back as the same."""
    system = read_system(deepcopy(raw))
    text = write_sheet(system)
    found = read_sheet(text.encode(), "text/csv").validated(read_system)
    assert identity(found) == identity(system)
    return text


def identity(system: AnySystem) -> str:
    return system_id(canonical(system))


ENDS = {"between": ["a", "b"]}
EVERY_PART: Raw = {
    "kind": "bodies",
    "name": "every part ",
    "motions": [],
    "gravity": 0,
    "damping": {"kind": "rayleigh"},
    "bodies": [
        {"name": "a", "mass": 1e-7, "inertia": {}, "motions": ["x", "y", "z", "rx", "ry", "rz"]},
        {"name": "b ", "at": [1, 0, 1 / 3], "motions": ["x", "y", "z", "rx", "ry", "rz"]},
        {"name": "b", "at": [1, 0, 0], "motions": ["rx"], "inertia": 0.5, "spin": {"axis": "x"}},
        {"name": "2e5", "motions": [], "held": []},
    ],
    "connections": [
        {"kind": "spring", "name": "s1", "between": ["b ", "a"], "stiffness": {"z": 1e5, "rx": 7}},
        {"kind": "spring", "name": "s2", **ENDS, "stiffness": -5, "along": [0, -1, 0.25],
         "destabilising": True, "damping": 3, "loss_factor": 0.1, "at": [0, 0, 0]},
        {"kind": "damper", "name": "d", "between": ["ground", "a"], "damping": {"x": 2.5},
         "axes": [[0, -1, 0], [1, 0, 0], [0, 0, 1]]},
        {"kind": "pendulum", "name": "p", "body": "a", "length": 0.1 + 0.2},
        {"kind": "link", "name": "l", **ENDS, "motions": ["rx"]},
        {"kind": "link", "name": "m", **ENDS, "motions": []},
        {"kind": "shaft", "name": "h1", **ENDS, "massless": True, "axis": "rx",
         "sections": [{"length": 1, "outer_diameter": 0.1, "material": "steel"},
                      {"length": 2, "outer_diameter": 0.2, "inner_diameter": 0.1,
                       "shear_modulus": 8e10, "density": 7800}]},
        {"kind": "shaft", "name": "h2", **ENDS, "stiffness": 5e4, "damping": 2, "axis": "rx"},
        {"kind": "gear", "name": "g", **ENDS, "ratio": -2.0, "axis": "rx", "mesh_stiffness": 1e8,
         "pitch_radius": [0.2, 0.1]},
        {"kind": "beam", "name": "e", **ENDS, "section": {"kind": "tube", "outer_diameter": 0.2,
         "inner_diameter": 0.1}, "material": "grey cast iron", "elements": 7, "up": [0, 1, 0],
         "theory": "timoshenko", "axial_force": -12.5},
        {"kind": "bearing", "name": "j", "between": ["a", "ground"],
         "points": [{"rpm": 60, "stiffness": [[1, 2], [3, 4]], "damping": [[0, -1], [1, 0]]},
                    {"rpm": 90, "stiffness": [[1, 2], [3, 5]]}]},
        {"kind": "bearing", "name": "k", "between": ["a", "ground"], "axis": "z",
         "stiffness": [[1, 2], [-3, 4]], "damping": [[1, 0], [0, 1]]},
        {"kind": "pad", "name": "o", "between": ["a", "ground"], "shear_modulus": 3e7,
         "footing": {"kind": "rectangle", "length": 2, "width": 3}, "poissons_ratio": 0.3,
         "density": 1800},
    ],
}  # fmt: skip


def test_every_part_survives() -> None:
    text = survives(EVERY_PART)
    assert "[damping]" not in text


def test_every_field_of_every_part_is_tried() -> None:
    """So that a new kind of connection is added here too."""
    from schemas.connections import __all__ as kinds

    tried = {part["kind"] for part in EVERY_PART["connections"]}
    assert tried == {kind.lower() for kind in kinds if kind != "Connection"}


@pytest.mark.parametrize("path", sorted(EXAMPLES.glob("*.json")), ids=lambda path: path.stem)
def test_every_example_survives(path: Path) -> None:
    raw = json.loads(path.read_text("utf-8"))
    survives(raw.get("system", raw))


@pytest.mark.parametrize("task", TASKS.values(), ids=lambda task: task.name)
def test_the_example_of_every_task_survives(task: Task) -> None:
    question: Any = read(task.question, deepcopy(task.example))
    sheet = read_sheet(write_question(question).encode(), "text/csv", task.question)
    found: Any = sheet.validated(lambda raw: read(task.question, raw))
    assert options(found) == options(question)
    assert identity(found.system) == identity(question.system)


@pytest.mark.parametrize(
    ("task", "asked"),
    [
        ("modes", {}),
        ("modes", {"count": 3, "damped": True, "at_rpm": 900}),
        ("separation", {
            "operation": [{"name": "run", "min_rpm": 1, "max_rpm": 2}],
            "excitations": [{"name": "x", "order": 1}, {"name": "y", "frequency_hz": 9}],
            "rule": {"kind": "torsional"},
            "forces_at": {"x": ["left/x", "right/x"], "y": ["left/x"]},
        }),
        ("response/transient", {
            "initial": {"displacement": {"right/x": 0.01, "left.2/x": 1},
                        "velocity": {"left/x": 2}},
            "forces": [{"at": "left/x", "time_s": [0, 1, 2.5], "force": [1, -2, 3]}],
            "duration_s": 10, "time_step_s": 0.5, "observe": ["left/x"],
        }),
        ("response/harmonic", {
            "frequencies": {"list_hz": [1, 2.5, 4]},
            "excite": [{"base": "rx", "displacement": 1e-3, "about": [0, 0, 1]},
                       {"at": "left/x", "force": 5, "phase_deg": -90}],
        }),
    ],
)  # fmt: skip
def test_every_form_of_a_question_survives(task: str, asked: Raw) -> None:
    model: Any = TASKS[task].question
    question = read(model, {"system_id": "s" + 40 * "0", **deepcopy(asked)})
    sheet = read_sheet(write_question(question).encode(), "text/csv", model)
    assert options(sheet.validated(lambda raw: read(model, raw))) == options(question)


@given(seed=st.integers(min_value=0, max_value=2**32), make=st.sampled_from([line, plane, space]))
def test_random_machines_survive(seed: int, make: Any) -> None:
    survives(make(Random(seed)))


@given(note=st.text(max_size=60) | st.text("='+-@[]|;,\t\r\n \"x1", max_size=12))
def test_any_note_survives(note: str) -> None:
    survives({"kind": "bodies", "note": note, "bodies": [{"name": "a", "mass": 1}]})


@given(st.floats(allow_nan=False, allow_infinity=False, min_value=-1e30, max_value=1e30))
def test_any_entry_of_a_matrix_survives_to_the_last_bit(value: float) -> None:
    survives({**MATRICES, "damping": [[value, 0], [0, 0]]})


MATRICES: Raw = {
    "kind": "matrices",
    "name": "two masses",
    "note": "=1+1",
    "degrees_of_freedom": ["a b/x", "ö/rz"],
    "mass": [[2, 0], [0, 3]],
    "stiffness": [[1e9 / 3, -4], [-4, 9]],
}


@pytest.mark.parametrize(
    "matrix",
    [
        {"rows": [0, 1, 1], "columns": [0, 1, 1], "values": [1, -0.0, 1e-30]},
        {"rows": [0, 1], "columns": [0, 0], "values": [1, 2.5], "symmetric": True},
        {"rows": [], "columns": [], "values": []},
        {"rows": [], "columns": [], "values": [], "symmetric": True},
        {"matrix_market": "%%MatrixMarket matrix array real general\n2 2\n1.0\n0\n-1\n1"},
        {"matrix_market": "%%MatrixMarket matrix array real symmetric\r\n% 1,5; =x\r\n\r\n \n"},
        {"matrix_market": ""},
        {"matrix_market": "\n[mass]\n'\n\t1\n"},
    ],
)
def test_every_form_of_a_matrix_survives(matrix: Raw) -> None:
    survives({**MATRICES, "structural": matrix})


@pytest.mark.parametrize(
    "note", ["=cmd()", "+1", "-1", "@x", "\t=1", "\r=1", 'x",=1', "\n=1", " =1"]
)
def test_no_text_runs_as_a_formula(note: str) -> None:
    text = survives({"kind": "bodies", "note": note, "bodies": [{"name": "a", "mass": 1}]})
    cells = [cell.strip() for row in csv.reader(StringIO(text, newline="")) for cell in row]
    assert not [cell for cell in cells if cell.startswith(("=", "+", "-", "@"))]


def test_the_sheet_follows_rfc_4180_and_leaves_defaults_out() -> None:
    raw = {
        "kind": "bodies",
        "bodies": [{"name": "a", "mass": 1.5, "at": [0, 0, 0]}],
        "connections": [],
    }
    assert write_sheet(read_system(raw)) == (
        "[system]\r\nkind\r\nbodies\r\n\r\n[bodies]\r\nname,mass\r\na,1.5\r\n"
    )
