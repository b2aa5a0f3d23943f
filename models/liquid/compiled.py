"""A stack of liquids of every kind: one call a kind, whatever the number of vessels and readings."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from models.arrays import FloatArray, IntArray
from models.liquid.definition import Liquid
from models.liquid.methods import METHODS, LiquidMethod
from models.liquid.state import Conditions, LiquidState, Row


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

    def key(self, density: FloatArray, sample: Conditions, row: IntArray) -> FloatArray:
        """What samples say of contents of one kind; see :class:`models.liquid.point.LiquidPoint`.

        Parameters
        ----------
        density : FloatArray, shape (n,) or (1,)
            Density of the sample. [kg/m³]
        sample : Conditions
            Where it was sampled. [K, Pa]
        row : IntArray, shape (n,) or (1,)
            Row of each content's liquid; all of one kind. [1]

        Returns
        -------
        FloatArray, shape (n,) or (1,)
            The key of each content; NaN outside the method. [as the method has it]
        """
        return self._method(row).key(density, sample, self._own(row))

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
