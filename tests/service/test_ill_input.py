"""What a caller may send by mistake or malice: a 4xx that names the field, and the server lives."""

import json
from typing import Any

import httpx
import pytest

from tests.service.test_http import fresh

Raw = dict[str, Any]


def changed(path: str, value: object) -> bytes:
    """A question on modes with one place changed."""
    body: Any = {"system": fresh("ill")}
    *way, last = path.strip("/").split("/")
    node = body
    for key in way:
        node = node[int(key)] if isinstance(node, list) else node[key]
    node[last] = value
    return json.dumps(body).encode()


MASS = "/system/bodies/0/mass"
STIFFNESS = "/system/connections/0/stiffness"
LARGE = {"kind": "bodies", "motions": ["z"],
         "bodies": [{"name": f"b{i}", "mass": 1} for i in range(100_000)]}  # fmt: skip
CASES: dict[str, tuple[bytes, int, str]] = {
    "NaN": (changed(MASS, float("nan")), 400, MASS),
    "Infinity": (changed(STIFFNESS, float("inf")), 400, STIFFNESS),
    "1e400": (changed(MASS, 1).replace(b'"mass": 1', b'"mass": 1e400'), 422, MASS),
    "huge integer": (changed(MASS, 10**400), 422, MASS),
    "empty body": (b"", 400, ""),
    "boolean for a number": (changed(MASS, True), 422, MASS),
    "bare number in a string": (changed(MASS, "200"), 422, MASS),
    "wrong unit": (changed(MASS, "3 m"), 422, MASS),
    "list for an object": (changed("/system/bodies", {}), 422, "/system/bodies"),
    "null system": (b'{"system": null}', 422, "/system"),
    "10 MB": (b'{"system": "' + b"x" * 10_000_000 + b'"}', 413, ""),
    "deep nesting": (b"[" * 200_000, 400, ""),
    "deep nesting in a field": (
        changed(MASS, 1).replace(b'"mass": 1', b'"mass": ' + b"[" * 150 + b"]" * 150), 422, MASS,
    ),
    "100 000 bodies": (json.dumps({"system": LARGE}).encode(), 422, "/system/bodies"),
    "name with a slash": (changed("/system/bodies/0/name", "a/b"), 422, "/system/bodies/0/name"),
    "name of a formula": (changed("/system/bodies/0/name", "=1+1"), 422, "/system/bodies/0/name"),
    "duplicate key": (b'{"system": 1, "system": 2}', 400, "/system"),
    "unknown body": (changed("/system/connections/0/between", ["x", "ground"]), 422,
                     "/system/connections/0/between/0"),
    "zero stiffness": (changed(STIFFNESS, 0), 422, STIFFNESS),
    "zero mass": (changed(MASS, 0), 422, "/system/bodies"),
    "not positive definite": (
        changed("/system/bodies/0/inertia", {"xx": 1, "yy": 1, "zz": 1, "xy": 2}), 422,
        "/system/bodies/0/inertia",
    ),
    "lone surrogate": (changed("/system/note", "\ud800"), 400, ""),
    "null byte in a name": (changed("/system/bodies/0/name", "a\0b"), 422, "/system/bodies/0/name"),
    "unknown field": (changed("/system/colour", "red"), 422, "/system/colour"),
    "options that exclude each other": (
        json.dumps({"system": fresh("ill"), "count": 1, "below_hz": 9}).encode(), 422, "/below_hz",
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", CASES)
def test_ill_input_is_a_problem_that_names_the_field(client: httpx.Client, name: str) -> None:
    body, status, pointer = CASES[name]
    reply = client.post("/v1/modes", content=body, headers={"Content-Type": "application/json"})
    assert reply.status_code == status, reply.text[:500]
    pointers = [error["pointer"] for error in reply.json()["errors"]]
    assert pointer in pointers, pointers
    assert client.get("/health/ready").status_code == 200


def test_duplicate_names_are_named(client: httpx.Client) -> None:
    system = fresh("twins")
    system["bodies"].append({"name": "k", "mass": 1})
    reply = client.post("/v1/modes", json={"system": system})
    assert reply.status_code == 422
    assert any(e["pointer"] == "/system/connections/0/name" for e in reply.json()["errors"])


@pytest.mark.parametrize("mass", [1e-30, 1e30])
@pytest.mark.parametrize("stiffness", [1e-30, 1e30])
def test_extreme_numbers_are_answered(client: httpx.Client, mass: float, stiffness: float) -> None:
    system = fresh("extreme", stiffness)
    system["bodies"][0]["mass"] = mass
    reply = client.post("/v1/modes", json={"system": system})
    assert reply.status_code == 200
    expected = (stiffness / mass) ** 0.5 / 6.283185307179586
    assert reply.json()["modes"][0]["frequency_hz"] == pytest.approx(expected, rel=1e-12)
