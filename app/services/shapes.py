"""The shapes of the wire as capacity curves and strains of the models."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np

from app.schemas import shape as wire
from app.schemas.vessel import Vessel
from models import units
from models.errors import DefinitionError
from models.geometry import shapes, tables
from models.geometry.curves import Curve
from models.geometry.head_stress import CoursedShell, coursed_shell
from models.geometry.heads import Head, head_depth, zones
from models.geometry.lying import horizontal_cylinder
from models.geometry.pieces import with_datum
from models.geometry.shell import pressure_strain


def capacity_curve(body: Vessel) -> tuple[Curve | None, float]:
    """The vessel's capacity curve on its gauge's datum, None without a level, and its whole capacity. [m³]"""
    shape = body.shape
    if isinstance(shape, wire.FixedVolume):
        return None, shapes.fixed_volume(volume=shape.volume_m3)
    if isinstance(shape, wire.Junction):
        return None, 0.0
    curve = BUILDERS[shape.kind](shape)
    if body.deadwood:
        bottoms, tops, volumes = (np.array(column) for column in zip(*body.deadwood, strict=True))
        curve = tables.with_deadwood(curve, bottoms, tops, volumes)
    if body.gauging.datum_m and not isinstance(shape, wire.CapacityTable):
        curve = with_datum(curve, body.gauging.datum_m)
    return curve, curve.capacity


def _vertical(shape: wire.VerticalCylinder) -> Curve:
    return shapes.vertical_cylinder(
        diameter=shape.diameter_m, height=shape.height_m, bottom=_head(shape.bottom), top=_head(shape.top)
    )


def _horizontal(shape: wire.HorizontalCylinder) -> Curve:
    return horizontal_cylinder(
        diameter=shape.diameter_m, length=shape.length_m, left_head=_head(shape.left_head),
        right_head=_head(shape.right_head), tilt=math.radians(shape.tilt_deg), gauge_at=shape.gauge_at_m,
    )  # fmt: skip


def _sphere(shape: wire.Sphere) -> Curve:
    return shapes.sphere(diameter=shape.diameter_m)


def _box(shape: wire.Box) -> Curve:
    return shapes.box(length=shape.length_m, width=shape.width_m, height=shape.height_m)


def _table(shape: wire.CapacityTable) -> Curve:
    levels, volumes = zip(*shape.rows, strict=True)
    return tables.capacity_table(levels, volumes, total_volume=shape.total_volume_m3, interpolation=shape.interpolation)


BUILDERS: dict[str, Callable[..., Curve]] = {
    "vertical_cylinder": _vertical,
    "horizontal_cylinder": _horizontal,
    "sphere": _sphere,
    "box": _box,
    "capacity_table": _table,
}


def _head(head: wire.Head | wire.Bottom) -> Head:
    return Head(
        kind=head.kind,
        depth=getattr(head, "depth_m", None),
        crown_radius=getattr(head, "crown_radius_m", None),
        knuckle_radius=getattr(head, "knuckle_radius_m", None),
        inverted=getattr(head, "inverted", False),
    )


def strain_of(body: Vessel) -> tuple[float, float]:
    """Sum of the three strains and the vertical one for each pascal of gauge pressure. [1/Pa]"""
    shell, shape = body.shell, body.shape
    if shell.thickness_m is None:
        return 0.0, 0.0
    kind = getattr(shape, "of", None) or shape.kind
    diameter = getattr(shape, "diameter_m", None)
    if kind in ("fixed_volume", "junction", "capacity_table"):
        return 0.0, 0.0
    if diameter is None and kind != "box":
        raise DefinitionError(
            "shell/thickness_m is given, but the table says no diameter_m: pressure strain needs both",
            field="shape/diameter_m",
        )
    return pressure_strain(
        kind, diameter or 1.0, shell.thickness_m, shell.elastic_modulus_gpa * 1e6 * units.PASCAL_PER_KPA,
        shell.poisson_ratio,
    )  # fmt: skip


def courses_of(body: Vessel) -> CoursedShell | None:
    """The shell by its courses, on the levels of the vessel's curve; None where no courses are given."""
    shape, shell = body.shape, body.shell
    if not shell.courses:
        return None
    if isinstance(shape, wire.VerticalCylinder):
        bottom = _head(shape.bottom)
        depth = 0.0 if bottom.inverted else head_depth(zones(bottom, 0.5 * shape.diameter_m, "bottom"))
        diameter, foot = shape.diameter_m, depth - body.gauging.datum_m
        top = foot + shape.height_m
    elif isinstance(shape, wire.CapacityTable) and shape.of == "vertical_cylinder" and shape.diameter_m is not None:
        diameter, foot, top = shape.diameter_m, 0.0, shape.rows[-1][0]
    else:
        raise DefinitionError(
            "courses are of an upright cylinder: a vertical_cylinder, or a capacity_table of one that gives diameter_m",
            field="courses",
        )
    return coursed_shell(
        diameter=diameter, elastic_modulus=shell.elastic_modulus_gpa * 1e6 * units.PASCAL_PER_KPA,
        courses=shell.courses, foot=foot, top=top,
    )  # fmt: skip


def head_included(body: Vessel) -> float:
    """Density at which the capacity table holds the widening by the head already; 0 where it does not. [kg/m³]"""
    return getattr(body.shape, "head_included_at_kg_m3", None) or 0.0
