"""A gauge that froze while product left: the live answer says so before the night.

What happened: tank 16 (1,000 m², 800 kg/m³: 800 kg to the millimetre) delivers into a pipeline from 08:00 to
20:00 on the 13th, 50 m³ an hour, 40 t an hour, 480 t. Its radar froze at 07:40: it shows 6.000 m, now and then
6.001, while the tank falls by 50 mm an hour. The pipeline's counter is posted every hour on the running ticket.

What the service must say:

- The level has not moved (2 mm is the step of a gauge). The tickets moved more than the gauge could miss: six
  times √2 × 1 mm × 800 kg and the meter's own error, 6.8 t. That is passed within a quarter of an hour. From
  then on every answer carries `level_unchanged` and is `uncertain`: at nine in the morning, not at six the
  next day.
- A gauge that follows is not doubted, nor one whose tank receives as much as it delivers, nor one whose tank
  stands idle.
- The night is flagged all the same: 480 t more than the book. The entry says `uncertain`.
"""

from __future__ import annotations

import math

import pytest

T = 1000.0  # kg
STARTED, ENDED = "2026-03-13 08:00", "2026-03-13 20:00"


@pytest.fixture
def tank(site):
    """The opening, and a meter of 0.1 % on the pipeline."""
    site.liquid("gas-oil", 800.0)
    site.tank("tk-16", "gas-oil", area_m2=1000.0)
    site.meter("m-line", systematic_pct=0.1)
    site.reads("tk-16", "2026-03-13 06:00", source="radar", level_m=6.0)
    return site


def pumped(site, until, ended=None):
    """The running ticket as posted at some hour: 40 t an hour since eight, by its counter."""
    hours = [{"at": f"2026-03-13 {hour:02}:00", "mass_kg": 40 * T * (hour - 8)} for hour in range(9, until + 1)]
    return site.delivers("tk-16", "line-0313", STARTED, ended, meter="m-line", mass_kg=40 * T * (until - 8),
                         progress=hours)  # fmt: skip


def shows(site, at, level):
    site.reads("tk-16", f"2026-03-13 {at}", source="radar", level_m=level)


def told(site, at):
    inventory = site.inventory(f"2026-03-13 {at}")
    return "level_unchanged" in inventory.warnings("tk-16"), inventory.of("tk-16")["status"]


def test_the_live_answer_says_so_an_hour_after_it_froze(tank):
    """Nine o'clock: 40 t are gone, 50 mm, and the radar shows 1 mm more than at eight."""
    pumped(tank, until=9)
    shows(tank, "08:00", 6.0)
    shows(tank, "09:00", 6.001)
    assert told(tank, "09:00") == (True, "uncertain")
    warning = [one for one in tank.inventory("2026-03-13 09:00").of("tk-16")["warnings"]
               if one["code"] == "level_unchanged"]  # fmt: skip
    assert len(warning) == 1 and "1.0 mm" in warning[0]["detail"]
    # The mass is what the radar gives, doubted and not replaced: 6.001 m × 1,000 m² × 800.
    assert tank.inventory("2026-03-13 09:00").of("tk-16")["mass_kg"] == pytest.approx(4_800.8 * T, abs=0.5)


def test_before_it_could_be_seen_nothing_is_said(tank):
    """Eight minutes: 5.3 t have left, less than the 6.8 t; and twelve minutes: 8 t."""
    counted = [{"at": "2026-03-13 08:08", "mass_kg": 5_333.0}, {"at": "2026-03-13 08:12", "mass_kg": 8_000.0}]
    tank.delivers("tk-16", "line-0313", STARTED, None, meter="m-line", mass_kg=8_000.0, progress=counted)
    for at in ("08:00", "08:08", "08:12"):
        shows(tank, at, 6.0)
    assert told(tank, "08:08") == (False, "measured")
    assert told(tank, "08:12") == (True, "uncertain")


def test_it_is_said_all_day_and_at_the_close(tank):
    """Noon, four, the end at eight, and six in the morning: still 6.000 m."""
    shows(tank, "08:00", 6.0)
    for hour in (12, 16):
        pumped(tank, until=hour)
        shows(tank, f"{hour}:00", 6.0)
        assert told(tank, f"{hour}:00") == (True, "uncertain")
    pumped(tank, until=20, ended=ENDED)
    tank.reads("tk-16", "2026-03-14 06:00", source="radar", level_m=6.001)
    night = tank.closes("2026-03-13")
    book = night.of("tk-16")
    assert night.flagged == {"tk-16"} and book["status"] == "uncertain"
    # 4,800 t − 480 t in the book, 4,800.8 t on the radar; the meter's 480 kg and two millimetres.
    assert book["imbalance_kg"] == pytest.approx(480.8 * T, abs=0.5)
    assert book["imbalance_uncertainty_kg"] == pytest.approx(math.sqrt(480.0**2 + 2 * 800.0**2), abs=0.5)


def test_a_gauge_that_follows_is_not_doubted(tank):
    pumped(tank, until=12)
    for hour in (8, 9, 10, 11, 12):
        shows(tank, f"{hour:02}:00", 6.0 - 0.05 * (hour - 8))
    assert told(tank, "12:00") == (False, "measured")


def test_a_tank_that_receives_as_much_as_it_delivers_stands_still_rightly(tank):
    """40 t an hour in and out: the tickets moved nothing together."""
    pumped(tank, until=12)
    hours = [{"at": f"2026-03-13 {hour:02}:00", "mass_kg": 40 * T * (hour - 8)} for hour in range(9, 13)]
    tank.receives("tk-16", "unit-0313", STARTED, None, mass_kg=160 * T, progress=hours)
    shows(tank, "08:00", 6.0)
    shows(tank, "12:00", 6.0)
    assert told(tank, "12:00") == (False, "measured")


def test_an_idle_tank_stands_still_rightly(tank):
    shows(tank, "12:00", 6.0)
    assert told(tank, "12:00") == (False, "measured")


def test_once_it_is_freed_the_doubt_is_gone(tank):
    """At three the instrument fitter frees it: 6.000 − 7 × 0.050 = 5.650 m. The answer of noon stays as it was."""
    pumped(tank, until=15)
    for at, level in (("08:00", 6.0), ("12:00", 6.0), ("15:00", 5.65)):
        shows(tank, at, level)
    assert told(tank, "15:00") == (False, "measured")
    assert told(tank, "12:00") == (True, "uncertain")


def test_a_dip_that_is_entered_late_says_why_the_night_changed(tank):
    """The hand dip of 06:10, 5.400 m, comes at noon and is newer than the radar: 4,320 t, and the night balances."""
    pumped(tank, until=20, ended=ENDED)
    tank.reads("tk-16", "2026-03-14 05:40", source="radar", level_m=6.001)
    assert tank.closes("2026-03-13").flagged == {"tk-16"}
    tank.reads("tk-16", "2026-03-14 06:00", source="hand", level_m=5.4)
    night = tank.closes("2026-03-13")
    assert night["id"] == "2026-03-13.2" and not night.flagged
    assert night.of("tk-16")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    change = next(one for one in tank.changes("2026-03-13.2") if one["field"] == "closing_mass_kg")
    assert (change["before"], change["after"]) == (pytest.approx(4_800.8 * T), pytest.approx(4_320 * T))
    assert [one["kind"] for one in change["because"]] == ["late_reading"]
