"""Replies kept ready in memory: the same request, byte for byte, needs no reading."""

from collections import OrderedDict
from hashlib import blake2b

from starlette.requests import Request

from service.routes.replies import Reply
from service.routes.requests import accepted


def key_of(request: Request, *parts: str | bytes) -> bytes:
    """A digest of what decides the reply: address, Accept, and further `parts` of the request."""
    digest = blake2b(digest_size=20)
    scope = request.scope
    for part in (scope["raw_path"], scope["query_string"], accepted(request), *parts):
        data = part.encode() if isinstance(part, str) else part
        digest.update(b"%d:" % len(data))
        digest.update(data)
    return digest.digest()


class Remembered:
    """The replies to the last requests, by what was sent, up to so many bytes."""

    def __init__(self, limit: int) -> None:
        self._replies: OrderedDict[bytes, Reply] = OrderedDict()
        self._limit = limit
        self._size = 0

    def get(self, key: bytes) -> Reply | None:
        """The reply to the same request, if it is still there."""
        reply = self._replies.get(key)
        if reply is not None:
            self._replies.move_to_end(key)
        return reply

    def put(self, key: bytes, reply: Reply) -> None:
        """Remember a reply, and forget the oldest ones beyond the limit."""
        if key in self._replies or len(reply.body) > self._limit // 8:
            return
        self._replies[key] = reply
        self._size += len(reply.body) + 512
        while self._size > self._limit:
            _, oldest = self._replies.popitem(last=False)
            self._size -= len(oldest.body) + 512
