"""Sites and definitions by name, or a refusal that says what is missing."""

from __future__ import annotations

from sqlalchemy import Connection

from app.errors import NotFound
from app.store import sites

ALL_TIME = 2**62  # µs; an instant after every other


def site_number(connection: Connection, site: str) -> int:
    """The number of a site; 404 where nobody defined it."""
    found = sites.find(connection, site)
    if found is None:
        raise NotFound("There is no site of that id", code="unknown_site")
    return found


def watermark(connection: Connection, site_id: int, as_of: int | None) -> int:
    """What an answer may include: what is known now, or what was known at an instant."""
    newest = sites.watermark(connection, site_id)
    return newest if as_of is None else min(newest, as_of)
