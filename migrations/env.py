"""Runs the migrations on the connection that the caller gives, within the caller's transaction."""

from __future__ import annotations

from alembic import context

connection = context.config.attributes.get("connection")
if connection is None:
    raise RuntimeError("migrations run on a connection of the store: use `brimbook migrate`")

# SQLite rolls DDL back too, since the store begins its transactions itself.
context.configure(connection=connection, transaction_per_migration=False, transactional_ddl=True)
with context.begin_transaction():
    context.run_migrations()
