"""What a window of nights needs of each close beside its masses: how they follow their inputs, and what moved.

Revision: 0002
"""

from __future__ import annotations

from typing import Any

import sqlalchemy as sa
from alembic import op

revision = "0002"
down_revision = "0001"
branch_labels = None
depends_on = None

INTEGER = sa.Integer()
SMALL = sa.SmallInteger().with_variant(sa.INTEGER(), "sqlite")
INSTANT = sa.BigInteger().with_variant(sa.INTEGER(), "sqlite")
NUMBER: sa.types.TypeEngine[float] = sa.Double().with_variant(sa.REAL(), "sqlite")
WORD = sa.Text(collation="C").with_variant(sa.TEXT(), "sqlite")
BODY = sa.Text().with_variant(sa.TEXT(), "sqlite")


def key(name: str, kind: sa.types.TypeEngine[Any]) -> sa.Column[Any]:
    return sa.Column(name, kind, primary_key=True, autoincrement=False, nullable=False)


def must(name: str, kind: sa.types.TypeEngine[Any]) -> sa.Column[Any]:
    return sa.Column(name, kind, nullable=False)


def of_book(table: str) -> sa.ForeignKeyConstraint:
    columns = ["site_id", "opening", "closing", "revision"]
    return sa.ForeignKeyConstraint(columns, [f"book.{column}" for column in columns], name=f"{table}_book")


def upgrade() -> None:
    op.create_table(
        "book_slope", key("site_id", INTEGER), key("vessel", WORD), key("closing", INSTANT), key("opening", INSTANT),
        key("revision", SMALL), must("body", BODY), of_book("book_slope"), sqlite_strict=True,
    )  # fmt: skip
    op.create_table(
        "book_move", key("site_id", INTEGER), key("closing", INSTANT), key("opening", INSTANT),
        key("revision", SMALL), key("place", INTEGER), must("transfer", WORD), must("source", WORD),
        must("target", WORD), sa.Column("mass_kg", NUMBER), must("parts", BODY), must("meter", WORD),
        of_book("book_move"), sqlite_strict=True,
    )  # fmt: skip


def downgrade() -> None:
    op.drop_table("book_move")
    op.drop_table("book_slope")
