"""Commodities and groups of the petroleum volume correction: constants, limits, and which group holds.

A commodity is declared; within ``refined`` the group follows from the density at 60 °F.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from models.arrays import ArrayLike, BoolArray, FloatArray, as_floats
from models.constants import ZERO_CELSIUS

EDITION = "ASTM D1250-04 / API MPMS 11.1-2004"
COMMODITIES = {"crude": 0, "refined": 1, "lubricating": 2, "special": 3}
CRUDE, REFINED, LUBRICATING, SPECIAL = COMMODITIES.values()

CodeArray = NDArray[np.int64]
OUTSIDE = -1  # the group of what belongs to none


class Group(NamedTuple):
    """A group of petroleum liquids with one correlation, α60 = K0/ρ² + K1/ρ + K2.

    Parameters
    ----------
    name : str
        What the group is called. [1]
    lowest : float
        Smallest density at 60 °F. [kg/m³]
    highest : float
        Largest density at 60 °F; between two groups of refined products the heavier one holds it. [kg/m³]
    k0 : float
        Coefficient of 1/ρ². [kg²/(m⁶ °F)]
    k1 : float
        Coefficient of 1/ρ. [kg/(m³ °F)]
    k2 : float
        Constant term. [1/°F]
    """

    name: str
    lowest: float
    highest: float
    k0: float
    k1: float
    k2: float


# API MPMS 11.1-2004, 11.1.6.1: constants and density limits. In the special group the client's α60 is K2.
GROUPS = (
    Group("crude oils", 610.6, 1163.5, 341.0957, 0.0, 0.0),
    Group("gasolines", 610.6, 770.3520, 192.4571, 0.2438, 0.0),
    Group("transition", 770.3520, 787.5195, 1489.0670, 0.0, -0.00186840),
    Group("jet fuels", 787.5195, 838.3127, 330.3010, 0.0, 0.0),
    Group("fuel oils", 838.3127, 1163.5, 103.8720, 0.2701, 0.0),
    Group("lubricating oils", 800.9, 1163.5, 0.0, 0.34878, 0.0),
    Group("special applications", 610.6, 1163.5, 0.0, 0.0, np.nan),
)
FIRST = np.array([0, 1, 5, 6])  # group of a commodity's lightest liquid, by the commodity's code
LAST = np.array([0, 4, 5, 6])
HEAVIER_REFINED = range(2, 5)  # groups that take over from a lighter one
LOWEST_DENSITY, HIGHEST_DENSITY = (np.array([group[place] for group in GROUPS]) for place in (1, 2))
_K0, _K1, _K2 = (np.array([group[place] for group in GROUPS]) for place in (3, 4, 5))

# API MPMS 11.1-2004, table of limits: −58 to 302 °F, 0 to 1500 psig, α60 230e-6 to 930e-6 1/°F.
LOWEST_TEMPERATURE, HIGHEST_TEMPERATURE = ZERO_CELSIUS - 50.0, ZERO_CELSIUS + 150.0  # K
PASCAL_PER_PSI = 6894.757  # as the standard converts; the exact factor is 4e-8 larger
HIGHEST_PRESSURE = 1500.0 * 6894.757293168  # Pa gauge, with the exact factor so that an exact conversion fits
LOWEST_ALPHA60, HIGHEST_ALPHA60 = 230e-6, 930e-6  # 1/°F
# Only the unit in which a limit is defined is exact: one that was converted there and back may lie a
# rounding beyond it and still counts as inside.
ROUNDING = 1e-9


def commodity_codes(commodity: ArrayLike) -> CodeArray:
    """Commodity codes as integers; −1 for a code that names no commodity.

    Parameters
    ----------
    commodity : array_like, shape (...)
        Values of :data:`COMMODITIES`. [1]

    Returns
    -------
    CodeArray, shape (...)
        The codes. [1]
    """
    codes = np.asarray(commodity, dtype=np.int64)
    return np.where((codes >= 0) & (codes < len(COMMODITIES)), codes, OUTSIDE)


def density_limits(commodity: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Smallest and largest density at 60 °F of a commodity.

    Parameters
    ----------
    commodity : array_like, shape (...)
        Values of :data:`COMMODITIES`. [1]

    Returns
    -------
    tuple of FloatArray, shape (...)
        Smallest and largest density, NaN for a code that names no commodity. [kg/m³]
    """
    codes = commodity_codes(commodity)
    known = codes >= 0
    return (
        np.where(known, LOWEST_DENSITY[FIRST[codes]], np.nan),
        np.where(known, HIGHEST_DENSITY[LAST[codes]], np.nan),
    )


def holds(value: ArrayLike, lowest: ArrayLike, highest: ArrayLike) -> BoolArray:
    """Whether a value lies within limits, a rounding of 1e-9 of the limit allowed; NaN does not.

    Parameters
    ----------
    value : array_like, shape (...)
        The value. [any]
    lowest : array_like, shape (...)
        Smallest value allowed. [any]
    highest : array_like, shape (...)
        Largest value allowed. [any]

    Returns
    -------
    BoolArray, shape (...)
        True where the value is inside. [1]
    """
    x, low, high = as_floats(value, lowest, highest)
    return np.asarray((x >= low - ROUNDING * np.abs(low)) & (x <= high + ROUNDING * np.abs(high)))


def pressure_holds(pressure_gauge: ArrayLike) -> BoolArray:
    """Whether a pressure is within the limits of the procedure; below 0 it is, and counts as 0.

    Parameters
    ----------
    pressure_gauge : array_like, shape (...)
        Pressure above base or equilibrium pressure. [Pa]

    Returns
    -------
    BoolArray, shape (...)
        True where it is inside. [1]
    """
    (gauge,) = as_floats(pressure_gauge)
    return np.asarray(np.isfinite(gauge) & (gauge <= HIGHEST_PRESSURE * (1.0 + ROUNDING)))


def alpha60_holds(commodity: ArrayLike, alpha60: ArrayLike) -> BoolArray:
    """Whether α60 is within its limits where the commodity is special; true where it is not.

    Parameters
    ----------
    commodity : array_like, shape (...)
        Values of :data:`COMMODITIES`. [1]
    alpha60 : array_like, shape (...)
        Expansivity at 60 °F. [1/°F]

    Returns
    -------
    BoolArray, shape (...)
        True where it is inside or not read. [1]
    """
    return np.asarray((np.asarray(commodity) != SPECIAL) | holds(alpha60, LOWEST_ALPHA60, HIGHEST_ALPHA60))


def conditions_hold(
    temperature: ArrayLike, pressure_gauge: ArrayLike, commodity: ArrayLike, alpha60: ArrayLike
) -> BoolArray:
    """Whether temperature, pressure and α60 are within the limits of the procedure.

    Parameters
    ----------
    temperature : array_like, shape (...)
        Liquid temperature. [K]
    pressure_gauge : array_like, shape (...)
        Pressure above base or equilibrium pressure. [Pa]
    commodity : array_like, shape (...)
        Values of :data:`COMMODITIES`. [1]
    alpha60 : array_like, shape (...)
        Expansivity at 60 °F, read where the commodity is special. [1/°F]

    Returns
    -------
    BoolArray, shape (...)
        True where all are inside. [1]
    """
    codes = commodity_codes(commodity)
    warm = holds(temperature, LOWEST_TEMPERATURE, HIGHEST_TEMPERATURE)
    return np.asarray(warm & pressure_holds(pressure_gauge) & alpha60_holds(codes, alpha60) & (codes >= 0))


def group_of(density_60f: ArrayLike, commodity: ArrayLike) -> CodeArray:
    """Index into :data:`GROUPS` of a liquid, −1 where its density is outside its commodity's limits.

    Parameters
    ----------
    density_60f : array_like, shape (...)
        Density at 60 °F. [kg/m³]
    commodity : array_like, shape (...)
        Values of :data:`COMMODITIES`. [1]

    Returns
    -------
    CodeArray, shape (...)
        The group. [1]
    """
    (rho,) = as_floats(density_60f)
    codes = commodity_codes(commodity)
    above = np.zeros(rho.shape, dtype=np.int64)
    for index in HEAVIER_REFINED:
        above = above + (rho >= LOWEST_DENSITY[index])
    group = FIRST[codes] + np.where(codes == REFINED, above, 0)
    return np.where(holds(rho, *density_limits(codes)), group, OUTSIDE)


def coefficients(group: CodeArray, alpha60: ArrayLike) -> tuple[FloatArray, FloatArray, FloatArray]:
    """K0, K1 and K2 of a group; for special applications K2 is the liquid's own α60.

    Parameters
    ----------
    group : CodeArray, shape (...)
        Indices into :data:`GROUPS`, −1 for none. [1]
    alpha60 : array_like, shape (...)
        Expansivity at 60 °F, read where the group is special. [1/°F]

    Returns
    -------
    tuple of FloatArray, shape (...)
        K0, K1, K2, NaN where there is no group. [kg²/(m⁶ °F), kg/(m³ °F), 1/°F]

    Notes
    -----
    The procedure's own formula for a liquid of known α60, ρ* = ρ60 exp[α60 δ/2 (1 + 0.4 α60 δ)], is that of
    the groups at K0 = K1 = 0 and K2 = α60.

    References
    ----------
    .. [1] API MPMS 11.1-2004, 11.1.6.1.
    """
    (own,) = as_floats(alpha60)
    k0 = np.where(group >= 0, _K0[group], np.nan)
    return k0, _K1[group], np.where(group == FIRST[SPECIAL], own, _K2[group])
