"""Tank statements of measured rows: each liquid in the trade's order of calculation, at three bases.

The order is that of API MPMS 12.1.1 (from memory): observed volume, less free water, the roof, then to each base
by C_T and C_P, net of sediment and water, barrels, mass, and weight in air.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any, NamedTuple, TypeVar

import numpy as np
from numpy.typing import NDArray

from app.services.compile import CompiledVessel
from app.services.liquids import liquid_columns, standard_pressure
from app.services.measure import Measured
from app.services.parts import at_row, celsius_of
from app.services.working import content
from models import constants, units
from models.columns import Method
from models.liquid.definition import Liquid
from models.liquid.petroleum import table_factor
from models.liquid.state import Conditions

BASES = {
    "at_15_c": float(units.kelvin(15.0)),
    "at_20_c": float(units.kelvin(20.0)),
    "at_60_f": constants.ZERO_CELSIUS + (60.0 - 32.0) / 1.8,
}  # K
Block = dict[str, Any]
Columns = NDArray[np.float64]
Density = TypeVar("Density", float, NDArray[np.float64])


def tank_statements(measured: Measured) -> dict[int, Block]:
    """The statement of every row whose liquid was measured by its volume.

    What moved since the reading is no part of it: ``at`` is when it was read.
    """
    alike: dict[tuple[CompiledVessel, Liquid], list[int]] = {}
    for row in range(measured.collected.rows):
        if _by_volume(measured, row):
            alike.setdefault((measured.vessel(row), measured.liquid(row)), []).append(row)
    return {row: block for (vessel, _), rows in alike.items() for row, block in _statements(measured, vessel, rows)}


def in_air(density: Density) -> Density:
    """Weight in air over mass, by the conventional densities of OIML D 28. [1]"""
    air, weights = constants.CONVENTIONAL_AIR_DENSITY, constants.CONVENTIONAL_WEIGHT_DENSITY
    return (1.0 - air / density) / (1.0 - air / weights)


def _by_volume(measured: Measured, row: int) -> bool:
    carried = measured.carried.get(row)
    if not measured.vessel(row).has_liquid or (carried is not None and carried.stated is not None):
        return False
    return math.isfinite(measured.result["mass"][row] + measured.result["liquid_mass"][row])


def _statements(measured: Measured, vessel: CompiledVessel, rows: list[int]) -> Iterator[tuple[int, Block]]:
    """Statements of rows of one vessel that hold one liquid."""
    held = _Held.of(measured, rows)
    own = vessel.parameters
    factors = held.to_base(own["standard_temperature"], own["standard_pressure"])
    bases = {name: _at_base(held, vessel, temperature) for name, temperature in BASES.items()}
    for place, row in enumerate(rows):
        mass = float(measured.result["liquid_mass"][row])
        weight = mass * in_air(float(measured.result["liquid_density"][row]))
        yield row, {
            "at": int(measured.collected.at[row]),
            **_volumes(measured, row),
            **_at(_shown(factors), place),
            **{name: _at(columns, place) for name, columns in bases.items()},
            "mass_kg": mass,
            "weight_in_air_kg": weight,
            "weight_in_air_long_ton": weight / units.KILOGRAM_PER_LONG_TON,
            "weight_in_air_short_ton": weight / units.KILOGRAM_PER_SHORT_TON,
        }


def _known(value: float) -> float | None:
    return float(value) if math.isfinite(value) else None


def _at(columns: Mapping[str, Columns | float], place: int) -> Block:
    return {
        name: _known(column if isinstance(column, float) else column[place]) for name, column in columns.items()
    }


def _volumes(measured: Measured, row: int) -> Block:
    """From the gauge to the gross observed volume; the parts add up to it."""
    result, state, vessel = measured.result, measured.state, measured.vessel(row)
    gross, water = float(result["gross_observed_volume"][row]), float(result["free_water_volume"][row])
    roof = float(result["roof_volume"][row]) if vessel.method & Method.ROOF else 0.0
    return {
        "level_m": None if vessel.is_full else _known(at_row(state.level, row)),
        "free_water_level_m": None if vessel.is_full else _known(at_row(state.water_level, row)),
        "liquid_temperature_c": celsius_of(at_row(state.liquid_temperature, row)),
        "shell_factor": float(result["shell_factor"][row]),
        "total_observed_volume_m3": gross - roof + water,
        "free_water_volume_m3": water,
        "roof_correction_m3": roof,
        "gross_observed_volume_m3": gross,
        "sediment_water_pct": 100.0 * at_row(state.sediment_water, row),
        "liquid_density_kg_m3": float(result["liquid_density"][row]),
    }


class _ToBase(NamedTuple):
    """Density at a base as sampled, and C_T and C_P from there; NaN where the method does not reach."""

    density: Columns  # kg/m³
    temperature_factor: Columns
    pressure_factor: Columns


@dataclass(frozen=True)
class _Held:
    """What rows of one vessel and one liquid hold, in columns. [SI]"""

    liquid: Liquid
    density: Columns
    sample: Conditions
    temperature: Columns
    here: Columns  # density in the vessel
    gross: Columns  # observed volume
    wet: Columns  # sediment and water, by volume
    dry_share: Columns  # mass of the dry liquid in a mass of the content as sampled

    @classmethod
    def of(cls, measured: Measured, rows: list[int]) -> _Held:
        state, result = measured.state, measured.result
        contents = [content(measured, row) for row in rows]
        density, warm, at, pressure, datum = np.array(
            [(one.density, one.here[0], *one.sample, one.standard[1]) for one in contents]
        ).T
        wet = np.array([at_row(state.sediment_water, row) for row in rows])
        is_dry = np.array([at_row(state.density_is_dry, row) for row in rows]) > 0.0
        water = measured.vessel(rows[0]).parameters["water_density"]
        return cls(
            contents[0].liquid, density, Conditions(at, pressure, datum), warm, result["liquid_density"][rows],
            result["gross_observed_volume"][rows], wet, 1.0 - np.where(is_dry, wet, wet * water / density),
        )  # fmt: skip

    def to_base(self, temperature: float, pressure: float) -> _ToBase:
        """To a base; the sample keeps the standard state by which the chain understood it: one content for all."""

        def conditions(at: Columns) -> Conditions:
            return Conditions(at, np.array([pressure]), np.array([pressure]))

        state = liquid_columns((self.liquid,)).state(
            self.density, self.sample, conditions(self.temperature), conditions(np.array([temperature])),
            np.zeros(1, dtype=np.intp),
        )  # fmt: skip
        warm, standard = (np.broadcast_to(one, self.density.shape) for one in (state.density, state.density_standard))
        return _ToBase(standard, warm / standard, np.where(np.isfinite(standard), self.here / warm, np.nan))


def _shown(factors: _ToBase) -> dict[str, Columns | float]:
    return {
        "temperature_factor": factors.temperature_factor,
        "temperature_factor_table": table_factor(factors.temperature_factor),
        "pressure_factor": factors.pressure_factor,
    }


def _at_base(held: _Held, vessel: CompiledVessel, temperature: float) -> dict[str, Columns | float]:
    """The liquid at one base: volumes, density net and dry, in vacuo and in air."""
    pressure = standard_pressure(vessel.liquid, vessel.site, vessel.boiling, temperature)
    base = held.to_base(temperature, pressure)
    gross = held.gross * held.here / base.density
    net = gross * (1.0 - held.wet)
    density = base.density * held.dry_share / (1.0 - held.wet)
    columns = {
        "base_temperature_c": celsius_of(temperature),
        "base_pressure_kpa_abs": pressure / units.PASCAL_PER_KPA,
        **_shown(base),
        "gross_standard_volume_m3": gross,
        "net_standard_volume_m3": net,
        "net_standard_volume_bbl": net / units.CUBIC_METRE_PER_BARREL,
        "density_kg_m3": density,
        "density_in_air_kg_m3": density * in_air(density),
    }
    if temperature == BASES["at_60_f"]:
        columns["relative_density_60_60"] = density / constants.WATER_DENSITY_60F
        columns["api_gravity"] = units.api_gravity_of_density(density)
    return columns
