"""Piecewise cubics: made, joined, turned over, cut, and moved to another datum."""

import numpy as np
import pytest

from models.errors import DefinitionError
from models.geometry.curves import Curve, Curves
from models.geometry.heads import Head
from models.geometry.pieces import Pieces, cut, hermite, join, mirrored, polynomial, split, with_datum
from models.geometry.shapes import sphere, vertical_cylinder

TANK = vertical_cylinder(diameter=2.0, height=5.0, bottom=Head("cone", depth=1.0), top=Head("hemispherical"))


def volume(curve, level):
    return Curves.from_curves([curve]).volume(level)


def as_curve(part: Pieces) -> Curve:
    return Curve(part.heights, part.coefficients, part.total, "part", "")


def test_a_hermite_piece_of_a_cubic_is_that_cubic():
    knots = np.array([0.0, 0.7, 1.0, 3.0])
    found = hermite(knots, knots**3 - knots + 2.0, 3.0 * knots**2 - 1.0)
    at = np.linspace(0.0, 3.0, 31)
    assert volume(as_curve(found), at) == pytest.approx(at**3 - at + 2.0, abs=1e-13)


def test_parts_are_joined_where_the_last_one_ends():
    stack = join([polynomial(0.0, 1.0, (0.0, 2.0)), polynomial(5.0, 7.0, (9.0, 0.0, 1.0))])
    assert stack.heights.tolist() == [0.0, 1.0, 3.0]
    assert stack.total == pytest.approx(2.0 + 4.0)
    assert volume(as_curve(stack), [0.5, 1.0, 2.0, 3.0]) == pytest.approx([1.0, 2.0, 3.0, 6.0])


def test_a_body_turned_over_holds_the_rest():
    bowl = join([polynomial(0.0, 1.0, (0.0, 0.0, 1.0, 0.5)), polynomial(0.0, 2.0, (0.0, 3.5))])
    at = np.linspace(0.0, 3.0, 13)
    assert volume(as_curve(mirrored(bowl)), at) == pytest.approx(8.5 - volume(as_curve(bowl), 3.0 - at), abs=1e-13)
    assert mirrored(bowl).depth == 3.0


@pytest.mark.parametrize(("bottom", "top"), [(0.0, 7.0), (0.3, 6.5), (1.0, 6.0), (2.0, 2.5), (0.0, 0.5)])
def test_a_cut_curve_keeps_its_volumes(bottom, top):
    part = cut(TANK, bottom, top)
    at = np.linspace(bottom, top, 21)
    assert (part.bottom, part.top, part.capacity) == (bottom, top, TANK.capacity)
    assert volume(part, at) == pytest.approx(volume(TANK, at), rel=1e-13)


def test_further_knots_change_nothing():
    ball = sphere(diameter=4.0)
    finer = split(ball, [-1.0, 0.3, 2.0, 3.9, 4.0, 5.0])
    assert finer.levels.tolist() == [0.0, 0.3, 2.0, 3.9, 4.0]
    at = np.linspace(0.0, 4.0, 41)
    assert volume(finer, at) == pytest.approx(volume(ball, at), rel=1e-13, abs=1e-14)


def test_a_datum_above_the_bottom_holds_liquid_at_level_zero():
    shifted = with_datum(TANK, 0.25)
    assert (shifted.bottom, shifted.top) == (0.0, 6.75)
    assert volume(shifted, [0.0, 1.0, 6.75]) == pytest.approx(volume(TANK, [0.25, 1.25, 7.0]), rel=1e-13)
    assert shifted.capacity == TANK.capacity


def test_a_datum_below_the_bottom_reads_above_zero_when_empty():
    shifted = with_datum(TANK, -0.5)
    assert (shifted.bottom, shifted.top) == (0.5, 7.5)
    assert volume(shifted, 0.5) == 0.0


@pytest.mark.parametrize("datum", [7.0, 8.0, np.nan, np.inf])
def test_a_datum_over_the_vessel_is_refused(datum):
    with pytest.raises(DefinitionError, match="below the highest level of the vessel, 7 m") as refused:
        with_datum(TANK, datum)
    assert refused.value.field == "datum_m"
