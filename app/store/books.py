"""Closed periods: each revision with the digest of its inputs, and each vessel's closing inventory."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, NamedTuple

import sqlalchemy as sa
from sqlalchemy.engine import Connection

from app.store.engine import Writing
from app.store.tables import BOOK, BOOK_MOVE, BOOK_SLOPE, BOOK_VESSEL


class Book(NamedTuple):
    """One revision of a closed period."""

    opening: int
    closing: int
    revision: int
    recorded_at: int
    known_at: int
    digest: str
    method: str
    body: str


class BookVessel(NamedTuple):
    """What one vessel held at the close: its mass, and named parts of the uncertainty as JSON.

    ``slopes`` is how the mass follows what was read, as JSON; empty where it does not.
    """

    vessel: str
    mass_kg: float | None
    parts: str
    flagged: bool
    slopes: str = ""


class BookMove(NamedTuple):
    """What one ticket moved in a period; an end beyond the books is empty, so is a meter that there is not."""

    transfer: str
    source: str
    target: str
    mass_kg: float | None
    parts: str
    meter: str


class WindowNight(NamedTuple):
    """One closed period of a chain: its closing inventories, how they follow their inputs, and what moved."""

    book: Book
    vessels: tuple[Night, ...]
    slopes: dict[str, str]
    moves: tuple[BookMove, ...]


class Night(NamedTuple):
    """One vessel's closing inventory in one book."""

    vessel: str
    opening: int
    closing: int
    revision: int
    mass_kg: float | None
    parts: str
    flagged: bool


_B, _V = BOOK.c, BOOK_VESSEL.c
_COLUMNS = (_B.opening, _B.closing, _B.revision, _B.recorded_at, _B.known_at, _B.digest, _B.method, _B.body)


def write_book(
    writing: Writing, opening: int, closing: int, digest: str, known_at: int, method: str, body: str,
    vessels: Sequence[BookVessel], moves: Sequence[BookMove] = (),
) -> tuple[Book, bool]:  # fmt: skip
    """Keep a close unless one stands that knew as much; the book that stands now, and whether it is new.

    The digest is of the inputs and the method. The same digest, or one that stands with a watermark not
    older than ``known_at``, stands: of many closers of one night one writes, whatever their order.
    """
    former = newest(writing.connection, writing.site_id, opening, closing, writing.recorded_at)
    if former is not None and (former.digest == digest or former.known_at >= known_at):
        return former, False
    revision = 1 if former is None else former.revision + 1
    book = Book(opening, closing, revision, writing.recorded_at, known_at, digest, method, body)
    site = {"site_id": writing.site_id}
    writing.connection.execute(sa.insert(BOOK), site | book._asdict())
    key = site | {"opening": opening, "closing": closing, "revision": revision}
    _write_rows(writing, key, vessels, moves)
    return book, True


def _write_rows(
    writing: Writing, key: dict[str, int], vessels: Sequence[BookVessel], moves: Sequence[BookMove]
) -> None:
    rows: list[tuple[sa.Table, list[dict[str, Any]]]] = [
        (BOOK_VESSEL, [key | {"vessel": one.vessel, "mass_kg": one.mass_kg, "parts": one.parts,
                              "flagged": int(one.flagged)} for one in vessels]),
        (BOOK_SLOPE, [key | {"vessel": one.vessel, "body": one.slopes} for one in vessels if one.slopes]),
        (BOOK_MOVE, [key | {"place": place} | one._asdict() for place, one in enumerate(moves)]),
    ]  # fmt: skip
    for table, own in rows:
        if own:
            writing.connection.execute(sa.insert(table), own)


def chain(connection: Connection, site_id: int, opening: int, known: int, count: int) -> list[WindowNight]:
    """The closed periods that lead up to an instant, oldest first: each closes where the next opens."""
    found: list[Book] = []
    while len(found) < count:
        book = closing_at(connection, site_id, opening, known)
        if book is None:
            break
        found.append(book)
        opening = book.opening
    return [_window_night(connection, site_id, book) for book in reversed(found)]


def _window_night(connection: Connection, site_id: int, book: Book) -> WindowNight:
    def own(table: sa.Table) -> sa.ColumnElement[bool]:
        return sa.and_(
            table.c.site_id == site_id, table.c.opening == book.opening, table.c.closing == book.closing,
            table.c.revision == book.revision,
        )  # fmt: skip

    slopes = connection.execute(sa.select(BOOK_SLOPE.c.vessel, BOOK_SLOPE.c.body).where(own(BOOK_SLOPE)))
    columns = [BOOK_MOVE.c[name] for name in BookMove._fields]
    moves = connection.execute(sa.select(*columns).where(own(BOOK_MOVE)).order_by(BOOK_MOVE.c.place))
    return WindowNight(
        book, tuple(vessels_of(connection, site_id, book)), {row.vessel: row.body for row in slopes},
        tuple(BookMove(*row) for row in moves),
    )  # fmt: skip


def newest(connection: Connection, site_id: int, opening: int, closing: int, known: int) -> Book | None:
    """The last known revision of a period."""
    found = revisions(connection, site_id, opening, closing, known, limit=1)
    return found[0] if found else None


def revision(connection: Connection, site_id: int, opening: int, closing: int, number: int) -> Book | None:
    """One revision of a period."""
    query = sa.select(*_COLUMNS).where(
        _B.site_id == site_id, _B.opening == opening, _B.closing == closing, _B.revision == number
    )
    row = connection.execute(query).one_or_none()
    return None if row is None else Book(*row)


def revisions(
    connection: Connection, site_id: int, opening: int, closing: int, known: int, limit: int = 1000
) -> list[Book]:
    """Known revisions of a period, newest first."""
    rows = connection.execute(
        sa.select(*_COLUMNS)
        .where(_B.site_id == site_id, _B.opening == opening, _B.closing == closing, _B.recorded_at <= known)
        .order_by(_B.revision.desc()).limit(limit)
    )  # fmt: skip
    return [Book(*row) for row in rows]


def listing(
    connection: Connection, site_id: int, lo: int, hi: int, known: int, *,
    cursor: tuple[int, int] | None = None, limit: int = 1000,
) -> tuple[list[Book], tuple[int, int] | None]:  # fmt: skip
    """A page of the books that close after ``lo`` and not after ``hi``, and the next cursor.

    They stand by closing and opening, each period once, at its last known revision.
    """
    query = (
        sa.select(*_COLUMNS)
        .where(_B.site_id == site_id, _B.closing > lo, _B.closing <= hi, _B.revision == _last_known(known))
        .order_by(_B.closing, _B.opening).limit(limit + 1)
    )  # fmt: skip
    if cursor is not None:
        query = query.where(_B.closing >= cursor[0], sa.tuple_(_B.closing, _B.opening) > cursor)
    books = [Book(*row) for row in connection.execute(query)]
    last = books[limit - 1] if len(books) > limit else None
    return books[:limit], None if last is None else (last.closing, last.opening)


def closing_at(connection: Connection, site_id: int, instant: int, known: int) -> Book | None:
    """The book that closes at an instant, which opens the next; of several the shortest period's."""
    query = (
        sa.select(*_COLUMNS)
        .where(_B.site_id == site_id, _B.closing == instant, _B.revision == _last_known(known))
        .order_by(_B.opening.desc()).limit(1)
    )  # fmt: skip
    row = connection.execute(query).one_or_none()
    return None if row is None else Book(*row)


def newest_closing(connection: Connection, site_id: int) -> int | None:
    """The end of the last closed period."""
    last: int | None = connection.scalar(sa.select(sa.func.max(_B.closing)).where(_B.site_id == site_id))
    return last


def vessels_of(connection: Connection, site_id: int, book: Book) -> list[Night]:
    """The closing inventories of one book, by vessel."""
    query = _nights(site_id).where(
        _V.opening == book.opening, _V.closing == book.closing, _V.revision == book.revision
    )
    return [_night(row) for row in connection.execute(query.order_by(_V.vessel))]


def nights(
    connection: Connection, site_id: int, vessel: str, lo: int, hi: int, known: int
) -> list[Night]:
    """A vessel's closing inventories after ``lo`` and not after ``hi``, by the last known revisions."""
    query = (
        _nights(site_id)
        .join(BOOK, sa.and_(_B.site_id == _V.site_id, _B.opening == _V.opening, _B.closing == _V.closing,
                            _B.revision == _V.revision))
        .where(_V.vessel == vessel, _V.closing > lo, _V.closing <= hi, _B.revision == _last_known(known))
        .order_by(_V.closing, _V.opening)
    )  # fmt: skip
    return [_night(row) for row in connection.execute(query)]


def _nights(site_id: int) -> sa.Select[Any]:
    columns = (_V.vessel, _V.opening, _V.closing, _V.revision, _V.mass_kg, _V.parts, _V.flagged)
    return sa.select(*columns).where(_V.site_id == site_id)


def _night(row: Sequence[Any]) -> Night:
    vessel, opening, closing, number, mass_kg, parts, flagged = row
    return Night(vessel, opening, closing, number, mass_kg, parts, bool(flagged))


def _last_known(known: int) -> sa.ScalarSelect[Any]:
    newer = BOOK.alias("newer")
    return (
        sa.select(sa.func.max(newer.c.revision))
        .where(newer.c.site_id == _B.site_id, newer.c.opening == _B.opening, newer.c.closing == _B.closing)
        .where(newer.c.recorded_at <= known).correlate(BOOK).scalar_subquery()
    )  # fmt: skip
