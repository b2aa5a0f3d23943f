"""A floating roof afloat, landing and landed; two tables; rain.

What happened: tank 3 (upright, 1,000 m³ to the metre, a liquid of 750 kg/m³) has a roof of 148 t. It stands on
its legs below 1.80 m and is fully afloat from 2.10 m. Afloat it displaces its own mass of liquid, so the
liquid's mass is `750 × V(h) − 148,000`, with V(h) the volume of the tank up to the liquid outside the roof.

    5.000 m, afloat     750 × 5,000 − 148,000 = 3,602,000 kg
    1.950 m, half way   750 × 1,950 −  74,000 = 1,388,500 kg, uncertain
    1.500 m, landed     750 × 1,500           = 1,125,000 kg

Two tables are in use on such tanks. One gives V(h) as it is. The other has the roof deducted at a density that
stands on its title page, here 740 kg/m³: 148,000 / 740 = 200 m³ less wherever the roof floats. At 5.000 m it
says 4,800 m³. Both must give the same mass: the second deducts what 740 kg/m³ would have displaced, the liquid
has 750, and the difference is made good.
"""

from __future__ import annotations

import math

import pytest

ROOF = {"mass_kg": 148_000, "lands_at_m": 1.8, "floats_at_m": 2.1}
AS_IT_IS = {"kind": "capacity_table", "of": "vertical_cylinder", "rows": [[0.0, 0.0], [10.0, 10_000.0]]}
ROOF_DEDUCTED = {
    "kind": "capacity_table", "of": "vertical_cylinder", "roof_deducted_at_kg_m3": 740.0,
    "rows": [[0.0, 0.0], [1.8, 1_800.0], [2.1, 1_900.0], [10.0, 9_800.0]],
}  # fmt: skip
MASSES = [(5.0, 3_602_000.0), (2.1, 1_427_000.0), (1.8, 1_350_000.0), (1.5, 1_125_000.0)]
EVENING = "2026-03-14 18:00"


@pytest.fixture(params=[AS_IT_IS, ROOF_DEDUCTED], ids=["as-it-is", "roof-deducted"])
def tank(request, site):
    """The tank by either table."""
    site.liquid("naphtha", 750.0)
    site.tank("tk-3", "naphtha", shape=request.param, floating_roof=ROOF)
    return site


@pytest.mark.parametrize(("level", "mass"), MASSES)
def test_afloat_and_landed_both_tables_give_the_same_mass(tank, level, mass):
    tank.reads("tk-3", EVENING, level_m=level)
    inventory = tank.inventory(EVENING)
    assert inventory.of("tk-3")["status"] == "measured"
    assert inventory.of("tk-3")["mass_kg"] == pytest.approx(mass, abs=0.5)
    assert "roof_landing_zone" not in inventory.warnings("tk-3")


def test_the_volume_of_the_liquid_has_the_roof_deducted(tank):
    """5,000 m³ less 148,000 / 750 = 197.333 m³, whatever the table deducts."""
    tank.reads("tk-3", EVENING, level_m=5.0)
    volume = tank.inventory(EVENING).of("tk-3")["gross_observed_volume_m3"]
    assert volume == pytest.approx(4_802.6667, abs=0.001)


def test_landing_is_uncertain_and_carries_the_whole_roof_in_its_error(tank):
    """Nobody knows how much the legs carry: 148 t somewhere between none and all, 148,000 / √12 = 42,724 kg.

    The gauge's 1 mm, at most 750 kg, hardly adds: √(42,724² + 750²) = 42,731 kg.
    """
    tank.reads("tk-3", EVENING, level_m=1.95)
    inventory = tank.inventory(EVENING)
    stock = inventory.of("tk-3")
    assert stock["status"] == "uncertain" and "roof_landing_zone" in inventory.warnings("tk-3")
    assert stock["mass_kg"] == pytest.approx(1_388_500.0, abs=0.5)
    assert 148_000 / math.sqrt(12) - 1 <= stock["mass_uncertainty_kg"] <= 42_732.0


def test_the_night_in_which_it_lands_loses_nothing(tank):
    """From 5.000 m to 1.500 m; by the weighbridge 2,477,000 kg left.

    3.5 m × 750 t are 2,625 t: who forgets the roof misses 148 t, all of it.
    """
    tank.reads("tk-3", "2026-03-13 06:00", level_m=5.0)
    tank.reads("tk-3", "2026-03-14 06:00", level_m=1.5)
    tank.delivers("tk-3", "pipe-0313", "2026-03-13 09:00", "2026-03-13 23:00", mass_kg=2_477_000.0)
    night = tank.closes("2026-03-13")
    assert night.of("tk-3")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert night.of("tk-3")["imbalance_uncertainty_kg"] == pytest.approx(math.sqrt(2) * 750.0, abs=1.0)
    assert not night.flagged


def test_rain_on_the_roof_displaces_its_own_mass(tank):
    """10 t of water stand on the roof: 3,602,000 − 10,000 kg of liquid at the same level.

    The table's deduction knows the roof, not the rain. On its legs the roof carries the rain alone.
    """
    tank.reads("tk-3", EVENING, level_m=5.0, roof_load_kg=10_000.0)
    assert tank.inventory(EVENING).of("tk-3")["mass_kg"] == pytest.approx(3_592_000.0, abs=0.5)
    assert tank.inventory(EVENING).of("tk-3")["gross_observed_volume_m3"] == pytest.approx(
        5_000.0 - 158_000.0 / 750.0, abs=0.001
    )
    later = "2026-03-14 20:00"
    tank.reads("tk-3", later, level_m=1.5, roof_load_kg=10_000.0)
    assert tank.inventory(later).of("tk-3")["mass_kg"] == pytest.approx(1_125_000.0, abs=0.5)


def test_a_gauge_that_sees_the_roof_says_nothing_below_its_floating(tank):
    """On its legs the roof stays where it is; the liquid under it may be anywhere."""
    tank.tank("tk-3r", "naphtha", shape=AS_IT_IS, floating_roof={**ROOF, "gauge_sees": "roof"})
    tank.reads("tk-3r", EVENING, level_m=2.5)
    assert tank.inventory(EVENING).of("tk-3r")["mass_kg"] == pytest.approx(750.0 * 2_500 - 148_000, abs=0.5)
    tank.reads("tk-3r", "2026-03-14 20:00", level_m=2.05)
    stock = tank.inventory("2026-03-14 20:00").of("tk-3r")
    assert stock["status"] == "unmeasured" and stock["mass_kg"] is None and stock["reason"]["detail"]


def test_there_is_no_vapour_mass_above_a_roof(site):
    """The same substance, with its vapour known, in a tank with a roof: liquid only, at any level."""
    site.substance(
        "pentane",
        liquid={"model": "expansivity", "density_kg_m3": 630.0, "expansivity_per_k": 0.0},
        vapour={"model": "virial", "components": [{"id": "n-pentane", "mole_fraction": 1.0}]},
    )
    site.tank("tk-3", "pentane", shape=AS_IT_IS, floating_roof=ROOF)
    for at, level in ((EVENING, 5.0), ("2026-03-14 20:00", 1.5)):
        site.reads("tk-3", at, level_m=level)
        stock = site.inventory(at).of("tk-3")
        afloat = level > 2.1
        assert stock["mass_kg"] == pytest.approx(630.0 * 1000 * level - (148_000 if afloat else 0), abs=0.5)
        assert stock["mass_kg"] == stock["liquid_mass_kg"]
        assert not stock["vapour_mass_kg"]


def test_rain_that_is_reported_late_revises_the_night(tank):
    """Ten tonnes fell on the roof. Until somebody says so the tank seems to have gained them.

    Nothing came or went, but the roof sinks deeper and the liquid outside it rises by what the rain displaces,
    10,000 / 750 = 13.333 m³: 13.3 mm, a false gain of 10,000 kg. The close is 750 × 5,013.333 − 148,000 =
    3,612,000 kg before, and with the rain taken off 3,602,000 kg, what it opened with.
    """
    tank.reads("tk-3", "2026-03-13 06:00", level_m=5.0)
    tank.reads("tk-3", "2026-03-14 06:00", level_m=5.0 + 10.0 / 750.0)
    first = tank.closes("2026-03-13")
    assert first.of("tk-3")["imbalance_kg"] == pytest.approx(10_000.0, abs=0.5)
    assert first.flagged == {"tk-3"}
    tank.reads("tk-3", "2026-03-14 06:00", source="operator", roof_load_kg=10_000.0)
    second = tank.closes("2026-03-13")
    assert second["id"] == "2026-03-13.2" and not second.flagged
    assert second.of("tk-3")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert second.of("tk-3")["closing_mass_kg"] == pytest.approx(3_602_000.0, abs=0.5)
    assert tank.book("2026-03-13.1").of("tk-3")["closing_mass_kg"] == pytest.approx(3_612_000.0, abs=0.5)
    assert tank.book("2026-03-13.1").flagged == {"tk-3"}

    told = {one["field"]: (one["before"], one["after"]) for one in tank.changes("2026-03-13.2")}
    assert set(told) == {"closing_mass_kg", "imbalance_kg", "flagged", "verdict"}
    assert {one["vessel"] for one in tank.changes("2026-03-13.2")} == {"tk-3"}
    assert told["closing_mass_kg"] == pytest.approx((3_612_000.0, 3_602_000.0), abs=0.5)
    assert told["imbalance_kg"] == pytest.approx((10_000.0, 0.0), abs=0.5)
    assert (told["flagged"], told["verdict"]) == ((True, False), ("fail", "pass"))
    rain = "tk-3 roof_load_kg 2026-03-14T06:00:00Z from operator"
    assert tank.because("2026-03-13.2") == {("late_reading", rain)}
    assert tank.words("2026-03-13.2")[0].startswith(
        "tk-3: closing mass 3,612,000 → 3,602,000 kg because the roof load of tk-3 of 2026-03-14T06:00:00Z "
        "from operator came on "
    )


def test_a_roof_that_was_lighter_on_paper_is_corrected_and_changes_the_opening_only(site):
    """The drawing says 148 t; weighed with its new seals the roof has 158 t, and had them all month.

    It lands in that night: afloat at 5.000 m the tank opened with 750 × 5,000 − 148,000 = 3,602,000 kg on paper,
    with 3,592,000 kg in truth. Landed at 1.500 m it closed with 1,125,000 kg either way. The weighbridge has
    2,467,000 kg: by the drawing 10,000 kg are missing, nine times the √2 × 750 kg of the gauge; in truth nothing.
    """
    site.liquid("naphtha", 750.0)
    since = "2026-03-01 06:00"
    site.tank("tk-3", "naphtha", shape=AS_IT_IS, floating_roof=ROOF, effective_from=since)
    site.reads("tk-3", "2026-03-13 06:00", level_m=5.0)
    site.reads("tk-3", "2026-03-14 06:00", level_m=1.5)
    site.delivers("tk-3", "pipe-0313", "2026-03-13 09:00", "2026-03-13 23:00", mass_kg=2_467_000.0)
    assert site.closes("2026-03-13").flagged == {"tk-3"}
    weighed = {**ROOF, "mass_kg": 158_000}
    assert site.tank("tk-3", "naphtha", shape=AS_IT_IS, floating_roof=weighed, effective_from=since) == "revised"
    second = site.closes("2026-03-13")
    assert second["id"] == "2026-03-13.2" and not second.flagged
    assert second.of("tk-3")["opening_mass_kg"] == pytest.approx(3_592_000.0, abs=0.5)
    former = site.book("2026-03-13.1").of("tk-3")
    assert former["opening_mass_kg"] == pytest.approx(3_602_000.0, abs=0.5) and former["flagged"]
    assert former["closing_mass_kg"] == second.of("tk-3")["closing_mass_kg"] == pytest.approx(1_125_000.0, abs=0.5)

    told = {one["field"]: (one["before"], one["after"]) for one in site.changes("2026-03-13.2")}
    assert set(told) == {"opening_mass_kg", "imbalance_kg", "flagged", "verdict"}
    assert told["opening_mass_kg"] == pytest.approx((3_602_000.0, 3_592_000.0), abs=0.5)
    assert told["imbalance_kg"] == pytest.approx((-10_000.0, 0.0), abs=0.5)
    assert site.because("2026-03-13.2") == {("definition", "vessel tk-3")}
    assert site.words("2026-03-13.2")[0].startswith(
        "tk-3: opening mass 3,602,000 → 3,592,000 kg because the definition of vessel tk-3 was changed on "
    )
