"""The schema's revision is known; how it is built is told in tests/test_migrations.py."""

from __future__ import annotations

from pathlib import Path

from app.store import schema
from app.store.engine import Store


def test_a_new_database_is_not_current_until_it_is_migrated(tmp_path: Path) -> None:
    store = Store.open(f"sqlite:///{tmp_path}/new.db")
    with store.reading() as connection:
        assert not schema.is_current(connection)
    store.migrate()
    with store.reading() as connection:
        assert schema.is_current(connection)
    store.close()


def test_a_database_of_another_program_version_is_not_current(tmp_path: Path) -> None:
    store = Store.open(f"sqlite:///{tmp_path}/other.db")
    store.migrate()
    with store.transaction(lock_key=1) as connection:
        connection.exec_driver_sql("UPDATE alembic_version SET version_num = '9999'")
    with store.reading() as connection:
        assert not schema.is_current(connection)
    store.close()


