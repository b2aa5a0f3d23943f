"""The months of ``reading``: partitions of PostgreSQL, made when the first value of a month comes."""

from __future__ import annotations

from collections.abc import Iterable
from datetime import UTC, datetime, timedelta

import sqlalchemy as sa

from app.store.engine import Store, name_key

EPOCH = datetime(1970, 1, 1, tzinfo=UTC)
DAY = 86_400_000_000  # microseconds


def make_months(store: Store, instants: Iterable[int]) -> None:
    """Make the partitions that these instants need; nothing to do on SQLite.

    It may be called within a writing transaction: the partition is made by a short transaction of its
    own, which waits for no row and no reader (ATTACH takes a lock that inserts and reads allow).
    """
    if store.dialect != "postgresql":
        return
    missing = {month_of(day * DAY) for day in {instant // DAY for instant in instants}} - store.months
    if not missing:
        return
    with store.transaction(lock_key=name_key("months")) as connection:
        for month in sorted(missing):
            name = f"reading_{month // 12:04}_{month % 12 + 1:02}"
            if connection.scalar(sa.text("SELECT to_regclass(:name)"), {"name": name}) is None:
                lo, hi = start_of(month), start_of(month + 1)
                connection.exec_driver_sql(f"CREATE TABLE {name} (LIKE reading INCLUDING ALL)")
                connection.exec_driver_sql(
                    f"ALTER TABLE reading ATTACH PARTITION {name} FOR VALUES FROM ({lo}) TO ({hi})"
                )
    store.months |= missing


def month_of(instant: int) -> int:
    """Months since year 0, in UTC."""
    when = EPOCH + timedelta(microseconds=instant)
    return when.year * 12 + when.month - 1


def start_of(month: int) -> int:
    """The first microsecond of a month."""
    return (datetime(month // 12, month % 12 + 1, 1, tzinfo=UTC) - EPOCH) // timedelta(microseconds=1)
