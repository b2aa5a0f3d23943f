"""Plane sections of each zone against quadrature of the chord."""

import math
from fractions import Fraction

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.optimize import brentq

from models.geometry import sections
from models.geometry.heads import Head, Zone, zones
from models.geometry.sections import section_area

ZONES = {
    "shell": Zone("quadratic", 0.0, 10.0, (2.25, 0.0, 0.0)),
    "cone": zones(Head("cone", depth=0.9), 1.5)[0],
    "ellipsoid": zones(Head("ellipsoidal", depth=0.6), 1.5)[0],
    "knuckle": zones(Head("torispherical", crown_radius=3.0, knuckle_radius=0.3), 1.5)[0],
    "crown": zones(Head("torispherical", crown_radius=3.0, knuckle_radius=0.3), 1.5)[1],
}
DEPTHS = np.array([-1.49, -1.2, -0.8, -0.1, 0.0, 0.31, 0.9, 1.3, 1.45, 1.6])


def by_quadrature(zone, depth, slope):
    """Chords summed over x = middle + half · sin(u), which takes the root out of both ends."""

    def room(x):
        return zone.radius(x) - abs(depth - slope * x)

    x = np.linspace(zone.start, zone.stop, 4001)
    inside = np.array([room(value) for value in x]) > 0.0
    if not inside.any():
        return 0.0
    first, last = int(np.argmax(inside)), len(x) - 1 - int(np.argmax(inside[::-1]))
    low = x[0] if first == 0 else brentq(room, x[first - 1], x[first], xtol=1e-15)
    high = x[-1] if last == len(x) - 1 else brentq(room, x[last], x[last + 1], xtol=1e-15)
    middle, half = 0.5 * (low + high), 0.5 * (high - low)

    def chord(u):
        at = middle + half * math.sin(u)
        return 2.0 * math.sqrt(max(zone.radius(at) ** 2 - (depth - slope * at) ** 2, 0.0)) * half * math.cos(u)

    return quad(chord, -math.pi / 2, math.pi / 2, epsabs=1e-13, epsrel=1e-12, limit=400)[0]


@pytest.mark.parametrize("slope", [-0.2, -0.01, 0.0, 1e-8, 0.01, 0.2])
@pytest.mark.parametrize("name", ZONES)
def test_sections_agree_with_quadrature(name, slope):
    zone = ZONES[name]

    expected = np.array([by_quadrature(zone, depth, slope) for depth in DEPTHS])
    assert section_area(zone, DEPTHS, slope) == pytest.approx(expected, rel=1e-9, abs=1e-11)


@pytest.mark.parametrize("slope", [0.0, 0.05])
@pytest.mark.parametrize("name", ZONES)
def test_a_plane_that_misses_the_zone_cuts_nothing(name, slope):
    assert np.all(section_area(ZONES[name], np.array([-4.0, 4.0]), slope) == 0.0)


def test_a_section_through_the_axis_is_twice_the_profile():
    cone = section_area(ZONES["cone"], np.array([0.0]), 0.0)
    assert cone == pytest.approx(0.9 * 1.5, rel=1e-14)
    ellipsoid = section_area(ZONES["ellipsoid"], np.array([0.0]), 0.0)
    assert ellipsoid == pytest.approx(math.pi * 0.6 * 1.5 / 2, rel=1e-14)


@pytest.mark.parametrize("angle", [1e-3, 0.1, 0.22, 0.2499, 0.2501, 1.0])
def test_an_angle_less_its_sine_keeps_its_digits(angle):
    # x − sin x = x³/3! − x⁵/5! + …, in whole fractions: the plain formula has lost 1e-13 of itself at 0.25.
    x = Fraction(angle)
    exact = float(sum((-1) ** (n + 1) * x ** (2 * n + 1) / math.factorial(2 * n + 1) for n in range(1, 20)))
    lost = 2e-15 if angle < 0.25 else 5e-13
    assert sections._less_sine(np.array([angle])) == pytest.approx(exact, rel=lost, abs=0.0)


@pytest.mark.parametrize("slope", [1e-300, 1e-160, 1e-100, 1e-17, 1e-15, 1e-12, 1e-9])
def test_a_slope_below_a_rounding_is_level_and_none_divides_by_it(slope):
    """2 · 10 m · √(1.5² − y²) at mid-length: the two ends cancel but for the slope's square."""
    level = 20.0 * np.sqrt(np.maximum(2.25 - (DEPTHS - 5.0 * slope) ** 2, 0.0))
    assert section_area(ZONES["shell"], DEPTHS, slope) == pytest.approx(level, abs=1e-12)
