"""The store: systems and answers, written once and never changed."""

import threading
import time
from collections.abc import Iterator
from contextlib import contextmanager
from sqlite3 import OperationalError
from types import TracebackType
from typing import Any, Self

from sqlalchemy import bindparam, create_engine, event, select
from sqlalchemy.dialects.sqlite import insert
from sqlalchemy.exc import DBAPIError
from sqlalchemy.pool import StaticPool

from service.failures import Unavailable
from service.store.tables import SCHEMA_VERSION, about, answers, metadata, systems

BUSY_SECONDS = 10.0
OPEN_SECONDS = 30.0


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
        Another kind of address, a file that can't be opened, or one that a later version of the
        service has written.
    failures.Unavailable
        From every method: the file is locked for too long, or its disk is full.
    """

    def __init__(self, address: str) -> None:
        if not address.startswith("sqlite:///"):
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
        self._failed: type[Exception] = self._engine.dialect.loaded_dbapi.OperationalError
        self._sql = {
            name: str(statement.compile(self._engine)) for name, statement in _STATEMENTS.items()
        }
        try:
            self._connection = self._engine.connect()
            # The driver's own connection: the layer above it takes longer than the database does.
            self._driver: Any = self._connection.connection.driver_connection
            found = self._create()
        except (DBAPIError, Unavailable) as error:
            self._engine.dispose()
            why = error.orig if isinstance(error, DBAPIError) else error
            raise ValueError(f"the store '{address}' can't be opened: {why}") from None
        if found != SCHEMA_VERSION:
            self.close()
            raise ValueError(
                f"the store '{address}' is of schema {found}; this version reads {SCHEMA_VERSION}"
            )

    def _create(self) -> str:
        """Make the tables that aren't there yet; returns the version of the schema."""
        with self._write():
            metadata.create_all(self._connection)
            self._run("keep schema", "schema", SCHEMA_VERSION)
            version: str = self._run("schema", "schema").fetchone()[0]
            return version

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
        try:
            return self._row("schema", "schema") is not None
        except Unavailable:
            return False

    def system(self, identity: str) -> bytes | None:
        """The canonical content of a system."""
        row = self._row("system", identity)
        return None if row is None else row[0]

    def answer(self, identity: str) -> tuple[str, bytes] | None:
        """The task and the bytes of an answer."""
        row: tuple[str, bytes] | None = self._row("answer", identity)
        return row

    def keep_system(self, identity: str, content: bytes) -> None:
        """Store a system, if it isn't there yet."""
        with self._write():
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
            first: bytes = self._run("answer", identity).fetchone()[1]
            return first

    def _row(self, name: str, *values: object) -> Any:
        with self._lock:
            return self._run(name, *values).fetchone()

    @contextmanager
    def _write(self) -> Iterator[None]:
        """A transaction that takes the write lock at once: one taken later can't be waited for."""
        with self._lock:
            self._execute("BEGIN IMMEDIATE")
            try:
                yield
                self._execute("COMMIT")
            finally:
                if self._driver.in_transaction:
                    self._driver.rollback()

    def _run(self, name: str, *values: object) -> Any:
        return self._execute(self._sql[name], values)

    def _execute(self, statement: str, values: tuple[object, ...] = ()) -> Any:
        try:
            return self._driver.execute(statement, values)
        except self._failed as error:
            raise Unavailable(f"The store can't be used now: {error}.") from error


def _prepare(connection: Any, _: Any) -> None:
    """Write-ahead log: readers never wait; an answer lost in a power cut is computed again."""
    connection.execute("PRAGMA synchronous=NORMAL").close()
    until = time.monotonic() + OPEN_SECONDS
    while True:
        try:
            connection.execute("PRAGMA journal_mode=WAL").close()
            return
        except OperationalError:  # the lock for this change isn't waited for by SQLite itself
            if time.monotonic() > until:
                raise
            time.sleep(0.02)


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
