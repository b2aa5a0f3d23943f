"""What is to be closed, marked by the transaction that makes it due. Rows of this table change."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any, NamedTuple

import sqlalchemy as sa
from sqlalchemy.dialects import postgresql, sqlite
from sqlalchemy.engine import Connection

from app.store.engine import Writing
from app.store.tables import BOOK, DUE

ATTEMPTS = 5  # a period that failed so often waits for new data, or for a person


class Due(NamedTuple):
    """A period to close: why, since when, how often it was tried and what went wrong last."""

    site_id: int
    opening: int
    closing: int
    cause: str
    marked_at: int
    attempts: int
    error: str | None


_C = DUE.c
_COLUMNS = (_C.site_id, _C.opening, _C.closing, _C.cause, _C.marked_at, _C.attempts, _C.error)


def mark(writing: Writing, periods: Iterable[tuple[int, int]], cause: str) -> None:
    """Make periods due; one that is due already is due anew, so that a close under way does not end it."""
    rows = [
        {"site_id": writing.site_id, "opening": opening, "closing": closing, "cause": cause,
         "marked_at": writing.recorded_at, "attempts": 0, "error": None}
        for opening, closing in sorted(set(periods))
    ]  # fmt: skip
    if rows:
        insert: Any = (postgresql if writing.store.dialect == "postgresql" else sqlite).insert(DUE)
        anew = {name: insert.excluded[name] for name in ("cause", "marked_at", "attempts", "error")}
        keys = [_C.site_id, _C.opening, _C.closing]
        writing.connection.execute(insert.on_conflict_do_update(index_elements=keys, set_=anew), rows)


def mark_touched(writing: Writing, lo: int, hi: int, cause: str) -> list[tuple[int, int]]:
    """Make due every closed period that begins or ends, or lies, between two instants (both included)."""
    b = BOOK.c
    touched = (
        sa.select(b.opening, b.closing)
        .where(b.site_id == writing.site_id, b.closing >= lo, b.opening <= hi)
        .distinct().order_by(b.closing, b.opening)
    )  # fmt: skip
    periods = [(opening, closing) for opening, closing in writing.connection.execute(touched)]
    mark(writing, periods, cause)
    return periods


def mark_opening_at(writing: Writing, instant: int, cause: str) -> list[tuple[int, int]]:
    """Make due every closed period that opens at an instant: its opening is what was just closed anew."""
    b = BOOK.c
    following = (
        sa.select(b.opening, b.closing).where(b.site_id == writing.site_id, b.opening == instant)
        .distinct().order_by(b.closing)
    )  # fmt: skip
    periods = [(opening, closing) for opening, closing in writing.connection.execute(following)]
    mark(writing, periods, cause)
    return periods


def listing(connection: Connection, site_id: int | None = None) -> list[Due]:
    """What is due, of one site or of all, oldest close first, so that books chain."""
    query = sa.select(*_COLUMNS).order_by(_C.closing, _C.opening, _C.site_id)
    if site_id is not None:
        query = query.where(_C.site_id == site_id)
    return [Due(*row) for row in connection.execute(query)]


def take(writing: Writing, ended_by: int) -> Due | None:
    """The site's oldest due period that has ended and may still be tried; it counts as one attempt."""
    query = (
        sa.select(*_COLUMNS)
        .where(_C.site_id == writing.site_id, _C.closing <= ended_by, _C.attempts < ATTEMPTS)
        .order_by(_C.closing, _C.opening).limit(1)
    )  # fmt: skip
    row = writing.connection.execute(query).one_or_none()
    if row is None:
        return None
    taken = Due(*row)
    writing.connection.execute(_one(sa.update(DUE), writing, taken.opening, taken.closing), {
        "attempts": taken.attempts + 1,
    })  # fmt: skip
    return taken._replace(attempts=taken.attempts + 1)


def finish(writing: Writing, opening: int, closing: int, known_at: int) -> bool:
    """End a period that was closed with what was known; False if it was marked again since then."""
    done = _one(sa.delete(DUE), writing, opening, closing).where(_C.marked_at <= known_at)
    return writing.connection.execute(done).rowcount > 0


def fail(writing: Writing, opening: int, closing: int, error: str) -> None:
    """Note what went wrong with an attempt."""
    writing.connection.execute(_one(sa.update(DUE), writing, opening, closing), {"error": error})


def _one(statement: Any, writing: Writing, opening: int, closing: int) -> Any:
    return statement.where(_C.site_id == writing.site_id, _C.opening == opening, _C.closing == closing)
