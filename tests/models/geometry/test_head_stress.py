"""How much more an upright shell holds under the head of its liquid."""

import math

import numpy as np
import pytest
from scipy.integrate import quad

from models.errors import DefinitionError
from models.geometry.head_stress import HeadStress, coursed_shell

G = 9.80665
STEEL = 207e9
COURSES = [(2.4, 0.020), (2.4, 0.016), (2.4, 0.012), (2.4, 0.010), (2.4, 0.008)]


def shell(courses=COURSES, diameter=40.0, foot=0.0, top=0.0, modulus=STEEL):
    return coursed_shell(diameter=diameter, elastic_modulus=modulus, courses=courses, foot=foot, top=top)


def stack(*shells):
    return HeadStress.from_shells(shells)


def by_quadrature(level, courses=COURSES, diameter=40.0, foot=0.0, floor=-np.inf, modulus=STEEL):
    """∫ 2 ε(z) π D²/4 dz with the hoop strain of each height, course by course."""
    total, start = 0.0, foot
    for height, thickness in courses:
        low, high = max(start, floor), min(start + height, level)
        if high > low:
            hoop = G * diameter / (2.0 * modulus * thickness)  # for each metre of head and each kg/m³
            total += quad(lambda z, hoop=hoop: 2.0 * hoop * (level - z) * math.pi * diameter**2 / 4, low, high)[0]
        start += height
    return total


# Thin-wall elasticity worked by hand, π ρ g D³ H²/(8 E t): D 50 m, H 12 m, 860 kg/m³, t 10 mm, E 207 GPa.
def test_a_tank_of_fifty_metres_holds_nearly_29_cubic_metres_more():
    found, slope = stack(shell([(12.0, 0.010)], 50.0, top=12.0)).volume_per_density(12.0)
    assert found * 860.0 == pytest.approx(28.80, abs=0.005)
    assert found * 860.0 / (math.pi * 25.0**2 * 12.0) == pytest.approx(0.0012, abs=5e-5)  # 0.12 %
    assert found * 860.0 == pytest.approx(math.pi * 860.0 * G * 50.0**3 * 12.0**2 / (8.0 * 207e9 * 0.010), rel=1e-14)
    assert slope == pytest.approx(2.0 * found / 12.0, rel=1e-14)


def test_many_courses_of_one_thickness_are_one_course():
    one, many = shell([(12.0, 0.010)]), shell([(1.5, 0.010)] * 8)
    level = np.linspace(0.0, 12.0, 37)
    found = stack(one, many)
    for ours, theirs in zip(found.volume_per_density(level, 0), found.volume_per_density(level, 1), strict=True):
        np.testing.assert_allclose(theirs, ours, rtol=1e-13)


def test_it_grows_with_the_square_of_the_level():
    found, _ = stack(shell([(12.0, 0.010)])).volume_per_density([2.0, 4.0, 8.0])
    assert found / found[0] == pytest.approx([1.0, 4.0, 16.0], rel=1e-14)


@pytest.mark.parametrize("level", [0.7, 2.4, 3.1, 6.9, 9.6, 12.0, 13.0])
def test_the_courses_are_the_integral_of_their_strains(level):
    found, _ = stack(shell()).volume_per_density(level)
    assert found == pytest.approx(by_quadrature(level), rel=1e-12)


def test_a_shell_that_stands_on_a_cone_begins_at_its_foot():
    found, slope = stack(shell(foot=0.8)).volume_per_density([-1.0, 0.0, 0.8, 5.0])
    assert list(found[:3]) == [0.0, 0.0, 0.0]
    assert list(slope[:3]) == [0.0, 0.0, 0.0]
    assert found[3] == pytest.approx(by_quadrature(5.0, foot=0.8), rel=1e-12)


def test_slopes_are_the_derivatives():
    tank, step = stack(shell(foot=0.3)), 1e-5
    level, floor = np.array([2.2, 5.05, 7.77, 11.9]), np.array([0.0, 0.45, 3.3, 6.1])
    _, slope, by_floor = tank.above(level, floor)
    up, down = (tank.above(level + s, floor)[0] for s in (step, -step))
    assert slope == pytest.approx((up - down) / (2 * step), rel=1e-7)
    up, down = (tank.above(level, floor + s)[0] for s in (step, -step))
    assert by_floor == pytest.approx((up - down) / (2 * step), rel=1e-7, abs=1e-15)
    _, slope = tank.volume_per_density(level)
    up, down = (tank.volume_per_density(level + s)[0] for s in (step, -step))
    assert slope == pytest.approx((up - down) / (2 * step), rel=1e-7)


@pytest.mark.parametrize(("level", "floor"), [(9.0, 0.4), (9.0, 2.4), (9.0, 5.5), (2.0, 1.0)])
def test_above_free_water_only_the_wall_beside_the_liquid_counts(level, floor):
    found, _, _ = stack(shell()).above(level, floor)
    assert found == pytest.approx(by_quadrature(level, floor=floor), rel=1e-12)


def test_without_water_the_whole_wall_counts_and_under_water_nothing():
    tank = stack(shell())
    whole, slope = tank.volume_per_density(7.0)
    assert tank.above(7.0, 0.0) == pytest.approx((whole, slope, 0.0), rel=1e-15)
    assert tank.above(7.0, 8.0)[0] == 0.0
    assert np.isnan(tank.above(np.nan, 0.0)[0])
    assert np.isnan(tank.above(7.0, np.nan)[0])


def test_rows_of_a_stack_are_the_shells_alone_and_one_without_courses_does_not_widen():
    small = shell([(3.0, 0.006), (3.0, 0.005)], 12.0)
    found = stack(shell(), None, small)
    level, row = np.array([5.0, 5.0, 5.0, 11.0]), np.array([2, 1, 0, 0])
    volume, slope = found.volume_per_density(level, row)
    alone = [stack(small).volume_per_density(5.0), (0.0, 0.0), *(stack(shell()).volume_per_density(h) for h in (5, 11))]
    np.testing.assert_array_equal(np.column_stack([volume, slope]), np.array(alone))
    assert HeadStress.from_shells([None, None]) is None


@pytest.mark.parametrize(
    ("changed", "field", "told"),
    [
        ({"courses": []}, "courses", "no course"),
        ({"courses": [(2.0, 0.01), (0.0, 0.01)]}, "courses/1", "above 0 m"),
        ({"courses": [(2.0, -0.01)]}, "courses/0", "above 0 m"),
        ({"courses": [(math.nan, 0.01)]}, "courses/0", "above 0 m"),
        ({"top": 12.1}, "courses", "they must reach 12.1 m"),
        ({"foot": -0.5, "top": 12.0}, "courses", "courses end 11.5 m"),
        ({"diameter": 0.0}, "diameter_m", "above 0 m"),
        ({"modulus": 0.0}, "elastic_modulus_gpa", "above 0 GPa"),
        ({"modulus": math.nan}, "elastic_modulus_gpa", "above 0 GPa"),
    ],
)
def test_an_impossible_shell_is_refused(changed, field, told):
    with pytest.raises(DefinitionError, match=told) as refused:
        shell(**changed)
    assert refused.value.field == field


def test_courses_that_add_up_in_decimals_reach_the_top():
    assert shell([(0.1, 0.01)] * 3, top=0.3).feet[-1] == pytest.approx(0.3)
    assert shell([(0.3, 0.01)] * 4, top=1.2).feet[-1] == pytest.approx(1.2)


# --- what is added to a curve ---------------------------------------------------------------------


def test_pitfall_3_head_stress_already_in_the_table_counts_by_the_difference_of_the_densities_only():
    """Pitfall: a table made at 850 kg/m³ needs nothing at 850, and −1.2 % of its 0.12 % at 840."""
    tank = stack(shell([(12.0, 0.010)], 50.0, top=12.0))
    geometric = tank.widening(12.0, 0.0, 860.0, 0.0).volume
    assert geometric == pytest.approx(28.80, abs=0.005)
    assert tank.widening(12.0, 0.0, 850.0, 850.0).volume == 0.0
    lighter = tank.widening(12.0, 0.0, 840.0, 850.0).volume
    assert lighter == pytest.approx(-28.80 * 10.0 / 860.0, rel=2e-4)
    assert tank.widening(12.0, 0.0, 860.0, 850.0).volume == pytest.approx(-lighter, rel=1e-12)


def test_above_water_and_water_share_the_whole():
    found = stack(shell()).widening(10.0, 0.6, 840.0, 0.0)
    assert found.volume == pytest.approx(840.0 * by_quadrature(10.0, floor=0.6), rel=1e-12)
    assert found.volume + found.water_volume == pytest.approx(840.0 * by_quadrature(10.0), rel=1e-12)
    table = stack(shell()).widening(10.0, 0.6, 840.0, 800.0)
    held = 800.0 * (by_quadrature(10.0) - by_quadrature(0.6))
    assert table.volume == pytest.approx(840.0 * by_quadrature(10.0, floor=0.6) - held, rel=1e-11)
    assert table.volume + table.water_volume == pytest.approx(40.0 * by_quadrature(10.0), rel=1e-11)


def test_the_derivatives_of_what_is_added():
    tank, given, step = stack(shell()), np.array([9.1, 0.7, 840.0, 790.0]), np.array([1e-4, 1e-4, 1e-2, 0.0])
    found = tank.widening(*given)
    for place, own in enumerate((found.by_level, found.by_water_level, found.by_density)):
        change = np.where(np.arange(4) == place, step, 0.0)
        slope = (tank.widening(*(given + change)).volume - tank.widening(*(given - change)).volume) / (2 * step[place])
        assert own == pytest.approx(slope, rel=1e-6)


def test_a_tank_without_free_water_is_one_whose_water_stands_below_every_course():
    """−inf is how a state says that there is no water: it is no unknown level."""
    tank = stack(shell())
    dry, low = tank.widening(10.0, -np.inf, 840.0, 800.0), tank.widening(10.0, -1.0, 840.0, 800.0)
    assert dry == low
    assert dry.volume == pytest.approx(40.0 * by_quadrature(10.0), rel=1e-12)
    assert dry.water_volume == 0.0
    assert np.isnan(tank.widening(10.0, np.nan, 840.0, 800.0).volume)
