"""Conversions between the units on the wire and the SI of the models. Nothing else converts."""

from __future__ import annotations

from models.arrays import ArrayLike, FloatArray, as_floats
from models.constants import (
    ATMOSPHERE_EARTH_RADIUS,
    ATMOSPHERE_GAS_CONSTANT,
    ATMOSPHERE_LAPSE_RATE,
    ATMOSPHERE_SEA_LEVEL_TEMPERATURE,
    STANDARD_ATMOSPHERE,
    STANDARD_GRAVITY,
    WATER_DENSITY_60F,
    ZERO_CELSIUS,
)

PASCAL_PER_KPA = 1000.0  # exact
CUBIC_METRE_PER_CUBIC_CENTIMETRE = 1e-6  # exact
KILOGRAM_PER_GRAM = 1e-3  # exact
SECONDS_PER_DAY = 86_400.0  # exact
# NIST Handbook 44, appendix C: gallon of 231 in³, inch of 25.4 mm, avoirdupois pound of 0.45359237 kg.
CUBIC_METRE_PER_BARREL = 0.158987294928  # exact: 42 US gallons
KILOGRAM_PER_LONG_TON = 1016.0469088  # exact: 2240 lb
KILOGRAM_PER_SHORT_TON = 907.18474  # exact: 2000 lb


def kelvin(celsius: ArrayLike) -> FloatArray:
    """Absolute temperature of a Celsius temperature.

    Parameters
    ----------
    celsius : array_like, shape (...)
        Temperature. [°C]

    Returns
    -------
    FloatArray, shape (...)
        The same temperature. [K]
    """
    (value,) = as_floats(celsius)
    return value + ZERO_CELSIUS


def celsius(kelvin: ArrayLike) -> FloatArray:
    """Celsius temperature of an absolute temperature.

    Parameters
    ----------
    kelvin : array_like, shape (...)
        Temperature. [K]

    Returns
    -------
    FloatArray, shape (...)
        The same temperature. [°C]
    """
    (value,) = as_floats(kelvin)
    return value - ZERO_CELSIUS


def pascal(kpa: ArrayLike) -> FloatArray:
    """Pressure in pascal; gauge stays gauge and absolute stays absolute.

    Parameters
    ----------
    kpa : array_like, shape (...)
        Pressure. [kPa]

    Returns
    -------
    FloatArray, shape (...)
        The same pressure. [Pa]
    """
    (value,) = as_floats(kpa)
    return value * PASCAL_PER_KPA


def kilopascal(pascal: ArrayLike) -> FloatArray:
    """Pressure in kilopascal; gauge stays gauge and absolute stays absolute.

    Parameters
    ----------
    pascal : array_like, shape (...)
        Pressure. [Pa]

    Returns
    -------
    FloatArray, shape (...)
        The same pressure. [kPa]
    """
    (value,) = as_floats(pascal)
    return value / PASCAL_PER_KPA


def atmospheric_pressure(elevation: ArrayLike) -> FloatArray:
    """Mean pressure of the atmosphere at an elevation, by the standard atmosphere.

    Parameters
    ----------
    elevation : array_like, shape (...)
        Height above mean sea level, below 11 km. [m]

    Returns
    -------
    FloatArray, shape (...)
        Absolute pressure. [Pa]

    Notes
    -----
    With the geopotential altitude H = r z / (r + z)::

        p = p0 (1 − L H / T0)^(g / (R L))        (1)

    References
    ----------
    .. [1] ISO 2533:1975, "Standard Atmosphere", clause 2 and table 5.
    """
    (height,) = as_floats(elevation)
    geopotential = ATMOSPHERE_EARTH_RADIUS * height / (ATMOSPHERE_EARTH_RADIUS + height)
    exponent = STANDARD_GRAVITY / (ATMOSPHERE_GAS_CONSTANT * ATMOSPHERE_LAPSE_RATE)
    ratio = 1.0 - ATMOSPHERE_LAPSE_RATE * geopotential / ATMOSPHERE_SEA_LEVEL_TEMPERATURE
    return STANDARD_ATMOSPHERE * ratio**exponent  # eq. 1


def density_of_api_gravity(degrees: ArrayLike) -> FloatArray:
    """Density of a liquid whose gravity is given in degrees API, at the temperature at which they were observed.

    Parameters
    ----------
    degrees : array_like, shape (...)
        API gravity, above −131.5. [°API]

    Returns
    -------
    FloatArray, shape (...)
        Density. [kg/m³]

    Notes
    -----
    With the relative density RD = ρ / ρ_w and ρ_w of water at 60 °F::

        API = 141.5 / RD − 131.5        (1)

    References
    ----------
    .. [1] API MPMS 11.1-2004, "Temperature and Pressure Volume Correction Factors for Generalized Crude
       Oils, Refined Products, and Lubricating Oils".
    """
    (value,) = as_floats(degrees)
    return 141.5 / (value + 131.5) * WATER_DENSITY_60F  # eq. 1


def api_gravity_of_density(density: ArrayLike) -> FloatArray:
    """Gravity in degrees API of a liquid whose density at 60 °F is given.

    Parameters
    ----------
    density : array_like, shape (...)
        Density at 60 °F, above 0. [kg/m³]

    Returns
    -------
    FloatArray, shape (...)
        API gravity. [°API]

    Notes
    -----
    The way back from :func:`density_of_api_gravity`, eq. 1::

        API = 141.5 ρ_w / ρ − 131.5        (1)

    References
    ----------
    .. [1] API MPMS 11.1-2004, "Temperature and Pressure Volume Correction Factors for Generalized Crude
       Oils, Refined Products, and Lubricating Oils".
    """
    (value,) = as_floats(density)
    return 141.5 * WATER_DENSITY_60F / value - 131.5  # eq. 1
