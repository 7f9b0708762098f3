"""What POST /v1/modes costs beside an endpoint that only validates the same body.

One server process, one keep-alive connection over a plain socket, requests of all kinds taken in
turn. Run: python -m tests.bench.http
"""

import json
import os
import socket
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path
from typing import Any

import uvicorn
from starlette.requests import Request
from starlette.responses import Response
from starlette.routing import Route

from schemas.modes import ModesQuestion
from schemas.reading import parse_json, read

ROUNDS = 1500
WARM_UP = 200


async def echo(request: Request) -> Response:
    """Validate the body as a question and send a small object back."""
    read(ModesQuestion, parse_json(await request.body()))
    return Response(b'{"ok":true}', media_type="application/json")


def serve(store: str, port: int) -> None:
    """The service with the echo endpoint beside its own."""
    from service.app import application
    from service.settings import Settings

    app = application(Settings(store=store), [Route("/echo", echo, methods=["POST"])])
    uvicorn.Server(uvicorn.Config(app, port=port, log_level="warning")).run()


def block(number: int) -> bytes:
    """A rigid body with six degrees of freedom on four mounts, another one for each number."""
    mounts = [
        {
            "kind": "spring",
            "name": f"mount {place}",
            "between": ["block", "ground"],
            "at": [x, y, -0.3],
            "stiffness": {"x": 9e5, "y": 7e5, "z": 2.1e6 + number},
        }
        for place, (x, y) in enumerate(((0.7, 0.4), (0.7, -0.4), (-0.7, 0.4), (-0.7, -0.4)))
    ]
    body: dict[str, Any] = {
        "name": "block",
        "mass": 850.0,
        "inertia": {"xx": 60.0, "yy": 140.0, "zz": 170.0},
    }
    system = {"kind": "bodies", "name": "block", "bodies": [body], "connections": mounts}
    return json.dumps({"system": system, "count": 6}).encode()


class Connection:
    """A keep-alive connection that reads replies by their Content-Length."""

    def __init__(self, port: int) -> None:
        self.socket = socket.create_connection(("127.0.0.1", port), timeout=30.0)
        self.socket.setsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY, 1)

    def post(self, path: str, body: bytes) -> float:
        """Seconds that a POST takes; the reply must be 200."""
        head = f"POST {path} HTTP/1.1\r\nHost: bench\r\nContent-Type: application/json\r\n"
        message = f"{head}Content-Length: {len(body)}\r\n\r\n".encode() + body
        start = time.perf_counter()
        self.socket.sendall(message)
        reply = b""
        while b"\r\n\r\n" not in reply:
            reply += self.socket.recv(262_144)
        header, _, rest = reply.partition(b"\r\n\r\n")
        length = int(header.lower().split(b"content-length: ")[1].split(b"\r\n")[0])
        while len(rest) < length:
            rest += self.socket.recv(262_144)
        taken = time.perf_counter() - start
        if not header.startswith(b"HTTP/1.1 200"):
            raise RuntimeError(rest.decode())
        return taken


def free_port() -> int:
    """A port that nobody listens on."""
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        port: int = probe.getsockname()[1]
        return port


def main() -> None:
    """Print the median times and their ratios."""
    with tempfile.TemporaryDirectory() as folder:
        port = free_port()
        store = f"sqlite:///{Path(folder) / 'bench.db'}"
        command = [sys.executable, "-m", "tests.bench.http", "serve", store, str(port)]
        with subprocess.Popen(command, env=dict(os.environ)) as server:
            try:
                measure(port)
            finally:
                server.terminate()


def await_server(port: int) -> Connection:
    """A connection to the server, which may still be starting."""
    for _ in range(400):
        try:
            return Connection(port)
        except OSError:
            time.sleep(0.05)
    raise RuntimeError("the server didn't start")


def measure(port: int) -> None:
    """Take the three kinds of request in turn."""
    connection = await_server(port)
    times: dict[str, list[float]] = {"validate only": [], "new question": [], "repeated": []}
    again = block(-1)
    connection.post("/v1/modes", again)
    for number in range(WARM_UP + ROUNDS):
        taken = {
            "validate only": connection.post("/echo", block(number)),
            "new question": connection.post("/v1/modes", block(number)),
            "repeated": connection.post("/v1/modes", again),
        }
        if number >= WARM_UP:
            for kind, seconds in taken.items():
                times[kind].append(seconds)
    medians = {kind: statistics.median(values) for kind, values in times.items()}
    for kind, median in medians.items():
        ratio = median / medians["validate only"]
        print(f"{kind:>14}: p50 {1e3 * median:.3f} ms, {ratio:.2f} x validate only")


if __name__ == "__main__":
    if sys.argv[1:2] == ["serve"]:
        serve(sys.argv[2], int(sys.argv[3]))
    else:
        main()
