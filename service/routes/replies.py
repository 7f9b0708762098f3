"""Replies: an answer in a form, a problem, a picked value."""

import re
from collections.abc import Mapping
from dataclasses import dataclass
from hashlib import blake2b
from typing import Any
from urllib.parse import unquote

import orjson
from starlette.requests import Request
from starlette.responses import Response

from schemas.faults import Fault
from service import failures
from service.forms import FORMS, METRICS
from service.forms.csv import rows_to_csv
from service.routes.negotiation import choose, matches
from service.tasks import TASKS

ANSWER_PARAMETERS = ("format", "pick", "table", "problems")
JSON = "application/json"


@dataclass(frozen=True, slots=True)
class Reply:
    """A reply that can be sent again: body and headers, of which ETag is one."""

    body: bytes
    headers: dict[str, str]

    def response(self, request: Request, **more: str) -> Response:
        """Send it, or 304 where the caller has it already."""
        headers = {**self.headers, **more}
        known = request.headers.get("if-none-match")
        if known is not None and matches(known, self.headers["ETag"]):
            headers.pop("Content-Type")
            return Response(status_code=304, headers=headers)
        return Response(self.body, headers=headers)


def answer_reply(
    body: bytes, task: str, query: Mapping[str, str], accept: str, *, metrics: bool = False
) -> Reply:
    """An answer in the form that the caller asks for."""
    offered = {"json": JSON} | {name: form.media_type for name, form in FORMS.items()}
    if metrics:
        offered["openmetrics"] = METRICS.media_type
    if "pick" in query:
        if query.get("format", "text") not in ("text", "json"):
            raise failures.NotAcceptable("A picked value is text.")
        return _reply(picked(orjson.loads(body), query["pick"]).encode(), "text/plain", "pick")
    name = choose(query.get("format"), accept, offered)
    if name == "json":
        return _reply(body, JSON, "json")
    form = METRICS if name == "openmetrics" else FORMS[name]
    answer = orjson.loads(body)
    return _reply(form.write(answer, _tables(task, query)).encode(), form.media_type, name)


def _tables(task: str, query: Mapping[str, str]) -> dict[str, Any]:
    tables = dict(TASKS[task].tables)
    wanted = query.get("table")
    if wanted is None:
        return tables
    if wanted not in tables:
        raise failures.NotFound(f"Tables of this answer: {', '.join(tables)}.")
    return {wanted: tables[wanted]}


def _reply(body: bytes, media_type: str, form: str) -> Reply:
    etag = f'"{blake2b(body, digest_size=12).hexdigest()}-{form}"'
    text = "; charset=utf-8" if media_type.startswith(("text/", "application/openm")) else ""
    version = "; version=1.0.0" if "openmetrics" in media_type else ""
    return Reply(
        body,
        {
            "Content-Type": media_type + version + text,
            "ETag": etag,
            "Vary": "Accept",
            "Cache-Control": "private, max-age=0, must-revalidate",
        },
    )


_INDEX = re.compile(r"0|[1-9][0-9]*")


def picked(document: Any, pointer: str) -> str:
    """The value at an RFC 6901 pointer, as text: words as they are, everything else as JSON."""
    value = document
    if pointer and not pointer.startswith("/"):
        raise failures.NotFound(f"'{pointer[:200]}' isn't a JSON pointer: it starts with /.")
    for token in pointer.split("/")[1:]:
        key = token.replace("~1", "/").replace("~0", "~")
        if isinstance(value, dict) and key in value:
            value = value[key]
        elif isinstance(value, list) and _INDEX.fullmatch(key) and int(key) < len(value):
            value = value[int(key)]
        else:
            raise failures.NotFound(f"The answer has nothing at '{pointer[:200]}'.")
    return value if isinstance(value, str) else orjson.dumps(value).decode()


def problem_response(request: Request, failure: failures.Failure) -> Response:
    """Problem details, or with ?problems=table a table that a macro can read."""
    headers = {**failure.headers, "Cache-Control": "no-store"}
    if request.query_params.get("problems") == "table":
        return Response(_problem_table(failure), 200, headers, media_type="text/csv; charset=utf-8")
    body = orjson.dumps(failure.problem(unquote(request.url.path)))
    return Response(body, failure.status, headers, media_type="application/problem+json")


def _problem_table(failure: failures.Failure) -> str:
    faults = failure.listed() or [Fault("", failure.detail)]
    rows = [[failure.name, f.row, f.column, f.pointer, f.detail] for f in faults]
    return rows_to_csv(("problem", "row", "column", "pointer", "detail"), rows)
