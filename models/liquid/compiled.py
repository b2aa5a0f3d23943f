"""A stack of liquids of every kind: one call a kind, whatever the number of vessels and readings."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np

from models.arrays import FloatArray, IntArray
from models.liquid import definition
from models.liquid.definition import Liquid
from models.liquid.expansivity import expansivity, log_volume_ratio
from models.liquid.state import Conditions, LiquidState, Row


class LiquidMethod(Protocol):
    """One kind of liquid, as columns of its own parameters."""

    def state(
        self, density: FloatArray, sample: Conditions, here: Conditions, standard: Conditions, row: Row
    ) -> LiquidState:
        """Densities that follow from a sample. [SI]"""

    def own_density(self, temperature: FloatArray, pressure: FloatArray, row: Row) -> FloatArray:
        """Density by the method alone; NaN where it needs a sample. [kg/m³]"""

    def why_outside(self, density: float, sample: tuple[float, float], here: tuple[float, float], row: int) -> str:
        """Which limit was passed, in one sentence."""


@dataclass(frozen=True)
class _Expansivity:
    """β and κ; the sample's density is carried by their integral."""

    coefficients: tuple[FloatArray, ...]
    origin: FloatArray
    compressibility: FloatArray

    @classmethod
    def of(cls, liquids: Sequence[definition.ExpansivityLiquid]) -> _Expansivity:
        width = max(len(one.coefficients) for one in liquids)
        return cls(
            tuple(np.array([(*one.coefficients, *[0.0] * width)[j] for one in liquids]) for j in range(width)),
            np.array([one.origin for one in liquids]),
            np.array([one.compressibility for one in liquids]),
        )

    def state(
        self, density: FloatArray, sample: Conditions, here: Conditions, standard: Conditions, row: Row
    ) -> LiquidState:
        rows = np.atleast_1d(np.asarray(row))
        series, origin, kappa = [b[rows] for b in self.coefficients], self.origin[rows], self.compressibility[rows]
        from_sample = log_volume_ratio(
            here.temperature, here.pressure, temperature_ref=sample.temperature, pressure_ref=sample.pressure,
            coefficients=series, origin=origin, compressibility=kappa,
        )  # fmt: skip
        to_standard = log_volume_ratio(
            sample.temperature, sample.pressure, temperature_ref=standard.temperature,
            pressure_ref=standard.pressure, coefficients=series, origin=origin, compressibility=kappa,
        )  # fmt: skip
        sample_beta = expansivity(sample.temperature, coefficients=series, origin=origin)
        thermal = from_sample + kappa * (here.pressure - sample.pressure)
        one = np.ones(1)
        return LiquidState(
            np.asarray(density * np.exp(-from_sample)), np.asarray(density * np.exp(to_standard)),
            expansivity(here.temperature, coefficients=series, origin=origin), kappa,
            one, sample_beta, one, sample_beta, np.asarray(-thermal),
        )  # fmt: skip

    def own_density(self, temperature: FloatArray, pressure: FloatArray, row: Row) -> FloatArray:
        return np.full(np.broadcast(temperature, pressure).shape, np.nan)

    def why_outside(self, density: float, sample: tuple[float, float], here: tuple[float, float], row: int) -> str:
        return "the density at this state is beyond every number"


METHODS = {
    definition.ExpansivityLiquid: _Expansivity.of,
}
"""How a kind of liquid is compiled."""


@dataclass(frozen=True)
class LiquidColumns:
    """Liquids of every kind, each a row.

    Parameters
    ----------
    kind : IntArray, shape (n,)
        Which of ``methods`` each liquid takes. [1]
    own_row : IntArray, shape (n,)
        Its row in that method's stack. [1]
    methods : tuple of LiquidMethod
        One stack a kind. [1]
    """

    kind: IntArray
    own_row: IntArray
    methods: tuple[LiquidMethod, ...]

    @classmethod
    def from_liquids(cls, liquids: Sequence[Liquid]) -> LiquidColumns:
        """Compile liquids to columns.

        Parameters
        ----------
        liquids : sequence of Liquid
            The liquids. [1]

        Returns
        -------
        LiquidColumns
            One row a liquid. [1]
        """
        kinds = list(dict.fromkeys(type(one) for one in liquids))
        kind = np.array([kinds.index(type(one)) for one in liquids], dtype=np.intp)
        own_row = np.zeros(len(liquids), dtype=np.intp)
        for number in range(len(kinds)):
            own_row[kind == number] = np.arange(np.count_nonzero(kind == number))
        methods = tuple(METHODS[which]([one for one in liquids if type(one) is which]) for which in kinds)
        return cls(kind, own_row, methods)

    def state(
        self, density: FloatArray, sample: Conditions, here: Conditions, standard: Conditions, row: IntArray
    ) -> LiquidState:
        """Densities that follow from a sample, of liquids of one kind.

        Parameters
        ----------
        density : FloatArray, shape (n,) or (1,)
            Density of the sample. [kg/m³]
        sample, here, standard : Conditions
            Where it was sampled, where it is, and the standard state. [K, Pa]
        row : IntArray, shape (n,) or (1,)
            Row of each content's liquid; all of one kind. [1]

        Returns
        -------
        LiquidState
            Columns of n rows. [SI]
        """
        return self._method(row).state(density, sample, here, standard, self._own(row))

    def own_density(self, temperature: FloatArray, pressure: FloatArray, row: IntArray) -> FloatArray:
        """Density of liquids of one kind by their method alone.

        Parameters
        ----------
        temperature, pressure : FloatArray, shape (n,) or (1,)
            Temperature and absolute pressure. [K, Pa]
        row : IntArray, shape (n,) or (1,)
            Row of each liquid; all of one kind. [1]

        Returns
        -------
        FloatArray, shape (n,) or (1,)
            Density; NaN outside the method, and of a method that needs a sample. [kg/m³]
        """
        return self._method(row).own_density(temperature, pressure, self._own(row))

    def why_outside(self, density: float, sample: tuple[float, float], here: tuple[float, float], row: int) -> str:
        """Which limit of its method a liquid has passed.

        Parameters
        ----------
        density : float
            Density of the sample. [kg/m³]
        sample, here : tuple of float
            Temperature and absolute pressure where it was sampled, and where it is. [K, Pa]
        row : int
            Row of the liquid. [1]

        Returns
        -------
        str
            One sentence. [1]
        """
        return self.methods[int(self.kind[row])].why_outside(density, sample, here, int(self.own_row[row]))

    def _method(self, row: IntArray) -> LiquidMethod:
        return self.methods[int(self.kind[row[0]])]

    def _own(self, row: IntArray) -> Row:
        own = self.own_row[row]
        return own if len(own) > 1 else int(own[0])
