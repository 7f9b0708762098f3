"""Reading a request: its body within the limit, its media type, its parameters."""

import zlib
from collections.abc import Collection, Mapping
from typing import Any

import zstandard
from pydantic import BaseModel
from starlette.requests import Request

from schemas.faults import Fault, Malformed
from schemas.reading import parse_json
from schemas.sheet import MEDIA_TYPES, Sheet, read_sheet
from service import failures


async def body_of(request: Request, limit: int) -> bytes:
    """The body, inflated where it is compressed, refused as soon as it passes `limit` bytes."""
    announced = request.headers.get("content-length", "")
    if announced.isascii() and announced.isdigit() and int(announced) > limit:
        raise _too_large(limit)
    parts: list[bytes] = []
    size = 0
    async for part in request.stream():
        size += len(part)
        if size > limit:
            raise _too_large(limit)
        parts.append(part)
    body = parts[0] if len(parts) == 1 else b"".join(parts)
    coding = request.headers.get("content-encoding")
    return body if coding is None else _inflated(body, coding.strip().lower(), limit)


def _inflated(body: bytes, coding: str, limit: int) -> bytes:
    """The body without its compression.

    Raises
    ------
    failures.UnsupportedMedia, failures.Malformed, failures.TooLarge
    """
    if coding == "identity":
        return body
    if coding not in ("gzip", "zstd"):
        raise failures.UnsupportedMedia(
            f"The coding '{coding[:32]}' can't be read: gzip or zstd is expected.",
            headers={"Accept-Encoding": "gzip, zstd"},
        )
    try:
        if coding == "gzip":
            inflater = zlib.decompressobj(wbits=31)
            plain = inflater.decompress(body, limit + 1)
            whole = inflater.eof or len(plain) > limit
        else:
            reader = zstandard.ZstdDecompressor(max_window_size=2**27).stream_reader(body)
            plain, whole = reader.read(limit + 1), True
    except (zlib.error, zstandard.ZstdError):
        plain, whole = b"", False
    if not whole:
        raise failures.Malformed("The body can't be read.", [Fault("", f"isn't whole {coding}")])
    if len(plain) > limit:
        raise _too_large(limit)
    return plain


def _too_large(limit: int) -> failures.TooLarge:
    return failures.TooLarge(
        f"The body is larger than {limit} bytes, the limit of this service.",
        [Fault("", f"larger than {limit} bytes")],
        {"Connection": "close"},
    )


def json_of(body: bytes, content_type: str) -> Any:
    """The value of a JSON body.

    Raises
    ------
    failures.UnsupportedMedia, failures.Malformed
    """
    media = content_type.partition(";")[0].strip().lower()
    if media not in ("application/json", "") and not media.endswith("+json"):
        raise failures.UnsupportedMedia(
            f"The body is '{media[:80]}', but JSON or a sheet is expected.",
            headers={"Accept": ", ".join(("application/json", *MEDIA_TYPES))},
        )
    try:
        return parse_json(body)
    except Malformed as fault:
        raise failures.Malformed("The body can't be read.", fault.faults) from None


def is_sheet(content_type: str) -> bool:
    """Whether a body of this media type is a sheet."""
    return content_type.partition(";")[0].strip().lower() in MEDIA_TYPES


def sheet_of(body: bytes, content_type: str, question: type[BaseModel] | None = None) -> Sheet:
    """A posted sheet: a question of a task, or a system.

    Raises
    ------
    failures.Malformed
    """
    try:
        return read_sheet(body, content_type, question)
    except Malformed as fault:
        raise failures.Malformed("The sheet can't be read.", fault.faults) from None


def parameters(request: Request, known: Collection[str]) -> Mapping[str, str]:
    """The parameters of the address, all of which must be `known` and stand once."""
    if not request.url.query:
        return {}
    pairs = request.query_params.multi_items()
    names = [name for name, _ in pairs]
    unknown = [name for name in names if name not in known]
    faults = [Fault("", f"unknown parameter '{name[:64]}'") for name in unknown]
    faults += [
        Fault("", f"the parameter '{name}' stands twice")
        for name in dict.fromkeys(names)
        if name in known and names.count(name) > 1
    ]
    if faults:
        listed = ", ".join(sorted(known)) or "none"
        raise failures.UnknownParameter(f"Parameters known here: {listed}.", faults)
    return dict(pairs)
