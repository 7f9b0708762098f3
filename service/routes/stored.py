"""Systems and answers by their id."""

import orjson
from starlette.requests import Request
from starlette.responses import Response

from service import failures
from service.routes.desk import Desk
from service.routes.negotiation import matches
from service.routes.replies import ANSWER_PARAMETERS, answer_reply
from service.routes.requests import body_of, json_of, parameters
from service.tasks import summarize


async def post_system(request: Request) -> Response:
    """POST /v1/systems: check a system and store it."""
    desk: Desk = request.app.state.desk
    parameters(request, ("problems",))
    body = await body_of(request, desk.settings.max_body_bytes)
    kept = await desk.keep_system(json_of(body, request.headers.get("content-type", "")))
    return Response(
        orjson.dumps(kept, option=orjson.OPT_SERIALIZE_NUMPY),
        201,
        {"Location": f"/v1/systems/{kept['id']}"},
        media_type="application/json",
    )


async def get_system(request: Request) -> Response:
    """GET /v1/systems/{id}: the canonical content of a system, and its summary."""
    desk: Desk = request.app.state.desk
    parameters(request, ("problems",))
    identity = request.path_params["identity"]
    content = desk.store.system(identity)
    if content is None:
        raise failures.NotFound("No system with this id is stored here.")
    etag = f'"{identity}"'
    if matches(request.headers.get("if-none-match", ""), etag):
        return Response(status_code=304, headers={"ETag": etag})
    _, system = desk.stored_system(identity)
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
