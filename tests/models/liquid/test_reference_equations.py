"""How far each method departs from the reference equations of CoolProp, of what a temperature changes.

The shares of ``models.liquid.methods`` are standard uncertainties of ln ρ/ρ_s, so each is the root mean square
of the departures of that logarithm, rounded up; every figure is printed with its worst.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import CoolProp
import numpy as np
import pytest

from models.components import component
from models.constants import STANDARD_ATMOSPHERE
from models.instruments import METHOD_DENSITY_SHARE
from models.liquid import ethanol_water, light_hydrocarbon, water
from models.liquid.costald import CostaldColumns
from models.liquid.density_table import DensityTableColumns
from models.liquid.methods import ETHANOL_SHARE, LIGHT_SHARE, MIXTURE_SHARE, TABLE_SHARE, WATER_SHARE

SAMPLED = 288.15
Column = np.ndarray
Density = Callable[[Column], Column]


@dataclass(frozen=True)
class Departure:
    """Departures of ln ρ/ρ_s, relative to it, and of the density itself."""

    way: Column
    density: Column

    @property
    def rms(self) -> float:
        return float(np.sqrt(np.mean(self.way**2)))

    @property
    def worst(self) -> float:
        return float(np.abs(self.way).max())


def departure(own: Density, reference: Density, t: Column, sampled: float = SAMPLED) -> Departure:
    at = np.append(t, sampled)
    ours, theirs = own(at), reference(at)
    away = np.flatnonzero(np.abs(t - sampled) > 3.0)
    way = np.log(theirs[away] / theirs[-1])
    return Departure(np.log(ours[away] / ours[-1]) / way - 1.0, ours / theirs - 1.0)


def together(parts: dict[str, Departure], what: str) -> Departure:
    whole = Departure(
        np.concatenate([part.way for part in parts.values()]), np.concatenate([part.density for part in parts.values()])
    )
    for name, part in (parts | {what: whole}).items():
        density = np.sqrt(np.mean(part.density**2))
        print(f"{name:40} of ln ρ/ρ_s: rms {part.rms:.2e}, worst {part.worst:.2e}; of ρ: rms {density:.2e}")
    return whole


def rounded_up(share: float, rms: float) -> bool:
    return rms <= share <= 1.2 * rms


def saturated(names: str, fractions: tuple[float, ...] = (1.0,)) -> Density:
    state = CoolProp.AbstractState("HEOS", names)
    if len(fractions) > 1:
        state.set_mole_fractions(list(fractions))

    def density(t: Column) -> Column:
        found = []
        for kelvin in t:
            state.update(CoolProp.QT_INPUTS, 0.0, kelvin)
            found.append(state.rhomass())
        return np.array(found)

    return density


def pressed(name: str, pressure: Density) -> Density:
    state = CoolProp.AbstractState("HEOS", name)
    state.specify_phase(CoolProp.iphase_liquid)

    def density(t: Column) -> Column:
        found = []
        for kelvin, pascal in zip(t, pressure(t), strict=True):
            state.update(CoolProp.PT_INPUTS, pascal, kelvin)
            found.append(state.rhomass())
        return np.array(found)

    return density


def as_water_is(t: Column) -> Column:
    """One atmosphere, and above 100 °C as much over the vapour pressure as keeps it a liquid."""
    state, found = CoolProp.AbstractState("HEOS", "Water"), []
    for kelvin in t:
        state.update(CoolProp.QT_INPUTS, 0.0, kelvin)
        found.append(max(STANDARD_ATMOSPHERE, 1.05 * state.p()))
    return np.array(found)


def at(pascal: float) -> Density:
    return lambda t: np.full_like(t, pascal)


def test_water() -> None:
    def own(t: Column) -> Column:
        return np.asarray(water.point(t, as_water_is(t)).density)

    whole = departure(own, pressed("Water", as_water_is), np.linspace(273.16, 423.15, 151))
    print(f"water: rms {whole.rms:.2e}, worst {whole.worst:.2e}")
    assert rounded_up(WATER_SHARE, whole.rms)
    assert whole.worst < 9e-4
    assert np.abs(whole.density).max() < 0.1 * METHOD_DENSITY_SHARE["water"]  # what is left are the impurities


PARAFFINS = {"ethane": "Ethane", "propane": "Propane", "isobutane": "IsoButane", "n-butane": "n-Butane",
             "isopentane": "Isopentane", "n-pentane": "n-Pentane"}  # fmt: skip


def by_density(name: str) -> Departure:
    reference = saturated(name)
    key = light_hydrocarbon.relative_density_60f(reference(np.array([SAMPLED])), SAMPLED, 0.0)

    def own(t: Column) -> Column:
        return np.asarray(light_hydrocarbon.point(key, t, 0.0).density)

    critical = CoolProp.CoolProp.PropsSI("Tcrit", name)
    return departure(own, reference, np.linspace(227.15, min(366.15, 0.95 * critical), 80))


def test_light_hydrocarbons_by_density() -> None:
    whole = together({name: by_density(fluid) for name, fluid in PARAFFINS.items()}, "light hydrocarbons by density")
    assert rounded_up(LIGHT_SHARE, whole.rms)
    assert whole.worst < 0.0136


def test_an_olefin_is_no_light_hydrocarbon_by_density() -> None:
    """GPA TP-27 was made for paraffins: the share says nothing of propylene, which is declared by its composition."""
    found = by_density("Propylene")
    print(f"propylene by density: rms {found.rms:.3f}, worst {found.worst:.3f}")
    assert 0.14 < found.rms < 0.18


NAMES = {"n-butane": "n-Butane", "isobutane": "IsoButane", "n-pentane": "n-Pentane", "n-hexane": "n-Hexane",
         "n-heptane": "n-Heptane", "carbon-dioxide": "CarbonDioxide"}  # fmt: skip
PURE = (
    "propane", "n-butane", "isobutane", "propylene", "n-pentane", "isopentane", "ethane", "ethylene", "methane",
    "nitrogen", "oxygen", "argon", "carbon-dioxide", "benzene", "toluene", "n-hexane", "n-heptane", "ammonia",
)  # fmt: skip
MIXTURES: tuple[dict[str, float], ...] = (
    {"propane": 0.9, "n-butane": 0.1}, {"propane": 0.5, "n-butane": 0.5},
    {"propane": 0.9, "isobutane": 0.07, "ethane": 0.03}, {"n-butane": 0.6, "isobutane": 0.4},
    {"propane": 0.95, "ethane": 0.05}, {"propane": 0.8, "propylene": 0.2},
)  # fmt: skip


def by_composition(parts: dict[str, float]) -> Departure:
    """From 15 °C, or from the middle of the range of a liquid that is none there."""
    columns = CostaldColumns.from_compositions([[(component(name), x) for name, x in parts.items()]])
    names = "&".join(NAMES.get(name, name.capitalize()) for name in parts)
    low, high = float(columns.lowest[0]), float(columns.highest[0])
    sampled = SAMPLED if high > SAMPLED + 10.0 else 0.5 * (low + high)
    if sampled == SAMPLED:
        low, high = max(low, 200.15), min(high, 340.15)

    def own(t: Column) -> Column:
        return np.asarray(columns.saturated(t).density)

    t = np.linspace(low, high, 60 if len(parts) == 1 else 25)
    return departure(own, saturated(names, tuple(parts.values())), t, sampled)


def test_mixtures_by_composition() -> None:
    compositions = [*({name: 1.0} for name in PURE), *MIXTURES]
    found = {" ".join(f"{x:g} {name}" for name, x in one.items()): by_composition(one) for one in compositions}
    whole = together(found, "by composition")
    assert rounded_up(MIXTURE_SHARE, whole.rms)
    assert whole.worst < 0.071
    assert np.abs(whole.density).max() < 0.014
    for parts, one in zip(compositions, found.values(), strict=True):  # what counts where no sample is read
        limit = CostaldColumns.from_compositions([[(component(name), x) for name, x in parts.items()]]).departure[0]
        assert np.abs(one.density).max() < 1.02 * limit, parts


TABULATED = {"Water": (10, 90), "Toluene": (-20, 100), "n-Heptane": (-20, 90), "Methanol": (-20, 60),
             "Ethanol": (-20, 70), "Acetone": (-20, 50), "Propane": (-20, 50), "Ammonia": (-20, 50)}  # fmt: skip


def by_table(name: str, first: int, last: int) -> Departure:
    """Rows of 10 K, as a laboratory prints them: to 0.1 kg/m³."""
    pressure = 2.5e6  # a liquid for all of them
    reference = pressed(name, at(pressure))
    rows = 273.15 + np.arange(first, last + 1, 10)
    table = np.column_stack([rows, np.round(reference(rows), 1)])
    columns = DensityTableColumns.from_tables([(table, 0.0, pressure)])

    def own(t: Column) -> Column:
        return np.asarray(columns.point(t, pressure, 0).density)

    return departure(own, reference, np.linspace(rows[0], rows[-1], 180))


def test_density_tables() -> None:
    whole = together({name: by_table(name, *span) for name, span in TABULATED.items()}, "density tables")
    assert rounded_up(TABLE_SHARE, whole.rms)
    assert whole.worst < 0.056


@pytest.mark.parametrize(("name", "strength", "coldest"), [("Ethanol", 1.0, 253.15), ("Water", 0.0, 273.16)])
def test_both_ends_of_ethanol_and_water(name: str, strength: float, coldest: float) -> None:
    def own(t: Column) -> Column:
        return np.asarray(ethanol_water.point(strength, t, STANDARD_ATMOSPHERE).density)

    found = departure(own, pressed(name, at(STANDARD_ATMOSPHERE)), np.linspace(coldest, 313.15, 61))
    print(f"{name}: rms {found.rms:.2e}, worst {found.worst:.2e}")
    assert rounded_up(ETHANOL_SHARE, found.rms)
    assert found.worst < 1.5e-3
    assert np.abs(found.density).max() < 3e-4
