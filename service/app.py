"""Puts the application together; nothing else."""

import gc
import logging
from collections.abc import AsyncIterator, Sequence
from contextlib import asynccontextmanager
from os import environ

from fastapi import FastAPI
from starlette.exceptions import HTTPException
from starlette.requests import ClientDisconnect, Request
from starlette.responses import Response
from starlette.routing import BaseRoute
from threadpoolctl import threadpool_limits

from service import __version__
from service.failures import Failure, Internal, from_status
from service.routes import routes
from service.routes.desk import Desk
from service.routes.replies import problem_response
from service.settings import Settings
from service.store import Store

log = logging.getLogger("wideberth")


def application(settings: Settings, more_routes: Sequence[BaseRoute] = ()) -> FastAPI:
    """The service with these settings; `more_routes` stand beside its own."""

    @asynccontextmanager
    async def lifespan(app: FastAPI) -> AsyncIterator[None]:
        # More threads buy nothing below a few hundred degrees of freedom, and take turns with
        # the other server processes.
        with threadpool_limits(1), Store(settings.store) as store:
            app.state.desk = Desk(store, settings)
            # What is here now stays: looking through it again and again takes a good part of the
            # time of a small question.
            gc.collect()
            gc.freeze()
            yield

    app = FastAPI(
        title="Wideberth",
        version=__version__,
        openapi_url=None,
        docs_url=None,
        redoc_url=None,
        redirect_slashes=False,
        lifespan=lifespan,
        exception_handlers={
            Failure: _failed,
            HTTPException: _refused,
            ClientDisconnect: _gone,
            Exception: _broke,
        },
    )
    app.router.routes[:] = [*routes(), *more_routes]
    return app


def from_environment() -> FastAPI:
    """The service as the environment sets it: what each server process starts."""
    return application(Settings.from_environment(environ))


async def _failed(request: Request, error: Exception) -> Response:
    assert isinstance(error, Failure)
    return problem_response(request, error)


async def _refused(request: Request, error: Exception) -> Response:
    """What the framework refuses: unknown paths and methods."""
    assert isinstance(error, HTTPException)
    headers = dict(error.headers or {})
    if "Allow" in headers:
        headers["Allow"] = ", ".join(sorted({*headers["Allow"].split(", "), "OPTIONS"}))
        if request.method == "OPTIONS":
            return Response(status_code=204, headers=headers)
    failure = from_status(error.status_code, _detail(error.status_code, headers), headers)
    return problem_response(request, failure)


def _detail(status: int, headers: dict[str, str]) -> str:
    if status == 404:
        return "No such path: /docs lists those that there are."
    return f"Allowed here: {headers['Allow']}." if "Allow" in headers else "The request is refused."


async def _gone(*_: object) -> Response:
    """The caller left while still sending: nobody reads this."""
    return Response(status_code=400)


async def _broke(request: Request, error: Exception) -> Response:
    log.error("%s %s failed", request.method, request.scope["path"], exc_info=error)
    return problem_response(request, Internal("The service failed; its log says why."))
