"""A real server on a real loopback socket, ended by its id."""

import os
import subprocess
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import httpx
import pytest

from service.demo import await_ready


@contextmanager
def serving(store: Path, *flags: str) -> Iterator[str]:
    """The address of `wideberth serve` on a free port with its own store."""
    command = [
        sys.executable, "-m", "service.cli", "serve", "--port", "0",
        "--store", f"sqlite:///{store}", *flags,
    ]  # fmt: skip
    kept = {name: value for name, value in os.environ.items() if not name.startswith("WIDEBERTH_")}
    with subprocess.Popen(command, stdout=subprocess.PIPE, text=True, env=kept) as server:
        try:
            assert server.stdout is not None
            address = server.stdout.readline().split()[-1]
            await_ready(address)
            yield address
        finally:
            server.terminate()


@pytest.fixture(scope="session")
def address(tmp_path_factory: pytest.TempPathFactory) -> Iterator[str]:
    """The address of one server for all tests."""
    with serving(tmp_path_factory.mktemp("store") / "answers.db") as found:
        yield found


@pytest.fixture(scope="session")
def client(address: str) -> Iterator[httpx.Client]:
    """A client of it."""
    with httpx.Client(base_url=address, trust_env=False, timeout=60.0) as found:
        yield found
