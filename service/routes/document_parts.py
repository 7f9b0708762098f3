"""Recurring parts of the OpenAPI document: parameters, headers, media types, problems."""

from typing import Any

from pydantic import BaseModel

from schemas.problem import Problem
from schemas.sheet import MEDIA_TYPES
from service import failures
from service.forms import FORMS
from service.tasks import QueryParameter

Document = dict[str, Any]
REFERENCE = "#/components/schemas/{model}"
ALWAYS = (400, 404, 405, 500, 503)
HEADERS = {
    "Allow": "The methods that are allowed here.",
    "Cache-Status": "Whether it came from the store (RFC 9211).",
    "Content-Location": "Where the answer is stored.",
    "ETag": "Identity of this form of it.",
    "Location": "Where the system is stored.",
    "Retry-After": "Seconds to wait before asking again.",
}
OF_STATUS = {405: ("Allow",), 503: ("Retry-After",)}
FORMAT = QueryParameter("format", "Form of the answer, instead of Accept (no unit).", "json")
PICK = QueryParameter("pick", "An RFC 6901 pointer: its value alone, as text (no unit).", "/id")
TABLE = QueryParameter("table", "Which table, for csv, html and text (no unit).", "")
PROBLEMS = QueryParameter(
    "problems", "`table`: a fault comes back as 200 text/csv, for macros (no unit).", "table"
)
IF_NONE_MATCH = {
    "name": "If-None-Match",
    "in": "header",
    "required": False,
    "description": "ETags that the caller has: 304 if one of them still holds (no unit).",
    "schema": {"type": "string"},
}
NOT_CHANGED = {"304": {"description": "Not changed."}}
ALL_FORMS = (FORMAT, PICK, TABLE, PROBLEMS)
SHEET = (
    "A spreadsheet's used range. A row whose first cell is [system], [bodies], [connections], "
    "[operation], [excitations], [options] or the like opens a block; the next row is its header, "
    "then comes one row per item. Columns are the fields of the JSON, `.` leads inwards, a unit "
    "may stand in the header (`mass [lb]`) or in the cell, several names in a cell are separated "
    "by |. Cells are separated by commas, semicolons or tabs; a decimal comma is read with the "
    "latter two."
)


def headers(*names: str) -> Document:
    """Headers of a reply, each described."""
    return {name: {"description": HEADERS[name], "schema": {"type": "string"}} for name in names}


def sheets(example: str) -> Document:
    """The media types of a sheet, with one as an example."""
    commas, tabs = MEDIA_TYPES
    return {
        commas: {"schema": {"type": "string", "description": SHEET}, "example": example},
        tabs: {"schema": {"type": "string", "description": f"{SHEET} Separated by tabs."}},
    }


def other_forms() -> Document:
    """The media types of an answer beside JSON."""
    return {form.media_type: {"schema": {"type": "string"}} for form in FORMS.values()}


def json_of_model(model: type[BaseModel], example: Any) -> Document:
    """The object, or with `?problems=table` the table of its faults."""
    content: Document = {"schema": reference(model)}
    if example is not None:
        content["example"] = example
    return {"content": {"application/json": content, "text/csv": {"schema": {"type": "string"}}}}


def reference(model: type[BaseModel]) -> Document:
    """A reference to the schema of a model."""
    return {"$ref": REFERENCE.format(model=model.__name__)}


def problems(*statuses: int) -> Document:
    """The replies of every path when a request fails, and those of further `statuses`."""
    return {
        str(status): {
            "description": failures.from_status(status, "").title() + ".",
            "headers": headers(*OF_STATUS.get(status, ())),
            "content": {"application/problem+json": {"schema": reference(Problem)}},
        }
        for status in sorted({*ALWAYS, *statuses})
    }


def identity() -> Document:
    """The id in a path."""
    return {
        "name": "identity",
        "in": "path",
        "required": True,
        "description": "The id that the service gave (no unit).",
        "schema": {"type": "string"},
    }


def queries(*parameters: QueryParameter) -> list[Document]:
    """Parameters of an address, none of them needed."""
    return [
        {
            "name": parameter.name,
            "in": "query",
            "required": False,
            "description": parameter.description,
            "schema": {"type": "string"},
            **({"example": parameter.example} if parameter.example else {}),
        }
        for parameter in parameters
    ]
