"""The statements whose plan is fixed by hand, for each database: every wanted row is a seek, never a scan.

A list of what is wanted goes in as one parameter (JSON on SQLite, arrays on PostgreSQL). The order of the
join is an instruction in all of them: CROSS JOIN after a materialised list on SQLite, LATERAL with a LIMIT
or OFFSET on PostgreSQL; a plan that starts from the values reads all of them. Bounds on ``taken_at`` that
hold for the whole list are parameters on PostgreSQL, which leaves out the months beyond them; SQLite would
seek by these bounds instead of by each row's own instants, and read all between.
"""

from __future__ import annotations

import json
from collections.abc import Sequence
from functools import cache
from typing import Any

import sqlalchemy as sa
from sqlalchemy.engine import Connection

from app.store.tables import BAD

Wanted = Sequence[tuple[int, int, int]]  # a series and two instants

# The revision that counts at an instant of series {series}: the newest that was known.
_KNOWN_REVISION = """(SELECT max(n.revision) FROM {table} n
    WHERE n.site_id = :site AND n.series_id = {series} AND n.taken_at = {instant} {bounds}
      AND n.recorded_at <= :known)"""
_USABLE = f"s.quality < {BAD} AND s.recorded_at <= :known"

_SQLITE_LIST = """WITH w(series_id, a, b) AS MATERIALIZED (
    SELECT json_extract(value, '$[0]'), json_extract(value, '$[1]'), json_extract(value, '$[2]')
    FROM json_each(:wanted))"""
_POSTGRESQL_LIST = """unnest(CAST(:series AS integer[]), CAST(:a AS bigint[]), CAST(:b AS bigint[]))
    AS w(series_id, a, b)"""


def _bounds(dialect: str, row: str) -> str:
    return f"AND {row}.taken_at >= :lo AND {row}.taken_at <= :hi" if dialect == "postgresql" else ""


def touched(connection: Connection, table: str, site_id: int, wanted: Wanted) -> set[int]:
    """The series that have any value from the first instant to the second."""
    within = f"s.taken_at >= w.a AND s.taken_at <= w.b {_bounds(connection.dialect.name, 's')}"
    any_value = f"""EXISTS (
        SELECT 1 FROM {table} s WHERE s.site_id = :site AND s.series_id = w.series_id AND {within})"""
    source = "w" if connection.dialect.name == "sqlite" else _POSTGRESQL_LIST
    prefix = _SQLITE_LIST if connection.dialect.name == "sqlite" else ""
    query = _text(f"{prefix} SELECT w.series_id FROM {source} WHERE {any_value}")
    return set(connection.scalars(query, _parameters(connection, site_id, wanted)))


def revisions(
    connection: Connection, table: str, site_id: int, keys: Sequence[tuple[int, int]]
) -> Sequence[Any]:
    """Every revision of the keys, in order.

    A row is (series, instant, revision, recorded_at, value, cited_id, quality).
    """
    columns = "s.series_id, s.taken_at, s.revision, s.recorded_at, s.value, s.cited_id, s.quality"
    bounds = _bounds(connection.dialect.name, "s")
    where = f"s.site_id = :site AND s.series_id = w.series_id AND s.taken_at = w.a {bounds}"
    if connection.dialect.name == "sqlite":
        query = f"{_SQLITE_LIST} SELECT {columns} FROM w CROSS JOIN {table} s WHERE {where}"
    else:
        lateral = f"(SELECT {columns} FROM {table} s WHERE {where} OFFSET 0)"
        query = f"SELECT s.* FROM {_POSTGRESQL_LIST} CROSS JOIN LATERAL {lateral} s"
    wanted = [(series, instant, instant) for series, instant in keys]
    parameters = _parameters(connection, site_id, wanted)
    return connection.execute(_text(f"{query} ORDER BY 1, 2, 3"), parameters).all()


def neighbours(
    connection: Connection, table: str, site_id: int, wanted: Wanted, known: int, *, newest: bool
) -> Sequence[Any]:
    """The newest (or the first) usable value of each series between its two instants, both included."""
    query = _text(_neighbours(connection.dialect.name, table, newest))
    return connection.execute(query, {**_parameters(connection, site_id, wanted), "known": known}).all()


@cache
def _neighbours(dialect: str, table: str, newest: bool) -> str:
    order = "DESC" if newest else "ASC"
    revision = _KNOWN_REVISION.format(
        table=table, series="w.series_id", instant="s.taken_at", bounds=_bounds(dialect, "n")
    )
    within = f"""s.site_id = :site AND s.series_id = w.series_id AND s.taken_at >= w.a AND s.taken_at <= w.b
        {_bounds(dialect, "s")} AND {_USABLE} AND s.revision = {revision}"""
    columns = "s.taken_at, s.value, s.cited_id, s.quality, s.revision, s.recorded_at"
    answer = "r.series_id, r.taken_at, r.value, c.body, r.quality, r.revision, r.recorded_at"
    cited = "LEFT JOIN cited c ON c.site_id = :site AND c.cited_id = r.cited_id"
    if dialect == "postgresql":
        one = f"WHERE {within} ORDER BY s.taken_at {order} LIMIT 1"
        lateral = f"(SELECT w.series_id, {columns} FROM {table} s {one})"
        return f"SELECT {answer} FROM {_POSTGRESQL_LIST} CROSS JOIN LATERAL {lateral} r {cited}"
    # No LATERAL on SQLite: find the instant, then the row.
    instant = f"(SELECT s.taken_at FROM {table} s WHERE {within} ORDER BY s.taken_at {order} LIMIT 1)"
    revision = _KNOWN_REVISION.format(table=table, series="x.series_id", instant="x.instant", bounds="")
    return f"""{_SQLITE_LIST}, x(series_id, instant) AS MATERIALIZED (SELECT w.series_id, {instant} FROM w)
        SELECT {answer} FROM x CROSS JOIN {table} r {cited}
        WHERE r.site_id = :site AND r.series_id = x.series_id AND r.taken_at = x.instant
          AND r.revision = {revision}"""


_ENDS_SQLITE = """WITH w(vessel, a) AS MATERIALIZED (
    SELECT json_extract(value, '$[0]'), json_extract(value, '$[1]') FROM json_each(:wanted))"""
_ENDS_POSTGRESQL = "unnest(CAST(:vessels AS text[]), CAST(:a AS bigint[])) AS w(vessel, a)"


def tickets(
    connection: Connection, site_id: int, wanted: Sequence[tuple[str, int]], before: int, known: int
) -> Sequence[Any]:
    """Tickets that end after each vessel's instant and begin before one, by either end; twice if by both.

    A row is (name, revision, recorded_at, started_at, ended_at, running, void, body).
    """
    sqlite = connection.dialect.name == "sqlite"
    prefix = _ENDS_SQLITE if sqlite else ""
    source = "w CROSS JOIN transfer t" if sqlite else f"{_ENDS_POSTGRESQL} JOIN transfer t ON true"
    columns = "t.name, t.revision, t.recorded_at, t.started_at, t.ended_at, t.running, t.void, t.body"
    last = """(SELECT max(n.revision) FROM transfer n
        WHERE n.site_id = t.site_id AND n.name = t.name AND n.recorded_at <= :known)"""
    halves = [
        f"""SELECT {columns} FROM {source} WHERE t.site_id = :site AND t.{end} = w.vessel AND t.ended_at > w.a
            AND t.started_at < :before AND t.recorded_at <= :known AND t.void = 0 AND t.revision = {last}"""
        for end in ("source", "target")
    ]
    parameters: dict[str, Any] = {"site": site_id, "before": before, "known": known}
    if sqlite:
        parameters["wanted"] = json.dumps(wanted)
    else:
        parameters |= {"vessels": [vessel for vessel, _ in wanted], "a": [first for _, first in wanted]}
    return connection.execute(_text(f"{prefix} {' UNION ALL '.join(halves)}"), parameters).all()


@cache
def _text(query: str) -> sa.TextClause:
    return sa.text(query)


def _parameters(connection: Connection, site_id: int, wanted: Wanted) -> dict[str, Any]:
    if connection.dialect.name == "sqlite":
        return {"site": site_id, "wanted": json.dumps(wanted)}
    series, first, last = zip(*wanted, strict=True)
    lists = {"series": list(series), "a": list(first), "b": list(last)}
    return {"site": site_id, "lo": min(first), "hi": max(last), **lists}
