"""A ship discharges across the close, at an uneven rate.

What happened: a ship pumps 15,000 t of a liquid of 750 kg/m³ into tank 1 (2,000 m²: 1,500 kg to the
millimetre) from 20:00 on the 13th to 16:00 on the 14th. She starts with all pumps and ends stripping: at
06:00, half of the time, 8,400 t are ashore, 56 % of the cargo.

    06:00 on the 13th    2.000 m     3,000 t
    06:00 on the 14th    7.600 m    11,400 t    (+ 8,400 t)
    06:00 on the 15th   12.000 m    18,000 t    (+ 6,600 t)

What was posted, and what the books must say, as the paper arrives:

1. The night of the 13th is closed without any ticket: 8,400 t more than the book. That is flagged, rightly.
2. On the morning of the 14th the jetty posts the running ticket with its totaliser at 06:00: the night is
   revised and balances. On the 15th the totaliser says 15,000 t: that night balances too.
3. Two days later the final ticket says 14,994 t. Both nights balance, and their receipts add up to it exactly.

Without any totaliser the final ticket is divided by time: 7,500 t to each night, ± 750 t (5 % of the whole).
The first night is 900 t over, the second 900 t short, both within what is known of the division; the error is
one and the same with two signs, so that over both nights together it is gone.
"""

from __future__ import annotations

import math

import pytest

T = 1000.0  # kg
KG_PER_MM = 2000.0 * 750.0 / 1000.0
STARTED, ENDED = "2026-03-13 20:00", "2026-03-14 16:00"
AT_CLOSE = {"at": "2026-03-14 06:00", "mass_kg": 8_400 * T}


@pytest.fixture
def harbour(site):
    """The tank's three readings, and the jetty's meter: 0.1 % that all of its tickets share."""
    site.liquid("gasoline", 750.0)
    site.tank("tk-1", "gasoline", area_m2=2000.0)
    site.meter("m-7", systematic_pct=0.1)
    for day, level in (("2026-03-13", 2.0), ("2026-03-14", 7.6), ("2026-03-15", 12.0)):
        site.reads("tk-1", f"{day} 06:00", level_m=level)
    return site


def ship(site, ended, mass_t, progress=()):
    return site.receives("tk-1", "ship-0313", STARTED, ended, meter="m-7", mass_kg=mass_t * T, progress=list(progress))


def test_without_a_ticket_the_cargo_is_flagged(harbour):
    """11,400 t measured, 3,000 t in the book, and 1 mm at either end: √2 × 1,500 kg."""
    night = harbour.closes("2026-03-13")
    book = night.of("tk-1")
    assert night.flagged == {"tk-1"} and night["status"] == "imbalanced"
    assert book["received_kg"] == 0.0
    assert book["imbalance_kg"] == pytest.approx(8_400 * T, abs=1.0)
    assert book["imbalance_uncertainty_kg"] == pytest.approx(math.sqrt(2) * KG_PER_MM, abs=1.0)


def test_the_running_ticket_with_its_totaliser_at_the_close_balances_the_night(harbour):
    """The ticket is still open; what it says at 06:00 is the night's, and nothing is divided by time.

    The meter's 0.1 % of 8,400 t are 8,400 kg, beside √2 × 1,500 kg of the gauge.
    """
    assert harbour.closes("2026-03-13")["id"] == "2026-03-13.1"
    assert ship(harbour, None, 8_400, [AT_CLOSE]) == "created"
    night = harbour.closes("2026-03-13")
    assert night["id"] == "2026-03-13.2" and not night.flagged
    book = night.of("tk-1")
    assert book["received_kg"] == pytest.approx(8_400 * T, abs=0.5)
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=1.0)
    expected = math.hypot(8_400.0, math.sqrt(2) * KG_PER_MM)
    assert book["imbalance_uncertainty_kg"] == pytest.approx(expected, abs=1.0)
    assert harbour.book("2026-03-13.1").flagged == {"tk-1"}  # what was said stays readable
    # And the revision says what it changed: the ship, and whatever she brought into the balance.
    assert harbour.because("2026-03-13") == {("late_transfer", "ship-0313")}
    changed = {one["field"]: (one["before"], one["after"]) for one in harbour.changes("2026-03-13")}
    assert set(changed) == {"received_kg", "imbalance_kg", "flagged", "verdict", "measured_mass_kg"}
    assert changed["received_kg"] == pytest.approx((0.0, 8_400 * T), abs=0.5)
    assert (changed["flagged"], changed["verdict"]) == ((True, False), ("fail", "pass"))
    assert harbour.words("2026-03-13")[0].startswith(
        "tk-1: receipts 0 → 8,400,000 kg because ticket ship-0313 came on "
    )


def test_as_the_paper_arrives_only_the_first_answer_is_flagged_and_the_nights_add_up(harbour):
    flagged = [harbour.closes("2026-03-13").flagged]
    ship(harbour, None, 8_400, [AT_CLOSE])
    flagged.append(harbour.closes("2026-03-13").flagged)
    running = [AT_CLOSE, {"at": "2026-03-15 06:00", "mass_kg": 15_000 * T}]
    ship(harbour, None, 15_000, running)
    flagged.append(harbour.closes("2026-03-14").flagged)
    ship(harbour, ENDED, 14_994, [AT_CLOSE])
    first, second = harbour.closes("2026-03-13"), harbour.closes("2026-03-14")
    assert [*flagged, first.flagged, second.flagged] == [{"tk-1"}, set(), set(), set(), set()]

    # 14,994 − 8,400 = 6,594 t are the second night's; the gauge says 6,600 t, the meter ± 0.1 %: 6 t over.
    assert first.of("tk-1")["received_kg"] == pytest.approx(8_400 * T, abs=0.5)
    assert second.of("tk-1")["received_kg"] == pytest.approx(6_594 * T, abs=0.5)
    assert first.of("tk-1")["received_kg"] + second.of("tk-1")["received_kg"] == pytest.approx(14_994 * T, abs=0.01)
    assert first.of("tk-1")["imbalance_kg"] == pytest.approx(0.0, abs=1.0)
    assert second.of("tk-1")["imbalance_kg"] == pytest.approx(6 * T, abs=1.0)
    expected = math.hypot(6_594.0, math.sqrt(2) * KG_PER_MM)
    assert second.of("tk-1")["imbalance_uncertainty_kg"] == pytest.approx(expected, abs=1.0)
    assert second.of("tk-1")["opening_mass_kg"] == first.of("tk-1")["closing_mass_kg"]
    assert harbour.because("2026-03-14") == {("late_transfer", "ship-0313")}
    assert harbour.words("2026-03-14")[0].startswith(
        "tk-1: receipts 6,600,000 → 6,594,000 kg because ticket ship-0313 was corrected on "
    )


def test_the_final_ticket_alone_is_divided_by_time(harbour):
    """10 of 20 hours: 7,500 t ± 750 t; a score of 900 / 750 = 1.2 in either night, flagged in none.

    The other errors, 0.1 % of 7,500 t and the gauge's, are small beside it: √(750² + 7.5² + 2.1²) = 750.04 t.
    """
    ship(harbour, ENDED, 15_000)
    first, second = harbour.closes("2026-03-13"), harbour.closes("2026-03-14")
    expected = math.sqrt(750_000.0**2 + 7_500.0**2 + 2 * KG_PER_MM**2)
    for night, sign in ((first, 1), (second, -1)):
        book = night.of("tk-1")
        assert book["received_kg"] == pytest.approx(7_500 * T, abs=0.5)
        assert book["imbalance_kg"] == pytest.approx(sign * 900 * T, abs=1.0)
        assert book["imbalance_uncertainty_kg"] == pytest.approx(expected, abs=1.0)
        assert book["score"] == pytest.approx(sign * 1.2, abs=0.001)
        assert not night.flagged


def test_over_both_nights_together_nothing_is_divided(harbour):
    """15,000 t in, 15,000 t on the gauge; the meter's 15 t and √2 × 1.5 t of the gauge remain."""
    ship(harbour, ENDED, 15_000)
    both = harbour.closes(opening="2026-03-13 06:00", closing="2026-03-15 06:00").of("tk-1")
    assert both["received_kg"] == pytest.approx(15_000 * T, abs=0.5)
    assert both["imbalance_kg"] == pytest.approx(0.0, abs=1.0)
    assert both["imbalance_uncertainty_kg"] == pytest.approx(math.hypot(15_000.0, math.sqrt(2) * KG_PER_MM), abs=1.0)


def test_a_totaliser_near_the_close_leaves_little_to_divide(harbour):
    """The totaliser was read at 05:00 and 07:00, not at six: 8,000 t and 8,800 t, 8,400 t halfway.

    The division by time is of the 800 t between those two readings only.
    """
    points = [{"at": "2026-03-14 05:00", "mass_kg": 8_000 * T}, {"at": "2026-03-14 07:00", "mass_kg": 8_800 * T}]
    ship(harbour, ENDED, 15_000, points)
    book = harbour.closes("2026-03-13").of("tk-1")
    assert book["received_kg"] == pytest.approx(8_400 * T, abs=0.5)
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=1.0)
    # 5 % of 800 t are 40 t, beside the meter's 8.4 t and the gauge's 2.1 t.
    expected = math.sqrt(40_000.0**2 + 8_400.0**2 + 2 * KG_PER_MM**2)
    assert book["imbalance_uncertainty_kg"] == pytest.approx(expected, abs=1.0)


def test_asked_why_it_is_heavier_the_tank_names_its_level_and_the_ship(harbour):
    """From six to six: 5.600 m more of the same liquid, 8,400 t; the ship's ticket says 8,400 t; nothing is left."""
    ship(harbour, ENDED, 14_994, [AT_CLOSE])
    why = harbour.change("tk-1", "2026-03-13 06:00", "2026-03-14 06:00")
    assert why["difference_kg"] == pytest.approx(8_400 * T, abs=0.5)
    level = [one for one in why["steps"] if one["input"] == "level_m"]
    assert [(one["before"], one["after"]) for one in level] == [(2.0, 7.6)]
    assert level[0]["contribution_kg"] == pytest.approx(8_400 * T, abs=0.5)
    others = [one["contribution_kg"] for one in why["steps"] if one["input"] != "level_m"]
    assert others == pytest.approx([0.0] * len(others), abs=0.01)
    assert [one["transfer"] for one in why["transfers"]] == ["ship-0313"]
    assert why["transfers"][0]["mass_kg"] == pytest.approx(8_400 * T, abs=0.5)
    assert why["unexplained_kg"] == pytest.approx(0.0, abs=0.5)
