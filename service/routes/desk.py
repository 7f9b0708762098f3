"""From a question to a stored answer: the way that every task's request goes."""

import asyncio
from dataclasses import dataclass
from typing import Any

import orjson

from schemas.faults import Fault, Invalid
from schemas.identity import answer_id, canonical, options, system_id
from schemas.reading import read_system
from schemas.system import AnySystem
from service import failures
from service.engine import compute, is_at_once
from service.routes.remembered import Remembered
from service.settings import Settings
from service.store import Store
from service.tasks import COMPUTATION, Task, degrees_of_freedom, summarize

# Cache-Status (RFC 9211): from the store, computed, or computed for another caller at this moment.
HIT = "wideberth; hit"
MISS = "wideberth; fwd=miss; stored"
JOINED = "wideberth; fwd=miss; collapsed"


@dataclass(frozen=True, slots=True)
class Answered:
    """The bytes of an answer, its id, and the Cache-Status that says where they came from."""

    identity: str
    body: bytes
    status: str


class Desk:
    """Takes questions, finds or computes their answers, keeps them."""

    def __init__(self, store: Store, settings: Settings) -> None:
        self.store = store
        self.settings = settings
        self.remembered = Remembered(settings.cache_bytes)
        self._running: dict[str, asyncio.Task[bytes]] = {}

    async def ask(self, task: Task, question: Any) -> Answered:
        """The answer to a question, from the store or computed and stored."""
        content, system = None, question.system
        if system is None:
            identity = question.system_id
        else:
            content = canonical(system)
            identity = system_id(content)
        wanted = answer_id(task.name, identity, options(question), COMPUTATION)
        known = self.store.answer(wanted)
        if known is not None:
            return Answered(wanted, known[1], HIT)
        if content is None:
            content, system = self.stored_system(identity)
        try:
            size = self.size_of(system, "/system")
        except Invalid as fault:
            raise invalid(_in_question(fault, question)) from None
        if wanted in self._running:
            return Answered(wanted, await asyncio.shield(self._running[wanted]), JOINED)
        new = self._computed(task, question, system, wanted, (identity, content), size)
        if is_at_once(size):
            return Answered(wanted, await new, MISS)
        # A caller who leaves doesn't take the answer away from those who joined.
        running = self._running[wanted] = asyncio.create_task(new)
        running.add_done_callback(lambda _: self._running.pop(wanted))
        return Answered(wanted, await asyncio.shield(running), MISS)

    async def _computed(
        self, task: Task, question: Any, system: AnySystem, wanted: str,
        kept: tuple[str, bytes], size: int,
    ) -> bytes:  # fmt: skip
        def work() -> bytes:
            answer = task.run(system, question)
            head = {"id": wanted, "task": task.name, "system_id": kept[0]}
            return orjson.dumps(head | answer, option=orjson.OPT_SERIALIZE_NUMPY)

        try:
            body = await compute(size, work)
        except Invalid as fault:
            raise invalid(_in_question(fault, question)) from None
        return self.store.keep_answer(wanted, task.name, kept, body)

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

    async def keep_system(self, system: AnySystem) -> dict[str, Any]:
        """Check and store a system; its id and summary."""
        summary = await self.summary(system)
        content = canonical(system)
        identity = system_id(content)
        self.store.keep_system(identity, content)
        return {"id": identity, **summary}

    async def summary(self, system: AnySystem) -> dict[str, Any]:
        """What a system comes to."""
        try:
            size = self.size_of(system, "")
            return await compute(size, lambda: summarize(system))
        except Invalid as fault:
            raise invalid(fault) from None

    def size_of(self, system: AnySystem, prefix: str) -> int:
        """How much there is to compute: degrees of freedom, or parts if they are more.

        Raises
        ------
        Invalid
            More degrees of freedom than the operator allows.
        """
        size, most = degrees_of_freedom(system), self.settings.max_degrees_of_freedom
        if size > most:
            field = "bodies" if system.kind == "bodies" else "degrees_of_freedom"
            detail = f"{size} degrees of freedom; the limit of this service is {most}"
            raise Invalid([Fault(f"{prefix}/{field}", detail)])
        return max(size, len(system.connections)) if system.kind == "bodies" else size


def _in_question(found: Invalid, question: Any) -> Invalid:
    """The faults where the caller can see them: a stored system is only an id in the question."""
    if question.system is not None:
        return found
    return Invalid([
        Fault("/system_id", f"in the stored system, at {fault.pointer[7:]}: {fault.detail}")
        if fault.pointer.startswith("/system/") else fault
        for fault in found.faults
    ])  # fmt: skip


def invalid(fault: Invalid) -> failures.Invalid:
    """The failure for faults that were found."""
    number = len(fault.faults)
    found = "One fault was found." if number == 1 else f"{number} faults were found."
    return failures.Invalid(found, fault.faults)
