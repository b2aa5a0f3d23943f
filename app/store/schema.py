"""The schema's revision: alembic run from code, on a connection of ours and without an ini file."""

from __future__ import annotations

from pathlib import Path

from alembic import command
from alembic.config import Config
from alembic.runtime.migration import MigrationContext
from alembic.script import ScriptDirectory
from sqlalchemy.engine import Connection

MIGRATIONS = Path(__file__).resolve().parents[2] / "migrations"  # beside app/ in the tree and when installed


def configuration(connection: Connection | None = None) -> Config:
    """Alembic's configuration; the connection's transaction is the caller's."""
    config = Config()
    config.set_main_option("script_location", str(MIGRATIONS).replace("%", "%%"))
    config.attributes["connection"] = connection
    return config


def upgrade(connection: Connection, revision: str = "head") -> None:
    """Run the migrations that are missing, in the caller's transaction."""
    command.upgrade(configuration(connection), revision)


def downgrade(connection: Connection, revision: str) -> None:
    """Undo migrations down to a revision, in the caller's transaction."""
    command.downgrade(configuration(connection), revision)


def is_current(connection: Connection) -> bool:
    """Whether the database's revision is the newest that this program knows."""
    heads = ScriptDirectory.from_config(configuration()).get_heads()
    return set(MigrationContext.configure(connection).get_current_heads()) == set(heads)
