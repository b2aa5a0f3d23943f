"""The lying cylinder with two heads, level or tilted, as a capacity curve."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.polynomial.legendre import leggauss

from models.arrays import FloatArray
from models.errors import DefinitionError
from models.geometry.curves import Curve
from models.geometry.heads import FLAT, Head, Zone, positive, upright, zones
from models.geometry.pieces import cut, hermite
from models.geometry.sections import section_area

KNOTS = 1024  # a piece that spans the whole vessel; measured: error below 1e-10 of the capacity
FEWEST_KNOTS = 64
NODES = 4  # of Gauss's rule between two knots
STEEPEST_TILT = math.radians(30.0)  # beyond it a vessel does not lie
STEEPEST_CONE = 0.9  # tan(tilt) over the cone's own slope


@dataclass(frozen=True)
class _Lying:
    """A lying vessel in coordinates along its axis, x from the left tangent line to the right."""

    radius: float
    length: float
    tilt: float
    gauge_at: float
    left: tuple[Zone, ...]
    right: tuple[Zone, ...]

    @property
    def shell(self) -> Zone:
        return Zone("quadratic", 0.0, self.length, (self.radius**2, 0.0, 0.0))

    def level(self, x: float, y: float) -> float:
        """Level of the horizontal plane through a point of the vessel's upright middle plane."""
        rise = (x - self.gauge_at) * math.sin(self.tilt)
        return (y + self.radius) * math.cos(self.tilt) + rise  # eq. 1

    def surface(self, level: FloatArray) -> FloatArray:
        """Area of the liquid's surface, eq. 2."""
        slope, secant = math.tan(self.tilt), 1.0 / math.cos(self.tilt)
        at_left = level * secant - self.radius + self.gauge_at * slope
        at_right = at_left - self.length * slope
        area = section_area(self.shell, at_left, slope)
        for zone in self.left:
            area = area + section_area(zone, at_left, -slope)
        for zone in self.right:
            area = area + section_area(zone, at_right, slope)
        return np.asarray(area * secant)  # eq. 2

    def breaks(self) -> FloatArray:
        """Levels at which the surface meets a corner of the vessel or just touches it."""
        found = [self.level(x, side * self.radius) for x in (0.0, self.length) for side in (-1.0, 1.0)]
        for x, outward, parts in ((0.0, -1.0, self.left), (self.length, 1.0, self.right)):
            found += [level for zone in parts for level in self._corners(x, outward, zone)]
            found += [level for zone in parts for level in self._touches(x, outward, zone)]
        ordered = np.unique(found)
        apart = np.diff(ordered, prepend=-math.inf) > 1e-12 * self.radius
        return np.asarray(ordered[apart])

    def _corners(self, x: float, outward: float, zone: Zone) -> Iterator[float]:
        rounded_tip = zone.kind == "quadratic" and zone.figures[2] < 0.0
        if not rounded_tip:  # a rounded tip is no corner: the surface passes over it smoothly
            r = zone.radius(zone.stop) if zone.kind == "torus" else 0.0
            yield self.level(x + outward * zone.stop, r)
            yield self.level(x + outward * zone.stop, -r)

    def _touches(self, x: float, outward: float, zone: Zone) -> Iterator[float]:
        """Highest point of a rounded head at the raised end, lowest at the other."""
        raised = outward * self.tilt
        if raised == 0.0 or zone.figures[-1] > 0.0 and zone.kind == "quadratic":
            return
        sine, cosine = math.sin(abs(self.tilt)), math.cos(self.tilt)
        if zone.kind == "torus":
            c, q = zone.figures
            inside = q * sine <= zone.stop
            beyond = c * cosine + q
        else:
            _, p1, p2 = zone.figures
            offset = -0.5 * p1 / p2  # the centre of the ellipse, from the tangent line outward
            square = zone.figures[0] - p2 * offset**2
            beyond = math.sqrt(square * cosine**2 - square / p2 * sine**2) + offset * sine
            inside = offset + square * sine / (-p2 * (beyond - offset * sine)) >= zone.start
        if inside:
            yield self.level(x, 0.0) + math.copysign(beyond, raised)


def horizontal_cylinder(
    *, diameter: float, length: float, left_head: Head = FLAT, right_head: Head = FLAT,
    tilt: float = 0.0, gauge_at: float | None = None,
) -> Curve:  # fmt: skip
    """Capacity curve of a lying cylinder, level zero on the shell's inside bottom at the gauge.

    Parameters
    ----------
    diameter : float
        Inside diameter. [m]
    length : float
        Between the tangent lines. [m]
    left_head, right_head : Head
        The two ends. [m]
    tilt : float
        Angle of the axis with the horizontal; positive raises the right end. [rad]
    gauge_at : float or None
        Distance of the gauge's foot from the left tangent line; the middle where it is level. [m]

    Returns
    -------
    Curve
        By the vertical level above the gauge's foot, up to where the vertical meets the shell. [m, m³]

    Notes
    -----
    At x along the axis a liquid at level h stands y above the axis, square to it, and the surface is the
    sum of the sections S of shell and heads, seen square to the axis::

        h = (y + R) cos θ + (x − x_g) sin θ        (1)
        A = dV/dh = Σ S / cos θ                    (2)
        V = ∫ A dh from the lowest point           (3)

    The integral is taken by Gauss's rule between knots that are dense where the surface meets a corner of
    the vessel, and a Hermite cubic stands between each two knots.

    References
    ----------
    .. [1] D. Jones, "Computing Fluid Tank Volumes", Chemical Processing, 2002; ISO 12917-1:2017 for the
       lying cylinder's table and its tilt.
    """
    radius = 0.5 * positive(diameter, "diameter_m")
    positive(length, "length_m")
    for head, name in ((left_head, "left_head"), (right_head, "right_head")):
        if head.inverted:
            raise DefinitionError(f"{name}/inverted is true; only a bottom can be", field=f"{name}/inverted")
    left, right = zones(left_head, radius, "left_head"), zones(right_head, radius, "right_head")
    _check_tilt(tilt, left + right)
    vessel = _Lying(radius, length, tilt, _checked_gauge(gauge_at, length, tilt), left, right)
    levels, volumes, areas = _integrated(vessel)
    capacity = math.pi * radius**2 * length + sum(upright(parts).total for parts in (left, right) if parts)
    spline = hermite(levels, volumes, areas)
    source = "sections in closed form, summed by Gauss's rule; Hermite cubics, error below 1e-10 of the capacity"
    whole = Curve(spline.heights, spline.coefficients, capacity, "horizontal_cylinder", source)
    return cut(whole, 0.0, min(diameter / math.cos(tilt), whole.top)) if tilt else whole


def _check_tilt(tilt: float, parts: tuple[Zone, ...]) -> None:
    if not abs(tilt) <= STEEPEST_TILT:
        raise DefinitionError(
            f"tilt_deg is {math.degrees(tilt):.6g}; a lying cylinder's is between "
            f"{-math.degrees(STEEPEST_TILT):.0f} and {math.degrees(STEEPEST_TILT):.0f} degrees",
            field="tilt_deg",
        )
    cones = [math.sqrt(zone.figures[2]) for zone in parts if zone.kind == "quadratic" and zone.figures[2] > 0.0]
    if cones and math.tan(abs(tilt)) > STEEPEST_CONE * min(cones):
        limit = math.degrees(math.atan(STEEPEST_CONE * min(cones)))
        raise DefinitionError(
            f"tilt_deg is {math.degrees(tilt):.6g}; with so long a cone it must stay below {limit:.3g} degrees",
            field="tilt_deg",
        )


def _checked_gauge(gauge_at: float | None, length: float, tilt: float) -> float:
    if gauge_at is None:
        if tilt:
            raise DefinitionError(
                "gauge_at_m is missing; a tilted vessel's level depends on where its gauge stands",
                field="gauge_at_m",
            )
        return 0.5 * length
    if not 0.0 <= gauge_at <= length:
        raise DefinitionError(
            f"gauge_at_m is {gauge_at:.6g} m; it must be on the shell, between 0 and {length:.6g} m",
            field="gauge_at_m",
        )
    return gauge_at


def _integrated(vessel: _Lying) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Knots from the lowest point to the highest, with volume and surface at each, eq. 3."""
    breaks = vessel.breaks()
    span = breaks[-1] - breaks[0]
    nodes, weights = leggauss(NODES)
    knots, volumes = [breaks[:1]], [np.zeros(1)]
    for low, high in zip(breaks[:-1], breaks[1:], strict=True):
        # The error grows with the fourth power of the spacing and with the piece's share.
        count = max(FEWEST_KNOTS, math.ceil(KNOTS * ((high - low) / span) ** 0.25))
        angle = np.linspace(0.0, np.pi, count + 1)
        half_step = 0.5 * np.pi / count
        at = (angle[:-1, None] + half_step * (1.0 + nodes)).ravel()
        half = 0.5 * (high - low)
        # Twice the square of the half angle's sine keeps the digits near the lower end.
        slices = vessel.surface(low + 2.0 * half * np.sin(0.5 * at) ** 2) * half * np.sin(at)
        steps = half_step * (slices.reshape(-1, NODES) @ weights)  # eq. 3
        inner = low + 2.0 * half * np.sin(0.5 * angle[1:]) ** 2
        inner[-1] = high
        knots.append(inner)
        volumes.append(volumes[-1][-1] + np.cumsum(steps))
    levels = np.concatenate(knots)
    return levels, np.concatenate(volumes), vessel.surface(levels)
