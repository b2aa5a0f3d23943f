"""A budget is doubted when it is, in either direction, and not for a handful of nights."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import chi2

from models.arrays import BoolArray, FloatArray
from models.balance.health import Verdict, budget_health, quiet


def scores(nights: int, total: float) -> FloatArray:
    """One vessel's scores with a given sum of squares."""
    one = np.arange(1.0, nights + 1.0)
    return np.asarray((one * np.sqrt(total / (one**2).sum()))[:, None])


def calm(nights: int, vessels: int = 1) -> BoolArray:
    return np.zeros((nights, vessels), dtype=bool)


@pytest.mark.parametrize(
    ("nights", "total", "verdict"),
    # Quantiles of the chi-square law at 0.005 on either side, from any table: 15 nights 4.601 and 32.801, 20 nights
    # 7.434 and 39.997, 30 nights 13.787 and 53.672; each missed and passed by a little.
    [(15, 4.599, "overstated"), (15, 4.603, "sound"), (15, 32.799, "sound"), (15, 32.803, "understated"),
     (20, 7.432, "overstated"), (20, 7.436, "sound"), (20, 39.994, "sound"), (20, 39.999, "understated"),
     (30, 13.784, "overstated"), (30, 13.790, "sound"), (30, 53.670, "sound"), (30, 53.675, "understated"),
     (14, 500.0, "too_few"), (14, 0.01, "too_few")],
)  # fmt: skip
def test_both_tails_are_doubted_at_one_in_a_hundred(nights: int, total: float, verdict: str) -> None:
    (found,) = budget_health(scores(nights, total), calm(nights))
    assert (found.nights, found.verdict) == (nights, verdict)
    assert found.ratio == pytest.approx(np.sqrt(total / nights), rel=1e-12)
    assert found.p_value == pytest.approx(2.0 * min(chi2.cdf(total, nights), chi2.sf(total, nights)), rel=1e-9)


def test_a_chance_never_passes_one() -> None:
    median = chi2.ppf(0.5, 20)
    (found,) = budget_health(scores(20, median), calm(20))
    assert found.p_value is not None
    assert found.p_value == pytest.approx(1.0, abs=1e-6)
    assert found.p_value <= 1.0


def test_a_vessel_without_a_night_has_no_ratio() -> None:
    for score in (np.zeros((0, 1)), np.full((20, 1), np.nan)):
        (found,) = budget_health(score, calm(len(score)))
        assert (found.nights, found.ratio, found.p_value, found.verdict) == (0, None, None, "too_few")


def test_flagged_nights_and_three_after_them_do_not_count() -> None:
    flagged = calm(10)
    flagged[2] = flagged[8] = True
    assert quiet(flagged)[:, 0].tolist() == [True, True, False, False, False, False, True, True, False, False]
    assert flagged.sum() == 2  # what was given is left as it was


def test_each_vessel_is_judged_by_its_own_nights() -> None:
    score = np.concatenate([scores(20, 20.0), scores(20, 20.0), scores(20, 20.0)], axis=1)
    score[[3, 4], 1] = np.nan
    score[6, 2] = 50.0
    flagged = calm(20, 3)
    flagged[6, 2] = True
    first, second, third = budget_health(score, flagged)
    assert [one.nights for one in (first, second, third)] == [20, 18, 16]
    assert [one.verdict for one in (first, second, third)] == ["sound", "sound", "sound"]


@pytest.mark.parametrize(("spread", "verdict", "power"), [(1.5, "understated", 0.779), (0.5, "overstated", 0.994)])
def test_thirty_nights_tell_a_wrong_budget(spread: float, verdict: Verdict, power: float) -> None:
    # χ²_30 beyond 53.672/2.25 and below 13.787/0.25.
    score = np.random.default_rng(31).normal(0.0, spread, (30, 4_000))
    found = [one.verdict for one in budget_health(score, calm(30, 4_000))]
    assert found.count(verdict) / 4_000 == pytest.approx(power, abs=0.02)


def test_a_right_budget_is_doubted_once_in_a_hundred() -> None:
    found = budget_health(np.random.default_rng(37).standard_normal((30, 20_000)), calm(30, 20_000))
    doubted = [one.verdict for one in found if one.verdict != "sound"]
    assert len(doubted) / 20_000 == pytest.approx(0.01, abs=0.0022)
    assert doubted.count("understated") / len(doubted) == pytest.approx(0.5, abs=0.12)
