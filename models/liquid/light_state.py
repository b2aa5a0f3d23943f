"""A light hydrocarbon at an absolute pressure: what of it lies above equilibrium, and what that does."""

from __future__ import annotations

import numpy as np

from models.arrays import ArrayLike, FloatArray, as_floats
from models.liquid import light_hydrocarbon
from models.liquid.light_pressure import vapour_pressure, vapour_pressure_by_density
from models.liquid.point import LiquidPoint

LIGHTEST, HEAVIEST = 0.49, np.nextafter(0.585, 0.0)  # γ of which GPA TP-15 gives the vapour pressure
_STEPS = 20  # Newton's steps square, and the first is near: five do
_TOLERANCE = 1e-14  # relative, of a step


def excess(relative_density: ArrayLike, temperature: ArrayLike, pressure: ArrayLike) -> FloatArray:
    """Pressure above that of equilibrium.

    Parameters
    ----------
    relative_density : array_like, shape (...)
        γ, relative density at 60 °F. [1]
    temperature : array_like, shape (...)
        Liquid temperature. [K]
    pressure : array_like, shape (...)
        Absolute pressure. [Pa]

    Returns
    -------
    FloatArray, shape (...)
        The excess; 0 below equilibrium, and where the pressure of equilibrium is not known. [Pa]

    Notes
    -----
    ::

        Δp = max(0, P − P_e(γ, T))        (1)

    The vapour pressure is known for γ of 0.49 to 0.585. A heavier liquid is taken to have that of 0.585, which
    is above its own by 2 bar at most at 20 °C: 6e-4 of the density. A lighter one is taken as at equilibrium,
    where it is stored.

    References
    ----------
    .. [1] API MPMS 11.2.2 (1986), 11.2.2.2 (form from memory); GPA TP-15 = API MPMS 11.2.5 for P_e.
    """
    gamma, t, p = as_floats(relative_density, temperature, pressure)
    return _above(p, vapour_pressure(np.minimum(gamma, HEAVIEST), t)[0])


def _above(pressure: FloatArray, equilibrium: FloatArray) -> FloatArray:
    above = pressure - equilibrium  # eq. 1 of ``excess``
    return np.asarray(np.where(above > 0.0, above, np.where(np.isnan(pressure), np.nan, 0.0)))


def point_at(relative_density: ArrayLike, temperature: ArrayLike, pressure: ArrayLike) -> LiquidPoint:
    """Density and slopes at an absolute pressure.

    Parameters
    ----------
    relative_density : array_like, shape (...)
        γ, relative density at 60 °F. [1]
    temperature : array_like, shape (...)
        Liquid temperature. [K]
    pressure : array_like, shape (...)
        Absolute pressure. [Pa]

    Returns
    -------
    LiquidPoint, shape (...)
        β at fixed pressure, κ (0 at and below equilibrium), ∂ln ρ/∂ln γ at fixed pressure. [SI]

    Notes
    -----
    The excess falls as the pressure of equilibrium rises, so with the slopes at fixed excess, marked x::

        β = β_x + κ ∂P_e/∂T,  ∂ln ρ/∂ln γ = (∂ln ρ/∂ln γ)_x − κ γ ∂P_e/∂γ        (1)

    References
    ----------
    .. [1] The chain rule.
    """
    gamma, t, p = as_floats(relative_density, temperature, pressure)
    equilibrium, warmer = vapour_pressure(np.minimum(gamma, HEAVIEST), t)
    above = _above(p, equilibrium)
    found = light_hydrocarbon.point(gamma, t, above)
    pressed = above > 0.0
    inside = np.isfinite(found.density)
    kappa = np.where(pressed, found.compressibility, np.where(inside, 0.0, np.nan))
    warmer = np.where(pressed, warmer, 0.0)
    heavier = np.where(pressed & (gamma < HEAVIEST), vapour_pressure_by_density(gamma, t), 0.0)
    return LiquidPoint(
        found.density,
        np.asarray(found.expansivity + kappa * warmer),  # eq. 1
        kappa,
        np.asarray(found.by_key - kappa * gamma * heavier),
    )


def key_at(density: ArrayLike, temperature: ArrayLike, pressure: ArrayLike) -> FloatArray:
    """Relative density at 60 °F of a liquid observed at an absolute pressure.

    Parameters
    ----------
    density : array_like, shape (...)
        Observed density. [kg/m³]
    temperature : array_like, shape (...)
        Its temperature. [K]
    pressure : array_like, shape (...)
        Its absolute pressure. [Pa]

    Returns
    -------
    FloatArray, shape (...)
        γ; NaN where there is none within the methods' ranges. [1]

    Notes
    -----
    The excess depends on γ, so Newton's method takes the root at equilibrium to that at the pressure. At 0.49,
    where the vapour pressure ceases to be known, the density has a step: one that falls into it is that of 0.49.

    References
    ----------
    .. [1] GPA TP-27 / API MPMS 11.2.4, table 23E.
    """
    rho, t, p = as_floats(density, temperature, pressure)
    gamma = light_hydrocarbon.relative_density_60f(rho, t, np.where(np.isnan(p), np.nan, 0.0))
    with np.errstate(invalid="ignore"):
        for _ in range(_STEPS):
            found = point_at(gamma, t, p)
            step = np.exp(-np.log(found.density / rho) / found.by_key)
            gamma = np.asarray(gamma * step)
            moving = np.abs(step - 1.0) > _TOLERANCE
            if not np.any(moving):
                return gamma
    return np.asarray(np.where(moving, LIGHTEST, gamma))
