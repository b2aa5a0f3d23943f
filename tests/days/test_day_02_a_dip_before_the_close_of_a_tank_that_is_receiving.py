"""A hand dip at 05:40 in a tank that receives 1,000 m³/h, closed at 06:00.

What happened: tank 2 (1,000 m², a liquid of 800 kg/m³: 800 kg to the millimetre) stood at 4.000 m at 06:00 on
the 13th. From 02:00 on the 14th a line brings 1,000 m³/h, 800 t an hour, until 08:00: 4,800 t. The operator
dips at 05:40, because at 06:00 he has to be at the manifold; 3 h 40 min of receipt are then in the tank.

What was posted: the opening dip, the line's ticket, the dip at 05:40, and the dip at 06:00 the day after.

What the books must say: the stock at six o'clock is not the dip. It is the dip, moved on by the 20 minutes of
receipt between it and the close: 800 t/h × ⅓ h = 266,667 kg. A night that takes the dip as it stands loses
267 t and finds them again the night after.

Three other ways of reading the same level at the same close follow: a counter of the line at 05:40 and 06:00,
which leaves nothing to divide by time; an automatic gauge at 05:57 and 06:02, between which the level is
interpolated and nothing is moved; and the gauge's value at 06:02 alone, moved back.
"""

from __future__ import annotations

import math

import pytest

KG_PER_M = 1000.0 * 800.0  # area × density
KG_PER_H = 800_000.0
KG_PER_MM = 800.0
CLOSE = "2026-03-14 06:00"


def level_at(hours_after_two: float) -> float:
    """4.000 m at 02:00, and 1 m an hour from there: 1,000 m³/h into 1,000 m²."""
    return 4.0 + hours_after_two


@pytest.fixture
def receiving(site):
    """The tank, its opening, and the line's ticket of 02:00 to 08:00, 4,800 t."""
    site.liquid("gas-oil", 800.0)
    site.tank("tk-2", "gas-oil", area_m2=1000.0)
    site.reads("tk-2", "2026-03-13 06:00", source="hand", level_m=4.0)
    return site


def line(site, **body):
    return site.receives("tk-2", "line-0314", "2026-03-14 02:00", "2026-03-14 08:00", mass_kg=4_800_000.0, **body)


def test_the_dip_is_moved_on_by_twenty_minutes_of_receipt(receiving):
    """The dip holds 4.000 + 3⅔ m = 7.666… m: 6,133,333 kg; 266,667 kg later it is 06:00.

    The ticket is divided by time at the dip (3⅔ of 6 hours: 2,933,333 kg) and at the close (4 of 6 hours:
    3,200,000 kg); the move is the difference, 266,667 kg.
    """
    line(receiving)
    receiving.reads("tk-2", "2026-03-14 05:40", source="hand", level_m=level_at(3 + 2 / 3))

    at_six = receiving.inventory(CLOSE)
    assert at_six.of("tk-2")["moved_kg"] == pytest.approx(KG_PER_H / 3, abs=0.5)
    assert at_six.of("tk-2")["mass_kg"] == pytest.approx(8.0 * KG_PER_M, abs=0.5)
    assert at_six.input("tk-2", "level_m")["value"] == pytest.approx(7.666667, abs=1e-6)
    assert at_six.input("tk-2", "level_m")["age_s"] == 1200.0

    night = receiving.closes("2026-03-13")
    book = night.of("tk-2")
    assert book["opening_mass_kg"] == pytest.approx(4.0 * KG_PER_M, abs=0.5)
    assert book["received_kg"] == pytest.approx(4 * KG_PER_H, abs=0.5)  # 02:00 to 06:00
    assert book["closing_mass_kg"] == pytest.approx(8.0 * KG_PER_M, abs=0.5)
    assert book["moved_kg"] == pytest.approx(KG_PER_H / 3, abs=0.5)
    assert book["closing_read_at"] == "2026-03-14T05:40:00Z"
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert not night.flagged


def test_what_is_not_known_about_the_move_is_less_than_the_move(receiving):
    """A line of which only the whole is known may have run faster or slower: 5 % of 4,800 t, 240 t, at 05:40.

    At 06:00 it is 240 t again, but nearly the same 240 t. Between the fixed start and end of a ticket the error
    of its running total goes like a bridge: after 11/18 and 12/18 of the time the two are correlated by
    ρ = √(11 × 6 / (12 × 7)) = 0.886. The move of 267 t is known to 240 × √(2 − 2ρ) = 114 t.

    The night's imbalance is another matter. The receipt after 05:40 stands in the closing mass and in the book
    alike and drops out; what came before 05:40 remains: 240 t, and √2 × 0.8 t of the two dips.
    """
    line(receiving)
    receiving.reads("tk-2", "2026-03-14 05:40", source="hand", level_m=level_at(3 + 2 / 3))
    correlation = math.sqrt(11.0 * 6.0 / (12.0 * 7.0))
    move = 240_000.0 * math.sqrt(2.0 - 2.0 * correlation)
    stock = receiving.inventory(CLOSE).of("tk-2")
    assert stock["mass_uncertainty_kg"] == pytest.approx(math.hypot(move, KG_PER_MM), abs=5.0)
    book = receiving.closes("2026-03-13").of("tk-2")
    assert book["imbalance_uncertainty_kg"] == pytest.approx(math.hypot(240_000.0, math.sqrt(2) * KG_PER_MM), abs=5.0)


def test_the_two_nights_add_up_to_the_ticket(receiving):
    """The night after receives the other 1,600 t (06:00 to 08:00) and closes at 10.000 m, idle since 08:00."""
    line(receiving)
    receiving.reads("tk-2", "2026-03-14 05:40", source="hand", level_m=level_at(3 + 2 / 3))
    receiving.reads("tk-2", "2026-03-15 06:00", source="hand", level_m=10.0)
    first, second = receiving.closes("2026-03-13"), receiving.closes("2026-03-14")
    assert second.of("tk-2")["opening_mass_kg"] == first.of("tk-2")["closing_mass_kg"]
    assert second.of("tk-2")["received_kg"] == pytest.approx(2 * KG_PER_H, abs=0.5)
    both = first.of("tk-2")["received_kg"] + second.of("tk-2")["received_kg"]
    assert both == pytest.approx(4_800_000.0, abs=0.01)
    assert second.of("tk-2")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert not first.flagged and not second.flagged


def test_a_counter_at_the_dip_and_at_the_close_leaves_nothing_to_divide_by_time(receiving):
    """The line slowed down: 2,900 t at 05:40, 3,150 t at 06:00. 250 t moved, not 266.667 t.

    The dip at 05:40 is 4.000 m + 2,900 t / (800 t/m) = 7.625 m; six o'clock is 6,100 + 250 = 6,350 t. No part of
    it was divided by time, so the only error is 1 mm of the dip: 800 kg. The night's imbalance has the error of
    two dips, √2 × 800 kg; the ticket is exact.
    """
    progress = [{"at": "2026-03-14 05:40", "mass_kg": 2.9e6}, {"at": CLOSE, "mass_kg": 3.15e6}]
    line(receiving, progress=progress)
    receiving.reads("tk-2", "2026-03-14 05:40", source="hand", level_m=7.625)
    stock = receiving.inventory(CLOSE).of("tk-2")
    assert stock["moved_kg"] == pytest.approx(250_000.0, abs=0.5)
    assert stock["mass_kg"] == pytest.approx(6_350_000.0, abs=0.5)
    assert stock["mass_uncertainty_kg"] == pytest.approx(KG_PER_MM, abs=0.5)
    book = receiving.closes("2026-03-13").of("tk-2")
    assert book["received_kg"] == pytest.approx(3_150_000.0, abs=0.5)
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert book["imbalance_uncertainty_kg"] == pytest.approx(math.sqrt(2) * KG_PER_MM, abs=0.5)


def test_a_gauge_before_and_after_the_close_is_interpolated_and_nothing_is_moved(receiving):
    """05:57 is 7.950 m, 06:02 is 8.0333… m; three fifths of the way between them is 8.000 m.

    1 mm of random error at each end: 800 kg × √((2/5)² + (3/5)²) = 576.9 kg, less than that of one reading.
    """
    line(receiving)
    receiving.reads("tk-2", "2026-03-14 05:57", source="gauge", level_m=level_at(3.95))
    receiving.reads("tk-2", "2026-03-14 06:02", source="gauge", level_m=level_at(4 + 2 / 60))
    stock = receiving.inventory(CLOSE).of("tk-2")
    assert stock["mass_kg"] == pytest.approx(8.0 * KG_PER_M, abs=0.5)
    assert stock["mass_uncertainty_kg"] == pytest.approx(KG_PER_MM * math.hypot(0.4, 0.6), abs=0.5)
    assert not stock.get("moved_kg")
    night = receiving.closes("2026-03-13")
    assert night.of("tk-2")["closing_mass_kg"] == pytest.approx(8.0 * KG_PER_M, abs=0.5)
    assert night.of("tk-2")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert not night.of("tk-2").get("moved_kg")


def test_a_dip_after_the_close_is_moved_back_to_it(receiving):
    """06:15 is 8.250 m; 200 t came between 06:00 and 06:15. Only a close looks ahead: live, nobody had it.

    The dip that was there live at six is the one of the morning before, 24 hours old: no longer usable.
    """
    line(receiving)
    receiving.reads("tk-2", "2026-03-14 06:15", source="hand", level_m=8.25)
    assert receiving.inventory(CLOSE).of("tk-2")["status"] == "unmeasured"
    book = receiving.closes("2026-03-13").of("tk-2")
    assert book["closing_mass_kg"] == pytest.approx(8.0 * KG_PER_M, abs=0.5)
    assert book["moved_kg"] == pytest.approx(-KG_PER_H / 4, abs=0.5)
    assert book["closing_read_at"] == "2026-03-14T06:15:00Z"
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)


def test_the_late_dip_makes_the_next_revision_and_the_first_stays_readable(receiving):
    """The dip of 05:40 reaches the books a day late: the night was incomplete, and is whole at once."""
    line(receiving)
    first = receiving.closes("2026-03-13")
    assert not first["complete"] and first.of("tk-2")["status"] == "unmeasured"
    assert first.of("tk-2")["imbalance_kg"] is None
    receiving.reads("tk-2", "2026-03-14 05:40", source="hand", level_m=level_at(3 + 2 / 3))
    second = receiving.closes("2026-03-13")
    assert second["id"] == "2026-03-13.2" and second["complete"]
    assert second.of("tk-2")["closing_mass_kg"] == pytest.approx(8.0 * KG_PER_M, abs=0.5)
    assert receiving.book("2026-03-13.1").of("tk-2")["status"] == "unmeasured"


def test_a_tank_that_delivers_is_moved_down(receiving):
    """800 t go out between 05:00 and 07:00; the dip at 05:30 says 3.750 m: 3,000 t. Half of 400 t are to go.

    05:30 to 06:00 is a quarter of the ticket: 200,000 kg. At 06:00 there are 2,800,000 kg: 4.000 m less 400 t.
    """
    receiving.delivers("tk-2", "pipe-0314", "2026-03-14 05:00", "2026-03-14 07:00", mass_kg=800_000.0)
    receiving.reads("tk-2", "2026-03-14 05:30", source="hand", level_m=3.75)
    book = receiving.closes("2026-03-13").of("tk-2")
    assert book["moved_kg"] == pytest.approx(-200_000.0, abs=0.5)
    assert book["closing_mass_kg"] == pytest.approx(2_800_000.0, abs=0.5)
    assert book["delivered_kg"] == pytest.approx(400_000.0, abs=0.5)
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)


def test_a_receipt_that_nobody_measured_cannot_be_moved_and_is_said(receiving):
    """The line has no meter: what came between 05:40 and 06:00 is unknown. The dip stands, and is uncertain."""
    receiving.receives("tk-2", "line-0314", "2026-03-14 02:00", "2026-03-14 08:00", unmetered=True)
    receiving.reads("tk-2", "2026-03-14 05:40", source="hand", level_m=level_at(3 + 2 / 3))
    inventory = receiving.inventory(CLOSE)
    assert inventory.of("tk-2")["mass_kg"] == pytest.approx(level_at(3 + 2 / 3) * KG_PER_M, abs=0.5)
    assert inventory.of("tk-2")["status"] == "uncertain"
    assert "input_uncertain" in inventory.warnings("tk-2")


def test_a_ticket_that_comes_late_moves_the_dip_as_well(receiving):
    """Without the ticket the dip is taken for six o'clock's stock, and 2,933 t are unexplained: flagged.

    The ticket of the next morning explains 3,200 t of receipt and moves the dip by 266,667 kg, both at once.
    """
    receiving.reads("tk-2", "2026-03-14 05:40", source="hand", level_m=level_at(3 + 2 / 3))
    first = receiving.closes("2026-03-13")
    assert first.of("tk-2")["imbalance_kg"] == pytest.approx(level_at(3 + 2 / 3) * KG_PER_M - 3_200_000.0, abs=0.5)
    assert first.flagged == {"tk-2"}
    line(receiving)
    second = receiving.closes("2026-03-13")
    assert second["id"] == "2026-03-13.2" and not second.flagged
    assert second.of("tk-2")["moved_kg"] == pytest.approx(KG_PER_H / 3, abs=0.5)
    assert second.of("tk-2")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)


def test_a_dip_that_was_copied_wrongly_is_corrected_and_the_revision_says_what_it_was(receiving):
    """7.525 m was entered, 7.625 m stands on the operator's sheet; the counter moves 250 t in either case.

    Before 7.525 m × 800 t/m + 250 t = 6,270,000 kg, after 7.625 m × 800 t/m + 250 t = 6,350,000 kg. The book is
    3,200 t + 3,150 t = 6,350 t: 80 t are missing, seventy times the √2 × 800 kg of two dips, and then none.
    """
    progress = [{"at": "2026-03-14 05:40", "mass_kg": 2.9e6}, {"at": CLOSE, "mass_kg": 3.15e6}]
    line(receiving, progress=progress)
    receiving.reads("tk-2", "2026-03-14 05:40", source="hand", level_m=7.525)
    first = receiving.closes("2026-03-13")
    assert (first["id"], first.flagged) == ("2026-03-13.1", {"tk-2"})
    assert receiving.changes("2026-03-13.1") == []  # the first close changes nothing
    assert receiving.reads("tk-2", "2026-03-14 05:40", source="hand", level_m=7.625)["revised"] == 1
    second = receiving.closes("2026-03-13")
    assert second["id"] == "2026-03-13.2" and not second.flagged

    assert second.of("tk-2")["closing_mass_kg"] == pytest.approx(6_350_000.0, abs=0.5)
    former = receiving.book("2026-03-13.1").of("tk-2")
    assert former["closing_mass_kg"] == pytest.approx(6_270_000.0, abs=0.5) and former["flagged"]
    told = {one["field"]: one for one in receiving.changes("2026-03-13.2")}
    assert set(told) == {"closing_mass_kg", "imbalance_kg", "flagged", "verdict"}
    assert {one["vessel"] for one in told.values()} == {"tk-2"}
    pairs = {field: (one["before"], one["after"]) for field, one in told.items()}
    assert pairs["closing_mass_kg"] == pytest.approx((6_270_000.0, 6_350_000.0), abs=0.5)
    assert pairs["imbalance_kg"] == pytest.approx((-80_000.0, 0.0), abs=0.5)
    assert (pairs["flagged"], pairs["verdict"]) == ((True, False), ("fail", "pass"))
    assert receiving.because("2026-03-13.2") == {("revised_reading", "tk-2 level_m 2026-03-14T05:40:00Z from hand")}
    assert receiving.words("2026-03-13.2")[0].startswith(
        "tk-2: closing mass 6,270,000 → 6,350,000 kg because the level of tk-2 of 2026-03-14T05:40:00Z from hand "
        "was revised on "
    )


def test_a_gauge_value_after_the_close_that_comes_late_takes_the_place_of_the_move(receiving):
    """Closed on 05:57 alone, 7.950 m: 6,360 t, and 3 min of 800 t/h, 40 t: 6,400,000 kg, as the book has it.

    The value of 06:02 arrives an hour later: 8.000 m, for the line ran slower just then. Three fifths of the way
    from 7.950 m, six o'clock is 7.980 m: 6,384,000 kg, 16 t short of the book. That is well within the 240 t that
    a ticket divided by time leaves open: nothing is flagged before or after.
    """
    line(receiving)
    receiving.reads("tk-2", "2026-03-14 05:57", source="gauge", level_m=7.95)
    assert receiving.closes("2026-03-13").of("tk-2")["moved_kg"] == pytest.approx(40_000.0, abs=0.5)
    receiving.reads("tk-2", "2026-03-14 06:02", source="gauge", level_m=8.0)
    second = receiving.closes("2026-03-13")
    assert second["id"] == "2026-03-13.2" and not second.flagged
    assert second.of("tk-2")["closing_mass_kg"] == pytest.approx(6_384_000.0, abs=0.5)
    assert not second.of("tk-2").get("moved_kg")

    former = receiving.book("2026-03-13.1").of("tk-2")
    assert former["closing_mass_kg"] == pytest.approx(6_400_000.0, abs=0.5)
    assert former["moved_kg"] == pytest.approx(40_000.0, abs=0.5)
    told = {(one["vessel"], one["field"]): (one["before"], one["after"]) for one in receiving.changes("2026-03-13.2")}
    assert set(told) == {("tk-2", "closing_mass_kg"), ("tk-2", "imbalance_kg")}
    assert told["tk-2", "closing_mass_kg"] == pytest.approx((6_400_000.0, 6_384_000.0), abs=0.5)
    assert told["tk-2", "imbalance_kg"] == pytest.approx((0.0, -16_000.0), abs=0.5)
    assert receiving.because("2026-03-13.2") == {("late_reading", "tk-2 level_m 2026-03-14T06:02:00Z from gauge")}
    assert receiving.words("2026-03-13.2")[0].startswith(
        "tk-2: closing mass 6,400,000 → 6,384,000 kg because the level of tk-2 of 2026-03-14T06:02:00Z from gauge "
        "came on "
    )
