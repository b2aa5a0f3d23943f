"""A tank that stands idle for three days behind a historian that stores changes only.

What happened: tank 24 (1,000 m², 800 kg/m³: 800 kg to the millimetre) is full to 6.000 m, 4,800,000 kg, and nobody
touches it from Tuesday the 10th to Friday the 13th. The site's historian stores a level when it differs from the one
before: one value on the 10th at 04:00, and then silence, because nothing changes. On the 13th at 09:00 a train is
loaded, 80,000 kg until 12:00: the historian stores 6.000 m at 09:00, the last value before the change, and 5.900 m
at 12:00.

What the books must say:

- A level counts for an hour if nothing else is declared. The three nights of silence are then *unmeasured*: there is
  no mass, the nights are not complete, and the reason says what was not read and how long a reading counts.
  No mass is made up, nothing is flagged, and a vessel that is not measured is not one that holds nothing.
- The site knows its historian and declares that a level of this tank holds for seven days. The nights are then even
  at 4,800,000 kg, and the answers say how old the level is: at the close of the 12th, 74 hours. Both ends of such a
  night rest on one reading, and `opening_read_at` and `closing_read_at` say so: nothing was measured in between.
- The night of the 13th has the train: 80,000 kg by the ticket, 100 mm by the gauge.
- A ticket during the silence moves the stock (`moved_kg`), because the level was read before it.
- A historian that drops the last value *before* a change leaves nothing but 6.000 m on Tuesday and 5.900 m on Friday,
  and a line between them: the three nights lose 24,000 kg each. A tank behind such a historian is not to be given a
  greater age than its silence is worth.
"""

from __future__ import annotations

import math

import pytest

SEVEN_DAYS = {"level_m": 604_800}
LAST, CHANGE = "2026-03-10 04:00", "2026-03-13 09:00"
IDLE = ["2026-03-10", "2026-03-11", "2026-03-12"]  # nights that begin on these days
TRAIN = "2026-03-13"
FULL = 4_800_000.0


def tank(site, **body):
    site.liquid("gas-oil", 800.0)
    site.tank("tk-24", "gas-oil", area_m2=1000.0, **body)
    site.reads("tk-24", LAST, source="historian", level_m=6.0)
    return site


def train(site, *, last_value=True):
    """The train's ticket, and what the historian stored of the level while it was loaded."""
    if last_value:
        site.reads("tk-24", CHANGE, source="historian", level_m=6.0)
    site.reads("tk-24", "2026-03-13 12:00", source="historian", level_m=5.9)
    site.delivers("tk-24", "train-0313", CHANGE, "2026-03-13 12:00", by_way_of="rail", by="weighbridge",
                  mass_kg=80_000.0, mass_uncertainty_kg=50.0)  # fmt: skip


def test_an_hour_of_silence_makes_the_tank_unmeasured_and_not_empty(site):
    """04:59 is within the hour, 05:01 is not; the reason names the level and how long one counts."""
    tank(site)
    assert site.inventory("2026-03-10 04:59").of("tk-24")["mass_kg"] == pytest.approx(FULL, abs=0.5)
    stock = site.inventory("2026-03-10 05:01").of("tk-24")
    assert (stock["status"], stock["mass_kg"]) == ("unmeasured", None)
    assert "level_m" in stock["reason"]["detail"]
    assert "3600 s (max_age_s)" in stock["reason"]["detail"]


def test_nights_of_silence_are_incomplete_and_lose_nothing(site):
    tank(site)
    for day in IDLE:
        night = site.closes(day)
        book = night.of("tk-24")
        assert not night["complete"] and not night.flagged
        assert book["status"] == "unmeasured"
        assert book["closing_mass_kg"] is None and book["imbalance_kg"] is None
        assert not night.total("gas-oil")["complete"]


def test_a_site_that_knows_its_historian_says_how_long_a_level_holds(site):
    """4,800,000 kg each morning by the level of the 10th at 04:00; on the 13th at 06:00 it is 74 hours old."""
    tank(site, max_age_s=SEVEN_DAYS)
    inventory = site.inventory("2026-03-13 06:00")
    assert inventory.of("tk-24")["mass_kg"] == pytest.approx(FULL, abs=0.5)
    assert inventory.of("tk-24")["status"] == "measured"
    assert inventory.input("tk-24", "level_m")["age_s"] == 74 * 3600
    for day in IDLE:
        night = site.closes(day)
        book = night.of("tk-24")
        assert night["complete"] and not night.flagged
        assert book["closing_mass_kg"] == pytest.approx(FULL, abs=0.5)
        assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
        assert book["opening_read_at"] == book["closing_read_at"] == "2026-03-10T04:00:00Z"


def test_the_train_is_measured_by_its_ticket_and_by_the_gauge(site):
    """80,000 kg against 100 mm × 800; 1 mm at either end and 50 kg of the weighbridge."""
    tank(site, max_age_s=SEVEN_DAYS)
    train(site)
    nights = [site.closes(day) for day in [*IDLE, TRAIN]]
    book = nights[-1].of("tk-24")
    assert book["opening_mass_kg"] == pytest.approx(FULL, abs=0.5)
    assert book["delivered_kg"] == pytest.approx(80_000.0, abs=0.5)
    assert book["closing_mass_kg"] == pytest.approx(FULL - 80_000.0, abs=0.5)
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert not any(night.flagged for night in nights)
    # At six on the 13th the level lies between 6.000 m of the 10th and 6.000 m at 09:00: 74 and 3 of 77 hours.
    between = math.hypot(3.0 / 77.0, 74.0 / 77.0) * 800.0
    assert book["imbalance_uncertainty_kg"] == pytest.approx(math.hypot(between, 800.0, 50.0), abs=0.5)


def test_the_last_value_before_the_change_moves_no_night_that_was_closed(site):
    """Closed in the silence, closed again when Friday's values are there: the same 4,800,000 kg each morning."""
    tank(site, max_age_s=SEVEN_DAYS)
    for day in IDLE:
        site.closes(day)
    train(site)
    for day in IDLE:
        book = site.closes(day).of("tk-24")
        assert book["closing_mass_kg"] == pytest.approx(FULL, abs=0.5)
        assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)


def test_a_historian_that_drops_the_last_value_before_a_change_draws_a_slope(site):
    """6.000 m and, 80 hours later, 5.900 m: 30 mm or 24,000 kg in each day between that never left."""
    tank(site, max_age_s=SEVEN_DAYS)
    for day in IDLE:
        assert site.closes(day).of("tk-24")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    train(site, last_value=False)
    nights = [site.closes(day) for day in IDLE]
    assert [night["revision"] for night in nights] == [2, 2, 2]
    assert [night.of("tk-24")["imbalance_kg"] for night in nights] == pytest.approx([-24_000.0] * 3, abs=0.5)
    assert all(night.flagged == {"tk-24"} for night in nights)
    # What was said in the silence stands as it was said.
    assert site.book(f"{IDLE[0]}.1").of("tk-24")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)


def test_a_ticket_in_the_silence_moves_the_stock(site):
    """A tanker of 28,000 kg on the 11th, and the historian stored nothing: 4,772,000 kg by the ticket alone.

    The gauge is not asked: the night is even because nobody contradicts the ticket, and both of its ends rest on the
    reading of the 10th.
    """
    tank(site, max_age_s=SEVEN_DAYS)
    site.delivers("tk-24", "road-0311", "2026-03-11 09:00", "2026-03-11 09:40", by_way_of="road", mass_kg=28_000.0)
    stock = site.inventory("2026-03-11 12:00").of("tk-24")
    assert stock["moved_kg"] == pytest.approx(-28_000.0, abs=0.5)
    assert stock["mass_kg"] == pytest.approx(4_772_000.0, abs=0.5)
    book = site.closes("2026-03-11").of("tk-24")
    assert book["closing_mass_kg"] == pytest.approx(4_772_000.0, abs=0.5)
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert book["opening_read_at"] == book["closing_read_at"] == "2026-03-10T04:00:00Z"


def test_the_gauge_that_speaks_again_contradicts_a_ticket_that_never_was(site):
    """The tanker of the 11th was booked on the wrong tank: on the 12th at 05:00 the level is stored again, 6.000 m.

    28,000 kg more than the book, against 1 mm at either end.
    """
    tank(site, max_age_s=SEVEN_DAYS)
    site.delivers("tk-24", "road-0311", "2026-03-11 09:00", "2026-03-11 09:40", by_way_of="road", mass_kg=28_000.0)
    first = site.closes("2026-03-11")
    assert not first.flagged
    site.reads("tk-24", "2026-03-12 05:00", source="historian", level_m=6.0)
    second = site.closes("2026-03-11")
    assert second["id"] == "2026-03-11.2"
    assert second.of("tk-24")["imbalance_kg"] == pytest.approx(28_000.0, abs=0.5)
    assert second.flagged == {"tk-24"}
    told = next(one for one in site.changes("2026-03-11.2") if one["field"] == "closing_mass_kg")
    assert (told["before"], told["after"]) == pytest.approx((4_772_000.0, FULL), abs=0.5)
    assert "late_reading" in [one["kind"] for one in told["because"]]


def test_a_month_of_silence_is_more_than_any_level_holds(site):
    """35 days are the most that may be declared of a level; 36 are refused."""
    site.liquid("gas-oil", 800.0)
    answer = site.client.put(f"{site.path}/vessels/tk-24", json={
        "name": "tk-24", "substance": "gas-oil", "max_age_s": {"level_m": 36 * 86_400},
        "shape": {"kind": "box", "length_m": 100.0, "width_m": 10.0, "height_m": 20.0}})  # fmt: skip
    assert answer.status_code == 422
    tank(site, max_age_s={"level_m": 35 * 86_400})
    assert site.inventory("2026-04-14 03:59").of("tk-24")["mass_kg"] == pytest.approx(FULL, abs=0.5)
    assert site.inventory("2026-04-14 04:01").of("tk-24")["status"] == "unmeasured"
