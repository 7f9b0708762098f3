"""Tasks in the server's own process: small ones at once, larger ones in a thread."""

import os
from collections.abc import Callable
from functools import cache
from typing import TypeVar

from anyio import CapacityLimiter
from anyio.to_thread import run_sync

Result = TypeVar("Result")
AT_ONCE_UP_TO = 60  # degrees of freedom or parts: below, a thread costs more than it frees


def is_at_once(size: int) -> bool:
    """Whether work on so many degrees of freedom or parts is done without giving way to others."""
    return size <= AT_ONCE_UP_TO


async def compute(size: int, work: Callable[[], Result]) -> Result:
    """Do `work` on so many degrees of freedom or parts."""
    return work() if is_at_once(size) else await in_thread(work)


async def in_thread(work: Callable[[], Result]) -> Result:
    """Do `work` while others are answered."""
    return await run_sync(work, limiter=_limiter())


@cache
def _limiter() -> CapacityLimiter:
    """As many at a time as there are processors: more would only share time and fill memory."""
    return CapacityLimiter(os.cpu_count() or 1)
