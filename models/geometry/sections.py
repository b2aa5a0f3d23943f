"""Surface of the liquid in a lying vessel: plane sections of solids of revolution, level or tilted."""

from __future__ import annotations

import math

import numpy as np
from numpy.polynomial.legendre import leggauss

from models.arrays import BoolArray, FloatArray
from models.geometry.heads import Zone

SMALL_ANGLE = 0.25  # rad; below it x − sin x is a series, whose first term left out is 9e-16 of it
KNUCKLE_NODES = 40
EPSILON = float(np.finfo(np.float64).eps)


def section_area(zone: Zone, depth: FloatArray, slope: float) -> FloatArray:
    """Area cut from one zone of a solid of revolution by planes y = depth − slope · x, over the x axis.

    Parameters
    ----------
    zone : Zone
        Profile r(x). [m]
    depth : FloatArray, shape (n,)
        Height of each plane over the vessel's axis at x = 0, square to the axis. [m]
    slope : float
        Fall of the planes along the axis. [1]

    Returns
    -------
    FloatArray, shape (n,)
        Area of the sections as seen square to the axis; the tilted plane's own is larger by
        √(1 + slope²). [m²]

    Notes
    -----
    The chord at x is 2 √(r² − y²), and the area its integral over the x where r > |y|::

        S = 2 ∫ √(r(x)² − (y_0 − τ x)²) dx        (1)

    Where r² is a quadratic, so is g = r² − y² = α x² + β x + γ, and the integral is the area under an
    ellipse (α < 0) or a hyperbola (α > 0, cones). Between x_a and x_b, with s = √g and w = x_b − x_a::

        ellipse     ∫ s dx = w (s_a + s_b)/2 + D (δ − sin δ)/(8 |α|^{3/2})                      (2)
        hyperbola   ∫ s dx = Q(x_a) − Q(x_b),  Q = (m − x) s/2 − K asinh(s/√K)/(2 √α)           (3)

    with D = β² − 4αγ, δ the angle between both points seen from the centre of the ellipse drawn as a
    circle, m = −β/(2α) and K = α m² − γ.

    References
    ----------
    .. [1] D. Jones, "Computing Fluid Tank Volumes", Chemical Processing, 2002; equations 2 and 3 are
       the elementary primitives of a root of a quadratic.
    """
    if zone.kind == "torus":
        return _torus(zone, depth, slope)
    p0, p1, p2 = zone.figures
    rise = abs(slope) * (zone.stop - zone.start)
    if p2 == 0.0 and rise <= EPSILON * math.sqrt(p0):  # level but for a rounding: eq. 2 divides by the slope
        half = np.sqrt(np.maximum((math.sqrt(p0) - depth) * (math.sqrt(p0) + depth), 0.0))
        return np.asarray(2.0 * half * (zone.stop - zone.start))
    return 2.0 * (_hyperbola(zone, depth, slope) if p2 > 0.0 else _ellipse(zone, depth, slope))


def _ellipse(zone: Zone, depth: FloatArray, slope: float) -> FloatArray:
    """Area under the root of a quadratic that opens downward, eq. 2."""
    p0, p1, p2 = zone.figures
    alpha, beta, gamma = p2 - slope**2, p1 + 2.0 * slope * depth, p0 - depth**2
    scale = math.sqrt(-alpha)
    # D without the difference of two large squares that cancels at a small slope
    discriminant = p1 * p1 - 4.0 * p2 * p0 + 4.0 * (p1 * slope * depth + p2 * depth**2 + slope**2 * p0)
    reach = np.sqrt(np.maximum(discriminant, 0.0)) / (-2.0 * alpha)
    middle = -beta / (2.0 * alpha)
    low, high = np.maximum(zone.start, middle - reach), np.minimum(zone.stop, middle + reach)
    s_low = _root(alpha, beta, gamma, low, low > zone.start)
    s_high = _root(alpha, beta, gamma, high, high < zone.stop)
    width = np.maximum(high - low, 0.0)
    across = 0.5 * np.hypot(scale * width, s_high - s_low)
    to_centre = np.hypot(scale * (0.5 * (low + high) - middle), 0.5 * (s_low + s_high))
    angle = 2.0 * np.arctan2(across, to_centre)
    bow = _less_sine(angle) * np.maximum(discriminant, 0.0) / (8.0 * scale**3)
    return np.where(width > 0.0, 0.5 * width * (s_low + s_high) + bow, 0.0)  # eq. 2


def _less_sine(angle: FloatArray) -> FloatArray:
    """x − sin x without cancellation."""
    square = angle * angle
    rest = 1.0 - square / 72.0 * (1.0 - square / 110.0)
    series = angle * square / 6.0 * (1.0 - square / 20.0 * (1.0 - square / 42.0 * rest))
    return np.where(angle < SMALL_ANGLE, series, angle - np.sin(angle))


def _root(alpha: float, beta: FloatArray, gamma: FloatArray, x: FloatArray, at_zero: BoolArray) -> FloatArray:
    """√g at x, exactly zero where x was cut at a zero of g."""
    return np.where(at_zero, 0.0, np.sqrt(np.maximum(gamma + x * (beta + x * alpha), 0.0)))


def _hyperbola(zone: Zone, depth: FloatArray, slope: float) -> FloatArray:
    """Area under a section of a cone, whose tip lies beyond, eq. 3."""
    p0, _, p2 = zone.figures
    steep, radius = math.sqrt(p2), math.sqrt(p0)
    alpha = p2 - slope**2
    cut = np.minimum((radius - depth) / (steep - slope), (radius + depth) / (steep + slope))
    high = np.clip(cut, zone.start, zone.stop)
    middle = (steep * radius - depth * slope) / alpha
    root_k = np.abs(steep * depth - slope * radius) / math.sqrt(alpha)

    def primitive(x: FloatArray, ends: BoolArray) -> FloatArray:
        r, y = steep * (zone.stop - x), depth - slope * x
        s = np.where(ends, 0.0, np.sqrt(np.maximum((r - y) * (r + y), 0.0)))
        ratio = np.divide(s, root_k, out=np.zeros_like(s), where=root_k > 0.0)
        return np.asarray(0.5 * (middle - x) * s - root_k**2 * np.arcsinh(ratio) / (2.0 * math.sqrt(alpha)))

    low = np.full_like(high, zone.start)
    area = primitive(low, low >= high) - primitive(high, high < zone.stop)  # eq. 3
    return np.where(high > low, np.maximum(area, 0.0), 0.0)


def _torus(zone: Zone, depth: FloatArray, slope: float) -> FloatArray:
    """Equation 1 for a knuckle, by Gauss's rule over the angle, dense where the chord vanishes."""
    c, q = zone.figures
    tilt, reach = math.atan(slope), q * math.hypot(1.0, slope)
    low, high = np.zeros_like(depth), np.full_like(depth, math.asin(min(zone.stop / q, 1.0)))
    for sign in (1.0, -1.0):  # r > y and r > −y hold each over one interval of the angle
        half = np.arccos(np.clip((sign * depth - c) / reach, -1.0, 1.0))
        low = np.maximum(low, sign * tilt - half)
        high = np.minimum(high, sign * tilt + half)
    half_width = np.maximum(0.5 * (high - low), 0.0)
    nodes, weights = leggauss(KNUCKLE_NODES)
    turn = 0.5 * np.pi * nodes
    angle = 0.5 * (low + high)[:, None] + half_width[:, None] * np.sin(turn)
    r, x = c + q * np.cos(angle), q * np.sin(angle)
    y = depth[:, None] - slope * x
    chord = 2.0 * np.sqrt(np.maximum((r - y) * (r + y), 0.0))  # eq. 1
    return np.asarray(half_width * ((chord * q * np.cos(angle)) @ (weights * 0.5 * np.pi * np.cos(turn))))
