"""Definitions become parameters: one vessel compiled once, many vessels stacked into columns."""

from __future__ import annotations

import hashlib
import json
import math
from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import cached_property, lru_cache
from typing import NamedTuple, cast

import numpy as np

from app.schemas.instruments import Assumed
from app.schemas.instruments import Instrument as Declared
from app.schemas.site import Conditions, Site
from app.schemas.substance import Substance
from app.schemas.vessel import Vessel
from app.services import liquids
from app.services.compositions import (
    Boiling,
    analysed,
    mixture_of,
    saturation_columns,
    virial_columns,
    what_boils,
)
from app.services.find import ALL_TIME
from app.services.liquids import base_state
from app.services.shapes import capacity_curve, courses_of, head_included, strain_of
from models import constants, instruments, units
from models.columns import Method, Vessels
from models.errors import DefinitionError
from models.geometry.curves import Curve, Curves
from models.geometry.head_stress import CoursedShell, HeadStress
from models.geometry.shell import LIQUID_WEIGHT
from models.liquid.definition import Liquid
from models.liquid.water import water_density
from models.vapour.series import VapourMixture

WATER_DENSITY = float(water_density(288.15))  # at 15 °C, whatever the base: a mass does not depend on the base
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
    liquid: Liquid | None
    mixture: VapourMixture | None
    boiling: Boiling | None
    density: tuple[float, float, float]
    density_uncertainty: float
    space: str
    table: bool
    courses: CoursedShell | None
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

    def declared(self, quantity: str, source: str, at: int | None = None) -> Declared | None:
        """What the vessel's text says of the instrument that reads a quantity, from a source."""
        return _declared(self.text_at(at), quantity, source)

    @cached_property
    def _instruments(self) -> dict[tuple[str, str], Instrument]:
        return {}

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


def mean_atmosphere(site: Conditions) -> tuple[float, bool]:
    """The place's atmospheric pressure where no barometer is read, and whether it was only assumed. [Pa]"""
    if site.atmospheric_pressure_kpa_abs is not None:
        return site.atmospheric_pressure_kpa_abs * units.PASCAL_PER_KPA, False
    if site.elevation_m is not None:
        return float(units.atmospheric_pressure(site.elevation_m)), False
    return constants.STANDARD_ATMOSPHERE, True


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
    courses = courses_of(body)
    if courses is not None and method & Method.LIQUID:
        method |= Method.HEAD
    if method == Method.NOTHING and kind != "junction":
        raise DefinitionError(
            "the substance has neither a liquid that this shape can gauge nor a vapour that counts in this space",
            field="substance",
        )
    mixture = mixture_of(vapour) if vapour is not None and method & Method.VAPOUR else None
    boiling = what_boils(substance) if method & Method.SATURATION else None
    own = None if liquid is None else liquids.liquid_of(liquid, site)
    state: tuple[float, ...] = (math.nan,) * 4
    if liquid is not None and own is not None:
        state = liquids.reference(liquid, own, site, boiling)
    parameters = _site_parameters(site, own, boiling) | _shell_parameters(body) | _roof_parameters(body)
    return CompiledVessel(
        name, definitions, site, body, substance, method, curve, capacity, parameters,
        own, mixture, boiling, (state[0], state[1], state[2]), state[3], space, kind == "capacity_table", courses,
    )  # fmt: skip


def _space(body: Vessel, substance: Substance) -> str:
    if body.vapour_space is not None:
        return str(body.vapour_space.kind)
    if body.floating_roof is not None:
        return "none"
    return "product" if substance.vapour is not None else "open"


def analysed_mixture(vessel: CompiledVessel, analysis: Mapping[str, float]) -> VapourMixture:
    """The vessel's vapour with an analysis's mole fractions, which are normalised."""
    assert vessel.substance.vapour is not None
    return analysed(vessel.substance.vapour, tuple(sorted(analysis.items())))


def _site_parameters(site: Conditions, liquid: Liquid | None, boiling: Boiling | None) -> dict[str, float]:
    return {
        "standard_temperature": base_state(site)[0],
        "standard_pressure": liquids.standard_pressure(liquid, site, boiling),
        "water_density": WATER_DENSITY,
    }


def _shell_parameters(body: Vessel) -> dict[str, float]:
    shell = body.shell
    total, vertical = strain_of(body)
    return {
        "expansion": shell.expansion_per_k,
        "expansion_temperature": float(units.kelvin(shell.at_temperature_c)),
        "liquid_weight": 1.0 if shell.insulated else LIQUID_WEIGHT,
        "strain_sum": total,
        "strain_vertical": vertical,
        "strain_pressure": shell.at_pressure_kpa * units.PASCAL_PER_KPA,
        "head_included": head_included(body),
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


class Analysed(NamedTuple):
    """What analyses brought beside the vessels' own substances: it follows them in the columns."""

    mixtures: tuple[VapourMixture, ...] = ()
    liquids: tuple[Liquid, ...] = ()
    boiling: tuple[Boiling, ...] = ()


NOT_ANALYSED = Analysed()


@lru_cache(maxsize=64)
def stack(compiled: tuple[CompiledVessel, ...], extra: Analysed = NOT_ANALYSED) -> Vessels:
    """Columns of parameters of some vessels, in their order."""
    curves = [c.curve for c in compiled if c.curve is not None]
    curve_row = np.cumsum([c.curve is not None for c in compiled]) - 1
    mixtures, own, boiling = all_of(compiled, extra)

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
        liquids=liquids.liquid_columns(own) if own else None,
        liquid_row=np.array([own.index(c.liquid) if c.liquid else 0 for c in compiled], dtype=np.intp),
        head_stress=HeadStress.from_shells([c.courses for c in compiled]),
        head_row=np.arange(len(compiled), dtype=np.intp),
        vapour=virial_columns(mixtures) if mixtures else None,
        vapour_row=np.array([mixtures.index(c.mixture) if c.mixture else 0 for c in compiled], dtype=np.intp),
        saturation=saturation_columns(boiling) if boiling else None,
        saturation_row=np.array([boiling.index(c.boiling) if c.boiling else 0 for c in compiled], dtype=np.intp),
        gas_standard_density=np.array([_gas_standard_density(c) for c in compiled]),
    )


PARAMETERS = (
    "expansion", "expansion_temperature", "liquid_weight", "strain_sum", "strain_vertical", "strain_pressure",
    "roof_mass", "roof_lands", "roof_floats", "roof_volume_per_mass", "standard_temperature",
    "standard_pressure", "water_density", "head_included",
)  # fmt: skip


def all_of(compiled: tuple[CompiledVessel, ...], extra: Analysed) -> Analysed:
    """Everything that the columns hold, each once: the vessels' own first, then what analyses brought."""
    return Analysed(
        tuple(dict.fromkeys([*(c.mixture for c in compiled if c.mixture is not None), *extra.mixtures])),
        tuple(dict.fromkeys([*(c.liquid for c in compiled if c.liquid is not None), *extra.liquids])),
        tuple(dict.fromkeys([*(c.boiling for c in compiled if c.boiling is not None), *extra.boiling])),
    )


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
