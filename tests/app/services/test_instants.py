"""Local days of a site: 23, 24 and 25 hours, and edges that fall into or onto a change of clocks."""

from datetime import UTC, date, datetime, timedelta
from zoneinfo import ZoneInfo

import pytest

from app.services.instants import (
    Period,
    basic,
    check_zone,
    day_bounds,
    day_edge,
    micros,
    parse_basic,
    parse_label,
)
from models.errors import DefinitionError

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


def test_an_instant_of_an_id_is_read_back():
    assert parse_basic("20260328T060000Z") == (20540 * 24 + 6) * HOUR
    with pytest.raises(ValueError, match="does not match"):
        parse_basic("20260328T250000Z")


def test_a_label_is_a_day_or_two_instants():
    assert parse_label("2026-03-28") == date(2026, 3, 28)
    period = Period((20540 * 24 + 6) * HOUR, (20541 * 24 + 5) * HOUR)
    assert period.label == "20260328T060000Z--20260329T050000Z"
    assert parse_label(period.label) == period
    assert Period(0, 1, day="1970-01-01").label == "1970-01-01"


def test_a_moment_is_counted_exactly():
    # A float of seconds would lose the last digit here.
    moment = datetime(2026, 3, 28, 6, 0, 0, 123457, tzinfo=UTC)
    assert micros(moment) == (20540 * 24 + 6) * HOUR + 123457


def test_zones_are_those_of_the_tz_database():
    check_zone("Europe/Oslo")
    for name in ("Europe/Atlantis", "", "../etc/passwd"):
        with pytest.raises(DefinitionError):
            check_zone(name)


@pytest.mark.parametrize("zone", ["Europe/Lisbon", "Australia/Lord_Howe", "America/St_Johns", "Asia/Kathmandu"])
@pytest.mark.parametrize("starts_at", ["00:00", "01:30", "02:15", "06:00", "23:59"])
def test_days_follow_on_each_other_and_begin_on_their_local_date(zone, starts_at):
    edges = [day_edge(date(2026, 1, 1) + timedelta(days=i), starts_at, zone) for i in range(366)]
    hours = {(after - before) / HOUR for before, after in zip(edges, edges[1:], strict=False)}
    assert hours <= {23.0, 23.25, 23.5, 23.75, 24.0, 24.25, 24.5, 24.75, 25.0}
    for i, edge in enumerate(edges):
        local = (datetime(1970, 1, 1, tzinfo=UTC) + timedelta(microseconds=edge)).astimezone(ZoneInfo(zone))
        assert local.date() == date(2026, 1, 1) + timedelta(days=i)
        assert f"{local:%H:%M}" >= starts_at  # later only where that hour does not exist
