"""A shape as a capacity table: rows at a step, and how far the table is from the shape between them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from models.arrays import BoolArray, FloatArray, as_floats
from models.errors import DefinitionError
from models.geometry.curves import Curve
from models.geometry.pieces import split

DECIMALS = 9  # of the level of a row, as it would be written: 0.3 and not 0.30000000000000004
ROUNDING = 1e-6  # of the step: a row this near to an end is the end


@dataclass(frozen=True)
class WorstError:
    """Where a capacity table is furthest from what it tabulates.

    Parameters
    ----------
    volume : float
        The table's volume less the true one; above 0 where it overstates. [m³]
    level : float
        Where. [m]
    share : float
        The same error relative to the true volume there; NaN where that is 0. [1]
    """

    volume: float
    level: float
    share: float


def row_levels(curve: Curve, step: float) -> FloatArray:
    """Levels of the rows of a table: both ends, and every multiple of the step between them.

    Parameters
    ----------
    curve : Curve
        A capacity curve. [m, m³]
    step : float
        Step of the rows. [m]

    Returns
    -------
    FloatArray, shape (k,)
        Levels above the curve's datum, increasing. [m]
    """
    if not (np.isfinite(step) and step > 0.0):
        raise DefinitionError(f"step_m is {step:.6g} m; it must be above 0 m", field="step_m")
    inside = np.arange(np.floor(curve.bottom / step), np.ceil(curve.top / step) + 1.0) * step
    inside = np.round(inside, DECIMALS)
    near = ROUNDING * step
    inside = inside[(inside > curve.bottom + near) & (inside < curve.top - near)]
    return np.concatenate([[curve.bottom], np.unique(inside), [curve.top]])


def row_count(curve: Curve, step: float) -> int:
    """How many rows a step makes, at most; without making them.

    Parameters
    ----------
    curve : Curve
        A capacity curve. [m, m³]
    step : float
        Step of the rows, above 0. [m]

    Returns
    -------
    int
        Number of rows, or at most two more. [1]
    """
    return int((curve.top - curve.bottom) / step) + 3


def worst_error(curve: Curve, table: Curve) -> WorstError:
    """Greatest difference between a capacity curve and a table of it, at the rows and between them.

    Parameters
    ----------
    curve : Curve
        What is true. [m, m³]
    table : Curve
        The table, read by its interpolation; from the curve's lowest level to its highest. [m, m³]

    Returns
    -------
    WorstError
        The error of the greatest size in volume, the lowest of equal ones. [m³]

    Notes
    -----
    Between two neighbouring knots of either, the difference of two cubics is a cubic of the distance t
    above the lower one, and is greatest at an end or where its slope is nothing::

        d_1 + 2 d_2 t + 3 d_3 t² = 0        (1)

    so the extreme is found and not sampled.

    References
    ----------
    .. [1] Calculus; the pieces are those of :class:`Curve`.
    """
    true, read = split(curve, table.levels), split(table, curve.levels)
    width, d = np.diff(true.levels), read.coefficients - true.coefficients
    places = [np.zeros_like(width), width, *(np.clip(root, 0.0, width) for root in _turning(d))]
    errors = np.stack([d[:, 0] + t * (d[:, 1] + t * (d[:, 2] + t * d[:, 3])) for t in places])
    which, piece = np.unravel_index(np.argmax(np.abs(errors)), errors.shape)
    at = float(places[which][piece])
    c = true.coefficients[piece]
    volume = float(c[0] + at * (c[1] + at * (c[2] + at * c[3])))
    error = float(errors[which, piece])
    return WorstError(error, float(true.levels[piece]) + at, error / volume if volume > 0.0 else float("nan"))


def _turning(d: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Both roots of the slope of each cubic, one a row; 0 where there is none."""
    half, product = d[:, 2], 3.0 * d[:, 3] * d[:, 1]
    inner = half**2 - product
    root = -(half + np.copysign(np.sqrt(np.maximum(inner, 0.0)), half))  # eq. 1, without cancellation
    nothing = np.zeros_like(root)
    real = inner >= 0.0
    far = np.divide(root, 3.0 * d[:, 3], out=nothing.copy(), where=real & (d[:, 3] != 0.0))
    near = np.divide(d[:, 1], root, out=nothing.copy(), where=real & (root != 0.0))
    return far, near


def rows_off_nominal(
    levels: FloatArray, volumes: FloatArray, *, area: float, share: float, resolution: float = 0.0
) -> tuple[BoolArray, FloatArray]:
    """Rows of a table whose step in volume is not that of an upright cylinder.

    Parameters
    ----------
    levels, volumes : FloatArray, shape (k,)
        Rows of a table. [m, m³]
    area : float
        Nominal area of the cylinder. [m²]
    share : float
        Greatest departure that is let pass, relative to the nominal step. [1]
    resolution : float
        Last digit to which the volumes are written, let pass as well. [m³]

    Returns
    -------
    off : BoolArray, shape (k-1,)
        True where the step to the next row departs by more. [1]
    departure : FloatArray, shape (k-1,)
        Departure of each step relative to the nominal one. [1]

    Notes
    -----
    ::

        ΔV/(A Δh) − 1        (1)

    References
    ----------
    .. [1] Within 5 % is common practice; a bottom, deadwood or a roof that is deducted depart rightly.
    """
    height, rise = np.diff(as_floats(levels)[0]), np.diff(as_floats(volumes)[0])
    nominal = area * height
    departure = np.divide(rise, nominal, out=np.full_like(rise, np.nan), where=nominal > 0.0) - 1.0  # eq. 1
    return np.abs(rise - nominal) > share * nominal + resolution, departure
