"""Liquefied petroleum gas and natural gas liquids by their relative density at 60 °F."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from models.arrays import ArrayLike, BoolArray, FloatArray, IntArray, as_floats
from models.constants import WATER_DENSITY_60F, ZERO_CELSIUS
from models.liquid import light_pressure as yielding
from models.liquid import light_temperature as saturated
from models.liquid.light_pressure import Compressed, vapour_pressure
from models.liquid.light_temperature import Saturated
from models.liquid.point import LiquidPoint

__all__ = ["Factors", "factors", "point", "relative_density_60f", "vapour_pressure", "why_outside"]

_ITERATIONS = 100  # a bisection alone ends after 50
_TOLERANCE = 1e-13  # relative, of a step
_ROUNDING = 1e-12  # a density given to the last bit may fall this far outside
# Where the search for a relative density starts: near propane and butane ρ/ρ_w falls by 1.2e-3 each kelvin.
_FIRST_STEP = 1.2e-3
# What a client can do instead; the names are those of the two methods.
_OTHERWISE = "give the liquid as a density_table or by its components"


@dataclass(frozen=True)
class Factors:
    """Every step from the relative density to the density.

    Parameters
    ----------
    saturation : Saturated
        The correction for temperature at saturation. [as there]
    compression : Compressed
        The correction for pressure above saturation. [as there]
    density : FloatArray, shape (...)
        Density at the state. [kg/m³]
    """

    saturation: Saturated
    compression: Compressed
    density: FloatArray


def factors(relative_density: ArrayLike, temperature: ArrayLike, pressure_excess: ArrayLike) -> Factors:
    """The corrections for temperature and pressure with all they are made of.

    Parameters
    ----------
    relative_density : array_like, shape (...)
        γ, relative density at 60 °F, 0.35 to 0.688. [1]
    temperature : array_like, shape (...)
        Temperature, 227.15 to 366.15 K and below the critical one. [K]
    pressure_excess : array_like, shape (...)
        Pressure above the saturation pressure; below 0 it counts as 0. [Pa]

    Returns
    -------
    Factors
        The steps; density NaN where a method that is needed does not reach. [as there]

    Notes
    -----
    With CTL of :func:`models.liquid.light_temperature.correct` and CPL of
    :func:`models.liquid.light_pressure.compress`::

        ρ = γ ρ_w CTL CPL        (1)

    References
    ----------
    .. [1] GPA TP-27 / API MPMS 11.2.4, 2007; API MPMS 11.2.2-1986; ρ_w = 999.016 kg/m³ of API MPMS 11.1-2004.
    """
    gamma, t, excess = as_floats(relative_density, temperature, pressure_excess)
    pressed = np.maximum(excess, 0.0)
    inside = saturated.reaches(gamma, t)
    ctl = saturated.correct(np.where(inside, gamma, np.nan), t, saturated.between(gamma))
    cpl = _within(yielding.compress(gamma, t, pressed), gamma, t, excess)
    return Factors(ctl, cpl, np.asarray(gamma * WATER_DENSITY_60F * ctl.factor * cpl.factor))  # eq. 1


def point(relative_density: ArrayLike, temperature: ArrayLike, pressure_excess: ArrayLike) -> LiquidPoint:
    """Density of a light hydrocarbon and its slopes.

    Parameters
    ----------
    relative_density : array_like, shape (...)
        γ, relative density at 60 °F, 0.35 to 0.688. [1]
    temperature : array_like, shape (...)
        Temperature, 227.15 to 366.15 K and below the critical one. [K]
    pressure_excess : array_like, shape (...)
        Pressure above the saturation pressure; below 0 it counts as 0. [Pa]

    Returns
    -------
    LiquidPoint
        β at fixed excess, so that a saturation pressure that rises with temperature adds κ dPe/dT; κ is 0 below
        saturation, and at saturation NaN where only the compressibility is outside its range. [as there]

    Notes
    -----
    The slopes are those of eq. 1 of :func:`factors`::

        β = −∂ln CTL/∂T − ∂ln CPL/∂T        (1)
        ∂ln ρ/∂ln γ = 1 + ∂ln CTL/∂ln γ + ∂ln CPL/∂ln γ        (2)

    References
    ----------
    .. [1] GPA TP-27 / API MPMS 11.2.4, 2007; API MPMS 11.2.2-1986.
    """
    steps = factors(relative_density, temperature, pressure_excess)
    ctl, cpl = steps.saturation, steps.compression
    return LiquidPoint(
        density=steps.density,
        expansivity=np.asarray(-ctl.by_temperature - cpl.by_temperature),  # eq. 1
        compressibility=np.asarray(np.where(np.isnan(ctl.factor), np.nan, cpl.by_pressure)),
        by_key=np.asarray(1.0 + ctl.by_relative_density + cpl.by_relative_density),  # eq. 2
    )


def _within(cpl: Compressed, gamma: FloatArray, t: FloatArray, excess: FloatArray) -> Compressed:
    """The compression where its method holds, 1 where it is not needed, else NaN."""
    holds, needed = yielding.reaches_compressed(gamma, t), excess > 0.0
    if np.all(holds & needed):
        return cpl
    idle = ~needed & ~np.isnan(excess)
    return Compressed(
        factor_psi=np.where(holds, cpl.factor_psi, np.nan),
        factor=np.where(idle, 1.0, np.where(holds, cpl.factor, np.nan)),
        by_pressure=np.where(excess < 0.0, 0.0, np.where(holds, cpl.by_pressure, np.nan)),
        by_temperature=np.where(idle, 0.0, np.where(holds, cpl.by_temperature, np.nan)),
        by_relative_density=np.where(idle, 0.0, np.where(holds, cpl.by_relative_density, np.nan)),
    )


def relative_density_60f(density: ArrayLike, temperature: ArrayLike, pressure_excess: ArrayLike) -> FloatArray:
    """Relative density at 60 °F of a liquid observed at a temperature and pressure.

    Parameters
    ----------
    density : array_like, shape (...)
        Observed density. [kg/m³]
    temperature : array_like, shape (...)
        Temperature, 227.15 to 366.15 K. [K]
    pressure_excess : array_like, shape (...)
        Pressure above the saturation pressure; below 0 it counts as 0. [Pa]

    Returns
    -------
    FloatArray, shape (...)
        γ, relative density at 60 °F; NaN where there is none within the methods' ranges. [1]

    Notes
    -----
    The root of eq. 1 of :func:`factors`, bracketed by the ranges and by the critical temperature. From 0.35 up
    the density rises with γ; below 0.333 it does not at −40 °F, and there would be two roots.

    References
    ----------
    .. [1] GPA TP-27 / API MPMS 11.2.4, 2007, table 23E.
    """
    shape = np.broadcast_shapes(*(np.shape(value) for value in (density, temperature, pressure_excess)))
    rho, t, excess = (np.broadcast_to(v, shape).reshape(-1) for v in as_floats(density, temperature, pressure_excess))
    low, high = _limits(t, excess)
    usable = (rho > 0.0) & (low <= high) & (excess == excess)
    rows = np.flatnonzero(usable)
    result = np.full(rho.shape, np.nan)
    result[rows] = _solve(np.log(rho[rows] / WATER_DENSITY_60F), t[rows], excess[rows], low[rows], high[rows])
    return result.reshape(shape)


def _limits(t: FloatArray, excess: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Lowest and highest relative density that the methods allow; crossed or NaN where they allow none."""
    critical = saturated.least_relative_density(t) * (1.0 + _ROUNDING)
    low = np.maximum(saturated.LOWEST_RELATIVE_DENSITY, critical)
    pressed = excess > 0.0
    low = np.where(pressed, np.maximum(low, yielding.least_compressed_relative_density(t)), low)
    compressed = yielding.HIGHEST_COMPRESSED_RELATIVE_DENSITY
    high = np.where(pressed, compressed, saturated.HIGHEST_RELATIVE_DENSITY)
    allowed = saturated.reaches(high, t) & (~pressed | yielding.reaches_compressed(compressed, t))
    return low, np.where(allowed, high, np.nan)


def _miss(target: FloatArray, gamma: FloatArray, t: FloatArray, excess: FloatArray) -> tuple[FloatArray, FloatArray]:
    """ln ρ/ρ_w less its target, and its slope by ln γ; the ranges are not looked at."""
    ctl = saturated.correct(gamma, t, saturated.between(gamma))
    miss, slope = np.log(gamma * ctl.factor) - target, 1.0 + ctl.by_relative_density
    pressed = excess > 0.0
    if not pressed.any():
        return miss, slope
    cpl = yielding.compress(gamma, t, np.maximum(excess, 0.0))
    miss = miss + np.where(pressed, np.log(cpl.factor), 0.0)
    return miss, slope + np.where(pressed, cpl.by_relative_density, 0.0)


def _solve(target: FloatArray, t: FloatArray, excess: FloatArray, low: FloatArray, high: FloatArray) -> FloatArray:
    """Newton's steps; a limit where they leave the range, half of the bracket where they leave that."""
    result = np.full(target.shape, np.nan)
    rows: IntArray = np.arange(target.size)
    gamma = np.clip(np.exp(target) + _FIRST_STEP * (t - saturated.TEMPERATURE_60F), low, high)
    tried_low: BoolArray = np.zeros(target.shape, dtype=np.bool_)
    tried_high = tried_low
    for _ in range(_ITERATIONS):
        miss, slope = _miss(target, gamma, t, excess)
        tried_low, tried_high = tried_low | (miss <= 0.0), tried_high | (miss >= 0.0)
        low, high = np.where(miss <= 0.0, gamma, low), np.where(miss >= 0.0, gamma, high)
        step = gamma * np.exp(-miss / slope)
        halved = ((step < low) & tried_low) | ((step > high) & tried_high)
        step = np.where(halved, 0.5 * (low + high), np.clip(step, low, high))
        done = np.abs(step - gamma) <= _TOLERANCE * gamma
        found = done & (np.abs(miss) <= _ROUNDING * slope)  # else the limit is as near as it comes
        result[rows[found]] = step[found]
        left = ~done & ~np.isnan(step)
        if not left.any():
            break
        gamma = step
        if not left.all():
            rows, tried_low, tried_high = rows[left], tried_low[left], tried_high[left]
            gamma, target, t, excess, low, high = (c[left] for c in (gamma, target, t, excess, low, high))
    return result


def why_outside(
    relative_density: float | None, density: float, temperature: float, pressure_excess: float = 0.0
) -> str:
    """Why a density has no answer.

    Parameters
    ----------
    relative_density : float or None
        Relative density at 60 °F; None where it was to be found from the observed density. [1]
    density : float
        Observed density; without meaning where the relative density is given. [kg/m³]
    temperature : float
        Temperature. [K]
    pressure_excess : float
        Pressure above the saturation pressure. [Pa]

    Returns
    -------
    str
        One sentence; empty where there is an answer. [1]
    """
    celsius, pressed = temperature - ZERO_CELSIUS, pressure_excess > 0.0
    if not saturated.reaches(saturated.HIGHEST_RELATIVE_DENSITY, temperature):
        return (
            f"the temperature of the light hydrocarbon is {celsius:.6g} °C; its correction is defined from "
            f"{_celsius(saturated.LOWEST_TEMPERATURE)} to {_celsius(saturated.HIGHEST_TEMPERATURE)} °C: "
            f"{_OTHERWISE}"
        )
    if pressed and not yielding.reaches_compressed(yielding.HIGHEST_COMPRESSED_RELATIVE_DENSITY, temperature):
        return (
            f"the temperature of the light hydrocarbon is {celsius:.6g} °C at {pressure_excess / 1000.0:.6g} kPa above "
            f"its saturation pressure; its compressibility is defined from "
            f"{_celsius(yielding.LOWEST_COMPRESSED_TEMPERATURE)} to "
            f"{_celsius(yielding.HIGHEST_COMPRESSED_TEMPERATURE)} °C: {_OTHERWISE}"
        )
    if relative_density is None:
        return _why_no_root(density, temperature, pressure_excess)
    return _why_no_density(relative_density, temperature, pressed)


def _celsius(kelvin: float) -> str:
    return f"{kelvin - ZERO_CELSIUS:.4g}"


def _why_no_root(density: float, temperature: float, excess: float) -> str:
    if not np.isnan(relative_density_60f(density, temperature, excess)):
        return ""
    low, high = (float(limit) for limit in _limits(np.asarray(temperature), np.asarray(excess)))
    lightest, heaviest = factors(np.array([low, high]), temperature, excess).density
    return (
        f"the density is {density:.6g} kg/m³ at {temperature - ZERO_CELSIUS:.6g} °C; a light hydrocarbon has "
        f"{lightest:.6g} to {heaviest:.6g} kg/m³ there, for the relative densities at 60 °F from {low:.4g} to "
        f"{high:.4g} of the method: {_OTHERWISE}"
    )


def _why_no_density(gamma: float, temperature: float, pressed: bool) -> str:
    celsius = temperature - ZERO_CELSIUS
    named = f"the relative density at 60 °F is {gamma:.6g}"
    if not saturated.reaches(gamma, temperature):
        return (
            f"{named}; the correction is defined from {saturated.LOWEST_RELATIVE_DENSITY:g} to "
            f"{saturated.HIGHEST_RELATIVE_DENSITY:g}: {_OTHERWISE}"
        )
    critical = float(saturated.correct(gamma, temperature, saturated.between(gamma)).critical_temperature)
    if temperature >= critical:
        return (
            f"{named} and the temperature is {celsius:.6g} °C; such a liquid ends at its critical temperature, "
            f"{_celsius(critical)} °C: check both, for there is no liquid"
        )
    if not pressed or yielding.reaches_compressed(gamma, temperature):
        return ""
    guard = float(yielding.critical_guard(gamma))
    if temperature > guard and gamma <= yielding.HIGHEST_COMPRESSED_RELATIVE_DENSITY:
        return (
            f"{named} and the temperature is {celsius:.6g} °C, above the saturation pressure; the compressibility "
            f"of such a liquid is defined up to {_celsius(guard)} °C: {_OTHERWISE}"
        )
    return (
        f"{named}, above the saturation pressure; the compressibility is defined from "
        f"{yielding.LOWEST_COMPRESSED_RELATIVE_DENSITY:g} to {yielding.HIGHEST_COMPRESSED_RELATIVE_DENSITY:g}: "
        f"{_OTHERWISE}"
    )
