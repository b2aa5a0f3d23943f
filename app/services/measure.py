"""Candidates become a state, the state a mass with its parts: one path for live answers, courses and closes."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING, Any, cast

import numpy as np
from numpy.typing import NDArray

from app.services.analyses import UNCHANGED, analyses_of
from app.services.attribute import parts_of
from app.services.choose import NEVER, Chosen, choose
from app.services.collect import INPUTS, Collected
from app.services.compile import NOT_ANALYSED, Analysed, CompiledVessel, all_of, mean_atmosphere, stack
from app.services.compositions import Boiling, boiling_pressure
from app.services.gauged import HEAD, by_head, head_sensitivities, levels_per_unit
from app.services.liquids import SATURATED
from app.services.parts import KELVIN, OTHER_MEANS, PASCAL, Part, at_row
from app.services.warmed import Warmed, warmed
from models import units
from models.columns import Inventory, State
from models.estimate import Estimate
from models.liquid.definition import Liquid
from models.liquid.hydrometer import hydrometer_factor
from models.mass import inventory
from models.space import NO_SERIES
from models.vapour.series import VapourMixture

if TYPE_CHECKING:
    from app.services.blend import Corrections
    from app.services.carry import Carried

FloatColumns = NDArray[np.float64]
BoolColumns = NDArray[np.bool_]

HYDROMETERS = (288.15, 293.15, 288.706)  # K; a scale is right at the site's base of 15 °C, 20 °C or 60 °F, or at 15 °C
CLOSED = 1e-12  # share of a missing vapour; below it nothing is said


@dataclass
class Measured:
    """n masses, what counted for each, and every error under its name."""

    collected: Collected
    chosen: dict[str, Chosen]
    state: State
    result: Inventory
    parts: list[Part]
    assumed: dict[str, BoolColumns] = field(default_factory=dict)
    atmosphere_assumed: BoolColumns | None = None
    held: Analysed = NOT_ANALYSED
    asked: NDArray[np.int64] | None = None
    carried: dict[int, Carried] = field(default_factory=dict)
    tickets: list[tuple[str, str]] = field(default_factory=list)
    checks: dict[int, list[dict[str, Any]]] = field(default_factory=dict)
    refused: Mapping[int, str] = field(default_factory=dict)
    warmed: Warmed | None = None
    glass: FloatColumns | None = None  # what the glass of a hydrometer made of each reading of a density

    def instant(self, row: int) -> int:
        """The instant that a row was asked for; it may have been read at another."""
        return int(self.collected.at[row] if self.asked is None else self.asked[row])

    def source(self, name: str, row: int) -> str:
        """The source of what counts for an input."""
        return self.collected.origins[name].of(row, int(self.chosen[name].source[row]))[1]

    def mixture(self, row: int) -> VapourMixture:
        """The vapour of a row: by its analysis, or the substance's own."""
        own = self.vessel(row).mixture
        if self.state.vapour_row is None or self.state.vapour_row[row] == NO_SERIES:
            assert own is not None
            return own
        return self.held.mixtures[int(self.state.vapour_row[row])]

    def liquid(self, row: int) -> Liquid:
        """The liquid of a row: by its analysis, or the substance's own."""
        own = self.vessel(row).liquid
        if self.state.liquid_row is None:
            assert own is not None
            return own
        return self.held.liquids[int(self.state.liquid_row[row])]

    def boiling(self, row: int) -> Boiling | None:
        """What boils in a row: by its analysis, or by the substance's own composition."""
        if self.state.saturation_row is None or self.vessel(row).boiling is None:
            return self.vessel(row).boiling
        return self.held.boiling[int(self.state.saturation_row[row])]

    def vessel(self, row: int) -> CompiledVessel:
        """The vessel of a row."""
        return self.collected.vessel(row)


def choices(collected: Collected, ahead: NDArray[np.int64] | None = None) -> dict[str, Chosen]:
    """What counts for each input in each row; see :func:`choose` for ``ahead``."""
    return {
        spec.name: choose(collected.candidates[spec.name], collected.at, interpolates=spec.interpolates, ahead=ahead)
        for spec in INPUTS
    }


def measure(
    collected: Collected, *, ahead: NDArray[np.int64] | None = None, asked: NDArray[np.int64] | None = None,
    corrections: Corrections | None = None,
) -> Measured:  # fmt: skip
    """The mass of every row by the chain."""
    chosen = choices(collected, ahead)
    if corrections is not None and corrections.dry:
        water = chosen["free_water"]
        wet = np.array([row not in corrections.dry for row in range(collected.rows)])
        chosen["free_water"] = replace(
            water, source=np.where(wet, water.source, -1), value=np.where(wet, water.value, np.nan)
        )
    builder = States(collected, chosen, corrections)
    state, extra = builder.build()
    vessels = stack(collected.vessels, extra)
    rows = None if len(collected.vessels) == 1 else np.arange(collected.rows, dtype=np.intp)
    heads = builder.by_head
    state = by_head(collected.vessels, vessels, state, heads)
    result = inventory(vessels, rows, state)
    gravity = head_sensitivities(collected.vessels, state, result, heads)
    per_unit = levels_per_unit(collected.vessels, vessels, state, result) if builder.other_means else None
    parts = parts_of(builder, state, per_unit, gravity)
    return Measured(
        collected, chosen, state, result, parts, builder.assumed, builder.atmosphere_assumed,
        all_of(collected.vessels, extra), asked, refused=builder.refused, warmed=builder.warmed, glass=builder.glass,
    )  # fmt: skip


class States:
    """Builds the chain's state from what counts in each row."""

    def __init__(self, collected: Collected, chosen: dict[str, Chosen], corrections: Corrections | None = None) -> None:
        self.collected = collected
        self.chosen = chosen
        self.blends = {} if corrections is None else corrections.blends
        self.dry = frozenset[int]() if corrections is None else corrections.dry
        self.vessels: Sequence[CompiledVessel] = collected.vessels
        self.assumed: dict[str, BoolColumns] = {}
        self.atmosphere_assumed = np.zeros(collected.rows, dtype=bool)
        self.density_is_sample = chosen["density"].usable
        self.ambient_unread = np.zeros(collected.rows, dtype=bool)
        self.mixed = self.of_vessels([float(vessel.mixed) for vessel in self.vessels]) > 0
        self.vented = self.of_vessels([float(vessel.space in ("open", "none")) for vessel in self.vessels]) > 0
        self.at_rest = np.zeros(collected.rows, dtype=bool)
        self.gauge = np.zeros(collected.rows, dtype=bool)
        self.warmed: Warmed | None = None
        self.glass: FloatColumns = np.ones(1)
        self.refused: dict[int, str] = {}  # rows whose analysis the substance's model cannot take, and why
        level, origin = chosen["level"].source, collected.origins["level"]
        means = [origin.of(row, int(level[row]))[0] if level[row] >= 0 else "" for row in range(collected.rows)]
        self.other_means = any(one in OTHER_MEANS for one in means)
        self.by_head = np.array([one == HEAD for one in means], dtype=bool)

    def of_vessels(self, values: Sequence[float]) -> FloatColumns:
        """A column of one value a row from one value a vessel."""
        column = np.array(values, dtype=np.float64)
        return column if len(self.vessels) > 1 else np.full(self.collected.rows, column[0])

    def value(self, name: str, quantity: str) -> FloatColumns:
        """What counts for an input, or what the vessel's definition assumes."""
        column = self.chosen[name].value
        given = [vessel.assumed(quantity) for vessel in self.vessels]
        if any(item is not None for item in given):
            instead = self.of_vessels([np.nan if item is None else item.value for item in given])
            use = ~self.chosen[name].usable & np.isfinite(instead)
            self.assumed[quantity] = use
            column = np.where(use, instead, column)
        return column

    def build(self) -> tuple[State, Analysed]:
        """The state of every row, and what analyses brought."""
        liquid = units.kelvin(self.value("liquid_temperature", "liquid_temperature_c"))
        atmosphere = self._atmosphere()
        analysed = analyses_of(self)
        self.refused.update(analysed.refused)
        self.mixed = np.where(analysed.mixed == UNCHANGED, self.mixed, analysed.mixed == 1)
        density = self._density(analysed.own_densities)
        water = self.value("free_water", "free_water_level_m")
        state = State(
            level=self.value("level", "level_m"),
            water_level=np.where(np.isfinite(water), water, np.where(self._outlived(), np.nan, -np.inf)),
            liquid_temperature=liquid,
            ambient_temperature=self._ambient(liquid),
            vapour_temperature=units.kelvin(self.value("vapour_temperature", "vapour_temperature_c")),
            pressure=self._pressure(atmosphere),
            atmosphere=atmosphere,
            density=density[0],
            density_temperature=density[1],
            density_pressure=density[2],
            sediment_water=self._sediment_water(),
            density_is_dry=self._is_dry(),
            pressure_uncertainty=np.hypot(self._spread("pressure_kpa", PASCAL), self.weather()),
            temperature_uncertainty=self._spread("liquid_temperature_c", KELVIN),
            vapour_row=analysed.vapour_row,
            liquid_row=analysed.liquid_row,
            saturation_row=analysed.saturation_row,
            roof_load=np.nan_to_num(self.chosen["roof_load"].value),
        )
        self.warmed = warmed(self, state)
        if self.warmed is not None:
            state = replace(state, level=state.level + self.warmed.tape + self.warmed.reference)
        for row in self.refused:  # nothing is computed by a composition that is not the content's
            if row in analysed.refused_liquids:
                state.level[row] = np.nan
            elif not self.vessels[row if len(self.vessels) > 1 else 0].has_liquid:
                state.pressure[row] = np.nan
        return state, analysed.extra

    def _outlived(self) -> BoolColumns:
        """Where free water was read, but too long ago: it is neither what was read nor none."""
        read = (self.collected.candidates["free_water"].before_at > NEVER).any(axis=1)
        kept = np.array([row not in self.dry for row in range(self.collected.rows)])
        return np.asarray(read & kept & ~self.chosen["free_water"].usable)

    def _atmosphere(self) -> FloatColumns:
        means = [mean_atmosphere(vessel.site) for vessel in self.vessels]
        read = units.pascal(self.chosen["barometer"].value)
        mean = self.of_vessels([pressure for pressure, _ in means])
        unknown = self.of_vessels([float(assumed) for _, assumed in means]) > 0
        self.atmosphere_assumed = ~np.isfinite(read) & unknown
        return np.where(np.isfinite(read), read, mean)

    def _pressure(self, atmosphere: FloatColumns) -> FloatColumns:
        """Absolute pressure of the space; a vented tank and one under a floating roof are at the atmosphere's."""
        column = self.value("pressure", "pressure_kpa")
        origin, source = self.collected.origins["pressure"], self.chosen["pressure"].source
        is_absolute = np.array(
            [origin.of(row, int(source[row]))[0] == "pressure_kpa_abs" for row in range(self.collected.rows)]
            if len(self.vessels) > 1
            else [name == "pressure_kpa_abs" for name, _ in origin.columns[0]] or [False]
        )
        if len(self.vessels) == 1:
            is_absolute = is_absolute[np.maximum(source, 0)] & (source >= 0)
        if any("pressure_kpa_abs" in vessel.body.assumed for vessel in self.vessels):
            absolute = self.value("pressure", "pressure_kpa_abs")
            instead = self.assumed["pressure_kpa_abs"] & ~np.isfinite(column)
            self.assumed["pressure_kpa_abs"] = instead
            column, is_absolute = np.where(instead, absolute, column), is_absolute | instead
        self.at_rest = self.vented & ~np.isfinite(column)
        column = np.where(self.at_rest, 0.0, column)
        self.gauge = ~is_absolute
        return np.where(is_absolute, units.pascal(column), units.pascal(column) + atmosphere)

    def weather(self) -> FloatColumns:
        """Standard uncertainty of the atmosphere's pressure where it makes a gauge's reading absolute. [Pa]"""
        spread = self.of_vessels([vessel.site.barometer_uncertainty_kpa for vessel in self.vessels])
        return np.where(self.gauge, spread * PASCAL, 0.0)

    def _ambient(self, liquid: FloatColumns) -> FloatColumns:
        own = self.value("ambient", "ambient_temperature_c")
        site = self.chosen["site_ambient"].value
        read = units.kelvin(np.where(np.isfinite(own), own, site))
        self.ambient_unread = ~np.isfinite(read)
        gas = units.kelvin(self.chosen["vapour_temperature"].value)
        return np.where(np.isfinite(read), read, np.where(np.isfinite(liquid), liquid, gas))

    def _density(self, analysed: Mapping[int, float]) -> tuple[FloatColumns, FloatColumns, FloatColumns]:
        """The sample's density and state, or the substance's own figure, or that of the analysed composition."""
        own = [self.of_vessels([vessel.density[i] for vessel in self.vessels]) for i in range(3)]
        for row, figure in analysed.items():
            own[0][row] = figure
        read = self.value("density", "observed_density_kg_m3")
        sampled = np.isfinite(read)
        self.density_is_sample = sampled & self.chosen["density"].usable
        standard = self.of_vessels([vessel.parameters["standard_temperature"] for vessel in self.vessels])
        temperature = units.kelvin(self.companion("density", "observed_density_temperature_c"))
        temperature = np.where(np.isfinite(temperature), temperature, standard)
        pressure = units.pascal(self.companion("density", "observed_density_pressure_kpa_abs"))
        if sampled.any():
            self.glass = self._glass(temperature, standard)
            read = read * self.glass
            base = self.of_vessels([vessel.site.base_pressure_kpa_abs * PASCAL for vessel in self.vessels])
            pressure = np.where(np.isfinite(pressure), pressure, np.maximum(base, self._boiling(temperature, sampled)))
        density = [
            np.where(sampled, read, own[0]),
            np.where(sampled, temperature, own[1]),
            np.where(sampled, pressure, own[2]),
        ]
        for row, blend in self.blends.items():
            if blend.density is not None:
                held = self.vessels[row if len(self.vessels) > 1 else 0].parameters
                density[0][row] = blend.density
                if len(self.glass) > 1:
                    self.glass[row] = 1.0  # a blend is no reading
                density[1][row], density[2][row] = held["standard_temperature"], held["standard_pressure"]
        return density[0], density[1], density[2]

    def _glass(self, temperature: FloatColumns, standard: FloatColumns) -> FloatColumns:
        """What the glass of a hydrometer did to each reading: 1 for every other instrument."""
        if not self.collected.companions[("density", "observed_density_by")][1].any():
            return np.ones(1)
        by = [self.companion_text("density", "observed_density_by", row) for row in range(self.collected.rows)]
        of_glass = np.array([one == "hydrometer" for one in by])
        scale = np.where(np.isin(np.round(standard, 3), HYDROMETERS), standard, HYDROMETERS[0])
        return np.where(of_glass, hydrometer_factor(temperature, scale), 1.0)

    def _sediment_water(self) -> FloatColumns:
        """The sample's share of sediment and water, or a blend's."""
        share = np.nan_to_num(self.value("sediment_water", "sediment_water_pct")) / 100.0
        for row, blend in self.blends.items():
            if blend.water is not None:
                share[row] = blend.water
        return share

    def _boiling(self, temperature: FloatColumns, where: BoolColumns) -> FloatColumns:
        """Vapour pressure at each sample's temperature, where the substance has one."""
        boiling = np.zeros(self.collected.rows)
        for row in np.flatnonzero(where).tolist():
            vessel = self.vessels[row if len(self.vessels) > 1 else 0]
            if vessel.boiling is None or isinstance(vessel.liquid, SATURATED):
                continue
            boiling[row] = boiling_pressure(vessel.boiling, float(temperature[row]))
        return boiling

    def companion(self, name: str, quantity: str) -> FloatColumns:
        """What was read in the same sample as the value that counts; NaN where it was not."""
        candidates, _ = self.collected.companions[(name, quantity)]
        chosen = self.chosen[name]
        rows = np.arange(self.collected.rows)
        column = np.maximum(chosen.source, 0)
        same = chosen.usable & (candidates.before_at[rows, column] == chosen.begins)
        return np.where(same, candidates.before[rows, column], np.nan)

    def companion_text(self, name: str, quantity: str, row: int) -> str | None:
        """A text of the same sample as the value that counts."""
        candidates, texts = self.collected.companions[(name, quantity)]
        chosen = self.chosen[name]
        column = int(chosen.source[row])
        if column < 0 or candidates.before_at[row, column] != chosen.begins[row]:
            return None
        return cast("str | None", texts[row, column])

    def _is_dry(self) -> FloatColumns:
        """1 where the density is that of the dry liquid: said with the sample, or a blend's."""
        blended = {row for row, blend in self.blends.items() if blend.density is not None}
        if not self.chosen["sediment_water"].usable.any() and not blended:
            return np.zeros(1)
        return np.array(
            [
                float(row in blended or self.companion_text("sediment_water", "density_basis", row) == "dry")
                for row in range(self.collected.rows)
            ]
        )

    def _spread(self, quantity: str, scale: float) -> FloatColumns:
        """Standard uncertainty of a quantity for the saturation check, by its first source."""
        spreads = []
        for vessel in self.vessels:
            source = vessel.body.sources[0].source if vessel.body.sources else ""
            own = vessel.instrument(quantity, source)
            spreads.append(np.hypot(own.random, own.systematic) * scale)
        return self.of_vessels(spreads)


def standard_density(measured: Measured, row: int) -> Estimate:
    """Density of the vessel's liquid at its standard state, with the errors of its sample. [kg/m³]"""
    value = float(measured.result["standard_density"][row])
    if not math.isfinite(value):
        return Estimate(math.nan)
    per_unit = value / at_row(measured.state.density, row)
    slopes = {
        "density": per_unit * float(measured.result["standard_by_sample"][row]),
        "density_temperature": value * float(measured.result["standard_by_sample_temperature"][row]),
    }
    named: dict[str, float] = {}
    for part in measured.parts:
        slope = slopes.get(part.sensitivity)
        sigma = at_row(part.sigma, row)
        if slope is not None and sigma != 0.0:
            name = part.name(row)
            named[name] = named.get(name, 0.0) + slope * sigma
    return Estimate(value, named)
