"""Systems and answers by their id."""

from collections.abc import Mapping

import orjson
from starlette.requests import Request
from starlette.responses import Response

from schemas.reading import read_system
from schemas.sheet import write_sheet
from service import failures
from service.routes.desk import Desk
from service.routes.negotiation import choose
from service.routes.posted import located, posted
from service.routes.remembered import key_of
from service.routes.replies import ANSWER_PARAMETERS, JSON, Reply, picked, picks, reply, wanted
from service.routes.requests import accepted, body_of, parameters


async def post_system(request: Request) -> Response:
    """POST /v1/systems: check a system and store it."""
    desk: Desk = request.app.state.desk
    parameters(request, ("problems",))
    body = await body_of(request, desk.settings.max_body_bytes)
    system, sheet = await posted(body, request.headers.get("content-type", ""), read_system)
    with located(sheet):
        kept = await desk.keep_system(system)
    return Response(
        orjson.dumps(kept, option=orjson.OPT_SERIALIZE_NUMPY),
        201,
        {"Location": f"/v1/systems/{kept['id']}"},
        media_type=JSON,
    )


async def get_system(request: Request) -> Response:
    """GET /v1/systems/{id}: a system and its summary, as JSON; as a sheet; or one value of it."""
    desk: Desk = request.app.state.desk
    key = key_of(request)
    ready = desk.remembered.get(key)
    if ready is None:
        query = parameters(request, ("format", "pick", "problems"))
        form = "json" if picks(query) else _form(request, query)
        ready = await _system(desk, request.path_params["identity"], form, query.get("pick"))
        desk.remembered.put(key, ready)
    return ready.response(request)


def _form(request: Request, query: Mapping[str, str]) -> str:
    return choose(query.get("format"), accepted(request), {"json": JSON, "csv": "text/csv"})


async def _system(desk: Desk, identity: str, form: str, pick: str | None) -> Reply:
    if desk.store.system(identity) is None:
        raise failures.NotFound("No system with this id is stored here.")
    content, system = desk.stored_system(identity)
    if form == "csv":
        return reply(write_sheet(system).encode(), "text/csv", "csv")
    summary = await desk.summary(system)
    document = {"id": identity, "system": orjson.Fragment(content), **summary}
    body = orjson.dumps(document, option=orjson.OPT_SERIALIZE_NUMPY)
    if pick is None:
        return reply(body, JSON, "json")
    return reply(picked(orjson.loads(body), pick).encode(), "text/plain", "pick")


async def get_result(request: Request) -> Response:
    """GET /v1/results/{id}: an answer in one of its forms."""
    desk: Desk = request.app.state.desk
    query = parameters(request, ANSWER_PARAMETERS)
    found = desk.store.answer(request.path_params["identity"])
    if found is None:
        raise failures.NotFound("No answer with this id is stored here.")
    task, body = found
    return wanted(task, query, accepted(request)).reply(body).response(request)
