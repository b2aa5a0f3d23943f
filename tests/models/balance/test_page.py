"""Page's sums alarm as seldom as stated, and soon when mass goes missing night after night."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.stats import norm

from models.balance.page import page_limit, page_limits, page_sums, stated_run_length
from models.balance.run_length import page_one_sided
from models.errors import DefinitionError

TEN_YEARS, ONE_YEAR = 3_652.5, 365.25  # nights


@pytest.mark.parametrize(
    ("allowance", "run_length", "limit"),
    # Worked out from the integral equation with 80 Gauss nodes by a program of its own; two sums, one on each
    # side, alarm twice as often as one, so their limit is that of one for twice the run length.
    [(0.25, TEN_YEARS, 11.115), (0.5, TEN_YEARS, 6.356), (0.75, TEN_YEARS, 4.399), (1.0, TEN_YEARS, 3.310),
     (0.25, ONE_YEAR, 6.684), (0.5, ONE_YEAR, 4.083), (0.75, ONE_YEAR, 2.874), (1.0, ONE_YEAR, 2.169),
     (0.25, 2 * TEN_YEARS, 12.487), (0.5, 2 * TEN_YEARS, 7.047), (0.75, 2 * TEN_YEARS, 4.860),
     (1.0, 2 * TEN_YEARS, 3.657)],
)  # fmt: skip
def test_limits_for_a_stated_run_length(allowance: float, run_length: float, limit: float) -> None:
    assert page_limit(allowance, run_length) == pytest.approx(limit, abs=6e-4)


@pytest.mark.parametrize(
    ("allowance", "nights"),
    # Mean nights to the alarm of a loss of 0.25, 0.5, 1 and 2 standard deviations a night, as above.
    [(0.25, [150.8, 41.2, 15.5, 7.0]), (0.5, [305.5, 56.6, 13.1, 4.9]), (1.0, [708.2, 163.5, 20.0, 4.1])],
)
def test_nights_to_the_alarm_at_one_false_one_in_ten_years(allowance: float, nights: list[float]) -> None:
    limit = page_limit(allowance, TEN_YEARS)
    for shift, expected in zip((0.25, 0.5, 1.0, 2.0), nights, strict=True):
        assert page_one_sided(allowance, limit, shift=shift) == pytest.approx(expected, abs=0.06)


def test_single_nights_need_longer_for_a_slow_loss() -> None:
    limit = norm.isf(1.0 / TEN_YEARS)
    assert limit == pytest.approx(3.456, abs=5e-4)
    for shift, expected in zip((0.25, 0.5, 1.0, 2.0), (1_487.7, 642.4, 142.5, 13.76), strict=True):
        assert page_one_sided(limit, 0.0, shift=shift) == pytest.approx(expected, rel=1e-3)


def test_ten_vessels_and_one_flag_in_two_months() -> None:
    rate = 0.5 / 30.44
    assert stated_run_length(10, rate) == pytest.approx(6_088.0, abs=1e-6)  # 20 sums over a fifth of the rate
    (slow, slow_limit), (quick, quick_limit) = page_limits(10, rate)
    assert (slow, quick) == (0.25, 1.0)
    assert slow_limit == pytest.approx(12.1, abs=0.05)
    assert quick_limit == pytest.approx(3.57, abs=0.005)


def test_limits_of_tens_of_thousands_of_vessels() -> None:
    (_, slow), (_, quick) = page_limits(30_000, 0.5 / 30.44)
    for allowance, limit in ((0.25, slow), (1.0, quick)):
        reach = limit + 1.166  # D. Siegmund 1985, good to a percent where the sum must climb far
        siegmund = (math.expm1(2.0 * allowance * reach) - 2.0 * allowance * reach) / (2.0 * allowance**2)
        assert siegmund == pytest.approx(60_000 * 304.4, rel=0.15 if allowance == 1.0 else 0.01)


@pytest.mark.parametrize("run_length", [6.0, 1.0, math.inf, math.nan])
def test_a_run_length_that_no_limit_gives_is_refused(run_length: float) -> None:
    with pytest.raises(DefinitionError, match="alarms by chance after 6.30 nights or more") as refused:
        page_limit(1.0, run_length)
    assert refused.value.field == "run_length"


def test_a_sum_rises_falls_to_zero_alarms_and_begins_anew() -> None:
    score = np.array([[1.5, -3.0], [1.25, 0.25], [1.5, np.nan], [0.75, 5.0], [-9.0, 0.0]])
    sums, alarms = page_sums(score, 0.5, 2.5)  # the first vessel's third night passes 2.5, the second's fourth
    assert sums.T.tolist() == [[1.0, 1.75, 2.75, 0.25, 0.0], [0.0, 0.0, 0.0, 4.5, 0.0]]
    assert alarms.T.tolist() == [[False, False, True, False, False], [False, False, False, True, False]]


def test_a_sum_at_its_limit_does_not_alarm_yet() -> None:
    _, alarms = page_sums(np.array([1.0, 1.0, 1.0]), 0.5, 1.0)
    assert alarms.tolist() == [False, False, True]


def test_a_night_without_a_score_leaves_the_sum() -> None:
    sums, _ = page_sums(np.array([2.0, np.nan, 1.0]), 0.5, 9.0)
    assert sums.tolist() == [1.5, 1.5, 2.0]


def test_no_night_is_no_sum() -> None:
    sums, alarms = page_sums(np.zeros((0, 3)), 0.25, 5.0)
    assert sums.shape == alarms.shape == (0, 3)


@pytest.mark.parametrize(("shift", "mean"), [(0.0, 40.0), (1.0, 8.38)])
def test_simulated_sums_alarm_after_the_mean_run_length(shift: float, mean: float) -> None:
    # 8.38 with an allowance of 0.5 and a limit of 4: Lucas & Crosier 1982 (from memory).
    limit = 4.0 if shift else page_limit(0.5, mean)
    score = np.random.default_rng(23).standard_normal((900, 10_000)) + shift
    _, alarms = page_sums(score, 0.5, limit)
    assert alarms.any(axis=0).all()
    first = alarms.argmax(axis=0) + 1.0
    assert first.mean() == pytest.approx(mean, abs=4.0 * first.std() / 100.0)
