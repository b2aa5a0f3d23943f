"""Default uncertainties: every figure worked out again from what its source prints."""

from __future__ import annotations

import math

import pytest

from models import instruments
from models.instruments import CAPACITY_PCT, DEFAULTS

SQUARE_ROOT_OF_3 = 1.7320508
"""JCGM 100:2008, 4.3.7: limits ±a without a law are a standard uncertainty of a/√3."""

R_TO_SIGMA = 2.77
"""ISO 5725-6:1994, 4.1.4: 1.96 √2 standard deviations lie between 95 % of pairs of results."""

PRINTED = [
    # API MPMS ch. 3.1B-2001, 4.3.2 (±3 mm from the factory, inventory) and 4.3.3 (±3 mm installed)
    ("level_m", 0.001, 0.00424264 / SQUARE_ROOT_OF_3),
    ("liquid_volume_pct", 0.2, 2.0 / SQUARE_ROOT_OF_3),  # the dial of a float gauge, ±2 % of it, common practice
    ("differential_pressure_kpa", 0.02, 0.001 * 100.0 / SQUARE_ROOT_OF_3),  # 0.1 % of a span of 100 kPa, from memory
    ("free_water_level_m", 0.005 / SQUARE_ROOT_OF_3, 0.0),  # water-finding paste, ±3 to 6 mm, from memory
    ("liquid_temperature_c", 0.1, 0.5 / SQUARE_ROOT_OF_3),  # Directive 2014/32/EU, annex VII: ±0.5 °C
    ("ambient_temperature_c", 0.0, 2.0),  # common practice
    ("vapour_temperature_c", 0.2, 1.0),  # common practice
    ("pressure_kpa", 0.2, 0.001 * 1600.0 / SQUARE_ROOT_OF_3),  # 0.1 % of a span of 1 600 kPa, from memory
    # ISO 3675 and ASTM D1298, transparent products: r = 0.5, R = 1.2 kg/m³, from memory
    ("observed_density_kg_m3", 0.5 / R_TO_SIGMA, 1.0908712 / R_TO_SIGMA),
    ("observed_density_temperature_c", 0.0, 0.25 / SQUARE_ROOT_OF_3),  # common practice
    # ASTM D4006: r = 0.08, R = 0.11 %, from memory
    ("sediment_water_pct", 0.08 / R_TO_SIGMA, 0.0754983 / R_TO_SIGMA),
    ("vapour_composition", 0.0, 0.5),  # common practice
]


@pytest.mark.parametrize(("quantity", "random", "systematic"), PRINTED)
def test_a_default_is_its_sources_figure(quantity: str, random: float, systematic: float) -> None:
    default = DEFAULTS[quantity]
    assert default.random == pytest.approx(random, rel=1e-6)
    assert default.systematic == pytest.approx(systematic, rel=1e-6)
    assert default.source


def test_every_default_is_worked_out_here() -> None:
    assert set(DEFAULTS) == {quantity for quantity, _, _ in PRINTED}


def test_random_and_systematic_make_the_reproducibility() -> None:
    density, water = DEFAULTS["observed_density_kg_m3"], DEFAULTS["sediment_water_pct"]
    assert 2.77 * math.hypot(density.random, density.systematic) == pytest.approx(1.2, rel=1e-12)
    assert 2.77 * math.hypot(water.random, water.systematic) == pytest.approx(0.11, rel=1e-12)


@pytest.mark.parametrize(
    ("kind", "limit"),  # OIML R 71 (2008): ±0.2 % upright, 0.3 % lying, 0.5 % others (the last two from memory)
    [("vertical_cylinder", 0.2), ("horizontal_cylinder", 0.3), ("sphere", 0.5), ("box", 0.5), ("fixed_volume", 0.5),
     ("capacity_table", 0.5)],
)  # fmt: skip
def test_a_capacity_is_as_good_as_legal_metrology_allows(kind: str, limit: float) -> None:
    assert CAPACITY_PCT[kind] == pytest.approx(limit / SQUARE_ROOT_OF_3, rel=1e-6)


@pytest.mark.parametrize(
    ("found", "expected"),
    [
        (instruments.CAPACITY_LOCAL_PCT, 0.02),  # common practice
        (instruments.LOCAL_SPAN, 1.0),  # a setting: metres between the knots
        (instruments.BAROMETER_KPA, 1.0),  # common practice: weather about the mean of the place
        (instruments.DENSITY_SHARE, 8.4 / 840.0),  # 1 % of a density that no sample confirmed
        (instruments.METHOD_DENSITY_SHARE["water"] * 1e6, 100.0),  # common practice: 0.1 g/l of impurities, 1e-4
        (instruments.METHOD_DENSITY_SHARE["density_table"] * 840.0, 8.4),  # as of any density that none confirmed
        (instruments.EXPANSION_SHARE, 1.66e-5 / 8.3e-4),  # 2 % of β
        (instruments.SATURATED_VAPOUR_TEMPERATURE, 3.0),  # a vapour whose temperature nothing reads
        (instruments.AMBIENT_UNREAD, 10.0),  # an ambient temperature taken as the liquid's
        (instruments.OPEN_SPACE_KPA, 0.2),  # common practice: pressure and vacuum valves
        (instruments.STALE_TEMPERATURE * 24 * 3600.0, 1.2),  # 0.05 K an hour is 1.2 K a day
        (instruments.STALE_PRESSURE_KPA * 24 * 3600.0, 48.0),  # 2 kPa an hour is 48 kPa a day
        (instruments.BLEND_DENSITY, 3.0),  # kg/m³ of a receipt that no sample confirms; a setting
        (instruments.WEIGHED_SHARE * 50_000.0, 50.0),  # common practice: 0.1 % by load cells, 50 kg of 50 t
        (instruments.METER_RANDOM_PCT, 0.05),  # common practice
        (instruments.METER_SYSTEMATIC_PCT, 0.3 / SQUARE_ROOT_OF_3),  # Directive 2014/32/EU, annex VII, class 0.5
    ],
)
def test_a_setting_is_what_its_source_says(found: float, expected: float) -> None:
    assert found == pytest.approx(expected, rel=1e-6)
