"""Local days of a site: 23, 24 and 25 hours, and edges that fall into or onto a change of clocks."""

from datetime import date

import pytest

from app.services.instants import basic, day_bounds, day_edge

HOUR = 3_600_000_000


@pytest.mark.parametrize(
    ("day", "hours"),
    # Directive 2000/84/EC: summer time begins on the last Sunday of March and ends on that of October, 01:00 UTC.
    [("2026-03-27", 24), ("2026-03-28", 23), ("2026-03-29", 24), ("2026-10-24", 25), ("2026-10-25", 24)],
)
def test_a_day_from_six_to_six_has_as_many_hours_as_the_clocks_give_it(day, hours):
    opening, closing = day_bounds(date.fromisoformat(day), "06:00", "Europe/Lisbon")
    assert closing - opening == hours * HOUR


def test_six_in_the_morning_in_winter_and_in_summer():
    # 2026-03-28T06:00Z in winter; 2026-03-29 at 06:00 summer time is 05:00Z. Microseconds by hand:
    # 2026-03-28 is day 20540 of the epoch (20454 = 2026-01-01, + 86).
    assert day_edge(date(2026, 3, 28), "06:00", "Europe/Lisbon") == (20540 * 24 + 6) * HOUR
    assert day_edge(date(2026, 3, 29), "06:00", "Europe/Lisbon") == (20541 * 24 + 5) * HOUR


def test_an_hour_that_does_not_exist_moves_to_the_end_of_the_gap():
    # Lisbon, 29 March 2026: 01:00 becomes 02:00 at 01:00 UTC; 01:30 does not exist.
    assert day_edge(date(2026, 3, 29), "01:30", "Europe/Lisbon") == (20541 * 24 + 1) * HOUR
    # A half-hour gap: Lord Howe, 4 October 2026: 02:00 becomes 02:30 at 15:30 UTC of the day before.
    assert day_edge(date(2026, 10, 4), "02:15", "Australia/Lord_Howe") == (20729 * 24 + 15) * HOUR + HOUR // 2


def test_an_hour_that_occurs_twice_is_the_first():
    # Lisbon, 25 October 2026: 01:30 summer time is 00:30 UTC, 01:30 winter time is 01:30 UTC.
    assert day_edge(date(2026, 10, 25), "01:30", "Europe/Lisbon") == 20751 * 24 * HOUR + HOUR // 2


def test_a_zone_of_half_hours():
    # Kolkata is UTC+05:30 all year: 06:00 is 00:30 UTC.
    assert day_edge(date(2026, 3, 28), "06:00", "Asia/Kolkata") == 20540 * 24 * HOUR + HOUR // 2


def test_the_ids_of_periods_are_basic_utc():
    assert basic((20540 * 24 + 6) * HOUR) == "20260328T060000Z"
