"""Months of readings are made when they are needed, once, and left out where they cannot matter."""

from __future__ import annotations

import json
from concurrent.futures import ThreadPoolExecutor
from datetime import UTC, datetime

import pytest
import sqlalchemy as sa

from app.store import readings, seek
from app.store.engine import Store
from app.store.months import make_months, month_of, start_of
from app.store.readings import Value


def instant(*when: int) -> int:
    return int(datetime(*when, tzinfo=UTC).timestamp()) * 1_000_000  # type: ignore[arg-type, misc]


def partitions(connection: sa.Connection) -> set[str]:
    inherited = "SELECT inhrelid::regclass::text FROM pg_inherits WHERE inhparent = 'reading'::regclass"
    return set(connection.scalars(sa.text(inherited)))


@pytest.mark.parametrize(
    ("when", "year", "month"),
    [
        (instant(2024, 2, 29, 23, 59, 59) + 999_999, 2024, 2),
        (instant(2024, 3, 1), 2024, 3),
        (instant(2023, 12, 31, 23, 59, 59), 2023, 12),
        (-1, 1969, 12),
        (0, 1970, 1),
    ],
)
def test_an_instant_belongs_to_its_month_in_utc(when: int, year: int, month: int) -> None:
    number = month_of(when)
    assert (number // 12, number % 12 + 1) == (year, month)
    assert start_of(number) == instant(year, month, 1)
    assert start_of(number) <= when < start_of(number + 1)


def test_writing_makes_the_months_that_it_needs_and_no_other(postgresql_store: Store, site_id: str) -> None:
    edges = [instant(2011, 2, 28, 23, 59, 59) + 999_999, instant(2011, 3, 1), instant(2013, 12, 31), 0]
    with postgresql_store.writing(site_id, create=True) as writing:
        told = readings.write_values(writing, [Value("tk-1", "level_m", "", at, 1.0) for at in edges])
    assert set(told) == {"stored"}
    with postgresql_store.reading() as connection:
        years = ("reading_2011", "reading_2012", "reading_2013")
        made = {name for name in partitions(connection) if name.startswith(years)}
        assert made == {"reading_2011_02", "reading_2011_03", "reading_2013_12"}
        in_month = connection.scalar(sa.text("SELECT count(*) FROM reading_2011_02"))
        assert in_month == 1
        # the partition is what the table says, key and check included
        found = sa.inspect(connection)
        for name in ("reading", "reading_2011_02"):
            assert found.get_pk_constraint(name)["constrained_columns"] == [
                "site_id", "series_id", "taken_at", "revision",
            ]  # fmt: skip
            assert [check["name"] for check in found.get_check_constraints(name)] == ["reading_says_something"]


def test_writers_of_two_sites_who_need_one_month_at_once_both_get_it(postgresql_store: Store, site_id: str) -> None:
    def write(number: int) -> set[str]:
        own = Store.open(postgresql_store.url.render_as_string(hide_password=False))  # knows of no month yet
        try:
            with own.writing(f"{site_id}-{number}", create=True) as writing:
                return set(readings.write_values(writing, [Value("tk-1", "level_m", "", instant(2009, 5, 5), 1.0)]))
        finally:
            own.close()

    with ThreadPoolExecutor(6) as pool:
        assert list(pool.map(write, range(6))) == [{"stored"}] * 6


def test_a_batch_that_fails_leaves_its_month_and_nothing_in_it(postgresql_store: Store, site_id: str) -> None:
    with pytest.raises(RuntimeError), postgresql_store.writing(site_id, create=True) as writing:
        readings.write_values(writing, [Value("tk-1", "level_m", "", instant(2008, 1, 1), 1.0)])
        raise RuntimeError
    with postgresql_store.reading() as connection:
        assert connection.scalar(sa.text("SELECT count(*) FROM reading_2008_01")) == 0
    with postgresql_store.writing(site_id, create=True) as writing:
        assert readings.write_values(writing, [Value("tk-1", "level_m", "", instant(2008, 1, 1), 1.0)]) == ["stored"]


def test_months_beyond_the_bounds_are_left_out_of_the_plan(postgresql_store: Store, site_id: str) -> None:
    every_month = [instant(year, month, 15) for year in (2016, 2017) for month in range(1, 13)]
    with postgresql_store.writing(site_id, create=True) as writing:
        readings.write_values(writing, [Value("tk-1", "level_m", "", at, 1.0) for at in every_month])
    at = instant(2017, 6, 20)
    with postgresql_store.reading() as connection:
        (series,) = readings.series_of(connection, writing.site_id)
        wanted = [(series.series_id, at - 7 * 86_400_000_000, at)]
        parameters = {**seek._parameters(connection, writing.site_id, wanted), "known": 2**62}
        query = f"EXPLAIN (FORMAT JSON) {seek._neighbours('postgresql', 'reading', True)}"
        plan = json.dumps(connection.scalar(sa.text(query), parameters))
        asked = [(series.series_id, at - 7 * 86_400_000_000)]
        (found,) = readings.newest(connection, writing.site_id, asked, at, 2**62)
    assert "reading_2017_06" in plan
    assert not [month for month in partitions_in(plan) if month != "reading_2017_06"]
    assert found.taken_at == instant(2017, 6, 15)


def partitions_in(plan: str) -> set[str]:
    return {word for word in plan.replace('"', " ").split() if word.startswith("reading_2") and len(word) == 15}


def test_sqlite_needs_none(sqlite_store: Store) -> None:
    make_months(sqlite_store, [0, instant(2011, 2, 28)])
    with sqlite_store.reading() as connection:
        assert [name for name in sa.inspect(connection).get_table_names() if name.startswith("reading")] == ["reading"]
