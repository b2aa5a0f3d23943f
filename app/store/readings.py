"""Values of readings: kept once, revised by contradiction, read as they were known."""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator, Sequence
from itertools import chain, pairwise
from typing import Any, Literal, NamedTuple

import sqlalchemy as sa
from sqlalchemy.engine import Connection

from app.store import seek
from app.store.engine import Writing
from app.store.months import make_months
from app.store.series import Series, cited, numbered, series_of
from app.store.tables import ANALYSIS, BAD, CITED, GOOD, READING, table_of

__all__ = [
    "Course", "Found", "Listed", "Outcome", "Series", "Value",
    "course", "following", "listing", "newest", "recorded", "series_of", "write_values",
]  # fmt: skip

Outcome = Literal["stored", "revised", "unchanged", "stale_correction"]
FEW = 100  # keys; for more, series that have nothing in the batch's time are left out first


class Value(NamedTuple):
    """One value as it came; a number, a text (a sample's id, a composition as canonical JSON), or both."""

    vessel: str
    quantity: str
    source: str
    taken_at: int
    value: float | None = None
    cited: str | None = None
    quality: int = GOOD
    corrects: int | None = None  # the recorded_at of what is to be replaced


class Found(NamedTuple):
    """One value as it was kept."""

    series_id: int
    taken_at: int
    value: float | None
    cited: str | None
    quality: int
    revision: int
    recorded_at: int


class Course(NamedTuple):
    """Usable values of several series as columns, by series and then by time."""

    series_id: list[int]
    taken_at: list[int]
    value: list[float | None]
    cited: list[str | None]
    quality: list[int]
    revision: list[int]


class Listed(NamedTuple):
    """One reading as it was kept: the values of one source at one instant, by quantity."""

    taken_at: int
    source: str
    values: dict[str, Found]


# Plain tuples: a batch makes one of each for every value, and named ones take four times as long.
_Row = tuple[int, int, int, float | None, int | None, int, int | None]
"""Position in the batch, series, instant, value, citation, quality, what it corrects."""
_Kept = tuple[int, int, float | None, int | None, int]
"""Revision, recorded_at, value, citation, quality."""
_Key = tuple[int, int]  # series, instant


def write_values(writing: Writing, values: Sequence[Value]) -> list[Outcome]:
    """Keep what is new, and say of each value, in order, what became of it.

    A value that equals any revision kept of its series and instant, to the last bit and with its quality,
    is *unchanged*; another one is a new revision. With ``corrects`` it is compared with the newest
    revision only, and is stale unless that is the one it names. The same key twice is taken in order.

    The revisions that stand are read first and the decision is made here: under the site's lock nobody
    else writes, so it cannot go stale, and one rule serves new values, repeats and corrections.
    """
    rows = _rows(writing, values)
    outcomes: list[Outcome] = ["stored"] * len(values)
    for table in (READING, ANALYSIS):
        own = [row for row in rows if table_of(row[1]) is table]
        if own:
            _write(writing, table, own, outcomes)
    return outcomes


def _rows(writing: Writing, values: Sequence[Value]) -> list[_Row]:
    series = numbered(writing, {value[:3] for value in values})
    texts = cited(writing, {value.cited for value in values if value.cited is not None})
    rows: list[_Row] = []
    for position, (vessel, quantity, source, taken_at, value, text, quality, corrects) in enumerate(values):
        if value is not None:
            if not math.isfinite(value):
                raise ValueError(f"the value at index {position} is not a finite number")
            value = value + 0.0  # −0.0 becomes 0.0, of which it is no revision
        elif text is None:
            raise ValueError(f"the value at index {position} says nothing")
        cited_id = None if text is None else texts[text]
        number = series[vessel, quantity, source]
        rows.append((position, number, taken_at, value, cited_id, quality, corrects))
    return rows


def _write(writing: Writing, table: sa.Table, rows: Sequence[_Row], outcomes: list[Outcome]) -> None:
    standing = _standing(writing.connection, table, writing.site_id, {row[1:3] for row in rows})
    site_id, recorded_at = writing.site_id, writing.recorded_at
    new: list[tuple[int, int, int, int, int, float | None, int | None, int]] = []
    for position, series_id, taken_at, value, cited_id, quality, corrects in rows:
        said = (value, cited_id, quality)
        kept = standing.get((series_id, taken_at))
        if kept is None and corrects is None:  # "stored", and most of all values
            revision = 1
            standing[series_id, taken_at] = [(1, recorded_at, *said)]
        else:
            outcome = outcomes[position] = _outcome(kept, said, corrects)
            if kept is None or outcome != "revised":
                continue
            revision = kept[-1][0] + 1
            kept.append((revision, recorded_at, *said))
        new.append((site_id, series_id, taken_at, revision, recorded_at, value, cited_id, quality))
    if new:
        new.sort()  # in the order of the key: neighbours share pages
        if table is READING:
            make_months(writing.store, (row[2] for row in new))
        _insert(writing.connection, table, new)


def _outcome(kept: Sequence[_Kept] | None, said: tuple[float | None, int | None, int], corrects: int | None) -> Outcome:
    """What becomes of a value where something is kept, or where it corrects something."""
    if kept is None:
        return "stale_correction"
    if corrects is None:
        return "unchanged" if any(said == one[2:] for one in kept) else "revised"
    if said == kept[-1][2:]:
        return "unchanged"
    return "revised" if kept[-1][1] == corrects else "stale_correction"


_COLUMNS = "site_id, series_id, taken_at, revision, recorded_at, value, cited_id, quality"
_TYPES = ("int4", "int4", "int8", "int2", "int8", "float8", "int4", "int2")


def _insert(connection: Connection, table: sa.Table, rows: Sequence[tuple[object, ...]]) -> None:
    if connection.dialect.name == "sqlite":
        marks = ", ".join("?" * len(_TYPES))
        connection.exec_driver_sql(f"INSERT INTO {table.name} ({_COLUMNS}) VALUES ({marks})", list(rows))
        return
    driver = connection.connection.driver_connection
    assert driver is not None
    statement = f"COPY {table.name} ({_COLUMNS}) FROM STDIN (FORMAT BINARY)"
    with driver.cursor() as cursor, cursor.copy(statement) as copy:
        copy.set_types(_TYPES)
        for row in rows:
            copy.write_row(row)


def _standing(
    connection: Connection, table: sa.Table, site_id: int, keys: set[_Key]
) -> dict[_Key, list[_Kept]]:
    """The revisions kept of each key, in order."""
    if len(keys) > FEW:
        bounds: dict[int, tuple[int, int]] = {}
        for series_id, at in keys:
            lo, hi = bounds.get(series_id, (at, at))
            bounds[series_id] = (at if at < lo else lo, at if at > hi else hi)
        wanted = [(series_id, lo, hi) for series_id, (lo, hi) in bounds.items()]
        met = seek.touched(connection, table.name, site_id, wanted)
        keys = {key for key in keys if key[0] in met}
    found: dict[_Key, list[_Kept]] = {}
    if keys:
        for row in seek.revisions(connection, table.name, site_id, sorted(keys)):
            found.setdefault(row[:2], []).append(row[2:])
    return found


def newest(
    connection: Connection, site_id: int, wanted: Iterable[tuple[int, int]], at: int, known: int
) -> list[Found]:
    """The newest usable value of each series at or before an instant, as it was known.

    ``wanted`` pairs a series with the oldest instant that still counts (included). A series that has no
    such value has no row. A withdrawn instant is passed over.
    """
    pairs = [(series_id, oldest, at) for series_id, oldest in wanted]
    return _neighbours(connection, site_id, pairs, known, newest=True)


def following(
    connection: Connection, site_id: int, wanted: Iterable[tuple[int, int]], at: int, known: int
) -> list[Found]:
    """The first usable value of each series after an instant, as it was known.

    ``wanted`` pairs a series with the latest instant that still counts (included).
    """
    pairs = [(series_id, at + 1, latest) for series_id, latest in wanted]
    return _neighbours(connection, site_id, pairs, known, newest=False)


def newest_each(
    connection: Connection, site_id: int, wanted: Iterable[tuple[int, int, int]], known: int
) -> list[Found]:
    """Like ``newest``, each series (once) by two instants of its own: the oldest that counts, and the latest."""
    return _neighbours(connection, site_id, list(wanted), known, newest=True)


def following_each(
    connection: Connection, site_id: int, wanted: Iterable[tuple[int, int, int]], known: int
) -> list[Found]:
    """Like ``following``, each series (once) by two instants of its own, both included."""
    return _neighbours(connection, site_id, list(wanted), known, newest=False)


def _neighbours(
    connection: Connection, site_id: int, wanted: Sequence[tuple[int, int, int]], known: int, *, newest: bool
) -> list[Found]:
    rows: list[Found] = []
    for table in (READING, ANALYSIS):
        own = [row for row in wanted if table_of(row[0]) is table]
        if own:
            found = seek.neighbours(connection, table.name, site_id, own, known, newest=newest)
            rows.extend(Found(*row) for row in found)
    return rows


def recorded(
    connection: Connection, site_id: int, keys: Sequence[_Key], since: int, known: int
) -> list[tuple[Found, bool]]:
    """The last revision of each key that was recorded after one instant and up to another, if there is any.

    True beside one of which nothing was kept before.
    """
    last: dict[_Key, tuple[Found, bool]] = {}
    for table in (READING, ANALYSIS):
        own = sorted(key for key in keys if table_of(key[0]) is table)
        for series_id, at, number, when, value, _, quality in (
            seek.revisions(connection, table.name, site_id, own) if own else ()
        ):
            if since < when <= known:
                first = number == 1 or ((series_id, at) in last and last[series_id, at][1])
                last[series_id, at] = (Found(series_id, at, value, None, quality, number, when), first)
    return list(last.values())


def course(
    connection: Connection, site_id: int, series_ids: Sequence[int], lo: int, hi: int, known: int
) -> Course:
    """Every usable value of some series between two instants (both included), as it was known."""
    kept: list[Any] = []
    for table in (READING, ANALYSIS):
        own = [series_id for series_id in series_ids if table_of(series_id) is table]
        if own:
            c = table.c
            query = (
                sa.select(c.series_id, c.taken_at, c.value, CITED.c.body, c.quality, c.revision)
                .select_from(_with_cited(table))
                .where(c.site_id == site_id, c.series_id.in_(own), c.taken_at >= lo, c.taken_at <= hi)
                .where(c.recorded_at <= known)
                .order_by(c.series_id, c.taken_at, c.revision)
            )
            kept.extend(row for row in _last_revisions(connection.execute(query).all()) if row[4] < BAD)
    if not kept:
        return Course([], [], [], [], [], [])
    series, taken_at, value, text, quality, revision = (list(column) for column in zip(*kept, strict=True))
    return Course(series, taken_at, value, text, quality, revision)


def _last_revisions(rows: Sequence[Any]) -> Iterator[Any]:
    """Of rows ordered by series, instant and revision, the last of each instant."""
    for row, after in pairwise(chain(rows, (None,))):
        if after is None or row[1] != after[1] or row[0] != after[0]:
            yield row


def _with_cited(table: sa.Table) -> sa.Join:
    return table.join(
        CITED, sa.and_(CITED.c.site_id == table.c.site_id, CITED.c.cited_id == table.c.cited_id), isouter=True
    )


def listing(
    connection: Connection, site_id: int, vessel: str, lo: int, hi: int, known: int, *,
    source: str | None = None, cursor: tuple[int, str] | None = None, limit: int = 1000,
) -> tuple[list[Listed], tuple[int, str] | None]:  # fmt: skip
    """The readings of a vessel from ``lo`` to before ``hi``, withdrawn ones too, and the next cursor.

    They stand in the order (instant, source); a cursor is the last such key of the page before. Pages of
    one listing agree if they are asked with one ``known``.
    """
    wanted = [one for one in series_of(connection, site_id, [vessel]) if source in (None, one.source)]
    first = lo if cursor is None else max(lo, cursor[0])
    by_id = {one.series_id: one for one in wanted}
    found: dict[tuple[int, str], dict[str, Found]] = {}
    for row in _first_values(connection, site_id, list(by_id), first, hi, known, limit + 2):
        of = by_id[row.series_id]
        if cursor is None or (row.taken_at, of.source) > cursor:
            found.setdefault((row.taken_at, of.source), {})[of.quantity] = row
    keys = sorted(found)
    page = [Listed(*key, found[key]) for key in keys[:limit]]
    return page, keys[limit - 1] if len(keys) > limit else None


def _first_values(
    connection: Connection, site_id: int, series_ids: Sequence[int], lo: int, hi: int, known: int, count: int
) -> Iterator[Found]:
    """Of each series the first values, as many as could fall on one page: later ones cannot be on it."""
    for table in (READING, ANALYSIS):
        own = [series_id for series_id in series_ids if table_of(series_id) is table]
        for start in range(0, len(own), 100):  # SQLite joins at most 500 selects
            some = own[start : start + 100]
            first = [_first_of(table, site_id, series_id, lo, hi, known, count) for series_id in some]
            yield from (Found(*row) for row in connection.execute(sa.union_all(*first)))


def _first_of(
    table: sa.Table, site_id: int, series_id: int, lo: int, hi: int, known: int, count: int
) -> sa.Select[Any]:
    c, later = table.c, table.alias("later")
    newest_known = (
        sa.select(sa.func.max(later.c.revision))
        .where(later.c.site_id == site_id, later.c.series_id == series_id, later.c.taken_at == c.taken_at)
        .where(later.c.recorded_at <= known, later.c.taken_at >= lo, later.c.taken_at < hi)
        .correlate(table).scalar_subquery()
    )  # fmt: skip
    values = (
        sa.select(c.series_id, c.taken_at, c.value, CITED.c.body, c.quality, c.revision, c.recorded_at)
        .select_from(_with_cited(table))
        .where(c.site_id == site_id, c.series_id == series_id, c.taken_at >= lo, c.taken_at < hi)
        .where(c.recorded_at <= known, c.revision == newest_known)
        .order_by(c.taken_at).limit(count).subquery()
    )  # fmt: skip
    return sa.select(values)
