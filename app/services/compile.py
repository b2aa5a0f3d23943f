"""Definitions become parameters: one vessel compiled once, many vessels stacked into columns."""

from __future__ import annotations

import hashlib
import json
import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cached_property, lru_cache
from typing import NamedTuple, cast

import numpy as np

from app.schemas.instruments import Assumed
from app.schemas.instruments import Instrument as Declared
from app.schemas.site import Conditions, Site
from app.schemas.substance import Component as WireComponent
from app.schemas.substance import Substance, VirialVapour
from app.schemas.vessel import Vessel
from app.services.find import ALL_TIME
from app.services.shapes import capacity_curve, strain_of
from models import constants, instruments, units
from models.columns import Method, Vessels
from models.components import Component, component, given_component
from models.errors import DefinitionError
from models.geometry.curves import Curve, Curves
from models.liquid.expansivity import log_volume_ratio
from models.liquid.water import water_density
from models.saturation import SaturationColumns
from models.vapour.series import VapourColumns, VapourMixture

Boiling = tuple[tuple[Component, float], ...]  # a liquid as substances and mole fractions
WATER_DENSITY = float(water_density(288.15))  # at 15 °C, whatever the base: a mass does not depend on the base
UNINSULATED_LIQUID_WEIGHT = 7.0 / 8.0  # API MPMS 12.1.1: T_shell = (7 T_liquid + T_ambient)/8
HOUR_US, DAY_US = 3_600_000_000, 86_400_000_000
MAX_AGE_US: dict[str, int | None] = {
    "level_m": HOUR_US, "ullage_m": HOUR_US, "liquid_volume_m3": HOUR_US, "liquid_volume_pct": HOUR_US,
    "differential_pressure_kpa": HOUR_US, "weighed_mass_kg": HOUR_US,
    "pressure_kpa": HOUR_US, "pressure_kpa_abs": HOUR_US,
    "liquid_temperature_c": HOUR_US, "vapour_temperature_c": HOUR_US, "ambient_temperature_c": DAY_US,
    "barometric_pressure_kpa_abs": DAY_US, "free_water_level_m": 7 * DAY_US,
}  # fmt: skip


class InForce(NamedTuple):
    """A definition that a result was computed by; ``effective_from`` None holds for all time before, too."""

    kind: str
    id: str
    effective_from: int | None
    revision: int


@dataclass(frozen=True)
class Instrument:
    """One quantity's errors on one vessel from one source, in the unit of the quantity."""

    name: str
    random: float
    systematic: float
    offset: float
    declared: bool


@dataclass(frozen=True, eq=False)
class CompiledVessel:
    """One vessel's definition in force, ready for the chain."""

    name: str
    definitions: tuple[InForce, ...]
    site: Conditions
    body: Vessel
    substance: Substance
    method: Method
    curve: Curve | None
    capacity: float
    parameters: Mapping[str, float]
    expansivity: tuple[float, ...]
    mixture: VapourMixture | None
    boiling: Boiling | None
    density: tuple[float, float, float]
    density_uncertainty: float
    space: str
    table: bool
    since: int = -ALL_TIME  # µs; nothing about the liquid that was read before counts
    until: int = ALL_TIME  # µs; nor what is read from here on: another substance, or out of service
    history: tuple[tuple[int, Vessel], ...] = ()  # effective_from and body of every text, where there are several

    @cached_property
    def has_liquid(self) -> bool:
        """Whether the vessel has a level and a liquid under it."""
        return bool(self.method & Method.LIQUID)

    @property
    def is_blanketed(self) -> bool:
        """Whether the substance's vapour counts beside a blanket, whose pressure has then to be known."""
        return bool(self.method & Method.BLANKET)

    @cached_property
    def is_full(self) -> bool:
        """Whether it is a line kept full: a liquid without a level."""
        return bool(self.method & Method.FULL)

    @property
    def key_input(self) -> str:
        """The input without which there is no mass, and whose instant is the reading's."""
        if self.is_full:
            return "liquid_temperature"
        return "level" if self.has_liquid else "pressure"

    @cached_property
    def has_vapour(self) -> bool:
        """Whether the substance's vapour counts in this vessel."""
        return bool(self.method & Method.VAPOUR)

    def assumed(self, quantity: str) -> Assumed | None:
        """What the definition gives for a quantity that is not read."""
        return cast("Mapping[str, Assumed]", self.body.assumed).get(quantity)

    def rank(self, source: str) -> int:
        """Place of a source in the vessel's order; those not named come last, all equal without an order."""
        named = [item.source for item in self.body.sources]
        return named.index(source) if source in named else len(named)

    def max_age_us(self, quantity: str) -> int | None:
        """Greatest age of a quantity in microseconds; None where it holds until it is replaced."""
        given = self.body.max_age_s
        if isinstance(given, Mapping):
            if quantity in given:
                seconds = given[quantity]
                return None if seconds is None else int(seconds * 1e6)
        elif given is not None and MAX_AGE_US.get(quantity) is not None:
            return int(given * 1e6)
        return MAX_AGE_US.get(quantity)

    def text_at(self, instant: int | None) -> Vessel:
        """The vessel's text in force when something was read."""
        if instant is None or not self.history:
            return self.body
        held = [body for begins, body in self.history if begins <= instant]
        return held[-1] if held else self.history[0][1]

    def instrument(self, quantity: str, source: str, at: int | None = None) -> Instrument:
        """Errors of a quantity from a source when it was read: the source's own, the vessel's, or the defaults."""
        if self.history:
            return _instrument(self.name, self.text_at(at), quantity, source)
        known = self._instruments.get((quantity, source))
        if known is None:
            known = self._instruments[quantity, source] = _instrument(self.name, self.body, quantity, source)
        return known

    @cached_property
    def _instruments(self) -> dict[tuple[str, str], Instrument]:
        return {}

    @property
    def compressibility(self) -> float:
        """κ of the liquid. [1/Pa]"""
        return _compressibility(self.substance)

    @property
    def density_declared(self) -> bool:
        """Whether the substance says how well its density is known."""
        liquid = self.substance.liquid
        return liquid is not None and liquid.density_uncertainty_kg_m3 is not None

    @property
    def mixed(self) -> bool:
        """Whether the vapour has more than one component."""
        return self.mixture is not None and len(self.mixture.fractions) > 1

    @cached_property
    def table_id(self) -> str:
        """Which table the capacity comes from: a new table has a new error, another text of the vessel not."""
        said = [self.body.shape.model_dump_json(), [list(row) for row in self.body.deadwood], self.body.gauging.datum_m]
        return hashlib.sha256(json.dumps(said).encode()).hexdigest()[:8]


def _instrument(vessel: str, text: Vessel, quantity: str, source: str) -> Instrument:
    default = instruments.DEFAULTS.get(quantity)
    random = default.random if default else 0.0
    systematic = default.systematic if default else 0.0
    own = f"{vessel}/{source}" if source else vessel
    declared = _declared(text, quantity, source)
    if declared is None:
        return Instrument(own, random, systematic, 0.0, declared=False)
    since = f"@{declared.calibrated_at}" if declared.calibrated_at is not None else ""
    return Instrument(
        (declared.instrument or own) + since,
        random if declared.random is None else declared.random,
        systematic if declared.systematic is None else declared.systematic,
        declared.offset or 0.0,
        declared=declared.random is not None or declared.systematic is not None,
    )


def _declared(body: Vessel, quantity: str, source: str) -> Declared | None:
    for item in body.sources:
        if item.source == source and quantity in item.instruments:
            return item.instruments[quantity]
    return cast("Mapping[str, Declared]", body.instruments).get(quantity)


def base_state(site: Conditions) -> tuple[float, float]:
    """Base temperature and pressure of a site. [K, Pa]"""
    return float(units.kelvin(site.base_temperature_c)), float(units.pascal(site.base_pressure_kpa_abs))


def mean_atmosphere(site: Conditions) -> tuple[float, bool]:
    """The place's atmospheric pressure where no barometer is read, and whether it was only assumed. [Pa]"""
    if site.atmospheric_pressure_kpa_abs is not None:
        return site.atmospheric_pressure_kpa_abs * units.PASCAL_PER_KPA, False
    if site.elevation_m is not None:
        return float(units.atmospheric_pressure(site.elevation_m)), False
    return constants.STANDARD_ATMOSPHERE, True


def boiling_pressure(composition: Boiling | None, temperature: float) -> float:
    """Vapour pressure of a substance at a temperature; 0 where it has none that we know. [Pa]"""
    if composition is None:
        return 0.0
    pressure, _ = _saturation((composition,)).pressure(np.array([temperature]), 0)
    return float(pressure[0]) if math.isfinite(pressure[0]) else 0.0


@lru_cache(maxsize=64)
def _saturation(compositions: tuple[Boiling, ...]) -> SaturationColumns:
    return SaturationColumns.from_compositions([list(composition) for composition in compositions])


@lru_cache(maxsize=256)
def virial_columns(mixtures: tuple[VapourMixture, ...]) -> VapourColumns:
    """Virial series of some mixtures; the same mixtures are compiled once."""
    return VapourColumns.from_mixtures(list(mixtures))


@lru_cache(maxsize=50_000)
def vessel_of(text: str) -> Vessel:
    """A stored text as a vessel; the same text is read once."""
    return Vessel.model_validate_json(text)


@lru_cache(maxsize=20_000)
def compile_texts(
    name: str, definitions: tuple[InForce, ...], site: str, vessel: str, substance: str,
    bounds: tuple[int, int], history: tuple[tuple[int, str], ...],
) -> CompiledVessel:  # fmt: skip
    """The parameters of one vessel from the stored texts of its definitions."""
    bodies = Site.model_validate_json(site), vessel_of(vessel), Substance.model_validate_json(substance)
    compiled = compile_bodies(name, *bodies, definitions=definitions)
    texts = tuple((begins, vessel_of(text)) for begins, text in history)
    return replace(compiled, since=bounds[0], until=bounds[1], history=texts)


def compile_bodies(
    name: str, site: Conditions, body: Vessel, substance: Substance, definitions: tuple[InForce, ...] = ()
) -> CompiledVessel:
    """The parameters of one vessel; raises DefinitionError where the definitions do not fit each other."""
    curve, capacity = capacity_curve(body)
    kind = body.shape.kind
    liquid, vapour = substance.liquid, substance.vapour
    space = _space(body, substance)
    method = Method.NOTHING
    if liquid is not None and kind not in ("fixed_volume", "junction"):
        method |= Method.LIQUID
    elif liquid is not None and kind == "fixed_volume" and not (space == "product" and vapour is not None):
        method |= Method.LIQUID | Method.FULL
    if space == "product" and vapour is not None and kind != "junction":
        method |= Method.VAPOUR
    elif space == "blanketed" and vapour is not None and method & (Method.LIQUID | Method.FULL) == Method.LIQUID:
        method |= Method.VAPOUR | Method.BLANKET
    if body.floating_roof is not None:
        if not method & Method.LIQUID:
            raise DefinitionError("a floating roof needs a liquid under it", field="floating_roof")
        method |= Method.ROOF
    if method & Method.LIQUID and method & Method.VAPOUR:
        method |= Method.SATURATION
    if method == Method.NOTHING and kind != "junction":
        raise DefinitionError(
            "the substance has neither a liquid that this shape can gauge nor a vapour that counts in this space",
            field="substance",
        )
    mixture = _mixture(vapour) if method & Method.VAPOUR else None
    boiling = _composition(vapour) if method & Method.SATURATION else None
    state = _reference_density(site, substance, boiling) if liquid is not None else (math.nan,) * 4
    parameters = _site_parameters(site, boiling) | _shell_parameters(body) | _roof_parameters(body)
    return CompiledVessel(
        name, definitions, site, body, substance, method, curve, capacity, parameters,
        _expansivity(substance), mixture, boiling, state[:3], state[3], space, kind == "capacity_table",
    )  # fmt: skip


def _space(body: Vessel, substance: Substance) -> str:
    if body.vapour_space is not None:
        return str(body.vapour_space.kind)
    if body.floating_roof is not None:
        return "none"
    return "product" if substance.vapour is not None else "open"


def _composition(vapour: VirialVapour | None) -> Boiling:
    assert vapour is not None
    total = math.fsum(item.mole_fraction for item in vapour.components)
    return tuple((_component(item), item.mole_fraction / total) for item in vapour.components)


def _component(item: WireComponent) -> Component:
    if item.critical_temperature_k is None:
        return component(item.id)
    assert item.critical_pressure_kpa_abs is not None and item.acentric_factor is not None
    assert item.molar_mass_g_mol is not None
    return given_component(
        item.id, critical_temperature=item.critical_temperature_k,
        critical_pressure=item.critical_pressure_kpa_abs * units.PASCAL_PER_KPA,
        acentric_factor=item.acentric_factor, molar_mass=item.molar_mass_g_mol * units.KILOGRAM_PER_GRAM,
    )  # fmt: skip


def _mixture(vapour: VirialVapour | None) -> VapourMixture:
    assert vapour is not None
    pairs = _composition(vapour)
    cubic = units.CUBIC_METRE_PER_CUBIC_CENTIMETRE
    return VapourMixture(
        tuple(item for item, _ in pairs), tuple(fraction for _, fraction in pairs), form=vapour.form,
        terms=vapour.terms, coefficients=vapour.coefficients, second_virial=vapour.second_virial,
        third_virial=vapour.third_virial, measured_second=_measured(vapour.second_virial_cm3_mol, cubic),
        measured_third=_measured(vapour.third_virial_cm6_mol2, cubic**2),
    )  # fmt: skip


def _measured(
    given: float | tuple[tuple[float, float], ...] | None, scale: float
) -> float | tuple[tuple[float, float], ...] | None:
    if given is None or isinstance(given, int | float):
        return None if given is None else given * scale
    return tuple((float(units.kelvin(t)), value * scale) for t, value in given)


@lru_cache(maxsize=1024)
def _analysed(vapour: VirialVapour, analysis: tuple[tuple[str, float], ...]) -> VapourMixture:
    """The substance's vapour with the composition of an analysis in place of its own."""
    own = {item.id: item for item in vapour.components}
    total = math.fsum(fraction for _, fraction in analysis)
    return replace(
        _mixture(vapour),
        components=tuple(_component(own[name]) if name in own else component(name) for name, _ in analysis),
        mole_fractions=tuple(fraction / total for _, fraction in analysis),
    )


def analysed_mixture(vessel: CompiledVessel, analysis: Mapping[str, float]) -> VapourMixture:
    """The vessel's vapour with an analysis's mole fractions, which are normalised."""
    assert vessel.substance.vapour is not None
    return _analysed(vessel.substance.vapour, tuple(sorted(analysis.items())))


def _expansivity(substance: Substance) -> tuple[float, ...]:
    if substance.liquid is None:
        return (0.0,)
    given = substance.liquid.expansivity_per_k
    return tuple(given) if isinstance(given, Sequence) else (given,)


def _reference_density(
    site: Conditions, substance: Substance, boiling: Boiling | None
) -> tuple[float, float, float, float]:
    """Density, temperature and pressure of the substance's own figure, and its standard uncertainty."""
    liquid = substance.liquid
    assert liquid is not None
    temperature = float(units.kelvin(liquid.at_temperature_c))
    if liquid.at_pressure_kpa_abs is not None:
        pressure = liquid.at_pressure_kpa_abs * units.PASCAL_PER_KPA
    else:
        pressure = max(base_state(site)[1], boiling_pressure(boiling, temperature))
    given = liquid.density_uncertainty_kg_m3
    spread = instruments.DENSITY_SHARE * liquid.density_kg_m3 if given is None else given
    return liquid.density_kg_m3, temperature, pressure, spread


def _site_parameters(site: Conditions, boiling: Boiling | None) -> dict[str, float]:
    temperature, pressure = base_state(site)
    return {
        "standard_temperature": temperature,
        "standard_pressure": max(pressure, boiling_pressure(boiling, temperature)),
        "water_density": WATER_DENSITY,
    }


def _shell_parameters(body: Vessel) -> dict[str, float]:
    shell = body.shell
    total, vertical = strain_of(body)
    return {
        "expansion": shell.expansion_per_k,
        "expansion_temperature": float(units.kelvin(shell.at_temperature_c)),
        "liquid_weight": 1.0 if shell.insulated else UNINSULATED_LIQUID_WEIGHT,
        "strain_sum": total,
        "strain_vertical": vertical,
        "strain_pressure": shell.at_pressure_kpa * units.PASCAL_PER_KPA,
    }


def _roof_parameters(body: Vessel) -> dict[str, float]:
    roof = body.floating_roof
    if roof is None:
        return {"roof_mass": 0.0, "roof_lands": 0.0, "roof_floats": 0.0, "roof_volume_per_mass": 0.0}
    deducted = getattr(body.shape, "roof_deducted_at_kg_m3", None)
    return {
        "roof_mass": roof.mass_kg,
        "roof_lands": roof.lands_at_m,
        "roof_floats": roof.floats_at_m,
        "roof_volume_per_mass": 1.0 / deducted if deducted else 0.0,
    }


@lru_cache(maxsize=64)
def stack(compiled: tuple[CompiledVessel, ...], extra: tuple[VapourMixture, ...] = ()) -> Vessels:
    """Columns of parameters of some vessels, in their order; ``extra`` mixtures follow the vessels' own."""
    curves = [c.curve for c in compiled if c.curve is not None]
    curve_row = np.cumsum([c.curve is not None for c in compiled]) - 1
    mixtures = tuple(dict.fromkeys([c.mixture for c in compiled if c.mixture is not None] + list(extra)))
    boiling = tuple(dict.fromkeys(c.boiling for c in compiled if c.boiling is not None))
    width = max((len(c.expansivity) for c in compiled), default=1)

    def column(name: str) -> np.ndarray[tuple[int, ...], np.dtype[np.float64]]:
        return np.array([c.parameters[name] for c in compiled], dtype=np.float64)

    return Vessels(
        method=np.array([int(c.method) for c in compiled], dtype=np.intp),
        curves=Curves.from_curves(curves) if curves else None,
        curve_row=np.maximum(curve_row, 0).astype(np.intp),
        bottom=np.array([c.curve.bottom if c.curve else math.nan for c in compiled]),
        top=np.array([c.curve.top if c.curve else math.nan for c in compiled]),
        is_table=np.array([float(c.table) for c in compiled]),
        capacity=np.array([c.capacity for c in compiled]),
        **{name: column(name) for name in PARAMETERS},
        expansivity=tuple(
            np.array([c.expansivity[j] if j < len(c.expansivity) else 0.0 for c in compiled]) for j in range(width)
        ),
        expansivity_origin=np.array([c.density[1] for c in compiled]),
        compressibility=np.array([_compressibility(c.substance) for c in compiled]),
        vapour=virial_columns(mixtures) if mixtures else None,
        vapour_row=np.array([mixtures.index(c.mixture) if c.mixture else 0 for c in compiled], dtype=np.intp),
        saturation=_saturation(boiling) if boiling else None,
        saturation_row=np.array([boiling.index(c.boiling) if c.boiling else 0 for c in compiled], dtype=np.intp),
        gas_standard_density=np.array([_gas_standard_density(c) for c in compiled]),
    )


PARAMETERS = (
    "expansion", "expansion_temperature", "liquid_weight", "strain_sum", "strain_vertical", "strain_pressure",
    "roof_mass", "roof_lands", "roof_floats", "roof_volume_per_mass", "standard_temperature",
    "standard_pressure", "water_density",
)  # fmt: skip


def mixture_rows(compiled: tuple[CompiledVessel, ...], extra: tuple[VapourMixture, ...]) -> dict[VapourMixture, int]:
    """Row of each mixture in the stacked virial series."""
    mixtures = dict.fromkeys([c.mixture for c in compiled if c.mixture is not None] + list(extra))
    return {mixture: row for row, mixture in enumerate(mixtures)}


def _compressibility(substance: Substance) -> float:
    if substance.liquid is None:
        return 0.0
    return substance.liquid.compressibility_per_kpa / units.PASCAL_PER_KPA


def _gas_standard_density(c: CompiledVessel) -> float:
    """Density of the vapour as an ideal gas at the site's gas base temperature and base pressure. [kg/m³]"""
    if c.mixture is None:
        return math.nan
    temperature = float(units.kelvin(c.site.gas_base_temperature_c))
    pressure = base_state(c.site)[1]
    molar_mass = float(virial_columns((c.mixture,)).molar_mass[0])
    return molar_mass * pressure / (constants.GAS_CONSTANT * temperature)


def vapour_density(c: CompiledVessel, pressure: float, temperature: float) -> tuple[float, float]:
    """Density of the vessel's vapour and its relative standard uncertainty; of an ideal gas where refused. [kg/m³]"""
    assert c.mixture is not None
    columns = virial_columns((c.mixture,))
    state = columns.state(pressure, temperature, 0)
    if np.isfinite(state.density):
        return float(state.density), float(state.model_uncertainty)
    return float(columns.molar_mass[0]) * pressure / (constants.GAS_CONSTANT * temperature), IDEAL_GAS_SHARE


IDEAL_GAS_SHARE = 0.2  # of a vapour so dense that the virial equation refuses it


def density_at(c: CompiledVessel, temperature: float, pressure: float) -> float:
    """Density of the vessel's liquid by the substance's own figure, at a state. [kg/m³]"""
    density, at_temperature, at_pressure = c.density
    ratio = log_volume_ratio(
        temperature, pressure, temperature_ref=at_temperature, pressure_ref=at_pressure,
        coefficients=c.expansivity, origin=at_temperature, compressibility=_compressibility(c.substance),
    )  # fmt: skip
    return float(density * np.exp(-ratio))
