"""Constants against figures that are printed elsewhere, none of which holds the constant itself."""

from __future__ import annotations

import pytest

from models import constants

POUND = 0.45359237  # kg, exact: international yard and pound agreement, 1959
INCH = 0.0254  # m, exact: the same


def test_boltzmann_and_avogadro_make_the_gas_constant() -> None:
    # CODATA 2018 (Tiesinga et al., Rev. Mod. Phys. 93 (2021) 025010): R in J/(mol K), N_A, and k in eV/K with e exact.
    assert constants.GAS_CONSTANT == pytest.approx(8.314462618, abs=5e-10)
    assert constants.BOLTZMANN / 1.602176634e-19 == pytest.approx(8.617333262e-5, abs=5e-15)
    # The same table, Faraday's constant: N_A e = 96485.33212 C/mol.
    assert constants.AVOGADRO * 1.602176634e-19 == pytest.approx(96485.33212, abs=5e-6)


def test_a_mole_of_ideal_gas_at_zero_celsius_and_one_atmosphere() -> None:
    # CODATA 2018: molar volume at 273.15 K and 101.325 kPa, 22.413 969 54e-3 m³/mol.
    volume = constants.GAS_CONSTANT * constants.ZERO_CELSIUS / constants.STANDARD_ATMOSPHERE
    assert volume == pytest.approx(22.41396954e-3, abs=1e-11)  # digits cut, not rounded


def test_temperatures_and_pressures_in_other_units() -> None:
    # NIST SP 811 (2008), B.8: 0 °F is 255.372 K by (t + 459.67)/1.8; 1 mmHg is 133.3224 Pa; 1 psi is 6894.757 Pa.
    assert constants.ZERO_CELSIUS - 32.0 / 1.8 == pytest.approx(255.372, abs=5e-4)
    assert constants.STANDARD_ATMOSPHERE / 760.0 == pytest.approx(133.3224, abs=5e-5)
    assert constants.STANDARD_GRAVITY * POUND / INCH**2 == pytest.approx(6894.757, abs=5e-4)


def test_the_standard_atmosphere() -> None:
    # ISO 2533:1975, table 1, and the U.S. Standard Atmosphere, 1976, table I: density at sea level 1.225 kg/m³;
    # 216.65 K and 226.320 hPa at 11 km; 84.852 km of geopotential altitude are 86.000 km of height (from memory).
    sea_level = constants.ATMOSPHERE_SEA_LEVEL_TEMPERATURE
    gas, lapse = constants.ATMOSPHERE_GAS_CONSTANT, constants.ATMOSPHERE_LAPSE_RATE
    assert constants.STANDARD_ATMOSPHERE / (gas * sea_level) == pytest.approx(1.2250, abs=5e-5)
    at_11_km = sea_level - lapse * 11_000.0
    assert at_11_km == pytest.approx(216.65, abs=5e-3)
    pressure = constants.STANDARD_ATMOSPHERE * (at_11_km / sea_level) ** (constants.STANDARD_GRAVITY / (gas * lapse))
    assert pressure == pytest.approx(22_632.0, abs=0.5)
    radius = constants.ATMOSPHERE_EARTH_RADIUS
    assert radius * 84_852.0 / (radius - 84_852.0) == pytest.approx(86_000.0, abs=0.5)


def test_weight_in_air_is_the_conventional_one() -> None:
    air, weights = constants.CONVENTIONAL_AIR_DENSITY, constants.CONVENTIONAL_WEIGHT_DENSITY
    # OIML D 28 (2004): 1.2 and 8000 kg/m³, so 1 − 1.2/8000 = 0.99985 and 1 − 1.2/850 = 0.998588235 by hand.
    factor = (1.0 - air / 850.0) / (1.0 - air / weights)
    assert factor == pytest.approx(0.998588235 / 0.99985, abs=1e-8)
    # API MPMS 11.5.3 (2009): density in air is 1.000149926 ρ − 1.199407795, which takes 1.1992 kg/m³ of air.
    assert factor == pytest.approx(1.000149926 - 1.199407795 / 850.0, abs=1e-6)


def test_water_at_60_fahrenheit() -> None:
    # API MPMS 11.5 (2009), from memory: a US gallon of 231 cubic inches at a relative density of 1 is 8.3372 lb.
    assert constants.WATER_DENSITY_60F * 231.0 * INCH**3 / POUND == pytest.approx(8.3372, abs=5e-5)
