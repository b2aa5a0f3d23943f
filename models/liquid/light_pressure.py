"""Light hydrocarbons above their saturation pressure: how far they yield, and what that pressure is."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from models.arrays import ArrayLike, BoolArray, FloatArray, as_floats
from models.constants import STANDARD_GRAVITY

__all__ = [
    "HIGHEST_COMPRESSED_RELATIVE_DENSITY",
    "HIGHEST_COMPRESSED_TEMPERATURE",
    "LOWEST_COMPRESSED_RELATIVE_DENSITY",
    "LOWEST_COMPRESSED_TEMPERATURE",
    "PASCAL_PER_PSI",
    "Compressed",
    "compress",
    "critical_guard",
    "least_compressed_relative_density",
    "reaches_compressed",
    "vapour_pressure",
]

POUND, INCH = 0.45359237, 0.0254  # kg, m, exact: international yard and pound agreement, 1959
PASCAL_PER_PSI = POUND * STANDARD_GRAVITY / INCH**2  # derived: 6894.757...
_RANKINE_PER_KELVIN = 1.8  # exact
_RANKINE_OF_ZERO_FAHRENHEIT = 459.67  # °R, exact

# A and B of API MPMS 11.2.2-1986, eqs. 1 and 2 below; coefficients as in public text, the arrangement of the terms
# held against reference equations of state. The third term of B bears G: without it F is a fifth to three quarters low.
_A_T2, _A_T2_G2, _A_T2_G4 = -2.1465891e-6, 1.5774390e-5, -1.0502139e-5
_A_T3_G6, _A_T3_G2, _A_T3_G4 = 2.8324481e-7, 7.2900662e-8, -2.7769343e-7
_A_1, _A_T_G2, _A_T_G, _A_T, _A_G = -0.95495939, 0.03645838, -0.05110158, 0.00795529, 9.13114910
_B_T2, _B_T_G2, _B_G, _B_G2 = -6.0357667e-10, 2.2112678e-6, 0.00088384, -0.00204016
_SCALE = 1e-5  # F is in 1e-5/psi
# Critical temperature of eq. 5 [°R], and the share of it up to which the method holds.
_TC_1, _TC_G, _TC_G2, _TC_SHARE = 621.418, -822.686, 1737.86, 0.96
# The method's range: 0.350 to 0.637, −50 to 140 °F.
LOWEST_COMPRESSED_RELATIVE_DENSITY, HIGHEST_COMPRESSED_RELATIVE_DENSITY = 0.350, 0.637
LOWEST_COMPRESSED_TEMPERATURE, HIGHEST_COMPRESSED_TEMPERATURE = 409.67 / 1.8, 599.67 / 1.8  # K
ROUNDING = 1e-9  # a limit given in other units may fall this far outside, relative

# GPA TP-15 (2007) = API MPMS 11.2.5: A0, A1, B0, B1 from each relative density up to the next. The standard's
# table goes on below and above; the three rows here are those that could be read in public text.
_VAPOUR_LIMITS = (0.49, 0.51, 0.56, 0.585)
_VAPOUR_COEFFICIENTS = (
    (-6.4747, 37.083, 12038.0, -31296.5),
    (11.5454, 1.749, 1378.8, -10396.1),
    (6.4827, 10.79, 3721.5, -14579.5),
)
_VAPOUR_ORIGIN = 443.0  # added to °F, same source


@dataclass(frozen=True)
class Compressed:
    """Density over the density at saturation, with its slopes; NaN where the method does not reach.

    Parameters
    ----------
    factor_psi : FloatArray, shape (...)
        F, mean compressibility between saturation and the pressure. [1e-5/psi]
    factor : FloatArray, shape (...)
        CPL, volume at saturation over volume at the pressure. [1]
    by_pressure : FloatArray, shape (...)
        κ = ∂ln CPL/∂P. [1/Pa]
    by_temperature : FloatArray, shape (...)
        ∂ln CPL/∂T at fixed excess. [1/K]
    by_relative_density : FloatArray, shape (...)
        ∂ln CPL/∂ln γ at fixed excess. [1]
    """

    factor_psi: FloatArray
    factor: FloatArray
    by_pressure: FloatArray
    by_temperature: FloatArray
    by_relative_density: FloatArray


def critical_guard(relative_density: ArrayLike) -> FloatArray:
    """Highest temperature at which the compressibility method holds for a relative density.

    Parameters
    ----------
    relative_density : array_like, shape (...)
        G, relative density at 60 °F. [1]

    Returns
    -------
    FloatArray, shape (...)
        Temperature. [K]

    Notes
    -----
    In degrees Rankine::

        T_R = 0.96 (621.418 − 822.686 G + 1737.86 G²)        (1)

    References
    ----------
    .. [1] API MPMS 11.2.2-1986, "Compressibility Factors for Hydrocarbons: 0.350-0.637 Relative Density
       (60 °F/60 °F) and −50 °F to 140 °F Metering Temperature".
    """
    (g,) = as_floats(relative_density)
    return np.asarray(_TC_SHARE * (_TC_1 + (_TC_G + _TC_G2 * g) * g) / _RANKINE_PER_KELVIN)  # eq. 1


def least_compressed_relative_density(temperature: ArrayLike) -> FloatArray:
    """Relative density from which the compressibility method holds at a temperature.

    Parameters
    ----------
    temperature : array_like, shape (...)
        Temperature. [K]

    Returns
    -------
    FloatArray, shape (...)
        Relative density at 60 °F. [1]

    Notes
    -----
    The larger root of eq. 1 of :func:`critical_guard`.

    References
    ----------
    .. [1] API MPMS 11.2.2-1986.
    """
    (t,) = as_floats(temperature)
    rest = _TC_1 - t * _RANKINE_PER_KELVIN / _TC_SHARE
    inside = np.maximum(_TC_G**2 - 4.0 * _TC_G2 * rest, 0.0)  # below 0 every liquid is far enough from critical
    return np.asarray(np.maximum((np.sqrt(inside) - _TC_G) / (2.0 * _TC_G2), LOWEST_COMPRESSED_RELATIVE_DENSITY))


def reaches_compressed(relative_density: ArrayLike, temperature: ArrayLike) -> BoolArray:
    """Where the compressibility method holds.

    Parameters
    ----------
    relative_density : array_like, shape (...)
        Relative density at 60 °F. [1]
    temperature : array_like, shape (...)
        Temperature. [K]

    Returns
    -------
    BoolArray, shape (...)
        True within its three limits. [1]
    """
    g, t = as_floats(relative_density, temperature)
    more, less = 1.0 + ROUNDING, 1.0 - ROUNDING
    dense = (g >= LOWEST_COMPRESSED_RELATIVE_DENSITY * less) & (g <= HIGHEST_COMPRESSED_RELATIVE_DENSITY * more)
    warm = (t >= LOWEST_COMPRESSED_TEMPERATURE * less) & (t <= HIGHEST_COMPRESSED_TEMPERATURE * more)
    return np.asarray(dense & warm & (t <= critical_guard(g) * more))


def compress(relative_density: ArrayLike, temperature: ArrayLike, pressure_excess: ArrayLike) -> Compressed:
    """How much denser a light hydrocarbon is than at its saturation pressure.

    Parameters
    ----------
    relative_density : array_like, shape (...)
        G, relative density at 60 °F. [1]
    temperature : array_like, shape (...)
        Temperature. [K]
    pressure_excess : array_like, shape (...)
        Pressure above the saturation pressure, not below 0. [Pa]

    Returns
    -------
    Compressed
        The factor and its slopes, wherever the formula gives one. [as there]

    Notes
    -----
    With T in degrees Rankine and D the excess in psi::

        A = a1 T² + a2 T² G² + a3 T² G⁴ + a4 T³ G⁶ + a5 + a6 T³ G² + a7 T³ G⁴ + a8 T G² + a9 T G
            + a10 T + a11 G        (1)
        B = b1 T² + b2 T G² + b3 G + b4 G²        (2)
        F = 1/(A + B D)        (3)
        CPL = 1/(1 − 1e-5 F D)        (4)

    References
    ----------
    .. [1] API MPMS 11.2.2-1986, "Compressibility Factors for Hydrocarbons: 0.350-0.637 Relative Density
       (60 °F/60 °F) and −50 °F to 140 °F Metering Temperature".
    """
    g, kelvin, excess = as_floats(relative_density, temperature, pressure_excess)
    t, d, g2 = kelvin * _RANKINE_PER_KELVIN, excess / PASCAL_PER_PSI, g * g
    # A and B as polynomials in T, whose coefficients are polynomials in G
    a2 = _A_T2 + (_A_T2_G2 + _A_T2_G4 * g2) * g2
    a3 = (_A_T3_G2 + (_A_T3_G4 + _A_T3_G6 * g2) * g2) * g2
    a1 = _A_T + (_A_T_G + _A_T_G2 * g) * g
    a = _A_1 + _A_G * g + (a1 + (a2 + a3 * t) * t) * t  # eq. 1
    b = (_B_T_G2 * g2 + _B_T2 * t) * t + (_B_G + _B_G2 * g) * g  # eq. 2
    a_by_t = a1 + (2.0 * a2 + 3.0 * a3 * t) * t
    a2_by_g = (2.0 * _A_T2_G2 + 4.0 * _A_T2_G4 * g2) * g
    a3_by_g = (2.0 * _A_T3_G2 + (4.0 * _A_T3_G4 + 6.0 * _A_T3_G6 * g2) * g2) * g
    a_by_g = _A_G + (_A_T_G + 2.0 * _A_T_G2 * g + (a2_by_g + a3_by_g * t) * t) * t
    b_by_t = _B_T_G2 * g2 + 2.0 * _B_T2 * t
    b_by_g = 2.0 * _B_T_G2 * g * t + _B_G + 2.0 * _B_G2 * g
    below = a + b * d
    below = np.where(below > _SCALE * d, below, np.nan)  # no pole is crossed: F > 0 and CPL > 0
    f = 1.0 / below  # eq. 3
    cpl = 1.0 / (1.0 - _SCALE * f * d)  # eq. 4
    yielding = _SCALE * f * f * cpl
    return Compressed(
        factor_psi=np.asarray(f),
        factor=np.asarray(cpl),
        by_pressure=np.asarray(yielding * a / PASCAL_PER_PSI),
        by_temperature=np.asarray(-yielding * d * (a_by_t + b_by_t * d) * _RANKINE_PER_KELVIN),
        by_relative_density=np.asarray(-yielding * d * (a_by_g + b_by_g * d) * g),
    )


def vapour_pressure(relative_density: ArrayLike, temperature: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Saturation pressure of a commercial light hydrocarbon, and its slope.

    Parameters
    ----------
    relative_density : array_like, shape (...)
        γ, relative density at 60 °F, 0.49 to 0.585. [1]
    temperature : array_like, shape (...)
        Temperature. [K]

    Returns
    -------
    FloatArray, shape (...)
        Absolute pressure; NaN outside 0.49 to 0.585. [Pa]
    FloatArray, shape (...)
        Its slope by temperature. [Pa/K]

    Notes
    -----
    With t in °F, P in psi, and the coefficients of the row of γ::

        ln P = A0 + A1 γ + (B0 + B1 γ)/(t + 443)        (1)

    References
    ----------
    .. [1] GPA TP-15, "A Simplified Vapor Pressure Correlation for Commercial NGLs", 2007 = API MPMS 11.2.5.
    """
    gamma, t = as_floats(relative_density, temperature)
    limits = np.asarray(_VAPOUR_LIMITS)
    row = np.clip(np.searchsorted(limits, gamma, side="right") - 1, 0, len(_VAPOUR_COEFFICIENTS) - 1)
    a0, a1, b0, b1 = (column[row] for column in np.asarray(_VAPOUR_COEFFICIENTS).T)
    inside = (gamma >= limits[0]) & (gamma < limits[-1])
    constant = np.where(inside, b0 + b1 * gamma, np.nan)
    over = t * _RANKINE_PER_KELVIN - _RANKINE_OF_ZERO_FAHRENHEIT + _VAPOUR_ORIGIN
    pressure = np.exp(a0 + a1 * gamma + constant / over) * PASCAL_PER_PSI  # eq. 1
    return np.asarray(pressure), np.asarray(-pressure * constant / over**2 * _RANKINE_PER_KELVIN)


def vapour_pressure_by_density(relative_density: ArrayLike, temperature: ArrayLike) -> FloatArray:
    """Slope of the saturation pressure by the relative density.

    Parameters
    ----------
    relative_density : array_like, shape (...)
        γ, relative density at 60 °F, 0.49 to 0.585. [1]
    temperature : array_like, shape (...)
        Temperature. [K]

    Returns
    -------
    FloatArray, shape (...)
        ∂P/∂γ within the row of γ; NaN outside 0.49 to 0.585. [Pa]

    Notes
    -----
    From eq. 1 of :func:`vapour_pressure`::

        ∂P/∂γ = P [A1 + B1/(t + 443)]        (1)

    References
    ----------
    .. [1] As of :func:`vapour_pressure`.
    """
    gamma, t = as_floats(relative_density, temperature)
    limits = np.asarray(_VAPOUR_LIMITS)
    row = np.clip(np.searchsorted(limits, gamma, side="right") - 1, 0, len(_VAPOUR_COEFFICIENTS) - 1)
    over = t * _RANKINE_PER_KELVIN - _RANKINE_OF_ZERO_FAHRENHEIT + _VAPOUR_ORIGIN
    _, a1, _, b1 = (column[row] for column in np.asarray(_VAPOUR_COEFFICIENTS).T)
    return np.asarray(vapour_pressure(gamma, t)[0] * (a1 + b1 / over))  # eq. 1
