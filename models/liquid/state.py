"""From a sample of the content to its density in the vessel and at the standard state."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, fields
from typing import Protocol

import numpy as np

from models.arrays import FloatArray, IntArray
from models.liquid.point import LiquidPoint

Row = IntArray | int


@dataclass(frozen=True)
class Conditions:
    """Where a liquid is, or was when it was sampled.

    Parameters
    ----------
    temperature, pressure : FloatArray, shape (n,) or (1,)
        Temperature and absolute pressure. [K, Pa]
    atmosphere : FloatArray, shape (n,) or (1,)
        Pressure from which a gauge pressure counts there. [Pa]
    """

    temperature: FloatArray
    pressure: FloatArray
    atmosphere: FloatArray

    @property
    def gauge(self) -> FloatArray:
        """Pressure above that of the atmosphere. [Pa]"""
        return np.asarray(self.pressure - self.atmosphere)

    def take(self, rows: IntArray) -> Conditions:
        """The conditions of given rows; columns of one value for all stay as they are.

        Parameters
        ----------
        rows : IntArray, shape (m,)
            Rows. [1]

        Returns
        -------
        Conditions
            Columns of shape (m,) or (1,). [as above]
        """
        columns = (self.temperature, self.pressure, self.atmosphere)
        return Conditions(*(column[rows] if len(column) > 1 else column for column in columns))


@dataclass(frozen=True)
class LiquidState:
    """Densities that follow from a sample, and what they owe to it; NaN where the method does not reach.

    Parameters
    ----------
    density, density_standard : FloatArray, shape (n,) or (1,)
        Density in the vessel and at the standard state. [kg/m³]
    expansivity, compressibility : FloatArray, shape (n,) or (1,)
        β and κ of the content in the vessel. [1/K, 1/Pa]
    by_sample, by_sample_temperature : FloatArray, shape (n,) or (1,)
        ∂ln ρ/∂ln ρ_s, and ∂ln ρ/∂T_s at a given ρ_s. [1, 1/K]
    standard_by_sample, standard_by_sample_temperature : FloatArray, shape (n,) or (1,)
        The same of the standard density. [1, 1/K]
    method_error : FloatArray, shape (n,) or (1,)
        Relative change of the density, with its sign, for one unit of the method's own unknown error. [1]
    """

    density: FloatArray
    density_standard: FloatArray
    expansivity: FloatArray
    compressibility: FloatArray
    by_sample: FloatArray
    by_sample_temperature: FloatArray
    standard_by_sample: FloatArray
    standard_by_sample_temperature: FloatArray
    method_error: FloatArray


class Keyed(Protocol):
    """A method that tells contents of its kind apart by one number, found from a sample."""

    def key(self, density: FloatArray, sample: Conditions, row: Row) -> FloatArray:
        """What samples say of their contents.

        Parameters
        ----------
        density : FloatArray, shape (n,) or (1,)
            Density of the sample. [kg/m³]
        sample : Conditions
            Where it was sampled. [K, Pa]
        row : IntArray, shape (n,), or int
            Row of each content's liquid. [1]

        Returns
        -------
        FloatArray, shape (n,) or (1,)
            The key of each content. [as the method has it]
        """

    def point(self, key: FloatArray, conditions: Conditions, row: Row) -> LiquidPoint:
        """Density and slopes of contents at a state.

        Parameters
        ----------
        key : FloatArray, shape (n,) or (1,)
            The key of each content. [as the method has it]
        conditions : Conditions
            Where it is. [K, Pa]
        row : IntArray, shape (n,), or int
            Row of each content's liquid. [1]

        Returns
        -------
        LiquidPoint, shape (n,) or (1,)
            Density and slopes. [SI]
        """

    def error(self, here: Conditions, sample: Conditions, ratio: FloatArray, row: Row) -> FloatArray:
        """What the method's own unknown error does.

        Parameters
        ----------
        here, sample : Conditions
            Where the content is, and where it was sampled. [K, Pa]
        ratio : FloatArray, shape (n,) or (1,)
            ln ρ/ρ_s. [1]
        row : IntArray, shape (n,), or int
            Row of each content's liquid. [1]

        Returns
        -------
        FloatArray, shape (n,) or (1,)
            Relative change of the density for one standard uncertainty of the method. [1]
        """


@dataclass(frozen=True)
class _Sampled:
    """What depends on the sample alone, and so changes as rarely as samples do."""

    key: FloatArray
    expansivity: FloatArray
    by_key: FloatArray
    density_standard: FloatArray
    standard_expansivity: FloatArray
    standard_by_key: FloatArray


def state_of(
    method: Keyed, density: FloatArray, sample: Conditions, here: Conditions, standard: Conditions, row: Row
) -> LiquidState:
    """The content's densities by a method that has a key.

    Parameters
    ----------
    method : Keyed
        The method. [1]
    density : FloatArray, shape (n,) or (1,)
        Density of the sample. [kg/m³]
    sample, here, standard : Conditions
        Where it was sampled, where it is, and the standard state. [K, Pa]
    row : IntArray, shape (n,), or int
        Row of each content's liquid in the method's own stack. [1]

    Returns
    -------
    LiquidState
        Columns of n rows. [SI]

    Notes
    -----
    With the key x of the content, which the sample fixes by ρ(x, T_s, P_s) = ρ_s::

        ∂ln ρ/∂ln ρ_s = (∂ln ρ/∂ln x)/(∂ln ρ_s/∂ln x) = D        (1)
        ∂ln ρ/∂T_s = D β(x, T_s, P_s)        (2)

    References
    ----------
    .. [1] Implicit differentiation.
    """
    known = _by_runs(
        lambda d, s, z, r: _sampled(method, d, s, z, r), density, sample, standard, row
    )
    point = method.point(known.key, here, row)
    by_sample = point.by_key / known.by_key  # eq. 1
    standard_by_sample = known.standard_by_key / known.by_key
    with np.errstate(invalid="ignore", divide="ignore"):
        ratio = np.log(point.density / density)
    return LiquidState(
        point.density, known.density_standard, point.expansivity, point.compressibility,
        by_sample, np.asarray(by_sample * known.expansivity),  # eq. 2
        standard_by_sample, np.asarray(standard_by_sample * known.expansivity),
        method.error(here, sample, ratio, row),
    )  # fmt: skip


def _sampled(method: Keyed, density: FloatArray, sample: Conditions, standard: Conditions, row: Row) -> _Sampled:
    key = method.key(density, sample, row)
    there, base = method.point(key, sample, row), method.point(key, standard, row)
    return _Sampled(key, there.expansivity, there.by_key, base.density, base.expansivity, base.by_key)


def _by_runs(
    solve: Callable[[FloatArray, Conditions, Conditions, Row], _Sampled],
    density: FloatArray, sample: Conditions, standard: Conditions, row: Row,
) -> _Sampled:  # fmt: skip
    """Solve once for each run of equal samples: a content is sampled far less often than it is gauged."""
    columns: list[FloatArray | IntArray] = [density, sample.temperature, sample.pressure, sample.atmosphere]
    columns += [standard.temperature, standard.pressure] + ([] if isinstance(row, int) else [row])
    rows = max(len(column) for column in columns)
    changed = np.zeros(rows - 1, dtype=bool)
    for column in columns:
        if len(column) > 1:
            changed |= column[1:] != column[:-1]
    heads = np.concatenate([[0], np.flatnonzero(changed) + 1])
    if len(heads) > rows // 2:
        return solve(density, sample, standard, row)
    first = solve(
        density[heads] if len(density) > 1 else density, sample.take(heads), standard.take(heads),
        row if isinstance(row, int) else row[heads],
    )  # fmt: skip
    lengths = np.diff(np.append(heads, rows))
    found = (np.broadcast_to(getattr(first, item.name), heads.shape) for item in fields(first))
    return _Sampled(*(np.repeat(column, lengths) for column in found))
