"""Sheets posted over HTTP: the same machine has the same id, and faults name row and column."""

import csv
import json
from io import StringIO
from pathlib import Path

import httpx
import pytest

EXAMPLES = sorted((Path(__file__).parents[2] / "deploy" / "examples").glob("*.csv"))
SHEET = """\
[system]
name,motions
hung masses,x

[bodies]
name,mass [lb],at.x,at.y,at.z
left,4.5,0,0,0
right,6,0.4,0,0

[connections]
kind,name,body,between,length,stiffness
pendulum,rod a,left,,500 mm,
pendulum,rod b,right,,0.5,
spring,tie,,left|right,,40
"""


def post(client: httpx.Client, path: str, text: str, media: str = "text/csv") -> httpx.Response:
    """Post a sheet."""
    return client.post(path, content=text.encode(), headers={"Content-Type": media})


@pytest.mark.parametrize("path", EXAMPLES, ids=[path.stem for path in EXAMPLES])
def test_an_example_has_the_same_answer_as_json_and_as_a_sheet(
    client: httpx.Client, path: Path
) -> None:
    body = json.loads(path.with_suffix(".json").read_text(encoding="utf-8"))
    task = "separation" if "operation" in body else "modes"
    sheet = post(client, f"/v1/{task}", path.read_text(encoding="utf-8"))
    assert sheet.status_code == 200, sheet.text
    assert sheet.json()["id"] == client.post(f"/v1/{task}", json=body).json()["id"]


def test_a_system_comes_back_as_the_sheet_that_gives_its_id(client: httpx.Client) -> None:
    kept = post(client, "/v1/systems", SHEET)
    assert kept.status_code == 201, kept.text
    identity = kept.json()["id"]
    sheet = client.get(f"/v1/systems/{identity}", params={"format": "csv"})
    assert sheet.headers["Content-Type"] == "text/csv; charset=utf-8"
    assert post(client, "/v1/systems", sheet.text).json()["id"] == identity


def test_separators_and_decimal_commas_change_nothing(client: httpx.Client) -> None:
    identity = post(client, "/v1/systems", SHEET).json()["id"]
    european = SHEET.replace(",", ";").replace(".", ",").replace("at,", "at.")
    assert post(client, "/v1/systems", european).json()["id"] == identity
    tabbed = SHEET.replace(",", "\t")
    found = post(client, "/v1/systems", tabbed, "text/tab-separated-values")
    assert found.json()["id"] == identity


@pytest.mark.parametrize(
    ("before", "after", "row", "column"),
    [
        ("left,4.5,", "left,heavy,", 7, 2),
        ("left,4.5,", "left,4.5 kg,", 7, 2),
        ("right,6,0.4,0,0", "right,6,0.4,0,0,9", 8, 6),
        ("mass [lb]", "weight", 6, 2),
        ("left|right", "left|nobody", 14, 4),
        ("[connections]", "[bodies]", 10, 1),
        ("[connections]", "[springs]", 10, 1),
        ("500 mm", "500 kg", 12, 5),
        ("hung masses,x", "hung masses,q", 3, 2),
    ],
)
def test_a_fault_names_its_row_and_column(
    client: httpx.Client, before: str, after: str, row: int, column: int
) -> None:
    assert before in SHEET
    reply = post(client, "/v1/modes", SHEET.replace(before, after))
    assert reply.status_code == 422, reply.text
    places = [(error.get("row"), error.get("column")) for error in reply.json()["errors"]]
    assert (row, column) in places, reply.text
    table = post(client, "/v1/modes?problems=table", SHEET.replace(before, after))
    assert str(row) in {line["row"] for line in csv.DictReader(StringIO(table.text))}


@pytest.mark.parametrize("text", ['[system]\nname\n"open', "name,mass\na,1", "\xff", "[", ""])
def test_what_is_no_sheet_is_refused(client: httpx.Client, text: str) -> None:
    reply = client.post(
        "/v1/modes", content=text.encode("latin-1"), headers={"Content-Type": "text/csv"}
    )
    assert reply.status_code in (400, 422)
    assert reply.json()["errors"]


def test_the_sheet_that_documents_a_task_is_its_json_example(client: httpx.Client) -> None:
    paths = client.get("/openapi.json").json()["paths"]
    contents = {
        path: methods["post"]["requestBody"]["content"]
        for path, methods in paths.items()
        if "text/csv" in methods.get("post", {}).get("requestBody", {}).get("content", {})
    }
    assert len(contents) > 2
    for path, content in contents.items():
        sheet = post(client, path, content["text/csv"]["example"])
        assert sheet.is_success, sheet.text
        example = content["application/json"]["example"]
        assert sheet.json()["id"] == client.post(path, json=example).json()["id"]
