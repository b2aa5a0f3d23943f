"""Heads, bottoms and roofs of vessels: their depth, their profile and their volume to a height."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from models.arrays import FloatArray
from models.errors import DefinitionError
from models.geometry.pieces import Pieces, hermite, join, polynomial

KNUCKLE_KNOTS = 385  # measured: below 1e-12 of the head's volume for every proportion in use


@dataclass(frozen=True)
class Head:
    """The end of a cylinder.

    Parameters
    ----------
    kind : str
        ``flat``, ``hemispherical``, ``ellipsoidal``, ``torispherical`` or ``cone``. [1]
    depth : float or None
        From the tangent line to the outermost point; of ellipsoidal heads and cones. [m]
    crown_radius, knuckle_radius : float or None
        Inside radii of a torispherical head; without a knuckle it is a spherical cap. [m]
    inverted : bool
        True where a bottom points up into the vessel. [1]
    """

    kind: str = "flat"
    depth: float | None = None
    crown_radius: float | None = None
    knuckle_radius: float | None = None
    inverted: bool = False


FLAT = Head()


@dataclass(frozen=True)
class Zone:
    """Part of a head (or the shell) with one formula for its profile r(x), x outward along the axis.

    Parameters
    ----------
    kind : str
        ``quadratic``: r² = p_0 + p_1 x + p_2 x²; ``torus``: r = c + √(q² − x²). [1]
    start, stop : float
        Where it begins and ends, from the tangent line outward. [m]
    figures : tuple of float
        (p_0, p_1, p_2) or (c, q). [m², m, 1] or [m, m]
    """

    kind: str
    start: float
    stop: float
    figures: tuple[float, ...]

    def radius(self, x: float) -> float:
        """Radius of the vessel at a distance from the tangent line.

        Parameters
        ----------
        x : float
            Distance, outward. [m]

        Returns
        -------
        float
            Inside radius. [m]
        """
        if self.kind == "torus":
            c, q = self.figures
            return c + math.sqrt(max(q * q - x * x, 0.0))
        p0, p1, p2 = self.figures
        return math.sqrt(max(p0 + x * (p1 + x * p2), 0.0))


def zones(head: Head, radius: float, name: str = "head") -> tuple[Zone, ...]:
    """The parts of a head from the tangent line outward.

    Parameters
    ----------
    head : Head
        The head; whether it is inverted plays no part. [m]
    radius : float
        Inside radius of the cylinder. [m]
    name : str
        Field that an error names. [1]

    Returns
    -------
    tuple of Zone
        None for a flat end, two for a torispherical head, else one. [m]

    Notes
    -----
    R the radius, a the depth, F and q the radii of crown and knuckle, x outward from the tangent line::

        cone            r = R (1 − x/a)                                          (1)
        ellipsoidal     r² = R² (1 − x²/a²), a = R where hemispherical           (2)
        torispherical   a = F − e,  e = √((F − q)² − (R − q)²)                   (3)
                        r = R − q + √(q² − x²) up to x_j = q e/(F − q)           (4)
                        r² = F² − (x + e)² beyond                                (5)

    References
    ----------
    .. [1] D. Jones, "Computing Fluid Tank Volumes, Part II", Chemical Processing, 2003.
    """
    return ZONES[_checked(head, name).kind](head, radius, name)


def _checked(head: Head, name: str) -> Head:
    if head.kind not in ZONES:
        raise DefinitionError(f"{name} is of no known kind; known are {', '.join(ZONES)}", field=f"{name}/kind")
    return head


def positive(value: float | None, field: str) -> float:
    """A length that a definition needs.

    Parameters
    ----------
    value : float or None
        What the definition says. [m]
    field : str
        Its field, named in the error. [1]

    Returns
    -------
    float
        The value, finite and above zero. [m]
    """
    if value is None or not math.isfinite(value) or value <= 0.0:
        told = "missing" if value is None else f"{value:.6g} m"
        raise DefinitionError(f"{field} is {told}; it must be above 0 m", field=field)
    return float(value)


def _flat(head: Head, radius: float, name: str) -> tuple[Zone, ...]:
    return ()


def _cone(head: Head, radius: float, name: str) -> tuple[Zone, ...]:
    depth = positive(head.depth, f"{name}/depth_m")
    slope = radius / depth
    return (Zone("quadratic", 0.0, depth, (radius**2, -2.0 * radius * slope, slope**2)),)  # eq. 1


def _ellipsoidal(head: Head, radius: float, name: str) -> tuple[Zone, ...]:
    depth = positive(head.depth, f"{name}/depth_m")
    return (Zone("quadratic", 0.0, depth, (radius**2, 0.0, -((radius / depth) ** 2))),)  # eq. 2


def _hemispherical(head: Head, radius: float, name: str) -> tuple[Zone, ...]:
    return (Zone("quadratic", 0.0, radius, (radius**2, 0.0, -1.0)),)  # eq. 2


def _torispherical(head: Head, radius: float, name: str) -> tuple[Zone, ...]:
    crown = positive(head.crown_radius, f"{name}/crown_radius_m")
    knuckle = 0.0 if head.knuckle_radius is None else head.knuckle_radius
    if crown < radius:
        raise DefinitionError(
            f"{name}/crown_radius_m is {crown:.6g} m; it must be at least the radius of the cylinder, "
            f"{radius:.6g} m, or the dish does not reach the shell",
            field=f"{name}/crown_radius_m",
        )
    if not 0.0 <= knuckle < radius:
        raise DefinitionError(
            f"{name}/knuckle_radius_m is {knuckle:.6g} m; it must be at least 0 and below the radius of the "
            f"cylinder, {radius:.6g} m",
            field=f"{name}/knuckle_radius_m",
        )
    inner = radius - knuckle
    offset = math.sqrt((crown - knuckle) ** 2 - inner**2)  # eq. 3
    junction = knuckle * offset / (crown - knuckle)  # eq. 4
    parts = (
        Zone("torus", 0.0, junction, (inner, knuckle)),
        Zone("quadratic", junction, crown - offset, (crown**2 - offset**2, -2.0 * offset, -1.0)),  # eq. 5
    )
    return parts if junction > 0.0 else parts[1:]


ZONES: dict[str, Callable[[Head, float, str], tuple[Zone, ...]]] = {
    "flat": _flat,
    "hemispherical": _hemispherical,
    "ellipsoidal": _ellipsoidal,
    "torispherical": _torispherical,
    "cone": _cone,
}


def head_depth(parts: tuple[Zone, ...]) -> float:
    """Distance from the tangent line to the outermost point of a head.

    Parameters
    ----------
    parts : tuple of Zone
        The head. [m]

    Returns
    -------
    float
        Depth; 0 of a flat end. [m]
    """
    return parts[-1].stop if parts else 0.0


def upright(parts: tuple[Zone, ...]) -> Pieces:
    """Volume of a head that hangs below its cylinder, by the height above its lowest point.

    Parameters
    ----------
    parts : tuple of Zone
        The head; not a flat one. [m]

    Returns
    -------
    Pieces
        From 0 at the outermost point to the tangent line. [m, m³]

    Notes
    -----
    Discs of area π r² add up to::

        V = π ∫ (p_0 + p_1 x + p_2 x²) dx                                             (6)
        V = π [(c² + q²) x − x³/3 + c (x √(q² − x²) + q² asin(x/q))]   of a torus     (7)

    Equation (6) is a cubic of the height and exact; (7) is taken at knots with even angles, and a
    Hermite cubic stands between each two.

    References
    ----------
    .. [1] D. Jones, "Computing Fluid Tank Volumes, Part II", Chemical Processing, 2003.
    """
    return join([_quadratic(part) if part.kind == "quadratic" else _torus(part) for part in reversed(parts)])


def _quadratic(part: Zone) -> Pieces:
    p0, p1, p2 = part.figures
    x = part.stop
    cubic = (0.0, p0 + x * (p1 + x * p2), -0.5 * (p1 + 2.0 * p2 * x), p2 / 3.0)
    return polynomial(0.0, part.stop - part.start, [math.pi * c for c in cubic])  # eq. 6


def _torus(part: Zone) -> Pieces:
    c, q = part.figures
    angle = np.linspace(math.asin(min(part.stop / q, 1.0)), 0.0, KNUCKLE_KNOTS)
    x: FloatArray = q * np.sin(angle)
    root = q * np.cos(angle)
    volume = np.pi * ((c * c + q * q) * x - x**3 / 3.0 + c * (x * root + q * q * angle))  # eq. 7
    return hermite(x[0] - x, volume[0] - volume, np.pi * (c + root) ** 2)
