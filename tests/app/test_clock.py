"""The clock counts microseconds of UTC."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta

from app.clock import Clock


def test_the_clock_agrees_with_the_systems_own_calendar() -> None:
    before = datetime.now(UTC)
    read = datetime(1970, 1, 1, tzinfo=UTC) + timedelta(microseconds=Clock().now())
    after = datetime.now(UTC)
    assert before - timedelta(microseconds=1) <= read <= after
