"""`wideberth demo`: a private instance, the demo machine, its separation."""

import os
import subprocess
import sys
import tempfile
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import httpx

MACHINE = Path(__file__).parent.parent / "deploy" / "examples" / "induced-draught-fan.json"
START_SECONDS = 60.0


def demonstrate() -> int:
    """Put the demo machine through separation and print the answer; returns the exit status."""
    with tempfile.TemporaryDirectory() as folder, _instance(Path(folder)) as address:
        with httpx.Client(base_url=address, timeout=60.0, trust_env=False) as client:
            reply = client.post(
                "/v1/separation",
                content=MACHINE.read_bytes(),
                headers={"Content-Type": "application/json", "Accept": "text/plain"},
            )
        print(reply.text)
        if reply.status_code != 200:
            return 1
    command = Path(sys.executable).parent / "wideberth"
    print(f"To start the service for real:  {command} serve")
    print("Then read http://127.0.0.1:8080/docs, or post a machine of your own:")
    print(
        "  curl http://127.0.0.1:8080/v1/separation -H 'Content-Type: application/json' "
        f"-d @{MACHINE}"
    )
    return 0


@contextmanager
def _instance(folder: Path) -> Iterator[str]:
    """A server on a free loopback port with a store of its own; ended on leaving."""
    command = [
        sys.executable, "-m", "service.cli", "serve", "--port", "0",
        "--store", f"sqlite:///{folder / 'demo.db'}",
    ]  # fmt: skip
    kept = {name: value for name, value in os.environ.items() if not name.startswith("WIDEBERTH_")}
    with subprocess.Popen(command, stdout=subprocess.PIPE, text=True, env=kept) as server:  # noqa: S603
        try:
            assert server.stdout is not None
            address = server.stdout.readline().split()[-1:]
            if not address:
                raise ValueError("the private instance didn't start")
            await_ready(address[0])
            yield address[0]
        finally:
            server.terminate()


def await_ready(address: str) -> None:
    """Return when the service at `address` is ready; ValueError where it takes too long."""
    end = time.monotonic() + START_SECONDS
    with httpx.Client(base_url=address, trust_env=False) as client:
        while time.monotonic() < end:
            try:
                if client.get("/health/ready").status_code == 200:
                    return
            except httpx.TransportError:
                time.sleep(0.05)
    raise ValueError(f"the private instance wasn't ready within {START_SECONDS:g} s")
