"""The command `wideberth`."""

import argparse
import ipaddress
import os
import socket
import sys
from collections.abc import Sequence
from contextlib import suppress
from dataclasses import fields

import uvicorn

from service import __version__
from service.settings import Settings, environment_name
from service.store import Store

BACKLOG = 2048  # connections that wait to be taken


def main(arguments: Sequence[str] | None = None) -> int:
    """Run a command; returns the exit status."""
    options = _parser().parse_args(arguments)
    try:
        status: int = options.run(options)
    except ValueError as error:
        print(f"wideberth: {error}", file=sys.stderr)
        return 2
    return status


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="wideberth",
        description="Natural frequencies, mode shapes and separation of machines, over HTTP.",
    )
    parser.add_argument("--version", action="version", version=f"wideberth {__version__}")
    commands = parser.add_subparsers(required=True, metavar="COMMAND")
    serve = commands.add_parser("serve", help="start the service")
    for knob in fields(Settings):
        serve.add_argument(
            f"--{knob.name.replace('_', '-')}",
            type=type(knob.default),
            help=f"{knob.metadata['help']} [{environment_name(knob.name)}; {knob.default}]",
        )
    serve.set_defaults(run=_serve)
    demo = commands.add_parser("demo", help="put the demo machine through a private instance")
    demo.set_defaults(run=_demo)
    openapi = commands.add_parser("openapi", help="print the OpenAPI document")
    openapi.set_defaults(run=_openapi)
    return parser


def _serve(options: argparse.Namespace) -> int:
    given = {knob.name: getattr(options, knob.name) for knob in fields(Settings)}
    settings = Settings.from_environment(os.environ, **given)
    if not _is_loopback(settings.host):
        raise ValueError(
            f"{settings.host} isn't a loopback address, and this version has no keys to protect "
            "it: listen on 127.0.0.1 or ::1, behind a proxy that lets in whom you trust"
        )
    Store(settings.store).close()  # says what is wrong with it before anything listens
    with _listening(settings) as bound:
        port = bound.getsockname()[1]
        host = f"[{settings.host}]" if ":" in settings.host else settings.host
        print(f"wideberth {__version__} on http://{host}:{port}", flush=True)
        os.environ.update(settings.to_environment())
        config = uvicorn.Config(
            "service.app:from_environment",
            factory=True,
            workers=settings.workers,
            log_level="warning",
            server_header=False,
            timeout_graceful_shutdown=5,
        )
        _run(config, bound)
    return 0


def _run(config: uvicorn.Config, bound: socket.socket) -> None:
    if config.workers > 1:
        from uvicorn.supervisors import Multiprocess

        Multiprocess(config, [bound]).run()
    else:
        with suppress(KeyboardInterrupt):
            uvicorn.Server(config).run(sockets=[bound])


def _listening(settings: Settings) -> socket.socket:
    family = socket.AF_INET6 if ":" in settings.host else socket.AF_INET
    bound = socket.socket(family, socket.SOCK_STREAM)
    bound.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, 1)
    try:
        bound.bind((settings.host, settings.port))
        bound.listen(BACKLOG)  # whoever reads the address below may call at once
    except OSError as error:
        bound.close()
        raise ValueError(f"can't listen on {settings.host}:{settings.port}: {error}") from None
    return bound


def _is_loopback(host: str) -> bool:
    if host == "localhost":
        return True
    try:
        return ipaddress.ip_address(host).is_loopback
    except ValueError:
        return False


def _demo(_: argparse.Namespace) -> int:
    from service.demo import demonstrate

    return demonstrate()


def _openapi(_: argparse.Namespace) -> int:
    import orjson

    from service.routes.documents import openapi

    print(orjson.dumps(openapi(), option=orjson.OPT_INDENT_2).decode())
    return 0


if __name__ == "__main__":
    sys.exit(main())
