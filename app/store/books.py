"""Closed periods: each revision with the digest of its inputs, and each vessel's closing inventory."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, NamedTuple

import sqlalchemy as sa
from sqlalchemy.engine import Connection

from app.store.engine import Writing
from app.store.tables import BOOK, BOOK_VESSEL


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
    """What one vessel held at the close: its mass, and named parts of the uncertainty as JSON."""

    vessel: str
    mass_kg: float | None
    parts: str
    flagged: bool


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
    vessels: Sequence[BookVessel],
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
    rows = [key | one._asdict() | {"flagged": int(one.flagged)} for one in vessels]
    if rows:
        writing.connection.execute(sa.insert(BOOK_VESSEL), rows)
    return book, True


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
