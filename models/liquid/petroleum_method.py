"""Equations of the petroleum volume correction, API MPMS 11.1-2004, 11.1.6.1, each with its slope.

The procedure's own units are °F and psi. The correlations were fitted on IPTS-68, on which 60 °F is
60.0068749 °F: temperature and density are moved there (t*, ρ*) before anything else.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from models.arrays import ArrayLike, FloatArray, as_floats
from models.constants import ZERO_CELSIUS
from models.liquid.petroleum_groups import PASCAL_PER_PSI

Coefficients = tuple[FloatArray, FloatArray, FloatArray]

# API MPMS 11.1-2004, 11.1.5.3: ITS-90 minus IPTS-68 in °C, a polynomial of t90/630 without constant term.
_SHIFT = (-0.148759, -0.267408, 1.080760, 1.269056, -4.089591, -1.871251, 7.438081, -3.536296)
_SHIFT_SCALE = 630.0  # °C
# API MPMS 11.1-2004, 11.1.6.1.
_DELTA60 = 0.01374979547  # °F, twice the shift of 60 °F
_STAR60 = 60.0068749  # °F on IPTS-68, where ITS-90 says 60 °F
_CURVE = 0.8  # of the second-order term of CTL
_F0, _F1, _F2, _F3 = -1.9947, 0.00013427, 793920.0, 2326.0  # of Fp
_FP_SCALE = 1e-5
_DEGREES_F, _ZERO_F = 1.8, 32.0  # exact


class State(NamedTuple):
    """Temperature and pressure as the procedure has them.

    Parameters
    ----------
    celsius : FloatArray, shape (...)
        Temperature on ITS-90. [°C]
    shift : FloatArray, shape (...)
        Δ, ITS-90 minus IPTS-68. [°C]
    star : FloatArray, shape (...)
        t*, temperature on IPTS-68. [°F]
    psi : FloatArray, shape (...)
        Gauge pressure that counts, never below 0. [psi]
    """

    celsius: FloatArray
    shift: FloatArray
    star: FloatArray
    psi: FloatArray


class Star(NamedTuple):
    """A liquid at 60 °F of IPTS-68.

    Parameters
    ----------
    density : FloatArray, shape (...)
        ρ*. [kg/m³]
    slope : FloatArray, shape (...)
        d ln ρ*/d ln ρ60 within the group. [1]
    alpha : FloatArray, shape (...)
        α60. [1/°F]
    alpha_slope : FloatArray, shape (...)
        dα60/d ln ρ* within the group. [1/°F]
    """

    density: FloatArray
    slope: FloatArray
    alpha: FloatArray
    alpha_slope: FloatArray


def state(temperature: ArrayLike, pressure_gauge: ArrayLike) -> State:
    """Temperature moved to IPTS-68 and pressure in psi.

    Parameters
    ----------
    temperature : array_like, shape (...)
        Temperature on ITS-90. [K]
    pressure_gauge : array_like, shape (...)
        Pressure above base or equilibrium pressure; below 0 counts as 0. [Pa]

    Returns
    -------
    State
        t90, Δ, t*, P. [°C, °C, °F, psi]

    Notes
    -----
    With τ = t90/630::

        Δ = Σ a_i τ^i,  i = 1 … 8        (1)
        t* = 1.8 (t90 − Δ) + 32          (2)

    References
    ----------
    .. [1] API MPMS 11.1-2004, 11.1.5.3.
    """
    kelvin, gauge = as_floats(temperature, pressure_gauge)
    celsius = kelvin - ZERO_CELSIUS
    tau = celsius / _SHIFT_SCALE
    shift = np.zeros_like(tau)
    for a in reversed(_SHIFT):
        shift = (shift + a) * tau  # eq. 1
    star = _DEGREES_F * (celsius - shift) + _ZERO_F  # eq. 2
    return State(celsius, shift, star, np.maximum(gauge, 0.0) / PASCAL_PER_PSI)


def star_by_temperature(celsius: ArrayLike) -> FloatArray:
    """Slope of t* against the temperature on ITS-90.

    Parameters
    ----------
    celsius : array_like, shape (...)
        Temperature on ITS-90. [°C]

    Returns
    -------
    FloatArray, shape (...)
        dt*/dt90. [°F/°C]

    Notes
    -----
    ::

        dt*/dt90 = 1.8 (1 − Σ i a_i τ^(i−1) / 630)        (1)

    References
    ----------
    .. [1] API MPMS 11.1-2004, 11.1.5.3, differentiated.
    """
    (t,) = as_floats(celsius)
    tau = t / _SHIFT_SCALE
    slope = np.zeros_like(tau)
    for power, a in reversed(list(enumerate(_SHIFT, start=1))):
        slope = slope * tau + power * a
    return np.asarray(_DEGREES_F * (1.0 - slope / _SHIFT_SCALE))  # eq. 1


def star(density_60f: FloatArray, k: Coefficients) -> Star:
    """Density at 60 °F of IPTS-68 and expansivity there, with their slopes.

    Parameters
    ----------
    density_60f : FloatArray, shape (...)
        Density at 60 °F. [kg/m³]
    k : tuple of FloatArray, shape (...)
        K0, K1, K2 of the group. [kg²/(m⁶ °F), kg/(m³ °F), 1/°F]

    Returns
    -------
    Star
        ρ* and α60. [kg/m³, 1, 1/°F, 1/°F]

    Notes
    -----
    With δ = 0.01374979547 °F and ρ for ρ60::

        A = (δ/2) [(K0/ρ + K1)/ρ + K2]                                  (1)
        B = (2 K0 + K1 ρ) / [K0 + (K1 + K2 ρ) ρ]                        (2)
        ρ* = ρ {1 + (exp[A (1 + 0.8 A)] − 1) / [1 + A (1 + 1.6 A) B]}   (3)
        α60 = (K0/ρ* + K1)/ρ* + K2                                      (4)

    A B is −dA/d ln ρ: neither it nor the slopes divide by α60, which the transition group has at 0.

    References
    ----------
    .. [1] API MPMS 11.1-2004, 11.1.6.1.
    """
    k0, k1, k2 = k
    half, twice = 0.5 * _DELTA60, 2.0 * _CURVE
    square, line = half * k0 / density_60f**2, half * k1 / density_60f
    a = square + line + half * k2  # eq. 1
    ab = 2.0 * square + line  # eq. 1, 2
    growth = np.expm1(a * (1.0 + _CURVE * a))
    below = 1.0 + (1.0 + twice * a) * ab
    ratio = 1.0 + growth / below  # eq. 3
    growth_slope = -(1.0 + growth) * (1.0 + twice * a) * ab
    below_slope = -(1.0 + twice * a) * (4.0 * square + line) - twice * ab**2
    slope = 1.0 + (growth_slope - growth * below_slope / below) / (below * ratio)
    density = density_60f * ratio
    alpha = (k0 / density + k1) / density + k2  # eq. 4
    return Star(density, slope, alpha, -(2.0 * k0 / density + k1) / density)


def log_ctl(alpha: FloatArray, temperature_star: FloatArray) -> FloatArray:
    """Logarithm of the factor for temperature.

    Parameters
    ----------
    alpha : FloatArray, shape (...)
        α60. [1/°F]
    temperature_star : FloatArray, shape (...)
        t*. [°F]

    Returns
    -------
    FloatArray, shape (...)
        ln CTL. [1]

    Notes
    -----
    With Δt = t* − 60.0068749::

        CTL = exp{−α60 Δt [1 + 0.8 α60 (Δt + δ)]}        (1)

    References
    ----------
    .. [1] API MPMS 11.1-2004, 11.1.6.1.
    """
    away = temperature_star - _STAR60
    return np.asarray(-alpha * away * (1.0 + _CURVE * alpha * (away + _DELTA60)))  # eq. 1


def log_ctl_slopes(alpha: FloatArray, temperature_star: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Slopes of ln CTL against α60 and against t*.

    Parameters
    ----------
    alpha : FloatArray, shape (...)
        α60. [1/°F]
    temperature_star : FloatArray, shape (...)
        t*. [°F]

    Returns
    -------
    tuple of FloatArray, shape (...)
        ∂ln CTL/∂α60 and ∂ln CTL/∂t*. [°F, 1/°F]

    Notes
    -----
    ::

        ∂ln CTL/∂α60 = −Δt [1 + 1.6 α60 (Δt + δ)]          (1)
        ∂ln CTL/∂t* = −α60 [1 + 0.8 α60 (2 Δt + δ)]        (2)

    References
    ----------
    .. [1] API MPMS 11.1-2004, 11.1.6.1, differentiated.
    """
    away = temperature_star - _STAR60
    by_alpha = -away * (1.0 + 2.0 * _CURVE * alpha * (away + _DELTA60))  # eq. 1
    by_star = -alpha * (1.0 + _CURVE * alpha * (2.0 * away + _DELTA60))  # eq. 2
    return np.asarray(by_alpha), np.asarray(by_star)


def scaled_compressibility(density_star: FloatArray, temperature_star: FloatArray) -> FloatArray:
    """Scaled compressibility Fp.

    Parameters
    ----------
    density_star : FloatArray, shape (...)
        ρ*. [kg/m³]
    temperature_star : FloatArray, shape (...)
        t*. [°F]

    Returns
    -------
    FloatArray, shape (...)
        Fp. [1e-5/psi]

    Notes
    -----
    ::

        Fp = exp[−1.9947 + 0.00013427 t* + (793920 + 2326.0 t*)/ρ*²]        (1)

    References
    ----------
    .. [1] API MPMS 11.1-2004, 11.1.6.1.
    """
    return np.exp(_F0 + _F1 * temperature_star + (_F2 + _F3 * temperature_star) / density_star**2)  # eq. 1


def compressibility_slopes(density_star: FloatArray, temperature_star: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Slopes of ln Fp against ln ρ* and against t*.

    Parameters
    ----------
    density_star : FloatArray, shape (...)
        ρ*. [kg/m³]
    temperature_star : FloatArray, shape (...)
        t*. [°F]

    Returns
    -------
    tuple of FloatArray, shape (...)
        ∂ln Fp/∂ln ρ* and ∂ln Fp/∂t*. [1, 1/°F]

    Notes
    -----
    ::

        ∂ln Fp/∂ln ρ* = −2 (793920 + 2326.0 t*)/ρ*²        (1)
        ∂ln Fp/∂t* = 0.00013427 + 2326.0/ρ*²               (2)

    References
    ----------
    .. [1] API MPMS 11.1-2004, 11.1.6.1, differentiated.
    """
    square = density_star**2
    return -2.0 * (_F2 + _F3 * temperature_star) / square, _F1 + _F3 / square  # eq. 1, 2


def pressed(fp: FloatArray, psi: FloatArray) -> FloatArray:
    """What the pressure takes of the volume: 1 − 1/CPL.

    Parameters
    ----------
    fp : FloatArray, shape (...)
        Fp. [1e-5/psi]
    psi : FloatArray, shape (...)
        Gauge pressure that counts. [psi]

    Returns
    -------
    FloatArray, shape (...)
        1e-5 Fp P. [1]

    Notes
    -----
    ::

        CPL = 1 / (1 − 1e-5 Fp P)        (1)

    References
    ----------
    .. [1] API MPMS 11.1-2004, 11.1.6.1.
    """
    return np.asarray(_FP_SCALE * fp * psi)  # eq. 1


def log_ctpl_and_slope(density_60f: FloatArray, k: Coefficients, at: State) -> tuple[FloatArray, FloatArray]:
    """Logarithm of CTL · CPL and the slope of the density against the density at 60 °F.

    Parameters
    ----------
    density_60f : FloatArray, shape (...)
        Density at 60 °F. [kg/m³]
    k : tuple of FloatArray, shape (...)
        K0, K1, K2 of the group. [kg²/(m⁶ °F), kg/(m³ °F), 1/°F]
    at : State
        Temperature and pressure. [°C, °C, °F, psi]

    Returns
    -------
    tuple of FloatArray, shape (...)
        ln CTPL and ∂ln ρ/∂ln ρ60 within the group. [1, 1]

    Notes
    -----
    With f = 1e-5 Fp P, CPL = 1/(1 − f)::

        ln ρ = ln ρ60 + ln CTL − ln(1 − f)                                                           (1)
        ∂ln ρ/∂ln ρ60 = 1 + (dln ρ*/dln ρ60) [(∂ln CTL/∂α)(dα/dln ρ*) + f/(1 − f) ∂ln Fp/∂ln ρ*]     (2)

    References
    ----------
    .. [1] API MPMS 11.1-2004, 11.1.6.1, differentiated.
    """
    s = star(density_60f, k)
    f = pressed(scaled_compressibility(s.density, at.star), at.psi)
    by_alpha, _ = log_ctl_slopes(s.alpha, at.star)
    fp_slope, _ = compressibility_slopes(s.density, at.star)
    slope = 1.0 + s.slope * (by_alpha * s.alpha_slope + f / (1.0 - f) * fp_slope)  # eq. 2
    return np.asarray(log_ctl(s.alpha, at.star) - np.log1p(-f)), np.asarray(slope)  # eq. 1
