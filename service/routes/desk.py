"""From a question to a stored answer: the way that every task's request goes."""

import asyncio
from collections import OrderedDict
from dataclasses import dataclass
from typing import Any

import orjson
from pydantic import BaseModel

from schemas.faults import Fault, Invalid
from schemas.identity import answer_id, canonical, options, system_id
from schemas.reading import read, read_system
from schemas.system import AnySystem
from service import failures
from service.engine import compute
from service.routes.replies import Reply
from service.settings import Settings
from service.store import Store
from service.tasks import COMPUTATION, Task, degrees_of_freedom, summarize


@dataclass(frozen=True, slots=True)
class Answered:
    """The bytes of an answer, its id, and whether it was in the store."""

    identity: str
    body: bytes
    hit: bool


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


class Desk:
    """Takes questions, finds or computes their answers, keeps them."""

    def __init__(self, store: Store, settings: Settings) -> None:
        self.store = store
        self.settings = settings
        self.remembered = Remembered(settings.cache_bytes)
        self._running: dict[str, asyncio.Future[bytes]] = {}

    def question(self, task: Task, raw: Any) -> BaseModel:
        """A validated question.

        Raises
        ------
        failures.Invalid
        """
        try:
            return read(task.question, raw)
        except Invalid as fault:
            raise invalid(fault) from None

    def system_of(self, question: Any) -> tuple[str, bytes, AnySystem]:
        """Id, canonical content and model of the system that a question is about."""
        if question.system is not None:
            content = canonical(question.system)
            return system_id(content), content, question.system
        content, system = self.stored_system(question.system_id)
        return question.system_id, content, system

    def stored_system(self, identity: str) -> tuple[bytes, AnySystem]:
        """Content and model of a stored system.

        Raises
        ------
        failures.Invalid
            There is none with this id.
        """
        content = self.store.system(identity)
        if content is None:
            raise failures.Invalid(
                "The system isn't stored here.",
                [Fault("/system_id", "no system with this id is stored here")],
            )
        return content, read_system(orjson.loads(content))

    async def ask(self, task: Task, question: Any) -> Answered:
        """The answer to a question, from the store or computed and stored."""
        identity, content, system = self.system_of(question)
        self.check_size(system, "/system")
        wanted = answer_id(task.name, identity, options(question), COMPUTATION)
        known = self.store.answer(wanted)
        if known is not None:
            return Answered(wanted, known[1], True)
        running = self._running.get(wanted)
        if running is not None:
            return Answered(wanted, await asyncio.shield(running), True)
        future: asyncio.Future[bytes] = asyncio.get_running_loop().create_future()
        self._running[wanted] = future
        try:
            body = await self._computed(task, question, system, wanted, identity)
            body = self.store.keep_answer(wanted, task.name, (identity, content), body)
            future.set_result(body)
        except BaseException as error:
            future.set_exception(error)
            future.exception()  # nobody may be waiting for it
            raise
        finally:
            del self._running[wanted]
        return Answered(wanted, body, False)

    async def _computed(
        self, task: Task, question: Any, system: AnySystem, identity: str, system_identity: str
    ) -> bytes:
        def work() -> bytes:
            answer = task.run(system, question)
            head = {"id": identity, "task": task.name, "system_id": system_identity}
            return orjson.dumps(head | answer, option=orjson.OPT_SERIALIZE_NUMPY)

        try:
            return await compute(degrees_of_freedom(system), work)
        except Invalid as fault:
            raise invalid(fault) from None

    async def keep_system(self, system: AnySystem) -> dict[str, Any]:
        """Check and store a system; its id and summary."""
        self.check_size(system, "")
        try:
            summary = await compute(degrees_of_freedom(system), lambda: summarize(system))
        except Invalid as fault:
            raise invalid(fault) from None
        content = canonical(system)
        identity = system_id(content)
        self.store.keep_system(identity, content)
        return {"id": identity, **summary}

    def check_size(self, system: AnySystem, prefix: str) -> None:
        """Refuse a system with more degrees of freedom than the operator allows."""
        size, most = degrees_of_freedom(system), self.settings.max_degrees_of_freedom
        if size > most:
            field = "bodies" if system.kind == "bodies" else "degrees_of_freedom"
            raise failures.Invalid(
                "The system is too large for this service.",
                [Fault(f"{prefix}/{field}", f"{size} degrees of freedom; the limit is {most}")],
            )


def invalid(fault: Invalid) -> failures.Invalid:
    """The failure for faults that were found."""
    number = len(fault.faults)
    found = "One fault was found." if number == 1 else f"{number} faults were found."
    return failures.Invalid(found, fault.faults)
