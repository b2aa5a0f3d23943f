"""Density of mixtures of ethanol and water from −20 to 40 °C: the international alcoholometric tables."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from scipy.optimize import brentq

from models.arrays import ArrayLike, BoolArray, FloatArray, as_floats
from models.constants import STANDARD_ATMOSPHERE, ZERO_CELSIUS
from models.liquid.point import LiquidPoint

# OIML R 22 (1973), p. 13, printed again in the annex of Directive 76/766/EEC; every digit stands alike in
# three public copies (a fourth has digits of C_2,3 and C_2,5 exchanged: below 1e-6 kg/m3).
_A = (
    9.982012300e2, -1.929769495e2, 3.891238958e2, -1.668103923e3, 1.352215441e4, -8.829278388e4,
    3.062874042e5, -6.138381234e5, 7.470172998e5, -5.478461354e5, 2.234460334e5, -3.903285426e4,
)  # fmt: skip
_B = (-2.0618513e-1, -5.2682542e-3, 3.6130013e-5, -3.8957702e-7, 7.1693540e-9, -9.9739231e-11)
_C = (
    (1.693443461530087e-1, -1.046914743455169e1, 7.196353469546523e1, -7.047478054272792e2,
     3.924090430035045e3, -1.210164659068747e4, 2.248646550400788e4, -2.605562982188164e4,
     1.852373922069467e4, -7.420201433430137e3, 1.285617841998974e3),
    (-1.193013005057010e-2, 2.517399633803461e-1, -2.170575700536993, 1.353034988843029e1,
     -5.029988758547014e1, 1.096355666577570e2, -1.422753946421155e2, 1.080435942856230e2,
     -4.414153236817392e1, 7.442971530188783),
    (-6.802995733503803e-4, 1.876837790289664e-2, -2.002561813734156e-1, 1.022992966719220,
     -2.895696483903638, 4.810060584300675, -4.672147440794683, 2.458043105903461, -5.411227621436812e-1),
    (4.075376675622027e-6, -8.763058573471110e-6, 6.515031360099368e-6, -1.515784836987210e-6),
    (-2.788074354782409e-8, 1.345612883493354e-8),
)  # fmt: skip
_REFERENCE = 20.0  # °C, where the powers of temperature begin
_COLDEST, _HOTTEST = -20.0, 40.0  # °C, the range of the formula
_HIGHEST_PRESSURE = 1e6  # Pa; the tables are those at one atmosphere
_ROUNDING = 1e-9  # °C, what a conversion of units may leave
_STEPS = 60  # bisection alone would find the last bit of a mass fraction
_TOLERANCE = 1e-10  # of a mass fraction; the step that is taken last squares what was left


def _table() -> FloatArray:
    """Coefficients by the power of the mass fraction (row) and of t − 20 °C (column)."""
    table = np.zeros((len(_A), len(_B) + 1))
    table[:, 0] = _A
    table[0, 1:] = _B
    for power, column in enumerate(_C, start=1):
        table[1 : len(column) + 1, power] = column
    return table


_COEFFICIENTS = _table()


def point(
    mass_fraction_key: ArrayLike, temperature: ArrayLike, pressure: ArrayLike, *, compressibility: ArrayLike = 0.0
) -> LiquidPoint:
    """A mixture of ethanol and water at a temperature and pressure; NaN outside −20 to 40 °C and above 10 bar.

    Parameters
    ----------
    mass_fraction_key : array_like, shape (...)
        Mass of ethanol in the mass of the mixture, the key of this method. [1]
    temperature : array_like, shape (...)
        Liquid temperature; the mixture is taken as liquid, also where it would freeze. [K]
    pressure : array_like, shape (...)
        Pressure. [Pa]
    compressibility : array_like, shape (...)
        κ, which the tables do not give: 0 unless it is measured; pure ethanol's is 1.1e-9, water's 4.6e-10
        at 20 °C, so that 0 is at most 1.1e-4 of the density low for each bar. [1/Pa]

    Returns
    -------
    LiquidPoint, shape (...)
        Density and slopes. [kg/m³, 1/K, 1/Pa, 1]

    Notes
    -----
    With the mass fraction p and t in °C::

        ρ₀ = Σ_k A_k p^(k−1) + Σ_k B_k (t−20)^k + Σ_i Σ_k C_ik p^k (t−20)^i        (1)
        ρ  = ρ₀ exp[κ (P − P₀)],  β = −∂ln ρ₀/∂T,  ∂ln ρ/∂ln p = p/ρ₀ ∂ρ₀/∂p      (2)

    The tables stand on IPTS-68 and are used with today's degrees, as everybody does: 0.008 kg/m³ at 40 °C.

    References
    ----------
    .. [1] OIML R 22, "International alcoholometric tables", 1973, p. 5 and 13.
    .. [2] Council Directive 76/766/EEC of 27 July 1976, annex, 4.
    """
    key, kelvin, p, kappa = as_floats(mass_fraction_key, temperature, pressure, compressibility)
    t = kelvin - ZERO_CELSIUS
    inside = (key >= 0.0) & (key <= 1.0) & (p >= 0.0) & (p <= _HIGHEST_PRESSURE) & _warm(t)
    theta = np.where(_warm(t), t, np.nan) - _REFERENCE
    density, by_key, by_temperature = as_floats(0.0, 0.0, 0.0)
    for row in _COEFFICIENTS[::-1]:  # eq. 1, powers of p outside, of t − 20 inside
        value, slope = _polynomial(row, theta)
        by_key = by_key * key + density
        density = density * key + value
        by_temperature = by_temperature * key + slope
    nan = np.where(inside, 1.0, np.nan)
    pressed = density * np.exp(kappa * (p - STANDARD_ATMOSPHERE))  # eq. 2
    return LiquidPoint(pressed * nan, -by_temperature / density * nan, kappa * nan, key * by_key / density * nan)


def mass_fraction(density: ArrayLike, temperature: ArrayLike) -> FloatArray:
    """Mass fraction of ethanol of a mixture whose density is measured at one atmosphere.

    Parameters
    ----------
    density : array_like, shape (...)
        Density of the mixture at its temperature. [kg/m³]
    temperature : array_like, shape (...)
        Temperature, −20 to 40 °C. [K]

    Returns
    -------
    FloatArray, shape (...)
        Mass of ethanol in the mass of the mixture; NaN where no mixture has this density. [1]

    Notes
    -----
    At every temperature of the range eq. 1 of :func:`point` falls from water to ethanol, so that its one root
    is found by Newton's steps between bounds that close in.

    References
    ----------
    .. [1] OIML R 22, "International alcoholometric tables", 1973, p. 5: tables Va and Vb are such roots.
    """
    wanted, kelvin = np.broadcast_arrays(*as_floats(density, temperature))
    t = kelvin - ZERO_CELSIUS
    theta = np.where(_warm(t), t, np.nan) - _REFERENCE
    powers = [_polynomial(row, theta)[0] for row in _COEFFICIENTS]
    low, high = np.zeros_like(wanted), np.ones_like(wanted)
    water, ethanol = _value_and_slope(powers, low)[0], _value_and_slope(powers, high)[0]
    possible = (wanted <= water + _ROUNDING) & (wanted >= ethanol - _ROUNDING)
    fraction = np.clip((water - wanted) / (water - ethanol), 0.0, 1.0)
    for _ in range(_STEPS):
        value, slope = _value_and_slope(powers, fraction)
        low, high = np.where(value > wanted, fraction, low), np.where(value > wanted, high, fraction)
        newton = fraction + (wanted - value) / slope
        new = np.where((newton >= low) & (newton <= high), newton, 0.5 * (low + high))
        moved = np.abs(new - fraction)
        fraction = new
        if not np.any(possible & (moved > _TOLERANCE)):
            break
    return np.where(possible, fraction, np.nan)


def density_of_strength(volume_fraction: float) -> float:
    """Density at 20 °C of a mixture whose strength by volume is given.

    Parameters
    ----------
    volume_fraction : float
        Volume of ethanol at 20 °C in the volume of the mixture at 20 °C. [1]

    Returns
    -------
    float
        Density at 20 °C and one atmosphere. [kg/m³]

    Notes
    -----
    With ρ(p) of eq. 1 of :func:`point` at 20 °C, where p ρ(p) rises with p::

        q ρ(1) = p ρ(p)        (1)

    References
    ----------
    .. [1] OIML R 22, "International alcoholometric tables", 1973, p. 5.
    """
    kelvin = _REFERENCE + ZERO_CELSIUS

    def density(fraction: float) -> float:
        return float(point(fraction, kelvin, STANDARD_ATMOSPHERE).density)

    goal = volume_fraction * density(1.0)
    found = brentq(lambda p: p * density(p) - goal, 0.0, 1.0, xtol=1e-15)  # eq. 1
    return density(float(found))


def why_outside(mass_fraction_key: float, temperature: float, pressure: float) -> str:
    """Why a mixture of ethanol and water has no density at a state.

    Parameters
    ----------
    mass_fraction_key : float
        Mass of ethanol in the mass of the mixture. [1]
    temperature : float
        Liquid temperature. [K]
    pressure : float
        Pressure. [Pa]

    Returns
    -------
    str
        One sentence, or nothing where the state is inside. [1]
    """
    t = temperature - ZERO_CELSIUS
    if not 0.0 <= mass_fraction_key <= 1.0:
        return f"the mass fraction of ethanol is {mass_fraction_key:.6g}; it lies from 0 to 1: correct it"
    if not _warm(np.float64(t)):
        return (
            f"the temperature of the ethanol and water is {t:.6g} °C; the alcoholometric tables are defined from "
            f"{_COLDEST:g} to {_HOTTEST:g} °C: for a state outside give a density_table"
        )
    if not 0.0 <= pressure <= _HIGHEST_PRESSURE:
        return (
            f"the pressure of the ethanol and water is {pressure / 1e3:.6g} kPa absolute; the alcoholometric tables "
            f"are taken from 0 to {_HIGHEST_PRESSURE / 1e3:g} kPa: for a state outside give a density_table"
        )
    return ""


def why_no_mixture(density: float, temperature: float) -> str:
    """Why no mixture of ethanol and water has a density at one atmosphere.

    Parameters
    ----------
    density : float
        Density of the sample. [kg/m³]
    temperature : float
        Temperature of the sample. [K]

    Returns
    -------
    str
        One sentence, or nothing where a mixture has it, and outside the range of the tables. [1]
    """
    if np.isfinite(mass_fraction(density, temperature)) or not _warm(np.float64(temperature - ZERO_CELSIUS)):
        return ""
    ends = point([1.0, 0.0], temperature, STANDARD_ATMOSPHERE).density
    return (
        f"the density is {density:.6g} kg/m³ at {temperature - ZERO_CELSIUS:.6g} °C; ethanol and water have "
        f"{ends[0]:.2f} kg/m³ (pure ethanol) to {ends[1]:.2f} kg/m³ (water) there: correct the density, or give "
        "another liquid as a density_table"
    )


def _warm(t: FloatArray | np.float64) -> BoolArray:
    return np.asarray((t >= _COLDEST - _ROUNDING) & (t <= _HOTTEST + _ROUNDING))


def _polynomial(coefficients: FloatArray, x: FloatArray) -> tuple[FloatArray, FloatArray]:
    """A polynomial and its slope; the highest powers that are zero cost nothing."""
    return _value_and_slope(as_floats(*coefficients[: int(np.flatnonzero(coefficients)[-1]) + 1]), x)


def _value_and_slope(coefficients: Sequence[FloatArray], x: FloatArray) -> tuple[FloatArray, FloatArray]:
    value, slope = as_floats(0.0, 0.0)
    for coefficient in reversed(coefficients):
        slope = slope * x + value
        value = value * x + coefficient
    return value, slope
