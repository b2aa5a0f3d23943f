"""A line between jetty and tanks that is full at both closes, of another product at the second.

What happened: 200 m³ of line lie between the jetty and the tanks, always full. At 06:00 on the 13th they hold
gasoline (750 kg/m³), from the last ship. At noon a ship starts to discharge 4,000 m³ of gas oil (840 kg/m³). Her
first 200 m³ push the gasoline into tank 1; then the valve is turned, 3,800 m³ run into tank 2, and 200 m³ of gas
oil stay in the line. Both tanks have 1,000 m²: 750 and 840 kg to the millimetre.

                 13th 06:00                       14th 06:00
    line         200 m³ gasoline      150 t       200 m³ gas oil     168 t
    tank 1       5.000 m gasoline   3,750 t       5.200 m          3,900 t
    tank 2       3.000 m gas oil    2,520 t       6.800 m          5,712 t
    ship                            3,360 t

What was posted: the ship's ticket into the line (a meter, 0.1 %); the push into tank 1, by statement, 150 t ± 0.4 t;
the run into tank 2, which nobody metered; and a text of the line that says gas oil from noon on.

What the books must say:

- The line is a vessel of stamped volume whose liquid needs a temperature and no level. It holds 150 t and 168 t.
- Line and tank 2 are judged together, for nothing was metered between them: 150 + 2,520 + 3,360 − 150 = 5,880 t,
  found 168 + 5,712 = 5,880 t. Tank 1 balances with the push.
- Gasoline: 3,900 t before and after. That it went through a line of gas oil is reclassified out and in again.
- Where nobody says that the line changed its product, it is taken for gasoline still: 18 t short, and flagged.
"""

from __future__ import annotations

import math

import pytest

T = 1000.0  # kg
OPENED, NOON, CLOSED = "2026-03-13 06:00", "2026-03-13 12:00", "2026-03-14 06:00"
EXACT = {"capacity_pct": {"systematic": 0.0}}
AT_15 = {"liquid_temperature_c": {"value": 15.0, "standard_uncertainty": 0.0}}


def line(site, holds, **body):
    usual = {"shape": {"kind": "fixed_volume", "volume_m3": 200.0}, "shell": {"expansion_per_k": 0.0},
             "instruments": EXACT, "assumed": AT_15}  # fmt: skip
    return site.vessel("l-1", holds, **{**usual, **body})


@pytest.fixture
def jetty(site):
    """The line, both tanks with their readings, and the ship's meter."""
    site.liquid("gasoline", 750.0)
    site.liquid("gas-oil", 840.0)
    line(site, "gasoline")
    for name, holds, before, after in (("tk-1", "gasoline", 5.0, 5.2), ("tk-2", "gas-oil", 3.0, 6.8)):
        site.tank(name, holds, area_m2=1000.0)
        site.reads(name, OPENED, level_m=before)
        site.reads(name, CLOSED, level_m=after)
    site.meter("m-ship", systematic_pct=0.1)
    return site


def discharge(site):
    site.receives("l-1", "ship-0313", NOON, "2026-03-13 22:00", meter="m-ship", mass_kg=3_360 * T)
    site.moves("push-0313", "l-1", "tk-1", NOON, "2026-03-13 12:30", mass_kg=150 * T, by="statement",
               mass_uncertainty_kg=400.0)  # fmt: skip
    site.moves("run-0313", "l-1", "tk-2", "2026-03-13 12:30", "2026-03-13 22:00", unmetered=True, by="gauging")


def changes_product(site):
    assert line(site, "gas-oil", effective_from=NOON) == "revised"


def test_a_line_is_full_without_any_reading(jetty):
    """200 m³ × 750 and × 840: with an assumed 15 °C and an exact volume nothing is uncertain."""
    changes_product(jetty)
    for at, substance, mass in ((OPENED, "gasoline", 150 * T), (CLOSED, "gas-oil", 168 * T)):
        stock = jetty.inventory(at).of("l-1")
        assert (stock["substance"], stock["status"]) == (substance, "measured")
        assert stock["mass_kg"] == pytest.approx(mass, abs=0.01)
        assert stock["mass_uncertainty_kg"] == pytest.approx(0.0, abs=0.01)


def test_line_and_tank_are_judged_together(jetty):
    """5,880 t and 5,880 t; √(3,360² + 400² + 2 × 840²) kg. Tank 1: √(400² + 2 × 750²) kg."""
    changes_product(jetty)
    discharge(jetty)
    night = jetty.closes("2026-03-13")
    assert night["complete"] and not night.flagged
    for name, other, mass in (("l-1", "tk-2", 168 * T), ("tk-2", "l-1", 5_712 * T)):
        book = night.of(name)
        assert book["judged_with"] == [other]
        assert book["closing_mass_kg"] == pytest.approx(mass, abs=0.5)
        assert (book["received_kg"], book["delivered_kg"]) == (3_360 * T, 150 * T)
        assert book["book_mass_kg"] == pytest.approx(5_880 * T, abs=0.5)
        assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
        expected = math.sqrt(3_360.0**2 + 400.0**2 + 2 * 840.0**2)
        assert book["imbalance_uncertainty_kg"] == pytest.approx(expected, abs=0.5)
    assert night.of("l-1")["opening_mass_kg"] == pytest.approx(150 * T, abs=0.5)
    assert not night.of("l-1").get("restated_kg")
    tank = night.of("tk-1")
    assert tank["judged_with"] == [] and tank["received_kg"] == 150 * T
    assert tank["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert tank["imbalance_uncertainty_kg"] == pytest.approx(math.sqrt(400.0**2 + 2 * 750.0**2), abs=0.5)


def test_the_totals_are_those_of_the_products(jetty):
    """Gasoline 3,900 t twice; gas oil 2,520 + 3,360 = 5,880 t. What was reclassified came back: 0 in all."""
    changes_product(jetty)
    discharge(jetty)
    night = jetty.closes("2026-03-13")
    gasoline, gas_oil = night.total("gasoline"), night.total("gas-oil")
    assert gasoline["opening_mass_kg"] == pytest.approx(3_900 * T, abs=0.5)
    assert gasoline["closing_mass_kg"] == pytest.approx(3_900 * T, abs=0.5)
    assert (gasoline["received_kg"], gasoline["delivered_kg"]) == (0.0, 0.0)
    assert gas_oil["opening_mass_kg"] == pytest.approx(2_520 * T, abs=0.5)
    assert gas_oil["received_kg"] == pytest.approx(3_360 * T, abs=0.5)
    assert gas_oil["closing_mass_kg"] == pytest.approx(5_880 * T, abs=0.5)
    for total in (gasoline, gas_oil):
        assert total["complete"]
        assert total["reclassified_kg"] == pytest.approx(0.0, abs=0.5)
        assert total["imbalance_kg"] == pytest.approx(0.0, abs=0.5)


def test_a_line_that_nobody_renamed_is_eighteen_tonnes_short_until_it_is(jetty):
    """200 m³ × (840 − 750) = 18 t against ± 3.6 t. The text comes a day later and revises the night."""
    discharge(jetty)
    night = jetty.closes("2026-03-13")
    assert night.flagged == {"l-1", "tk-2"}
    assert night.of("l-1")["imbalance_kg"] == pytest.approx(-18 * T, abs=0.5)
    changes_product(jetty)
    night = jetty.closes("2026-03-13")
    assert night["id"] == "2026-03-13.2" and not night.flagged
    assert night.of("l-1")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    told = {(one.get("vessel"), one["field"]): one for one in jetty.changes("2026-03-13.2")}
    line_closed = told["l-1", "closing_mass_kg"]
    assert (line_closed["before"], line_closed["after"]) == (pytest.approx(150 * T), pytest.approx(168 * T))
    assert {one["kind"] for one in line_closed["because"]} == {"definition"}


def test_a_line_that_lies_idle_balances_exactly(jetty):
    night = jetty.closes("2026-03-13").of("l-1")
    assert (night["opening_mass_kg"], night["closing_mass_kg"]) == (pytest.approx(150 * T), pytest.approx(150 * T))
    assert night["imbalance_kg"] == 0.0
    assert not night["flagged"] and night["judged_with"] == []


def test_a_line_in_the_sun_holds_less_and_needs_a_temperature(site):
    """β = 0.0012 /K, 40 °C: 200 × 750 × exp(−0.0012 × 25) = 145,566.8 kg. Unread and not assumed: unmeasured."""
    site.liquid("gasoline", 750.0, beta_per_k=0.0012)
    line(site, "gasoline", assumed={})
    cold = site.inventory("2026-03-13 14:00").of("l-1")
    assert cold["status"] == "unmeasured" and cold["mass_kg"] is None
    site.reads("l-1", "2026-03-13 14:00", liquid_temperature_c=40.0)
    warm = site.inventory("2026-03-13 14:00").of("l-1")
    assert warm["mass_kg"] == pytest.approx(150_000.0 * math.exp(-0.03), abs=0.5)
    assert warm["mass_kg"] == pytest.approx(145_566.8, abs=0.5)
