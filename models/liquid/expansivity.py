"""A liquid of given expansivity β and compressibility κ: density from one state to another."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from models.arrays import ArrayLike, FloatArray, as_floats


def expansivity(temperature: ArrayLike, *, coefficients: Sequence[ArrayLike], origin: ArrayLike) -> FloatArray:
    """Thermal expansivity β of the liquid at a temperature.

    Parameters
    ----------
    temperature : array_like, shape (...)
        Liquid temperature. [K]
    coefficients : sequence of array_like, shape (...)
        b_0, b_1, … of the powers of T − t₀. [1/K, 1/K², …]
    origin : array_like, shape (...)
        t₀, where the polynomial has its origin. [K]

    Returns
    -------
    FloatArray, shape (...)
        β(T). [1/K]

    Notes
    -----
    ::

        β(T) = Σ_j b_j (T − t₀)^j        (1)

    References
    ----------
    .. [1] CRC Handbook of Chemistry and Physics, 87th ed., "Pressure and temperature dependence of
       liquid density": β = (1/V)(∂V/∂T)_P.
    """
    t, zero = as_floats(temperature, origin)
    result: FloatArray = np.zeros(np.broadcast(t, zero).shape)
    for coefficient in reversed(as_floats(*coefficients)):
        result = result * (t - zero) + coefficient  # eq. 1
    return np.asarray(result)


def log_volume_ratio(
    temperature: ArrayLike,
    pressure: ArrayLike,
    *,
    temperature_ref: ArrayLike,
    pressure_ref: ArrayLike,
    coefficients: Sequence[ArrayLike],
    origin: ArrayLike,
    compressibility: ArrayLike,
) -> FloatArray:
    """Logarithm of the liquid's volume relative to its volume at a reference state.

    Parameters
    ----------
    temperature : array_like, shape (...)
        Liquid temperature. [K]
    pressure : array_like, shape (...)
        Pressure of the space above the liquid. [Pa]
    temperature_ref : array_like, shape (...)
        Temperature of the reference state. [K]
    pressure_ref : array_like, shape (...)
        Pressure of the reference state. [Pa]
    coefficients : sequence of array_like, shape (...)
        b_0, b_1, … of the powers of T − t₀. [1/K, 1/K², …]
    origin : array_like, shape (...)
        t₀, where the polynomial has its origin. [K]
    compressibility : array_like, shape (...)
        Isothermal compressibility κ, constant. [1/Pa]

    Returns
    -------
    FloatArray, shape (...)
        ln V(T, P) − ln V(T_ref, P_ref). [1]

    Notes
    -----
    The definitions of β and κ, integrated without linearising::

        ln(V/V_ref) = Σ_j b_j [(T − t₀)^(j+1) − (T_ref − t₀)^(j+1)]/(j+1) − κ (P − P_ref)        (1)

    References
    ----------
    .. [1] J. M. Smith, H. C. Van Ness, M. M. Abbott, "Introduction to Chemical Engineering
       Thermodynamics", 7th ed., McGraw-Hill, 2005, ch. 3 (from memory).
    """
    t, p, t_ref, p_ref, kappa = as_floats(temperature, pressure, temperature_ref, pressure_ref, compressibility)
    (zero,), series = as_floats(origin), as_floats(*coefficients)
    here, there = t - zero, t_ref - zero
    if len(series) == 1:  # the common case, without cancellation between two integrals
        return np.asarray(series[0] * (t - t_ref) - kappa * (p - p_ref))
    thermal: FloatArray = np.zeros(np.broadcast(here, there).shape)
    for power, coefficient in reversed(list(enumerate(series, start=1))):
        thermal = thermal + coefficient * (here**power - there**power) / power
    return np.asarray(thermal - kappa * (p - p_ref))  # eq. 1


def density(density_ref: ArrayLike, log_ratio: ArrayLike) -> FloatArray:
    """Density of the liquid from its density at the reference state.

    Parameters
    ----------
    density_ref : array_like, shape (...)
        Density at the reference state. [kg/m³]
    log_ratio : array_like, shape (...)
        ln V/V_ref of :func:`log_volume_ratio`. [1]

    Returns
    -------
    FloatArray, shape (...)
        Density at the state. [kg/m³]

    Notes
    -----
    The mass is the same in both states::

        ρ = ρ_ref exp(−ln(V/V_ref))        (1)

    References
    ----------
    .. [1] Conservation of mass.
    """
    reference, ratio = as_floats(density_ref, log_ratio)
    return np.asarray(reference * np.exp(-ratio))  # eq. 1
