"""Definitions and readings that the tests of the services share, and the shortest way from them to masses."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from app.schemas.calculation import CalculationReading
from app.schemas.site import Conditions
from app.schemas.substance import Substance
from app.schemas.vessel import Vessel
from app.services.calculate import collected
from app.services.compile import CompiledVessel, compile_bodies
from app.services.explain import answers
from app.services.measure import Measured, measure

Body = dict[str, Any]

GAS_OIL: Body = {
    "name": "gas oil",
    "liquid": {
        "model": "expansivity", "density_kg_m3": 840.0, "density_uncertainty_kg_m3": 1.0,
        "expansivity_per_k": 8.3e-4, "compressibility_per_kpa": 7.5e-7,
    },
}  # fmt: skip
PROPANE: Body = {
    "name": "propane",
    "liquid": {
        "model": "expansivity", "density_kg_m3": 507.4, "expansivity_per_k": [2.9e-3, 1.1e-5],
        "compressibility_per_kpa": 4.5e-6,
    },
    "vapour": {"model": "virial", "components": [{"id": "propane", "mole_fraction": 1.0}]},
}  # fmt: skip
HYDROGEN: Body = {
    "name": "hydrogen",
    "vapour": {"model": "virial", "components": [{"id": "hydrogen", "mole_fraction": 1.0}]},
}

TANK: Body = {"kind": "vertical_cylinder", "diameter_m": 30.0, "height_m": 15.0}
SPHERE: Body = {"kind": "sphere", "diameter_m": 18.0}
BULLET: Body = {
    "kind": "horizontal_cylinder", "diameter_m": 3.0, "length_m": 14.0,
    "left_head": {"kind": "ellipsoidal", "depth_m": 0.75}, "right_head": {"kind": "ellipsoidal", "depth_m": 0.75},
    "tilt_deg": 1.0, "gauge_at_m": 2.0,
}  # fmt: skip
RECEIVER: Body = {"kind": "fixed_volume", "volume_m3": 95.0}
SITE: Body = {"elevation_m": 12.0}

OIL_READ: Body = {
    "level_m": 8.231, "free_water_level_m": 0.21, "liquid_temperature_c": 24.3, "ambient_temperature_c": 9.0,
    "observed_density_kg_m3": 843.1, "observed_density_temperature_c": 21.0, "sediment_water_pct": 0.4,
}  # fmt: skip
LPG_READ: Body = {
    "level_m": 1.4, "liquid_temperature_c": 18.1, "vapour_temperature_c": 23.0, "pressure_kpa": 660.0,
    "ambient_temperature_c": 9.0,
}  # fmt: skip
GAS_READ: Body = {"vapour_temperature_c": 25.0, "pressure_kpa": 4900.0, "ambient_temperature_c": 9.0}


def compiled(
    shape: Mapping[str, Any], substance: Body = GAS_OIL, *, name: str = "tk-1", site: Body = SITE, **vessel: Any
) -> CompiledVessel:
    """One vessel as compiled from its bodies."""
    body = {"name": name, "substance": substance["name"].replace(" ", "-"), "shape": dict(shape)} | vessel
    return compile_bodies(
        name, Conditions.model_validate(site), Vessel.model_validate(body), Substance.model_validate(substance)
    )


def readings(rows: Sequence[Body]) -> tuple[CalculationReading, ...]:
    """Readings as they come over the wire; lists are tuples there."""
    return tuple(CalculationReading.model_validate(row) for row in rows)


def masses(vessel: CompiledVessel, *rows: Body) -> Measured:
    """The masses of a vessel's readings, each standing alone."""
    return measure(collected(vessel, readings(rows)))


def answer(vessel: CompiledVessel, row: Body, **blocks: bool) -> Body:
    """One reading's inventory."""
    return answers(masses(vessel, row), **blocks)[0]


def codes(inventory: Body) -> set[str]:
    """Codes of an inventory's warnings."""
    return {warning["code"] for warning in inventory["warnings"]}
