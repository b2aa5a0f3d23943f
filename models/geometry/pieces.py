"""Piecewise cubics: how the pieces of a capacity curve are made, joined, mirrored and cut."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from models.arrays import ArrayLike, FloatArray
from models.errors import DefinitionError
from models.geometry.curves import Curve


@dataclass(frozen=True)
class Pieces:
    """A volume as a piecewise cubic of a height that starts anywhere.

    Parameters
    ----------
    heights : FloatArray, shape (k,)
        Knots, increasing. [m]
    coefficients : FloatArray, shape (k-1, 4)
        Powers of the distance to the lower knot. [m³, m², m, 1]
    """

    heights: FloatArray
    coefficients: FloatArray

    @property
    def depth(self) -> float:
        """Height from the first knot to the last. [m]"""
        return float(self.heights[-1] - self.heights[0])

    @property
    def total(self) -> float:
        """Volume from the first knot to the last. [m³]"""
        return float(_moved(self.coefficients[-1], self.heights[-1] - self.heights[-2])[0] - self.coefficients[0, 0])


def polynomial(start: float, stop: float, coefficients: Sequence[float]) -> Pieces:
    """One piece between two heights.

    Parameters
    ----------
    start, stop : float
        Heights. [m]
    coefficients : sequence of float
        At most four, lowest power first, of the distance to the start. [m³, m², m, 1]

    Returns
    -------
    Pieces
        The piece. [m, m³]
    """
    row = np.zeros((1, 4))
    row[0, : len(coefficients)] = coefficients
    return Pieces(np.array([start, stop]), row)


def hermite(heights: FloatArray, volumes: FloatArray, areas: FloatArray) -> Pieces:
    """Cubic between each two knots with the volumes and areas given there.

    Parameters
    ----------
    heights, volumes, areas : FloatArray, shape (k,)
        Knots, increasing, with the volume and its derivative. [m, m³, m²]

    Returns
    -------
    Pieces
        k − 1 pieces. [m, m³]

    Notes
    -----
    With w the width of a piece, m = (V_1 − V_0)/w its mean area, and A_0, A_1 the areas at its ends::

        c_2 = (3 m − 2 A_0 − A_1)/w,  c_3 = (A_0 + A_1 − 2 m)/w²        (1)

    References
    ----------
    .. [1] C. de Boor, "A Practical Guide to Splines", Springer, 1978, ch. IV.
    """
    width = np.diff(heights)
    mean = np.diff(volumes) / width
    low, high = areas[:-1], areas[1:]
    second, third = (3.0 * mean - 2.0 * low - high) / width, (low + high - 2.0 * mean) / width**2  # eq. 1
    return Pieces(heights, np.column_stack([volumes[:-1], low, second, third]))


def join(parts: Sequence[Pieces]) -> Pieces:
    """Parts one above the other, each starting at the height and volume at which the last one ends.

    Parameters
    ----------
    parts : sequence of Pieces
        From the lowest to the highest. [m, m³]

    Returns
    -------
    Pieces
        From the first part's first height, with the first part's first volume. [m, m³]
    """
    heights = [parts[0].heights]
    rows = [parts[0].coefficients]
    height = float(parts[0].heights[-1])
    volume = float(parts[0].coefficients[0, 0]) + parts[0].total
    for part in parts[1:]:
        heights.append(part.heights[1:] - part.heights[0] + height)
        row = part.coefficients.copy()
        row[:, 0] += volume - part.coefficients[0, 0]
        rows.append(row)
        height, volume = float(heights[-1][-1]), volume + part.total
    return Pieces(np.concatenate(heights), np.concatenate(rows))


def mirrored(part: Pieces) -> Pieces:
    """The same body upside down.

    Parameters
    ----------
    part : Pieces
        A body, lowest point first. [m, m³]

    Returns
    -------
    Pieces
        Volume from what was its highest point, heights from 0. [m, m³]
    """
    width = np.diff(part.heights)[:, None]
    end = np.stack([_moved(c, w) for c, w in zip(part.coefficients, width[:, 0], strict=True)])
    top = part.coefficients[0, 0] + part.total
    flipped = np.column_stack([top - end[:, 0], end[:, 1], -end[:, 2], end[:, 3]])[::-1]
    return Pieces((part.heights[-1] - part.heights)[::-1], np.ascontiguousarray(flipped))


def cut(curve: Curve, bottom: float, top: float) -> Curve:
    """The part of a curve between two levels; volumes and levels stay what they are.

    Parameters
    ----------
    curve : Curve
        A capacity curve. [m, m³]
    bottom, top : float
        New lowest and highest readable level, inside the old ones. [m]

    Returns
    -------
    Curve
        The same volumes, readable between the two levels only. [m, m³]
    """
    first = int(np.searchsorted(curve.levels, bottom, side="right")) - 1
    last = int(np.searchsorted(curve.levels, top, side="left"))
    first, last = max(first, 0), min(last, len(curve.levels) - 1)
    levels, rows = curve.levels[first : last + 1].copy(), curve.coefficients[first:last].copy()
    if bottom > levels[0]:
        rows[0] = _moved(rows[0], bottom - levels[0])
        levels[0] = bottom
    levels[-1] = min(top, float(levels[-1]))
    return replace(curve, levels=levels, coefficients=rows)


def split(curve: Curve, levels: ArrayLike) -> Curve:
    """The same curve with further knots.

    Parameters
    ----------
    curve : Curve
        A capacity curve. [m, m³]
    levels : array_like, shape (m,)
        Levels that become knots; those outside the curve are passed over. [m]

    Returns
    -------
    Curve
        A curve of the same volumes. [m, m³]
    """
    wanted = np.asarray(levels, dtype=np.float64)
    wanted = wanted[(wanted > curve.bottom) & (wanted < curve.top)]
    knots = np.union1d(curve.levels, wanted)
    piece = np.clip(np.searchsorted(curve.levels, knots[:-1], side="right") - 1, 0, len(curve.coefficients) - 1)
    rows = _moved(curve.coefficients[piece].T, knots[:-1] - curve.levels[piece]).T
    return replace(curve, levels=knots, coefficients=np.ascontiguousarray(rows))


def with_datum(curve: Curve, datum: float) -> Curve:
    """A curve whose level zero lies a given height above the old one.

    Parameters
    ----------
    curve : Curve
        A capacity curve on its own zero. [m, m³]
    datum : float
        Height of the gauge's datum above that zero; negative where it lies below. [m]

    Returns
    -------
    Curve
        Volumes by levels above the datum. What lies below the datum is held at level 0 already, and
        a level below the datum cannot be read. [m, m³]
    """
    if not np.isfinite(datum) or datum >= curve.top:
        raise DefinitionError(
            f"datum_m is {datum:.6g} m; it must lie below the highest level of the vessel, {curve.top:.6g} m",
            field="datum_m",
        )
    above = cut(curve, max(datum, curve.bottom), curve.top) if datum > curve.bottom else curve
    return replace(above, levels=above.levels - datum)


def _moved(cubic: FloatArray, by: float | FloatArray) -> FloatArray:
    """Coefficients of the same cubic, or of each column's, in powers of the distance to a point further up."""
    c0, c1, c2, c3 = cubic
    return np.array(
        [c0 + by * (c1 + by * (c2 + by * c3)), c1 + by * (2.0 * c2 + 3.0 * by * c3), c2 + 3.0 * by * c3, c3]
    )
