"""Shapes as capacity tables, and the error of reading between the rows."""

import math

import numpy as np
import pytest
from scipy.optimize import minimize_scalar

from models.errors import DefinitionError
from models.geometry.curves import Curves
from models.geometry.heads import Head
from models.geometry.lying import horizontal_cylinder
from models.geometry.pieces import with_datum
from models.geometry.shapes import box, sphere, vertical_cylinder
from models.geometry.tables import INTERPOLATIONS, capacity_table
from models.geometry.tabulate import row_count, row_levels, rows_off_nominal, worst_error

END = Head("ellipsoidal", depth=0.75)
BULLET = horizontal_cylinder(diameter=3.0, length=16.0, left_head=END, right_head=END)


def volume(curve, level):
    return Curves.from_curves([curve]).volume(level)


def table_of(curve, step, kind="linear"):
    levels = row_levels(curve, step)
    return capacity_table(levels, volume(curve, levels), interpolation=kind)


def true_bullet(h):
    """D 3 m, L 16 m, two 2:1 heads, by the closed forms of a segment and an ellipsoid."""
    phi = math.acos(1.0 - h / 1.5)
    return 16.0 * 2.25 * (phi - math.sin(phi) * math.cos(phi)) + math.pi * 0.75 / 4.5 * h * h * (4.5 - h)


# Overstatement of a linear table midway between the row at this level and the next, in per cent: worked out
# beforehand from the closed forms, to the digits given.
@pytest.mark.parametrize(
    ("step", "level", "percent", "half_a_digit"),
    [
        (0.010, 0.1, 0.084, 5e-4), (0.010, 0.3, 0.009, 5e-4), (0.010, 0.7, 0.0013, 5e-5),
        (0.050, 0.1, 1.5, 5e-2), (0.050, 0.3, 0.20, 5e-3), (0.050, 0.7, 0.031, 5e-4),
        (0.100, 0.1, 4.1, 5e-2), (0.100, 0.3, 0.685, 5e-4), (0.100, 0.7, 0.11, 5e-3),
    ],
)  # fmt: skip
def test_a_linear_table_of_a_lying_vessel_overstates(step, level, percent, half_a_digit):
    """Pitfall: linear interpolation in a horizontal vessel, D 3 m, L 16 m, 2:1 heads."""
    at = level + 0.5 * step
    found = 100.0 * (volume(table_of(BULLET, step), at) / volume(BULLET, at) - 1.0)
    assert found == pytest.approx(percent, abs=half_a_digit)
    by_hand = 50.0 * (true_bullet(level) + true_bullet(level + step)) / true_bullet(at) - 100.0
    assert found == pytest.approx(by_hand, rel=1e-6)
    cubic = 100.0 * (volume(table_of(BULLET, step, "monotone_cubic"), at) / volume(BULLET, at) - 1.0)
    assert abs(cubic) < 0.3 * found


@pytest.mark.parametrize("kind", INTERPOLATIONS)
@pytest.mark.parametrize("curve", [BULLET, sphere(diameter=12.0)], ids=lambda curve: curve.kind)
def test_the_worst_error_is_the_greatest_of_a_dense_search_and_no_smaller(curve, kind):
    table = table_of(curve, 0.1, kind)
    found = worst_error(curve, table)
    levels = np.linspace(0.0, curve.top, 40_001)
    errors = np.abs(volume(table, levels) - volume(curve, levels))
    densest = int(np.argmax(errors))
    best = minimize_scalar(
        lambda h: -abs(float(volume(table, h) - volume(curve, h))), method="bounded",
        bounds=(levels[max(densest - 1, 0)], levels[min(densest + 1, 40_000)]), options={"xatol": 1e-10},
    )  # fmt: skip
    assert abs(found.volume) >= errors[densest] * (1.0 - 1e-9)
    assert abs(found.volume) == pytest.approx(-best.fun, rel=1e-6)
    there = float(volume(curve, found.level))
    assert found.volume == pytest.approx(float(volume(table, found.level)) - there, rel=1e-9)
    assert found.share == pytest.approx(found.volume / there, rel=1e-12)


def test_between_the_rows_of_a_sphere_the_error_is_that_of_its_second_derivative():
    # V = π h²(3R − h)/3 with R = 6: V'' = 2π(R − h), so a chord of length s is off by s² V''/8 at the most,
    # which is greatest in the first step and as great, with the other sign, in the last.
    for step in (0.1, 0.01):
        found = worst_error(sphere(diameter=12.0), table_of(sphere(diameter=12.0), step))
        assert abs(found.volume) == pytest.approx(2.0 * math.pi * 6.0 * step**2 / 8.0, rel=0.02)
        assert found.level < step or found.level > 12.0 - step


def test_a_shape_with_straight_walls_is_tabulated_without_error():
    for curve in (box(length=6.0, width=2.5, height=2.0), vertical_cylinder(diameter=20.0, height=11.987)):
        found = worst_error(curve, table_of(curve, 0.25))
        assert abs(found.volume) < 1e-11


def test_a_monotone_cubic_is_nearer_than_straight_lines():
    linear, cubic = (abs(worst_error(BULLET, table_of(BULLET, 0.05, kind)).volume) for kind in INTERPOLATIONS)
    assert cubic < 0.5 * linear  # in the first step, where the volume grows with h to the power of 1.5


def test_rows_are_multiples_of_the_step_and_both_ends():
    assert list(row_levels(box(length=1.0, width=1.0, height=1.0), 0.1)) == [
        0.0, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 1.0,
    ]  # fmt: skip
    assert list(row_levels(box(length=1.0, width=1.0, height=0.95), 0.3)) == [0.0, 0.3, 0.6, 0.9, 0.95]
    assert list(row_levels(box(length=1.0, width=1.0, height=1.0), 5.0)) == [0.0, 1.0]
    low = with_datum(box(length=1.0, width=1.0, height=1.0), -0.25)
    assert list(row_levels(low, 0.5)) == [0.25, 0.5, 1.0, 1.25]


@pytest.mark.parametrize("step", [0.01, 0.007, 0.3, 1.0, 4.0])
def test_the_number_of_rows_is_known_before_they_are_made(step):
    for curve in (BULLET, with_datum(BULLET, -0.213)):
        assert 0 <= row_count(curve, step) - len(row_levels(curve, step)) <= 2


@pytest.mark.parametrize("step", [0.0, -0.1, math.nan, math.inf])
def test_a_step_that_cannot_be_is_refused(step):
    with pytest.raises(DefinitionError, match="step_m") as refused:
        row_levels(BULLET, step)
    assert refused.value.field == "step_m"


def test_a_step_in_volume_away_from_the_nominal_area_is_found():
    levels = np.array([0.0, 0.1, 0.2, 0.3, 0.4])
    volumes = np.array([3.0, 13.0, 23.0, 32.0, 43.0])  # 100 m²: the third step is 10 % short, the last 10 % long
    off, departure = rows_off_nominal(levels, volumes, area=100.0, share=0.05)
    assert list(off) == [False, False, True, True]
    assert departure == pytest.approx([0.0, 0.0, -0.1, 0.1], abs=1e-12)
    # Written to whole cubic metres, a step of 10 m³ may be 9 or 11.
    assert not rows_off_nominal(levels, volumes, area=100.0, share=0.05, resolution=1.0)[0].any()
