"""Tasks in the server's own process: small ones at once, larger ones in a thread."""

from collections.abc import Callable
from typing import TypeVar

from anyio.to_thread import run_sync

Result = TypeVar("Result")
AT_ONCE_UP_TO = 60  # degrees of freedom: below, a thread costs more than it frees


async def compute(size: int, work: Callable[[], Result]) -> Result:
    """Run `work` on a system of `size` degrees of freedom."""
    if size <= AT_ONCE_UP_TO:
        return work()
    return await run_sync(work)
