"""What was posted, as JSON or as a sheet, and where in it a fault lies."""

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import Any, TypeVar

from pydantic import BaseModel

from schemas.faults import Invalid, Malformed
from schemas.sheet import MEDIA_TYPES, Sheet, read_sheet
from service import failures
from service.engine import in_thread
from service.routes.desk import invalid
from service.routes.requests import json_of

Model = TypeVar("Model")


LARGE = 100_000  # bytes: reading more takes longer than others should wait


async def posted(
    body: bytes,
    content_type: str,
    read: Callable[[Any], Model],
    question: type[BaseModel] | None = None,
) -> tuple[Model, Sheet | None]:
    """What `read` makes of a body, and the sheet if it was one.

    `question` is the model of a task's question; without it a sheet is read as a system.

    Raises
    ------
    failures.UnsupportedMedia, failures.Malformed, failures.Invalid
    """

    def work() -> tuple[Model, Sheet | None]:
        sheet = _sheet(body, content_type, question)
        try:
            if sheet is None:
                return read(json_of(body, content_type)), None
            return sheet.validated(read), sheet
        except Invalid as fault:
            raise invalid(fault) from None

    return work() if len(body) <= LARGE else await in_thread(work)


def _sheet(body: bytes, content_type: str, question: type[BaseModel] | None) -> Sheet | None:
    if content_type.partition(";")[0].strip().lower() not in MEDIA_TYPES:
        return None
    try:
        return read_sheet(body, content_type, question)
    except Malformed as fault:
        raise failures.Malformed("The sheet can't be read.", fault.faults) from None


@contextmanager
def located(sheet: Sheet | None) -> Iterator[None]:
    """Inside, faults that come to light later are given their row and column too."""
    try:
        yield
    except failures.Invalid as failure:
        if sheet is None:
            raise
        raise failures.Invalid(failure.detail, sheet.located(failure.faults)) from None
