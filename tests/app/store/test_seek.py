"""Seeks stay flat: the work for the newest values is counted, and is the same at 1e3 and at 1e5 rows."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager

import pytest
import sqlalchemy as sa

from app.store import readings, seek
from app.store.engine import Store
from app.store.readings import Value

T0 = 1_767_225_600_000_000
MINUTE = 60_000_000
SERIES = 4


def fill(store: Store, site: str, instants: range) -> int:
    """A site with some series of so many values; the rows go in as the product's own do, in one batch."""
    with store.writing(site, create=True) as writing:
        readings.write_values(writing, [
            Value(f"tk-{number}", "level_m", "radar", T0 + index * MINUTE, index / 1000)
            for number in range(SERIES) for index in instants
        ])  # fmt: skip
        return writing.site_id


@contextmanager
def steps(connection: sa.Connection) -> Iterator[list[int]]:
    """Counts the steps of SQLite's virtual machine."""
    counted = [0]

    def step() -> int:
        counted[0] += 1
        return 0

    driver = connection.connection.driver_connection
    assert driver is not None
    driver.set_progress_handler(step, 1)
    try:
        yield counted
    finally:
        driver.set_progress_handler(None, 0)


def ask(connection: sa.Connection, site: int, at: int, newest: bool) -> None:
    wanted = [one.series_id for one in readings.series_of(connection, site)]
    if newest:
        found = readings.newest(connection, site, [(one, at - 10**12) for one in wanted], at, 2**62)
    else:
        found = readings.following(connection, site, [(one, at + 10**12) for one in wanted], at, 2**62)
    assert len(found) == SERIES


@pytest.mark.parametrize("newest", [True, False])
def test_sqlite_takes_the_same_steps_at_a_thousand_and_at_a_hundred_thousand_rows(
    sqlite_store: Store, site_id: str, newest: bool
) -> None:
    few = fill(sqlite_store, f"{site_id}-few", range(250))
    many = fill(sqlite_store, f"{site_id}-many", range(25_000))
    counted = []
    for site, rows in ((few, 250), (many, 25_000)):
        for at in (rows // 2, rows - 2):
            with sqlite_store.reading() as connection, steps(connection) as count:
                ask(connection, site, T0 + at * MINUTE, newest)
            counted.append(count[0])
    print("steps", counted)
    assert max(counted) - min(counted) <= SERIES
    assert counted[0] < 2000


@pytest.mark.parametrize("newest", [True, False])
def test_postgresql_reads_as_many_blocks_at_a_thousand_and_at_a_hundred_thousand_rows(
    postgresql_store: Store, site_id: str, newest: bool
) -> None:
    few = fill(postgresql_store, f"{site_id}-few", range(250))
    many = fill(postgresql_store, f"{site_id}-many", range(25_000))
    counted = [blocks(postgresql_store, few, 125, newest), blocks(postgresql_store, many, 12_500, newest)]
    print("blocks", counted)
    # Both live in one table and one index, so that its depth is the same for both.
    assert counted[1] <= counted[0] + SERIES
    assert counted[1] <= SERIES * 12


def blocks(store: Store, site: int, at: int, newest: bool) -> int:
    """Blocks touched by the statement behind ``newest``, cold or in memory."""
    with store.reading() as connection:
        wanted = [(one.series_id, T0, T0 + 25_000 * MINUTE) for one in readings.series_of(connection, site)]
        wanted = [(one, T0, T0 + at * MINUTE) if newest else (one, T0 + at * MINUTE, hi) for one, _, hi in wanted]
        parameters = {**seek._parameters(connection, site, wanted), "known": 2**62}
        query = sa.text(f"EXPLAIN (ANALYZE, BUFFERS, FORMAT JSON) {seek._neighbours('postgresql', 'reading', newest)}")
        plan = connection.scalar(query, parameters)[0]["Plan"]
    assert plan["Actual Rows"] == SERIES
    return int(plan["Shared Hit Blocks"] + plan["Shared Read Blocks"])


def test_a_replayed_batch_seeks_its_keys_and_scans_nothing(sqlite_store: Store, site_id: str) -> None:
    def replay(site: str, rows: int) -> int:
        fill(sqlite_store, site, range(rows))
        batch = [Value(f"tk-{number}", "level_m", "radar", T0 + index * MINUTE, index / 1000)
                 for number in range(SERIES) for index in (0, rows - 1, *range(1, 40))]  # fmt: skip
        with sqlite_store.writing(site) as writing, steps(writing.connection) as count:
            assert set(readings.write_values(writing, batch)) == {"unchanged"}
        return count[0]

    few, many = replay(f"{site_id}-few", 250), replay(f"{site_id}-many", 25_000)
    assert abs(few - many) <= SERIES
