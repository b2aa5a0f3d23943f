"""Sites by name, and what was recorded at each: the watermark and the audit."""

from __future__ import annotations

from typing import NamedTuple

import sqlalchemy as sa
from sqlalchemy.engine import Connection

from app.store.engine import UnknownSite
from app.store.tables import RECORDING, SITE


class Recording(NamedTuple):
    """One writing transaction: who did what, by which request."""

    recorded_at: int
    actor: str
    deed: str
    request: str


def find(connection: Connection, name: str) -> int | None:
    """The number of a site, if anybody defined it."""
    return connection.scalar(sa.select(SITE.c.site_id).where(SITE.c.name == name))


def number(connection: Connection, name: str) -> int:
    """The number of a site; ``UnknownSite`` if nobody defined it."""
    found = find(connection, name)
    if found is None:
        raise UnknownSite(name)
    return found


def watermark(connection: Connection, site_id: int) -> int:
    """The newest ``recorded_at`` that this transaction sees: what is known now; 0 if nothing was written."""
    newest = sa.select(sa.func.max(RECORDING.c.recorded_at)).where(RECORDING.c.site_id == site_id)
    return connection.scalar(newest) or 0


def listing(connection: Connection, after: str = "", limit: int = 1000) -> list[tuple[int, str]]:
    """Numbers and names in the order of the names, from the one after ``after`` on."""
    rows = connection.execute(
        sa.select(SITE.c.site_id, SITE.c.name).where(SITE.c.name > after).order_by(SITE.c.name).limit(limit)
    )
    return [(row.site_id, row.name) for row in rows]


def recordings(connection: Connection, site_id: int, lo: int, hi: int, limit: int = 1000) -> list[Recording]:
    """Who wrote what between two instants (both included), oldest first."""
    c = RECORDING.c
    rows = connection.execute(
        sa.select(c.recorded_at, c.actor, c.deed, c.request)
        .where(c.site_id == site_id, c.recorded_at >= lo, c.recorded_at <= hi)
        .order_by(c.recorded_at)
        .limit(limit)
    )
    return [Recording(*row) for row in rows]
