"""The tables: instants in integer microseconds UTC, append-only but for ``due``, keys and sign-ins.

One value is one row: a *series* is one quantity of one vessel from one source, and its values are rows
of ``reading`` or ``analysis``, each with a revision. Narrow tables are clustered on their key on SQLite
(WITHOUT ROWID); tables with a body of text are not, because long rows would fill the inner pages of the
tree. Columns of ``reading`` stand in the order that packs without padding on PostgreSQL.
"""

from __future__ import annotations

from typing import Any

import sqlalchemy as sa

METADATA = sa.MetaData()

# Numbers on disk: add at the end, never renumber.
QUANTITIES: dict[str, int] = {
    "level_m": 1,
    "ullage_m": 2,
    "liquid_volume_m3": 3,
    "liquid_volume_pct": 4,
    "differential_pressure_kpa": 5,
    "weighed_mass_kg": 6,
    "free_water_level_m": 7,
    "liquid_temperature_c": 8,
    "ambient_temperature_c": 9,
    "vapour_temperature_c": 10,
    "pressure_kpa": 11,
    "pressure_kpa_abs": 12,
    "observed_density_kg_m3": 13,
    "observed_density_temperature_c": 14,
    "observed_density_pressure_kpa_abs": 15,
    "observed_density_by": 16,
    "sediment_water_pct": 17,
    "density_basis": 18,
    "liquid_composition": 19,
    "vapour_composition": 20,
    "roof_load_kg": 21,
    "empty": 22,
    "sample": 23,
    "sample_holds_from": 24,
    "barometric_pressure_kpa_abs": 25,
}
QUANTITY_NAMES: dict[int, str] = {number: name for name, number in QUANTITIES.items()}

# Few values that hold until they are replaced: they live in one unpartitioned table, so that the newest
# of years ago is still one seek. Their series have negative numbers, which is how a series tells its table.
LABORATORY: frozenset[str] = frozenset({
    "free_water_level_m", "observed_density_kg_m3", "observed_density_temperature_c",
    "observed_density_pressure_kpa_abs", "observed_density_by", "sediment_water_pct", "density_basis",
    "liquid_composition", "vapour_composition", "sample", "sample_holds_from",
})  # fmt: skip

GOOD, UNCERTAIN, BAD = 0, 1, 2
ALWAYS = -(2**62)  # the effective_from of a definition that holds for all time before, too
LONGEST_TRANSFER = 31 * 86_400_000_000  # 31 days in microseconds


def integer() -> sa.types.TypeEngine[int]:
    """32 bits on PostgreSQL."""
    return sa.Integer()


def small() -> sa.types.TypeEngine[int]:
    """16 bits on PostgreSQL; a STRICT table of SQLite takes only the name INTEGER."""
    return sa.SmallInteger().with_variant(sa.INTEGER(), "sqlite")


def instant() -> sa.types.TypeEngine[int]:
    """Microseconds UTC, 64 bits on both."""
    return sa.BigInteger().with_variant(sa.INTEGER(), "sqlite")


def number() -> sa.types.TypeEngine[float]:
    """IEEE 754 binary64 on both."""
    return sa.Double().with_variant(sa.REAL(), "sqlite")


def word() -> sa.types.TypeEngine[str]:
    """Text compared by its bytes, on both."""
    return sa.Text(collation="C").with_variant(sa.TEXT(), "sqlite")


def body() -> sa.types.TypeEngine[str]:
    """Text that is never compared."""
    return sa.Text().with_variant(sa.TEXT(), "sqlite")


def key(name: str, kind: sa.types.TypeEngine[Any]) -> sa.Column[Any]:
    """A column of the primary key; numbers are given by us, never by the database."""
    return sa.Column(name, kind, primary_key=True, autoincrement=False, nullable=False)


def must(name: str, kind: sa.types.TypeEngine[Any]) -> sa.Column[Any]:
    """A column that is never NULL."""
    return sa.Column(name, kind, nullable=False)


def recorded(table: str) -> sa.ForeignKeyConstraint:
    """Every row belongs to a writing transaction of its site."""
    columns, target = ["site_id", "recorded_at"], ["recording.site_id", "recording.recorded_at"]
    return sa.ForeignKeyConstraint(columns, target, name=f"{table}_recorded")


SITE = sa.Table(
    "site", METADATA, key("site_id", integer()), must("name", word()),
    sa.UniqueConstraint("name", name="site_name"), sqlite_strict=True,
)  # fmt: skip

RECORDING = sa.Table(
    "recording", METADATA, key("site_id", integer()), key("recorded_at", instant()),
    must("actor", body()), must("deed", body()), must("request", body()),
    sa.ForeignKeyConstraint(["site_id"], ["site.site_id"], name="recording_site"),
    sqlite_strict=True, sqlite_with_rowid=False,
)  # fmt: skip

SERIES = sa.Table(
    "series", METADATA, key("site_id", integer()), key("series_id", integer()),
    must("vessel", word()), must("quantity", small()), must("source", word()),
    sa.UniqueConstraint("site_id", "vessel", "quantity", "source", name="series_names"),
    sa.ForeignKeyConstraint(["site_id"], ["site.site_id"], name="series_site"),
    sqlite_strict=True, sqlite_with_rowid=False,
)  # fmt: skip

# A sample's id, or a composition as canonical JSON. Unique by digest: an index entry of PostgreSQL
# holds 2.7 kB at most.
CITED = sa.Table(
    "cited", METADATA, key("site_id", integer()), key("cited_id", integer()),
    must("digest", word()), must("body", body()),
    sa.UniqueConstraint("site_id", "digest", name="cited_digest"),
    sa.ForeignKeyConstraint(["site_id"], ["site.site_id"], name="cited_site"), sqlite_strict=True,
)  # fmt: skip


def _value_columns(table: str) -> list[sa.schema.SchemaItem]:
    return [
        key("site_id", integer()), key("series_id", integer()), key("taken_at", instant()),
        must("recorded_at", instant()), sa.Column("value", number()), sa.Column("cited_id", integer()),
        sa.Column("revision", small(), primary_key=True, autoincrement=False, nullable=False),
        must("quality", small()),
        sa.CheckConstraint("value IS NOT NULL OR cited_id IS NOT NULL", name=f"{table}_says_something"),
    ]  # fmt: skip


# No foreign keys: they cost 40 % of ingest. Months are made on demand and there is no default partition,
# because attaching a month beside one scans it.
READING = sa.Table(
    "reading", METADATA, *_value_columns("reading"),
    sqlite_strict=True, sqlite_with_rowid=False, postgresql_partition_by="RANGE (taken_at)",
)  # fmt: skip

ANALYSIS = sa.Table(
    "analysis", METADATA, *_value_columns("analysis"), recorded("analysis"),
    sa.ForeignKeyConstraint(
        ["site_id", "series_id"], ["series.site_id", "series.series_id"], name="analysis_series"
    ),
    sqlite_strict=True, sqlite_with_rowid=False,
)  # fmt: skip

# Sites, substances, vessels, meters and feeds: one table of dated bodies.
DEFINITION = sa.Table(
    "definition", METADATA, key("site_id", integer()), key("kind", word()), key("name", word()),
    key("effective_from", instant()), key("revision", small()),
    must("recorded_at", instant()), must("body", body()), recorded("definition"), sqlite_strict=True,
)  # fmt: skip

# A transfer that still runs is kept as ending when it must at the latest, so that one index finds it. Its
# ends stand beside its body, so that what touched a vessel since a reading is a seek; a boundary is "".
TRANSFER = sa.Table(
    "transfer", METADATA, key("site_id", integer()), key("name", word()), key("revision", small()),
    must("recorded_at", instant()), must("started_at", instant()), must("ended_at", instant()),
    must("source", word()), must("target", word()),
    must("running", small()), must("void", small()), must("body", body()), recorded("transfer"),
    sa.CheckConstraint(
        f"ended_at >= started_at AND ended_at - started_at <= {LONGEST_TRANSFER}", name="transfer_period"
    ),
    sa.Index("transfer_by_end", "site_id", "ended_at"),
    sa.Index("transfer_by_source", "site_id", "source", "ended_at"),
    sa.Index("transfer_by_target", "site_id", "target", "ended_at"), sqlite_strict=True,
)  # fmt: skip

BOOK = sa.Table(
    "book", METADATA, key("site_id", integer()), key("opening", instant()), key("closing", instant()),
    key("revision", small()), must("recorded_at", instant()), must("known_at", instant()),
    must("digest", body()), must("method", body()), must("body", body()), recorded("book"),
    sa.CheckConstraint("closing > opening", name="book_period"),
    sa.Index("book_by_closing", "site_id", "closing", "opening"), sqlite_strict=True,
)  # fmt: skip

# Each closing inventory with its named parts: what a window of nights reads.
BOOK_VESSEL = sa.Table(
    "book_vessel", METADATA, key("site_id", integer()), key("vessel", word()), key("closing", instant()),
    key("opening", instant()), key("revision", small()),
    sa.Column("mass_kg", number()), must("parts", body()), must("flagged", small()),
    sa.ForeignKeyConstraint(
        ["site_id", "opening", "closing", "revision"],
        ["book.site_id", "book.opening", "book.closing", "book.revision"], name="book_vessel_book",
    ), sqlite_strict=True,
)  # fmt: skip

# How each closing inventory follows what was read, and whose errors its density has: what a fault would change.
BOOK_SLOPE = sa.Table(
    "book_slope", METADATA, key("site_id", integer()), key("vessel", word()), key("closing", instant()),
    key("opening", instant()), key("revision", small()), must("body", body()),
    sa.ForeignKeyConstraint(
        ["site_id", "opening", "closing", "revision"],
        ["book.site_id", "book.opening", "book.closing", "book.revision"], name="book_slope_book",
    ), sqlite_strict=True,
)  # fmt: skip

# What each ticket moved in the period, with its named parts; an end beyond the books is "", a place counts them.
BOOK_MOVE = sa.Table(
    "book_move", METADATA, key("site_id", integer()), key("closing", instant()), key("opening", instant()),
    key("revision", small()), key("place", integer()), must("transfer", word()), must("source", word()),
    must("target", word()), sa.Column("mass_kg", number()), must("parts", body()), must("meter", word()),
    sa.ForeignKeyConstraint(
        ["site_id", "opening", "closing", "revision"],
        ["book.site_id", "book.opening", "book.closing", "book.revision"], name="book_move_book",
    ), sqlite_strict=True,
)  # fmt: skip

DUE = sa.Table(
    "due", METADATA, key("site_id", integer()), key("opening", instant()), key("closing", instant()),
    must("cause", body()), must("marked_at", instant()), must("attempts", small()),
    sa.Column("error", body()),
    sa.ForeignKeyConstraint(["site_id"], ["site.site_id"], name="due_site"), sqlite_strict=True,
)  # fmt: skip

# What opens the door; site is NULL for a key to every site. Only the digest of a secret is kept.
ACCESS_KEY = sa.Table(
    "access_key", METADATA, key("key_id", word()), must("digest", body()), must("holder", body()),
    must("role", body()), sa.Column("site_id", integer()), must("created_at", instant()),
    sa.Column("expires_at", instant()), sa.Column("revoked_at", instant()),
    sa.ForeignKeyConstraint(["site_id"], ["site.site_id"], name="access_key_site"), sqlite_strict=True,
)  # fmt: skip

SIGN_IN = sa.Table(
    "sign_in", METADATA, key("digest", word()), must("key_id", word()), must("created_at", instant()),
    must("expires_at", instant()), sa.Column("ended_at", instant()),
    sa.ForeignKeyConstraint(["key_id"], ["access_key.key_id"], name="sign_in_key"), sqlite_strict=True,
)  # fmt: skip


def table_of(series_id: int) -> sa.Table:
    """Where the values of a series live."""
    return ANALYSIS if series_id < 0 else READING
