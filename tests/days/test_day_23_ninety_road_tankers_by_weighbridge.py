"""Ninety road tankers by weighbridge, in air.

What happened: tank 23 (1,000 m², gasoline of 750 kg/m³: 750 kg to the millimetre) stands at 15.000 m on the 13th
at 06:00. From 06:20 on a road tanker leaves the rack every fifteen minutes, ninety of them until 04:50; the
weighbridge shows 28,000 kg net for each, ± 20 kg.

A weighbridge stands in air and is adjusted with weights of steel. Air carries a part of the gasoline: 1.2 kg for
each cubic metre, of steel of 8,000 kg/m³ likewise. What shows 28,000 kg in air has the mass (OIML D 28:2004)

    28,000 × (1 − 1.2/8,000) / (1 − 1.2/750) = 28,000 × 0.99985 / 0.9984 = 28,040.665 kg,

0.145 % more. Ninety of them: 2,523,659.9 kg, where the scales add up to 2,520,000 kg: 3,659.9 kg of air.

On the 14th at 06:00 the tank stands at 15.000 m − 2,523,659.9 / 750,000 = 11.635120 m.

What the books must say: delivered 2,523,660 kg, nothing is missing. Books that take the tickets as masses lose
3,660 kg at every ninety tankers: with 1 mm of level at either end (√2 × 750 = 1,061 kg) and ninety independent
tickets of 20 kg (√90 × 20 = 190 kg), 1,077 kg in all, that is 3.4 times what chance explains, each night, always
the same way: a leak that nobody finds.
"""

from __future__ import annotations

import math
from datetime import UTC, datetime, timedelta

import pytest

KG_PER_M = 750_000.0
IN_AIR = 28_000.0
BUOYANCY = (1.0 - 1.2 / 8_000.0) / (1.0 - 1.2 / 750.0)
MASS = IN_AIR * BUOYANCY
TANKERS = 90
NIGHT, OPENS, CLOSES = "2026-03-13", "2026-03-13 06:00", "2026-03-14 06:00"
CHANCE = math.hypot(math.sqrt(2.0) * 750.0, math.sqrt(TANKERS) * 20.0 * BUOYANCY)
FIRST = datetime(2026, 3, 13, 6, 0, tzinfo=UTC)


def tickets(*, in_air=True, density=None, count=TANKERS):
    """One tanker every fifteen minutes, twenty minutes on the rack each."""
    found = []
    for number in range(count):
        starts = FIRST + timedelta(minutes=15 * number)
        body = {"id": f"road-{number + 1:02d}", "from": "tk-23", "to": "boundary:road", "by": "weighbridge",
                "started_at": starts.isoformat(), "ended_at": (starts + timedelta(minutes=20)).isoformat(),
                "mass_uncertainty_kg": 20.0, ("weight_in_air_kg" if in_air else "mass_kg"): IN_AIR}  # fmt: skip
        if density is not None:
            body |= {"density_kg_m3": density, "density_temperature_c": 15.0}
        found.append(body)
    return found


@pytest.fixture
def tank(site):
    """The tank at both closes; nothing is posted of the rack yet."""
    site.liquid("gasoline", 750.0)
    site.tank("tk-23", "gasoline", area_m2=1000.0)
    site.reads("tk-23", OPENS, level_m=15.0)
    site.reads("tk-23", CLOSES, level_m=15.0 - TANKERS * MASS / KG_PER_M)
    return site


def test_the_arithmetic_of_the_buoyancy():
    """What the docstring says, on paper: 28,040.665 kg each, 2,523,659.9 kg in all, 11.635120 m."""
    assert pytest.approx(28_040.665, abs=0.001) == MASS
    assert pytest.approx(2_523_659.9, abs=0.1) == TANKERS * MASS
    assert pytest.approx(11.635120, abs=1e-6) == 15.0 - TANKERS * MASS / KG_PER_M


@pytest.mark.parametrize("density", [750.0, None])
def test_ninety_tankers_leave_the_books_even(tank, density):
    """With the density on the ticket or without it, then by the tank's: 2,523,660 kg out, 0 kg missing."""
    answer = tank.post("/transfers", {"transfers": tickets(density=density)})
    assert answer["stored"] == TANKERS
    night = tank.closes(NIGHT)
    book = night.of("tk-23")
    assert book["delivered_kg"] == pytest.approx(2_523_659.9, abs=0.5)
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert book["imbalance_uncertainty_kg"] == pytest.approx(CHANCE, abs=0.5)
    assert not night.flagged
    assert night.total("gasoline")["delivered_kg"] == pytest.approx(2_523_659.9, abs=0.5)
    assert night.ticket("road-42")["measured_mass_kg"] == pytest.approx(28_040.665, abs=0.01)


def test_weights_that_are_taken_for_masses_are_a_false_loss(tank):
    """Tickets that call 28,000 kg a mass: the book is 3,659.9 kg too high, 3.4 times its uncertainty."""
    tank.post("/transfers", {"transfers": tickets(in_air=False)})
    night = tank.closes(NIGHT)
    book = night.of("tk-23")
    assert book["imbalance_kg"] == pytest.approx(-3_659.9, abs=0.5)
    assert book["score"] == pytest.approx(-3_659.9 / math.hypot(1_060.66, 189.74), abs=0.01)
    assert night.flagged == {"tk-23"}


def test_the_tank_says_what_a_weighbridge_would_show_for_all_of_it(tank):
    """15,000 m³ × 750 = 11,250,000 kg weigh 11,250,000 / 1.001452 in air."""
    stock = tank.inventory(OPENS).of("tk-23")
    assert stock["mass_kg"] == pytest.approx(11_250_000.0, abs=0.5)
    assert stock["weight_in_air_kg"] == pytest.approx(11_250_000.0 / BUOYANCY, abs=0.5)


def test_a_tanker_on_the_rack_at_six_is_divided_and_both_nights_stay_even(tank):
    """A 91st from 05:50 to 06:10: half of it, 14,020.33 kg, before six, ± 5 % of the whole, 1,402 kg.

    The level at six lacks that half; at 06:00 a day later the tank is the other half down.
    """
    tank.post("/transfers", {"transfers": tickets()})
    starts = datetime(2026, 3, 14, 5, 50, tzinfo=UTC)
    tank.delivers("tk-23", "road-91", starts.isoformat(), (starts + timedelta(minutes=20)).isoformat(),
                  by="weighbridge", weight_in_air_kg=IN_AIR, mass_uncertainty_kg=20.0)  # fmt: skip
    tank.reads("tk-23", CLOSES, level_m=15.0 - (TANKERS + 0.5) * MASS / KG_PER_M)
    tank.reads("tk-23", "2026-03-15 06:00", level_m=15.0 - (TANKERS + 1) * MASS / KG_PER_M)
    nights = [tank.closes(day) for day in (NIGHT, "2026-03-14")]
    delivered = [night.ticket("road-91")["measured_mass_kg"] for night in nights]
    assert delivered == pytest.approx([MASS / 2.0, MASS / 2.0], abs=0.01)
    assert nights[0].of("tk-23")["imbalance_uncertainty_kg"] == pytest.approx(math.hypot(CHANCE, 0.05 * MASS), abs=1.0)
    for night in nights:
        assert night.of("tk-23")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
        assert not night.flagged


def test_the_last_ten_slips_come_in_the_afternoon(tank):
    """Eighty tickets at the close: 280,406.7 kg short, flagged. The other ten revise the night, and it is even."""
    slips = tickets()
    tank.post("/transfers", {"transfers": slips[:80]})
    first = tank.closes(NIGHT)
    assert first.of("tk-23")["imbalance_kg"] == pytest.approx(-10 * MASS, abs=0.5)
    assert first.flagged == {"tk-23"}
    answer = tank.post("/transfers", {"transfers": slips})
    assert (answer["stored"], answer["unchanged"]) == (10, 80)
    second = tank.closes(NIGHT)
    assert second["id"] == f"{NIGHT}.2" and not second.flagged
    assert second.of("tk-23")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert tank.book(f"{NIGHT}.1").of("tk-23")["delivered_kg"] == pytest.approx(80 * MASS, abs=0.5)
    told = next(one for one in tank.changes(f"{NIGHT}.2") if one["field"] == "delivered_kg")
    assert (told["before"], told["after"]) == pytest.approx((80 * MASS, 90 * MASS), abs=0.5)
    # The ten slips, and none of the eighty that were there before.
    late = [(one["kind"], one["subject"]) for one in told["because"]]
    assert sorted(late) == [("late_transfer", f"road-{number}") for number in range(81, 91)]
