"""Day 27. Three vessels that nobody dips.

An upright cold box of liquid nitrogen shows its head of liquid: a transmitter from a tap 0.20 m above the bottom to
the vapour space. A reactor stands on load cells. A bullet has a dial in percent of its capacity.

The head weighs: its level is ΔP/(g ρ) above the tap, so a density that is 1 % wrong moves the mass only below the
tap. The load cells' mass counts as it stands. The dial's percentage is a volume of the whole capacity, and what no
vessel can hold is answered as outside it.
"""

import math

import pytest

MORNING = "2026-03-14 06:00"
GRAVITY = 9.80665  # m/s², 3rd CGPM 1901
BOX = {"kind": "box", "length_m": 10.0, "width_m": 10.0, "height_m": 5.0}


def cold_box(site, density, spread):
    site.liquid("nitrogen-liquid", density, density_uncertainty_kg_m3=spread)
    site.tank(
        "cold-1", "nitrogen-liquid", shape=BOX, gauging={"tap_m": 0.2}, vapour_space={"kind": "open"},
        instruments={"differential_pressure_kpa": {"random": 0.0, "systematic": 0.05},
                     "capacity_pct": {"systematic": 0.0, "local": 0.0}},
    )  # fmt: skip
    site.reads("cold-1", MORNING, differential_pressure_kpa=15.0)
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
