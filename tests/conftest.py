"""Databases for the tests: each is built once in a run by its migrations and never cleaned.

A test that wants one asks for ``store`` (it then runs on both), ``sqlite_store`` or ``postgresql_store``,
and works in a site of its own, whose name is random. PostgreSQL is the server whose URL stands in
``BRIMBOOK_TEST_POSTGRESQL``, else one that is started from the binaries of this machine, else the test
is skipped and says why; with ``BRIMBOOK_REQUIRE_POSTGRESQL`` set, it fails.
"""

from __future__ import annotations

import os
import shutil
import subprocess
import tempfile
import uuid
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest
import sqlalchemy as sa

from app.store.engine import Store, normalised

USER = "brimbook"
Fresh = Callable[[], str]


@pytest.fixture(scope="session")
def sqlite_url(tmp_path_factory: pytest.TempPathFactory) -> str:
    """An empty SQLite database's URL; the file comes with the first connection."""
    return f"sqlite:///{tmp_path_factory.mktemp('sqlite')}/brimbook.db"


@pytest.fixture(scope="session")
def fresh_postgresql(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Fresh]:
    """Makes an empty database at each call and gives its URL; all are dropped at the end."""
    with server() as url:
        engine = sa.create_engine(normalised(url), isolation_level="AUTOCOMMIT")
        made: list[str] = []

        def fresh() -> str:
            name = f"brimbook_test_{uuid.uuid4().hex[:12]}"
            with engine.connect() as connection:
                connection.exec_driver_sql(f"CREATE DATABASE {name}")
            made.append(name)
            return normalised(url).set(database=name).render_as_string(hide_password=False)

        try:
            yield fresh
        finally:
            with engine.connect() as connection:
                for name in made:
                    connection.exec_driver_sql(f"DROP DATABASE {name} WITH (FORCE)")
            engine.dispose()


@pytest.fixture(scope="session")
def postgresql_url(fresh_postgresql: Fresh) -> str:
    """An empty PostgreSQL database's URL."""
    return fresh_postgresql()


@pytest.fixture(scope="session")
def sqlite_store(sqlite_url: str) -> Iterator[Store]:
    yield from migrated(sqlite_url)


@pytest.fixture(scope="session")
def postgresql_store(postgresql_url: str) -> Iterator[Store]:
    yield from migrated(postgresql_url)


@pytest.fixture(scope="session", params=["sqlite", "postgresql"])
def store(request: pytest.FixtureRequest) -> Store:
    """The store, on each database in turn."""
    found: Store = request.getfixturevalue(f"{request.param}_store")
    return found


@pytest.fixture
def site_id() -> str:
    """A site that no other test knows: the id that its client chose."""
    return f"site-{uuid.uuid4().hex[:16]}"


def migrated(url: str) -> Iterator[Store]:
    store = Store.open(url)
    store.migrate()
    yield store
    store.close()


@contextmanager
def server() -> Iterator[str]:
    """The URL of a PostgreSQL server on which databases can be made."""
    given = os.environ.get("BRIMBOOK_TEST_POSTGRESQL")
    if given:
        yield given
        return
    binaries = postgresql_binaries()
    if binaries is None:
        reason = "PostgreSQL is not installed: no initdb on the path, by pg_config or in /usr/lib/postgresql"
        if os.environ.get("BRIMBOOK_REQUIRE_POSTGRESQL"):
            pytest.fail(f"{reason}, and BRIMBOOK_REQUIRE_POSTGRESQL is set")
        pytest.skip(f"{reason}, and BRIMBOOK_TEST_POSTGRESQL is not set")
    folder = Path(tempfile.mkdtemp(prefix="bb-pg-"))  # a socket's path has room for 107 bytes
    try:
        yield from started(binaries, folder)
    finally:
        shutil.rmtree(folder, ignore_errors=True)


def postgresql_binaries() -> Path | None:
    """Where initdb and pg_ctl are."""
    places = [Path(found).parent for found in [shutil.which("initdb")] if found]
    if shutil.which("pg_config"):
        told = subprocess.run(["pg_config", "--bindir"], check=True, capture_output=True, text=True).stdout
        places.append(Path(told.strip()))
    versions = Path("/usr/lib/postgresql").glob("*/bin")
    places += sorted(versions, key=lambda place: place.parent.name, reverse=True)
    complete = (place for place in places if (place / "initdb").exists() and (place / "pg_ctl").exists())
    return next(complete, None)


def started(binaries: Path, folder: Path) -> Iterator[str]:
    """A server that listens on a socket in the folder only, without fsync: it holds nothing of worth."""
    prefix: list[str] = []
    if os.geteuid() == 0:  # PostgreSQL refuses to run as root
        shutil.chown(folder, "postgres", "postgres")
        prefix = ["setpriv", "--reuid=postgres", "--regid=postgres", "--init-groups"]
        if not shutil.which("setpriv"):
            prefix = ["runuser", "-u", "postgres", "--"]
    data, log = folder / "data", folder / "log"

    def run(*command: str) -> None:
        # To files, not pipes: the server would inherit a pipe, and reading it would never end.
        done = subprocess.run([*prefix, *command], cwd=folder, stdin=subprocess.DEVNULL, check=False,
                              stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)  # fmt: skip
        if done.returncode:
            said = log.read_text(errors="replace")[-2000:] if log.exists() else ""
            pytest.fail(f"{Path(command[0]).name} failed with {done.returncode}\n{said}")

    initdb = str(binaries / "initdb")
    run(initdb, "-D", str(data), "-U", USER, "-A", "trust", "-E", "UTF8", "--locale=C", "--no-sync")
    options = (
        f"-c listen_addresses='' -c unix_socket_directories={folder} -c fsync=off -c synchronous_commit=off "
        "-c full_page_writes=off -c max_connections=120"
    )
    control = str(binaries / "pg_ctl")
    run(control, "-D", str(data), "-l", str(log), "-w", "-t", "60", "-o", options, "start")
    try:
        yield f"postgresql+psycopg://{USER}@/postgres?host={folder}"
    finally:
        run(control, "-D", str(data), "-w", "-t", "60", "-m", "immediate", "stop")
