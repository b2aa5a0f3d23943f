"""Nightly imbalances made independent, watched, and turned into a rate of loss that is honest about what it sees."""

from __future__ import annotations

import math

import numpy as np
import pytest

from models.arrays import FloatArray
from models.balance.trends import Innovations, cumulative, innovations, loss_rate, watch
from models.estimate import Estimate

# Twelve nights of a vessel with an inventory known to 1 kg, tickets to 0.5 kg each and 0.1 kg through one meter, with
# 0.6 kg a night lost from the fifth on: drawn once, and worked out by a program of its own (sign: missing is positive).
MISSING = [1.873108, -1.591894, -0.654973, 3.040762, -0.56351, -0.426008, 0.983907, 0.172914, 1.060565, -0.556385,
           0.589128, 1.062384]  # fmt: skip
SCORES = [1.245973, -0.570789, -0.821231, 1.859, 0.646817, 0.031322, 0.750943, 0.543074, 1.095766, 0.166101, 0.495664,
          1.049055]  # fmt: skip
SPREADS = [1.50333, 1.351417, 1.314551, 1.304407, 1.301964, 1.301601, 1.3016, 1.301505, 1.30125, 1.300874, 1.300423,
           1.299937]  # fmt: skip
SUMS = [0.745973, 0, 0, 1.359, 1.505817, 1.03714, 1.288082, 1.331156, 1.926922, 1.593023, 1.588688, 2.137743]
TOTALS = [1.873108, 0.281214, -0.373759, 2.667003, 2.103493, 1.677485, 2.661392, 2.834306, 3.894871, 3.338486,
          3.927614, 4.989998]  # fmt: skip
TOTAL_SPREADS = [1.50333, 1.593738, 1.68523, 1.777639, 1.870829, 1.964688, 2.059126, 2.154066, 2.249444, 2.345208,
                 2.441311, 2.537716]  # fmt: skip


def lone_vessel() -> Innovations:
    nights = len(MISSING)
    covariance = 2.26 * np.eye(nights) - 1.0 * (np.eye(nights, k=1) + np.eye(nights, k=-1))
    covariance += 0.01 * (1.0 - np.eye(nights))
    lower = np.asarray(np.linalg.cholesky(covariance), dtype=np.float64)
    return innovations(lower, np.linalg.solve(lower, -np.array(MISSING)), np.arange(1, nights + 1))


def test_a_lone_vessel_equals_the_sequence_worked_out_elsewhere() -> None:
    found = lone_vessel()
    assert np.sqrt(found.variance) == pytest.approx(np.array(SPREADS), abs=1e-6)
    assert found.value == pytest.approx(-np.array(SCORES) * np.array(SPREADS), abs=2e-6)
    score = found.scores(np.arange(12)[None])
    assert score.shape == (12, 1)
    assert score[:, 0] == pytest.approx(np.array(SCORES), abs=1e-6)


def test_page_on_that_sequence_equals_its_sums() -> None:
    watched = watch(lone_vessel().scores(np.arange(12)[None]), [(0.5, 2.0)])
    assert watched.statistic[:, 0] == pytest.approx(np.array(SUMS), abs=2e-6)
    assert watched.flagged[:, 0].tolist() == [False] * 11 + [True]
    assert set(watched.limit.ravel()) == {2.0}


def test_the_nearest_sum_is_shown_and_any_sum_flags() -> None:
    score = np.array([[3.0, 0.6, np.nan], [0.0, 0.6, 1.0], [0.0, 0.6, 1.0]])
    watched = watch(score, [(0.25, 10.0), (1.0, 1.5)])
    assert watched.flagged.tolist() == [[True, False, False], [False, False, False], [False, False, False]]
    assert watched.statistic[0, 0] == 2.0
    assert watched.limit[0, 0] == 1.5
    assert watched.statistic[:, 1] == pytest.approx([0.35, 0.70, 1.05])
    assert watched.limit[:, 1].tolist() == [10.0] * 3
    assert watched.statistic[1, 0] == pytest.approx(2.5)  # the quick sum was reset, the slow one goes on


def linked(nights: int, vessels: int, seed: int) -> tuple[FloatArray, FloatArray, FloatArray]:
    """A, the covariance of what was measured, and one draw of it, for vessels in a ring that all share one error."""
    rng = np.random.default_rng(seed)
    stocks = np.arange(vessels * (nights + 1)).reshape(nights + 1, vessels)
    incidence = np.zeros((nights * vessels, stocks.size + nights * vessels))
    for night in range(nights):
        for vessel in range(vessels):
            row = night * vessels + vessel
            incidence[row, stocks[night + 1, vessel]], incidence[row, stocks[night, vessel]] = 1.0, -1.0
            ticket = stocks.size + row
            incidence[row, ticket] = 1.0
            incidence[night * vessels + (vessel + 1) % vessels, ticket] = -1.0
    shared = rng.normal(0.0, 30.0, (incidence.shape[1], 6))
    covariance = np.diag(rng.uniform(20.0, 400.0, incidence.shape[1]) ** 2) + shared @ shared.T
    return incidence, covariance, rng.multivariate_normal(np.zeros(len(covariance)), covariance)


def test_innovations_equal_what_each_night_adds_to_all_before_it() -> None:
    nights, vessels = 9, 4
    incidence, covariance, measured = linked(nights, vessels, 3)
    residual = incidence @ measured
    whole = incidence @ covariance @ incidence.T
    lower = np.asarray(np.linalg.cholesky(whole), dtype=np.float64)
    white = np.asarray(np.linalg.solve(lower, residual), dtype=np.float64)
    found = innovations(lower, white, np.repeat(np.arange(1, nights + 1), vessels))
    for night in range(nights):
        old, new = slice(0, night * vessels), slice(night * vessels, (night + 1) * vessels)
        gain = np.linalg.solve(whole[old, old], whole[old, new]).T  # the law of a normal vector given a part of it
        expected = residual[new] - gain @ residual[old]
        variance = np.diag(whole[new, new] - gain @ whole[old, new])
        assert found.value[new] == pytest.approx(expected, rel=1e-9, abs=1e-9 * np.abs(residual).max())
        assert found.variance[new] == pytest.approx(variance, rel=1e-9)


def test_innovations_equal_those_of_a_filter() -> None:
    # R. E. Kalman, J. Basic Eng. 82 (1960) 35-45: the state is the true content and the meter's one error.
    closes = np.concatenate([[0.0], np.cumsum(-np.array(MISSING))])  # what was read, if the tickets add up to nothing
    state, spread = np.array([closes[0], 0.0]), np.diag([1.0, 1.0])
    step, seen = np.array([[1.0, -0.1], [0.0, 1.0]]), np.array([1.0, 0.0])
    expected, variance = [], []
    for reading in closes[1:]:
        state, spread = step @ state, step @ spread @ step.T + np.diag([0.25, 0.0])
        expected.append(reading - state[0])
        variance.append(spread[0, 0] + 1.0)
        gain = spread @ seen / variance[-1]
        state, spread = state + gain * expected[-1], spread - np.outer(gain, seen @ spread)
    found = lone_vessel()
    assert found.value == pytest.approx(np.array(expected), abs=1e-12)
    assert found.variance == pytest.approx(np.array(variance), rel=1e-12)


def test_a_night_without_a_row_or_completed_later_has_no_score() -> None:
    found = Innovations(np.array([-4.0, 6.0, 1.0]), np.array([4.0, 9.0, 4.0]), np.array([1, 3, 3]))
    score = found.scores(np.array([[0, 1, 1], [-1, -1, 2]]))  # the first vessel's second night merged with its third
    assert score.tolist()[0] == pytest.approx([2.0, math.nan], nan_ok=True)
    assert score.tolist()[1] == pytest.approx([math.nan, math.nan], nan_ok=True)
    assert score.tolist()[2] == pytest.approx([-2.0, -0.5])


def test_a_group_without_rows_has_no_scores() -> None:
    found = innovations(np.zeros((0, 0)), np.zeros(0), np.zeros(0, dtype=np.intp))
    assert found.value.size == 0
    assert np.isnan(found.scores(np.full((2, 3), -1))).all()
    assert found.scores(np.full((2, 3), -1)).shape == (3, 2)


def nightly(night: int) -> Estimate:
    """Physical less book of one night, with the errors of both inventories, its tickets and their meter."""
    parts = {f"stock {night}": 1.0, f"stock {night - 1}": -1.0, f"tickets {night}": 0.5, "meter": 0.1}
    return Estimate(-MISSING[night - 1], parts)


def test_of_the_inventories_only_two_survive_in_a_sum() -> None:
    for nights in range(1, 13):
        found = cumulative(nightly(night) for night in range(1, nights + 1))
        assert found.value == pytest.approx(-TOTALS[nights - 1], abs=1e-6)
        assert found.uncertainty == pytest.approx(TOTAL_SPREADS[nights - 1], abs=1e-6)
        assert {name for name in found.parts if name.startswith("stock")} == {"stock 0", f"stock {nights}"}


@pytest.mark.parametrize(("nights", "spread", "smallest"), [(1, 1.50, 4.93), (7, 1.94, 0.91), (30, 3.08, 0.34)])
def test_a_steady_loss_that_is_seen_shrinks_with_the_nights(nights: int, spread: float, smallest: float) -> None:
    # var = 2 s_I² + n s_T² without a meter's error, and 3.29 of its root over n nights: worked out by hand. The sum of
    # n nights is their best evidence where a loss is spread as their covariance is; here, all of it.
    found = cumulative(
        Estimate(0.0, {f"stock {night}": 1.0, f"stock {night - 1}": -1.0, f"tickets {night}": 0.5})
        for night in range(nights)
    )
    assert found.uncertainty == pytest.approx(spread, abs=0.005)
    rate = loss_rate(nights, 0.0, (nights / found.uncertainty) ** 2, 1.6449)
    assert rate is not None
    assert rate.detectable == pytest.approx(smallest, abs=0.005)


def test_a_rate_has_its_interval_and_its_limit_of_sight() -> None:
    rate = loss_rate(7, 0.5, 0.01, 3.5)  # u = 10 kg/d
    assert rate is not None
    assert rate.nights == 7
    assert [rate.rate, rate.low, rate.high] == pytest.approx([50.0, 30.40036, 69.59964], abs=1e-5)
    assert rate.detectable == pytest.approx(51.44854, abs=1e-5)


@pytest.mark.parametrize("weight", [0.0, math.nan])
def test_balances_that_say_nothing_give_no_rate(weight: float) -> None:
    assert loss_rate(30, 0.0, weight, 3.0) is None


def test_the_rates_cover_the_true_one_and_find_a_detectable_one() -> None:
    rng = np.random.default_rng(29)
    incidence, covariance, _ = linked(7, 3, 4)
    whole = incidence @ covariance @ incidence.T
    lost = np.zeros(21)
    lost[1::3] = -1.0  # of the second vessel, one kilogram a night
    pull = np.linalg.solve(whole, lost)
    weight, critical = float(lost @ pull), 3.0
    noise = rng.multivariate_normal(np.zeros(21), whole, 3_000)
    blank = loss_rate(7, 0.0, weight, critical)
    assert blank is not None
    found = [loss_rate(7, float(pull @ (one + blank.detectable * lost)), weight, critical) for one in noise]
    covered = np.mean([one is not None and one.low < blank.detectable < one.high for one in found])
    flagged = np.mean([one is not None and one.rate * math.sqrt(weight) > critical for one in found])
    assert covered == pytest.approx(0.95, abs=0.014)
    assert flagged == pytest.approx(0.95, abs=0.014)
