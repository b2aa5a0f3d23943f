"""Names become numbers: a series for (vessel, quantity, source), a citation for a text."""

from __future__ import annotations

import hashlib
from collections.abc import Collection, Sequence
from typing import NamedTuple

import sqlalchemy as sa
from sqlalchemy.engine import Connection

from app.store.engine import Writing
from app.store.tables import CITED, LABORATORY, QUANTITIES, QUANTITY_NAMES, SERIES

Name = tuple[str, str, str]  # vessel, quantity, source


class Series(NamedTuple):
    """One quantity of one vessel from one source; the vessel of the site's own readings is ``""``."""

    series_id: int
    vessel: str
    quantity: str
    source: str


def series_of(connection: Connection, site_id: int, vessels: Sequence[str] | None = None) -> list[Series]:
    """All series of a site, or of some of its vessels."""
    c = SERIES.c
    query = sa.select(c.series_id, c.vessel, c.quantity, c.source).where(c.site_id == site_id)
    if vessels is not None:
        query = query.where(c.vessel.in_(vessels))
    return [
        Series(number, vessel, QUANTITY_NAMES[quantity], source)
        for number, vessel, quantity, source in connection.execute(query)
    ]


def numbered(writing: Writing, names: Collection[Name]) -> dict[Name, int]:
    """The number of each series; those that are new are made."""
    vessels = sorted({vessel for vessel, _, _ in names})
    found = {
        (series.vessel, series.quantity, series.source): series.series_id
        for series in series_of(writing.connection, writing.site_id, vessels)
    }
    new = sorted(name for name in names if name not in found)
    if new:
        c = SERIES.c
        ends = sa.select(sa.func.min(c.series_id), sa.func.max(c.series_id))
        least, greatest = writing.connection.execute(ends.where(c.site_id == writing.site_id)).one()
        least, greatest = min(least or 0, 0), max(greatest or 0, 0)
        for name in new:
            if name[1] in LABORATORY:
                found[name] = least = least - 1
            else:
                found[name] = greatest = greatest + 1
        writing.connection.execute(sa.insert(SERIES), [
            {"site_id": writing.site_id, "series_id": found[name],
             "vessel": name[0], "quantity": QUANTITIES[name[1]], "source": name[2]} for name in new
        ])  # fmt: skip
    return found


def cited(writing: Writing, texts: Collection[str]) -> dict[str, int]:
    """The number of each cited text; those that are new are kept."""
    if not texts:
        return {}
    digests = {hashlib.sha256(text.encode()).hexdigest(): text for text in texts}
    c = CITED.c
    known = sa.select(c.digest, c.cited_id).where(c.site_id == writing.site_id, c.digest.in_(list(digests)))
    found = {digests[digest]: number for digest, number in writing.connection.execute(known)}
    new = sorted((text, digest) for digest, text in digests.items() if text not in found)
    if new:
        newest = sa.select(sa.func.max(c.cited_id)).where(c.site_id == writing.site_id)
        first = (writing.connection.scalar(newest) or 0) + 1
        rows = [
            {"site_id": writing.site_id, "cited_id": number, "digest": digest, "body": text}
            for number, (text, digest) in enumerate(new, first)
        ]
        writing.connection.execute(sa.insert(CITED), rows)
        found |= {text: number for number, (text, _) in enumerate(new, first)}
    return found
