"""Answers and problems over HTTP, as a caller sees them."""

import csv
import gzip
import json
from io import StringIO
from pathlib import Path
from typing import Any

import httpx
import pytest
import zstandard

from service.tasks import TASKS

Raw = dict[str, Any]


def fresh(name: str, stiffness: object = 3.2e6) -> Raw:
    """One mass on a spring, under a name of its own so that nothing is stored yet."""
    return {
        "kind": "bodies",
        "name": name,
        "motions": ["z"],
        "bodies": [{"name": "m", "mass": 200.0}],
        "connections": [
            {"kind": "spring", "name": "k", "between": ["m", "ground"], "stiffness": stiffness}
        ],
    }


def test_a_new_answer_is_stored_and_found_again(client: httpx.Client) -> None:
    body = {"system": fresh("stored once"), "count": 1}
    first = client.post("/v1/modes", json=body)
    again = client.post("/v1/modes", json=body)
    respaced = client.post(
        "/v1/modes",
        content=json.dumps(body, indent=3),
        headers={"Content-Type": "application/json"},
    )
    assert first.status_code == 200
    assert first.headers["Cache-Status"] == "wideberth; fwd=miss; stored"
    assert again.headers["Cache-Status"] == respaced.headers["Cache-Status"] == "wideberth; hit"
    assert first.content == again.content == respaced.content
    stored = client.get(first.headers["Content-Location"])
    assert stored.content == first.content
    assert stored.json()["id"] in first.headers["Content-Location"]


def test_an_etag_gives_304(client: httpx.Client) -> None:
    body = {"system": fresh("etag"), "count": 1}
    reply = client.post("/v1/modes", json=body)
    etag, place = reply.headers["ETag"], reply.headers["Content-Location"]
    assert etag.startswith('"')
    for condition in (etag, f'"other", {etag}', "*", f"W/{etag}"):
        known = client.get(place, headers={"If-None-Match": condition})
        assert known.status_code == 304
        assert known.content == b""
    assert client.get(place, headers={"If-None-Match": '"other"'}).status_code == 200
    assert client.get(place, params={"format": "csv"}).headers["ETag"] != etag
    assert reply.headers["Vary"] == "Accept"


def test_an_answer_takes_its_forms(client: httpx.Client) -> None:
    reply = client.post("/v1/separation", json=TASKS["separation"].example)
    place = reply.headers["Content-Location"]
    table = client.get(place, params={"format": "csv"})
    assert table.headers["Content-Type"] == "text/csv; charset=utf-8"
    rows = list(csv.DictReader(StringIO(table.text)))
    assert rows[0]["verdict"] == reply.json()["findings"][0]["verdict"]
    assert float(rows[0]["margin"]) == reply.json()["findings"][0]["margin"]
    clear = client.get(place, params={"format": "csv", "table": "clear_speeds"})
    assert clear.text.splitlines()[0] == "min_rpm,max_rpm"
    page = client.get(place, headers={"Accept": "text/html,application/json;q=0.5"})
    assert page.headers["Content-Type"] == "text/html; charset=utf-8"
    assert reply.json()["findings"][0]["reading"] in page.text
    text = client.get(place, headers={"Accept": "text/plain"})
    assert reply.json()["caution"] in text.text
    assert client.get(place, headers={"Accept": "image/png"}).status_code == 406
    assert client.get(place, params={"format": "pdf"}).status_code == 406
    assert client.get(place, params={"format": "csv", "table": "none"}).status_code == 404


def test_one_value_can_be_picked(client: httpx.Client) -> None:
    reply = client.post("/v1/modes", json={"system": fresh("picked"), "count": 1})
    place = reply.headers["Content-Location"]
    value = client.get(place, params={"pick": "/modes/0/frequency_hz"})
    assert value.headers["Content-Type"].startswith("text/plain")
    assert float(value.text) == reply.json()["modes"][0]["frequency_hz"]
    assert client.get(place, params={"pick": "/modes/0/kind"}).text == "oscillating"
    for missing in ("/modes/1/frequency_hz", "/modes/x", "modes", "/modes/01"):
        assert client.get(place, params={"pick": missing}).status_code == 404


def test_a_system_is_stored_under_the_same_id_however_it_is_written(client: httpx.Client) -> None:
    first = client.post("/v1/systems", json=fresh("same id"))
    assert first.status_code == 201
    identity = first.json()["id"]
    assert first.headers["Location"] == f"/v1/systems/{identity}"
    with_units = client.post("/v1/systems", json=fresh("same id", "3.2 kN/mm"))
    whole = client.post("/v1/systems", json=fresh("same id", 3200000))
    assert with_units.json()["id"] == whole.json()["id"] == identity
    stored = client.get(f"/v1/systems/{identity}").json()
    assert client.post("/v1/systems", json=stored["system"]).json()["id"] == identity
    assert stored["total_mass_kg"] == 200.0
    by_id = client.post("/v1/modes", json={"system_id": identity})
    inline = client.post("/v1/modes", json={"system": fresh("same id")})
    assert by_id.content == inline.content


def test_questions_can_stand_in_the_address(client: httpx.Client) -> None:
    identity = client.post("/v1/systems", json=fresh("by address")).json()["id"]
    modes = client.get(f"/v1/systems/{identity}/modes", params={"count": 1})
    assert modes.json()["modes"][0]["frequency_hz"] == pytest.approx(20.1317, rel=1e-5)
    query: dict[str, Any] = {
        "min_rpm": 900,
        "max_rpm": 1100,
        "orders": "1,2",
        "lines_hz": "100",
        "fraction": 0.2,
    }
    found = client.get(f"/v1/systems/{identity}/separation", params=query)
    assert found.json()["verdict"] == "short"
    now: dict[str, Any] = {"rpm": 1208, "orders": "1", "pick": "/verdict"}
    assert client.get(f"/v1/systems/{identity}/separation", params=now).text == "short"
    gauges = client.get(
        f"/v1/systems/{identity}/separation", params={**query, "format": "openmetrics"}
    )
    assert gauges.headers["Content-Type"].startswith("application/openmetrics-text")
    assert gauges.text.endswith("# EOF\n")
    assert 'excitation="order 1"' in gauges.text
    unknown = client.get(f"/v1/systems/s{'0' * 40}/modes")
    assert unknown.status_code == 404


@pytest.mark.parametrize(
    ("method", "path", "options", "status", "name"),
    [
        ("POST", "/v1/modes", {"content": b"{"}, 400, "malformed"),
        ("GET", "/health/live?verbose=1", {}, 400, "invalid-parameter"),
        ("GET", "/nowhere", {}, 404, "not-found"),
        ("GET", "/v1/results/a0", {}, 404, "not-found"),
        ("GET", "/v1/modes", {}, 405, "method-not-allowed"),
        ("PUT", "/v1/systems", {}, 405, "method-not-allowed"),
        ("POST", "/v1/modes", {"content": b" " * 9_000_000}, 413, "too-large"),
        ("POST", "/v1/modes", {"content": b"a", "headers": {"Content-Type": "image/png"}}, 415,
         "unsupported-media-type"),
        ("POST", "/v1/modes", {"json": {}}, 422, "invalid"),
        ("POST", "/v1/modes", {"json": {"system_id": "s" + "0" * 40}}, 422, "invalid"),
    ],
)  # fmt: skip
def test_every_fault_is_a_problem_document(
    client: httpx.Client, method: str, path: str, options: Raw, status: int, name: str
) -> None:
    reply = client.request(method, path, **options)
    assert reply.status_code == status
    assert reply.headers["Content-Type"] == "application/problem+json"
    problem = reply.json()
    assert set(problem) - {"errors"} == {"type", "title", "status", "detail", "instance"}
    assert problem["type"] == f"/problems/{name}"
    assert problem["status"] == status
    assert problem["instance"] == path.partition("?")[0]
    assert client.get(problem["type"]).status_code == 200
    if status == 405:
        assert reply.headers["Allow"] == "OPTIONS, POST"


def test_a_body_that_grows_too_large_on_the_way_is_refused(client: httpx.Client) -> None:
    def parts() -> Any:
        for _ in range(90):
            yield b" " * 100_000

    reply = client.post("/v1/modes", content=parts(), headers={"Content-Type": "application/json"})
    assert reply.status_code == 413


def test_a_chunked_body_is_read(client: httpx.Client) -> None:
    def parts() -> Any:
        yield b'{"system":'
        yield json.dumps(fresh("chunked")).encode() + b"}"

    reply = client.post("/v1/modes", content=parts(), headers={"Content-Type": "application/json"})
    assert reply.status_code == 200


def test_options_and_head_are_answered_politely(client: httpx.Client) -> None:
    options = client.options("/v1/modes")
    assert (options.status_code, options.headers["Allow"]) == (204, "OPTIONS, POST")
    head = client.head("/health/live")
    assert (head.status_code, head.content) == (200, b"")


def test_all_faults_come_back_at_once_and_as_a_table_for_macros(client: httpx.Client) -> None:
    system = fresh("faulty")
    system["bodies"][0]["mass"] = -1
    system["connections"][0]["between"] = ["nobody", "ground"]
    reply = client.post("/v1/modes", json={"system": system, "count": 0})
    pointers = {error["pointer"] for error in reply.json()["errors"]}
    assert pointers == {"/system/bodies/0/mass", "/system/connections/0/between/0", "/count"}
    table = client.post("/v1/modes?problems=table", json={"system": system, "count": 0})
    assert (table.status_code, table.headers["Content-Type"]) == (200, "text/csv; charset=utf-8")
    rows = list(csv.DictReader(StringIO(table.text)))
    assert list(rows[0]) == ["problem", "row", "column", "pointer", "detail"]
    assert {row["pointer"] for row in rows} == pointers


def test_free_text_is_escaped(client: httpx.Client) -> None:
    system = {**fresh("escaped"), "note": "<script>alert(1)</script>"}
    reply = client.post("/v1/modes", json={"system": system})
    page = client.get(reply.headers["Content-Location"], params={"format": "html"})
    assert "<script" not in page.text
    system = fresh("=cmd|' /C calc'!A0")
    assert client.post("/v1/modes", json={"system": system}).status_code == 422


def test_pages_and_the_openapi_document_need_nothing_from_outside(client: httpx.Client) -> None:
    for path in ("/", "/docs", "/problems/invalid"):
        page = client.get(path)
        assert page.status_code == 200
        assert "http://" not in page.text
        assert "https://" not in page.text
        assert "<script" not in page.text
    document = client.get("/openapi.json").json()
    assert document["openapi"] == "3.1.0"
    bare = [
        f"{name}.{field}"
        for name, schema in document["components"]["schemas"].items()
        for field, about in schema.get("properties", {}).items()
        if not about.get("description")
    ]
    assert bare == []


@pytest.mark.parametrize("task", TASKS)
def test_the_example_of_a_task_works_and_every_form_of_its_answer(
    client: httpx.Client, task: str
) -> None:
    reply = client.post(f"/v1/{task}", json=TASKS[task].example)
    assert reply.status_code == 200, reply.text
    TASKS[task].answer.model_validate_json(reply.content)
    for form in ("csv", "html", "text"):
        other = client.get(reply.headers["Content-Location"], params={"format": form})
        assert other.status_code == 200
        assert other.text


@pytest.mark.parametrize("coding", ["gzip", "zstd"])
def test_a_compressed_body_is_read_within_the_limit(client: httpx.Client, coding: str) -> None:
    def packed(data: bytes) -> bytes:
        return gzip.compress(data) if coding == "gzip" else zstandard.compress(data)

    headers = {"Content-Type": "application/json", "Content-Encoding": coding}
    body = json.dumps({"system": fresh(f"packed {coding}")}).encode()
    assert client.post("/v1/modes", content=packed(body), headers=headers).status_code == 200
    bomb = packed(b" " * 20_000_000)
    assert client.post("/v1/modes", content=bomb, headers=headers).status_code == 413
    broken = packed(body)[:-9]
    assert client.post("/v1/modes", content=broken, headers=headers).status_code == 400
    headers["Content-Encoding"] = "br"
    assert client.post("/v1/modes", content=body, headers=headers).status_code == 415


EXAMPLES = sorted((Path(__file__).parents[2] / "deploy" / "examples").glob("*.json"))


@pytest.mark.parametrize("path", EXAMPLES, ids=[path.stem for path in EXAMPLES])
def test_every_example_machine_is_answered(client: httpx.Client, path: Path) -> None:
    body = json.loads(path.read_text(encoding="utf-8"))
    task = "separation" if "operation" in body else "modes"
    reply = client.post(f"/v1/{task}", json=body)
    assert reply.status_code == 200, reply.text
    assert reply.json()["evidence"]["complete"] is True
