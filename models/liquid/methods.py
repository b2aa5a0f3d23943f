"""Each published method as columns of its own parameters, under one interface."""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any, Protocol

import numpy as np

from models.arrays import FloatArray, IntArray
from models.constants import STANDARD_ATMOSPHERE
from models.liquid import ethanol_water, light_hydrocarbon, light_state, petroleum, petroleum_limits, water
from models.liquid.costald import CostaldColumns
from models.liquid.definition import (
    EthanolWaterLiquid,
    ExpansivityLiquid,
    LightHydrocarbonLiquid,
    MixtureLiquid,
    PetroleumLiquid,
    TableLiquid,
    WaterLiquid,
)
from models.liquid.density_table import DensityTableColumns
from models.liquid.expansivity import expansivity, log_volume_ratio
from models.liquid.point import LiquidPoint
from models.liquid.state import Conditions, LiquidState, Row, state_of

# Share of ln ρ/ρ_s that a method may be off by, one standard uncertainty: the root mean square, rounded up, of its
# departures from the reference equations of CoolProp 8.0.0 on the way from 15 °C, at 3 K from there and beyond.
WATER_SHARE = 3e-4  # 0 to 150 °C, 1 bar or a liquid's pressure: 2.6e-4, at worst 9e-4
MIXTURE_SHARE = 0.021  # -73 to 67 °C, saturated, 18 pure liquids and 6 mixtures: 2.1 %, at worst 7 % (benzene)
LIGHT_SHARE = 0.006  # -46 to 93 °C, saturated, ethane to n-pentane: 0.53 %, at worst 1.3 %; olefins 15 % and more
TABLE_SHARE = 0.006  # 8 liquids in rows of 10 K, rounded to 0.1 kg/m³: 0.57 %, at worst 5.5 % (water at 12 °C)
ETHANOL_SHARE = 1e-3  # -20 to 40 °C, both pure ends, as none is known between them: 9.9e-4, at worst 1.4e-3

At = tuple[float, float]  # temperature and absolute pressure [K, Pa]


class LiquidMethod(Protocol):
    """One kind of liquid, as columns of its own parameters."""

    def state(
        self, density: FloatArray, sample: Conditions, here: Conditions, standard: Conditions, row: Row
    ) -> LiquidState:
        """Densities that follow from samples.

        Parameters
        ----------
        density : FloatArray, shape (n,) or (1,)
            Density of the sample. [kg/m³]
        sample, here, standard : Conditions
            Where it was sampled, where it is, and the standard state. [K, Pa]
        row : IntArray, shape (n,), or int
            Row of each content's liquid in this stack. [1]

        Returns
        -------
        LiquidState
            Columns of n rows; NaN outside the method. [SI]
        """

    def key(self, density: FloatArray, sample: Conditions, row: Row) -> FloatArray:
        """What samples say of their contents.

        Parameters
        ----------
        density : FloatArray, shape (n,) or (1,)
            Density of the sample. [kg/m³]
        sample : Conditions
            Where it was sampled. [K, Pa]
        row : IntArray, shape (n,), or int
            Row of each content's liquid in this stack. [1]

        Returns
        -------
        FloatArray, shape (n,) or (1,)
            The key of each content. [as the method has it]
        """

    def own_density(self, temperature: FloatArray, pressure: FloatArray, row: Row) -> FloatArray:
        """Density by the method alone.

        Parameters
        ----------
        temperature, pressure : FloatArray, shape (n,) or (1,)
            Temperature and absolute pressure. [K, Pa]
        row : IntArray, shape (n,), or int
            Row of each liquid in this stack. [1]

        Returns
        -------
        FloatArray, shape (n,) or (1,)
            Density; NaN where the method needs a sample, or does not reach. [kg/m³]
        """

    def why_outside(self, density: float, sample: At, here: At, row: int) -> str:
        """Which limit was passed.

        Parameters
        ----------
        density : float
            Density of the sample. [kg/m³]
        sample, here : tuple of float
            Temperature and absolute pressure where it was sampled, and where it is. [K, Pa]
        row : int
            Row of the liquid in this stack. [1]

        Returns
        -------
        str
            One sentence; nothing where no limit was passed. [1]
        """


@dataclass(frozen=True)
class _ByExpansivity:
    """β and κ; the sample's density is carried by their integral."""

    coefficients: tuple[FloatArray, ...]
    origin: FloatArray
    compressibility: FloatArray

    @classmethod
    def of(cls, liquids: Sequence[ExpansivityLiquid]) -> _ByExpansivity:
        """Compile liquids; shorter polynomials are padded with zeros. [1]"""
        width = max(len(one.coefficients) for one in liquids)
        return cls(
            tuple(np.array([(*one.coefficients, *[0.0] * width)[j] for one in liquids]) for j in range(width)),
            np.array([one.origin for one in liquids]),
            np.array([one.compressibility for one in liquids]),
        )

    def state(
        self, density: FloatArray, sample: Conditions, here: Conditions, standard: Conditions, row: Row
    ) -> LiquidState:
        """Densities that follow from a sample; the method's error is one of β, so its unit is all of ∫β dT. [SI]"""
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

    def key(self, density: FloatArray, sample: Conditions, row: Row) -> FloatArray:
        """The sample's own density: β and κ carry it as it is. [kg/m³]"""
        return density

    def own_density(self, temperature: FloatArray, pressure: FloatArray, row: Row) -> FloatArray:
        """None: β and κ say nothing of the density itself. [kg/m³]"""
        return np.full(np.broadcast(temperature, pressure).shape, np.nan)

    def why_outside(self, density: float, sample: At, here: At, row: int) -> str:
        """What made a number that is none."""
        return "β and κ take the density at this state beyond every number: correct expansivity_per_k"


class _Keyed(ABC):
    """What the methods that have a key do alike."""

    @abstractmethod
    def key(self, density: FloatArray, sample: Conditions, row: Row) -> FloatArray:
        """What the sample says of the content. [as the method has it]"""

    @abstractmethod
    def point(self, key: FloatArray, conditions: Conditions, row: Row) -> LiquidPoint:
        """Density and slopes at a state. [SI]"""

    @abstractmethod
    def error(self, here: Conditions, sample: Conditions, ratio: FloatArray, row: Row) -> FloatArray:
        """Relative change of the density for one standard uncertainty of the method. [1]"""

    def state(
        self, density: FloatArray, sample: Conditions, here: Conditions, standard: Conditions, row: Row
    ) -> LiquidState:
        """Densities that follow from a sample. [SI]"""
        return state_of(self, density, sample, here, standard, row)

    def own_density(self, temperature: FloatArray, pressure: FloatArray, row: Row) -> FloatArray:
        """None: this method needs a sample. [kg/m³]"""
        return np.full(np.broadcast(temperature, pressure).shape, np.nan)


class _OwnDensity(_Keyed):
    """A liquid whose density is a function of its state; a sample's departure from it is kept as a factor."""

    share: float

    @abstractmethod
    def own_point(self, temperature: FloatArray, pressure: FloatArray, row: Row) -> LiquidPoint:
        """Density and slopes by the method alone. [SI]"""

    def key(self, density: FloatArray, sample: Conditions, row: Row) -> FloatArray:
        """Density of the sample over that of the method. [1]"""
        return np.asarray(density / self.own_point(sample.temperature, sample.pressure, row).density)

    def point(self, key: FloatArray, conditions: Conditions, row: Row) -> LiquidPoint:
        """The method's density times the key. [SI]"""
        found = self.own_point(conditions.temperature, conditions.pressure, row)
        return LiquidPoint(np.asarray(key * found.density), found.expansivity, found.compressibility, found.by_key)

    def error(self, here: Conditions, sample: Conditions, ratio: FloatArray, row: Row) -> FloatArray:
        """A share of the way from the sample to the vessel. [1]"""
        return np.asarray(self.share * ratio)

    def own_density(self, temperature: FloatArray, pressure: FloatArray, row: Row) -> FloatArray:
        """Density by the method alone. [kg/m³]"""
        return self.own_point(temperature, pressure, row).density


class _ByWater(_OwnDensity):
    """Water; every row is the same."""

    share = WATER_SHARE

    def own_point(self, temperature: FloatArray, pressure: FloatArray, row: Row) -> LiquidPoint:
        """Water of any row. [SI]"""
        return water.point(temperature, pressure)

    def why_outside(self, density: float, sample: At, here: At, row: int) -> str:
        """Which limit was passed."""
        return water.why_outside(*here) or water.why_outside(*sample)


@dataclass(frozen=True)
class _ByTable(_OwnDensity):
    """Density tables."""

    tables: DensityTableColumns
    share = TABLE_SHARE

    def own_point(self, temperature: FloatArray, pressure: FloatArray, row: Row) -> LiquidPoint:
        """The table's density. [SI]"""
        return self.tables.point(temperature, pressure, row)

    def why_outside(self, density: float, sample: At, here: At, row: int) -> str:
        """Which limit was passed."""
        return self.tables.why_outside(*here, row) or self.tables.why_outside(*sample, row)


@dataclass(frozen=True)
class _ByComposition(_OwnDensity):
    """Mixtures by their composition."""

    mixtures: CostaldColumns
    share = MIXTURE_SHARE

    def own_point(self, temperature: FloatArray, pressure: FloatArray, row: Row) -> LiquidPoint:
        """The mixture's density. [SI]"""
        return self.mixtures.point(temperature, pressure, row)

    def why_outside(self, density: float, sample: At, here: At, row: int) -> str:
        """Which limit was passed."""
        return self.mixtures.why_outside(row, here[0]) or self.mixtures.why_outside(row, sample[0])


class _ByLightDensity(_Keyed):
    """Light hydrocarbons by their density; the key is the relative density at 60 °F."""

    def key(self, density: FloatArray, sample: Conditions, row: Row) -> FloatArray:
        """Relative density at 60 °F. [1]"""
        return light_state.key_at(density, sample.temperature, sample.pressure)

    def point(self, key: FloatArray, conditions: Conditions, row: Row) -> LiquidPoint:
        """Density and slopes at a state. [SI]"""
        return light_state.point_at(key, conditions.temperature, conditions.pressure)

    def error(self, here: Conditions, sample: Conditions, ratio: FloatArray, row: Row) -> FloatArray:
        """A share of the way from the sample to the vessel. [1]"""
        return np.asarray(LIGHT_SHARE * ratio)

    def why_outside(self, density: float, sample: At, here: At, row: int) -> str:
        """Which limit was passed: by the sample, or by the content that it tells of."""
        why = light_hydrocarbon.why_outside(None, density, sample[0])
        key = float(light_state.key_at(density, *sample))
        return why or light_hydrocarbon.why_outside(key, density, here[0], float(light_state.excess(key, *here)))


@dataclass(frozen=True)
class _ByPetroleum(_Keyed):
    """Petroleum by commodity; the key is the density at 60 °F."""

    commodity: IntArray
    alpha60: FloatArray

    @classmethod
    def of(cls, liquids: Sequence[PetroleumLiquid]) -> _ByPetroleum:
        """Compile liquids. [1]"""
        return cls(
            np.array([petroleum.COMMODITIES[one.commodity] for one in liquids], dtype=np.intp),
            np.array([np.nan if one.alpha60 is None else one.alpha60 for one in liquids]),
        )

    def key(self, density: FloatArray, sample: Conditions, row: Row) -> FloatArray:
        """Density at 60 °F. [kg/m³]"""
        return petroleum.density_60f(
            density, sample.temperature, sample.gauge, self.commodity[row], self.alpha60[row]
        )

    def point(self, key: FloatArray, conditions: Conditions, row: Row) -> LiquidPoint:
        """Density and slopes at a state. [SI]"""
        return petroleum.point(key, conditions.temperature, conditions.gauge, self.commodity[row], self.alpha60[row])

    def error(self, here: Conditions, sample: Conditions, ratio: FloatArray, row: Row) -> FloatArray:
        """One standard uncertainty of C_T, from the sample's temperature to the vessel's. [1]"""
        return np.asarray(petroleum.model_error(sample.temperature) - petroleum.model_error(here.temperature))

    def why_outside(self, density: float, sample: At, here: At, row: int) -> str:
        """Which limit was passed; pressures are told as gauge above one atmosphere."""
        commodity, alpha60 = int(self.commodity[row]), float(self.alpha60[row])
        gauges = [max(0.0, pressure - STANDARD_ATMOSPHERE) for _, pressure in (sample, here)]
        why = petroleum_limits.why_outside(density, sample[0], gauges[0], commodity, alpha60, observed=True)
        key = float(petroleum.density_60f(density, sample[0], gauges[0], commodity, alpha60))
        return why or petroleum_limits.why_outside(key, here[0], gauges[1], commodity, alpha60)


class _ByStrength(_Keyed):
    """Ethanol and water; the key is the mass fraction of ethanol."""

    def key(self, density: FloatArray, sample: Conditions, row: Row) -> FloatArray:
        """Mass fraction of ethanol. [1]"""
        return ethanol_water.mass_fraction(density, sample.temperature)

    def point(self, key: FloatArray, conditions: Conditions, row: Row) -> LiquidPoint:
        """Density and slopes at a state. [SI]"""
        return ethanol_water.point(key, conditions.temperature, conditions.pressure)

    def error(self, here: Conditions, sample: Conditions, ratio: FloatArray, row: Row) -> FloatArray:
        """A share of the way from the sample to the vessel. [1]"""
        return np.asarray(ETHANOL_SHARE * ratio)

    def why_outside(self, density: float, sample: At, here: At, row: int) -> str:
        """Which limit was passed: by the sample, or by the content that it tells of."""
        strength = float(ethanol_water.mass_fraction(density, sample[0]))
        why = ethanol_water.why_no_mixture(density, sample[0])
        return why or ethanol_water.why_outside(strength, *here) or ethanol_water.why_outside(strength, *sample)


METHODS: dict[type, Callable[[Sequence[Any]], LiquidMethod]] = {
    ExpansivityLiquid: _ByExpansivity.of,
    PetroleumLiquid: _ByPetroleum.of,
    LightHydrocarbonLiquid: lambda liquids: _ByLightDensity(),
    MixtureLiquid: lambda liquids: _ByComposition(
        CostaldColumns.from_compositions([one.components for one in liquids])
    ),
    WaterLiquid: lambda liquids: _ByWater(),
    TableLiquid: lambda liquids: _ByTable(
        DensityTableColumns.from_tables([(one.rows, one.compressibility, one.pressure) for one in liquids])
    ),
    EthanolWaterLiquid: lambda liquids: _ByStrength(),
}
"""How a kind of liquid is compiled."""
