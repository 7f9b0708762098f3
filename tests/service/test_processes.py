"""The store between processes, the command line, and what the contract's document promises."""

import subprocess
import sys
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path
from typing import Any

import httpx
import schemathesis
from hypothesis import HealthCheck, given, settings
from schemathesis.specs.openapi.checks import positive_data_acceptance

from tests.service.conftest import serving
from tests.service.test_http import fresh


def test_two_servers_on_one_store_give_the_same_bytes(tmp_path: Path) -> None:
    store = tmp_path / "shared.db"
    with serving(store) as first, serving(store, "--workers", "2") as second:
        clients = [
            httpx.Client(base_url=address, trust_env=False, timeout=60.0)
            for address in (first, second)
        ]

        def ask(number: int) -> tuple[int, bytes]:
            body = {"system": fresh(f"shared {number // 4}"), "count": 1}
            reply = clients[number % 2].post("/v1/modes", json=body)
            assert reply.status_code == 200
            return number // 4, reply.content

        with ThreadPoolExecutor(8) as pool:
            replies = list(pool.map(ask, range(240)))
        for client in clients:
            client.close()
    assert len(set(replies)) == 60


def test_an_answer_survives_a_restart(tmp_path: Path) -> None:
    store = tmp_path / "kept.db"
    body = {"system": fresh("kept"), "count": 1}
    contents = []
    for status in ("wideberth; fwd=miss; stored", "wideberth; hit"):
        with serving(store) as address:
            reply = httpx.post(f"{address}/v1/modes", json=body, trust_env=False)
        assert reply.headers["Cache-Status"] == status
        contents.append(reply.content)
    assert contents[0] == contents[1]


def run(*arguments: str) -> subprocess.CompletedProcess[str]:
    """A command of the service."""
    return subprocess.run(
        [sys.executable, "-m", "service.cli", *arguments],
        capture_output=True, text=True, timeout=120, check=False,
    )  # fmt: skip


def test_the_demo_prints_the_table_and_the_readings() -> None:
    done = run("demo")
    assert done.returncode == 0, done.stderr
    for verdict in ("clear", "short", "coincident"):
        assert verdict in done.stdout
    assert "mode 11 with blade pass" in done.stdout
    assert "serve" in done.stdout


def test_the_service_refuses_an_address_that_others_can_reach() -> None:
    done = run("serve", "--host", "0.0.0.0", "--port", "0")  # noqa: S104
    assert done.returncode == 2
    assert "0.0.0.0" in done.stderr  # noqa: S104


def test_the_openapi_document_can_be_printed() -> None:
    assert '"openapi": "3.1.0"' in run("openapi").stdout


def test_generated_requests_are_never_answered_with_a_failure(address: str) -> None:
    schema = schemathesis.openapi.from_url(f"{address}/openapi.json")
    seen = 0
    for result in schema.get_all_operations():
        operation: Any = result.ok()  # type: ignore[union-attr]
        strategy = operation.as_strategy()

        @settings(max_examples=12, suppress_health_check=list(HealthCheck), deadline=None)
        @given(case=strategy)
        def check(case: Any) -> None:
            case.call_and_validate(excluded_checks=[positive_data_acceptance])

        check()
        seen += 1
    assert seen >= 10
