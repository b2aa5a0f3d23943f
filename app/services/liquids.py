"""The liquid of a substance: its method, its own density figure, and densities taken from state to state."""

from __future__ import annotations

import math
from functools import lru_cache

import numpy as np

from app.schemas import liquid as wire
from app.schemas.site import Conditions as Site
from app.services.compositions import Boiling, boiling_pressure, fractions_of
from models import constants, instruments, units
from models.errors import DefinitionError
from models.liquid import definition
from models.liquid.compiled import LiquidColumns
from models.liquid.costald import CostaldColumns
from models.liquid.definition import Liquid
from models.liquid.ethanol_water import density_of_strength
from models.liquid.state import Conditions, LiquidState

State = tuple[float, float]  # temperature and absolute pressure [K, Pa]
SATURATED = (definition.MixtureLiquid, definition.LightHydrocarbonLiquid)
"""Methods that start from the saturated liquid: a pressure below that of equilibrium counts as it."""

USUAL_C = 15.0  # °C, at which densities are stated where nothing else is said: common practice
STRENGTH_C = 20.0  # °C, at which a strength by volume is stated: OIML R 22


def base_state(site: Site) -> State:
    """Base temperature and pressure of a site. [K, Pa]"""
    return float(units.kelvin(site.base_temperature_c)), float(units.pascal(site.base_pressure_kpa_abs))


def liquid_of(body: wire.Liquid, site: Site) -> Liquid:
    """The method that a body asks for."""
    match body:
        case wire.ExpansivityLiquid():
            given = body.expansivity_per_k
            coefficients = (float(given),) if isinstance(given, float | int) else tuple(given)
            kappa = body.compressibility_per_kpa / units.PASCAL_PER_KPA
            return definition.ExpansivityLiquid(coefficients, float(units.kelvin(body.at_temperature_c)), kappa)
        case wire.PetroleumLiquid():
            return definition.PetroleumLiquid(body.commodity, body.alpha60_per_f)
        case wire.LightHydrocarbonLiquid(components=None):
            return definition.LightHydrocarbonLiquid()
        case wire.LightHydrocarbonLiquid():
            assert body.components is not None
            return definition.MixtureLiquid(fractions_of(body.components))
        case wire.EthanolWaterLiquid():
            return definition.EthanolWaterLiquid()
        case wire.WaterLiquid():
            return definition.WaterLiquid()
        case wire.DensityTableLiquid():
            rows = tuple((float(units.kelvin(t)), density) for t, density in body.rows)
            given_at = body.at_pressure_kpa_abs
            pressure = base_state(site)[1] if given_at is None else given_at * units.PASCAL_PER_KPA
            return definition.TableLiquid(rows, body.compressibility_per_kpa / units.PASCAL_PER_KPA, pressure)


def standard_pressure(
    liquid: Liquid | None, site: Site, boiling: Boiling | None, temperature: float | None = None
) -> float:
    """Pressure of the standard state: the base pressure or, where higher, that of equilibrium. [Pa]

    ``temperature`` is that of another base than the site's. [K] A method that starts from the saturated liquid
    finds the equilibrium itself and takes the base pressure.
    """
    own, pressure = base_state(site)
    at = own if temperature is None else temperature
    return pressure if isinstance(liquid, SATURATED) else max(pressure, boiling_pressure(boiling, at))


def reference(body: wire.Liquid, liquid: Liquid, site: Site, boiling: Boiling | None) -> tuple[float, ...]:
    """The substance's own density, its temperature and pressure, and its standard uncertainty. [kg/m³, K, Pa]"""
    at = _stated_at(body, liquid, site, boiling)
    density = _stated_density(body)
    if density is None:
        density = own_density(liquid, at)
        share = _own_share(body, liquid)
    else:
        share = instruments.DENSITY_SHARE
        datum = standard_pressure(liquid, site, boiling)
        if not _known(liquid, density, at, datum):
            field = _to_blame(liquid, density, at, datum)
            raise DefinitionError(why_outside(liquid, density, at, at), field=f"liquid/{field}")
    given = body.density_uncertainty_kg_m3
    return density, *at, share * density if given is None else given


def _own_share(body: wire.Liquid, liquid: Liquid) -> float:
    """Standard uncertainty of a density that a method gives of its own; of a composition its limit over √3. [1]"""
    if isinstance(liquid, definition.MixtureLiquid):
        return float(CostaldColumns.from_compositions([liquid.components]).departure[0]) / math.sqrt(3.0)
    return instruments.METHOD_DENSITY_SHARE[body.model]


def _to_blame(liquid: Liquid, density: float, at: State, datum: float) -> str:
    """Which field of a stated density takes it outside its method: the first that would help if it were usual."""
    usual = {"at_pressure_kpa_abs": (at[0], datum), "at_temperature_c": (constants.ZERO_CELSIUS + USUAL_C, datum)}
    helps = (name for name, there in usual.items() if _known(liquid, density, there, datum))
    return next(helps, "density_kg_m3")


def _known(liquid: Liquid, density: float, at: State, datum: float) -> bool:
    return math.isfinite(density_between(liquid, density, at, at, datum))


def _stated_at(body: wire.Liquid, liquid: Liquid, site: Site, boiling: Boiling | None) -> State:
    """Temperature and pressure of the substance's own density, as stated or as they are meant. [K, Pa]"""
    temperature, base = base_state(site)
    match body:
        case wire.DensityTableLiquid():
            assert isinstance(liquid, definition.TableLiquid)
            return min(max(temperature, liquid.rows[0][0]), liquid.rows[-1][0]), liquid.pressure
        case wire.EthanolWaterLiquid():
            stated = body.at_temperature_c if body.alcohol_volume_pct is None else STRENGTH_C
            return float(units.kelvin(stated)), constants.STANDARD_ATMOSPHERE
        case wire.WaterLiquid():
            return temperature, standard_pressure(liquid, site, boiling)
        case wire.LightHydrocarbonLiquid(density_kg_m3=None):
            return temperature, standard_pressure(liquid, site, boiling)
        case _:
            temperature = float(units.kelvin(body.at_temperature_c))
            if body.at_pressure_kpa_abs is not None:
                return temperature, body.at_pressure_kpa_abs * units.PASCAL_PER_KPA
            if isinstance(liquid, SATURATED):
                return temperature, base
            return temperature, max(base, boiling_pressure(boiling, temperature))


def _stated_density(body: wire.Liquid) -> float | None:
    """The density that a body gives, as such or as a strength. [kg/m³]"""
    if isinstance(body, wire.EthanolWaterLiquid) and body.alcohol_volume_pct is not None:
        return density_of_strength(body.alcohol_volume_pct / 100.0)
    return getattr(body, "density_kg_m3", None)


def own_density(liquid: Liquid, at: State) -> float:
    """Density of a liquid whose method needs no sample; refused where the method does not reach. [kg/m³]"""
    columns, row = liquid_columns((liquid,)), np.zeros(1, dtype=np.intp)
    found = float(columns.own_density(np.array([at[0]]), np.array([at[1]]), row)[0])
    if not math.isfinite(found):
        raise DefinitionError(why_outside(liquid, math.nan, at, at), field="liquid")
    return found


def why_outside(liquid: Liquid, density: float, sample: State, here: State) -> str:
    """Which limit of the liquid's method was passed, in one sentence."""
    return liquid_columns((liquid,)).why_outside(density, sample, here, 0)


def density_between(liquid: Liquid, density: float, sample: State, here: State, standard_pressure: float) -> float:
    """A density that was read at one state, at another. [kg/m³]"""
    found = state_of(liquid, density, sample, here, (sample[0], standard_pressure), standard_pressure)
    return float(found.density[0])


@lru_cache(maxsize=256)
def liquid_columns(liquids: tuple[Liquid, ...]) -> LiquidColumns:
    """Columns of some liquids; the same liquids are compiled once."""
    try:
        return LiquidColumns.from_liquids(liquids)
    except DefinitionError as refused:
        place = f"liquid/{refused.field}" if refused.field else "liquid"
        raise DefinitionError(refused.detail, field=place, index=refused.index) from None


def state_of(
    liquid: Liquid, density: float, sample: State, here: State, standard: State,
    atmosphere: float = constants.STANDARD_ATMOSPHERE,
) -> LiquidState:  # fmt: skip
    """Everything that follows from one sample: arrays of one value. [SI]"""

    def conditions(at: State, datum: float) -> Conditions:
        return Conditions(np.array([at[0]]), np.array([at[1]]), np.array([datum]))

    return liquid_columns((liquid,)).state(
        np.array([density]), conditions(sample, standard[1]), conditions(here, atmosphere),
        conditions(standard, standard[1]), np.zeros(1, dtype=np.intp),
    )  # fmt: skip


def key_of(liquid: Liquid, density: float, sample: State, datum: float) -> float:
    """What a sample says of a content by its liquid's method: its density at 60 °F, a factor beside 1, …"""
    at = Conditions(np.array([sample[0]]), np.array([sample[1]]), np.array([datum]))
    return float(liquid_columns((liquid,)).key(np.array([density]), at, np.zeros(1, dtype=np.intp))[0])
