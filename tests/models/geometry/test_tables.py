"""Capacity tables and deadwood."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from models.errors import DefinitionError, OutsideTable
from models.geometry.curves import Curves
from models.geometry.heads import Head
from models.geometry.shapes import horizontal_cylinder, sphere, vertical_cylinder
from models.geometry.tables import capacity_table, with_deadwood


def volume(curve, level):
    return Curves.from_curves([curve]).volume(level)


def test_between_two_rows_the_table_is_linear():
    table = capacity_table([0.0, 0.01, 0.02], [12.4, 32.1, 51.9], total_volume=35300.0)
    assert volume(table, [0.0, 0.0025, 0.01, 0.015, 0.02]) == pytest.approx([12.4, 17.325, 32.1, 42.0, 51.9])
    assert Curves.from_curves([table]).volume_and_area(0.015)[1] == pytest.approx(1980.0)
    assert table.capacity == 35300.0
    assert capacity_table([0.0, 1.0], [0.0, 5.0]).capacity == 5.0


# How much a linear table overstates a lying cylinder (D 3 m, L 16 m, 2:1 heads), computed beforehand
# by quadrature midway between rows of 50 mm.
def test_pitfall_14_a_linear_table_of_a_lying_vessel_overstates_and_a_monotone_cubic_hardly():
    end = Head("ellipsoidal", depth=0.75)
    true = horizontal_cylinder(diameter=3.0, length=16.0, left_head=end, right_head=end)
    rows = np.linspace(0.0, 3.0, 61)
    linear, cubic = (
        capacity_table(rows, volume(true, rows), interpolation=kind) for kind in ("linear", "monotone_cubic")
    )
    at = np.array([0.125, 0.325, 0.725])
    over = volume(linear, at) / volume(true, at) - 1.0
    assert np.all(over > 0.0)
    assert over == pytest.approx([0.015, 0.0020, 0.00031], rel=0.15)
    assert np.all(np.abs(volume(cubic, at) / volume(true, at) - 1.0) < 0.1 * over)


def test_a_table_is_never_extrapolated():
    table = capacity_table([0.1, 1.0], [1.0, 10.0], total_volume=20.0)
    for level in (0.0999, 1.0001):
        with pytest.raises(OutsideTable, match="the capacity table runs from 0.1 to 1 m"):
            volume(table, level)


@settings(derandomize=True, max_examples=50, deadline=None)
@given(
    steps=st.lists(st.tuples(st.floats(1e-3, 1.0), st.floats(0.0, 50.0)), min_size=2, max_size=30),
    kind=st.sampled_from(["linear", "monotone_cubic"]),
)
def test_a_table_that_never_falls_is_read_without_falling(steps, kind):
    rows = np.cumsum(np.array([(0.0, 1.0), *steps]), axis=0)
    table = capacity_table(rows[:, 0], rows[:, 1], interpolation=kind)
    read = volume(table, np.linspace(table.bottom, table.top, 401))
    assert np.all(np.diff(read) >= -1e-12 * table.capacity)
    assert volume(table, rows[:, 0]) == pytest.approx(rows[:, 1], rel=1e-12)


@pytest.mark.parametrize(
    ("levels", "volumes", "row", "says"),
    [
        ([0.0, 1.0, 2.0, 3.0], [0.0, 5.0, 4.9, 8.0], 2, r"rows/2 \(2 m, 4.9 m³\) holds less .* never falls"),
        ([0.0, 1.0, 1.0], [0.0, 5.0, 6.0], 2, "rows/2 .* does not lie above the row before it"),
        ([0.0, math.nan, 2.0], [0.0, 1.0, 2.0], 1, "rows/1 .* finite"),
        ([0.0, 1.0, 2.0], [0.0, math.nan, 2.0], 1, "rows/1 .* finite"),
        ([0.0, 1.0, math.inf], [0.0, 1.0, 2.0], 2, "rows/2 .* finite"),
        ([0.0, 1.0], [-1.0, 2.0], 0, "rows/0 .* below 0 m³"),
        ([0.0], [1.0], None, "at least 2 pairs"),
        ([0.0, 1.0], [1.0], None, "at least 2 pairs"),
        ([0.0, 1.0], [0.0, 0.0], None, "no volume at all"),
    ],
)
def test_an_impossible_table_is_refused_at_its_row(levels, volumes, row, says):
    with pytest.raises(DefinitionError, match=says) as refused:
        capacity_table(levels, volumes)
    assert refused.value.index == row
    assert refused.value.field == ("rows" if row is None else f"rows/{row}")


@pytest.mark.parametrize(
    ("more", "field"),
    [({"total_volume": 4.9}, "total_volume_m3"), ({"total_volume": math.nan}, "total_volume_m3"),
     ({"interpolation": "spline"}, "interpolation")],
)  # fmt: skip
def test_an_impossible_whole_is_refused(more, field):
    with pytest.raises(DefinitionError) as refused:
        capacity_table([0.0, 1.0], [0.0, 5.0], **more)
    assert refused.value.field == field


def test_deadwood_takes_its_room_over_its_band():
    tank = vertical_cylinder(diameter=2.0, height=5.0)
    less = with_deadwood(tank, [0.5, 1.0], [1.5, 4.0], [0.6, -0.3])
    at = np.array([0.0, 0.5, 0.8, 1.0, 1.2, 1.5, 2.5, 4.0, 5.0])
    taken = 0.6 * np.clip(at - 0.5, 0.0, 1.0) - 0.3 * np.clip((at - 1.0) / 3.0, 0.0, 1.0)
    assert volume(less, at) == pytest.approx(math.pi * at - taken, rel=1e-13)
    assert less.capacity == pytest.approx(tank.capacity - 0.3, rel=1e-14)
    assert less.volume_at_top == pytest.approx(less.capacity, rel=1e-13)
    area = Curves.from_curves([less]).volume_and_area([0.2, 0.7, 1.2, 2.0, 4.5])[1]
    assert area == pytest.approx(math.pi - np.array([0.0, 0.6, 0.6 - 0.1, -0.1, 0.0]), rel=1e-13)


def test_deadwood_in_a_sphere_and_below_the_datum():
    ball = sphere(diameter=4.0)
    less = with_deadwood(ball, [1.0], [3.0], [0.5])
    assert volume(ball, 2.0) - volume(less, 2.0) == pytest.approx(0.25, rel=1e-12)
    table = capacity_table([0.0, 1.0], [3.0, 9.0])
    assert volume(with_deadwood(table, [-1.0], [0.0], [0.4]), [0.0, 1.0]) == pytest.approx([2.6, 8.6])


@pytest.mark.parametrize(
    ("start", "stop", "taken", "says"),
    [
        (0.5, 0.5, 0.1, "deadwood/0 stands from 0.5 to 0.5 m"),
        (0.5, 5.5, 0.1, "below the highest level, 5 m"),
        (math.nan, 1.0, 0.1, "deadwood/0"),
        (0.0, 1.0, math.nan, "deadwood/0"),
        (0.5, 1.0, 1.6, "more room than the vessel has at 0.5 m"),
        (-1.0, 0.0, 0.1, "more room than the vessel has at 0 m"),
    ],
)
def test_impossible_deadwood_is_refused(start, stop, taken, says):
    with pytest.raises(DefinitionError, match=says):
        with_deadwood(vertical_cylinder(diameter=2.0, height=5.0), [start], [stop], [taken])
