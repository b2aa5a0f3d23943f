"""Upright cylinders, spheres, boxes and stamped volumes against closed forms and `fluids`."""

import inspect
import math

import numpy as np
import pytest
from fluids.geometry import TANK
from hypothesis import given, settings
from hypothesis import strategies as st

from models.errors import DefinitionError
from models.geometry.curves import Curves
from models.geometry.heads import FLAT, Head
from models.geometry.shapes import SHAPES, box, fixed_volume, sphere, vertical_cylinder

HEADS = {
    "flat": (FLAT, 0.0, {}),
    "cone": (Head("cone", depth=1.0), 1.0, {"": "conical", "_a": 1.0}),
    "ellipsoidal": (Head("ellipsoidal", depth=0.75), 0.75, {"": "ellipsoidal", "_a": 0.75}),
    "hemispherical": (Head("hemispherical"), 1.5, {"": "spherical", "_a": 1.5}),
    "dished": (
        Head("torispherical", crown_radius=3.0, knuckle_radius=0.18), 3.0 * (1.0 - math.sqrt(0.94**2 - 0.44**2)),
        {"": "torispherical", "_f": 1.0, "_k": 0.06},
    ),
}  # fmt: skip


def volume(curve, level):
    return Curves.from_curves([curve]).volume(level)


@pytest.mark.parametrize("top", HEADS)
@pytest.mark.parametrize("bottom", HEADS)
def test_upright_cylinders_agree_with_fluids(bottom, top):
    below, above = HEADS[bottom], HEADS[top]
    curve = vertical_cylinder(diameter=3.0, height=10.0, bottom=below[0], top=above[0])
    assert curve.top == pytest.approx(10.0 + below[1] + above[1], abs=2e-8)
    levels = curve.top * np.array([0.001, 0.02, 0.04, 0.1, 0.5, 0.93, 0.96, 0.99, 0.999])
    ends = {f"sideA{key}": value for key, value in below[2].items()}
    ends |= {f"sideB{key}": value for key, value in above[2].items()}
    reference = TANK(D=3.0, L=10.0, horizontal=False, **ends)
    expected = [reference.V_from_h(h) for h in levels]
    assert volume(curve, levels) == pytest.approx(np.array(expected), rel=1e-9)
    assert curve.capacity == pytest.approx(reference.V_total, rel=1e-9)
    assert curve.volume_at_top == pytest.approx(curve.capacity, rel=1e-14)


# Independent quadratures over discs, computed beforehand: D = 3 m, flat top, at 0.5 and 4.0 m.
@pytest.mark.parametrize(
    ("bottom", "expected"),
    [
        ("cone", (0.294524, 23.561945)),
        ("ellipsoidal", (1.832596, 26.507188)),
        ("dished", (2.130338, 26.870376)),
        ("hemispherical", (1.047198, 24.740042)),
    ],
)
def test_bottoms_agree_with_earlier_quadratures(bottom, expected):
    curve = vertical_cylinder(diameter=3.0, height=6.0, bottom=HEADS[bottom][0])
    assert volume(curve, [0.5, 4.0]) == pytest.approx(np.array(expected), abs=6e-7)


def test_an_inverted_cone_stands_in_the_liquid():
    curve = vertical_cylinder(diameter=10.0, height=8.0, bottom=Head("cone", depth=0.6, inverted=True))
    assert (curve.bottom, curve.top) == (0.0, 8.0)
    displaced = math.pi * 25.0 * 0.6 / 3.0
    assert curve.capacity == pytest.approx(math.pi * 25.0 * 8.0 - displaced, rel=1e-14)
    level = 0.25  # the cone below it is a frustum, from radius 5 m to 5 (1 − 0.25/0.6)
    ratio = 1.0 - level / 0.6
    frustum = math.pi * 25.0 * level * (1.0 + ratio + ratio**2) / 3.0
    assert volume(curve, level) == pytest.approx(math.pi * 25.0 * level - frustum, rel=1e-13)
    assert volume(curve, [0.6, 3.0]) == pytest.approx(math.pi * 25.0 * np.array([0.6, 3.0]) - displaced, rel=1e-13)


@pytest.mark.parametrize("kind", ["ellipsoidal", "dished", "hemispherical"])
def test_an_inverted_head_takes_what_it_would_hold(kind):
    head, deep, _ = HEADS[kind]
    inside_out = Head(head.kind, head.depth, head.crown_radius, head.knuckle_radius, inverted=True)
    up = vertical_cylinder(diameter=3.0, height=5.0, bottom=inside_out)
    down = vertical_cylinder(diameter=3.0, height=5.0, bottom=head)
    area, depth = math.pi * 2.25, down.top - 5.0
    assert depth == pytest.approx(deep, abs=2e-8)
    at = np.linspace(0.0, depth, 9)
    whole = volume(down, depth)
    expected = area * at - whole + volume(down, depth - at)
    assert volume(up, at) == pytest.approx(expected, abs=1e-12)
    assert down.capacity - up.capacity == pytest.approx(2.0 * whole, rel=1e-12)


def test_a_sphere_holds_what_archimedes_says():
    ball = sphere(diameter=18.0)
    # Independent figures of π h² (3R − h)/3, computed beforehand.
    expected = np.array([27.227136, 575.958653, 1526.814030])
    assert volume(ball, [1.0, 5.0, 9.0]) == pytest.approx(expected, abs=6e-7)
    assert ball.capacity == pytest.approx(4.0 / 3.0 * math.pi * 9.0**3, rel=1e-15)
    assert ball.volume_at_top == pytest.approx(ball.capacity, rel=1e-14)
    as_cylinder = vertical_cylinder(diameter=18.0, height=1e-9, bottom=Head("hemispherical"), top=Head("hemispherical"))
    at = np.linspace(0.5, 17.5, 18)
    assert volume(ball, at) == pytest.approx(volume(as_cylinder, at), rel=1e-8)


def test_a_box_is_length_by_width_by_level():
    room = box(length=4.0, width=2.5, height=3.0)
    assert Curves.from_curves([room]).volume_and_area(1.2) == (pytest.approx(12.0), pytest.approx(10.0))
    assert (room.capacity, room.top) == (30.0, 3.0)


@settings(derandomize=True, max_examples=50, deadline=None)
@given(
    diameter=st.floats(0.1, 100.0), height=st.floats(0.1, 40.0), share=st.floats(0.01, 0.99),
    bottom=st.sampled_from(["flat", "cone", "ellipsoidal", "hemispherical", "torispherical"]), inverted=st.booleans(),
)  # fmt: skip
def test_upright_volumes_rise_and_the_surface_is_never_wider_than_the_shell(diameter, height, share, bottom, inverted):
    deep = share * min(0.5 * diameter, height)
    head = Head(bottom, deep, 0.5 * diameter * (1.0 + share), 0.4 * share * diameter, inverted)
    if inverted and bottom in ("hemispherical", "torispherical") and height < 0.5 * diameter:
        return
    curve = vertical_cylinder(diameter=diameter, height=height, bottom=head)
    volumes, areas = Curves.from_curves([curve]).volume_and_area(np.linspace(0.0, curve.top, 301))
    assert np.all(np.diff(volumes) > 0.0)
    assert np.all((areas >= -1e-9 * diameter**2) & (areas <= math.pi / 4 * diameter**2 * (1 + 1e-9)))


@pytest.mark.parametrize(
    ("build", "more", "field", "says"),
    [
        (vertical_cylinder, {"diameter": 0.0, "height": 1.0}, "diameter_m", "diameter_m is 0 m; it must be above 0 m"),
        (vertical_cylinder, {"diameter": 1.0, "height": -2.0}, "height_m", "height_m is -2 m"),
        (vertical_cylinder, {"diameter": 2.0, "height": 0.5, "bottom": Head("cone", depth=1.0, inverted=True)},
         "bottom", "1 m deep; it must end inside the shell, whose height_m is 0.5 m"),
        (vertical_cylinder, {"diameter": 2.0, "height": 5.0, "top": Head("cone", depth=1.0, inverted=True)},
         "top/inverted", "only a bottom"),
        (sphere, {"diameter": math.nan}, "diameter_m", "above 0 m"),
        (sphere, {"diameter": math.inf}, "diameter_m", "above 0 m"),
        (box, {"length": 1.0, "width": 0.0, "height": 1.0}, "width_m", "above 0 m"),
        (fixed_volume, {"volume": 0.0}, "volume_m3", "above 0 m³"),
        (fixed_volume, {"volume": math.nan}, "volume_m3", "above 0 m³"),
    ],
)  # fmt: skip
def test_an_impossible_shape_is_refused(build, more, field, says):
    with pytest.raises(DefinitionError, match=says) as refused:
        build(**more)
    assert refused.value.field == field


def test_a_stamped_volume_is_its_capacity():
    assert fixed_volume(volume=2.5) == 2.5


def test_every_shape_is_named_as_its_curve_says():
    assert sphere(diameter=1.0).kind in SHAPES
    assert all(name == builder.__name__ for name, builder in SHAPES.items())
    assert all(inspect.getdoc(builder) for builder in SHAPES.values())
