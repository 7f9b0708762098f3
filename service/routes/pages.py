"""Health, and the pages that people read."""

from starlette.requests import Request
from starlette.responses import HTMLResponse, JSONResponse, Response

from service import failures
from service.forms.html import render
from service.routes.desk import Desk
from service.routes.documents import openapi
from service.routes.requests import parameters


async def live(request: Request) -> Response:
    """GET /health/live: the process answers."""
    parameters(request, ())
    return JSONResponse({"status": "live"})


async def ready(request: Request) -> Response:
    """GET /health/ready: the store answers too."""
    parameters(request, ())
    desk: Desk = request.app.state.desk
    is_ready = desk.store.is_ready()
    return JSONResponse({"status": "ready" if is_ready else "not ready"}, 200 if is_ready else 503)


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
    return HTMLResponse(render("problem.html", title=kind.title(), kind=kind))


async def start(request: Request) -> Response:
    """GET /: what this is and where to read on."""
    parameters(request, ())
    return HTMLResponse(render("start.html", title="Wideberth", tasks=openapi()["paths"]))


async def docs(request: Request) -> Response:
    """GET /docs: the OpenAPI document as a page."""
    parameters(request, ())
    return HTMLResponse(render("docs.html", title="Wideberth: what can be asked", api=openapi()))
