"""Columns of the chain: one value for all rows, or one a row."""

from __future__ import annotations

import math

import numpy as np
import pytest

from models.columns import UNMEASURED, Inventory, Mark
from models.mass import RESULTS, SENSITIVITIES, inventory
from tests.models.mass_cases import BULLET_CASE, CASES, OIL, Case, state, vessels


def test_vessels_are_taken_row_by_row_with_their_curves_whole() -> None:
    both = vessels([OIL, BULLET_CASE])
    taken = both.take(np.array([1, 1, 0]))
    assert taken.liquid_row.tolist() == [1, 1, 0]
    assert taken.liquids is both.liquids
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
    lost |= {"LIQUID_OUTSIDE_METHOD"}
    row = Inventory(np.array([int(mark)]), {"mass": np.array([1.0])}, {})
    assert row.measured[0] == (mark.name not in lost)
    assert bool(mark & UNMEASURED) == (mark.name in lost)
    assert row["mass"][0] == 1.0


def thousand() -> list[Case]:
    """A thousand vessels of every kind, each read otherwise."""
    draw = np.random.default_rng(20260314)
    cases = []
    for i in range(1000):
        case = CASES[i % len(CASES)]
        change = {"ambient_temperature": 278.15 + draw.uniform(-10.0, 10.0)}
        if case.curve is not None:
            change["level"] = float(draw.uniform(0.2, 0.9)) * case.curve.top
            change["liquid_temperature"] = case.reading["liquid_temperature"] + draw.uniform(-3.0, 3.0)
        if i % 97 == 5:
            change["level"] = 1e3
        if i % 97 == 6 and case.curve is not None:
            change["water_level"] = change["level"] + 0.01
        if i % 89 == 7:
            change["liquid_temperature"] = change["vapour_temperature"] = math.nan
        cases.append(case.reads(**change))
    return cases


def assert_equal_row(many: Inventory, row: int, one: Inventory) -> None:
    assert many.marks[row] == one.marks[0]
    for name in RESULTS:
        np.testing.assert_allclose(many[name][row], one[name][0], rtol=1e-13, err_msg=name)
    for name in SENSITIVITIES:
        np.testing.assert_allclose(
            many.sensitivities[name][row], one.sensitivities[name][0], rtol=1e-10, atol=1e-12, err_msg=name
        )


def test_a_thousand_vessels_in_one_call_are_a_thousand_calls() -> None:
    cases = thousand()
    many = inventory(vessels(cases), np.arange(len(cases)), state(cases))
    assert 0.9 < np.isfinite(many["mass"]).mean() < 1.0
    for row, case in enumerate(cases):
        assert_equal_row(many, row, inventory(vessels([case]), None, state([case])))


def test_a_row_that_fails_does_not_touch_its_neighbours() -> None:
    good = [BULLET_CASE.reads(level=0.3 + 0.1 * i) for i in range(20)]
    bad = [
        case.reads(**change) if i % 5 == 2 else case
        for i, (case, change) in enumerate(
            zip(good, [{"level": 9.0}, {"level": math.nan}, {"pressure": -3.0}, {"liquid_temperature": 900.0}] * 5,
                strict=True)
        )
    ]  # fmt: skip
    whole = inventory(vessels(good[:1]), None, state(good))
    hurt = inventory(vessels(good[:1]), None, state(bad))
    for row in range(20):
        if row % 5 != 2:
            assert hurt["mass"][row] == whole["mass"][row]
            assert hurt.marks[row] == whole.marks[row]


def test_nothing_read_gives_nothing() -> None:
    nothing = np.empty(0, dtype=np.intp)
    read = state([OIL, OIL]).take(nothing)
    assert len(inventory(vessels([OIL]), nothing, read)["mass"]) == 0
    assert len(inventory(vessels([OIL]), None, read)["mass"]) == 0
