"""The migrations alone build the database, and what they build is what app/store/tables.py says."""

from __future__ import annotations

import multiprocessing
import re
import sqlite3
from pathlib import Path
from typing import Any

import pytest
import sqlalchemy as sa
from alembic import command

from app.store import schema
from app.store.engine import Store, normalised
from app.store.tables import METADATA

CATALOGUE = {
    "columns": """SELECT c.relname, a.attnum, a.attname, a.attnotnull, l.collname,
                         format_type(a.atttypid, a.atttypmod), pg_get_expr(d.adbin, d.adrelid),
                         a.attidentity::text
                  FROM pg_attribute a JOIN pg_class c ON c.oid = a.attrelid
                  LEFT JOIN pg_collation l ON l.oid = a.attcollation
                  LEFT JOIN pg_attrdef d ON d.adrelid = c.oid AND d.adnum = a.attnum
                  WHERE c.relnamespace = 'public'::regnamespace
                    AND a.attnum > 0 AND c.relkind IN ('r', 'p')""",
    "kinds": """SELECT relname, relkind::text, pg_get_partkeydef(oid) FROM pg_class
                WHERE relnamespace = 'public'::regnamespace""",
    "constraints": """SELECT conrelid::regclass::text, conname, pg_get_constraintdef(oid) FROM pg_constraint
                      WHERE connamespace = 'public'::regnamespace""",
    "indexes": "SELECT tablename, indexname, indexdef FROM pg_indexes WHERE schemaname = 'public'",
}


def described(connection: sa.Connection) -> dict[str, list[str]]:
    """Everything that the database knows of its own tables, but for alembic's."""
    if connection.dialect.name == "sqlite":
        rows = connection.exec_driver_sql("SELECT type, name, tbl_name, sql FROM sqlite_master").all()
        found = {"schema": [" ".join(" ".join(map(str, row)).split()) for row in rows]}
    else:
        asked = {what: connection.exec_driver_sql(query) for what, query in CATALOGUE.items()}
        found = {what: [str(tuple(row)) for row in rows] for what, rows in asked.items()}
    return {what: sorted(row for row in rows if "alembic" not in row) for what, rows in found.items()}


@pytest.fixture(params=["sqlite", "postgresql"])
def fresh_url(request: pytest.FixtureRequest, tmp_path: Path) -> str:
    if request.param == "sqlite":
        return f"sqlite:///{tmp_path}/fresh.db"
    url: str = request.getfixturevalue("fresh_postgresql")()
    return url


def test_the_migrated_schema_equals_the_tables(
    fresh_url: str, tmp_path: Path, request: pytest.FixtureRequest
) -> None:
    store = Store.open(fresh_url)
    store.migrate()
    with store.reading() as connection:
        migrated = described(connection)
    store.close()

    other = f"sqlite:///{tmp_path}/other.db"
    if not fresh_url.startswith("sqlite"):
        other = request.getfixturevalue("fresh_postgresql")()
    engine = sa.create_engine(normalised(other))
    with engine.begin() as connection:
        METADATA.create_all(connection)
        declared = described(connection)
    engine.dispose()

    assert migrated == declared
    tables = {table.name for table in METADATA.sorted_tables}
    assert all(any(name in row for rows in migrated.values() for row in rows) for name in tables)


def test_every_migration_goes_down_and_up_again(fresh_url: str) -> None:
    store = Store.open(fresh_url)
    store.migrate()
    with store.reading() as connection:
        first = described(connection)
        assert schema.is_current(connection)
    with store.transaction(lock_key=1) as connection:
        schema.downgrade(connection, "base")
        assert described(connection) == {what: [] for what in first}
        assert not schema.is_current(connection)
    store.migrate()
    with store.reading() as connection:
        assert described(connection) == first
    store.close()


def test_a_migration_that_fails_half_way_leaves_nothing(
    fresh_url: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    real = command.upgrade

    def upgrade_then_fail(config: Any, revision: str) -> None:
        real(config, revision)
        raise RuntimeError("power cut")

    store = Store.open(fresh_url)
    monkeypatch.setattr(command, "upgrade", upgrade_then_fail)
    with pytest.raises(RuntimeError, match="power cut"):
        store.migrate()
    with store.reading() as connection:
        assert sa.inspect(connection).get_table_names() == []
    monkeypatch.undo()
    store.migrate()
    with store.reading() as connection:
        assert schema.is_current(connection)
    store.close()


def migrate(url: str, ready: Any, said: Any) -> None:
    """Body of another process."""
    ready.wait()
    try:
        store = Store.open(url)
        store.migrate()
        with store.reading() as connection:
            said.put(schema.is_current(connection))
        store.close()
    except Exception as error:
        said.put(repr(error))


def test_four_processes_migrate_one_database_at_once(fresh_url: str) -> None:
    context = multiprocessing.get_context("fork")
    ready, said = context.Barrier(4), context.Queue()
    processes = [context.Process(target=migrate, args=(fresh_url, ready, said)) for _ in range(4)]
    for process in processes:
        process.start()
    answers = [said.get(timeout=60) for _ in processes]
    for process in processes:
        process.join(timeout=60)
    said.close()
    said.join_thread()
    assert answers == [True] * 4


def test_the_values_have_the_types_that_keep_them(sqlite_store: Store) -> None:
    """STRICT tables refuse what their columns cannot hold, instead of keeping it as something else."""
    with pytest.raises(sa.exc.IntegrityError, match="cannot store TEXT value in REAL column"):  # noqa: SIM117
        with sqlite_store.transaction(lock_key=1) as connection:
            connection.exec_driver_sql(
                "INSERT INTO reading (site_id, series_id, taken_at, revision, recorded_at, value, quality)"
                " VALUES (1, 1, 1, 1, 1, 'high', 0)"
            )
    with sqlite_store.reading() as connection:
        loose = "SELECT name FROM pragma_table_list WHERE strict = 0 AND schema = 'main'"
        tables = connection.exec_driver_sql(loose)
        assert {row[0] for row in tables} == {"alembic_version", "sqlite_schema"}


def test_migrations_need_no_ini_file_and_stand_in_pyproject() -> None:
    root = Path(__file__).resolve().parents[1]
    assert not list(root.glob("**/alembic.ini"))
    configured = (root / "pyproject.toml").read_text(encoding="utf-8")
    assert re.search(r'\[tool\.alembic\]\nscript_location = "%\(here\)s/migrations"', configured)
    assert root / "migrations" == schema.MIGRATIONS
    assert sqlite3.sqlite_version_info >= (3, 37)  # STRICT
