"""Capacity curves: level to volume and surface area, and back, for one vessel or a thousand at once.

Every shape becomes the same thing, a piecewise cubic of the level: exact for boxes, spheres, cones,
ellipsoids and linear capacity tables, and a Hermite interpolant on closely spaced knots for the rest.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from models.arrays import BLOCK_ROWS, ArrayLike, BoolArray, FloatArray, IntArray, as_floats, blocks, first_index
from models.errors import DefinitionError, OutsideTable, OutsideVessel, at_index

TABLE = "capacity_table"
INVERSE_STEPS = 64  # bisection alone would end a piece at its last bit
INVERSE_TOLERANCE = 4e-16  # of the piece's width
ROUNDING = 1e-12  # of the capacity: a full vessel stays full after a sum of volumes

_Test = Callable[[IntArray], BoolArray]


@dataclass(frozen=True)
class Curve:
    """Volume of one vessel as a piecewise cubic of the level.

    Parameters
    ----------
    levels : FloatArray, shape (k,)
        Knots, increasing; the first is the lowest readable level, the last the highest. [m]
    coefficients : FloatArray, shape (k-1, 4)
        c_0 … c_3 of each piece, in powers of the distance to its lower knot. [m³, m², m, 1]
    capacity : float
        Volume of the whole vessel, which the highest readable level need not reach. [m³]
    kind : str
        Name of the shape. [1]
    source : str
        How the pieces were found, in one sentence. [1]

    Notes
    -----
    On the piece above knot h_k, with t = h − h_k::

        V(h) = c_0 + c_1 t + c_2 t² + c_3 t³        (1)
        A(h) = dV/dh = c_1 + 2 c_2 t + 3 c_3 t²     (2)

    References
    ----------
    .. [1] C. de Boor, "A Practical Guide to Splines", Springer, 1978, ch. IV.
    """

    levels: FloatArray
    coefficients: FloatArray
    capacity: float
    kind: str
    source: str

    @property
    def bottom(self) -> float:
        """Lowest readable level. [m]"""
        return float(self.levels[0])

    @property
    def top(self) -> float:
        """Highest readable level. [m]"""
        return float(self.levels[-1])

    @property
    def volumes(self) -> FloatArray:
        """Volume at every knot. [m³]"""
        return np.append(self.coefficients[:, 0], self.volume_at_top)

    @property
    def volume_at_top(self) -> float:
        """Volume at the highest readable level. [m³]"""
        return float(_cubic(self.coefficients[-1:], self.levels[-1:] - self.levels[-2:-1])[0][0])


def _cubic(coefficients: FloatArray, t: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Value and slope of cubics, one a row, at t above their lower knots."""
    first = coefficients[:, 1]
    second, third = coefficients[:, 2] * t, coefficients[:, 3] * t
    third *= t
    value = coefficients[:, 0] + t * (first + second + third)  # eq. 1
    return value, first + 2.0 * second + 3.0 * third  # eq. 2


@dataclass(frozen=True)
class Curves:
    """Capacity curves one after another: curve i is row i.

    Parameters
    ----------
    knots : FloatArray, shape (p,)
        Lower knot of every piece of every curve. [m]
    coefficients : FloatArray, shape (p, 4)
        Coefficients of every piece. [m³, m², m, 1]
    widths : FloatArray, shape (p,)
        Width of every piece. [m]
    starts : IntArray, shape (n+1,)
        First piece of each curve, and the number of all pieces. [1]
    bottom, top : FloatArray, shape (n,)
        Lowest and highest readable level. [m]
    capacity : FloatArray, shape (n,)
        Volume of the whole vessel. [m³]
    volume_at_top : FloatArray, shape (n,)
        Volume at the highest readable level. [m³]
    kinds : tuple of str
        Name of each curve's shape. [1]
    """

    knots: FloatArray
    coefficients: FloatArray
    widths: FloatArray
    starts: IntArray
    bottom: FloatArray
    top: FloatArray
    capacity: FloatArray
    volume_at_top: FloatArray
    kinds: tuple[str, ...]

    @classmethod
    def from_curves(cls, curves: Sequence[Curve]) -> Curves:
        """A stack of curves.

        Parameters
        ----------
        curves : sequence of Curve
            At least one curve. [m, m³]

        Returns
        -------
        Curves
            The same curves, as rows in the same order. [m, m³]
        """
        if not curves:
            raise DefinitionError("a stack of capacity curves needs at least one curve")
        pieces = [len(curve.coefficients) for curve in curves]
        return cls(
            knots=np.concatenate([curve.levels[:-1] for curve in curves]),
            coefficients=np.ascontiguousarray(np.concatenate([curve.coefficients for curve in curves])),
            widths=np.concatenate([np.diff(curve.levels) for curve in curves]),
            starts=np.concatenate([[0], np.cumsum(pieces)]).astype(np.intp),
            bottom=np.array([curve.bottom for curve in curves]),
            top=np.array([curve.top for curve in curves]),
            capacity=np.array([curve.capacity for curve in curves]),
            volume_at_top=np.array([curve.volume_at_top for curve in curves]),
            kinds=tuple(curve.kind for curve in curves),
        )

    def inside(self, level: ArrayLike, row: IntArray | int = 0) -> BoolArray:
        """Where a level can be read; a level that is NaN cannot.

        Parameters
        ----------
        level : array_like, shape (...)
            Level above the datum. [m]
        row : IntArray, shape (...), or int
            Curve of each level. [1]

        Returns
        -------
        BoolArray, shape (...)
            True between the lowest and the highest readable level. [1]
        """
        (h,) = as_floats(level)
        return np.asarray((h >= self.bottom[row]) & (h <= self.top[row]))

    def volume(self, level: ArrayLike, row: IntArray | int = 0) -> FloatArray:
        """Volume below a level.

        Parameters
        ----------
        level : array_like, shape (...)
            Level above the datum; NaN stays NaN. [m]
        row : IntArray, shape (...), or int
            Curve of each level. [1]

        Returns
        -------
        FloatArray, shape (...)
            Volume. [m³]
        """
        return self.volume_and_area(level, row)[0]

    def volume_and_area(self, level: ArrayLike, row: IntArray | int = 0) -> tuple[FloatArray, FloatArray]:
        """Volume below a level, and the area of the liquid's surface there.

        Parameters
        ----------
        level : array_like, shape (...)
            Level above the datum; NaN stays NaN. [m]
        row : IntArray, shape (...), or int
            Curve of each level. [1]

        Returns
        -------
        volume, area : FloatArray, shape (...)
            Volume, and its derivative by the level. [m³, m²]
        """
        (h,) = as_floats(level)
        if isinstance(row, np.ndarray) and row.ndim:
            h, row = np.broadcast_arrays(h, row)
        self._refuse_level(h, row)
        volume, area = np.empty(h.size), np.empty(h.size)
        flat, rows = h.reshape(-1), row.reshape(-1) if isinstance(row, np.ndarray) and row.ndim else row
        for block in blocks(h.size, BLOCK_ROWS):
            part = rows[block] if isinstance(rows, np.ndarray) and rows.ndim else rows
            piece = self._last_not_above(self.knots, flat[block], part)
            volume[block], area[block] = _cubic(
                np.take(self.coefficients, piece, axis=0), flat[block] - np.take(self.knots, piece)
            )
        return volume.reshape(h.shape), area.reshape(h.shape)

    def level(self, volume: ArrayLike, row: IntArray | int = 0) -> FloatArray:
        """Level at which a vessel holds a volume; the lowest such level where the curve is flat.

        Parameters
        ----------
        volume : array_like, shape (...)
            Volume; NaN stays NaN. [m³]
        row : IntArray, shape (...), or int
            Curve of each volume. [1]

        Returns
        -------
        FloatArray, shape (...)
            Level above the datum. [m]
        """
        v, rows = np.broadcast_arrays(*as_floats(volume), np.asarray(row))
        shape, v, rows = v.shape, v.reshape(-1), rows.reshape(-1)
        self._refuse_volume(v, rows)
        piece = self._last_below(v, rows)
        c0, c1, c2, c3 = self.coefficients[piece].T
        wanted, width = v - c0, self.widths[piece]
        low, high = np.zeros_like(v), width.copy()
        t = 0.5 * width
        rise = width * (c1 + width * (c2 + width * c3))
        full = wanted >= rise  # on a knot, to the last bit
        done = full | np.isnan(wanted)
        for _ in range(INVERSE_STEPS):
            excess = t * (c1 + t * (c2 + t * c3)) - wanted
            slope = c1 + t * (2.0 * c2 + 3.0 * t * c3)
            low, high = np.where(excess < 0.0, t, low), np.where(excess < 0.0, high, t)
            with np.errstate(divide="ignore", invalid="ignore"):
                newton = t - excess / slope
            new = np.where((newton > low) & (newton < high), newton, 0.5 * (low + high))
            new = np.where(done | (excess == 0.0), t, new)
            done |= np.abs(new - t) <= INVERSE_TOLERANCE * width
            t = new
            if done.all():
                break
        above = np.minimum(piece + 1, len(self.knots) - 1)
        end = np.where(piece + 1 < self.starts[rows + 1], self.knots[above], self.top[rows])
        level = np.where(full, end, np.minimum(self.knots[piece] + t, end))
        level = np.where(v <= self.coefficients[self.starts[rows], 0], self.bottom[rows], level)
        return np.where(np.isnan(v), np.nan, level).reshape(shape)

    def _last_not_above(self, keys: FloatArray, value: FloatArray, row: IntArray | int) -> IntArray:
        """Last piece of each row's curve whose key is not above the value; the first where all are."""
        if not (isinstance(row, np.ndarray) and row.ndim):
            start, stop = int(self.starts[int(row)]), int(self.starts[int(row) + 1])
            found = np.searchsorted(keys[start + 1 : stop], value, side="right")
            return np.asarray(found + start, dtype=np.intp)
        return self._bisect(value, row, lambda piece: keys[piece] <= value)

    def _last_below(self, volume: FloatArray, row: IntArray) -> IntArray:
        """Last piece of each row's curve that starts below the volume: on a flat the one before it."""
        start_volumes = self.coefficients[:, 0]
        return self._bisect(volume, row, lambda piece: start_volumes[piece] < volume)

    def _bisect(self, value: FloatArray, row: IntArray, holds: _Test) -> IntArray:
        """Last piece of each row's curve for which a test holds that holds for a first run of pieces."""
        low, high = self.starts[row], self.starts[row + 1]
        for _ in range(int(np.max(high - low, initial=1)).bit_length()):
            middle = (low + high) >> 1
            up = holds(middle) & (high - low > 1)
            low, high = np.where(up, middle, low), np.where(up, high, np.maximum(middle, low + 1))
        return np.asarray(low, dtype=np.intp)

    def _refuse_level(self, level: FloatArray, row: IntArray | int) -> None:
        outside = (level < self.bottom[row]) | (level > self.top[row])
        at = first_index(np.asarray(outside))
        if at is None:
            return
        which = int(np.broadcast_to(row, level.shape).reshape(-1)[at])
        table = self.kinds[which] == TABLE
        told = "the capacity table runs" if table else f"this {self.kinds[which]} can be read"
        raise (OutsideTable if table else OutsideVessel)(
            f"level is {level.reshape(-1)[at]:.6g} m{at_index(at if level.ndim else None)}; {told} from "
            f"{self.bottom[which]:.6g} to {self.top[which]:.6g} m",
            field="level",
            index=at if level.ndim else None,
        )

    def _refuse_volume(self, volume: FloatArray, row: IntArray) -> None:
        lowest = self.coefficients[self.starts[row], 0]
        most = self.volume_at_top[row] * (1.0 + ROUNDING)
        at = first_index((volume < lowest * (1.0 - ROUNDING)) | (volume > most))
        if at is None:
            return
        table = self.kinds[int(row[at])] == TABLE
        raise (OutsideTable if table else OutsideVessel)(
            f"volume is {volume[at]:.9g} m³{at_index(at)}; a level can be read from {lowest[at]:.9g} to "
            f"{self.volume_at_top[row[at]]:.9g} m³",
            field="volume",
            index=at,
        )
