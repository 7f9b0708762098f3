"""Every way in which a request can fail.

    Failure
    ├── Malformed            400
    ├── InvalidParameter     400
    ├── NotFound             404
    ├── MethodNotAllowed     405
    ├── NotAcceptable        406
    ├── TooLarge             413
    ├── UnsupportedMedia     415
    ├── Invalid              422
    ├── Internal             500
    └── Unavailable          503

The first line of a docstring is the title of the problem, the rest what its page says.
"""

from collections.abc import Mapping, Sequence
from dataclasses import replace
from inspect import cleandoc
from typing import ClassVar

from schemas.faults import Fault

MOST_FAULTS = 100
LONGEST = 500  # characters of a pointer or a detail: a caller's own megabytes aren't sent back


class Failure(Exception):
    """A request failed.

    Parameters
    ----------
    detail : what went wrong this time
    faults : each with a pointer into what was posted
    headers : to send along
    """

    status: ClassVar[int] = 500
    name: ClassVar[str] = "internal"

    def __init__(
        self,
        detail: str,
        faults: Sequence[Fault] = (),
        headers: Mapping[str, str] | None = None,
    ) -> None:
        super().__init__(detail)
        self.detail = detail
        self.faults = list(faults)
        self.headers = dict(headers or {})

    @classmethod
    def title(cls) -> str:
        """What kind of problem it is, in words."""
        return cleandoc(cls.__doc__ or "").splitlines()[0].rstrip(".")

    @classmethod
    def explanation(cls) -> str:
        """What the problem's page says."""
        return " ".join(cleandoc(cls.__doc__ or "").splitlines()[1:]).strip()

    def problem(self, instance: str) -> dict[str, object]:
        """Problem details (RFC 9457)."""
        document: dict[str, object] = {
            "type": f"/problems/{self.name}",
            "title": self.title(),
            "status": self.status,
            "detail": _sendable(self.detail),
            "instance": instance,
        }
        if self.faults:
            document["errors"] = [_error(fault) for fault in self.listed()]
        return document

    def listed(self) -> list[Fault]:
        """The faults to show: the first hundred, and how many more there are."""
        shown = [
            replace(fault, pointer=_sendable(fault.pointer), detail=_sendable(fault.detail))
            for fault in self.faults[:MOST_FAULTS]
        ]
        more = len(self.faults) - MOST_FAULTS
        return [*shown, Fault("", f"and {more} more faults")] if more > 0 else shown


def _sendable(text: str) -> str:
    """`text` cut to a length for people, without half surrogate pairs, which UTF-8 can't say."""
    cut = text if len(text) <= LONGEST else f"{text[:LONGEST]}…"
    return cut.encode("utf-8", "replace").decode()


def _error(fault: Fault) -> dict[str, object]:
    error: dict[str, object] = {"pointer": fault.pointer, "detail": fault.detail}
    if fault.row is not None:
        error |= {"row": fault.row, "column": fault.column}
    return error


class Malformed(Failure):
    """The request can't be read.

    The body isn't well-formed JSON: a syntax error, a key that stands twice, NaN or Infinity, bytes
    that aren't UTF-8, or nesting without end. Each error points at what can't be read.
    """

    status = 400
    name = "malformed"


class InvalidParameter(Failure):
    """A parameter of the address can't be used.

    It is unknown, stands twice, has a value it can't have, or doesn't go with another one.
    Parameters of an address are never ignored. Each error names one.
    """

    status = 400
    name = "invalid-parameter"


class NotFound(Failure):
    """There is nothing at this address.

    The path is unknown, or the id of a system or an answer that this store doesn't hold, or a
    pointer or table that the answer doesn't have.
    """

    status = 404
    name = "not-found"


class MethodNotAllowed(Failure):
    """The method isn't allowed here.

    The header Allow lists those that are. Tasks are asked with POST.
    """

    status = 405
    name = "method-not-allowed"


class NotAcceptable(Failure):
    """The answer has no such form.

    Neither `format` nor Accept names a form that this answer can take.
    """

    status = 406
    name = "not-acceptable"


class TooLarge(Failure):
    """The request is too large.

    The body is larger than the operator of this service allows.
    """

    status = 413
    name = "too-large"


class UnsupportedMedia(Failure):
    """The body's media type can't be read.

    The header Content-Type must name a type that this address reads.
    """

    status = 415
    name = "unsupported-media-type"


class Invalid(Failure):
    """The request is understood, but doesn't describe a valid system or question.

    Each error points at a field and says what is wrong with it. All faults that were found are
    listed. Mend them and post again: nothing was stored.
    """

    status = 422
    name = "invalid"


class Internal(Failure):
    """The service failed.

    That is a fault of the service, not of the request. The operator's log holds the details.
    """

    status = 500
    name = "internal"


class Unavailable(Failure):
    """The service can't answer at present.

    Nothing is wrong with the request. Ask again after the seconds that Retry-After names.
    """

    status = 503
    name = "unavailable"

    def __init__(
        self,
        detail: str,
        faults: Sequence[Fault] = (),
        headers: Mapping[str, str] | None = None,
    ) -> None:
        super().__init__(detail, faults, {"Retry-After": "5", **(headers or {})})


FAILURES: dict[str, type[Failure]] = {
    kind.name: kind
    for kind in (
        Malformed, InvalidParameter, NotFound, MethodNotAllowed, NotAcceptable, TooLarge,
        UnsupportedMedia, Invalid, Internal, Unavailable,
    )
}  # fmt: skip


def from_status(status: int, detail: str, headers: Mapping[str, str] | None = None) -> Failure:
    """The failure that belongs to a status the framework raised."""
    kinds = {kind.status: kind for kind in reversed(FAILURES.values())}
    return kinds.get(status, Internal)(detail, headers=headers)
