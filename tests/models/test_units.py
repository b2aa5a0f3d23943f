"""Conversions and the standard atmosphere."""

import numpy as np
import pytest

from models import units

EARTH_RADIUS = 6_356_766.0  # m, ISO 2533:1975, nominal


# ISO 2533:1975, "Standard Atmosphere", by geopotential altitude (values from memory).
@pytest.mark.parametrize(
    ("geopotential", "hectopascal"),
    [(-500.0, 1074.78), (0.0, 1013.25), (500.0, 954.608), (1000.0, 898.746), (2000.0, 794.952), (5000.0, 540.199)],
)
def test_the_standard_atmosphere_by_geopotential_altitude(geopotential, hectopascal):
    elevation = EARTH_RADIUS * geopotential / (EARTH_RADIUS - geopotential)
    assert units.atmospheric_pressure(elevation) / 100.0 == pytest.approx(
        hectopascal, abs=6e-3 if geopotential < 0 else 6e-4
    )


# U.S. Standard Atmosphere, 1976, by geometric altitude (values from memory, rounded to the digits given).
@pytest.mark.parametrize(("elevation", "hectopascal"), [(1000.0, 898.76), (2000.0, 795.01), (5000.0, 540.48)])
def test_the_standard_atmosphere_by_elevation(elevation, hectopascal):
    assert units.atmospheric_pressure(elevation) / 100.0 == pytest.approx(hectopascal, abs=6e-3)


def test_temperatures_there_and_back():
    assert units.kelvin([0.0, 15.0, -40.0]) == pytest.approx([273.15, 288.15, 233.15], rel=1e-15)
    assert units.celsius(units.kelvin(np.array([-33.4, 0.0, 250.0]))) == pytest.approx([-33.4, 0.0, 250.0], abs=1e-13)


def test_pressures_there_and_back():
    assert units.pascal(101.325) == pytest.approx(101_325.0, rel=1e-15)
    assert units.kilopascal(101_325.0) == pytest.approx(101.325, rel=1e-15)
    assert units.pascal(-0.5) == -500.0


def test_exact_factors():
    assert units.CUBIC_METRE_PER_CUBIC_CENTIMETRE * 1e6 == 1.0
    assert units.KILOGRAM_PER_GRAM * 1000.0 == 1.0
    assert units.SECONDS_PER_DAY == 24 * 60 * 60
    # NIST Handbook 44, appendix C: a barrel of 42 gallons of 231 in³, tons of 2240 and 2000 lb, exactly.
    barrel, pound = 42 * 231 * 0.0254**3, 0.45359237
    assert pytest.approx(barrel, rel=1e-15) == units.CUBIC_METRE_PER_BARREL
    assert pytest.approx(2240 * pound, rel=1e-15) == units.KILOGRAM_PER_LONG_TON
    assert pytest.approx(2000 * pound, rel=1e-15) == units.KILOGRAM_PER_SHORT_TON


def test_degrees_api_are_densities_relative_to_water_of_60_f() -> None:
    # API MPMS 11.1-2004: 10 °API is water of 999.016 kg/m³; 141.5 / 166.5 and 141.5 / 126 by hand.
    assert units.density_of_api_gravity([10.0, 35.0, -5.5]) == pytest.approx(
        [999.016, 0.849849849849849849 * 999.016, 1.123015873015873016 * 999.016], rel=1e-15
    )


def test_the_api_gravity_of_a_density() -> None:
    # 141.5 · 999.016/ρ − 131.5 by hand: water, and twice its density.
    assert units.api_gravity_of_density([999.016, 1998.032]) == pytest.approx([10.0, -60.75], rel=1e-14)
    degrees = np.array([-5.5, 10.0, 35.0, 93.5])
    assert units.api_gravity_of_density(units.density_of_api_gravity(degrees)) == pytest.approx(degrees, rel=1e-13)
