"""Printed examples of tank volumes: inches in, US gallons out, to their printed digits.

D. Jones, "Computing Fluid Tank Volumes" (Chemical Processing, 2002), its Part II (2003, vertical tanks
and concave heads), and the same author's "Calculating Tank Volume" (2008).
"""

import pytest

from models.geometry.curves import Curves
from models.geometry.heads import Head
from models.geometry.shapes import horizontal_cylinder, vertical_cylinder

INCH = 0.0254  # m
GALLON = 231.0 * INCH**3  # m³


def gallons(curve, inches):
    return float(Curves.from_curves([curve]).volume(inches * INCH)) / GALLON


def dished(f, k, diameter, **more):
    return Head("torispherical", crown_radius=f * diameter * INCH, knuckle_radius=k * diameter * INCH, **more)


def cap(depth, diameter, **more):
    """A spherical head: a dished one without a knuckle, of crown radius (R² + a²)/(2a)."""
    crown = ((diameter / 2) ** 2 + depth**2) / (2 * depth)
    return Head("torispherical", crown_radius=crown * INCH, **more)


@pytest.mark.parametrize(
    ("head", "printed"),
    [
        (Head("cone", depth=42 * INCH), 2041.19),
        (Head("ellipsoidal", depth=42 * INCH), 2380.96),
        (cap(42, 108), 2303.96),
        (dished(1.0, 0.06, 108), 2028.63),
    ],
    ids=["conical", "ellipsoidal", "spherical", "torispherical"],
)
def test_lying_tanks(head, printed):
    tank = horizontal_cylinder(diameter=108 * INCH, length=156 * INCH, left_head=head, right_head=head)
    assert round(gallons(tank, 36), 2) == printed


@pytest.mark.parametrize(
    ("bottom", "printed"),
    [
        (Head("cone", depth=33 * INCH), 250.67),
        (Head("ellipsoidal", depth=33 * INCH), 783.36),
        (cap(33, 132), 583.60),
        (dished(1.0, 0.06, 132), 904.07),
    ],
    ids=["conical", "ellipsoidal", "spherical", "torispherical"],
)
def test_upright_tanks_on_a_head(bottom, printed):
    tank = vertical_cylinder(diameter=132 * INCH, height=100 * INCH, bottom=bottom)
    assert round(gallons(tank, 24), 2) == printed


@pytest.mark.parametrize(
    ("bottom", "printed"),
    [
        (Head("cone", depth=33 * INCH, inverted=True), 251.16),
        (Head("ellipsoidal", depth=33 * INCH, inverted=True), 44.85),
        (cap(33, 113, inverted=True), 112.81),
        (dished(0.71, 0.081, 113, inverted=True), 103.89),
    ],
    ids=["conical", "ellipsoidal", "spherical", "torispherical"],
)
def test_upright_tanks_on_a_concave_head(bottom, printed):
    tank = vertical_cylinder(diameter=113 * INCH, height=100 * INCH, bottom=bottom)
    assert round(gallons(tank, 15), 2) == printed
