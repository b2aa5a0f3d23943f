"""Constants against figures that are printed elsewhere, none of which holds the constant itself."""

from __future__ import annotations

import pytest

from models import constants
from models.constants import (
    ATMOSPHERE_EARTH_RADIUS,
    ATMOSPHERE_GAS_CONSTANT,
    ATMOSPHERE_LAPSE_RATE,
    ATMOSPHERE_SEA_LEVEL_TEMPERATURE,
    GAS_CONSTANT,
    STANDARD_ATMOSPHERE,
    STANDARD_GRAVITY,
    ZERO_CELSIUS,
)

POUND = 0.45359237  # kg, exact: international yard and pound agreement, 1959
INCH = 0.0254  # m, exact: the same
ELEMENTARY_CHARGE = 1.602176634e-19  # C, exact: SI Brochure, 9th ed., 2019

AT_11_KM = ATMOSPHERE_SEA_LEVEL_TEMPERATURE - ATMOSPHERE_LAPSE_RATE * 11_000.0
RATIO_AT_11_KM = AT_11_KM / ATMOSPHERE_SEA_LEVEL_TEMPERATURE
EXPONENT = STANDARD_GRAVITY / (ATMOSPHERE_GAS_CONSTANT * ATMOSPHERE_LAPSE_RATE)


@pytest.mark.parametrize(
    ("found", "printed", "half_a_digit"),
    [
        # CODATA 2018 (E. Tiesinga et al., Rev. Mod. Phys. 93, 2021, 025010): the gas constant, Boltzmann's in eV/K,
        # Faraday's as N_A e, and a mole of ideal gas at 273.15 K and 101.325 kPa (its digits are cut, not rounded).
        pytest.param(GAS_CONSTANT, 8.314462618, 5e-10, id="R"),
        pytest.param(constants.BOLTZMANN / ELEMENTARY_CHARGE, 8.617333262e-5, 5e-15, id="k in eV/K"),
        pytest.param(constants.AVOGADRO * ELEMENTARY_CHARGE, 96485.33212, 5e-6, id="F"),
        pytest.param(GAS_CONSTANT * ZERO_CELSIUS / STANDARD_ATMOSPHERE, 22.41396954e-3, 1e-11, id="molar volume"),
        # NIST SP 811 (2008), appendix B: 0 °F in K, mmHg in Pa, pound-force per square inch in Pa.
        pytest.param(ZERO_CELSIUS - 32.0 / 1.8, 255.372, 5e-4, id="0 °F"),
        pytest.param(STANDARD_ATMOSPHERE / 760.0, 133.3224, 5e-5, id="mmHg"),
        pytest.param(STANDARD_GRAVITY * POUND / INCH**2, 6894.757, 5e-4, id="psi"),
        # ISO 2533:1975 and the U.S. Standard Atmosphere, 1976: density at sea level, temperature and pressure at 11 km
        # of geopotential altitude, and the height of 86 km at which that altitude is 84.852 km (from memory).
        pytest.param(
            STANDARD_ATMOSPHERE / (ATMOSPHERE_GAS_CONSTANT * ATMOSPHERE_SEA_LEVEL_TEMPERATURE), 1.2250, 5e-5, id="ρ0"
        ),
        pytest.param(AT_11_KM, 216.65, 5e-3, id="T at 11 km"),
        pytest.param(STANDARD_ATMOSPHERE * RATIO_AT_11_KM**EXPONENT, 22632.0, 0.5, id="p at 11 km"),
        pytest.param(
            ATMOSPHERE_EARTH_RADIUS * 84_852.0 / (ATMOSPHERE_EARTH_RADIUS - 84_852.0), 86_000.0, 0.5, id="86 km"
        ),
        # API MPMS 11.5 (2009), from memory: pounds in a US gallon of 231 cubic inches at a relative density of 1.
        pytest.param(constants.WATER_DENSITY_60F * 231.0 * INCH**3 / POUND, 8.3372, 5e-5, id="water at 60 °F"),
    ],
)
def test_a_constant_agrees_with_what_is_printed(found: float, printed: float, half_a_digit: float) -> None:
    assert found == pytest.approx(printed, abs=half_a_digit)


def test_weight_in_air_is_the_conventional_one() -> None:
    air, weights = constants.CONVENTIONAL_AIR_DENSITY, constants.CONVENTIONAL_WEIGHT_DENSITY
    # OIML D 28 (2004): 1.2 and 8000 kg/m³, so 1 − 1.2/8000 = 0.99985 and 1 − 1.2/850 = 0.998588235 by hand.
    factor = (1.0 - air / 850.0) / (1.0 - air / weights)
    assert factor == pytest.approx(0.998588235 / 0.99985, abs=1e-8)
    # API MPMS 11.5.3 (2009): density in air is 1.000149926 ρ − 1.199407795, for an air of 1.1992 kg/m³.
    assert factor == pytest.approx(1.000149926 - 1.199407795 / 850.0, abs=1e-6)
