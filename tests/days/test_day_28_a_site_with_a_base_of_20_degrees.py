"""A site with a 20 °C base, its tickets in standard volume.

What happened: a terminal sells by cubic metres at 20 °C. Its laboratory, like every other, gives densities at 15 °C:
the gas oil is 840.0 kg/m³ there, and expands by 0.0008 of itself for each kelvin.

    at 15 °C    840.0 kg/m³
    at 20 °C    840.0 × e^(−0.0008 × 5)  = 840.0 × 0.996 007 99 = 836.646 7 kg/m³
    at 25 °C    840.0 × e^(−0.0008 × 10) = 840.0 × 0.992 031 91 = 833.306 8 kg/m³

Tank 28 (100 m²) stands at 5.000 m and 25 °C: 500 m³ as they stand, 500 × 0.996 007 99 = 498.004 m³ at 20 °C, and
416,653.4 kg. On the 14th it delivers three times 100 m³ at 20 °C. One ticket names no density, one that of the
laboratory (840.0 at 15 °C), one that of the rack's own densitometer (836.646 7 at 20 °C): three ways to say
83,664.7 kg. In the morning 198.004 m³ at 20 °C are left, which stand at 25 °C as 198.797 6 m³: 1.987 976 m.

What the books must say: 250,994.0 kg delivered, nothing missing. Whoever takes a density of 15 °C for one of 20 °C
books 100 × 840.0 = 84,000 kg for a ticket: 335 kg too much each, 1,006 kg in all, where the error is that of the
gauge's two millimetres, 118 kg, and of an expansion that is known to 2 %: at most 0.02 × 0.0008 × 10 K × 251 t = 40 kg.
"""

from __future__ import annotations

import math

import pytest

BETA = 0.0008
AT_15 = 840.0
AT_20 = AT_15 * math.exp(-BETA * 5.0)
AT_25 = AT_15 * math.exp(-BETA * 10.0)
OPENED = 500.0 * AT_25
SOLD = 100.0 * AT_20
NIGHT, OPENS, CLOSES = "2026-03-14", "2026-03-14 06:00", "2026-03-15 06:00"
EXPANSION = 0.02 * BETA * 10.0 * 3.0 * SOLD
GAUGE = math.sqrt(2.0) * 0.1 * AT_25  # kg; 1 mm of 100 m² at either end


def terminal(new_site, base_c):
    """The tank and its three readings, at a site of that base temperature."""
    site = new_site(base_temperature_c=base_c)
    site.liquid("gas-oil", AT_15, beta_per_k=BETA)
    site.tank("tk-28", "gas-oil", assumed={}, instruments={"liquid_temperature_c": {"random": 0.0, "systematic": 0.0}})
    site.reads("tk-28", OPENS, level_m=5.0, liquid_temperature_c=25.0)
    site.reads("tk-28", CLOSES, level_m=1.987976, liquid_temperature_c=25.0)
    return site


def sells(site, ticket, hour, **quantity):
    said = {"standard_volume_m3": 100.0} | quantity
    return site.delivers("tk-28", ticket, f"2026-03-14 {hour:02}:00", f"2026-03-14 {hour:02}:40", **said)


@pytest.fixture
def base_20(new_site):
    return terminal(new_site, 20.0)


def test_the_tank_holds_fewer_cubic_metres_at_20_than_as_they_stand(base_20):
    told = base_20.inventory(OPENS).of("tk-28")
    assert told["gross_observed_volume_m3"] == pytest.approx(500.0, abs=1e-6)
    assert told["gross_standard_volume_m3"] == pytest.approx(498.0040, abs=0.0001)
    assert told["standard_density_kg_m3"] == pytest.approx(836.6467, abs=0.0001)
    assert told["liquid_density_kg_m3"] == pytest.approx(833.3068, abs=0.0001)
    assert told["mass_kg"] == pytest.approx(416_653.4, abs=0.1)


def test_three_ways_to_say_a_density_are_one_mass(base_20):
    sells(base_20, "silent", 8)
    sells(base_20, "laboratory", 10, density_kg_m3=840.0, density_temperature_c=15.0)
    sells(base_20, "densitometer", 12, density_kg_m3=836.6467, density_temperature_c=20.0)
    night = base_20.closes(NIGHT)
    masses = [night.ticket(name)["measured_mass_kg"] for name in ("silent", "laboratory", "densitometer")]
    assert masses == pytest.approx([83_664.67] * 3, abs=0.02)
    book = night.of("tk-28")
    assert book["delivered_kg"] == pytest.approx(250_994.0, abs=0.1)
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.2)
    assert GAUGE - 0.1 <= book["imbalance_uncertainty_kg"] <= math.hypot(GAUGE, EXPANSION) + 0.1
    assert not night.flagged


def test_a_density_of_15_taken_for_one_of_20_is_a_third_of_a_tonne_a_ticket(base_20):
    """Three tickets whose density was typed in with the wrong temperature: 1,006 kg over, and flagged."""
    for ticket, hour in (("a", 8), ("b", 10), ("c", 12)):
        sells(base_20, ticket, hour, density_kg_m3=840.0, density_temperature_c=20.0)
    night = base_20.closes(NIGHT)
    assert night.ticket("a")["measured_mass_kg"] == pytest.approx(84_000.0, abs=0.01)
    assert night.of("tk-28")["imbalance_kg"] == pytest.approx(3 * 335.33, abs=0.5)
    assert night.flagged == {"tk-28"}


def test_a_volume_as_it_ran_through_the_meter_needs_no_base(base_20):
    """100 m³ at 25 °C are 83,330.7 kg, by whichever base."""
    sells(base_20, "observed", 8, standard_volume_m3=None, observed_volume_m3=100.0, temperature_c=25.0)
    assert base_20.closes(NIGHT).ticket("observed")["measured_mass_kg"] == pytest.approx(83_330.68, abs=0.01)


def test_the_same_ticket_is_more_at_a_site_with_a_base_of_15(new_site):
    """100 standard m³ are 84,000 kg there. The tank's mass is the same: a mass knows no base."""
    base_15 = terminal(new_site, 15.0)
    sells(base_15, "silent", 8)
    told = base_15.inventory(OPENS).of("tk-28")
    assert told["gross_standard_volume_m3"] == pytest.approx(500.0 * math.exp(-0.008), abs=0.0001)
    assert told["standard_density_kg_m3"] == pytest.approx(840.0, abs=0.0001)
    assert told["mass_kg"] == pytest.approx(OPENED, abs=0.1)
    assert base_15.closes(NIGHT).ticket("silent")["measured_mass_kg"] == pytest.approx(84_000.0, abs=0.01)


def test_a_sample_of_15_is_the_tickets_of_20_and_revises_their_night(base_20):
    """Two days later the laboratory reports 842.0 at 15 °C for the week before: 842.0 × 0.996 007 99 at 20 °C.

    What left and what is left change by the same 2 in 840: the night balances as before, and its revision says why.
    """
    for ticket, hour in (("a", 8), ("b", 10), ("c", 12)):
        sells(base_20, ticket, hour)
    base_20.closes(NIGHT)
    base_20.reads("tk-28", "2026-03-08 09:00", source="lab", observed_density_kg_m3=842.0,
                  observed_density_temperature_c=15.0, sample="s-0308")  # fmt: skip
    night = base_20.closes(NIGHT)
    assert night["id"] == f"{NIGHT}.2"
    assert night.ticket("a")["measured_mass_kg"] == pytest.approx(100.0 * 842.0 * 0.99600799, abs=0.01)
    assert night.of("tk-28")["imbalance_kg"] == pytest.approx(0.0, abs=0.2)
    changed = base_20.changes(NIGHT)
    assert {one["field"] for one in changed} >= {"opening_mass_kg", "closing_mass_kg", "delivered_kg"}
    assert {cause["kind"] for one in changed for cause in one["because"]} == {"late_reading"}
    subjects = {cause["subject"] for one in changed for cause in one["because"]}
    assert "tk-28 observed_density_kg_m3 2026-03-08T09:00:00Z from lab" in subjects
