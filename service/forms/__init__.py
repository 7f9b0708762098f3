"""The forms of an answer: one module each, all driven by the tables of its task."""

from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any, Protocol

from service.forms import csv, html, metrics, text


class Table(Protocol):
    """A table of an answer: title, column names, and rows from the answer."""

    @property
    def title(self) -> str: ...
    @property
    def columns(self) -> tuple[str, ...]: ...
    @property
    def rows(self) -> Callable[[Mapping[str, Any]], Iterable[Sequence[object]]]: ...


@dataclass(frozen=True, slots=True)
class Form:
    """A form that an answer can take: its media type and how it is written.

    `write` takes the answer and its tables by name, the one that was asked for first.
    """

    media_type: str
    write: Callable[[Mapping[str, Any], Mapping[str, Table]], str]


FORMS: dict[str, Form] = {
    "csv": Form("text/csv", csv.write),
    "html": Form("text/html", html.write),
    "text": Form("text/plain", text.write),
}
METRICS = Form("application/openmetrics-text", metrics.write)

__all__ = ["FORMS", "METRICS", "Form", "Table"]
