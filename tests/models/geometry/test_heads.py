"""Heads: depth, profile and volume of each kind."""

import math

import numpy as np
import pytest
from fluids.geometry import V_vertical_conical, V_vertical_ellipsoidal, V_vertical_spherical, V_vertical_torispherical

from models.errors import DefinitionError
from models.geometry.curves import Curve, Curves
from models.geometry.heads import Head, head_depth, upright, zones


def dished(diameter, f, k):
    return zones(Head("torispherical", crown_radius=f * diameter, knuckle_radius=k * diameter), diameter / 2)


def volumes(parts, heights):
    body = upright(parts)
    return Curves.from_curves([Curve(body.heights, body.coefficients, body.total, "head", "")]).volume(heights)


def test_depth_of_dished_heads():
    # D. Jones, "Computing Fluid Tank Volumes, Part II": f = 0.9, k = 0.2, D = 96 in.
    assert head_depth(dished(96.0, 0.9, 0.2)) == pytest.approx(25.684, abs=5e-4)
    # The flanged and dished head of f = 1, k = 0.06: 0.1693 D, common practice.
    assert head_depth(dished(1.0, 1.0, 0.06)) == pytest.approx(0.1693, abs=5e-5)


@pytest.mark.parametrize(("f", "k"), [(1.0, 0.06), (0.8, 0.154), (1.0, 0.1), (0.9, 0.2), (0.51, 0.4), (3.0, 0.01)])
def test_a_dished_head_is_smooth_and_agrees_with_fluids(f, k):
    parts = dished(3.0, f, k)
    torus, crown = parts
    assert torus.radius(torus.stop) == pytest.approx(crown.radius(crown.start), rel=1e-12)
    step = 1e-6
    below = (torus.radius(torus.stop) - torus.radius(torus.stop - step)) / step
    above = (crown.radius(crown.start + step) - crown.radius(crown.start)) / step
    assert below == pytest.approx(above, rel=1e-3, abs=1e-4)
    assert torus.radius(0.0) == pytest.approx(1.5, rel=1e-15)
    assert crown.radius(crown.stop) == pytest.approx(0.0, abs=1e-7)
    heights = head_depth(parts) * np.array([0.05, 0.3, 0.5, 0.8, 0.95, 0.999, 1.0])
    expected = np.array([V_vertical_torispherical(3.0, f, k, h) for h in heights])
    assert volumes(parts, heights) == pytest.approx(expected, rel=1e-9)


def test_other_heads_agree_with_fluids():
    heights = np.array([0.001, 0.1, 0.4, 0.7, 0.75])
    cone, ellipsoid = (zones(Head(kind, depth=0.75), 1.5) for kind in ("cone", "ellipsoidal"))
    assert volumes(cone, heights) == pytest.approx([V_vertical_conical(3.0, 0.75, h) for h in heights], rel=1e-12)
    expected = [V_vertical_ellipsoidal(3.0, 0.75, h) for h in heights]
    assert volumes(ellipsoid, heights) == pytest.approx(expected, rel=1e-12)
    cap = zones(Head("torispherical", crown_radius=(1.5**2 + 0.75**2) / 1.5), 1.5)
    assert head_depth(cap) == pytest.approx(0.75, rel=1e-14)
    expected = [V_vertical_spherical(3.0, 0.75, h) for h in heights]
    assert volumes(cap, heights) == pytest.approx(expected, rel=1e-11)


def test_whole_heads_by_their_closed_forms():
    assert upright(zones(Head("hemispherical"), 2.0)).total == pytest.approx(2 * math.pi * 8 / 3, rel=1e-14)
    assert upright(zones(Head("ellipsoidal", depth=1.0), 2.0)).total == pytest.approx(math.pi * 4**3 / 24, rel=1e-14)
    assert upright(zones(Head("cone", depth=0.5), 2.0)).total == pytest.approx(math.pi * 4 * 0.5 / 3, rel=1e-14)
    # A crown as wide as the cylinder is a hemisphere, whatever its knuckle.
    assert upright(dished(4.0, 0.5, 0.1)).total == pytest.approx(2 * math.pi * 8 / 3, rel=1e-12)
    assert zones(Head(), 2.0) == ()
    assert head_depth(()) == 0.0


@pytest.mark.parametrize(
    ("head", "field", "says"),
    [
        (Head("torispherical", crown_radius=1.4, knuckle_radius=0.1), "bottom/crown_radius_m", "at least .* 1.5 m"),
        (Head("torispherical", crown_radius=3.0, knuckle_radius=1.5), "bottom/knuckle_radius_m", "below .* 1.5 m"),
        (Head("torispherical", crown_radius=3.0, knuckle_radius=-0.1), "bottom/knuckle_radius_m", "at least 0"),
        (Head("torispherical", crown_radius=3.0, knuckle_radius=math.nan), "bottom/knuckle_radius_m", "at least 0"),
        (Head("torispherical"), "bottom/crown_radius_m", "missing"),
        (Head("cone", depth=math.inf), "bottom/depth_m", "above 0 m"),
        (Head("pointed"), "bottom/kind", "known are flat, hemispherical"),
    ],
)
def test_an_impossible_head_is_refused(head, field, says):
    with pytest.raises(DefinitionError, match=says) as refused:
        zones(head, 1.5, "bottom")
    assert refused.value.field == field
