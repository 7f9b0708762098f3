"""Reading a request: its body within the limit, its media type, its parameters."""

import zlib
from collections import Counter
from collections.abc import Collection, Mapping
from typing import Any

import zstandard
from starlette.requests import Request

from schemas.faults import Fault, Malformed, pointer
from schemas.reading import parse_json
from schemas.sheet import MEDIA_TYPES
from service import failures

PATIENCE = 4  # times the limit: so much is read, though not kept, before the connection is cut


async def body_of(request: Request, limit: int) -> bytes:
    """The body, inflated where it is compressed.

    A body above `limit` bytes is refused, but read to its end if that isn't far: a caller who is
    cut off while still sending never sees why.

    Raises
    ------
    failures.TooLarge, failures.UnsupportedMedia, failures.Malformed
    """
    announced = _announced(request)
    if announced > PATIENCE * limit or (announced > limit and "expect" in request.headers):
        raise _too_large(limit, cut=True)
    parts: list[bytes] = []
    size = 0
    async for part in request.stream():
        size += len(part)
        if size <= limit:
            parts.append(part)
        elif size > PATIENCE * limit:
            raise _too_large(limit, cut=True)
    if size > limit:
        raise _too_large(limit)
    body = parts[0] if len(parts) == 1 else b"".join(parts)
    coding = request.headers.get("content-encoding")
    return body if coding is None else _inflated(body, coding.strip().lower(), limit)


def _announced(request: Request) -> int:
    text = request.headers.get("content-length", "")
    return int(text[:18]) if text.isascii() and text.isdigit() else 0


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


def _too_large(limit: int, *, cut: bool = False) -> failures.TooLarge:
    return failures.TooLarge(
        f"The body is larger than {limit} bytes, the limit of this service.",
        [Fault("", f"larger than {limit} bytes")],
        {"Connection": "close"} if cut else {},
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


def accepted(request: Request) -> str:
    """What the caller accepts; several headers count as one list."""
    return ",".join(request.headers.getlist("accept"))


def parameters(request: Request, known: Collection[str]) -> Mapping[str, str]:
    """The parameters of the address, all of which must be `known` and stand once.

    Raises
    ------
    failures.InvalidParameter
    """
    if not request.scope["query_string"]:
        return {}
    pairs = request.query_params.multi_items()
    counts = Counter(name for name, _ in pairs)
    found = dict(pairs)
    faults = [
        Fault(pointer((name,)), "unknown parameter" if name not in known else "it stands twice")
        for name, count in counts.items()
        if name not in known or count > 1
    ]
    if found.get("problems", "table") != "table" and "problems" in known:
        faults.append(Fault("/problems", "only 'table' is known"))
    if faults:
        listed = ", ".join(sorted(known)) or "none"
        raise failures.InvalidParameter(f"Parameters known here: {listed}.", faults)
    return found
