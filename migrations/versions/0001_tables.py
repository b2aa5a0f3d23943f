"""All tables of the first contract.

Revision: 0001
"""

from __future__ import annotations

from typing import Any

import sqlalchemy as sa
from alembic import op

revision = "0001"
down_revision = None
branch_labels = None
depends_on = None

INTEGER = sa.Integer()
SMALL = sa.SmallInteger().with_variant(sa.INTEGER(), "sqlite")
INSTANT = sa.BigInteger().with_variant(sa.INTEGER(), "sqlite")
NUMBER: sa.types.TypeEngine[float] = sa.Double().with_variant(sa.REAL(), "sqlite")
WORD = sa.Text(collation="C").with_variant(sa.TEXT(), "sqlite")
BODY = sa.Text().with_variant(sa.TEXT(), "sqlite")

STRICT = {"sqlite_strict": True}
CLUSTERED = {"sqlite_strict": True, "sqlite_with_rowid": False}


def key(name: str, kind: sa.types.TypeEngine[Any]) -> sa.Column[Any]:
    return sa.Column(name, kind, primary_key=True, autoincrement=False, nullable=False)


def must(name: str, kind: sa.types.TypeEngine[Any]) -> sa.Column[Any]:
    return sa.Column(name, kind, nullable=False)


def of_site(table: str) -> sa.ForeignKeyConstraint:
    return sa.ForeignKeyConstraint(["site_id"], ["site.site_id"], name=f"{table}_site")


def recorded(table: str) -> sa.ForeignKeyConstraint:
    columns, target = ["site_id", "recorded_at"], ["recording.site_id", "recording.recorded_at"]
    return sa.ForeignKeyConstraint(columns, target, name=f"{table}_recorded")


def values(table: str) -> list[sa.schema.SchemaItem]:
    return [
        key("site_id", INTEGER), key("series_id", INTEGER), key("taken_at", INSTANT),
        must("recorded_at", INSTANT), sa.Column("value", NUMBER), sa.Column("cited_id", INTEGER),
        key("revision", SMALL), must("quality", SMALL),
        sa.CheckConstraint("value IS NOT NULL OR cited_id IS NOT NULL", name=f"{table}_says_something"),
    ]  # fmt: skip


def upgrade() -> None:
    make_names()
    make_values()
    make_definitions_and_transfers()
    make_books()
    make_keys()


def make_names() -> None:
    op.create_table(
        "site", key("site_id", INTEGER), must("name", WORD),
        sa.UniqueConstraint("name", name="site_name"), **STRICT,
    )  # fmt: skip
    op.create_table(
        "recording", key("site_id", INTEGER), key("recorded_at", INSTANT),
        must("actor", BODY), must("deed", BODY), must("request", BODY), of_site("recording"), **CLUSTERED,
    )  # fmt: skip
    op.create_table(
        "series", key("site_id", INTEGER), key("series_id", INTEGER),
        must("vessel", WORD), must("quantity", SMALL), must("source", WORD),
        sa.UniqueConstraint("site_id", "vessel", "quantity", "source", name="series_names"),
        of_site("series"), **CLUSTERED,
    )  # fmt: skip
    op.create_table(
        "cited", key("site_id", INTEGER), key("cited_id", INTEGER), must("digest", WORD), must("body", BODY),
        sa.UniqueConstraint("site_id", "digest", name="cited_digest"), of_site("cited"), **STRICT,
    )  # fmt: skip


def make_values() -> None:
    op.create_table("reading", *values("reading"), postgresql_partition_by="RANGE (taken_at)", **CLUSTERED)
    op.create_table(
        "analysis", *values("analysis"), recorded("analysis"),
        sa.ForeignKeyConstraint(
            ["site_id", "series_id"], ["series.site_id", "series.series_id"], name="analysis_series"
        ), **CLUSTERED,
    )  # fmt: skip


def make_definitions_and_transfers() -> None:
    op.create_table(
        "definition", key("site_id", INTEGER), key("kind", WORD), key("name", WORD),
        key("effective_from", INSTANT), key("revision", SMALL),
        must("recorded_at", INSTANT), must("body", BODY), recorded("definition"), **STRICT,
    )  # fmt: skip
    op.create_table(
        "transfer", key("site_id", INTEGER), key("name", WORD), key("revision", SMALL),
        must("recorded_at", INSTANT), must("started_at", INSTANT), must("ended_at", INSTANT),
        must("source", WORD), must("target", WORD),
        must("running", SMALL), must("void", SMALL), must("body", BODY), recorded("transfer"),
        sa.CheckConstraint(
            "ended_at >= started_at AND ended_at - started_at <= 2678400000000", name="transfer_period"
        ), **STRICT,
    )  # fmt: skip
    op.create_index("transfer_by_end", "transfer", ["site_id", "ended_at"])
    op.create_index("transfer_by_source", "transfer", ["site_id", "source", "ended_at"])
    op.create_index("transfer_by_target", "transfer", ["site_id", "target", "ended_at"])


def make_books() -> None:
    op.create_table(
        "book", key("site_id", INTEGER), key("opening", INSTANT), key("closing", INSTANT),
        key("revision", SMALL), must("recorded_at", INSTANT), must("known_at", INSTANT),
        must("digest", BODY), must("method", BODY), must("body", BODY), recorded("book"),
        sa.CheckConstraint("closing > opening", name="book_period"), **STRICT,
    )  # fmt: skip
    op.create_index("book_by_closing", "book", ["site_id", "closing", "opening"])
    op.create_table(
        "book_vessel", key("site_id", INTEGER), key("vessel", WORD), key("closing", INSTANT),
        key("opening", INSTANT), key("revision", SMALL),
        sa.Column("mass_kg", NUMBER), must("parts", BODY), must("flagged", SMALL),
        sa.ForeignKeyConstraint(
            ["site_id", "opening", "closing", "revision"],
            ["book.site_id", "book.opening", "book.closing", "book.revision"], name="book_vessel_book",
        ), **STRICT,
    )  # fmt: skip
    op.create_table(
        "due", key("site_id", INTEGER), key("opening", INSTANT), key("closing", INSTANT),
        must("cause", BODY), must("marked_at", INSTANT), must("attempts", SMALL), sa.Column("error", BODY),
        of_site("due"), **STRICT,
    )  # fmt: skip


def make_keys() -> None:
    op.create_table(
        "access_key", key("key_id", WORD), must("digest", BODY), must("holder", BODY), must("role", BODY),
        sa.Column("site_id", INTEGER), must("created_at", INSTANT), sa.Column("expires_at", INSTANT),
        sa.Column("revoked_at", INSTANT), of_site("access_key"), **STRICT,
    )  # fmt: skip
    op.create_table(
        "sign_in", key("digest", WORD), must("key_id", WORD), must("created_at", INSTANT),
        must("expires_at", INSTANT), sa.Column("ended_at", INSTANT),
        sa.ForeignKeyConstraint(["key_id"], ["access_key.key_id"], name="sign_in_key"), **STRICT,
    )  # fmt: skip


def downgrade() -> None:
    for table in ("sign_in", "access_key", "due", "book_vessel", "book", "transfer", "definition", "analysis",
                  "reading", "cited", "series", "recording", "site"):  # fmt: skip
        op.drop_table(table)
