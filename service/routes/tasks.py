"""POST /v1/<task>, and the GET forms on a stored system."""

from collections.abc import Awaitable, Callable
from hashlib import blake2b

from starlette.requests import Request
from starlette.responses import Response

from schemas.faults import Invalid
from schemas.reading import read
from service import failures
from service.routes.desk import Answered, Desk, invalid
from service.routes.replies import ANSWER_PARAMETERS, answer_reply
from service.routes.requests import body_of, is_sheet, json_of, parameters, sheet_of
from service.tasks import TASKS, GetForm, Task

Endpoint = Callable[[Request], Awaitable[Response]]
HIT, MISS = "wideberth; hit", "wideberth; fwd=miss; stored"


def post(task: Task) -> Endpoint:
    """The endpoint that answers a task."""

    async def endpoint(request: Request) -> Response:
        desk: Desk = request.app.state.desk
        body = await body_of(request, desk.settings.max_body_bytes)
        accept = request.headers.get("accept", "")
        content_type = request.headers.get("content-type", "")
        key = _key(task.name, request.url.query, accept, content_type, body)
        known = desk.remembered.get(key)
        if known is not None:
            return known.response(request, **{"Cache-Status": HIT})
        query = parameters(request, ANSWER_PARAMETERS)
        if is_sheet(content_type):
            answered = await _ask_with_sheet(desk, task, body, content_type)
        else:
            question = desk.question(task, json_of(body, content_type))
            answered = await desk.ask(task, question)
        reply = answer_reply(answered.body, task.name, query, accept)
        reply.headers["Content-Location"] = f"/v1/results/{answered.identity}"
        desk.remembered.put(key, reply)
        return reply.response(request, **{"Cache-Status": HIT if answered.hit else MISS})

    return endpoint


async def _ask_with_sheet(desk: Desk, task: Task, body: bytes, content_type: str) -> Answered:
    """The answer to a question that stands in a sheet; faults name its rows and columns."""
    sheet = sheet_of(body, content_type, task.question)
    try:
        question = sheet.validated(lambda raw: read(task.question, raw))
    except Invalid as fault:
        raise invalid(fault) from None
    try:
        return await desk.ask(task, question)
    except failures.Invalid as failure:
        raise failures.Invalid(failure.detail, sheet.located(failure.faults)) from None


def _key(*parts: str | bytes) -> bytes:
    """A digest of everything that decides the reply."""
    digest = blake2b(digest_size=20)
    for part in parts:
        data = part.encode() if isinstance(part, str) else part
        digest.update(b"%d:" % len(data))
        digest.update(data)
    return digest.digest()


def get(form: GetForm) -> Endpoint:
    """The endpoint that answers a question that stands in the address."""
    task = TASKS[form.task]
    known = (*(parameter.name for parameter in form.parameters), *ANSWER_PARAMETERS)

    async def endpoint(request: Request) -> Response:
        desk: Desk = request.app.state.desk
        identity = request.path_params["identity"]
        query = parameters(request, known)
        if desk.store.system(identity) is None:
            raise failures.NotFound("No system with this id is stored here.")
        try:
            raw = form.question(query)
        except Invalid as fault:
            raise invalid(fault) from None
        question = desk.question(task, {"system_id": identity, **raw})
        answered = await desk.ask(task, question)
        accept = request.headers.get("accept", "")
        reply = answer_reply(
            answered.body, task.name, query, accept, metrics=task.name == "separation"
        )
        reply.headers["Content-Location"] = f"/v1/results/{answered.identity}"
        return reply.response(request, **{"Cache-Status": HIT if answered.hit else MISS})

    return endpoint
