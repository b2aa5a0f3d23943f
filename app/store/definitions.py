"""Dated definitions: bodies of sites, substances, vessels, meters and feeds, each from an instant on."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Literal, NamedTuple

import sqlalchemy as sa
from sqlalchemy.engine import Connection

from app.store.engine import Writing
from app.store.tables import ALWAYS, DEFINITION

Outcome = Literal["created", "revised", "unchanged"]


class EffectiveFromNeeded(Exception):  # noqa: N818
    """A changed body that does not say from when: "from now" and "for ever" are both dangerous guesses."""


class Definition(NamedTuple):
    """One body, from one instant on, as one revision said it."""

    name: str
    effective_from: int  # ALWAYS: for all time before, too
    revision: int
    recorded_at: int
    body: str


_C = DEFINITION.c
_COLUMNS = (_C.name, _C.effective_from, _C.revision, _C.recorded_at, _C.body)


def put(writing: Writing, kind: str, name: str, effective_from: int | None, body: str) -> Outcome:
    """Keep a body, canonical JSON of what was sent.

    The first body of a name may leave ``effective_from`` out and then holds for all time before, too. A
    later one must give it, unless it says again what the newest or the first one says. The same
    ``effective_from`` corrects that one.
    """
    standing = {
        one.effective_from: one
        for one in _newest_known(writing.connection, writing.site_id, kind, writing.recorded_at, [name])
    }
    if effective_from is None and standing:
        last = standing[max(standing)]
        if body == last.body or (ALWAYS in standing and body == standing[ALWAYS].body):
            return "unchanged"
        raise EffectiveFromNeeded(name)
    begins = ALWAYS if effective_from is None else effective_from
    former = standing.get(begins)
    if former is not None and former.body == body:
        return "unchanged"
    writing.connection.execute(sa.insert(DEFINITION), {
        "site_id": writing.site_id, "kind": kind, "name": name, "effective_from": begins,
        "revision": 1 if former is None else former.revision + 1,
        "recorded_at": writing.recorded_at, "body": body,
    })  # fmt: skip
    return "revised" if standing else "created"


def in_force(
    connection: Connection, site_id: int, kind: str, at: int, known: int, names: Sequence[str] | None = None
) -> list[Definition]:
    """The body of each name that holds at an instant, as it was known; by name."""
    held: dict[str, Definition] = {}
    for one in _newest_known(connection, site_id, kind, known, names, before=at):
        held[one.name] = one  # they come in the order of effective_from
    return list(held.values())


def timeline(
    connection: Connection, site_id: int, kind: str, lo: int, hi: int, known: int,
    names: Sequence[str] | None = None,
) -> list[Definition]:  # fmt: skip
    """The bodies that hold at some instant from ``lo`` to before ``hi``, by name and then by time."""
    kept: list[Definition] = []
    for one in _newest_known(connection, site_id, kind, known, names, before=hi - 1):
        if kept and kept[-1].name == one.name and one.effective_from <= lo:
            kept.pop()  # replaced before the period began
        kept.append(one)
    return kept


def revisions(connection: Connection, site_id: int, kind: str, name: str, known: int) -> list[Definition]:
    """Everything that was ever said of a name and was known, in the order in which it was recorded."""
    rows = connection.execute(
        sa.select(*_COLUMNS)
        .where(_C.site_id == site_id, _C.kind == kind, _C.name == name, _C.recorded_at <= known)
        .order_by(_C.recorded_at, _C.effective_from)
    )
    return [Definition(*row) for row in rows]


def listing(
    connection: Connection, site_id: int, kind: str, at: int, known: int, *,
    after: str = "", limit: int = 1000,
) -> tuple[list[Definition], str | None]:  # fmt: skip
    """A page of the bodies in force, by name from the one after ``after`` on, and the next cursor."""
    defined = (
        sa.select(_C.name)
        .where(_C.site_id == site_id, _C.kind == kind, _C.name > after)
        .where(_C.effective_from <= at, _C.recorded_at <= known)
        .distinct().order_by(_C.name).limit(limit + 1)
    )  # fmt: skip
    names = list(connection.scalars(defined))
    page = in_force(connection, site_id, kind, at, known, names[:limit])
    return page, names[limit - 1] if len(names) > limit else None


def _newest_known(
    connection: Connection, site_id: int, kind: str, known: int, names: Sequence[str] | None,
    before: int | None = None,
) -> list[Definition]:  # fmt: skip
    """The last known revision of each ``effective_from`` up to an instant, by name and then by time."""
    query: sa.Select[Any] = (
        sa.select(*_COLUMNS)
        .where(_C.site_id == site_id, _C.kind == kind, _C.recorded_at <= known)
        .order_by(_C.name, _C.effective_from, _C.revision)
    )
    if names is not None:
        query = query.where(_C.name.in_(names))
    if before is not None:
        query = query.where(_C.effective_from <= before)
    newest = {(row[0], row[1]): Definition(*row) for row in connection.execute(query)}
    return list(newest.values())
