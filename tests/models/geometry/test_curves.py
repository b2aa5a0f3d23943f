"""Stacks of capacity curves: one vessel or many, there and back, and what is refused."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from models.errors import DefinitionError, OutsideTable, OutsideVessel
from models.geometry.curves import Curve, Curves
from models.geometry.heads import Head
from models.geometry.shapes import box, capacity_table, horizontal_cylinder, sphere, vertical_cylinder

DISHED = Head("torispherical", crown_radius=3.0, knuckle_radius=0.18)
VESSELS = [
    sphere(diameter=18.0),
    vertical_cylinder(diameter=3.0, height=9.0, bottom=DISHED, top=Head("cone", depth=0.4)),
    horizontal_cylinder(diameter=3.0, length=10.0, left_head=DISHED, right_head=Head("hemispherical"), tilt=0.02,
                        gauge_at=1.0),
    box(length=4.0, width=5.0, height=2.0),
    capacity_table([0.5, 1.0, 2.0, 3.0, 3.5], [3.0, 9.0, 9.0, 21.0, 22.0]),
    capacity_table([-0.2, 1.0, 2.0, 3.5], [0.0, 9.0, 12.0, 21.0], interpolation="monotone_cubic"),
]  # fmt: skip
STACK = Curves.from_curves(VESSELS)


@settings(derandomize=True, max_examples=50, deadline=None)
@given(row=st.integers(0, len(VESSELS) - 1), share=st.lists(st.floats(0.0, 1.0), min_size=1, max_size=8))
def test_a_level_from_a_volume_holds_that_volume(row, share):
    level = STACK.bottom[row] + np.array(share) * (STACK.top[row] - STACK.bottom[row])
    volume = STACK.volume(level, row)
    back = STACK.level(volume, row)
    assert np.all(STACK.inside(back, row))
    assert STACK.volume(back, row) == pytest.approx(volume, rel=1e-12, abs=1e-13 * STACK.capacity[row])
    assert np.all(back <= level + 1e-7)  # the lowest such level


@pytest.mark.parametrize("row", range(len(VESSELS)))
def test_the_surface_is_the_slope_of_the_volume(row):
    low, high = STACK.bottom[row], STACK.top[row]
    level = low + np.array([0.07, 0.21, 0.33, 0.48, 0.66, 0.81, 0.93]) * (high - low)
    step = 1e-6
    slope = (STACK.volume(level + step, row) - STACK.volume(level - step, row)) / (2 * step)
    assert STACK.volume_and_area(level, row)[1] == pytest.approx(slope, rel=1e-6, abs=1e-6)


def test_many_vessels_in_one_call_are_each_vessel_alone_to_the_last_bit():
    rng = np.random.default_rng(7)
    rows = rng.integers(0, len(VESSELS), 3000)
    levels = STACK.bottom[rows] + rng.uniform(0.0, 1.0, 3000) * (STACK.top - STACK.bottom)[rows]
    volume, area = STACK.volume_and_area(levels, rows)
    back = STACK.level(volume, rows)
    for row, curve in enumerate(VESSELS):
        alone = Curves.from_curves([curve])
        at = rows == row
        expected = alone.volume_and_area(levels[at])
        assert np.array_equal(volume[at], expected[0])
        assert np.array_equal(area[at], expected[1])
        assert np.array_equal(back[at], alone.level(volume[at]))


def test_knots_and_both_ends_read_the_volume_given_there():
    for row, curve in enumerate(VESSELS):
        assert STACK.volume(curve.levels, row) == pytest.approx(curve.volumes, rel=1e-14)
        assert STACK.volume(curve.top, row) == curve.volume_at_top
        assert STACK.level(curve.volume_at_top, row) == pytest.approx(curve.top, rel=1e-12)
        assert STACK.level(curve.volumes[0], row) == curve.bottom


def test_scalars_and_grids_keep_their_shape():
    assert STACK.volume(9.0, 0).shape == ()
    assert float(STACK.volume(9.0, 0)) == pytest.approx(math.pi * 18**3 / 12, rel=1e-14)
    volume, area = STACK.volume_and_area(np.full((2, 3), 1.0), 3)
    assert volume.shape == area.shape == (2, 3)
    assert STACK.volume(1.0, np.array([0, 3, 4])).shape == (3,)
    assert STACK.level(np.array([1.0, 2.0]), 3) == pytest.approx([0.05, 0.1], rel=1e-13)


def test_a_flat_piece_answers_its_lowest_level():
    assert STACK.level(9.0, 4) == 1.0
    assert STACK.volume([1.0, 1.5, 2.0], 4) == pytest.approx([9.0, 9.0, 9.0])


def test_missing_stays_missing():
    volume, area = STACK.volume_and_area(np.array([1.0, np.nan]), np.array([0, 4]))
    assert np.isnan(volume[1]) and np.isnan(area[1]) and np.isfinite(volume[0])
    assert np.isnan(STACK.volume(np.nan, 2))
    assert np.isnan(STACK.level(np.array([np.nan, 1.0]), 3)[0])
    assert STACK.inside([np.nan, 1.0, 18.1], 0).tolist() == [False, True, False]


def test_a_level_outside_is_named_with_its_place_and_its_limits():
    with pytest.raises(OutsideVessel, match="level is 18.2 m at index 2; this sphere can be read from 0 to 18 m") as no:
        STACK.volume([1.0, 2.0, 18.2], 0)
    assert (no.value.field, no.value.index, no.value.code) == ("level", 2, "outside_vessel")
    with pytest.raises(OutsideTable, match="level is 0.4 m at index 1; the capacity table runs from 0.5 to 3.5 m"):
        STACK.volume([0.0, 0.4], np.array([0, 4]))
    with pytest.raises(OutsideTable, match="level is 3.6 m; "):
        STACK.volume(3.6, 4)
    with pytest.raises(OutsideVessel, match="volume is 41 m³ at index 1; .* from 0 to 40 m³"):
        STACK.level([1.0, 41.0], 3)
    with pytest.raises(OutsideTable, match="volume is 2 m³"):
        STACK.level(2.0, 4)


def test_infinite_levels_are_outside():
    for level in (np.inf, -np.inf):
        with pytest.raises(OutsideVessel):
            STACK.volume(level, 1)


def test_a_stack_of_nothing_is_refused():
    with pytest.raises(DefinitionError, match="at least one"):
        Curves.from_curves([])


def test_a_million_levels_pass_in_blocks():
    levels = np.linspace(0.0, 2.0, 100_003)
    assert np.allclose(STACK.volume(levels, 3), 20.0 * levels, rtol=1e-14)
    assert isinstance(VESSELS[0], Curve)
