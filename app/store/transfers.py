"""Transfers: tickets by the client's id, revised, struck, and found by the period that they overlap."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any, Literal, NamedTuple

import sqlalchemy as sa
from sqlalchemy.engine import Connection

from app.store import seek
from app.store.engine import Writing
from app.store.tables import LONGEST_TRANSFER, TRANSFER

Outcome = Literal["created", "revised", "unchanged"]


class Transfer(NamedTuple):
    """One revision of a ticket. One that still runs ends, until it says so, when it must at the latest."""

    name: str
    revision: int
    recorded_at: int
    started_at: int
    ended_at: int
    running: bool
    void: bool
    body: str


_C = TRANSFER.c
_COLUMNS = (
    _C.name, _C.revision, _C.recorded_at, _C.started_at, _C.ended_at, _C.running, _C.void, _C.body,
)  # fmt: skip


def put(
    writing: Writing, name: str, started_at: int, ended_at: int | None, body: str, *,
    ends: tuple[str, str] = ("", ""), void: bool = False,
) -> Outcome:  # fmt: skip
    """Keep a ticket between two vessels (a boundary is ``""``); the same again changes nothing."""
    end = started_at + LONGEST_TRANSFER if ended_at is None else ended_at
    if not 0 <= end - started_at <= LONGEST_TRANSFER:
        raise ValueError(f"transfer {name} lasts from 0 to 31 days")
    said = (started_at, end, ended_at is None, void, body)
    former = current(writing.connection, writing.site_id, name, writing.recorded_at)
    if former is not None and tuple(former[3:]) == said:
        return "unchanged"
    writing.connection.execute(sa.insert(TRANSFER), {
        "site_id": writing.site_id, "name": name, "revision": 1 if former is None else former.revision + 1,
        "recorded_at": writing.recorded_at, "started_at": started_at, "ended_at": end,
        "source": ends[0], "target": ends[1], "running": int(ended_at is None), "void": int(void), "body": body,
    })  # fmt: skip
    return "created" if former is None else "revised"


def current(connection: Connection, site_id: int, name: str, known: int) -> Transfer | None:
    """The last known revision of one ticket, void or not."""
    query = (
        sa.select(*_COLUMNS)
        .where(_C.site_id == site_id, _C.name == name, _C.recorded_at <= known)
        .order_by(_C.revision.desc()).limit(1)
    )  # fmt: skip
    row = connection.execute(query).one_or_none()
    return None if row is None else _transfer(row)


def revisions(connection: Connection, site_id: int, name: str, known: int) -> list[Transfer]:
    """Every known revision of one ticket, oldest first."""
    known_rows = sa.select(*_COLUMNS).where(_C.site_id == site_id, _C.name == name, _C.recorded_at <= known)
    return [_transfer(row) for row in connection.execute(known_rows.order_by(_C.revision))]


def overlapping(
    connection: Connection, site_id: int, lo: int, hi: int, known: int, *, void: bool = False
) -> list[Transfer]:
    """Tickets that move something from ``lo`` to before ``hi``, as they were known, by end and name.

    A ticket of no duration belongs to the period in which it stands. Struck ones come with ``void``.
    """
    rows = connection.execute(_overlap(site_id, lo, hi, known, void).order_by(_C.ended_at, _C.name))
    return [_transfer(row) for row in rows]


def listing(
    connection: Connection, site_id: int, lo: int, hi: int, known: int, *,
    cursor: tuple[int, str] | None = None, limit: int = 1000,
) -> tuple[list[Transfer], tuple[int, str] | None]:  # fmt: skip
    """A page of the tickets that overlap a period, struck ones too, by end and name; and the next cursor."""
    query = _overlap(site_id, lo, hi, known, void=True)
    if cursor is not None:
        query = query.where(_C.ended_at >= cursor[0], sa.tuple_(_C.ended_at, _C.name) > cursor)
    rows = connection.execute(query.order_by(_C.ended_at, _C.name).limit(limit + 1)).all()
    page = [_transfer(row) for row in rows[:limit]]
    return page, (page[-1].ended_at, page[-1].name) if len(rows) > limit else None


def _overlap(site_id: int, lo: int, hi: int, known: int, void: bool) -> sa.Select[Any]:
    # A transfer lasts 31 days at most: both ends of the index are bounded, and nothing after is scanned.
    newer = TRANSFER.alias("newer")
    last_known = (
        sa.select(sa.func.max(newer.c.revision))
        .where(newer.c.site_id == site_id, newer.c.name == _C.name, newer.c.recorded_at <= known)
        .correlate(TRANSFER).scalar_subquery()
    )  # fmt: skip
    query = sa.select(*_COLUMNS).where(
        _C.site_id == site_id, _C.ended_at >= lo, _C.ended_at <= hi + LONGEST_TRANSFER, _C.started_at < hi,
        sa.or_(_C.ended_at > lo, _C.started_at == lo), _C.recorded_at <= known, _C.revision == last_known,
    )  # fmt: skip
    return query if void else query.where(_C.void == 0)


def touching(
    connection: Connection, site_id: int, since: Mapping[str, int], before: int, known: int
) -> list[Transfer]:
    """Tickets with an end at some vessels that moved something since an instant of each, and before one.

    Struck ones are left out. Each vessel is a seek by its name and the end of the ticket.
    """
    wanted = [(name, first) for name, first in since.items()]
    if not wanted:
        return []
    found = {row[0]: _transfer(row) for row in seek.tickets(connection, site_id, wanted, before, known)}
    return sorted(found.values(), key=lambda one: (one.ended_at, one.name))


def _transfer(row: Sequence[Any]) -> Transfer:
    name, revision, recorded_at, started_at, ended_at, running, void, body = row
    return Transfer(name, revision, recorded_at, started_at, ended_at, bool(running), bool(void), body)
