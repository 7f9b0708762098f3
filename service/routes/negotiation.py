"""Which form of an answer a caller wants (RFC 9110, section 12)."""

from collections.abc import Mapping, Sequence

from service import failures


def choose(wanted: str | None, accept: str, offered: Mapping[str, str]) -> str:
    """The name of one of the `offered` forms (name: media type), the first being the default.

    `wanted` is what `?format=` says and goes before Accept.

    Raises
    ------
    failures.NotAcceptable
    """
    if wanted is not None:
        if wanted in offered:
            return wanted
        raise _nothing(offered)
    if not accept or accept == "*/*":
        return next(iter(offered))
    ranges = _ranges(accept)
    best = max(offered, key=lambda name: _quality(offered[name], ranges))
    if _quality(offered[best], ranges) <= 0.0:
        raise _nothing(offered)
    return best


def _nothing(offered: Mapping[str, str]) -> failures.NotAcceptable:
    return failures.NotAcceptable(
        "Forms of this answer: " + ", ".join(f"{n} ({media})" for n, media in offered.items()) + "."
    )


def _ranges(accept: str) -> list[tuple[str, float]]:
    """Media ranges with their quality; a quality that can't be read counts as 0."""
    ranges = []
    for part in accept.split(","):
        media, *parameters = (piece.strip().lower() for piece in part.split(";"))
        quality = 1.0
        for parameter in parameters:
            if parameter.startswith("q="):
                try:
                    quality = min(max(float(parameter[2:]), 0.0), 1.0)
                except ValueError:
                    quality = 0.0
        ranges.append((media, quality))
    return ranges


def _quality(media: str, ranges: Sequence[tuple[str, float]]) -> float:
    """The quality of the most specific range that matches."""
    kind = media.partition("/")[0]
    found = dict(ranges)
    return next((found[m] for m in (media, f"{kind}/*", "*/*") if m in found), 0.0)


def matches(if_none_match: Sequence[str], etag: str) -> bool:
    """Whether one of the headers If-None-Match names `etag`; the comparison is the weak one."""
    tags = [tag.strip().removeprefix("W/") for line in if_none_match for tag in line.split(",")]
    return etag in tags or tags == ["*"]
