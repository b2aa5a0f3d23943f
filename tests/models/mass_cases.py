"""Vessels and readings for the tests of the chain, as columns made by hand, without the service."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from models.columns import Method, State, Vessels
from models.geometry import shapes, tables
from models.geometry.curves import Curve, Curves
from models.geometry.head_stress import CoursedShell, HeadStress, coursed_shell
from models.geometry.heads import Head
from models.geometry.lying import horizontal_cylinder
from models.geometry.shell import pressure_strain
from models.liquid.compiled import LiquidColumns
from models.liquid.definition import ExpansivityLiquid, Liquid
from models.saturation import SaturationColumns
from models.vapour.series import VapourColumns, VapourMixture

STEEL = 1.12e-5  # 1/K, carbon steel
ATMOSPHERE = 101_325.0
NO_WATER = -math.inf


@dataclass(frozen=True)
class Case:
    """One vessel and one reading of it; names as in ``Vessels`` and ``State``."""

    name: str
    method: Method
    curve: Curve | None
    vessel: dict[str, Any]
    reading: dict[str, float]
    mixture: str | None = None
    boiling: str | None = None
    capacity: float | None = None
    courses: CoursedShell | None = None
    liquid: Liquid = ExpansivityLiquid((0.0,), 288.15, 0.0)

    def reads(self, **changed: float) -> Case:
        """The same vessel, read otherwise."""
        return replace(self, reading=self.reading | changed)


VESSEL: dict[str, Any] = {
    "is_table": 0.0, "expansion": STEEL, "expansion_temperature": 288.15, "liquid_weight": 7.0 / 8.0,
    "strain_sum": 0.0, "strain_vertical": 0.0, "strain_pressure": 0.0, "roof_mass": 0.0, "roof_lands": 0.0,
    "roof_floats": 0.0, "roof_volume_per_mass": 0.0, "standard_temperature": 288.15, "standard_pressure": ATMOSPHERE,
    "water_density": 999.1, "head_included": 0.0, "gas_standard_density": 1.0,
}  # fmt: skip
READING: dict[str, float] = {
    "level": math.nan, "water_level": NO_WATER, "liquid_temperature": math.nan, "ambient_temperature": 278.15,
    "vapour_temperature": math.nan, "pressure": ATMOSPHERE, "atmosphere": ATMOSPHERE, "density": math.nan,
    "density_temperature": 288.15, "density_pressure": ATMOSPHERE, "sediment_water": 0.0, "density_is_dry": 0.0,
    "pressure_uncertainty": 1e3, "temperature_uncertainty": 0.3,
}  # fmt: skip


def vessels(cases: Sequence[Case]) -> Vessels:
    """Columns of parameters of the cases' vessels, one row a case."""
    curves = [case.curve for case in cases if case.curve is not None]
    mixtures = [VapourMixture((case.mixture,)) for case in cases if case.mixture is not None]
    boiling = [{case.boiling: 1.0} for case in cases if case.boiling is not None]
    merged = [VESSEL | case.vessel for case in cases]

    def rows(held: list[bool]) -> np.ndarray[tuple[int, ...], np.dtype[np.intp]]:
        return np.asarray(np.maximum(np.cumsum(held) - 1, 0), dtype=np.intp)

    def limit(which: str) -> np.ndarray[tuple[int, ...], np.dtype[np.float64]]:
        return np.array([getattr(case.curve, which) if case.curve else math.nan for case in cases])

    plain = {name: np.array([one[name] for one in merged], dtype=float) for name in VESSEL}
    return Vessels(
        method=np.array([int(case.method) for case in cases]),
        curves=Curves.from_curves(curves) if curves else None,
        curve_row=rows([case.curve is not None for case in cases]),
        bottom=limit("bottom"), top=limit("top"),
        capacity=np.array([case.curve.capacity if case.curve else case.capacity for case in cases], dtype=float),
        liquids=LiquidColumns.from_liquids([case.liquid for case in cases]), liquid_row=np.arange(len(cases)),
        head_stress=HeadStress.from_shells([case.courses for case in cases]), head_row=np.arange(len(cases)),
        vapour=VapourColumns.from_mixtures(mixtures) if mixtures else None,
        vapour_row=rows([case.mixture is not None for case in cases]),
        saturation=SaturationColumns.from_compositions(boiling) if boiling else None,
        saturation_row=rows([case.boiling is not None for case in cases]),
        **plain,
    )  # fmt: skip


def state(cases: Sequence[Case]) -> State:
    """The cases' readings, one row a case."""
    merged = [READING | case.reading for case in cases]
    return State(**{name: np.array([one[name] for one in merged], dtype=float) for name in READING})


CRUDE = ExpansivityLiquid((8.3e-4,), 288.15, 7.5e-10)
PROPANE = ExpansivityLiquid((2.9e-3, 1.1e-5), 288.15, 4.5e-9)
UPRIGHT = shapes.vertical_cylinder(diameter=30.0, height=15.0, bottom=Head("cone", 0.3))
OIL_READING = {
    "level": 8.231, "water_level": 0.52, "liquid_temperature": 303.4, "density": 846.0, "density_temperature": 293.7,
    "sediment_water": 0.004,
}  # fmt: skip
ROOF = {"roof_mass": 1.2e5, "roof_lands": 1.8, "roof_floats": 2.1}


def _net_table() -> Curve:
    levels = np.linspace(0.0, 15.0, 1501)
    return tables.capacity_table(levels, 700.0 * levels + 3.0, total_volume=10_600.0)


def strained(kind: str, diameter: float, thickness: float) -> dict[str, float]:
    """Strains of a steel shell as columns of a vessel."""
    total, vertical = pressure_strain(kind, diameter, thickness, 207e9, 0.3)
    return {"strain_sum": total, "strain_vertical": vertical}


BULLET = horizontal_cylinder(
    diameter=3.0, length=14.0, left_head=Head("ellipsoidal", 0.75), right_head=Head("ellipsoidal", 0.75),
    tilt=math.radians(1.0), gauge_at=2.0,
)  # fmt: skip
SPHERE = shapes.sphere(diameter=18.0)
TWO_PHASE = Method.LIQUID | Method.VAPOUR | Method.SATURATION
LPG_READING = {
    "level": 1.4, "liquid_temperature": 291.3, "vapour_temperature": 296.2, "pressure": 7.6e5, "density": 507.4,
    "density_temperature": 289.4, "density_pressure": 7.4e5,
}  # fmt: skip
BULLET_CASE = Case(
    "bullet, all measured", TWO_PHASE, BULLET, strained("horizontal_cylinder", 3.0, 0.018), LPG_READING,
    "propane", "propane", liquid=PROPANE,
)  # fmt: skip
SPHERE_CASE = replace(
    BULLET_CASE, name="sphere under pressure", curve=SPHERE, vessel=strained("sphere", 18.0, 0.028)
).reads(level=11.3)
OIL = Case("upright, wet sample", Method.LIQUID, UPRIGHT, {}, OIL_READING, liquid=CRUDE)
NITROGEN = Case(
    "gas receiver", Method.VAPOUR, None, strained("horizontal_cylinder", 2.0, 0.02),
    {"vapour_temperature": 297.2, "pressure": 3.1e6}, "nitrogen", capacity=50.0,
)  # fmt: skip
PENTANE = ExpansivityLiquid((1.6e-3,), 288.15, 2.2e-9)
BLANKETED = Case(
    "blanketed, all measured", TWO_PHASE | Method.BLANKET, UPRIGHT, strained("vertical_cylinder", 30.0, 0.01),
    {"level": 6.2, "liquid_temperature": 293.4, "vapour_temperature": 297.1, "pressure": ATMOSPHERE + 5e3,
     "density": 626.1, "density_temperature": 293.15},
    "n-pentane", "n-pentane", liquid=PENTANE,
)  # fmt: skip
FLOATING = replace(OIL, name="floating roof", method=Method.LIQUID | Method.ROOF, vessel=ROOF)
DEDUCTED = replace(
    FLOATING, name="floating roof that the table deducts", curve=_net_table(),
    vessel=ROOF | {"roof_volume_per_mass": 1.0 / 850.0, "is_table": 1.0},
)  # fmt: skip

COURSES = coursed_shell(
    diameter=30.0, elastic_modulus=207e9, courses=[(3.0, 0.02), (3.0, 0.014), (9.0, 0.008)], foot=0.3, top=15.3
)
HEADED = replace(OIL, name="upright, widened by its head", method=Method.LIQUID | Method.HEAD, courses=COURSES)

CASES = [
    OIL,
    HEADED,
    replace(HEADED, name="upright, widened beyond its table", vessel={"head_included": 700.0}),
    replace(OIL, name="upright, dry sample").reads(density_is_dry=1.0),
    replace(OIL, name="upright, vented to a low pressure", vessel=strained("vertical_cylinder", 30.0, 0.01))
    .reads(pressure=ATMOSPHERE + 4e3),
    FLOATING,
    replace(FLOATING, name="floating roof, landing").reads(level=1.93),
    DEDUCTED,
    replace(DEDUCTED, name="floating roof that the table deducts, landing").reads(level=2.0),
    BULLET_CASE,
    replace(BULLET_CASE, name="bullet, no vapour temperature").reads(vapour_temperature=math.nan),
    replace(BULLET_CASE, name="bullet, no pressure").reads(vapour_temperature=math.nan, pressure=math.nan),
    SPHERE_CASE,
    replace(SPHERE_CASE, name="sphere, no pressure").reads(vapour_temperature=math.nan, pressure=math.nan),
    BLANKETED,
    replace(BLANKETED, name="blanketed, no vapour temperature").reads(vapour_temperature=math.nan),
    replace(BLANKETED, name="a blanket that is gone").reads(vapour_temperature=312.0),
    NITROGEN,
]  # fmt: skip
