"""Day 27. Three vessels that nobody dips.

An upright cold box of liquid nitrogen shows its head of liquid: a transmitter from a tap 0.20 m above the bottom to
the vapour space. A reactor stands on load cells. A bullet has a dial in percent of its capacity.

The head weighs: its level is ΔP/(g ρ) above the tap, so a density that is 1 % wrong moves the mass only below the
tap. The load cells' mass counts as it stands. The dial's percentage is a volume of the whole capacity, and what no
vessel can hold is answered as outside it.
"""

import math

import pytest

EVE, MORNING, NIGHT = "2026-03-13 06:00", "2026-03-14 06:00", "2026-03-13"
GRAVITY = 9.80665  # m/s², 3rd CGPM 1901
BOX = {"kind": "box", "length_m": 10.0, "width_m": 10.0, "height_m": 5.0}


def cold_box(site, density, spread, *, head_kpa=15.0, fresh_kpa=0.0):
    site.liquid("nitrogen-liquid", density, density_uncertainty_kg_m3=spread)
    site.tank(
        "cold-1", "nitrogen-liquid", shape=BOX, gauging={"tap_m": 0.2}, vapour_space={"kind": "open"},
        instruments={"differential_pressure_kpa": {"random": fresh_kpa, "systematic": 0.05},
                     "capacity_pct": {"systematic": 0.0, "local": 0.0}},
    )  # fmt: skip
    site.reads("cold-1", MORNING, differential_pressure_kpa=head_kpa)
    return site.inventory(MORNING).of("cold-1")


def test_a_head_of_liquid_weighs_what_stands_above_the_tap(site):
    """15.0 kPa over 100 m² carry 15,000 × 100 / 9.80665 = 152,957.4 kg; below the tap 0.2 × 100 × 800 = 16,000 kg."""
    stock = cold_box(site, 800.0, 8.0)
    assert stock["mass_kg"] == pytest.approx(152_957.4 + 16_000.0, abs=0.1)


def test_a_wrong_density_moves_only_what_stands_below_the_tap(new_site):
    """With 808 kg/m³ in place of 800 the mass is 160 kg more, not 1,690."""
    light, heavy = (cold_box(new_site(), density, 8.0)["mass_kg"] for density in (800.0, 808.0))
    assert heavy - light == pytest.approx(0.2 * 100.0 * 8.0, abs=0.01)


def test_its_uncertainty_is_the_transmitters_gravitys_and_a_little_density(site):
    """0.05 kPa: 509.9 kg. Gravity to 0.15 % of 152,957 kg: 229.4 kg. Density 8 kg/m³ over 20 m³: 160 kg."""
    stock = cold_box(site, 800.0, 8.0)
    transmitter = 50.0 * 100.0 / GRAVITY
    gravity = 0.0015 * 15_000.0 * 100.0 / GRAVITY
    assert stock["mass_uncertainty_kg"] == pytest.approx(math.hypot(transmitter, gravity, 160.0), rel=1e-4)


def test_a_reactor_on_load_cells_counts_as_it_stands(site):
    """12,480 kg by the cells at 05:50; a feed of 60 kg/min until six by its ticket brings 600 kg: 13,080 kg."""
    site.liquid("monomer", 900.0)
    site.tank(
        "reactor-1", "monomer", shape={"kind": "box", "length_m": 2.0, "width_m": 2.0, "height_m": 6.0},
        instruments={"weighed_mass_kg": {"random": 5.0, "systematic": 12.0}},
    )  # fmt: skip
    site.reads("reactor-1", "2026-03-14 05:50", weighed_mass_kg=12_480.0)
    stock = site.inventory("2026-03-14 05:50").of("reactor-1")
    assert (stock["mass_kg"], stock["status"]) == (12_480.0, "measured")
    assert stock["mass_uncertainty_kg"] == pytest.approx(13.0, rel=1e-9)  # 5, 12, 13
    site.receives(
        "reactor-1", "feed", "2026-03-14 05:40", "2026-03-14 06:40", by="ship", mass_kg=3_600.0, mass_uncertainty_kg=1.0
    )
    assert site.inventory(MORNING).of("reactor-1")["mass_kg"] == pytest.approx(13_080.0, abs=1e-6)


@pytest.mark.parametrize(("dial", "mass"), [(40.0, 160_000.0), (0.0, 0.0), (100.0, 400_000.0)])
def test_a_bullet_by_percent_of_its_capacity(site, dial, mass):
    """Of 500 m³ at 800 kg/m³."""
    site.liquid("oil", 800.0)
    site.tank("bullet-1", "oil", shape=BOX)
    site.reads("bullet-1", MORNING, liquid_volume_pct=dial)
    assert site.inventory(MORNING).of("bullet-1")["mass_kg"] == pytest.approx(mass, abs=1e-3)


def test_a_dial_is_good_to_two_percent_where_nobody_says_better(site):
    """±2 % of 500 m³ without a law is 2/√3 % of it: 4,618.8 kg, and 0.2 % at each reading: 800 kg."""
    site.liquid("oil", 800.0, density_uncertainty_kg_m3=0.0)
    site.tank("bullet-1", "oil", shape=BOX, instruments={"capacity_pct": {"systematic": 0.0, "local": 0.0}})
    site.reads("bullet-1", MORNING, liquid_volume_pct=40.0)
    stock = site.inventory(MORNING).of("bullet-1")
    assert stock["mass_uncertainty_kg"] == pytest.approx(math.hypot(400_000 * 0.02 / math.sqrt(3), 800.0), rel=1e-6)


def test_a_dial_past_the_end_is_kept_and_gives_no_mass(site):
    site.liquid("oil", 800.0)
    site.tank("bullet-1", "oil", shape=BOX)
    site.reads("bullet-1", MORNING, liquid_volume_pct=104.0)
    stock = site.inventory(MORNING).of("bullet-1")
    assert stock["status"] == "unmeasured" and stock["reason"]["code"] == "outside_vessel"


def test_a_corrected_head_revises_the_night(site):
    """14.8 kPa was written at six for 15.0: 0.2 kPa are 200 × 100 / 9.80665 = 2,039.4 kg, whatever the density.

    168,957.4 kg at the opening, 166,918.0 kg at the close. The offset and the density are the same at both ends;
    0.02 kPa fresh at either reading is 203.9 kg, √2 of it 288.4 kg: seven times that is missing, and flagged.
    """
    cold_box(site, 800.0, 8.0, head_kpa=14.8, fresh_kpa=0.02)
    site.reads("cold-1", EVE, differential_pressure_kpa=15.0)
    first = site.closes(NIGHT)
    assert first.flagged == {"cold-1"}
    assert first.of("cold-1")["opening_mass_kg"] == pytest.approx(168_957.4, abs=0.1)
    assert first.of("cold-1")["closing_mass_kg"] == pytest.approx(166_918.0, abs=0.1)
    site.reads("cold-1", MORNING, differential_pressure_kpa=15.0)
    second = site.closes(NIGHT)
    assert second["id"] == f"{NIGHT}.2" and not second.flagged
    assert second.of("cold-1")["imbalance_uncertainty_kg"] == pytest.approx(288.4, abs=0.1)
    assert site.book(f"{NIGHT}.1").of("cold-1")["imbalance_kg"] == pytest.approx(-2_039.4, abs=0.1)

    told = {one["field"]: one for one in site.changes(f"{NIGHT}.2")}
    assert set(told) == {"closing_mass_kg", "imbalance_kg", "flagged", "verdict"}
    assert {one["vessel"] for one in told.values()} == {"cold-1"}
    closing, imbalance = told["closing_mass_kg"], told["imbalance_kg"]
    assert (closing["before"], closing["after"]) == pytest.approx((166_918.0, 168_957.4), abs=0.1)
    assert (imbalance["before"], imbalance["after"]) == pytest.approx((-2_039.4, 0.0), abs=0.1)
    subject = "cold-1 differential_pressure_kpa 2026-03-14T06:00:00Z"
    assert site.because(f"{NIGHT}.2") == {("revised_reading", subject)}
    assert site.words(f"{NIGHT}.2")[0].startswith(
        "cold-1: closing mass 166,918 → 168,957 kg because the differential pressure of cold-1 of "
        "2026-03-14T06:00:00Z was revised on "
    )


def test_the_cells_own_value_at_the_close_comes_late(site):
    """12,480 kg at 05:50 and 600 kg of feed since: 13,080 kg at six. The cells themselves say 13,071 kg, a day late.

    The night opened with 9,000 kg and the feed, 68 minutes of 60 kg, brought 4,080: 13,080 in the book, and 9 kg
    short where the cells' 5 kg at either end are 7.1. Nothing is flagged before or after.
    """
    site.liquid("monomer", 900.0)
    site.tank(
        "reactor-1", "monomer", shape={"kind": "box", "length_m": 2.0, "width_m": 2.0, "height_m": 6.0},
        instruments={"weighed_mass_kg": {"random": 5.0, "systematic": 12.0}},
    )  # fmt: skip
    for at, mass in ((EVE, 9_000.0), ("2026-03-14 05:50", 12_480.0)):
        site.reads("reactor-1", at, weighed_mass_kg=mass)
    site.receives(
        "reactor-1", "feed", "2026-03-14 04:52", MORNING, by="ship", mass_kg=4_080.0, mass_uncertainty_kg=1.0
    )
    first = site.closes(NIGHT)
    assert first.of("reactor-1")["closing_mass_kg"] == pytest.approx(13_080.0, abs=0.001)
    site.reads("reactor-1", MORNING, weighed_mass_kg=13_071.0)
    second = site.closes(NIGHT)
    assert second["id"] == f"{NIGHT}.2"
    assert not first.flagged and not second.flagged
    assert site.book(f"{NIGHT}.1").of("reactor-1")["closing_mass_kg"] == pytest.approx(13_080.0, abs=0.001)
    told = {one["field"]: one for one in site.changes(f"{NIGHT}.2")}
    closing, imbalance = told["closing_mass_kg"], told["imbalance_kg"]
    assert closing["vessel"] == "reactor-1"
    assert (closing["before"], closing["after"]) == pytest.approx((13_080.0, 13_071.0), abs=0.001)
    assert (imbalance["before"], imbalance["after"]) == pytest.approx((0.0, -9.0), abs=0.001)
    assert site.because(f"{NIGHT}.2") == {("late_reading", "reactor-1 weighed_mass_kg 2026-03-14T06:00:00Z")}
    assert site.words(f"{NIGHT}.2")[0].startswith(
        "reactor-1: closing mass 13,080 → 13,071 kg because the weighed mass of reactor-1 of 2026-03-14T06:00:00Z "
        "came on "
    )
