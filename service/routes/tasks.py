"""POST /v1/<task>, and the GET forms on a stored system."""

from collections.abc import Awaitable, Callable, Mapping
from functools import partial

from pydantic import BaseModel
from starlette.requests import Request
from starlette.responses import Response

from schemas.faults import Invalid
from schemas.reading import read
from service import failures
from service.routes.desk import HIT, Answered, Desk, invalid
from service.routes.posted import located, posted
from service.routes.remembered import key_of
from service.routes.replies import ANSWER_PARAMETERS, Wanted, wanted
from service.routes.requests import accepted, body_of, parameters
from service.tasks import TASKS, GetForm, Task

Endpoint = Callable[[Request], Awaitable[Response]]


def post(task: Task) -> Endpoint:
    """The endpoint that answers a task."""

    async def endpoint(request: Request) -> Response:
        desk: Desk = request.app.state.desk
        body = await body_of(request, desk.settings.max_body_bytes)
        content_type = request.headers.get("content-type", "")
        key = key_of(request, content_type, body)
        known = desk.remembered.get(key)
        if known is not None:
            return known.response(request, **{"Cache-Status": HIT})
        query = parameters(request, ANSWER_PARAMETERS)
        form = wanted(task.name, query, accepted(request))
        reader = partial(read, task.question)
        question, sheet = await posted(body, content_type, reader, task.question)
        with located(sheet):
            answered = await desk.ask(task, question)
        return _sent(request, key, form, answered)

    return endpoint


def get(form: GetForm) -> Endpoint:
    """The endpoint that answers a question that stands in the address."""
    task = TASKS[form.task]
    allowed = (*(parameter.name for parameter in form.parameters), *ANSWER_PARAMETERS)

    async def endpoint(request: Request) -> Response:
        desk: Desk = request.app.state.desk
        key = key_of(request)
        known = desk.remembered.get(key)
        if known is not None:
            return known.response(request, **{"Cache-Status": HIT})
        query = parameters(request, allowed)
        shown = wanted(task.name, query, accepted(request), metrics=task.name == "separation")
        identity = request.path_params["identity"]
        if desk.store.system(identity) is None:
            raise failures.NotFound("No system with this id is stored here.")
        question = _question(task, form, identity, query)
        return _sent(request, key, shown, await desk.ask(task, question))

    return endpoint


def _question(task: Task, form: GetForm, identity: str, query: Mapping[str, str]) -> BaseModel:
    try:
        return read(task.question, {"system_id": identity, **form.question(query)})
    except Invalid as fault:
        raise invalid(form.in_address(fault, query)) from None


def _sent(request: Request, key: bytes, form: Wanted, answered: Answered) -> Response:
    """The answer in its form, remembered for the next who asks the same in the same way."""
    reply = form.reply(answered.body)
    reply.headers["Content-Location"] = f"/v1/results/{answered.identity}"
    desk: Desk = request.app.state.desk
    desk.remembered.put(key, reply)
    return reply.response(request, **{"Cache-Status": answered.status})
