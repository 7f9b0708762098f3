"""Closed forms and 50-digit results: each case names its source and how it was obtained."""

import json
from pathlib import Path
from typing import Any

import pytest

from tests.tasks.asking import ask

CASES: list[dict[str, Any]] = json.loads(
    Path(__file__).with_name("cases.json").read_text(encoding="utf-8")
)


def picked(answer: Any, pointer: str) -> Any:
    """What an RFC 6901 pointer without escapes picks from an answer."""
    for key in pointer.split("/")[1:]:
        answer = answer[int(key)] if isinstance(answer, list) else answer[key]
    return answer


@pytest.mark.parametrize("case", CASES, ids=[case["id"] for case in CASES])
def test_the_answer_agrees_with_its_source(case: dict[str, Any]) -> None:
    answer = ask(case["task"], case["body"])
    for expected in case["expect"]:
        value, wanted = picked(answer, expected["pointer"]), expected["value"]
        if isinstance(wanted, str):
            assert value == wanted, expected["pointer"]
        else:
            tolerance = expected.get("atol", expected.get("rtol", 0.0) * abs(wanted))
            assert abs(value - wanted) <= tolerance, expected["pointer"]


def test_every_case_names_its_source_and_expects_something() -> None:
    assert len(CASES) >= 11
    assert all(case["source"] and case["provenance"] and case["expect"] for case in CASES)


@pytest.mark.parametrize("case", [case for case in CASES if case["id"].startswith("hung")])
def test_hung_masses_are_held_to_twelve_digits(case: dict[str, Any]) -> None:
    assert [expected["rtol"] for expected in case["expect"]] == [1e-12, 1e-12]
