"""Connections and transactions. The project's only commit stands here.

::

    StoreError
    ├── StoreUnavailable    the database cannot be reached, or another writer keeps it too long
    ├── DiskFull            there is no room for what was to be written
    └── UnknownSite         a write to a site that was never defined
"""

from __future__ import annotations

import errno
import hashlib
import sqlite3
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager, nullcontext
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import sqlalchemy as sa
from sqlalchemy.engine import Connection, Engine, make_url

from app.store.lock import LockTimeout, LockUnusable, WriterLock
from app.store.tables import RECORDING, SITE

WAIT_S = 30  # how long a writer waits for the one before it
CONNECT_S = 5
CONNECTIONS = 40  # as many as the server has threads for handlers


class StoreError(Exception):
    """Base of what the store refuses."""


class StoreUnavailable(StoreError):  # noqa: N818
    """The database cannot be reached now; the same request may succeed later."""


class DiskFull(StoreError):  # noqa: N818
    """The database's disk is full; nothing of the transaction was kept."""


class UnknownSite(StoreError):  # noqa: N818
    """Nobody defined this site."""


@dataclass(frozen=True)
class Writing:
    """One writing transaction of one site: the lock is held, and everything gets one ``recorded_at``."""

    store: Store
    connection: Connection
    site: str
    site_id: int
    recorded_at: int
    created: bool  # this transaction made the site


def system_clock() -> int:
    """Now, in microseconds UTC."""
    return time.time_ns() // 1000


def normalised(url: str) -> sa.URL:
    """The URL with its driver named; ``postgres://`` is a common spelling that SQLAlchemy refuses."""
    parsed = make_url(url)
    if parsed.drivername in ("postgres", "postgresql"):
        parsed = parsed.set(drivername="postgresql+psycopg")
    if parsed.drivername not in ("sqlite", "sqlite+pysqlite", "postgresql+psycopg"):
        raise ValueError(f"the database is SQLite or PostgreSQL, not {parsed.drivername}")
    if parsed.get_backend_name() == "sqlite" and parsed.database in (None, "", ":memory:"):
        raise ValueError("the SQLite database is a file: sqlite:///path/to/file.db")
    return parsed


class Store:
    """A database and the ways into it."""

    def __init__(self, url: sa.URL, engine: Engine, lock: WriterLock | None, now: Callable[[], int]) -> None:
        self.url = url
        self._engine = engine
        self._lock = lock
        self._now = now
        self.months: set[int] = set()  # partitions that are known to be there; see app/store/months.py

    @classmethod
    def open(cls, url: str, now: Callable[[], int] = system_clock) -> Store:
        """Prepare connections to a database; nothing is read before the first transaction."""
        parsed = normalised(url)
        if parsed.get_backend_name() == "sqlite":
            path = Path(str(parsed.database))
            try:
                path.parent.mkdir(parents=True, exist_ok=True)
            except OSError as error:
                raise _no_file(error) from error
            lock = WriterLock(path.with_name(path.name + ".lock"), WAIT_S)
            return cls(parsed, _sqlite_engine(parsed), lock, now)
        return cls(parsed, _postgresql_engine(parsed), None, now)

    @property
    def dialect(self) -> str:
        """``sqlite`` or ``postgresql``."""
        return self._engine.dialect.name

    def migrate(self) -> None:
        """Bring the schema up to date; several processes may ask at once, one of them does it."""
        from app.store.schema import upgrade  # alembic takes 0.2 s to import, and only this needs it

        with self.transaction(lock_key=name_key("migrations")) as connection:
            upgrade(connection)

    @contextmanager
    def reading(self) -> Iterator[Connection]:
        """A read-only transaction in which every statement sees the same database."""
        options: dict[str, Any] = {"brimbook": "read"}
        if self.dialect == "postgresql":
            options |= {"isolation_level": "REPEATABLE READ", "postgresql_readonly": True}
        with _translated(), self._engine.connect() as connection:
            yield connection.execution_options(**options)

    @contextmanager
    def writing(
        self, site: str, *, actor: str = "", deed: str = "", request: str = "", create: bool = False
    ) -> Iterator[Writing]:
        """A transaction under the site's lock, with one ``recorded_at`` later than all before it.

        ``actor``, ``deed`` and ``request`` (its id) are the audit. Without ``create`` a site that does
        not exist raises ``UnknownSite``.
        """
        with self.transaction(lock_key=name_key(f"site {site}")) as connection:
            found = connection.scalar(sa.select(SITE.c.site_id).where(SITE.c.name == site))
            if found is None and not create:
                raise UnknownSite(site)
            site_id = self._make_site(connection, site) if found is None else int(found)
            newest = connection.scalar(
                sa.select(sa.func.max(RECORDING.c.recorded_at)).where(RECORDING.c.site_id == site_id)
            )
            now = self._now()
            recorded_at = now if newest is None else max(now, newest + 1)
            audit = {"actor": actor, "deed": deed, "request": request}
            row = {"site_id": site_id, "recorded_at": recorded_at, **audit}
            connection.execute(sa.insert(RECORDING), row)
            yield Writing(self, connection, site, site_id, recorded_at, found is None)

    @contextmanager
    def transaction(self, *, lock_key: int) -> Iterator[Connection]:
        """A writing transaction under a lock; it is committed if the block ends without an exception."""
        held = self._lock.held() if self._lock is not None else nullcontext()
        with _translated(), held, self._engine.connect() as connection:
            connection = connection.execution_options(brimbook="write")
            connection.begin()  # now, not at the first statement: alembic commits what it begins itself
            if self.dialect == "postgresql":
                wait_for_turn(connection, lock_key)
            yield connection
            connection.commit()

    def close(self) -> None:
        """Give all connections back; the last one to leave a SQLite file moves its log into it."""
        try:
            with self._lock.held() if self._lock is not None else nullcontext():
                self._engine.dispose()
        except (LockTimeout, LockUnusable):
            self._engine.dispose()

    def _make_site(self, connection: Connection, name: str) -> int:
        if self.dialect == "postgresql":
            wait_for_turn(connection, name_key("sites"))
        newest = connection.scalar(sa.select(sa.func.max(SITE.c.site_id))) or 0
        connection.execute(sa.insert(SITE), {"site_id": newest + 1, "name": name})
        return int(newest) + 1


def wait_for_turn(connection: Connection, lock_key: int) -> None:
    """Hold PostgreSQL's advisory lock of this key until the transaction ends."""
    # One round trip. The transaction is READ COMMITTED: its next statement sees what the one before
    # us committed, which a snapshot taken while waiting would not.
    turn = sa.text("SELECT set_config('lock_timeout', :wait, true), pg_advisory_xact_lock(:key)")
    connection.execute(turn, {"wait": f"{WAIT_S}s", "key": lock_key})


def name_key(name: str) -> int:
    """64 bits of a name; should two names collide they only wait for each other."""
    return int.from_bytes(hashlib.sha256(f"brimbook {name}".encode()).digest()[:8], "big", signed=True)


def _postgresql_engine(url: sa.URL) -> Engine:
    return sa.create_engine(
        url, pool_size=10, max_overflow=CONNECTIONS - 10, pool_timeout=WAIT_S, pool_pre_ping=True,
        connect_args={"connect_timeout": CONNECT_S},
    )  # fmt: skip


def _sqlite_engine(url: sa.URL) -> Engine:
    # No overflow: a connection beyond the pool is closed on return, and the last one to be closed would
    # move the log into the file without the writer's lock.
    engine = sa.create_engine(url, pool_size=CONNECTIONS, max_overflow=0, pool_timeout=WAIT_S)
    sa.event.listen(engine, "connect", _on_connect)
    sa.event.listen(engine, "begin", _on_begin)
    return engine


def _on_connect(dbapi_connection: Any, _record: object) -> None:
    # The driver's own transaction control commits before DDL: a migration that fails half-way would stay.
    dbapi_connection.isolation_level = None
    for pragma in (
        f"busy_timeout = {WAIT_S * 1000}",
        "journal_mode = WAL",
        "synchronous = FULL",  # NORMAL loses acknowledged rows when the power goes
        "foreign_keys = ON",
        "temp_store = MEMORY",
    ):
        dbapi_connection.execute(f"PRAGMA {pragma}").close()


def _on_begin(connection: Connection) -> None:
    writes = connection.get_execution_options().get("brimbook") == "write"
    connection.exec_driver_sql(f"PRAGMA query_only = {'OFF' if writes else 'ON'}")
    connection.exec_driver_sql("BEGIN IMMEDIATE" if writes else "BEGIN")


@contextmanager
def _translated() -> Iterator[None]:
    try:
        yield
    except LockTimeout as error:
        raise StoreUnavailable("another writer kept the database too long") from error
    except LockUnusable as error:
        raise _no_file(error.__cause__) from error
    except Exception as error:
        failure = _failure(error)
        if failure is None:
            raise
        raise failure from error


def _no_file(error: BaseException | None) -> StoreError:
    full = isinstance(error, OSError) and error.errno in (errno.ENOSPC, errno.EDQUOT)
    return DiskFull(FULL) if full else StoreUnavailable("there is no access to the folder of the database")


FULL = "the disk of the database is full"
SQLITE_FULL = 13
# busy, locked, read only, input/output, corrupt, cannot be opened, no database
SQLITE_AWAY = {5, 6, 8, 10, 11, 14, 26}
POSTGRESQL_FULL = "53100"
POSTGRESQL_AWAY = ("08", "53", "57P", "55P03", "58030", "40001", "40P01", "25006")


def _failure(error: Exception) -> StoreError | None:
    """What an error of the driver means; None if it is a fault of ours."""
    original = error.orig if isinstance(error, sa.exc.DBAPIError) else error
    if isinstance(error, sa.exc.TimeoutError):
        return StoreUnavailable("no connection became free")
    if isinstance(original, sqlite3.Error):
        code = getattr(original, "sqlite_errorcode", 0) & 0xFF
        if code == SQLITE_FULL:
            return DiskFull(FULL)
        return StoreUnavailable("the database cannot be used now") if code in SQLITE_AWAY else None
    if not type(original).__module__.startswith("psycopg"):
        return None
    state = getattr(original, "sqlstate", None)
    if state == POSTGRESQL_FULL:
        return DiskFull(FULL)
    if state is None:
        away = type(original).__name__ in ("OperationalError", "ConnectionTimeout", "InterfaceError")
    else:
        away = state.startswith(POSTGRESQL_AWAY)
    return StoreUnavailable("the database cannot be reached") if away else None
