"""Lying cylinders, level and tilted, against quadrature over discs and against `fluids`."""

import math

import numpy as np
import pytest
from fluids.geometry import V_from_h
from hypothesis import given, settings
from hypothesis import strategies as st

from models.errors import DefinitionError, OutsideVessel
from models.geometry.curves import Curves
from models.geometry.heads import FLAT, Head
from models.geometry.lying import horizontal_cylinder
from tests.models.geometry.discs import lying_volume

CAP = (1.5**2 + 0.4**2) / 0.8  # m, crown of a cap 0.4 m deep on a cylinder of 3 m
HEADS = {
    "flat": (FLAT, ("flat", {}), {}),
    "cone": (Head("cone", depth=1.0), ("cone", {"depth": 1.0}), {"side": "conical", "a": 1.0}),
    "ellipsoidal": (
        Head("ellipsoidal", depth=0.75), ("ellipsoidal", {"depth": 0.75}), {"side": "ellipsoidal", "a": 0.75},
    ),
    "hemispherical": (Head("hemispherical"), ("hemispherical", {}), {"side": "spherical", "a": 1.5}),
    "cap": (
        Head("torispherical", crown_radius=CAP), ("torispherical", {"crown": CAP, "knuckle": 0.0}),
        {"side": "spherical", "a": 0.4},
    ),
    "dished 1, 0.06": (
        Head("torispherical", crown_radius=3.0, knuckle_radius=0.18),
        ("torispherical", {"crown": 3.0, "knuckle": 0.18}), {"side": "torispherical", "f": 1.0, "k": 0.06},
    ),
    "dished 0.8, 0.154": (
        Head("torispherical", crown_radius=2.4, knuckle_radius=0.462),
        ("torispherical", {"crown": 2.4, "knuckle": 0.462}), {"side": "torispherical", "f": 0.8, "k": 0.154},
    ),
    "dished 1, 0.1": (
        Head("torispherical", crown_radius=3.0, knuckle_radius=0.3),
        ("torispherical", {"crown": 3.0, "knuckle": 0.3}), {"side": "torispherical", "f": 1.0, "k": 0.1},
    ),
}  # fmt: skip


def volume(curve, level):
    return Curves.from_curves([curve]).volume(level)


def vessel(left, right, **more):
    return horizontal_cylinder(diameter=3.0, length=10.0, left_head=HEADS[left][0], right_head=HEADS[right][0], **more)


@pytest.mark.parametrize("kind", HEADS)
def test_level_vessels_agree_with_fluids(kind):
    levels = np.array([0.01, 0.1, 0.3, 0.75, 1.2, 1.5, 1.9, 2.5, 2.9, 2.99, 3.0])
    told = HEADS[kind][2]
    ends = {f"side{end}{'' if key == 'side' else '_' + key}": value for end in "AB" for key, value in told.items()}
    expected = np.array([V_from_h(h, 3.0, 10.0, horizontal=True, **ends) for h in levels])
    curve = vessel(kind, kind)
    assert volume(curve, levels) == pytest.approx(expected, rel=1e-9, abs=1e-11 * curve.capacity)
    assert curve.capacity == pytest.approx(expected[-1], rel=1e-9)
    assert curve.volume_at_top == pytest.approx(curve.capacity, rel=1e-13)


# Independent quadratures over coaxial discs, computed beforehand: D = 3 m, L = 10 m at 0.3, 1.5 and 3.0 m.
@pytest.mark.parametrize(
    ("kind", "expected"),
    [
        ("flat", (3.678775, 35.342917, 70.685835)),
        ("cone", (3.736364, 37.699112, 75.398224)),
        ("ellipsoidal", (3.876695, 38.877209, 77.754418)),
        ("cap", (3.724799, 36.790144, 73.580289)),
        ("hemispherical", (4.074616, 42.411501, 84.823002)),
        ("dished 1, 0.06", (3.796163, 37.529891, 75.059781)),
        ("dished 0.8, 0.154", (3.885299, 38.873754, 77.747508)),
        ("dished 1, 0.1", (3.837403, 38.014999, 76.029998)),
    ],
)
def test_level_vessels_agree_with_earlier_quadratures(kind, expected):
    assert volume(vessel(kind, kind), [0.3, 1.5, 3.0]) == pytest.approx(np.array(expected), abs=6e-7)


def test_a_tilted_flat_ended_cylinder_agrees_with_an_earlier_integral():
    # D 2.5 m, L 8 m, slope 0.03, gauge 2 m from the lower end; depths square to the axis at the gauge.
    tilt = math.atan(0.03)
    curve = horizontal_cylinder(diameter=2.5, length=8.0, tilt=tilt, gauge_at=2.0)
    levels = np.array([0.05, 0.3, 1.2, 2.0, 2.45]) * math.cos(tilt)
    expected = np.array([0.111735, 1.978140, 17.441194, 32.672495, 38.571025])
    assert volume(curve, levels) == pytest.approx(expected, abs=6e-7)


@pytest.mark.parametrize("degrees", [-6.0, -0.4, 0.05, 1.0, 12.0])
@pytest.mark.parametrize(
    ("left", "right"),
    [("flat", "cone"), ("ellipsoidal", "cap"), ("hemispherical", "dished 1, 0.06"), ("dished 0.8, 0.154", "flat"),
     ("cone", "dished 1, 0.1")],
)  # fmt: skip
def test_tilted_vessels_agree_with_quadrature(left, right, degrees):
    tilt = math.radians(degrees)
    curve = vessel(left, right, tilt=tilt, gauge_at=2.5)
    levels = np.array([0.0, 0.02, 0.2, 0.7, 1.5, 2.4, 2.97])
    expected = np.array(
        [lying_volume(h, diameter=3.0, length=10.0, left=HEADS[left][1], right=HEADS[right][1], tilt=tilt, gauge_at=2.5)
         for h in levels]
    )  # fmt: skip
    assert volume(curve, levels) == pytest.approx(expected, rel=1e-9, abs=1e-10 * curve.capacity)


def test_the_lower_end_holds_liquid_at_level_zero_and_the_raised_end_is_not_full_at_the_top():
    curve = vessel("flat", "flat", tilt=math.radians(1.0), gauge_at=5.0)
    assert curve.bottom == 0.0
    assert volume(curve, 0.0) > 0.0
    assert curve.top == pytest.approx(3.0 / math.cos(math.radians(1.0)), rel=1e-12)
    assert curve.volume_at_top < curve.capacity
    assert curve.capacity == pytest.approx(math.pi * 1.5**2 * 10.0, rel=1e-14)


def test_a_gauge_at_the_raised_end_reads_up_to_the_full_vessel():
    curve = vessel("flat", "flat", tilt=math.radians(1.0), gauge_at=10.0)
    assert curve.volume_at_top == pytest.approx(curve.capacity, rel=1e-12)
    assert curve.top == pytest.approx(3.0 * math.cos(math.radians(1.0)), rel=1e-12)


def test_a_mirrored_vessel_holds_the_same():
    here = vessel("cone", "dished 1, 0.06", tilt=0.02, gauge_at=3.0)
    there = vessel("dished 1, 0.06", "cone", tilt=-0.02, gauge_at=7.0)
    levels = np.linspace(0.0, 3.0, 50)
    assert volume(here, levels) == pytest.approx(volume(there, levels), rel=1e-12)


@pytest.mark.parametrize("tilt", [1e-9, 1e-7, 1e-6])
def test_a_hardly_tilted_vessel_is_hardly_another(tilt):
    # First order: the level in the middle of the vessel's length is what counts, 3 m from the gauge.
    level, tilted = vessel("ellipsoidal", "ellipsoidal"), vessel("ellipsoidal", "ellipsoidal", tilt=tilt, gauge_at=2.0)
    h = np.linspace(0.1, 2.9, 29)
    assert volume(tilted, h) == pytest.approx(volume(level, h - 3.0 * math.tan(tilt)), rel=1e-8)


@settings(derandomize=True, max_examples=50, deadline=None)
@given(
    kinds=st.tuples(st.sampled_from(sorted(HEADS)), st.sampled_from(sorted(HEADS))),
    degrees=st.floats(-15.0, 15.0).filter(lambda d: d == 0.0 or abs(d) > 1e-6),
    gauge_at=st.floats(0.0, 10.0),
)
def test_volume_rises_with_the_level_and_never_passes_the_capacity(kinds, degrees, gauge_at):
    curve = vessel(*kinds, tilt=math.radians(degrees), gauge_at=gauge_at)
    levels = np.linspace(curve.bottom, curve.top, 997)
    volumes, areas = Curves.from_curves([curve]).volume_and_area(levels)
    assert np.all(np.diff(volumes) >= -1e-14 * curve.capacity)
    assert np.all(areas >= -1e-9 * areas.max())
    assert 0.0 <= volumes[0] <= volumes[-1] <= curve.capacity * (1.0 + 1e-12)


def test_a_level_vessel_is_convex_below_its_middle_and_concave_above():
    levels = np.linspace(0.0, 3.0, 601)
    bends = np.diff(volume(vessel("dished 1, 0.06", "hemispherical"), levels), 2)
    assert np.all(bends[:299] > 0.0)
    assert np.all(bends[300:] < 0.0)


@pytest.mark.parametrize(
    ("more", "field", "says"),
    [
        ({"diameter": 0.0}, "diameter_m", "above 0 m"),
        ({"length": -1.0}, "length_m", "above 0 m"),
        ({"length": math.nan}, "length_m", "above 0 m"),
        ({"tilt": 0.7, "gauge_at": 1.0}, "tilt_deg", "between -30 and 30"),
        ({"tilt": math.radians(30.1), "gauge_at": 1.0}, "tilt_deg", "tilt_deg is 30.1"),
        ({"tilt": 0.01}, "gauge_at_m", "missing"),
        ({"tilt": 0.01, "gauge_at": 10.5}, "gauge_at_m", "between 0 and 10 m"),
        ({"left_head": Head("cone", depth=0.0)}, "left_head/depth_m", "above 0 m"),
        ({"right_head": Head("ellipsoidal")}, "right_head/depth_m", "missing"),
        ({"left_head": Head("cone", depth=1.0, inverted=True)}, "left_head/inverted", "only a bottom"),
        ({"right_head": Head("dome")}, "right_head/kind", "known are flat"),
        ({"left_head": Head("cone", depth=6.0), "tilt": 0.4, "gauge_at": 1.0}, "tilt_deg", "below 12.7 degrees"),
    ],
)
def test_an_impossible_vessel_is_refused(more, field, says):
    with pytest.raises(DefinitionError, match=says) as refused:
        horizontal_cylinder(**{"diameter": 3.0, "length": 10.0, **more})
    assert refused.value.field == field


def test_a_level_outside_the_vessel_is_refused():
    with pytest.raises(OutsideVessel, match="level is 3.01 m at index 1; .* from 0 to 3 m"):
        volume(vessel("flat", "flat"), [1.0, 3.01])
