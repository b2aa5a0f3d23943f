"""Vapour density by the virial equation, for many readings and many mixtures at once."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from models.arrays import ArrayLike, BoolArray, FloatArray, IntArray, as_floats, blocks
from models.constants import GAS_CONSTANT
from models.vapour.compiled import Compiled, Note, compile_mixture, inverse_scale
from models.vapour.definition import VapourMixture
from models.vapour.guard import Trust, Verdict, expanded_uncertainty, judge
from models.vapour.root import vapour_root

__all__ = ["VapourColumns", "VapourMixture", "VapourState"]

Row = IntArray | int
FORM_NOTES = {
    ("density", 3): "Z = 1 + B rho + C rho^2, the vapour root between zero density and the spinodal",
    ("density", 2): "Z = 1 + B rho, the vapour root between zero density and the spinodal",
    ("pressure", 3): "Z = 1 + B' P + C' P^2",
    ("pressure", 2): "Z = 1 + B' P",
}


@dataclass(frozen=True)
class VapourState:
    """Vapours at their pressures and temperatures; each array has the shape of those.

    Parameters
    ----------
    density : FloatArray, shape (...)
        Density; NaN where the verdict is 3 or more. [kg/m3]
    compressibility : FloatArray, shape (...)
        Z. [1]
    psi : FloatArray, shape (...)
        Z times d ln P / d ln rho at constant temperature. [1]
    reduced_density : FloatArray, shape (...)
        Molar density times the critical volume. [1]
    pressure_sensitivity, temperature_sensitivity : FloatArray, shape (...)
        d ln rho / d ln P and d ln rho / d ln T. [1]
    model_uncertainty : FloatArray, shape (...)
        Relative standard uncertainty of the model. [1]
    verdict : int8 array, shape (...)
        A ``guard.Verdict``. [1]
    spinodal_pressure : FloatArray, shape (...)
        Highest pressure that a vapour can have; NaN where there is no limit. [Pa]
    """

    density: FloatArray
    compressibility: FloatArray
    psi: FloatArray
    reduced_density: FloatArray
    pressure_sensitivity: FloatArray
    temperature_sensitivity: FloatArray
    model_uncertainty: FloatArray
    verdict: NDArray[np.int8]
    spinodal_pressure: FloatArray


@dataclass(frozen=True)
class VapourColumns:
    """Compiled mixtures, one row each; spare rows behind them serve temperatures outside their range.

    Parameters
    ----------
    molar_mass : FloatArray, shape (n,)
        Molar mass. [kg/mol]
    second, third : FloatArray, shape (degree + 1, n + spare)
        Polynomials in the scaled inverse temperature, highest power first. [m3/mol, m6/mol2]
    degrees : IntArray, shape (2, n + spare)
        Degree of each. [1]
    middle, half, lowest, highest : FloatArray, shape (n + spare,)
        Scale of the inverse temperature, and the range. [1/K, 1/K, K, K]
    critical_temperature, critical_volume : FloatArray, shape (n + spare,)
        Mole averages. [K, m3/mol]
    by_pressure, terms : IntArray, shape (n + spare,)
        1 for the pressure form; 3 or 2. [1]
    trust : Trust
        Uncertainty and limits of each row. [1]
    spare : IntArray, shape (n + spare,)
        Row to use outside the range, -1 for none. [1]
    notes : tuple of tuple of Note
        The working of each row. [1]
    """

    molar_mass: FloatArray
    second: FloatArray
    third: FloatArray
    degrees: IntArray
    middle: FloatArray
    half: FloatArray
    lowest: FloatArray
    highest: FloatArray
    critical_temperature: FloatArray
    critical_volume: FloatArray
    by_pressure: IntArray
    terms: IntArray
    trust: Trust
    spare: IntArray
    notes: tuple[tuple[Note, ...], ...]

    @classmethod
    def from_mixtures(cls, mixtures: Sequence[VapourMixture]) -> VapourColumns:
        """Compile mixtures to columns.

        Parameters
        ----------
        mixtures : sequence of VapourMixture
            The mixtures. [1]

        Returns
        -------
        VapourColumns
            One row a mixture, in their order. [1]
        """
        compiled = [compile_mixture(mixture) for mixture in mixtures]
        rows = [own for own, *_ in compiled]
        owners = list(mixtures)
        spare = np.full(len(rows) + sum(len(c) - 1 for c in compiled), -1, dtype=np.intp)
        for i, (_, *others) in enumerate(compiled):
            for other in others:
                spare[i] = len(rows)
                rows.append(other)
                owners.append(mixtures[i])
        scales = np.array([inverse_scale(row.lowest, row.highest) for row in rows]).reshape(-1, 2).T
        trust = Trust(*(np.array(column) for column in zip(*(row.trust for row in rows), strict=True)))
        return cls(
            molar_mass=np.array([mixture.molar_mass for mixture in owners]),
            second=_stacked([row.second for row in rows]),
            third=_stacked([row.third for row in rows]),
            degrees=np.array([[len(r.second) - 1 for r in rows], [len(r.third) - 1 for r in rows]]),
            middle=scales[0],
            half=scales[1],
            lowest=np.array([row.lowest for row in rows]),
            highest=np.array([row.highest for row in rows]),
            critical_temperature=_averages(owners, "critical_temperature"),
            critical_volume=_averages(owners, "critical_volume"),
            by_pressure=np.array([mixture.form == "pressure" for mixture in owners], dtype=np.intp),
            terms=np.array([mixture.terms for mixture in owners], dtype=np.intp),
            trust=trust,
            spare=spare,
            notes=_notes(compiled, mixtures),
        )

    def second_and_third(
        self, temperature: ArrayLike, row: Row = 0
    ) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
        """Second and third virial coefficient and their slopes; outside the range they mean nothing.

        Parameters
        ----------
        temperature : array_like, shape (...)
            Temperature. [K]
        row : IntArray or int, shape (...)
            Which mixture. [1]

        Returns
        -------
        tuple of FloatArray, shape (...)
            B, dB/dT, C, dC/dT. [m3/mol, m3/mol/K, m6/mol2, m6/mol2/K]

        Notes
        -----
        With ``x = (1/T - middle)/half`` a polynomial p has ``dp/dT = -p'(x) / (half T^2)``.
        """
        (t,) = as_floats(temperature)
        inverse = 1.0 / t
        x = (inverse - self.middle[row]) / self.half[row]
        by_temperature = -inverse * inverse / self.half[row]
        second, second_slope = _polynomial(self.second, self._first(0, row), row, x)
        third, third_slope = _polynomial(self.third, self._first(1, row), row, x)
        return second, second_slope * by_temperature, third, third_slope * by_temperature

    def _first(self, which: int, row: Row) -> int:
        """First power that any of the rows has."""
        degree = np.max(self.degrees[which][row], initial=0)
        return int(self.second.shape[0] if which == 0 else self.third.shape[0]) - 1 - int(degree)

    def state(self, pressure: ArrayLike, temperature: ArrayLike, row: Row = 0) -> VapourState:
        """Density and its derivatives, with a verdict on each; nothing raises.

        Parameters
        ----------
        pressure : array_like, shape (...)
            Absolute pressure. [Pa]
        temperature : array_like, shape (...)
            Temperature. [K]
        row : IntArray or int, shape (...)
            Which mixture. [1]

        Returns
        -------
        VapourState
            One entry a reading. [1]

        Notes
        -----
        With psi = 1 + 2 B rho + 3 C rho^2 in the density form::

            d ln rho / d ln P = Z / psi                                              (1)
            d ln rho / d ln T = -[Z + T (rho dB/dT + rho^2 dC/dT)] / psi             (2)

        and in the pressure form, p = P/RT::

            Z = 1 + B p + (C - B^2) p^2,   d ln rho / d ln P = [1 - (C - B^2) p^2] / Z    (3)
            d ln rho / d ln T = -1 - (T/Z) dZ/dT at constant P                            (4)

        References
        ----------
        .. [1] J. M. Smith, H. C. Van Ness, M. M. Abbott, "Introduction to Chemical Engineering
           Thermodynamics", 7th ed., McGraw-Hill, 2005, section 3.4.
        """
        p, t = np.broadcast_arrays(*as_floats(pressure, temperature))
        single = np.ndim(row) == 0
        if not single:
            p, t, row = np.broadcast_arrays(p, t, np.asarray(row))
        shape = p.shape
        p, t = p.reshape(-1), t.reshape(-1)
        flat_row = row if single else np.asarray(row).reshape(-1)
        out = [np.empty(len(p)) for _ in range(8)]
        verdict = np.empty(len(p), dtype=np.int8)
        for block in blocks(len(p)):
            own = flat_row if isinstance(flat_row, (int, np.integer)) or single else flat_row[block]
            columns, verdict[block] = self._block(p[block], t[block], own)
            for target, column in zip(out, columns, strict=True):
                target[block] = column
        return VapourState(
            density=out[0].reshape(shape),
            compressibility=out[1].reshape(shape),
            psi=out[2].reshape(shape),
            reduced_density=out[3].reshape(shape),
            pressure_sensitivity=out[4].reshape(shape),
            temperature_sensitivity=out[5].reshape(shape),
            model_uncertainty=out[6].reshape(shape),
            verdict=verdict.reshape(shape),
            spinodal_pressure=out[7].reshape(shape),
        )

    def _block(
        self, p: FloatArray, t: FloatArray, row: Row
    ) -> tuple[tuple[FloatArray, ...], NDArray[np.int8]]:
        """One block: coefficients, root, derivatives, verdict."""
        row, outside = self._serving(t, row)
        outside |= ~((p >= 0.0) & (p < np.inf))
        any_outside = bool(outside.any())
        if any_outside:
            p, t = np.where(outside, 0.0, p), np.where(outside, self.highest[row], t)
        second, second_slope, third, third_slope = self.second_and_third(t, row)
        p_ideal = p / (GAS_CONSTANT * t)
        slopes = (second_slope * t, third_slope * t)
        if np.any(self.by_pressure[row]):
            solved = _by_pressure(second, third, *slopes, p_ideal, self.terms[row])
            if not np.all(self.by_pressure[row]):
                other = _by_density(second, third, *slopes, p_ideal)
                which = self.by_pressure[row] > 0
                solved = tuple(np.where(which, a, b) for a, b in zip(solved, other, strict=True))
        else:
            solved = _by_density(second, third, *slopes, p_ideal)
        density, z, psi, by_p, by_t, no_root, limit = solved
        missing = no_root > 0.0
        reduced = density * self.critical_volume[row]
        reduced_temperature = t / self.critical_temperature[row]
        trust = Trust(*(np.asarray(column)[row] for column in self.trust))
        expanded = expanded_uncertainty(trust, reduced, reduced_temperature, second * density, psi)
        verdict = judge(trust, reduced, reduced_temperature, psi)
        verdict[missing] = Verdict.NO_VAPOUR_ROOT
        verdict[outside] = Verdict.OUTSIDE_RANGE
        refused = verdict >= Verdict.REFUSED
        density = density * self.molar_mass[row]
        columns = [density, z, psi, reduced, by_p, by_t, 0.5 * expanded]
        if refused.any():
            columns[0] = np.where(refused, np.nan, density)
            if any_outside or missing.any():
                unknown = verdict >= Verdict.NO_VAPOUR_ROOT
                columns[1:] = [np.where(unknown, np.nan, column) for column in columns[1:]]
        spinodal = np.where(np.isfinite(limit) & ~outside, limit * GAS_CONSTANT * t, np.nan)
        return (*columns, spinodal), verdict

    def _serving(self, t: FloatArray, row: Row) -> tuple[Row, BoolArray]:
        """The row that serves each reading, and where none does."""
        outside = ~((t >= self.lowest[row]) & (t <= self.highest[row]))
        if not outside.any() or not np.any(self.spare[row] >= 0):
            return row, outside
        serving = np.where(outside & (self.spare[row] >= 0), self.spare[row], row)
        return serving, ~((t >= self.lowest[serving]) & (t <= self.highest[serving]))

    def describe(self, row: int = 0) -> tuple[Note, ...]:
        """How the density of a mixture is computed: one note for each step of the working.

        Parameters
        ----------
        row : int
            Which mixture. [1]

        Returns
        -------
        tuple of Note
            Quantity, symbol, method and reference of each. [1]
        """
        return self.notes[row]


def _polynomial(
    coefficients: FloatArray, first: int, row: Row, x: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Value and slope in x by Horner's rule, from the given power downwards."""
    value = np.zeros_like(x) + coefficients[first][row]
    slope = np.zeros_like(value)
    for power in coefficients[first + 1 :]:
        slope *= x
        slope += value
        value *= x
        value += power[row]
    return value, slope


Solved = tuple[FloatArray, ...]


def _by_density(
    second: FloatArray, third: FloatArray, second_slope: FloatArray, third_slope: FloatArray, p: FloatArray
) -> Solved:
    """Molar density, Z, psi, both sensitivities, no root, limit of P/RT, by the density form.

    The slopes are those by ln T.
    """
    density, missing, limit = vapour_root(second, third, p)
    b, c = second * density, third * density
    c *= density
    z = 1.0 + b + c
    psi = z + b + 2.0 * c
    safe = np.where(missing, 1.0, psi) if missing.any() else psi
    by_t = -(z + density * (second_slope + density * third_slope)) / safe  # eq. 2
    return density, z, psi, z / safe, by_t, missing.astype(np.float64), limit  # eq. 1


def _by_pressure(
    second: FloatArray, third: FloatArray, second_slope: FloatArray, third_slope: FloatArray,
    p: FloatArray, terms: IntArray,
) -> Solved:  # fmt: skip
    """The same by the pressure form; without a root where Z is not positive or falls faster than P rises."""
    b = second * p
    by_third = np.where(terms == 3, (third - second * second) * p * p, 0.0)
    z = 1.0 + b + by_third  # eq. 3
    missing = (z <= 0.0) | (by_third >= 1.0)
    safe = np.where(missing, 1.0, z)
    by_p = (1.0 - by_third) / safe
    b_slope = second_slope * p - b
    by_third_slope = (third_slope - 2.0 * second * second_slope) * p * p - 2.0 * by_third
    by_t = -1.0 - (b_slope + np.where(terms == 3, by_third_slope, 0.0)) / safe  # eq. 4
    psi = safe / np.where(missing, 1.0, by_p)
    return p / safe, z, psi, by_p, by_t, missing.astype(np.float64), np.full_like(p, np.inf)


def _stacked(polynomials: Sequence[FloatArray]) -> FloatArray:
    """Polynomials of rising powers as columns, highest power first."""
    width = max(len(p) for p in polynomials)
    stacked = np.zeros((width, len(polynomials)))
    for i, polynomial in enumerate(polynomials):
        stacked[width - len(polynomial) :, i] = polynomial[::-1]
    return stacked


def _averages(mixtures: Sequence[VapourMixture], name: str) -> FloatArray:
    """Mole average of a constant of each mixture's components."""
    return np.array(
        [sum(y * getattr(c, name) for c, y in zip(m.substances, m.fractions, strict=True)) for m in mixtures]
    )


def _notes(
    compiled: Sequence[tuple[Compiled, ...]], mixtures: Sequence[VapourMixture]
) -> tuple[tuple[Note, ...], ...]:
    """Notes of each mixture: its coefficients, those outside their range, the form."""
    result = []
    for (own, *others), mixture in zip(compiled, mixtures, strict=True):
        form = Note("compressibility factor", "Z", FORM_NOTES[mixture.form, mixture.terms],
                    "Smith, Van Ness, Abbott, 7th ed., 2005, section 3.4")  # fmt: skip
        spare = tuple(
            note._replace(quantity=f"{note.quantity} outside that range")
            for o in others
            for note in o.notes[:2]
        )
        result.append((*own.notes, *spare, form))
    return tuple(result)
