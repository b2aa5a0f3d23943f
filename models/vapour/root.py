"""The vapour root of the virial equation: the smallest positive density, and no other."""

from __future__ import annotations

import numpy as np

from models.arrays import ArrayLike, BoolArray, FloatArray, as_floats, first_index
from models.constants import GAS_CONSTANT
from models.errors import NoVapourRoot, at_index

NEWTON_STEPS = 6  # of the whole column; four are usual
BRACKET_STEPS = 80  # of the few rows that are left
TOLERANCE = 1e-12  # of the last step; the one before it was its square root
LARGEST_RATIO = 4.0  # no vapour is denser than four times the ideal gas: Z >= 1/4 on its branch


def spinodal_density(second: ArrayLike, third: ArrayLike) -> FloatArray:
    """Density at which the pressure of the three-term density series has its first maximum.

    Parameters
    ----------
    second : array_like, shape (...)
        B. [m3/mol]
    third : array_like, shape (...)
        C. [m6/mol2]

    Returns
    -------
    FloatArray, shape (...)
        Molar density of the spinodal; infinite where the pressure has no maximum. [mol/m3]

    Notes
    -----
    One formula for every combination of signs, where ``B^2 >= 3C`` and the denominator is positive::

        rho_s = 1 / (sqrt(B^2 - 3C) - B)        (1)

    References
    ----------
    .. [1] The smaller positive root of ``1 + 2 B rho + 3 C rho^2 = 0``, rationalised.
    """
    b, c = as_floats(second, third)
    discriminant = np.asarray(b * b - 3.0 * c)
    denominator = np.sqrt(np.maximum(discriminant, 0.0)) - b
    bounded = (discriminant >= 0.0) & (denominator > 0.0)
    return np.where(bounded, 1.0 / np.where(bounded, denominator, 1.0), np.inf)  # eq. 1


def vapour_root(
    second: ArrayLike, third: ArrayLike, ideal_density: FloatArray
) -> tuple[FloatArray, BoolArray, FloatArray]:
    """Density of the vapour by the three-term density series, on the branch that begins at zero.

    Parameters
    ----------
    second : array_like, shape (...)
        B. [m3/mol]
    third : array_like, shape (...)
        C; zero leaves the series with two terms. [m6/mol2]
    ideal_density : FloatArray, shape (...)
        P/RT, not negative. [mol/m3]

    Returns
    -------
    tuple of FloatArray, BoolArray and FloatArray, shape (...)
        Molar density, where there is no vapour root (the density there is that of the spinodal), and the
        ideal density at the spinodal, infinite where there is none. [mol/m3, 1, mol/m3]

    Notes
    -----
    With z the density relative to the ideal gas's, between 0 and the spinodal, where f increases::

        f(z) = z + B' z^2 + C' z^3 - 1,   B' = B p,  C' = C p^2,  p = P/RT        (1)

    Newton's method from the pressure series; rows that it leaves are bisected.

    References
    ----------
    .. [1] W. H. Press et al., "Numerical Recipes", 3rd ed., Cambridge, 2007, section 9.4.
    """
    p = ideal_density
    second, third = as_floats(second, third)
    spinodal = spinodal_density(second, third)
    with np.errstate(invalid="ignore", over="ignore"):
        limit = spinodal * (1.0 + spinodal * (second + spinodal * third))
    limit = np.where(np.isfinite(spinodal), limit, np.inf)
    missing = limit < p
    b, c = np.asarray(second * p), np.asarray(third * (p * p))
    highest = np.minimum(spinodal / np.maximum(p, 1e-300), LARGEST_RATIO)
    z = 1.0 / np.maximum(1.0 + b + c - b * b, 1.0 / highest)
    last: FloatArray = np.full(b.shape, np.inf)
    with np.errstate(divide="ignore", invalid="ignore"):
        for _ in range(NEWTON_STEPS):
            step = (((c * z + b) * z + 1.0) * z - 1.0) / ((3.0 * c * z + 2.0 * b) * z + 1.0)  # eq. 1
            following = np.minimum(np.maximum(z - step, 0.0), highest)
            last = np.abs(following - z)
            z = following
            if np.max(last, initial=0.0) < TOLERANCE:
                break
    left = ~(last < TOLERANCE) & ~missing
    if left.any():
        z = np.array(z)
        z[left] = _bracketed(b[left], c[left], highest[left])
    return np.where(missing, spinodal, z * p), missing, limit


def _bracketed(b: FloatArray, c: FloatArray, high: FloatArray) -> FloatArray:
    """Root of eq. 1 of ``vapour_root`` by Newton's method inside a bracket, bisecting where it leaves it."""
    low, z = np.zeros_like(b), 0.5 * high
    with np.errstate(divide="ignore", invalid="ignore"):
        for _ in range(BRACKET_STEPS):
            value = ((c * z + b) * z + 1.0) * z - 1.0
            low, high = np.where(value < 0.0, z, low), np.where(value < 0.0, high, z)
            newton = z - value / ((3.0 * c * z + 2.0 * b) * z + 1.0)
            following = np.where((newton > low) & (newton < high), newton, 0.5 * (low + high))
            if np.max(np.abs(following - z), initial=0.0) == 0.0:
                break
            z = following
    return z


def vapour_density(
    pressure: ArrayLike, temperature: ArrayLike, second: ArrayLike, third: ArrayLike
) -> FloatArray:
    """Molar density of a vapour; a pressure that no vapour can have is refused.

    Parameters
    ----------
    pressure : array_like, shape (...)
        Absolute pressure. [Pa]
    temperature : array_like, shape (...)
        Temperature. [K]
    second : array_like, shape (...)
        B. [m3/mol]
    third : array_like, shape (...)
        C; zero leaves the series with two terms. [m6/mol2]

    Returns
    -------
    FloatArray, shape (...)
        Molar density. [mol/m3]

    References
    ----------
    .. [1] J. M. Smith, H. C. Van Ness, M. M. Abbott, "Introduction to Chemical Engineering
       Thermodynamics", 7th ed., McGraw-Hill, 2005, eq. 3.40 (number from memory).
    """
    p, t, b, c = np.broadcast_arrays(*as_floats(pressure, temperature, second, third))
    density, missing, limit = vapour_root(b, c, p / (GAS_CONSTANT * t))
    index = first_index(missing)
    if index is not None:
        at = at_index(index if p.ndim else None)
        highest = float((limit * GAS_CONSTANT * t).reshape(-1)[index])
        raise NoVapourRoot(
            f"pressure is {float(p.reshape(-1)[index]) / 1e3:.6g} kPa absolute{at}; a vapour of this"
            f" composition at {float(t.reshape(-1)[index]):.2f} K has at most {highest / 1e3:.6g} kPa"
            " (the spinodal of its virial equation): it is liquid, or the reading or composition is wrong",
            field="pressure",
            index=index,
        )
    return density
