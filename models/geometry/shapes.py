"""Shapes of vessels as capacity curves: upright and lying cylinders, spheres, boxes, tables, stamped volumes."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np

from models.errors import DefinitionError
from models.geometry.curves import Curve
from models.geometry.heads import FLAT, Head, head_depth, positive, upright, zones
from models.geometry.lying import horizontal_cylinder
from models.geometry.pieces import Pieces, join, mirrored, polynomial
from models.geometry.tables import capacity_table

CLOSED = "closed form"
SPLINED = "closed form; Hermite cubics between knots in the knuckles, error below 1e-12 of the volume"


def vertical_cylinder(*, diameter: float, height: float, bottom: Head = FLAT, top: Head = FLAT) -> Curve:
    """Capacity curve of an upright cylinder, level zero at its lowest inside point.

    Parameters
    ----------
    diameter : float
        Inside diameter. [m]
    height : float
        Of the shell between its tangent lines. [m]
    bottom, top : Head
        The bottom, which may be inverted, and the roof. [m]

    Returns
    -------
    Curve
        From the lowest inside point to the highest. [m, m³]

    Notes
    -----
    With the bottom's volume V_b(z) to a height z above its lowest point, its depth a, and R the radius::

        V = V_b(h)                               h ≤ a              (1)
        V = V_b(a) + π R² (h − a)                in the shell       (2)
        V = π R² h − V_b(a) + V_b(a − h)         h ≤ a, inverted    (3)

    An inverted bottom's lowest points are its rim. The roof is a bottom upside down.

    References
    ----------
    .. [1] D. Jones, "Computing Fluid Tank Volumes, Part II", Chemical Processing, 2003.
    """
    radius = 0.5 * positive(diameter, "diameter_m")
    shell = positive(height, "height_m")
    if top.inverted:
        raise DefinitionError("top/inverted is true; only a bottom can point into the vessel", field="top/inverted")
    area = math.pi * radius**2
    below, above = zones(bottom, radius, "bottom"), zones(top, radius, "top")
    parts: list[Pieces] = []
    if below and bottom.inverted:
        depth = head_depth(below)
        if depth > shell:
            raise DefinitionError(
                f"the inverted bottom is {depth:.6g} m deep; it must end inside the shell, whose height_m is "
                f"{shell:.6g} m",
                field="bottom",
            )
        parts.append(_around(mirrored(upright(below)), area))  # eq. 3
        shell -= depth
    elif below:
        parts.append(upright(below))  # eq. 1
    if shell > 0.0:
        parts.append(polynomial(0.0, shell, (0.0, area)))  # eq. 2
    if above:
        parts.append(mirrored(upright(above)))
    whole = join(parts)
    source = SPLINED if any(zone.kind == "torus" for zone in below + above) else CLOSED
    return Curve(whole.heights, whole.coefficients, whole.total, "vertical_cylinder", source)


def _around(body: Pieces, area: float) -> Pieces:
    """Room in a cylinder around a body that stands on its floor."""
    rows = -body.coefficients
    rows[:, 0] += area * body.heights[:-1]
    rows[:, 1] += area
    return Pieces(body.heights, rows)


def sphere(*, diameter: float) -> Curve:
    """Capacity curve of a sphere.

    Parameters
    ----------
    diameter : float
        Inside diameter. [m]

    Returns
    -------
    Curve
        From the lowest point to the highest. [m, m³]

    Notes
    -----
    With R the radius::

        V = π h² (3 R − h)/3        (1)

    References
    ----------
    .. [1] Archimedes, "On the Sphere and Cylinder"; the spherical segment of every handbook.
    """
    size = positive(diameter, "diameter_m")
    cubic = polynomial(0.0, size, (0.0, 0.0, 0.5 * math.pi * size, -math.pi / 3.0))  # eq. 1
    return Curve(cubic.heights, cubic.coefficients, math.pi * size**3 / 6.0, "sphere", CLOSED)


def box(*, length: float, width: float, height: float) -> Curve:
    """Capacity curve of an upright box.

    Parameters
    ----------
    length, width, height : float
        Inside dimensions. [m]

    Returns
    -------
    Curve
        From the floor to the roof. [m, m³]
    """
    top = positive(height, "height_m")
    area = positive(length, "length_m") * positive(width, "width_m")
    prism = polynomial(0.0, top, (0.0, area))
    return Curve(prism.heights, prism.coefficients, area * top, "box", CLOSED)


def fixed_volume(*, volume: float) -> float:
    """Capacity of a vessel without a level: a gas receiver of stamped capacity, a line kept full.

    Parameters
    ----------
    volume : float
        Its volume. [m³]

    Returns
    -------
    float
        The same volume, finite and above zero. [m³]
    """
    if not np.isfinite(volume) or volume <= 0.0:
        raise DefinitionError(f"volume_m3 is {volume:.6g} m³; it must be above 0 m³", field="volume_m3")
    return float(volume)


SHAPES: dict[str, Callable[..., Curve]] = {
    "vertical_cylinder": vertical_cylinder,
    "horizontal_cylinder": horizontal_cylinder,
    "sphere": sphere,
    "box": box,
    "capacity_table": capacity_table,
}
