"""The store: systems and answers, written once and never changed."""

import threading
import time
from collections.abc import Iterator
from contextlib import contextmanager
from types import TracebackType
from typing import Any, Self

from sqlalchemy import bindparam, create_engine, event, select
from sqlalchemy.dialects.sqlite import insert
from sqlalchemy.engine import Connection
from sqlalchemy.pool import StaticPool

from service.store.tables import SCHEMA_VERSION, about, answers, metadata, systems

BUSY_SECONDS = 10.0


class Store:
    """Systems and answers in an SQLite file that several processes may share.

    Every write is one short transaction that inserts what isn't there yet. What is there is never
    changed, so a reader needs no lock and two writers of the same content agree.

    Parameters
    ----------
    address : sqlite:///PATH

    Raises
    ------
    ValueError
        Another kind of address, or a file that a later version of the service has written.
    """

    def __init__(self, address: str) -> None:
        if not address.startswith("sqlite:"):
            raise ValueError(f"the store '{address}' can't be used: sqlite:///PATH is expected")
        # One connection, used by one thread at a time: it saves a pool check-out on every request.
        self._engine = create_engine(
            address,
            poolclass=StaticPool,
            isolation_level="AUTOCOMMIT",
            connect_args={"timeout": BUSY_SECONDS, "check_same_thread": False},
        )
        event.listen(self._engine, "connect", _prepare)
        self._lock = threading.Lock()
        self._connection: Connection = self._engine.connect()
        self._sql = {
            name: str(statement.compile(self._engine)) for name, statement in _STATEMENTS.items()
        }
        self._create()

    def _create(self) -> None:
        with self._write():
            metadata.create_all(self._connection)
            self._run("keep schema", "schema", SCHEMA_VERSION)
            found = self._run("schema", "schema").scalar_one()
        if found != SCHEMA_VERSION:
            raise ValueError(f"the store is of schema {found}, this version reads {SCHEMA_VERSION}")

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        self.close()

    def close(self) -> None:
        """Give the file back."""
        with self._lock:
            self._connection.close()
            self._engine.dispose()

    def is_ready(self) -> bool:
        """Whether the store answers."""
        with self._lock:
            return self._run("schema", "schema").scalar_one_or_none() is not None

    def system(self, identity: str) -> bytes | None:
        """The canonical content of a system."""
        with self._lock:
            content: bytes | None = self._run("system", identity).scalar_one_or_none()
        return content

    def answer(self, identity: str) -> tuple[str, bytes] | None:
        """The task and the bytes of an answer."""
        with self._lock:
            row = self._run("answer", identity).first()
        return None if row is None else (row[0], row[1])

    def keep_system(self, identity: str, content: bytes) -> None:
        """Store a system, if it isn't there yet."""
        with self._lock:
            self._run("keep system", identity, content, time.time())

    def keep_answer(
        self, identity: str, task: str, system: tuple[str, bytes], body: bytes
    ) -> bytes:
        """Store an answer and the (id, content) of its system.

        Returns the bytes that are stored, which another process may have written first.
        """
        now = time.time()
        with self._write():
            self._run("keep system", *system, now)
            if self._run("keep answer", identity, task, system[0], body, now).rowcount:
                return body
            first: bytes = self._run("answer", identity).one()[1]
            return first

    @contextmanager
    def _write(self) -> Iterator[None]:
        """A transaction that takes the write lock at once: one taken later can't be waited for."""
        with self._lock:
            self._connection.exec_driver_sql("BEGIN IMMEDIATE")
            try:
                yield
            except BaseException:
                self._connection.exec_driver_sql("ROLLBACK")
                raise
            self._connection.exec_driver_sql("COMMIT")

    def _run(self, name: str, *values: object) -> Any:
        return self._connection.exec_driver_sql(self._sql[name], values)


def _prepare(connection: Any, _: Any) -> None:
    """Write-ahead log: readers never wait; an answer lost in a power cut is computed again."""
    for pragma in ("journal_mode=WAL", "synchronous=NORMAL"):
        connection.execute(f"PRAGMA {pragma}").close()


# Written with SQLAlchemy's expressions and compiled once: building them anew for each request
# takes longer than the database does.
_STATEMENTS: dict[str, Any] = {
    "schema": select(about.c.value).where(about.c.name == bindparam("name")),
    "system": select(systems.c.content).where(systems.c.id == bindparam("id")),
    "answer": select(answers.c.task, answers.c.body).where(answers.c.id == bindparam("id")),
    "keep schema": insert(about).on_conflict_do_nothing(),
    "keep system": insert(systems).on_conflict_do_nothing(),
    "keep answer": insert(answers).on_conflict_do_nothing(),
}
