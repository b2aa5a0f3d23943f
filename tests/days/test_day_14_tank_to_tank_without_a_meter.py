"""Tank to tank without a meter; the same with a ticket that was computed from the gauges.

What happened: tanks 1 and 2 (100 m² each, 800 kg/m³: 80 kg to the millimetre) stand side by side. On the 13th from
09:00 to 14:00 the pump moves gas oil from the one to the other. There is no meter on that line.

    13th 06:00    tank 1 6.000 m    480,000 kg        tank 2 1.000 m     80,000 kg
    14th 06:00    tank 1 4.000 m    320,000 kg        tank 2 3.000 m    240,000 kg

What was posted, and what the books must say:

- The ticket says `unmetered`. What it moved is not known, so neither tank has a balance of its own; together
  they do: 560,000 kg before and after, ± √4 × 80 kg. Each names the other in `judged_with`.
- The planner computes the ticket from tank 1's gauge, 160,000 kg, `by: gauging`. That is no second measurement:
  it would make tank 1 balance whatever its gauge says, and put every fault on tank 2. It is kept and shown, and
  the balance is as if it were unmetered.
- A meter on the line would give each tank its own balance.
- A ship that was measured by the shore's own gauges leaves nothing to compare with: no verdict.
"""

from __future__ import annotations

import math

import pytest

STARTED, ENDED = "2026-03-13 09:00", "2026-03-13 14:00"
OPENED, CLOSED = "2026-03-13 06:00", "2026-03-14 06:00"
KG_PER_MM = 80.0
FOUR_READINGS = math.sqrt(4.0) * KG_PER_MM


@pytest.fixture
def tanks(site):
    site.liquid("gas-oil", 800.0)
    for name, level in (("tk-1", 6.0), ("tk-2", 1.0)):
        site.tank(name, "gas-oil")
        site.reads(name, OPENED, level_m=level)
    return site


def morning(site, first=4.0, second=3.0):
    site.reads("tk-1", CLOSED, level_m=first)
    site.reads("tk-2", CLOSED, level_m=second)


def unmetered(site):
    return site.moves("pump-0313", "tk-1", "tk-2", STARTED, ENDED, unmetered=True, by="gauging")


def by_gauging(site, mass_kg):
    return site.moves("pump-0313", "tk-1", "tk-2", STARTED, ENDED, mass_kg=mass_kg, by="gauging")


def test_two_tanks_are_judged_together(tanks):
    """560,000 kg in the book of the two, 560,000 kg found: each of the two entries carries the pair's."""
    unmetered(tanks)
    morning(tanks)
    night = tanks.closes("2026-03-13")
    assert night["complete"] and not night.flagged
    for name, other in (("tk-1", "tk-2"), ("tk-2", "tk-1")):
        book = night.of(name)
        assert book["judged_with"] == [other]
        assert (book["received_kg"], book["delivered_kg"]) == (0.0, 0.0)
        assert book["book_mass_kg"] == pytest.approx(560_000.0, abs=0.5)
        assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
        assert book["imbalance_uncertainty_kg"] == pytest.approx(FOUR_READINGS, abs=0.5)
    assert night.of("tk-1")["closing_mass_kg"] == pytest.approx(320_000.0, abs=0.5)
    assert night.of("tk-2")["closing_mass_kg"] == pytest.approx(240_000.0, abs=0.5)
    assert night.ticket("pump-0313")["measured_mass_kg"] is None
    assert night.ticket("pump-0313")["observability"] == "observable"


def test_without_any_ticket_both_are_flagged(tanks):
    """160,000 kg short in the one, over in the other; the first thing to look for is a ticket."""
    morning(tanks)
    night = tanks.closes("2026-03-13")
    assert night.flagged == {"tk-1", "tk-2"}
    assert night.of("tk-1")["imbalance_kg"] == pytest.approx(-160_000.0, abs=0.5)
    assert night.of("tk-2")["imbalance_kg"] == pytest.approx(160_000.0, abs=0.5)
    unmetered(tanks)
    assert not tanks.closes("2026-03-13").flagged


def test_what_left_both_is_seen_in_the_two_together(tanks):
    """Tank 2 found at 2.900 m: 8,000 kg left the pair, against ± 160 kg. Which of the two, nobody can say."""
    unmetered(tanks)
    morning(tanks, second=2.9)
    night = tanks.closes("2026-03-13")
    assert night.flagged == {"tk-1", "tk-2"}
    assert night.of("tk-1")["imbalance_kg"] == pytest.approx(-8_000.0, abs=0.5)
    assert night.of("tk-2")["imbalance_kg"] == pytest.approx(-8_000.0, abs=0.5)
    assert night.total("gas-oil")["imbalance_kg"] == pytest.approx(-8_000.0, abs=0.5)  # once, not twice


def test_what_left_with_a_ticket_is_in_the_book_of_the_two(tanks):
    """Tank 2 loads 40,000 kg by road meanwhile, 2.500 m: 560,000 − 40,000 = 320,000 + 200,000."""
    unmetered(tanks)
    tanks.delivers("tk-2", "road-0313", "2026-03-13 10:00", "2026-03-13 11:00", mass_kg=40_000.0)
    morning(tanks, second=2.5)
    night = tanks.closes("2026-03-13")
    assert night.of("tk-1")["delivered_kg"] == night.of("tk-2")["delivered_kg"] == 40_000.0
    assert night.of("tk-1")["book_mass_kg"] == pytest.approx(520_000.0, abs=0.5)
    assert night.of("tk-1")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert not night.flagged


def test_a_ticket_from_the_gauges_is_no_second_measurement(tanks):
    """The books are those of the unmetered ticket, to the digit; the ticket itself is kept as it was written."""
    morning(tanks)
    unmetered(tanks)
    without = tanks.closes("2026-03-13")
    assert by_gauging(tanks, 160_000.0) == "revised"
    night = tanks.closes("2026-03-13")
    assert night["id"] == "2026-03-13.2"
    assert [night.of(name) for name in ("tk-1", "tk-2")] == [without.of(name) for name in ("tk-1", "tk-2")]
    assert tanks.get("/transfers/pump-0313")["transfer"]["mass_kg"] == 160_000.0


def test_a_gauge_that_moved_cannot_hide_behind_its_own_ticket(tanks):
    """Tank 1's gauge has risen by 100 mm: 4.100 m, and the ticket that it makes is 152,000 kg.

    Taken as a measurement it would clear tank 1 and find 8,000 kg too many in tank 2. The pair is 8,000 kg over.
    """
    by_gauging(tanks, 152_000.0)
    morning(tanks, first=4.1)
    night = tanks.closes("2026-03-13")
    assert night.of("tk-1")["judged_with"] == ["tk-2"]
    assert night.of("tk-1")["imbalance_kg"] == pytest.approx(8_000.0, abs=0.5)
    assert night.flagged == {"tk-1", "tk-2"}


def test_a_meter_on_the_line_gives_each_its_own_balance(tanks):
    """160,000 kg ± 0.1 %: √(2 × 80² + 160²) kg in each."""
    tanks.meter("m-p", systematic_pct=0.1)
    tanks.moves("pump-0313", "tk-1", "tk-2", STARTED, ENDED, meter="m-p", mass_kg=160_000.0)
    morning(tanks)
    night = tanks.closes("2026-03-13")
    assert not night.flagged
    for name in ("tk-1", "tk-2"):
        book = night.of(name)
        assert book["judged_with"] == []
        assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
        expected = math.sqrt(2 * KG_PER_MM**2 + 160.0**2)
        assert book["imbalance_uncertainty_kg"] == pytest.approx(expected, abs=0.5)
    assert night.of("tk-1")["delivered_kg"] == night.of("tk-2")["received_kg"] == 160_000.0


def test_a_ship_by_the_shores_own_gauges_leaves_no_verdict(tanks):
    """Tank 2 received what its own gauge says that it received: there is nothing left to find."""
    tanks.receives("tk-2", "ship-0313", STARTED, ENDED, mass_kg=160_000.0, by="gauging")
    morning(tanks, first=6.0)
    night = tanks.closes("2026-03-13")
    book = night.of("tk-2")
    assert book["imbalance_kg"] is None
    assert (book["verdict"], book["flagged"]) == ("inconclusive", False)
    assert book["closing_mass_kg"] == pytest.approx(240_000.0, abs=0.5)
    assert night.of("tk-1")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert not night["complete"]


def test_a_dip_while_the_pump_ran_says_that_it_cannot_be_moved(tanks):
    """Dipped at 11:30, asked at noon: what moved in that half hour nobody measured. The answer is uncertain."""
    unmetered(tanks)
    tanks.reads("tk-1", "2026-03-13 11:30", level_m=5.0)
    inventory = tanks.inventory("2026-03-13 12:00")
    assert inventory.of("tk-1")["mass_kg"] == pytest.approx(400_000.0, abs=0.5)
    assert inventory.of("tk-1")["status"] == "uncertain"
    assert "input_uncertain" in inventory.warnings("tk-1")


def test_one_meter_feeds_two_tanks_through_a_manifold(tanks):
    """A barge's 240,000 kg pass one meter (0.1 %) and then a manifold: two thirds go to tank 1, a third to tank 2.

    The manifold holds nothing and is a node all the same: what came in must have gone out. The two branches have
    no meter, so the three are judged together: 560,000 + 240,000 = 640,000 + 160,000 kg.
    """
    tanks.vessel("manifold", None, shape={"kind": "junction"})
    tanks.meter("m-b", systematic_pct=0.1)
    tanks.receives("manifold", "barge-0313", STARTED, ENDED, meter="m-b", mass_kg=240_000.0)
    for tank in ("tk-1", "tk-2"):
        tanks.moves(f"branch-{tank}", "manifold", tank, STARTED, ENDED, unmetered=True, by="gauging")
    morning(tanks, first=8.0, second=2.0)
    night = tanks.closes("2026-03-13")
    assert night["complete"] and not night.flagged
    for name in ("tk-1", "tk-2"):
        book = night.of(name)
        assert set(book["judged_with"]) == {"tk-1", "tk-2", "manifold"} - {name}
        assert book["received_kg"] == pytest.approx(240_000.0, abs=0.5)
        assert book["book_mass_kg"] == pytest.approx(800_000.0, abs=0.5)
        assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
        expected = math.hypot(FOUR_READINGS, 240.0)
        assert book["imbalance_uncertainty_kg"] == pytest.approx(expected, abs=0.5)
    assert night.total("gas-oil")["received_kg"] == pytest.approx(240_000.0, abs=0.5)
    assert "manifold" not in [one["vessel"] for one in tanks.inventory(CLOSED)["vessels"]]


def test_a_manifold_whose_branches_are_metered_has_a_balance_of_its_own(tanks):
    """240,000 kg in by the barge's meter, 160,000 and 79,000 out by two others: 1,000 kg went another way."""
    tanks.vessel("manifold", None, shape={"kind": "junction"})
    for meter in ("m-b", "m-1", "m-2"):
        tanks.meter(meter, systematic_pct=0.1)
    tanks.receives("manifold", "barge-0313", STARTED, ENDED, meter="m-b", mass_kg=240_000.0)
    tanks.moves("branch-1", "manifold", "tk-1", STARTED, ENDED, meter="m-1", mass_kg=160_000.0)
    tanks.moves("branch-2", "manifold", "tk-2", STARTED, ENDED, meter="m-2", mass_kg=79_000.0)
    morning(tanks, first=8.0, second=1.9875)
    night = tanks.closes("2026-03-13")
    book = night.of("manifold")
    assert (book["opening_mass_kg"], book["closing_mass_kg"]) == (0.0, 0.0)
    assert (book["received_kg"], book["delivered_kg"]) == (240_000.0, 239_000.0)
    # Nothing was found in it where 1,000 kg should be: that much left by a way that nobody wrote down.
    assert book["imbalance_kg"] == pytest.approx(-1_000.0, abs=0.5)
    expected = math.sqrt(240.0**2 + 160.0**2 + 79.0**2)
    assert book["imbalance_uncertainty_kg"] == pytest.approx(expected, abs=0.5)
    assert night.flagged == {"manifold"}
    assert night.of("tk-1")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert night.of("tk-2")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    # The site received 240,000 kg and holds 239,000 of them: the total sees the loss that no tank sees.
    assert night.total("gas-oil")["received_kg"] == pytest.approx(240_000.0, abs=0.5)
    assert night.total("gas-oil")["imbalance_kg"] == pytest.approx(-1_000.0, abs=0.5)


def test_the_meters_ticket_comes_late_and_says_what_it_changed(tanks):
    """Judged together first; the meter's slip of the morning after gives each its own balance, from 560,000 kg."""
    morning(tanks)
    unmetered(tanks)
    tanks.closes("2026-03-13")
    tanks.meter("m-p", systematic_pct=0.1)
    assert tanks.moves("pump-0313", "tk-1", "tk-2", STARTED, ENDED, meter="m-p", mass_kg=160_000.0) == "revised"
    assert tanks.closes("2026-03-13")["id"] == "2026-03-13.2"
    told = [one for one in tanks.changes("2026-03-13.2") if one.get("transfer") == "pump-0313"]
    measured = next(one for one in told if one["field"] == "measured_mass_kg")
    assert (measured["before"], measured["after"]) == (None, pytest.approx(160_000.0, abs=0.5))
    assert {one["kind"] for one in measured["because"]} <= {"late_transfer", "definition"}
    assert "pump-0313" in [one["subject"] for one in measured["because"]]
