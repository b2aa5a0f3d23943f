"""Density of a liquid from a table over temperature, for one liquid or a thousand at once.

Every table becomes a piecewise cubic of ln ρ, so that its slope is the expansivity; it is never extrapolated.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from scipy.interpolate import PchipInterpolator

from models.arrays import ArrayLike, BoolArray, FloatArray, IntArray, as_floats, first_index
from models.constants import ZERO_CELSIUS
from models.errors import DefinitionError, at_index
from models.liquid.point import LiquidPoint

Rows = Sequence[tuple[float, float]] | FloatArray
_ROUNDING = 1e-9  # K, what a conversion of units may leave


@dataclass(frozen=True)
class DensityTableColumns:
    """Density tables one after another: table i is row i.

    Parameters
    ----------
    knots : FloatArray, shape (p,)
        Lower temperature of every piece of every table. [K]
    coefficients : FloatArray, shape (p, 4)
        c_0 … c_3 of ln ρ in every piece, in powers of the distance to its knot. [1, 1/K, 1/K², 1/K³]
    starts : IntArray, shape (n+1,)
        First piece of each table, and the number of all pieces. [1]
    lowest, highest : FloatArray, shape (n,)
        First and last temperature of each table. [K]
    compressibility : FloatArray, shape (n,)
        Isothermal compressibility κ of each liquid. [1/Pa]
    pressure : FloatArray, shape (n,)
        Pressure that each table holds at. [Pa]
    """

    knots: FloatArray
    coefficients: FloatArray
    starts: IntArray
    lowest: FloatArray
    highest: FloatArray
    compressibility: FloatArray
    pressure: FloatArray

    @classmethod
    def from_tables(cls, tables: Sequence[tuple[Rows, float, float]]) -> DensityTableColumns:
        """A stack of tables.

        Parameters
        ----------
        tables : sequence of (rows, float, float)
            Rows of (temperature, density), compressibility κ, and the pressure of the rows; at least one
            table of at least two rows. [K, kg/m³, 1/Pa, Pa]

        Returns
        -------
        DensityTableColumns
            The same tables, in the same order. [K, 1/Pa, Pa]

        Raises
        ------
        DefinitionError
            Temperatures that do not rise, a density that is not positive, fewer than two rows.
        """
        if not tables:
            raise DefinitionError("a stack of density tables needs at least one table")
        checked = [_checked(rows) for rows, _, _ in tables]
        for _, kappa, pressure in tables:
            _refuse_state(kappa, pressure)
        pieces = [PchipInterpolator(t, np.log(density)).c.T[:, ::-1] for t, density in checked]
        return cls(
            knots=np.concatenate([t[:-1] for t, _ in checked]),
            coefficients=np.ascontiguousarray(np.concatenate(pieces)),
            starts=np.concatenate([[0], np.cumsum([len(one) for one in pieces])]).astype(np.intp),
            lowest=np.array([t[0] for t, _ in checked]),
            highest=np.array([t[-1] for t, _ in checked]),
            compressibility=np.array([kappa for _, kappa, _ in tables], dtype=np.float64),
            pressure=np.array([pressure for _, _, pressure in tables], dtype=np.float64),
        )

    def point(self, temperature: ArrayLike, pressure: ArrayLike, row: IntArray | int = 0) -> LiquidPoint:
        """The liquids at temperatures and pressures; NaN beyond the rows of a table.

        Parameters
        ----------
        temperature : array_like, shape (...)
            Liquid temperature. [K]
        pressure : array_like, shape (...)
            Pressure. [Pa]
        row : IntArray, shape (...), or int
            Table of each reading. [1]

        Returns
        -------
        LiquidPoint, shape (...)
            Density and slopes; the key is a factor beside 1. [kg/m³, 1/K, 1/Pa, 1]

        Notes
        -----
        On the piece above the row (T_k, ρ_k), with x = T − T_k, and P₀ the pressure of the table::

            ln ρ = c_0 + c_1 x + c_2 x² + c_3 x³ + κ (P − P₀)        (1)
            β = −(c_1 + 2 c_2 x + 3 c_3 x²)                          (2)

        Two rows are joined by a straight line of ln ρ: β is then constant. More rows are joined by the monotone
        cubic of Fritsch and Carlson: between two rows the density never leaves theirs.

        References
        ----------
        .. [1] F. N. Fritsch, R. E. Carlson, "Monotone piecewise cubic interpolation",
           SIAM J. Numer. Anal. 17 (1980) 238–246.
        """
        t, p = as_floats(temperature, pressure)
        if isinstance(row, np.ndarray) and row.ndim:
            t, row = np.broadcast_arrays(t, row)
        piece = self._piece(t, row)
        x = np.where(self._inside(t, row), t, np.nan) - self.knots[piece]
        c0, c1, c2, c3 = np.moveaxis(self.coefficients[piece], -1, 0)
        kappa = self.compressibility[row]
        above = np.where(p >= 0.0, p, np.nan) - self.pressure[row]
        density = np.exp(c0 + x * (c1 + x * (c2 + x * c3)) + kappa * above)  # eq. 1
        beta = -(c1 + x * (2.0 * c2 + x * 3.0 * c3))  # eq. 2
        one = np.where(np.isnan(density), np.nan, 1.0)
        return LiquidPoint(np.asarray(density), np.asarray(beta * one), np.asarray(kappa * one), one)

    def why_outside(self, temperature: float, pressure: float, row: int = 0) -> str:
        """Why a table has no density at a state.

        Parameters
        ----------
        temperature : float
            Liquid temperature. [K]
        pressure : float
            Pressure. [Pa]
        row : int
            Table. [1]

        Returns
        -------
        str
            One sentence, or nothing where the state is inside. [1]
        """
        if not self._inside(np.float64(temperature), row):
            return (
                f"the liquid's temperature is {temperature - ZERO_CELSIUS:.6g} °C; the density table runs from "
                f"{self.lowest[row] - ZERO_CELSIUS:.6g} to {self.highest[row] - ZERO_CELSIUS:.6g} °C and is not "
                "extrapolated: extend it by a measurement"
            )
        if not pressure >= 0.0:
            return f"the liquid's pressure is {pressure / 1e3:.6g} kPa absolute; it cannot be below 0 kPa: correct it"
        return ""

    def _inside(self, t: FloatArray | np.float64, row: IntArray | int) -> BoolArray:
        return np.asarray((t >= self.lowest[row] - _ROUNDING) & (t <= self.highest[row] + _ROUNDING))

    def _piece(self, t: FloatArray, row: IntArray | int) -> IntArray:
        """Last piece of each row's table whose knot is not above the temperature; the first where all are."""
        if not (isinstance(row, np.ndarray) and row.ndim):
            start, stop = int(self.starts[int(row)]), int(self.starts[int(row) + 1])
            return np.asarray(np.searchsorted(self.knots[start + 1 : stop], t, side="right") + start, dtype=np.intp)
        low, high = self.starts[row], self.starts[row + 1]
        for _ in range(int(np.max(high - low, initial=1)).bit_length()):
            middle = (low + high) >> 1
            up = (high - low > 1) & (self.knots[np.minimum(middle, len(self.knots) - 1)] <= t)
            low, high = np.where(up, middle, low), np.where(up, high, np.maximum(middle, low + 1))
        return np.asarray(low, dtype=np.intp)


def _checked(rows: Rows) -> tuple[FloatArray, FloatArray]:
    """Temperatures and densities of a table that can be."""
    (table,) = as_floats(rows)
    if table.ndim != 2 or table.shape[1] != 2 or len(table) < 2:
        raise DefinitionError("a density table has at least two rows of a temperature and a density", field="rows")
    t, density = np.ascontiguousarray(table[:, 0]), np.ascontiguousarray(table[:, 1])
    bad = first_index(~(np.isfinite(t) & (t > 0.0)))
    if bad is not None:
        raise DefinitionError(
            f"a temperature of the density table is {t[bad]:.6g} K{at_index(bad)}; it is above 0 K",
            field="rows",
            index=bad,
        )
    bad = first_index(~(np.isfinite(density) & (density > 0.0)))
    if bad is not None:
        raise DefinitionError(
            f"a density of the table is {density[bad]:.6g} kg/m³{at_index(bad)}; it is above 0 kg/m³",
            field="rows",
            index=bad,
        )
    bad = first_index(np.diff(t) <= 0.0)
    if bad is not None:
        raise DefinitionError(
            f"the temperature of the density table is {t[bad + 1] - ZERO_CELSIUS:.6g} °C{at_index(bad + 1)} after "
            f"{t[bad] - ZERO_CELSIUS:.6g} °C; rows rise in temperature, none twice",
            field="rows",
            index=bad + 1,
        )
    return t, density


def _refuse_state(compressibility: float, pressure: float) -> None:
    if not 0.0 <= compressibility < np.inf:
        raise DefinitionError(
            f"the compressibility of the liquid is {compressibility:.6g} 1/Pa; it is 0 or above",
            field="compressibility",
        )
    if not 0.0 <= pressure < np.inf:
        raise DefinitionError(
            f"the pressure of the density table is {pressure / 1e3:.6g} kPa absolute; it is 0 kPa or above",
            field="pressure",
        )
