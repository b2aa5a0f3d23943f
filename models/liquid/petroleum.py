"""Volume correction of petroleum liquids, ASTM D1250-04 / API MPMS 11.1-2004, unrounded.

The tables of 1980 differ from it: by water at 60 °F, the shift to ITS-90, ρ*, the transition's formula and
the glass hydrometer, which stands in :mod:`models.liquid.hydrometer` and outside this procedure.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from models.arrays import ArrayLike, FloatArray, as_floats
from models.constants import ZERO_CELSIUS
from models.liquid import petroleum_groups as groups
from models.liquid import petroleum_method as method
from models.liquid.petroleum_groups import COMMODITIES, EDITION, GROUPS, PASCAL_PER_PSI, CodeArray
from models.liquid.petroleum_limits import why_outside
from models.liquid.point import LiquidPoint

__all__ = [
    "COMMODITIES",
    "EDITION",
    "GROUPS",
    "Factors",
    "base_factors",
    "density_60f",
    "factors",
    "model_error",
    "point",
    "table_factor",
    "why_outside",
]

_ITERATIONS = 15
_RAIL_TOLERANCE = 0.01  # how far beyond its group a step may lead
_STEP_TOLERANCE = 1e-9  # relative; Newton's steps square, so what remains is rounding
_RESIDUAL_TOLERANCE = 1e-7  # relative, before the last step; the procedure itself stops at 1e-6 kg/m3

# API MPMS 11.1-1980, volume X (from memory): error of the generalised CTL at 95 %, by distance from 60 °F.
_ERROR_AWAY = np.array([0.0, 40.0, 90.0, 140.0, 190.0])  # °F
_ERROR_95 = np.array([0.0, 0.0005, 0.0015, 0.0025, 0.0035])
_SIGMAS_AT_95 = 2.0
_KELVIN_60F = ZERO_CELSIUS + (60.0 - 32.0) / 1.8


@dataclass(frozen=True)
class Factors:
    """Everything between a density at 60 °F and the density at a state, to be redone by hand.

    Parameters
    ----------
    group : CodeArray, shape (...)
        Index into GROUPS, −1 outside the procedure's limits. [1]
    temperature_f : FloatArray, shape (...)
        Liquid temperature on ITS-90. [°F]
    shift : FloatArray, shape (...)
        Δ, ITS-90 minus IPTS-68. [°C]
    temperature_star_f : FloatArray, shape (...)
        t*, liquid temperature on IPTS-68. [°F]
    density_star : FloatArray, shape (...)
        ρ*, density at 60 °F of IPTS-68. [kg/m³]
    alpha60 : FloatArray, shape (...)
        Expansivity at 60 °F. [1/°F]
    ctl : FloatArray, shape (...)
        Factor for temperature, ρ(t, 0)/ρ60. [1]
    pressure_psi : FloatArray, shape (...)
        Gauge pressure that counts, never below 0. [psi]
    fp : FloatArray, shape (...)
        Scaled compressibility Fp. [1e-5/psi]
    cpl : FloatArray, shape (...)
        Factor for pressure, ρ(t, P)/ρ(t, 0). [1]
    """

    group: CodeArray
    temperature_f: FloatArray
    shift: FloatArray
    temperature_star_f: FloatArray
    density_star: FloatArray
    alpha60: FloatArray
    ctl: FloatArray
    pressure_psi: FloatArray
    fp: FloatArray
    cpl: FloatArray


def _within(
    density_60f: ArrayLike, temperature: ArrayLike, gauge: ArrayLike, commodity: ArrayLike, alpha60: ArrayLike
) -> tuple[FloatArray, CodeArray, method.Coefficients, method.State]:
    """Density, group, coefficients and state of each row, NaN and −1 where a limit is passed."""
    rho, t, p, own = np.broadcast_arrays(*as_floats(density_60f, temperature, gauge, alpha60))
    codes = groups.commodity_codes(commodity)
    group = np.where(groups.conditions_hold(t, p, codes, own), groups.group_of(rho, codes), groups.OUTSIDE)
    inside = group >= 0
    at = method.state(np.where(inside, t, np.nan), np.where(inside, p, np.nan))
    return np.where(inside, rho, np.nan), group, groups.coefficients(group, own), at


def factors(
    density_60f: ArrayLike,
    temperature: ArrayLike,
    pressure_gauge: ArrayLike,
    commodity: ArrayLike,
    alpha60: ArrayLike = np.nan,
) -> Factors:
    """Every intermediate figure of the correction from 60 °F and base pressure to a state.

    Parameters
    ----------
    density_60f : array_like, shape (...)
        Density at 60 °F and base pressure. [kg/m³]
    temperature : array_like, shape (...)
        Liquid temperature, ITS-90. [K]
    pressure_gauge : array_like, shape (...)
        Pressure above base or equilibrium pressure; below 0 counts as 0. [Pa]
    commodity : array_like, shape (...)
        Values of COMMODITIES. [1]
    alpha60 : array_like, shape (...)
        Expansivity at 60 °F, read where the commodity is special. [1/°F]

    Returns
    -------
    Factors
        The figures, NaN outside the procedure's limits. [°F, °C, kg/m³, 1/°F, psi, 1e-5/psi, 1]

    Notes
    -----
    The equations stand in :mod:`models.liquid.petroleum_method`; the density is ρ60 · CTL · CPL.

    References
    ----------
    .. [1] API MPMS 11.1-2004, 11.1.6.1.
    """
    rho, group, k, at = _within(density_60f, temperature, pressure_gauge, commodity, alpha60)
    s = method.star(rho, k)
    fp = method.scaled_compressibility(s.density, at.star)
    return Factors(
        group=group,
        temperature_f=1.8 * at.celsius + 32.0,
        shift=at.shift,
        temperature_star_f=at.star,
        density_star=s.density,
        alpha60=s.alpha,
        ctl=np.exp(method.log_ctl(s.alpha, at.star)),
        pressure_psi=at.psi,
        fp=fp,
        cpl=1.0 / (1.0 - method.pressed(fp, at.psi)),
    )


def point(
    density_60f: ArrayLike,
    temperature: ArrayLike,
    pressure_gauge: ArrayLike,
    commodity: ArrayLike,
    alpha60: ArrayLike = np.nan,
) -> LiquidPoint:
    """Density of a petroleum liquid at a state, from its density at 60 °F, with its slopes.

    Parameters
    ----------
    density_60f : array_like, shape (...)
        Density at 60 °F and base pressure, the key. [kg/m³]
    temperature : array_like, shape (...)
        Liquid temperature, ITS-90. [K]
    pressure_gauge : array_like, shape (...)
        Pressure above base or equilibrium pressure; below 0 counts as 0. [Pa]
    commodity : array_like, shape (...)
        Values of COMMODITIES. [1]
    alpha60 : array_like, shape (...)
        Expansivity at 60 °F, read where the commodity is special. [1/°F]

    Returns
    -------
    LiquidPoint
        Density, β, κ and ∂ln ρ/∂ln ρ60 within the group; NaN outside the limits. [kg/m³, 1/K, 1/Pa, 1]

    Notes
    -----
    With f = 1e-5 Fp P, CPL = 1/(1 − f)::

        ρ = ρ60 CTL CPL                                                              (1)
        β = −(dt*/dT) [∂ln CTL/∂t* + f/(1 − f) ∂ln Fp/∂t*]                           (2)
        κ = 1e-5 Fp / [(1 − f) 6894.757], 0 where the gauge pressure is below 0      (3)

    References
    ----------
    .. [1] API MPMS 11.1-2004, 11.1.6.1.
    """
    rho, _, k, at = _within(density_60f, temperature, pressure_gauge, commodity, alpha60)
    s = method.star(rho, k)
    fp = method.scaled_compressibility(s.density, at.star)
    f = method.pressed(fp, at.psi)
    squeezed = f / (1.0 - f)
    by_alpha, ctl_by_star = method.log_ctl_slopes(s.alpha, at.star)
    fp_by_density, fp_by_star = method.compressibility_slopes(s.density, at.star)
    counts = np.asarray(pressure_gauge) >= 0.0
    return LiquidPoint(
        density=rho * np.exp(method.log_ctl(s.alpha, at.star)) / (1.0 - f),  # eq. 1
        expansivity=-method.star_by_temperature(at.celsius) * (ctl_by_star + squeezed * fp_by_star),  # eq. 2
        compressibility=method.pressed(fp, counts / PASCAL_PER_PSI) / (1.0 - f),  # eq. 3
        by_key=1.0 + s.slope * (by_alpha * s.alpha_slope + squeezed * fp_by_density),
    )


def _group_observed(rho: FloatArray, codes: CodeArray, at: method.State) -> CodeArray:
    """Group in which the solution lies: the heaviest one whose lightest liquid is not denser than observed."""
    group = np.where(codes >= 0, groups.FIRST[codes], groups.OUTSIDE)
    refined = codes == groups.REFINED
    if np.any(refined):
        for index in groups.HEAVIER_REFINED:
            k = groups.coefficients(np.asarray(index), np.nan)
            lightest = np.asarray(GROUPS[index].lowest)
            s = method.star(lightest, k)
            f = method.pressed(method.scaled_compressibility(s.density, at.star), at.psi)
            at_limit = lightest * np.exp(method.log_ctl(s.alpha, at.star)) / (1.0 - f)
            group = group + (refined & (rho >= at_limit))
    return group


def _newton(rho: FloatArray, group: CodeArray, k: method.Coefficients, at: method.State) -> FloatArray:
    """Density at 60 °F by the group's formula, NaN where there is none near the group.

    Notes
    -----
    ::

        ρ60 ← ρ60 {1 + [ln(ρ/ρ60) − ln CTPL(ρ60)] / (∂ln ρ/∂ln ρ60)}        (1)

    References
    ----------
    .. [1] API MPMS 11.1-2004, 11.1.6.2, with the exact slope.
    """
    low = (1.0 - _RAIL_TOLERANCE) * groups.LOWEST_DENSITY[group]
    high = (1.0 + _RAIL_TOLERANCE) * groups.HIGHEST_DENSITY[group]
    first = np.clip(rho, low, high)
    # Pressure left out, the start lies on the dense side, where the density rises with that at 60 °F.
    alpha = (k[0] / first + k[1]) / first + k[2]
    result = np.clip(rho * np.exp(-method.log_ctl(alpha, at.star)), low, high)
    for _ in range(_ITERATIONS):
        log_ctpl, slope = method.log_ctpl_and_slope(result, k, at)
        residual = np.log(rho / result) - log_ctpl
        step = residual / slope
        result = np.clip(result + result * step, low, high)  # eq. 1
        if np.fmax.reduce(np.abs(step), axis=None, initial=0.0) < _STEP_TOLERANCE:
            break
    return np.where(np.abs(residual) < _RESIDUAL_TOLERANCE, result, np.nan)


def density_60f(
    density: ArrayLike,
    temperature: ArrayLike,
    pressure_gauge: ArrayLike,
    commodity: ArrayLike,
    alpha60: ArrayLike = np.nan,
) -> FloatArray:
    """Density at 60 °F and base pressure of a liquid whose density was observed at a state.

    Parameters
    ----------
    density : array_like, shape (...)
        Observed density, mass over volume; a hydrometer's reading is corrected for its glass before. [kg/m³]
    temperature : array_like, shape (...)
        Liquid temperature at the observation, ITS-90. [K]
    pressure_gauge : array_like, shape (...)
        Pressure above base or equilibrium pressure; below 0 counts as 0. [Pa]
    commodity : array_like, shape (...)
        Values of COMMODITIES. [1]
    alpha60 : array_like, shape (...)
        Expansivity at 60 °F, read where the commodity is special. [1/°F]

    Returns
    -------
    FloatArray, shape (...)
        Density at 60 °F, NaN outside the procedure's limits. [kg/m³]

    Notes
    -----
    Newton's method on the logarithm with the exact slope, in place of the procedure's approximate one: the
    same root, to rounding, where the procedure stops at 1e-6 kg/m³.

    The group of a refined product is that of the solution: it is the heaviest whose lightest liquid would
    not be denser than observed. At a group's limit CTL jumps by up to 1e-7. Where the jump leaves densities
    that no liquid has, the answer is the limit itself; where two liquids have the density, it is the denser
    one. Of a special liquid near 610.6 kg/m³, 150 °C and 1500 psig two may have the density: the same holds.

    References
    ----------
    .. [1] API MPMS 11.1-2004, 11.1.6.2.
    """
    rho, t, p, own = np.broadcast_arrays(*as_floats(density, temperature, pressure_gauge, alpha60))
    codes = groups.commodity_codes(commodity)
    lightest, heaviest = groups.density_limits(codes)
    # CTL and CPL stay far within a factor 2: beyond it there is nothing to solve.
    inside = groups.conditions_hold(t, p, codes, own) & groups.holds(rho, lightest / 2.0, heaviest * 2.0)
    rho, t, p = (np.where(inside, value, np.nan) for value in (rho, t, p))
    at = method.state(t, p)
    group = np.where(inside, _group_observed(rho, codes, at), groups.OUTSIDE)
    result = _newton(rho, group, groups.coefficients(group, own), at)
    inner_low = np.where(group > groups.FIRST[codes], groups.LOWEST_DENSITY[group], 0.0)
    inner_high = np.where(group < groups.LAST[codes], groups.HIGHEST_DENSITY[group], np.inf)
    result = np.clip(result, inner_low, inner_high)
    return np.where(groups.holds(result, lightest, heaviest), result, np.nan)


def base_factors(
    density_60f: ArrayLike,
    temperature: ArrayLike,
    pressure_gauge: ArrayLike,
    temperature_base: ArrayLike,
    commodity: ArrayLike,
    alpha60: ArrayLike = np.nan,
) -> tuple[FloatArray, FloatArray]:
    """Factors for temperature and pressure from a base temperature, by way of 60 °F.

    Parameters
    ----------
    density_60f : array_like, shape (...)
        Density at 60 °F and base pressure. [kg/m³]
    temperature : array_like, shape (...)
        Liquid temperature, ITS-90. [K]
    pressure_gauge : array_like, shape (...)
        Pressure above base or equilibrium pressure; below 0 counts as 0. [Pa]
    temperature_base : array_like, shape (...)
        Base temperature: 15 °C, 20 °C, 60 °F or any other. [K]
    commodity : array_like, shape (...)
        Values of COMMODITIES. [1]
    alpha60 : array_like, shape (...)
        Expansivity at 60 °F, read where the commodity is special. [1/°F]

    Returns
    -------
    tuple of FloatArray, shape (...)
        C_T and C_P: the density at the state is ρ(T, 0) C_T C_P. [1, 1]

    Notes
    -----
    ::

        C_T = CTL(t) / CTL(T)        (1)
        C_P = CPL                    (2)

    References
    ----------
    .. [1] API MPMS 11.1-2004, 11.1.7.
    """
    there = factors(density_60f, temperature, pressure_gauge, commodity, alpha60)
    base = factors(density_60f, temperature_base, 0.0, commodity, alpha60)
    return there.ctl / base.ctl, there.cpl  # eq. 1, 2


def table_factor(factor: ArrayLike) -> FloatArray:
    """A factor as a table prints it: five decimals, a half away from zero.

    Parameters
    ----------
    factor : array_like, shape (...)
        The unrounded factor. [1]

    Returns
    -------
    FloatArray, shape (...)
        The factor to five decimals. [1]

    Notes
    -----
    What is a half in decimals seldom is one in binary: eleven decimals decide what is a half.

    References
    ----------
    .. [1] API MPMS 11.1-2004, 11.1.5.4 (from memory): only the final factor is rounded, and only where a
       table's value is wanted.
    """
    (value,) = as_floats(factor)
    scaled = np.round(np.abs(value) * 1e5, 6)
    return np.asarray(np.copysign(np.floor(scaled + 0.5) / 1e5, value))


def model_error(temperature: ArrayLike) -> FloatArray:
    """What one standard deviation of the method's own error does to ln CTL.

    Parameters
    ----------
    temperature : array_like, shape (...)
        Liquid temperature. [K]

    Returns
    -------
    FloatArray, shape (...)
        Relative error of CTL, one sigma, positive above 60 °F and negative below. [1]

    Notes
    -----
    Half of the documented 95 % figures, 0.05 % at 100 °F, 0.15 % at 150 °F, 0.25 % at 200 °F and 0.35 % at
    250 °F, linear between them and beyond, 0 at 60 °F. A liquid that expands more than its group's formula
    says does so on both sides of 60 °F: the function is odd, so that one shared error may carry it.

    References
    ----------
    .. [1] API MPMS 11.1-1980, volume X (from memory).
    """
    (kelvin,) = as_floats(temperature)
    away = 1.8 * (kelvin - _KELVIN_60F)
    distance = np.abs(away)
    steepness = (_ERROR_95[-1] - _ERROR_95[-2]) / (_ERROR_AWAY[-1] - _ERROR_AWAY[-2])
    error = np.interp(distance, _ERROR_AWAY, _ERROR_95) + steepness * np.maximum(distance - _ERROR_AWAY[-1], 0.0)
    return np.asarray(np.copysign(error / _SIGMAS_AT_95, away))
