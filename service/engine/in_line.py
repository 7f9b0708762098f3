"""Tasks in the server's own process: small ones at once, larger ones in a thread."""

import os
from collections.abc import Callable
from functools import cache
from typing import TypeVar

from anyio import CapacityLimiter
from anyio.to_thread import run_sync

Result = TypeVar("Result")
AT_ONCE_UP_TO = 60  # degrees of freedom: below, a thread costs more than it frees


def is_at_once(size: int) -> bool:
    """Whether a system of `size` degrees of freedom is computed without giving way to others."""
    return size <= AT_ONCE_UP_TO


async def compute(size: int, work: Callable[[], Result]) -> Result:
    """Run `work` on a system of `size` degrees of freedom."""
    if is_at_once(size):
        return work()
    return await run_sync(work, limiter=_limiter())


@cache
def _limiter() -> CapacityLimiter:
    """As many at a time as there are processors: more would only share time and fill memory."""
    return CapacityLimiter(os.cpu_count() or 1)
