"""From the density series to the pressure series and back."""

from __future__ import annotations

from models.arrays import ArrayLike, FloatArray, as_floats
from models.constants import GAS_CONSTANT


def pressure_coefficients(
    second: ArrayLike, third: ArrayLike, temperature: ArrayLike
) -> tuple[FloatArray, FloatArray]:
    """B' and C' of ``Z = 1 + B' P + C' P^2`` from B and C of ``Z = 1 + B rho + C rho^2``.

    Parameters
    ----------
    second : array_like, shape (...)
        B. [m3/mol]
    third : array_like, shape (...)
        C. [m6/mol2]
    temperature : array_like, shape (...)
        Temperature. [K]

    Returns
    -------
    tuple of FloatArray, shape (...)
        B' and C'. [1/Pa, 1/Pa2]

    Notes
    -----
    Exact for the infinite series; the series cut after the third term are not equivalent::

        B' = B / RT,  C' = (C - B^2) / (RT)^2        (1)

    References
    ----------
    .. [1] AIP Handbook, 3rd ed., McGraw-Hill, 1972, section 4i.
    """
    b, c, t = as_floats(second, third, temperature)
    rt = GAS_CONSTANT * t
    return b / rt, (c - b * b) / rt**2  # eq. 1


def density_coefficients(
    second_by_pressure: ArrayLike, third_by_pressure: ArrayLike, temperature: ArrayLike
) -> tuple[FloatArray, FloatArray]:
    """B and C of the density series from B' and C' of the pressure series.

    Parameters
    ----------
    second_by_pressure : array_like, shape (...)
        B'. [1/Pa]
    third_by_pressure : array_like, shape (...)
        C'. [1/Pa2]
    temperature : array_like, shape (...)
        Temperature. [K]

    Returns
    -------
    tuple of FloatArray, shape (...)
        B and C. [m3/mol, m6/mol2]

    Notes
    -----
    ::

        B = B' RT,  C = (C' + B'^2) (RT)^2        (1)

    References
    ----------
    .. [1] AIP Handbook, 3rd ed., McGraw-Hill, 1972, section 4i.
    """
    b, c, t = as_floats(second_by_pressure, third_by_pressure, temperature)
    rt = GAS_CONSTANT * t
    return b * rt, (c + b * b) * rt**2  # eq. 1
