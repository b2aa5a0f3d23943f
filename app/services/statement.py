"""The tank statement of one measured row: its liquid in the trade's order of calculation, at three bases.

The order is that of API MPMS 12.1.1 (from memory): observed volume, less free water, the roof, then to each base
by C_T and C_P, net of sediment and water, barrels, mass, and weight in air.
"""

from __future__ import annotations

import math
from typing import Any

from app.services.liquids import standard_pressure, state_of
from app.services.measure import Measured
from app.services.parts import at_row, celsius_of
from app.services.working import content
from models import constants, units
from models.columns import Method
from models.liquid.petroleum import table_factor

FAHRENHEIT_60 = constants.ZERO_CELSIUS + (60.0 - 32.0) / 1.8  # K
BASES = {
    "at_15_c": float(units.kelvin(15.0)), "at_20_c": float(units.kelvin(20.0)), "at_60_f": FAHRENHEIT_60,
}  # fmt: skip
Block = dict[str, Any]


def tank_statement(measured: Measured, row: int) -> Block | None:
    """The statement of a row's reading; None where no liquid was measured by its volume.

    What moved since the reading is no part of it: ``at`` is when it was read.
    """
    carried = measured.carried.get(row)
    mass = float(measured.result["liquid_mass"][row])
    if not measured.vessel(row).has_liquid or not math.isfinite(mass) or (carried and carried.stated is not None):
        return None
    density = float(measured.result["liquid_density"][row])
    weight = mass * in_air(density)
    return {
        "at": int(measured.collected.at[row]),
        **_volumes(measured, row),
        **_factors(measured, row),
        **{name: _at_base(measured, row, name) for name in BASES},
        "mass_kg": mass,
        "weight_in_air_kg": weight,
        "weight_in_air_long_ton": weight / units.KILOGRAM_PER_LONG_TON,
        "weight_in_air_short_ton": weight / units.KILOGRAM_PER_SHORT_TON,
    }


def in_air(density: float) -> float:
    """Weight in air over mass, by the conventional densities of OIML D 28. [1]"""
    air, weights = constants.CONVENTIONAL_AIR_DENSITY, constants.CONVENTIONAL_WEIGHT_DENSITY
    return (1.0 - air / density) / (1.0 - air / weights)


def _known(value: float) -> float | None:
    return value if math.isfinite(value) else None


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


def _factors(measured: Measured, row: int) -> Block:
    """C_T and C_P from the site's own base."""
    held = measured.vessel(row).parameters
    _, temperature, pressure = _to_base(measured, row, held["standard_temperature"], held["standard_pressure"])
    return _shown(temperature, pressure)


def _shown(temperature: float, pressure: float) -> Block:
    return {
        "temperature_factor": _known(temperature),
        "temperature_factor_table": _known(float(table_factor(temperature))),
        "pressure_factor": _known(pressure),
    }


def _to_base(measured: Measured, row: int, temperature: float, pressure: float) -> tuple[float, float, float]:
    """Density at a base as sampled, C_T and C_P from it; NaN where the method does not reach. [kg/m³, 1, 1]

    The sample keeps the standard state by which the chain understood it, so the content is one for all bases.
    """
    one = content(measured, row)
    warm = (one.here[0], pressure)
    state = state_of(
        one.liquid, one.density, one.sample, warm, (temperature, pressure), pressure, datum=one.standard[1]
    )
    standard, here = float(state.density_standard[0]), float(measured.result["liquid_density"][row])
    return standard, float(state.density[0]) / standard, here / float(state.density[0])


def _at_base(measured: Measured, row: int, name: str) -> Block:
    """The liquid at one base: volumes, density net and dry, in vacuo and in air."""
    temperature, vessel = BASES[name], measured.vessel(row)
    pressure = standard_pressure(vessel.liquid, vessel.site, vessel.boiling, temperature)
    standard, *factors = _to_base(measured, row, temperature, pressure)
    gross = float(measured.result["gross_observed_volume"][row])
    gross *= float(measured.result["liquid_density"][row]) / standard
    wet = at_row(measured.state.sediment_water, row)
    net, density = gross * (1.0 - wet), standard * _dry_share(measured, row) / (1.0 - wet)
    block = {
        "base_temperature_c": celsius_of(temperature),
        "base_pressure_kpa_abs": pressure / units.PASCAL_PER_KPA,
        **_shown(*factors),
        "gross_standard_volume_m3": _known(gross),
        "net_standard_volume_m3": _known(net),
        "net_standard_volume_bbl": _known(net / units.CUBIC_METRE_PER_BARREL),
        "density_kg_m3": _known(density),
        "density_in_air_kg_m3": _known(density * in_air(density)),
    }
    if name == "at_60_f":
        block["relative_density_60_60"] = _known(density / constants.WATER_DENSITY_60F)
        block["api_gravity"] = _known(float(units.api_gravity_of_density(density)))
    return block


def _dry_share(measured: Measured, row: int) -> float:
    """Mass of the dry liquid in a mass of the content as sampled, as the chain has it. [1]"""
    state, wet = measured.state, at_row(measured.state.sediment_water, row)
    if at_row(state.density_is_dry, row) > 0.0:
        return 1.0 - wet
    return 1.0 - wet * measured.vessel(row).parameters["water_density"] / at_row(state.density, row)
