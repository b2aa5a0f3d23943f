"""The month closed as one period; a day of it revised afterwards; the day of 23 hours; the day of 25.

What happened: tank 29 in Oslo (100 m², 800 kg/m³: 80 kg to the millimetre) is fed by a pipeline, 1,000 kg in every
hour of the clock, by one ticket for the month with its running total at each six o'clock. The rack takes 24,000 kg at
noon every day. So the tank stands at 5.000 m every morning, and

- on the 29th of March 12.5 mm lower: clocks went forward in the night, the day of the 28th had 23 hours, 23,000 kg
  came and 24,000 left; it stays there;
- on the 12th the gauger wrote 4.990 m for 5.000;
- on the 20th a second tanker took 8,000 kg, and its ticket stayed in the cab: 100 mm lower from the 21st on.

    March, from 1 March 06:00 (05:00 UTC) to 1 April 06:00 (04:00 UTC): 31 days less one hour, 743 hours
    opening 400,000 + 743,000 in − 31 × 24,000 out = 399,000 kg in the book; 391,000 kg in the tank

What the books must say: the nights of the 11th and the 12th are 800 kg short and 800 kg over, the night of the 20th
8,000 kg short, all others even. The month is 8,000 kg short: what its days add up to. When the dip of the 12th is
corrected, two nights are revised and the month stands as it was: it never looked at that morning. When the ticket
is found, the night of the 20th and the month are revised, and say why; the nights after it stand.

In October the clocks go back: the day of the 24th has 25 hours, and its night an hour that comes twice.
"""

from __future__ import annotations

import math
from datetime import date, datetime, timedelta
from zoneinfo import ZoneInfo

import pytest

OSLO = ZoneInfo("Europe/Oslo")
GAUGE = math.sqrt(2.0) * 80.0
FIRST, LAST = date(2026, 3, 1), date(2026, 4, 1)
DAYS = [FIRST + timedelta(days=number) for number in range(31)]
MONTH = "20260301T050000Z--20260401T040000Z"


def clock(day, hour=6):
    """An hour of the clock in Oslo, with the offset of that day."""
    return datetime(day.year, day.month, day.day, hour, tzinfo=OSLO)


def hours(start, end):
    """Hours that passed between two local instants."""
    return (end.timestamp() - start.timestamp()) / 3600.0


def levels():
    """What the gauger wrote on each morning of the month and on the first of April."""
    for day in (*DAYS, LAST):
        level = 4.99 if day == date(2026, 3, 12) else 5.0
        level -= 0.1 if day >= date(2026, 3, 21) else 0.0
        level -= 0.0125 if day >= date(2026, 3, 29) else 0.0
        yield {"vessel": "tk-29", "taken_at": clock(day).isoformat(), "level_m": level}


def statement(ticket, from_, to, started, ended, mass, **said):
    return {"id": ticket, "from": from_, "to": to, "by": "statement", "mass_kg": mass, "mass_uncertainty_kg": 0.0,
            "started_at": started.isoformat(), "ended_at": ended.isoformat(), **said}  # fmt: skip


def pipeline(first, last):
    """One ticket, with its running total at every six o'clock in between."""
    start, end = clock(first), clock(last)
    between = [clock(first + timedelta(days=number)) for number in range(1, (last - first).days)]
    progress = [{"at": at.isoformat(), "mass_kg": 1000.0 * hours(start, at)} for at in between]
    whole = 1000.0 * hours(start, end)
    return statement("pipe", "boundary:pipeline", "tk-29", start, end, whole, progress=progress)


def tanker(ticket, day, mass, hour=12):
    return statement(ticket, "tk-29", "boundary:road", clock(day, hour), clock(day, hour + 1), mass)


@pytest.fixture
def oslo(new_site):
    site = new_site(time_zone="Europe/Oslo")
    site.liquid("gas-oil", 800.0)
    site.tank("tk-29", "gas-oil")
    return site


@pytest.fixture
def march(oslo):
    """The month as it was posted by the first of April: everything but the ticket in the cab."""
    assert oslo.post("/readings", {"readings": list(levels())})["stored"] == 32
    tickets = [pipeline(FIRST, LAST), *(tanker(f"road-{day.day:02}", day, 24_000.0) for day in DAYS)]
    assert oslo.post("/transfers", {"transfers": tickets})["stored"] == 32
    return oslo


def whole_month(site):
    return site.closes(opening=clock(FIRST).isoformat(), closing=clock(LAST).isoformat())


def test_the_month_is_what_its_days_add_up_to(march):
    nights = {day.day: march.closes(day.isoformat()) for day in DAYS}
    missing = {day: night.of("tk-29")["imbalance_kg"] for day, night in nights.items()}
    expected = dict.fromkeys(range(1, 32), 0.0) | {11: -800.0, 12: 800.0, 20: -8_000.0}
    assert missing == pytest.approx(expected, abs=0.5)
    assert {day for day, night in nights.items() if night.flagged} == {11, 12, 20}

    month = whole_month(march)
    assert month["id"] == f"{MONTH}.1"
    book = month.of("tk-29")
    assert book["received_kg"] == pytest.approx(743_000.0, abs=0.5)
    assert book["delivered_kg"] == pytest.approx(744_000.0, abs=0.5)
    assert book["book_mass_kg"] == pytest.approx(399_000.0, abs=0.5)
    assert book["closing_mass_kg"] == pytest.approx(391_000.0, abs=0.5)
    assert book["imbalance_kg"] == pytest.approx(-8_000.0, abs=0.5)
    assert book["imbalance_kg"] == pytest.approx(sum(missing.values()), abs=0.01)
    assert book["imbalance_uncertainty_kg"] == pytest.approx(GAUGE, abs=0.1)  # two ends, however many days between
    assert month.flagged == {"tk-29"}


def test_a_morning_within_the_month_revises_two_nights_and_not_the_month(march):
    for day in ("2026-03-11", "2026-03-12"):
        march.closes(day)
    assert whole_month(march)["id"] == f"{MONTH}.1"
    march.reads("tk-29", clock(date(2026, 3, 12)).isoformat(), level_m=5.0)
    nights = [march.closes(day) for day in ("2026-03-11", "2026-03-12")]
    assert [one["id"] for one in nights] == ["2026-03-11.2", "2026-03-12.2"]
    assert [one.of("tk-29")["imbalance_kg"] for one in nights] == pytest.approx([0.0, 0.0], abs=0.5)
    assert whole_month(march)["id"] == f"{MONTH}.1"
    # Both name the same dip: the one closed with it, the other opened with it.
    dip = ("revised_reading", "tk-29 level_m 2026-03-12T05:00:00Z")
    for day, field in (("2026-03-11", "closing_mass_kg"), ("2026-03-12", "opening_mass_kg")):
        changed = march.changes(day)
        assert {(cause["kind"], cause["subject"]) for one in changed for cause in one["because"]} == {dip}
        (mass,) = (one for one in changed if one["field"] == field)
        assert (mass["before"], mass["after"]) == pytest.approx((399_200.0, 400_000.0), abs=0.5)


def test_a_ticket_found_in_april_revises_its_night_and_the_month(march):
    for day in ("2026-03-19", "2026-03-20", "2026-03-21"):
        march.closes(day)
    whole_month(march)
    march.post("/transfers", {"transfers": [tanker("road-20-b", date(2026, 3, 20), 8_000.0, hour=15)]})
    assert [march.closes(day)["id"] for day in ("2026-03-19", "2026-03-20", "2026-03-21")] == [
        "2026-03-19.1", "2026-03-20.2", "2026-03-21.1",
    ]  # fmt: skip
    month = whole_month(march)
    assert month["id"] == f"{MONTH}.2" and not month.flagged
    assert month.of("tk-29")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert march.book(f"{MONTH}.1").of("tk-29")["imbalance_kg"] == pytest.approx(-8_000.0, abs=0.5)
    for name in ("2026-03-20", MONTH):
        changed = march.changes(name)
        assert {(cause["kind"], cause["subject"]) for one in changed for cause in one["because"]} == {
            ("late_transfer", "road-20-b")
        }
        delivered = next(one for one in changed if one["field"] == "delivered_kg")
        assert delivered["after"] - delivered["before"] == pytest.approx(8_000.0, abs=0.5)
        words = march.get(f"/reconciliations/{name}/changes")["words"]
        line = "tk-29: imbalance -8,000 → 0 kg because ticket road-20-b came on "
        assert any(one.startswith(line) for one in words)


def test_the_day_after_the_month_opens_with_its_last_night(march):
    """Two periods close at six on the first of April, the night and the month, at the same 391,000 kg."""
    night, month = march.closes("2026-03-31"), whole_month(march)
    assert night["closing"] == month["closing"] == "2026-04-01T04:00:00Z"
    march.reads("tk-29", clock(date(2026, 4, 2)).isoformat(), level_m=4.8875)
    opening = march.closes("2026-04-01").of("tk-29")["opening_mass_kg"]
    assert opening == night.of("tk-29")["closing_mass_kg"] == pytest.approx(391_000.0, abs=0.5)


def test_the_day_of_23_hours(march):
    """From 05:00 UTC on the 28th to 04:00 UTC on the 29th: 23,000 kg came, 24,000 left, 1,000 fewer are there."""
    night = march.closes("2026-03-28")
    assert (night["opening"], night["closing"]) == ("2026-03-28T05:00:00Z", "2026-03-29T04:00:00Z")
    book = night.of("tk-29")
    assert (book["received_kg"], book["delivered_kg"]) == pytest.approx((23_000.0, 24_000.0), abs=0.5)
    assert book["closing_mass_kg"] - book["opening_mass_kg"] == pytest.approx(-1_000.0, abs=0.5)
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)


def test_the_day_of_25_hours(oslo):
    """From 04:00 UTC on the 24th of October to 05:00 UTC on the 25th: 25,000 kg came, 24,000 left: 12.5 mm more."""
    first, last = date(2026, 10, 24), date(2026, 10, 25)
    oslo.post("/transfers", {"transfers": [pipeline(first, last), tanker("road", first, 24_000.0)]})
    oslo.reads("tk-29", clock(first).isoformat(), level_m=5.0)
    oslo.reads("tk-29", clock(last).isoformat(), level_m=5.0125)
    night = oslo.closes("2026-10-24")
    assert (night["opening"], night["closing"]) == ("2026-10-24T04:00:00Z", "2026-10-25T05:00:00Z")
    book = night.of("tk-29")
    assert (book["received_kg"], book["delivered_kg"]) == pytest.approx((25_000.0, 24_000.0), abs=0.5)
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)


def test_half_past_two_comes_twice_and_is_two_readings(oslo):
    """The tank fills by 12.5 mm in the hour between them; a text with its offset says which is meant."""
    summer, winter = "2026-10-25T02:30:00+02:00", "2026-10-25T02:30:00+01:00"
    assert oslo.reads("tk-29", summer, level_m=4.9)["stored"] == 1
    assert oslo.reads("tk-29", winter, level_m=4.9125)["stored"] == 1
    assert oslo.inventory(summer).of("tk-29")["mass_kg"] == pytest.approx(392_000.0, abs=0.5)
    assert oslo.inventory(winter).of("tk-29")["mass_kg"] == pytest.approx(393_000.0, abs=0.5)
