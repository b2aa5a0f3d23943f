"""A site at 2,250 m: with a barometer, with its elevation only, with neither.

What happened: on a high plateau stands a nitrogen receiver of 50 m³, 15 °C, whose gauge shows 300 kPa over the
atmosphere; the barometer in the control room shows 76.2 kPa. A gauge measures against the air around it, and a gas
against nothing: what the receiver holds follows from 300 kPa plus whatever the air's pressure is.

The air's pressure at 2,250 m by ISO 2533:1975: the geopotential altitude is 6,356,766 × 2,250 / (6,356,766 + 2,250)
= 2,249.2 m, the temperature 288.15 − 0.0065 × 2,249.2 = 273.530 K, and

    p = 101.325 × (273.530 / 288.15) ^ (9.80665 / (287.05287 × 0.0065)) = 101.325 × 0.949263 ^ 5.25588 = 77.07 kPa.

The nitrogen is taken as an ideal gas here (B = 0), so that the arithmetic stays visible: for each kPa
50 m³ × 28.0134 g/mol / (8.314463 J/(mol K) × 288.15 K) = 0.584633 kg.

- with the barometer: 376.2 kPa, 219.94 kg;
- with the elevation only: 377.07 kPa, 220.44 kg: right within the weather, ± 1 kPa or 0.58 kg;
- with neither: 401.325 kPa, 234.63 kg, 6.7 % too much, and `atmosphere_assumed` says so.

Then a front passes. The receiver is shut; the air falls from 76.8 to 74.8 kPa overnight, and the gauge, which
measures against it, rises from 300.0 to 302.0 kPa. Nothing came and nothing went. With the barometer's two values
the books say so. Without them the night gains 1.17 kg, and the books know that they cannot tell: ± 1 kPa at either
end is ± 0.83 kg.
"""

from __future__ import annotations

import math

import pytest

R, MOLAR_MASS, VOLUME = 8.314462618, 0.0280134, 50.0
KG_PER_KPA = VOLUME * MOLAR_MASS / (R * 288.15) * 1e3
EXACT = {"random": 0.0, "systematic": 0.0}
STIFF = {"expansion_per_k": 0.0}
AT, NEXT, NIGHT = "2026-03-13 06:00", "2026-03-14 06:00", "2026-03-13"
BAROMETER, ELEVATION_KPA = 76.2, 77.066


def iso_2533(metres):
    """The mean pressure at a height, by the standard's own formula. [kPa]"""
    geopotential = 6_356_766.0 * metres / (6_356_766.0 + metres)
    return 101.325 * ((288.15 - 0.0065 * geopotential) / 288.15) ** (9.80665 / (287.05287 * 0.0065))


def receiver(site, name="v-19", **body):
    """A stiff receiver of ideal nitrogen; nothing in it is uncertain but the air outside."""
    site.substance("nitrogen", vapour={
        "model": "virial", "components": [{"id": "nitrogen", "mole_fraction": 1.0}], "terms": 2,
        "coefficients": "measured", "second_virial_cm3_mol": 0.0})  # fmt: skip
    errors = {"pressure_kpa": EXACT, "vapour_temperature_c": EXACT,
              "capacity_pct": {"systematic": 0.0}}  # fmt: skip
    site.vessel(name, "nitrogen", shape={"kind": "fixed_volume", "volume_m3": VOLUME}, shell=STIFF,
                instruments=errors, **body)  # fmt: skip


def reads(site, at, gauge, name="v-19"):
    site.reads(name, at, pressure_kpa=gauge, vapour_temperature_c=15.0)


def barometer(site, at, kpa):
    site.reads(None, at, barometric_pressure_kpa_abs=kpa)


def test_the_formula_gives_the_tables_77_kpa():
    assert iso_2533(2_250.0) == pytest.approx(ELEVATION_KPA, abs=0.001)
    assert pytest.approx(0.584633, abs=1e-6) == KG_PER_KPA


def stock_of(site):
    receiver(site)
    reads(site, AT, 300.0)
    return site.inventory(AT)


def test_with_a_barometer(new_site):
    """376.2 kPa × 0.584633 = 219.94 kg; the barometer counts, whatever the elevation says."""
    site = new_site(elevation_m=2_250.0, barometer_uncertainty_kpa=0.1)
    barometer(site, AT, BAROMETER)
    inventory = stock_of(site)
    assert inventory.of("v-19")["mass_kg"] == pytest.approx(219.939, abs=0.005)
    assert inventory.input("v-19", "barometric_pressure_kpa_abs")["value"] == BAROMETER
    assert "atmosphere_assumed" not in inventory.warnings("v-19")


def test_with_its_elevation_only(new_site):
    """377.066 kPa × 0.584633 = 220.445 kg, and the weather is ± 1 kPa: ± 0.585 kg."""
    inventory = stock_of(new_site(elevation_m=2_250.0))
    assert inventory.of("v-19")["mass_kg"] == pytest.approx(220.445, abs=0.005)
    assert inventory.of("v-19")["mass_uncertainty_kg"] >= 0.584
    assert "atmosphere_assumed" not in inventory.warnings("v-19")


def test_with_neither(new_site):
    """401.325 kPa × 0.584633 = 234.628 kg, 6.7 % more than there is, and a warning."""
    inventory = stock_of(new_site(elevation_m=None))
    assert inventory.of("v-19")["mass_kg"] == pytest.approx(234.628, abs=0.005)
    assert "atmosphere_assumed" in inventory.warnings("v-19")


def test_a_transmitter_that_measures_absolute_pressure_needs_none_of_it(new_site):
    """376.2 kPa absolute: 219.94 kg anywhere."""
    site = new_site(elevation_m=None)
    receiver(site)
    site.reads("v-19", AT, pressure_kpa_abs=376.2, vapour_temperature_c=15.0)
    assert site.inventory(AT).of("v-19")["mass_kg"] == pytest.approx(219.939, abs=0.005)


def test_an_open_tank_asks_for_no_air(new_site):
    """100 m² × 5 m × 800 = 400,000 kg by its level at any height, without a warning."""
    site = new_site(elevation_m=None)
    site.liquid("gas-oil", 800.0)
    site.tank("tk-19", "gas-oil")
    site.reads("tk-19", AT, level_m=5.0)
    inventory = site.inventory(AT)
    assert inventory.of("tk-19")["mass_kg"] == pytest.approx(400_000.0, abs=0.5)
    assert "atmosphere_assumed" not in inventory.warnings("tk-19")


def test_the_weather_is_the_same_for_all_vessels_of_the_site(new_site):
    """Two receivers: what the weather does to one it does to the other. 2 × 0.585 kg together, not √2 ×."""
    site = new_site(elevation_m=2_250.0)
    for name in ("v-19", "v-20"):
        receiver(site, name)
        reads(site, AT, 300.0, name)
    inventory = site.inventory(AT)
    lines = site.working("v-19", AT)["budget"]
    weather = [line for line in lines if line["input"] == "barometric_pressure_kpa_abs"]
    assert [line["contribution_kg"] for line in weather] == pytest.approx([KG_PER_KPA], abs=1e-3)
    single = inventory.of("v-19")["mass_uncertainty_kg"]
    assert inventory.total("nitrogen")["mass_uncertainty_kg"] == pytest.approx(2.0 * single, rel=1e-6)


BULLET = {"kind": "capacity_table", "of": "horizontal_cylinder", "diameter_m": 2.0, "total_volume_m3": 60.0,
          "rows": [[0.0, 0.0], [1.0, 30.0], [2.0, 60.0]]}  # fmt: skip


def bullet(site, gauge):
    """Propane at 25 °C: saturated at 952.1 kPa absolute (reference equation of state, Lemmon et al., 2009)."""
    site.substance("propane", liquid={"model": "expansivity", "density_kg_m3": 500.0, "expansivity_per_k": 0.0,
                                      "density_uncertainty_kg_m3": 0.0, "at_pressure_kpa_abs": 1000.0},
                   vapour={"model": "virial", "components": [{"id": "propane", "mole_fraction": 1.0}]})  # fmt: skip
    site.tank("v-21", "propane", shape=BULLET, assumed={},
              instruments={"pressure_kpa": EXACT, "liquid_temperature_c": EXACT})  # fmt: skip
    site.reads("v-21", AT, level_m=1.0, liquid_temperature_c=25.0, pressure_kpa=gauge)
    return site.inventory(AT).warnings("v-21")


@pytest.mark.parametrize(("off", "said"), [(0.0, set()), (1.5, set()), (-1.5, set()), (4.0, {"saturation_high"})])
def test_the_saturation_check_knows_how_well_the_air_is_known(new_site, off, said):
    """Gauge 952.1 − 77.07 = 875.03 kPa. 1.5 kPa beside it lie within 2 × 1 kPa of weather, 4 kPa do not."""
    warnings = bullet(new_site(elevation_m=2_250.0), 952.1 - ELEVATION_KPA + off)
    assert {one for one in warnings if one.startswith("saturation")} == said


def test_at_the_wrong_height_every_bullet_seems_to_hold_gas_that_does_not_condense(new_site):
    """875.03 + 101.325 = 976.4 kPa, 24 kPa above saturation: `saturation_high`, beside `atmosphere_assumed`."""
    assert {"saturation_high", "atmosphere_assumed"} <= bullet(new_site(elevation_m=None), 952.1 - ELEVATION_KPA)


FRONT = [(AT, 300.0, 76.8), (NEXT, 302.0, 74.8)]
GAIN = 2.0 * KG_PER_KPA


def a_front_passes(site):
    receiver(site)
    for at, gauge, _ in FRONT:
        reads(site, at, gauge)


def test_a_front_moves_the_gauge_and_not_the_gas(new_site):
    """300.0 + 76.8 = 302.0 + 74.8 = 376.8 kPa: 220.29 kg, both mornings."""
    site = new_site(elevation_m=2_250.0, barometer_uncertainty_kpa=0.1)
    a_front_passes(site)
    for at, _, kpa in FRONT:
        barometer(site, at, kpa)
    book = site.closes(NIGHT).of("v-19")
    assert book["opening_mass_kg"] == pytest.approx(220.290, abs=0.005)
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.001)


def test_without_a_barometer_the_front_is_a_gain_that_the_books_do_not_believe(new_site):
    """1.17 kg more against √2 × 0.585 = 0.827 kg of weather: 1.4 times, not flagged."""
    site = new_site(elevation_m=2_250.0)
    a_front_passes(site)
    night = site.closes(NIGHT)
    book = night.of("v-19")
    assert book["imbalance_kg"] == pytest.approx(GAIN, abs=0.005) == pytest.approx(1.169, abs=0.005)
    assert book["imbalance_uncertainty_kg"] == pytest.approx(math.sqrt(2.0) * KG_PER_KPA, rel=0.01)
    assert not night.flagged


def test_the_barometers_log_sheet_is_typed_in_later(new_site):
    """Both values come after the close: the night is closed again, and nothing came or went."""
    site = new_site(elevation_m=2_250.0, barometer_uncertainty_kpa=0.1)
    a_front_passes(site)
    assert site.closes(NIGHT)["revision"] == 1
    for at, _, kpa in FRONT:
        barometer(site, at, kpa)
    night = site.closes(NIGHT)
    assert night["id"] == f"{NIGHT}.2"
    assert night.of("v-19")["imbalance_kg"] == pytest.approx(0.0, abs=0.001)
    assert site.book(f"{NIGHT}.1").of("v-19")["imbalance_kg"] == pytest.approx(GAIN, abs=0.005)
    told = {one["field"]: one for one in site.changes(f"{NIGHT}.2")}
    # From 377.07 + 2.0 to 74.8 + 302.0 = 376.8 kPa, and before it from 377.07 to 376.8 kPa.
    assert told["closing_mass_kg"]["before"] == pytest.approx((ELEVATION_KPA + 302.0) * KG_PER_KPA, abs=0.005)
    assert told["closing_mass_kg"]["after"] == pytest.approx(376.8 * KG_PER_KPA, abs=0.005)
    for field in ("opening_mass_kg", "closing_mass_kg"):
        assert {one["kind"] for one in told[field]["because"]} == {"late_reading"}
