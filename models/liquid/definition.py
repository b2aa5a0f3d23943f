"""Liquids as they are defined: what a method needs to know beside a sample of the content."""

from __future__ import annotations

from dataclasses import dataclass

from models.components import Component
from models.constants import STANDARD_ATMOSPHERE


@dataclass(frozen=True)
class ExpansivityLiquid:
    """A liquid of given β and κ.

    Parameters
    ----------
    coefficients : tuple of float
        b_0, b_1, … of the powers of T − t₀ in β. [1/K, 1/K², …]
    origin : float
        t₀. [K]
    compressibility : float
        κ. [1/Pa]
    """

    coefficients: tuple[float, ...]
    origin: float
    compressibility: float


@dataclass(frozen=True)
class PetroleumLiquid:
    """A crude oil, a refined product, a lubricating oil, or one of a measured α60.

    Parameters
    ----------
    commodity : str
        One of ``models.liquid.petroleum.COMMODITIES``. [1]
    alpha60 : float or None
        Thermal expansion at 60 °F of a special application. [1/°F]
    """

    commodity: str
    alpha60: float | None = None


@dataclass(frozen=True)
class LightHydrocarbonLiquid:
    """A light hydrocarbon known by its density alone."""


@dataclass(frozen=True)
class MixtureLiquid:
    """A liquid known by its composition.

    Parameters
    ----------
    components : tuple of (Component, float)
        Substances and their mole fractions. [1]
    """

    components: tuple[tuple[Component, float], ...]


@dataclass(frozen=True)
class WaterLiquid:
    """Water."""


@dataclass(frozen=True)
class EthanolWaterLiquid:
    """Ethanol and water, whose strength a density tells."""


@dataclass(frozen=True)
class TableLiquid:
    """A liquid by a table of densities.

    Parameters
    ----------
    rows : tuple of (float, float)
        Temperatures and densities. [K, kg/m³]
    compressibility : float
        κ. [1/Pa]
    pressure : float
        Absolute pressure of the table. [Pa]
    """

    rows: tuple[tuple[float, float], ...]
    compressibility: float = 0.0
    pressure: float = STANDARD_ATMOSPHERE


Liquid = (
    ExpansivityLiquid
    | PetroleumLiquid
    | LightHydrocarbonLiquid
    | MixtureLiquid
    | WaterLiquid
    | EthanolWaterLiquid
    | TableLiquid
)
