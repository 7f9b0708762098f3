"""Systems and answers by their id."""

from typing import Any

import orjson
from starlette.requests import Request
from starlette.responses import Response

from schemas.faults import Invalid
from schemas.reading import read_system
from schemas.sheet import write_sheet
from service import failures
from service.routes.desk import Desk, invalid
from service.routes.negotiation import choose, matches
from service.routes.replies import ANSWER_PARAMETERS, answer_reply
from service.routes.requests import body_of, is_sheet, json_of, parameters, sheet_of
from service.tasks import summarize


async def post_system(request: Request) -> Response:
    """POST /v1/systems: check a system and store it."""
    desk: Desk = request.app.state.desk
    parameters(request, ("problems",))
    body = await body_of(request, desk.settings.max_body_bytes)
    content_type = request.headers.get("content-type", "")
    if is_sheet(content_type):
        kept = await _keep_sheet(desk, body, content_type)
    else:
        try:
            system = read_system(json_of(body, content_type))
        except Invalid as fault:
            raise invalid(fault) from None
        kept = await desk.keep_system(system)
    return Response(
        orjson.dumps(kept, option=orjson.OPT_SERIALIZE_NUMPY),
        201,
        {"Location": f"/v1/systems/{kept['id']}"},
        media_type="application/json",
    )


async def _keep_sheet(desk: Desk, body: bytes, content_type: str) -> dict[str, Any]:
    """Store a system that stands in a sheet; faults name its rows and columns."""
    sheet = sheet_of(body, content_type)
    try:
        system = sheet.validated(read_system)
    except Invalid as fault:
        raise invalid(fault) from None
    try:
        return await desk.keep_system(system)
    except failures.Invalid as failure:
        raise failures.Invalid(failure.detail, sheet.located(failure.faults)) from None


async def get_system(request: Request) -> Response:
    """GET /v1/systems/{id}: the canonical content of a system, and its summary."""
    desk: Desk = request.app.state.desk
    query = parameters(request, ("problems", "format"))
    identity = request.path_params["identity"]
    content = desk.store.system(identity)
    if content is None:
        raise failures.NotFound("No system with this id is stored here.")
    etag = f'"{identity}"'
    if matches(request.headers.get("if-none-match", ""), etag):
        return Response(status_code=304, headers={"ETag": etag})
    _, system = desk.stored_system(identity)
    offered = {"json": "application/json", "csv": "text/csv"}
    form = choose(query.get("format"), request.headers.get("accept", ""), offered)
    if form == "csv":
        headers = {"ETag": f'"{identity}-csv"', "Vary": "Accept"}
        return Response(write_sheet(system), headers=headers, media_type="text/csv; charset=utf-8")
    document = {"id": identity, "system": orjson.Fragment(content), **summarize(system)}
    body = orjson.dumps(document, option=orjson.OPT_SERIALIZE_NUMPY)
    return Response(body, headers={"ETag": etag}, media_type="application/json")


async def get_result(request: Request) -> Response:
    """GET /v1/results/{id}: an answer in one of its forms."""
    desk: Desk = request.app.state.desk
    query = parameters(request, ANSWER_PARAMETERS)
    found = desk.store.answer(request.path_params["identity"])
    if found is None:
        raise failures.NotFound("No answer with this id is stored here.")
    task, body = found
    reply = answer_reply(body, task, query, request.headers.get("accept", ""))
    return reply.response(request)
