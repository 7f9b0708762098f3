"""The same machine as JSON and as a sheet is the same machine."""

from copy import deepcopy
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from schemas.identity import canonical, options, system_id
from schemas.modes import ModesQuestion
from schemas.reading import read, read_system
from schemas.separation import SeparationQuestion
from schemas.sheet import read_sheet
from schemas.system import AnySystem

Raw = dict[str, Any]

JSON: Raw = {
    "kind": "bodies",
    "name": "pump set",
    "note": 'spare, "as built"\nsecond line; see 4|7',
    "motions": ["x", "z", "ry"],
    "gravity": 9.81,
    "damping": {"kind": "modal", "ratio": 0.02},
    "bodies": [
        {"name": "12", "mass": "40 lb", "at": [0, 0, 0.5], "inertia": 1.25},
        {
            "name": "motor",
            "mass": "100.5 lb",
            "at": [1.5, 0, 0.5],
            "inertia": 3,
            "held": ["x", "z"],
        },
        {"name": "TRUE", "motions": ["z"]},
    ],
    "connections": [
        {
            "kind": "spring",
            "name": "mount",
            "between": ["12", "ground"],
            "stiffness": {"x": "1.5 kN/mm", "z": 2e6},
            "axes": [[1, 0, 0], [0, 1, 0], [0, 0, 1]],
        },
        {
            "kind": "spring",
            "name": "tie",
            "between": ["12", "motor"],
            "stiffness": -4000.5,
            "along": [1, 0, 0.5],
            "destabilising": True,
        },
        {"kind": "link", "name": "rod", "between": ["motor", "TRUE"], "motions": ["z"]},
        {
            "kind": "bearing",
            "name": "bush",
            "between": ["12", "motor"],
            "axis": "y",
            "points": [
                {"rpm": 600, "stiffness": [[1e6, 2e5], [-2e5, 1e6]]},
                {"rpm": 1200, "stiffness": [[2e6, 3e5], [-3e5, 2e6]]},
            ],
        },
    ],
}
POINTS = [
    f"points.{point}.{field}"
    for point in range(2)
    for field in ("rpm", *(f"stiffness.{row}.{column}" for row in range(2) for column in range(2)))
]
SHEET: dict[str, list[list[str]]] = {
    "system": [
        ["name", "note", "motions", "gravity", "damping.kind", "damping.ratio"],
        ["pump set", 'spare, "as built"\nsecond line; see 4|7', "x|z|ry", "9.81", "modal", "2 %"],
    ],
    "bodies": [
        ["name", "mass [lb]", "at.x", "at.y", "at.z", "inertia", "held", "motions"],
        ["12", "40", "0", "0", "0.5", "1.25", "", ""],
        ["motor", "100.5", "1.5", "0", "0.5", "3", "x|z", ""],
        ["TRUE", "", "", "", "", "", "", "z"],
    ],
    "connections": [
        [
            "kind", "name", "between", "stiffness.x [kN/mm]", "stiffness.z", "stiffness",
            "along.x", "along.y", "along.2", "destabilising", "motions", "axis", *POINTS,
            *(f"axes.{row}.{column}" for row in range(3) for column in "xyz"),
        ],
        ["spring", "mount", "12|ground", "1.5", "2e6", *[""] * 17, *"100010001"],
        ["spring", "tie", "12 | motor", "", "", "-4000.5", "1", "0", ".5", "true"],
        ["link", "rod", "motor|TRUE", *[""] * 7, "z"],
        ["bearing", "bush", "12|motor", *[""] * 8, "y",
         *["600", "1e6", "200000", "-2E5", "1000000.0", "1200", "2e6", "3e5", "-3e5", "+2e6"]],
    ],
}  # fmt: skip


def sheet_of(
    blocks: dict[str, list[list[str]]], separator: str = ",", decimal_comma: bool = False
) -> bytes:
    """A sheet as a spreadsheet saves it: every row as wide as the widest."""
    width = max(len(row) for rows in blocks.values() for row in rows)
    lines = []
    for name, rows in blocks.items():
        for row in [[f"[{name}]"], *rows, []]:
            cells = [_quoted(_comma(cell) if decimal_comma else cell, separator) for cell in row]
            lines.append(separator.join([*cells, *[""] * (width - len(cells))]))
    return "\r\n".join(lines).encode()


def _comma(cell: str) -> str:
    number = cell.split(" ")[0]
    try:
        float(number)
    except ValueError:
        return cell
    return cell.replace(".", ",")


def _quoted(cell: str, separator: str) -> str:
    quoted = any(letter in cell for letter in ('"', "\n", separator))
    return '"' + cell.replace('"', '""') + '"' if quoted else cell


def system_of(data: bytes, content_type: str = "text/csv") -> AnySystem:
    return read_sheet(data, content_type).validated(read_system)


def identity(system: AnySystem) -> str:
    return system_id(canonical(system))


AS_JSON = identity(read_system(deepcopy(JSON)))


@pytest.mark.parametrize("separator", [",", ";", "\t"], ids=["comma", "semicolon", "tab"])
def test_a_sheet_has_the_id_of_the_same_machine_in_json(separator: str) -> None:
    assert identity(system_of(sheet_of(SHEET, separator))) == AS_JSON


@pytest.mark.parametrize(
    ("separator", "content_type"),
    [(";", "text/csv"), ("\t", "text/csv"), ("\t", "text/tab-separated-values")],
)
def test_decimal_commas_change_no_id(separator: str, content_type: str) -> None:
    data = sheet_of(SHEET, separator, decimal_comma=True)
    assert b"100,5" in data
    assert identity(system_of(data, content_type)) == AS_JSON


@given(order=st.permutations(range(len(SHEET["connections"][0]))))
def test_the_order_of_columns_changes_no_id(order: list[int]) -> None:
    moved = [
        [row[column] if column < len(row) else "" for column in order]
        for row in SHEET["connections"]
    ]
    assert identity(system_of(sheet_of({**SHEET, "connections": moved}))) == AS_JSON


def test_the_order_of_blocks_and_blank_rows_change_no_id() -> None:
    blocks = dict(reversed(SHEET.items()))
    blocks["bodies"] = [row for row in blocks["bodies"] for row in (row, ["", " "], [])]
    assert identity(system_of(sheet_of(blocks))) == AS_JSON


@pytest.mark.parametrize(
    ("encode", "content_type"),
    [
        (lambda text: text.encode("utf-8-sig"), "text/csv"),
        (lambda text: text.encode("utf-16"), "text/csv"),
        (lambda text: b"\xfe\xff" + text.encode("utf-16-be"), "text/csv; charset=utf-8"),
        (lambda text: text.encode("utf-8"), 'text/csv; charset="UTF-8"; header=present'),
        (lambda text: text.encode("cp1252"), "text/csv; charset=windows-1252"),
    ],
)
def test_what_spreadsheets_save_is_read(encode: Any, content_type: str) -> None:
    text = "[system]\r\nname,motions\r\nLüfter,z\r\n[bodies]\r\nname,mass\r\nMotor é,5\r\n"
    system = system_of(encode(text), content_type)
    assert system.kind == "bodies"
    assert (system.name, system.bodies[0].name) == ("Lüfter", "Motor é")


def test_line_ends_of_every_kind_are_read() -> None:
    data = sheet_of(
        {
            **SHEET,
            "system": [["kind", *SHEET["system"][0][2:]], ["bodies", *SHEET["system"][1][2:]]],
        }
    )
    found = {identity(system_of(data.replace(b"\r\n", end))) for end in (b"\r\n", b"\n", b"\r")}
    assert len(found) == 1


def test_a_question_on_a_sheet_is_the_same_question() -> None:
    blocks = {
        **SHEET,
        "operation": [["name", "min_rpm", "max_rpm"], ["run", "900", "1100"],
                      ["slow", "5 Hz", "6 Hz"]],
        "excitations": [
            ["name", "order", "frequency_hz"], ["unbalance", "1", ""], ["2xline", "", "100"],
        ],
        "options": [["rule.kind", "rule.mode_above", "rule.mode_below"],
                    ["fraction", "0.25", "15 %"]],
        "forces_at": [["excitation", "at"], ["unbalance", "12/x|12/z"], ["unbalance", "motor/ry"]],
    }  # fmt: skip
    raw = {
        "system": deepcopy(JSON),
        "operation": [
            {"name": "run", "min_rpm": 900, "max_rpm": 1100},
            {"name": "slow", "min_rpm": 300, "max_rpm": 360},
        ],
        "excitations": [{"name": "unbalance", "order": 1}, {"name": "2xline", "frequency_hz": 100}],
        "rule": {"kind": "fraction", "mode_above": 0.25, "mode_below": 0.15},
        "forces_at": {"unbalance": ["12/x", "12/z", "motor/ry"]},
    }
    sheet = read_sheet(sheet_of(blocks), "text/csv", SeparationQuestion)
    found = sheet.validated(lambda posted: read(SeparationQuestion, posted))
    expected = read(SeparationQuestion, raw)
    assert options(found) == options(expected)
    assert found.system is not None
    assert identity(found.system) == AS_JSON


def test_a_block_of_one_object_serves_as_well_as_columns_of_options() -> None:
    rule = [["kind", "mode_above"], ["fraction", "0.25"]]
    sheet = read_sheet(sheet_of({"rule": rule}), "text/csv", SeparationQuestion)
    assert (sheet.raw, sheet.faults) == ({"rule": {"kind": "fraction", "mode_above": 0.25}}, [])


def test_a_question_on_a_stored_system_needs_no_system_in_the_sheet() -> None:
    identifier = "s" + "0" * 40
    data = sheet_of({"options": [["system_id", "count", "damped"], [identifier, "6.0", "FALSE"]]})
    sheet = read_sheet(data, "text/csv", ModesQuestion)
    assert sheet.raw == {"system_id": identifier, "count": 6, "damped": False}


def test_a_name_with_a_point_may_follow_a_field_of_names() -> None:
    class Shape(ModesQuestion):
        shape: dict[str, float]

    sheet = read_sheet(b"[options]\nshape.pump.2/x,shape.a/z\n1,-.5\n", "text/csv", Shape)
    assert sheet.raw == {"shape": {"pump.2/x": 1, "a/z": -0.5}}
    assert sheet.place("/shape/a~1z") == (3, 2)


MATRICES: Raw = {
    "kind": "matrices",
    "degrees_of_freedom": ["a/x", "b/x"],
    "mass": [[2, 0], [0, 3]],
    "stiffness": [[10.5, -4], [-4, 9]],
}


def test_matrices_stand_below_the_names_of_their_columns_in_any_order() -> None:
    blocks = {
        "stiffness": [["b/x", "a/x"], ["-4", "10.5"], ["9", "-4"]],
        "degrees_of_freedom": [["name"], ["a/x"], ["b/x"]],
        "mass": [["a/x", "b/x"], ["2", "0"], ["0", "3"]],
    }
    assert read_sheet(sheet_of(blocks), "text/csv").raw == MATRICES
    assert identity(system_of(sheet_of(blocks, ";", decimal_comma=True))) == identity(
        read_system(deepcopy(MATRICES))
    )


def test_matrices_may_be_lists_of_entries_or_matrix_market_text() -> None:
    text = "%%MatrixMarket matrix coordinate real symmetric\n% by hand, 3; 4\n\n2 2 1\n1 1 2.0\n"
    blocks = {
        "system": [["kind"], ["matrices"]],
        "degrees_of_freedom": [["name"], ["a/x"], ["b/x"]],
        "mass": [["matrix_market"], *([line or "'"] for line in text.split("\n"))],
        "stiffness": [
            ["value", "row", "column", "symmetric"],
            ["10.5", "0", "0", "TRUE"],
            ["-4", "0", "1"],
            ["9", "1", "1"],
        ],
        "damping": [["row", "column", "value"], ["1", "1", "5"]],
    }
    raw = read_sheet(sheet_of(blocks), "text/csv").raw
    assert raw["mass"] == {"matrix_market": text}
    assert raw["stiffness"] == {
        "rows": [0, 0, 1], "columns": [0, 1, 1], "values": [10.5, -4, 9], "symmetric": True,
    }  # fmt: skip
    assert raw["damping"] == {"rows": [1], "columns": [1], "values": [5]}


@pytest.mark.parametrize(
    ("cell", "text"),
    [
        ("'=A1", "=A1"),
        ("''", "'"),
        ("'tis", "'tis"),
        ("''tis", "'tis"),
        ("' a ", " a "),
        (" a ", "a"),
    ],
)
def test_an_apostrophe_that_protects_text_is_taken_off(cell: str, text: str) -> None:
    assert read_sheet(sheet_of({"system": [["note"], [cell]]}), "text/csv").raw["note"] == text


def test_places_are_those_of_the_cells() -> None:
    sheet = read_sheet(sheet_of(SHEET), "text/csv")
    places = {
        "/name": (3, 1),
        "/damping": (3, 5),
        "/bodies": (5, 1),  # the note above takes two lines, but one row
        "/bodies/1/mass": (8, 2),
        "/bodies/1/at/2": (8, 5),
        "/bodies/2/mass": (9, 2),  # blank
        "/connections/0/stiffness/z": (13, 5),
        "/connections/3/points/1/stiffness/0/1": (16, 20),
        "/connections/2/length": (15, 1),  # has no column
        "/connections/1/between/0": (14, 3),
        "/connections/99": (11, 1),
        "/kind": (3, 1),
    }
    assert {pointer: sheet.place(pointer) for pointer in places} == places
