"""Thresholds promise a rate of false alarms and keep it, however much the tests share."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.sparse.csgraph import minimum_spanning_tree
from scipy.stats import multivariate_normal, norm

from models.arrays import FloatArray
from models.balance.thresholds import (
    PAGE_SHARE,
    SIGNATURE_SHARE,
    alarm_rate,
    benjamini_hochberg,
    family_critical,
    family_p_value,
    spanning_tree,
    spanning_tree_by_rows,
)
from models.errors import DefinitionError

# The 15 p-values of the worked example of Benjamini & Hochberg 1995 (from memory).
WORKED = [0.0001, 0.0004, 0.0019, 0.0095, 0.0201, 0.0278, 0.0298, 0.0344, 0.0459, 0.3240, 0.4262, 0.5719, 0.6528,
          0.7590, 1.0]  # fmt: skip


def drawn(size: int, rows: int, seed: int = 5) -> FloatArray:
    """Correlations of scores of random signatures over so many balances."""
    shapes = np.random.default_rng(seed).standard_normal((rows, size))
    shapes /= np.linalg.norm(shapes, axis=0)
    return np.asarray(shapes.T @ shapes)


def pair(rho: float) -> FloatArray:
    return np.array([[1.0, rho], [rho, 1.0]])


def test_a_month_of_nights_shares_its_alarms_and_each_night_is_split_in_two() -> None:
    assert alarm_rate(0.5) == pytest.approx(1.0 / 60.88, rel=1e-12)
    assert alarm_rate(1.0) * 365.25 == pytest.approx(12.0, abs=0.001)
    assert [SIGNATURE_SHARE, PAGE_SHARE] == [0.8, 0.2]


@pytest.mark.parametrize("asked", [0.0, -1.0, 30.44, math.nan])
def test_a_rate_that_no_night_can_have_is_refused_with_the_way_out(asked: float) -> None:
    with pytest.raises(DefinitionError, match="must be above 0 and below 30.44") as refused:
        alarm_rate(asked)
    assert refused.value.field == "false_alarms_per_month"


def test_one_score_has_the_two_sided_chance_of_the_normal_law() -> None:
    # A hundred of them judged for a year at 3 sigma are 98.6 false flags, at 95 % 1,825: worked out by hand.
    assert 36_500 * family_p_value(3.0, np.ones((1, 1))) == pytest.approx(98.55, abs=0.02)
    assert family_critical(0.05, np.ones((1, 1))) == pytest.approx(1.959964, abs=5e-7)
    assert family_p_value(1.0, np.ones((1, 1))) == pytest.approx(0.3173105, abs=5e-8)


def test_no_score_at_all_is_never_passed() -> None:
    assert family_critical(0.05, np.zeros((0, 0))) == math.inf
    assert family_p_value(9.0, np.zeros((0, 0))) == 1.0


@pytest.mark.parametrize("rho", [0.0, 0.3, -0.7, 0.95, -0.9999])
@pytest.mark.parametrize("m", [0.1, 1.0, 2.5, 4.0])
def test_two_scores_are_exact(rho: float, m: float) -> None:
    law = multivariate_normal(cov=pair(rho))
    inside = law.cdf([m, m]) - law.cdf([m, -m]) - law.cdf([-m, m]) + law.cdf([-m, -m])
    assert family_p_value(m, pair(rho)) == pytest.approx(1.0 - inside, abs=1e-10)


@pytest.mark.parametrize(
    ("size", "sidak"),
    # Two-sided normal quantiles at 1 - (1 - 0.05)^(1/k), Šidák 1967; the first two also in Narasimhan & Jordache
    # 2000 (from memory). Independent scores pass together so rarely that the bound adds less than 0.02 to them.
    [(4, 2.4909), (6, 2.6310), (7, 2.6828), (10, 2.7996), (100, 3.4740), (1_000, 4.0497)],
)
def test_independent_scores_stand_between_sidak_and_bonferroni(size: int, sidak: float) -> None:
    bonferroni = norm.isf(0.025 / size)
    assert sidak - 5e-5 <= family_critical(0.05, np.eye(size)) < bonferroni
    assert bonferroni - sidak < (0.008 if size >= 10 else 0.02)


@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_scores_that_are_one_score_count_once(sign: float) -> None:
    side = np.array([1.0, sign, sign, 1.0, sign])
    same = np.outer(side, side)
    assert family_critical(0.0133, same) == pytest.approx(norm.isf(0.0133 / 2.0), rel=1e-9)
    assert family_p_value(2.0, same) == pytest.approx(2.0 * norm.sf(2.0), rel=1e-12)


def test_the_critical_value_is_the_root_of_the_chance() -> None:
    rho = drawn(60, 12)
    for alpha in (0.3, 0.0133, 1e-6):
        assert family_p_value(family_critical(alpha, rho), rho) == pytest.approx(alpha, rel=1e-6)


def test_a_chance_never_passes_one() -> None:
    assert family_p_value(0.5, np.eye(50)) == 1.0
    assert family_p_value(0.0, drawn(5, 3)) == 1.0


@pytest.mark.parametrize(("size", "rows"), [(2, 2), (40, 10), (700, 30)])
def test_both_trees_are_the_heaviest_one(size: int, rows: int) -> None:
    rho = drawn(size, rows)
    heaviest = np.sort(2.0 - minimum_spanning_tree(np.triu(2.0 - np.abs(rho), 1)).data)  # an independent search
    whole, lean = spanning_tree(rho), spanning_tree_by_rows(rho.__getitem__, size)
    assert whole.size == lean.size == size
    assert np.sort(whole.strength) == pytest.approx(heaviest, abs=1e-12)
    assert np.sort(lean.strength) == pytest.approx(heaviest, abs=1e-12)
    assert family_critical(0.01, lean) == pytest.approx(family_critical(0.01, rho), rel=1e-8)


def test_equal_correlations_still_make_a_tree() -> None:
    rho = np.full((9, 9), 0.4) + 0.6 * np.eye(9)
    for tree in (spanning_tree(rho), spanning_tree_by_rows(rho.__getitem__, 9)):
        assert tree.strength.tolist() == [0.4] * 8
    assert spanning_tree_by_rows(np.eye(1).__getitem__, 1).strength.size == 0
    assert spanning_tree_by_rows(np.zeros((0, 0)).__getitem__, 0).size == 0


@pytest.mark.parametrize("alpha", [0.05, 0.0133])
def test_the_true_rate_is_close_below_the_rate_asked_for(alpha: float) -> None:
    # Signatures as of a window of nights: for each of 8 vessels what begins at each of 20 nights and stays, and
    # what happens once, seen through the correlation of neighbouring nights. 320 scores, 100,000 windows.
    rng = np.random.default_rng(11)
    nights, vessels = 20, 8
    covariance = 2.0 * np.eye(nights) - 0.9 * (np.eye(nights, k=1) + np.eye(nights, k=-1))
    whitened = np.linalg.inv(np.linalg.cholesky(covariance))
    every = np.zeros((vessels, nights, vessels, 2, nights))
    for vessel, moved in enumerate(rng.uniform(0.2, 1.0, (vessels, nights))):
        every[vessel, :, vessel, 0] = whitened @ (np.tril(np.ones((nights, nights))) * moved[:, None])
        every[vessel, :, vessel, 1] = whitened
    shapes = every.reshape(vessels * nights, -1)
    shapes /= np.linalg.norm(shapes, axis=0)
    critical = family_critical(alpha, shapes.T @ shapes)
    passed = sum(
        int((np.abs(rng.standard_normal((4_000, len(shapes))) @ shapes).max(axis=1) > critical).sum())
        for _ in range(25)
    )
    rate = passed / 100_000
    noise = 2.5 * math.sqrt(alpha / 100_000)
    assert 0.8 * alpha - noise < rate < alpha + noise
    assert critical < norm.isf(alpha / 2.0 / shapes.shape[1]) - 0.05  # the tree gains something


def test_benjamini_hochberg_on_its_worked_example() -> None:
    shuffled = np.random.default_rng(3).permutation(15)
    counted = benjamini_hochberg(np.array(WORKED)[shuffled], 0.05)
    assert np.array(WORKED)[shuffled][counted].max() == 0.0095
    assert counted.sum() == 4  # Bonferroni: 3
    assert benjamini_hochberg(WORKED, 0.05).tolist() == [True] * 4 + [False] * 11


def test_benjamini_hochberg_steps_up_past_a_chance_that_fails_alone() -> None:
    assert benjamini_hochberg([0.03, 0.04], 0.05).tolist() == [True, True]
    assert benjamini_hochberg([0.03, 0.06], 0.05).tolist() == [False, False]
    assert benjamini_hochberg([0.5, 0.9], 0.05).tolist() == [False, False]
    assert benjamini_hochberg([], 0.05).tolist() == []


@pytest.mark.parametrize(
    ("tests", "faults", "shift", "found"), [(200, 10, 4.0, 0.82), (2_000, 10, 5.0, 0.91)]  # worked out by simulation
)  # fmt: skip
def test_benjamini_hochberg_keeps_the_share_of_false_ones(tests: int, faults: int, shift: float, found: float) -> None:
    rng = np.random.default_rng(17)
    true, false = [], []
    for _ in range(800):
        z = rng.standard_normal(tests)
        z[:faults] += shift
        counted = benjamini_hochberg(2.0 * norm.sf(np.abs(z)), 0.05)
        true.append(counted[:faults].mean())
        false.append(counted[faults:].sum() / max(counted.sum(), 1))
    assert np.mean(true) == pytest.approx(found, abs=0.015)
    assert np.mean(false) == pytest.approx(0.05 * (1.0 - faults / tests), abs=0.008)
