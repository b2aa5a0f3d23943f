"""Capacity tables: rows of level and volume as measured, and deadwood that takes room in any vessel."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
from scipy.interpolate import PchipInterpolator

from models.arrays import ArrayLike, FloatArray, as_floats
from models.errors import DefinitionError
from models.geometry.curves import TABLE, Curve
from models.geometry.pieces import Pieces, hermite, split

ROOM = 1e-9  # of the largest surface: rounding, not an area below zero


def _linear(levels: FloatArray, volumes: FloatArray) -> Pieces:
    slope = np.diff(volumes) / np.diff(levels)
    nothing = np.zeros_like(slope)
    return Pieces(levels, np.column_stack([volumes[:-1], slope, nothing, nothing]))


def _monotone_cubic(levels: FloatArray, volumes: FloatArray) -> Pieces:
    return hermite(levels, volumes, np.asarray(PchipInterpolator(levels, volumes).derivative()(levels)))


INTERPOLATIONS = {"linear": _linear, "monotone_cubic": _monotone_cubic}


def capacity_table(
    levels: ArrayLike, volumes: ArrayLike, *, total_volume: float | None = None, interpolation: str = "linear"
) -> Curve:
    """Capacity curve of a table; never extrapolated.

    Parameters
    ----------
    levels : array_like, shape (k,)
        Levels on the table's own zero, increasing. [m]
    volumes : array_like, shape (k,)
        Volume at each level, never falling. [m³]
    total_volume : float or None
        Volume of the whole vessel; the last row's where it is left out. [m³]
    interpolation : str
        ``linear``, or ``monotone_cubic``. [1]

    Returns
    -------
    Curve
        From the first row to the last. [m, m³]

    References
    ----------
    .. [1] ISO 7507-1:2003, "Calibration of vertical cylindrical tanks", for the table; F. N. Fritsch,
       R. E. Carlson, SIAM J. Numer. Anal. 17 (1980) 238, for the monotone cubic.
    """
    h, v = as_floats(levels, volumes)
    _check_rows(h, v)
    capacity = float(v[-1]) if total_volume is None else total_volume
    if not math.isfinite(capacity) or capacity < v[-1]:
        raise DefinitionError(
            f"total_volume_m3 is {capacity:.9g} m³; it must be at least the last row's volume, {v[-1]:.9g} m³",
            field="total_volume_m3",
        )
    if interpolation not in INTERPOLATIONS:
        raise DefinitionError(
            f"interpolation is of no known kind; known are {', '.join(INTERPOLATIONS)}", field="interpolation"
        )
    pieces = INTERPOLATIONS[interpolation](h, v)
    told = f"capacity table of {len(h)} rows, {interpolation.replace('_', ' ')}"
    return Curve(pieces.heights, pieces.coefficients, capacity, TABLE, told)


def _check_rows(h: FloatArray, v: FloatArray) -> None:
    if h.ndim != 1 or h.shape != v.shape or len(h) < 2:
        raise DefinitionError("rows must be at least 2 pairs of level and volume", field="rows")
    for told, wrong in (
        ("is not a pair of finite numbers", ~(np.isfinite(h) & np.isfinite(v))),
        ("has a volume below 0 m³", v < 0.0),
        ("does not lie above the row before it", np.diff(h, prepend=-np.inf) <= 0.0),
        ("holds less than the row before it: a capacity table never falls", np.diff(v, prepend=-np.inf) < 0.0),
    ):
        if wrong.any():
            row = int(np.argmax(wrong))
            raise DefinitionError(
                f"rows/{row} ({h[row]:.6g} m, {v[row]:.9g} m³) {told}", field=f"rows/{row}", index=row
            )
    if v[-1] <= 0.0:
        raise DefinitionError("rows hold no volume at all", field="rows")


def with_deadwood(curve: Curve, from_level: ArrayLike, to_level: ArrayLike, volume: ArrayLike) -> Curve:
    """A curve less what stands in the vessel: coils, columns, ladders.

    Parameters
    ----------
    curve : Curve
        Capacity curve of the empty vessel. [m, m³]
    from_level, to_level : array_like, shape (m,)
        Band of each piece of deadwood, on the curve's own levels. [m]
    volume : array_like, shape (m,)
        What each takes, spread evenly over its band; negative where it adds room. [m³]

    Returns
    -------
    Curve
        The same levels with less volume, and less capacity. [m, m³]

    Notes
    -----
    With D the deadwood of a band from h_1 to h_2::

        V(h) → V(h) − Σ D min(max((h − h_1)/(h_2 − h_1), 0), 1)        (1)

    What lies below the curve's first level is taken from its first volume.

    References
    ----------
    .. [1] ISO 7507-1:2003, "Calibration of vertical cylindrical tanks": deadwood (form from memory).
    """
    start, stop, taken = np.broadcast_arrays(*as_floats(from_level, to_level, volume))
    for row, (low, high, room) in enumerate(zip(start, stop, taken, strict=True)):
        if not (math.isfinite(room) and math.isfinite(low) and low < high <= curve.top):
            raise DefinitionError(
                f"deadwood/{row} stands from {low:.6g} to {high:.6g} m; it must be an upward band that ends at or "
                f"below the highest level, {curve.top:.6g} m",
                field=f"deadwood/{row}",
                index=row,
            )
    refined = split(curve, np.concatenate([start, stop]))
    rows, knots = refined.coefficients.copy(), refined.levels[:-1]
    for low, high, room in zip(start, stop, taken, strict=True):
        rows[:, 0] -= room * np.clip((knots - low) / (high - low), 0.0, 1.0)  # eq. 1
        rows[:, 1] -= np.where((knots >= low) & (knots < high), room / (high - low), 0.0)
    lost = replace(refined, coefficients=rows, capacity=curve.capacity - float(taken.sum()))
    _check_room(lost)
    return lost


def _check_room(curve: Curve) -> None:
    """Deadwood may not take more than there is, over its band or below it."""
    c = curve.coefficients
    width = np.diff(curve.levels)
    turning = np.divide(-c[:, 2], 3.0 * c[:, 3], out=np.zeros_like(width), where=c[:, 3] > 0.0)
    inside = np.clip(turning, 0.0, width)
    areas = [c[:, 1] + t * (2.0 * c[:, 2] + 3.0 * c[:, 3] * t) for t in (np.zeros_like(width), width, inside)]
    least = np.min(areas, axis=0)
    wrong = least < -ROOM * np.max(areas)
    if wrong.any() or c[0, 0] < 0.0:
        at = int(np.argmax(wrong))
        raise DefinitionError(
            f"deadwood takes more room than the vessel has at {curve.levels[at]:.6g} m", field="deadwood"
        )
