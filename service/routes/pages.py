"""Health, and the pages that people read."""

from starlette.requests import Request
from starlette.responses import JSONResponse, Response

from service import failures
from service.forms.html import render
from service.routes.desk import Desk
from service.routes.documents import openapi
from service.routes.replies import page
from service.routes.requests import parameters

FRESH = {"Cache-Control": "no-store"}


async def live(request: Request) -> Response:
    """GET /health/live: the process answers."""
    parameters(request, ())
    return JSONResponse({"status": "live"}, headers=FRESH)


async def ready(request: Request) -> Response:
    """GET /health/ready: the store answers too."""
    parameters(request, ())
    desk: Desk = request.app.state.desk
    if not desk.store.is_ready():
        raise failures.Unavailable("The store doesn't answer.")
    return JSONResponse({"status": "ready"}, headers=FRESH)


async def document(request: Request) -> Response:
    """GET /openapi.json."""
    parameters(request, ())
    return JSONResponse(openapi())


async def problem(request: Request) -> Response:
    """GET /problems/{name}: what a kind of problem means."""
    parameters(request, ())
    kind = failures.FAILURES.get(request.path_params["name"])
    if kind is None:
        raise failures.NotFound("There is no such kind of problem.")
    return page(render("problem.html", title=kind.title(), kind=kind))


async def start(request: Request) -> Response:
    """GET /: what this is and where to read on."""
    parameters(request, ())
    return page(render("start.html", title="Wideberth", tasks=openapi()["paths"]))


async def docs(request: Request) -> Response:
    """GET /docs: the OpenAPI document as a page."""
    parameters(request, ())
    return page(render("docs.html", title="Wideberth: what can be asked", api=openapi()))
