"""Density of air-free water: near room temperature as a reference, and from 0 to 150 °C with its slopes."""

from __future__ import annotations

import numpy as np

from models.arrays import ArrayLike, FloatArray, as_floats, first_index
from models.constants import STANDARD_ATMOSPHERE, ZERO_CELSIUS
from models.errors import OutsideRange, at_index
from models.liquid.point import LiquidPoint

# The coefficients of eq. 1, recalled and confirmed against IAPWS-95 to 0.0012 kg/m3.
_A1, _A2, _A3, _A4, _A5 = -3.983035, 301.797, 522528.9, 69.34881, 999.974950
_LOWEST, _HIGHEST = 0.0, 40.0  # °C, the range of the published equation

# Kell (1975), density at one atmosphere; t in °C of IPTS-68. A reprint of the table has the digits of the
# denominator's constant transposed (16.897850e-3), which is 0.27 kg/m3 low at 20 °C.
_KELL = (999.83952, 16.945176, -7.9870401e-3, -46.170461e-6, 105.56302e-9, -280.54253e-12)
_KELL_BELOW = 16.879850e-3
# Kell (1975), eq. 20: isothermal compressibility at one atmosphere [1e-6/bar], 0 to 100 °C. Carried on to 150 °C it
# stays within 0.18 % of IAPWS-95; the paper's own equation for 100 to 150 °C differs by 0.36 %, and a step at 100 °C.
_KAPPA = (50.88496, 0.6163813, 1.459187e-3, 20.08438e-6, -58.47727e-9, 410.4110e-12)
_KAPPA_BELOW = 19.67348e-3
_PER_PASCAL = 1e-11  # 1e-6/bar in 1/Pa, exact
_IPTS_68 = 1.00024  # t68/t90, 0 to 100 °C: P. M. Saunders, WOCE Newsletter 10 (1990); within 0.002 °C to 150 °C
# Kell's greatest density, 999.9720 kg/m3, rests on the litre of 1901; that of eq. 1 is measured in SI.
_SCALE = _A5 / 999.9720
_COLDEST, _HOTTEST = 0.0, 150.0  # °C, the range of Kell's equations
_HIGHEST_PRESSURE = 10e6  # Pa; above it a constant κ is no longer within 1e-4 of the density
_ROUNDING = 1e-9  # °C, what a conversion of units may leave


def water_density(temperature: ArrayLike) -> FloatArray:
    """Density of water at one atmosphere, 0 to 40 °C.

    Parameters
    ----------
    temperature : array_like, shape (...)
        Water temperature. [K]

    Returns
    -------
    FloatArray, shape (...)
        Density. [kg/m³]

    Raises
    ------
    OutsideRange
        A temperature outside 0 to 40 °C.

    Notes
    -----
    ::

        ρ = a5 [1 − (t + a1)² (t + a2) / (a3 (t + a4))]        (1)

    References
    ----------
    .. [1] M. Tanaka et al., "Recommended table for the density of water between 0 °C and 40 °C",
       Metrologia 38 (2001) 301–309, eq. 1.
    """
    (kelvin,) = as_floats(temperature)
    t = kelvin - ZERO_CELSIUS
    bad = first_index((t < _LOWEST - 1e-9) | (t > _HIGHEST + 1e-9))
    if bad is not None:
        raise OutsideRange(
            f"the water temperature{at_index(bad if kelvin.ndim else None)} is {t.reshape(-1)[bad]:.6g} °C; "
            f"the equation is defined from {_LOWEST:g} to {_HIGHEST:g} °C",
            field="temperature",
            index=bad,
        )
    return np.asarray(_A5 * (1.0 - (t + _A1) ** 2 * (t + _A2) / (_A3 * (t + _A4))))  # eq. 1


def point(temperature: ArrayLike, pressure: ArrayLike) -> LiquidPoint:
    """Water at a temperature and pressure, 0 to 150 °C and up to 100 bar; NaN outside.

    Parameters
    ----------
    temperature : array_like, shape (...)
        Water temperature. [K]
    pressure : array_like, shape (...)
        Pressure; below the vapour pressure the liquid is taken as superheated, not as steam. [Pa]

    Returns
    -------
    LiquidPoint, shape (...)
        Density and slopes; the key is a factor beside 1. [kg/m³, 1/K, 1/Pa, 1]

    Notes
    -----
    With t68 = 1.00024 t90 in °C, c = 999.974950/999.9720 and P₀ of one atmosphere::

        ρ₀ = c Σ_i a_i t68^i / (1 + a t68)               (1)
        κ  = Σ_i k_i t68^i / (1 + k t68)                 (2)
        ρ  = ρ₀ exp[κ (P − P₀)]                          (3)
        β  = −d ln ρ₀/dT − (P − P₀) dκ/dT                (4)

    One equation over the whole range has no step at 40 °C; the scale c brings it onto Tanaka's, and the scale of
    temperature keeps it there: from IAPWS-95 at one atmosphere or the vapour pressure it differs by at most
    0.0018 kg/m³ up to 100 °C and 0.006 up to 150 °C, where eq. 1 as published and in t90 differs by 0.015 and
    0.035. Above 100 °C ρ₀ is a reference that no stable liquid has. At 100 bar ρ is 0.08 kg/m³ high up to 100 °C,
    0.14 up to 150 °C, as κ is that at one atmosphere; eq. 2 is published up to 100 °C, and carried on to 150 °C.

    References
    ----------
    .. [1] G. S. Kell, "Density, thermal expansivity, and compressibility of liquid water from 0 °C to 150 °C",
       J. Chem. Eng. Data 20 (1975) 97–105.
    .. [2] P. M. Saunders, "The International Temperature Scale of 1990, ITS-90", WOCE Newsletter 10 (1990) 10.
    """
    kelvin, p = as_floats(temperature, pressure)
    t = kelvin - ZERO_CELSIUS
    inside = (t >= _COLDEST - _ROUNDING) & (t <= _HOTTEST + _ROUNDING) & (p >= 0.0) & (p <= _HIGHEST_PRESSURE)
    t68 = np.where(inside, t, np.nan) * _IPTS_68
    density, density_slope = _fraction(_KELL, _KELL_BELOW, t68)  # eq. 1
    kappa, kappa_slope = _fraction(_KAPPA, _KAPPA_BELOW, t68)  # eq. 2
    kappa, above = kappa * _PER_PASCAL, p - STANDARD_ATMOSPHERE
    pressed = _SCALE * density * np.exp(kappa * above)  # eq. 3
    beta = -_IPTS_68 * (density_slope / density + above * (kappa_slope * _PER_PASCAL))  # eq. 4
    return LiquidPoint(pressed, beta, kappa, np.where(inside, 1.0, np.nan))


def why_outside(temperature: float, pressure: float) -> str:
    """Why water has no density at a state.

    Parameters
    ----------
    temperature : float
        Water temperature. [K]
    pressure : float
        Pressure. [Pa]

    Returns
    -------
    str
        One sentence, or nothing where the state is inside. [1]
    """
    t = temperature - ZERO_CELSIUS
    if not _COLDEST - _ROUNDING <= t <= _HOTTEST + _ROUNDING:
        return (
            f"the water's temperature is {t:.6g} °C; its density is defined from {_COLDEST:g} to {_HOTTEST:g} °C: "
            "for a state outside give a density_table"
        )
    if not 0.0 <= pressure <= _HIGHEST_PRESSURE:
        return (
            f"the water's pressure is {pressure / 1e3:.6g} kPa absolute; its density is defined from 0 to "
            f"{_HIGHEST_PRESSURE / 1e3:g} kPa: for a state outside give a density_table"
        )
    return ""


def _fraction(above: tuple[float, ...], below: float, t: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Value of a polynomial over 1 + below · t, and its derivative by t."""
    value, slope = np.full_like(t, above[-1]), np.zeros_like(t)
    for coefficient in above[-2::-1]:
        slope = slope * t + value
        value = value * t + coefficient
    bottom = 1.0 + below * t
    whole = value / bottom
    return whole, (slope - below * whole) / bottom
