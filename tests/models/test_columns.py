"""Columns of the chain: one value for all rows, or one a row."""

from __future__ import annotations

import numpy as np
import pytest

from models.columns import UNMEASURED, Inventory, Mark
from tests.models.mass_cases import BULLET_CASE, OIL, state, vessels


def test_vessels_are_taken_row_by_row_with_their_curves_whole() -> None:
    both = vessels([OIL, BULLET_CASE])
    taken = both.take(np.array([1, 1, 0]))
    assert taken.compressibility.tolist() == [4.5e-9, 4.5e-9, 7.5e-10]
    assert [b.tolist() for b in taken.expansivity] == [[2.9e-3, 2.9e-3, 8.3e-4], [1.1e-5, 1.1e-5, 0.0]]
    assert taken.curve_row.tolist() == [1, 1, 0]
    assert taken.curves is both.curves
    assert taken.saturation is both.saturation


def test_a_states_columns_of_one_value_stay_as_they_are() -> None:
    read = state([OIL.reads(level=float(i)) for i in range(4)])
    wide = type(read)(**{**read.__dict__, "density": np.array([840.0]), "vapour_row": np.array([3, 4, 5, 6])})
    taken = wide.take(np.array([2, 3]))
    assert wide.rows == 4
    assert taken.level.tolist() == [2.0, 3.0]
    assert taken.density.tolist() == [840.0]
    assert taken.vapour_row is not None
    assert taken.vapour_row.tolist() == [5, 6]
    assert read.take(slice(0, 1)).vapour_row is None


@pytest.mark.parametrize("mark", list(Mark))
def test_marks_that_take_the_mass_away_are_told_from_those_that_doubt_it(mark: Mark) -> None:
    lost = {"GUARD_REFUSED", "OUTSIDE_VESSEL", "OUTSIDE_TABLE", "OUTSIDE_METHOD", "NO_VAPOUR_ROOT", "MISSING"}
    row = Inventory(np.array([int(mark)]), {"mass": np.array([1.0])}, {})
    assert row.measured[0] == (mark.name not in lost)
    assert bool(mark & UNMEASURED) == (mark.name in lost)
    assert row["mass"][0] == 1.0
