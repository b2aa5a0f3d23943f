"""Water is drawn off without a new dip; and a tank whose water was never dipped.

What happened: tank 10 (1,000 m², a gasoline of 750 kg/m³: 750 kg to the millimetre) was dipped on the 13th at
06:00: 8.000 m, with 0.200 m of water under the product. Its product is then 7,800 m³, 5,850 t. From 10:00 to
11:00 an operator opens the drain until oil shows: 180 m³ of water are gone, the level falls to 7.820 m, and
0.020 m of water stay behind. He has not dipped the water when the night is closed at 06:00.

    13th 06:00    8.000 m, water 0.200 m     7,800 m³    5,850 t
    14th 06:00    7.820 m, water 0.020 m     7,800 m³    5,850 t    nothing is missing

What the books must say:

- Without a ticket of the draw nobody can know of it: the old dip stands, 7,620 m³ of product, 135 t short, and
  flagged.
- The ticket says `of: water`. It is no part of the balance, and no dip of the water is carried past it: what is
  left is taken as none, 7,820 m³, 5,865 t, 15 t over the book. The last dip bounds the error, 200 m³ / √3 of
  product: ± 86.6 t, and the answer says `water_predates_receipt`, `uncertain`. It is no gain, and not flagged.
- The dip of 0.020 m that was taken at 05:30, and entered the day after, revises the night: 5,850 t, balanced.
"""

from __future__ import annotations

import math

import pytest

OPENED, CLOSED = "2026-03-13 06:00", "2026-03-14 06:00"
KG_PER_MM = 1000.0 * 750.0 / 1000.0
T = 1000.0  # kg
EXACT_WATER = {"free_water_level_m": {"random": 0.0, "systematic": 0.0}}
BOUND = 200.0 * 750.0 / math.sqrt(3.0)  # kg; the water that was dipped, had it been product


@pytest.fixture
def tank(site):
    """The tank with its opening, 5,850 t, and the level after the draw."""
    site.liquid("gasoline", 750.0)
    site.tank("tk-10", "gasoline", area_m2=1000.0, instruments=EXACT_WATER)
    site.reads("tk-10", OPENED, source="hand", level_m=8.0, free_water_level_m=0.2)
    site.reads("tk-10", CLOSED, source="hand", level_m=7.82)
    return site


def drain(site):
    """180 m³ at 1,000 kg/m³; its uncertainty is the operator's guess, and enters nothing."""
    return site.delivers("tk-10", "drain-0313", "2026-03-13 10:00", "2026-03-13 11:00", by_way_of="drain",
                         water=True, mass_kg=180_000.0, mass_uncertainty_kg=20_000.0)  # fmt: skip


def test_a_dip_of_the_water_takes_its_room(tank):
    """8,000 − 200 = 7,800 m³; a millimetre of level, 750 kg, is the only error."""
    stock = tank.inventory(OPENED).of("tk-10")
    assert stock["free_water_volume_m3"] == pytest.approx(200.0, abs=1e-6)
    assert stock["mass_kg"] == pytest.approx(5_850 * T, abs=0.5)
    assert stock["mass_uncertainty_kg"] == pytest.approx(KG_PER_MM, abs=0.5)
    assert stock["status"] == "measured"


def test_without_a_ticket_the_water_is_missed_as_product(tank):
    """The dip of the 13th is a day old and stands: (7,820 − 200) × 750 = 5,715 t, 135 t short."""
    night = tank.closes("2026-03-13")
    assert night.flagged == {"tk-10"}
    assert night.of("tk-10")["imbalance_kg"] == pytest.approx(-135 * T, abs=0.5)


def test_the_old_dip_is_not_carried_past_the_draw(tank):
    """7,820 m³ × 750 = 5,865 t ± √(86,603² + 750²) kg, and the answer says why."""
    assert drain(tank) == "created"
    inventory = tank.inventory(CLOSED)
    stock = inventory.of("tk-10")
    assert stock["free_water_volume_m3"] == 0.0
    assert stock["mass_kg"] == pytest.approx(5_865 * T, abs=0.5)
    assert stock["mass_uncertainty_kg"] == pytest.approx(math.hypot(BOUND, KG_PER_MM), abs=1.0)
    assert stock["status"] == "uncertain"
    assert "water_predates_receipt" in inventory.warnings("tk-10")
    water = inventory.input("tk-10", "free_water_level_m")
    assert (water["value"], water["quality"]) == (0.0, "assumed")


def test_the_draw_is_no_delivery_and_what_it_leaves_unknown_is_no_gain(tank):
    """Nothing delivered; 15 t over the book with 86.6 t unknown, a score of 0.17."""
    drain(tank)
    night = tank.closes("2026-03-13")
    book = night.of("tk-10")
    assert (book["received_kg"], book["delivered_kg"]) == (0.0, 0.0)
    assert book["imbalance_kg"] == pytest.approx(15 * T, abs=0.5)
    expected = math.sqrt(BOUND**2 + 2 * KG_PER_MM**2)
    assert book["imbalance_uncertainty_kg"] == pytest.approx(expected, abs=1.0)
    assert book["score"] == pytest.approx(15 * T / expected, abs=0.001)
    assert not night.flagged and night["complete"]
    assert night.total("gasoline")["delivered_kg"] == 0.0
    assert "drain-0313" not in [one["transfer"] for one in night["transfers"]]


def test_a_dip_that_is_entered_a_day_late_revises_the_night(tank):
    """0.020 m at 05:30: 7,800 m³, 5,850 t. What remains is a millimetre of level at either end."""
    drain(tank)
    assert tank.closes("2026-03-13")["id"] == "2026-03-13.1"
    tank.reads("tk-10", "2026-03-14 05:30", source="hand", free_water_level_m=0.02)
    night = tank.closes("2026-03-13")
    assert night["id"] == "2026-03-13.2" and not night.flagged
    book = night.of("tk-10")
    assert book["status"] == "measured"
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert book["imbalance_uncertainty_kg"] == pytest.approx(math.sqrt(2.0) * KG_PER_MM, abs=0.5)
    assert tank.inventory(CLOSED).of("tk-10")["free_water_volume_m3"] == pytest.approx(20.0, abs=1e-6)
    assert tank.book("2026-03-13.1").of("tk-10")["imbalance_kg"] == pytest.approx(15 * T, abs=0.5)
    told = {one["field"]: one for one in tank.changes("2026-03-13.2")}
    closing = told["closing_mass_kg"]
    assert (closing["vessel"], closing["before"], closing["after"]) == ("tk-10", 5_865 * T, 5_850 * T)
    assert [one["kind"] for one in closing["because"]] == ["late_reading"]
    assert "free_water_level_m 2026-03-14T05:30:00Z from hand" in closing["because"][0]["subject"]


def test_a_receipt_after_the_dip_is_said_and_changes_no_number(tank):
    """150 t of gasoline, 200 m³, arrive at noon: the water may have moved, but it is what was dipped.

    Level 8.200 m; (8,200 − 200) × 750 = 6,000 t. A warning, and the answer stays measured.
    """
    tank.receives("tk-10", "barge-0314", "2026-03-14 12:00", "2026-03-14 13:00", mass_kg=150 * T)
    tank.reads("tk-10", "2026-03-14 14:00", source="hand", level_m=8.2)
    inventory = tank.inventory("2026-03-14 14:00")
    assert inventory.of("tk-10")["mass_kg"] == pytest.approx(6_000 * T, abs=0.5)
    assert inventory.of("tk-10")["status"] == "measured"
    assert "water_predates_receipt" in inventory.warnings("tk-10")
    assert inventory.input("tk-10", "free_water_level_m")["value"] == 0.2


def test_a_dip_that_nobody_repeated_for_a_week_is_neither_water_nor_none(tank):
    """It was taken on the 13th at 06:00 and counts for seven days; 06:30 on the 20th is half an hour too late.

    Taken as none, the 0.200 m of water would be 200 × 750 kg = 150 t of gasoline that is not there.
    """
    tank.reads("tk-10", "2026-03-20 05:30", source="hand", level_m=8.0)
    tank.reads("tk-10", "2026-03-20 06:30", source="hand", level_m=8.0)
    assert tank.inventory("2026-03-20 05:30").of("tk-10")["mass_kg"] == pytest.approx(5_850 * T, abs=0.5)
    late = tank.inventory("2026-03-20 06:30").of("tk-10")
    assert (late["status"], late["mass_kg"]) == ("unmeasured", None)
    assert late["reason"]["code"] == "input_missing"
    assert "free_water_level_m" in late["reason"]["detail"] and "604800 s" in late["reason"]["detail"]
    tank.reads("tk-10", "2026-03-20 06:25", source="hand", free_water_level_m=0.2)
    assert tank.inventory("2026-03-20 06:30").of("tk-10")["mass_kg"] == pytest.approx(5_850 * T, abs=0.5)


def test_water_that_was_never_dipped_is_none_and_says_so(tank):
    """Tank 11 beside it, 4.000 m: 4,000 m³ × 750 = 3,000 t, with the water assumed."""
    tank.tank("tk-11", "gasoline", area_m2=1000.0, instruments=EXACT_WATER)
    tank.reads("tk-11", OPENED, source="hand", level_m=4.0)
    inventory = tank.inventory(OPENED)
    stock = inventory.of("tk-11")
    assert stock["mass_kg"] == pytest.approx(3_000 * T, abs=0.5)
    assert stock["free_water_volume_m3"] == 0.0
    water = inventory.input("tk-11", "free_water_level_m")
    assert (water["value"], water["quality"]) == (0.0, "assumed")
    assert stock["status"] == "measured"


def test_water_that_the_site_assumes_counts_with_its_uncertainty(tank):
    """The vessel assumes a film of 5 mm ± 5 mm: (4,000 − 5) × 750 kg; 5 mm are 3,750 kg."""
    film = {"free_water_level_m": {"value": 0.005, "standard_uncertainty": 0.005},
            "liquid_temperature_c": {"value": 15.0, "standard_uncertainty": 0.0}}  # fmt: skip
    tank.tank("tk-11", "gasoline", area_m2=1000.0, assumed=film)
    tank.reads("tk-11", OPENED, source="hand", level_m=4.0)
    inventory = tank.inventory(OPENED)
    assert inventory.of("tk-11")["mass_kg"] == pytest.approx(3_000 * T - 3_750.0, abs=0.5)
    assert inventory.of("tk-11")["mass_uncertainty_kg"] == pytest.approx(math.hypot(3_750.0, KG_PER_MM), abs=0.5)
    assert "input_assumed" in inventory.warnings("tk-11")
