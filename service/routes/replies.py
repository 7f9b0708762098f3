"""Replies: an answer in a form, a problem, a picked value."""

import re
from collections.abc import Mapping
from dataclasses import dataclass
from hashlib import blake2b
from typing import Any

import orjson
from starlette.requests import Request
from starlette.responses import HTMLResponse, Response

from schemas.faults import Fault
from service import failures
from service.forms import FORMS, METRICS
from service.forms.csv import rows_to_csv
from service.routes.negotiation import choose, matches
from service.tasks import TASKS, Table

ANSWER_PARAMETERS = ("format", "pick", "table", "problems")
JSON = "application/json"
PAGE = {
    "Content-Security-Policy": "default-src 'none'; style-src 'unsafe-inline'; "
    "base-uri 'none'; form-action 'none'; frame-ancestors 'none'",
    "Referrer-Policy": "no-referrer",
}


@dataclass(frozen=True, slots=True)
class Reply:
    """A reply that can be sent again: body and headers, of which ETag is one."""

    body: bytes
    headers: dict[str, str]

    def response(self, request: Request, **more: str) -> Response:
        """Send it, or 304 where the caller has it already."""
        headers = {**self.headers, **more}
        if matches(request.headers.getlist("if-none-match"), self.headers["ETag"]):
            headers.pop("Content-Type")
            return Response(status_code=304, headers=headers)
        return Response(self.body, headers=headers)


@dataclass(frozen=True, slots=True)
class Wanted:
    """The form in which a caller wants an answer, settled before anything is computed.

    Attributes
    ----------
    form : json, a name in FORMS, openmetrics, or pick
    tables : the tables of the answer to show, by name
    pick : the pointer to a single value
    """

    form: str
    tables: Mapping[str, Table]
    pick: str = ""

    def reply(self, body: bytes) -> Reply:
        """The answer in this form.

        Raises
        ------
        failures.NotFound
            The answer has nothing to pick there.
        """
        if self.form == "json":
            return reply(body, JSON, "json")
        answer = orjson.loads(body)
        if self.form == "pick":
            return reply(picked(answer, self.pick).encode(), "text/plain", "pick")
        form = METRICS if self.form == "openmetrics" else FORMS[self.form]
        return reply(form.write(answer, self.tables).encode(), form.media_type, self.form)


def wanted(task: str, query: Mapping[str, str], accept: str, *, metrics: bool = False) -> Wanted:
    """What the parameters and Accept ask for.

    Raises
    ------
    failures.NotAcceptable, failures.NotFound, failures.InvalidParameter
    """
    tables = dict(TASKS[task].tables)
    if picks(query):
        form = "pick"
    else:
        offered = {"json": JSON} | {name: form.media_type for name, form in FORMS.items()}
        if metrics:
            offered["openmetrics"] = METRICS.media_type
        form = choose(query.get("format"), accept, offered)
    if "table" in query:
        tables = _table(query["table"], tables, form)
    return Wanted(form, tables, query.get("pick", ""))


def picks(query: Mapping[str, str]) -> bool:
    """Whether a single value is asked for, which is always text.

    Raises
    ------
    failures.NotAcceptable
    """
    if "pick" in query and query.get("format", "text") not in ("text", "json"):
        raise failures.NotAcceptable("A picked value is text.")
    return "pick" in query


def _table(name: str, tables: Mapping[str, Table], form: str) -> dict[str, Table]:
    """The one table that is asked for."""
    if form not in FORMS:
        fault = Fault("/table", f"goes with the forms {', '.join(FORMS)} only")
        raise failures.InvalidParameter("There is no table in this form.", [fault])
    if name not in tables:
        raise failures.NotFound(f"Tables of this answer: {', '.join(tables)}.")
    return {name: tables[name]}


def reply(body: bytes, media_type: str, form: str) -> Reply:
    """A reply whose ETag is a digest of its bytes."""
    etag = f'"{blake2b(body, digest_size=12).hexdigest()}-{form}"'
    text = "; charset=utf-8" if media_type.startswith(("text/", "application/openm")) else ""
    version = "; version=1.0.0" if "openmetrics" in media_type else ""
    headers = {
        "Content-Type": media_type + version + text,
        "ETag": etag,
        "Vary": "Accept",
        "Cache-Control": "private, max-age=0, must-revalidate",
        "X-Content-Type-Options": "nosniff",
    }
    return Reply(body, headers | PAGE if form == "html" else headers)


def page(html: str) -> Response:
    """A page that may neither run nor fetch anything."""
    return HTMLResponse(html, headers=PAGE)


_INDEX = re.compile(r"0|[1-9][0-9]{0,8}")


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
    headers = {
        **failure.headers, "Cache-Control": "no-store", "X-Content-Type-Options": "nosniff",
    }  # fmt: skip
    if request.query_params.get("problems") == "table":
        headers["Content-Type"] = "text/csv; charset=utf-8"
        return Response(_problem_table(failure), 200, headers)
    instance = request.scope["raw_path"].decode("ascii", "replace")
    body = orjson.dumps(failure.problem(instance))
    return Response(body, failure.status, headers, media_type="application/problem+json")


def _problem_table(failure: failures.Failure) -> str:
    faults = failure.listed() or [Fault("", failure.detail)]
    rows = [
        [failure.name, fault.row, fault.column, fault.pointer, fault.detail] for fault in faults
    ]
    return rows_to_csv(("problem", "row", "column", "pointer", "detail"), rows)
