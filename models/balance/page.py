"""Page's test of a slow loss: sums of nightly scores that alarm once in a stated number of nights."""

from __future__ import annotations

import math
from functools import lru_cache

import numpy as np
from scipy.optimize import brentq

from models.arrays import BoolArray, FloatArray
from models.balance.run_length import page_one_sided
from models.balance.thresholds import PAGE_SHARE
from models.errors import DefinitionError

ALLOWANCES = (0.25, 1.0)  # of a score: slow losses that build up over weeks, and those of a few nights
LIMIT_TOLERANCE = 1e-7  # of a sum
CACHED_LIMITS = 1024


def stated_run_length(vessels: int, alarm_rate: float) -> float:
    """Mean number of nights between false alarms of one sum of one vessel, so that all together keep their share.

    Parameters
    ----------
    vessels : int
        Number of vessels that are watched. [1]
    alarm_rate : float
        Chance of any flag in one night when nothing is wrong, of which these sums have a fifth. [1]

    Returns
    -------
    float
        Mean run length without a loss. [nights]

    Notes
    -----
    Each of n vessels has two sums, so each sum alarms by chance after 2 n / (0.2 α) nights.
    """
    return len(ALLOWANCES) * vessels / (PAGE_SHARE * alarm_rate)


@lru_cache(maxsize=CACHED_LIMITS)
def page_limit(allowance: float, run_length: float) -> float:
    """Limit of Page's one-sided sum for a stated mean run length without a loss.

    Parameters
    ----------
    allowance : float
        What a score must exceed to raise the sum, κ. [1]
    run_length : float
        Mean number of nights up to a false alarm and with it. [nights]

    Returns
    -------
    float
        Sum that alarms, h. [1]

    Raises
    ------
    DefinitionError
        If even a limit of zero alarms less often.

    Notes
    -----
    The root h of ``page_one_sided(κ, h) = ARL_0``. The search starts from Siegmund's approximation::

        ARL_0 ≈ (exp(2 κ b) − 2 κ b − 1)/(2 κ²),  b = h + 1.166        (1)

    References
    ----------
    .. [1] D. Siegmund, "Sequential Analysis", Springer, 1985, ch. 2.
    """
    least = page_one_sided(allowance, 0.0)
    if not least < run_length < math.inf:
        raise DefinitionError(
            f"run_length is {run_length} nights; a sum with an allowance of {allowance} alarms by chance after "
            f"{least:.2f} nights or more: ask for a longer one",
            field="run_length",
        )

    def excess(limit: float) -> float:
        return math.log(page_one_sided(allowance, limit) / run_length)

    high = 1.0 + math.log1p(2.0 * allowance**2 * run_length) / (2.0 * allowance)  # beyond eq. 1
    while excess(high) < 0.0:
        high *= 2.0
    return float(brentq(excess, 0.0, high, xtol=LIMIT_TOLERANCE))


def page_limits(vessels: int, alarm_rate: float) -> tuple[tuple[float, float], ...]:
    """The sums kept for each vessel of a site.

    Parameters
    ----------
    vessels : int
        Number of vessels that are watched. [1]
    alarm_rate : float
        Chance of any flag in one night when nothing is wrong, of which these sums have a fifth. [1]

    Returns
    -------
    tuple of (float, float)
        Allowance κ and limit h of each sum. [1]
    """
    run_length = stated_run_length(vessels, alarm_rate)
    return tuple((allowance, page_limit(allowance, run_length)) for allowance in ALLOWANCES)


def page_sums(score: FloatArray, allowance: float, limit: float) -> tuple[FloatArray, BoolArray]:
    """Page's sum of each vessel, night after night, from zero before the first.

    Parameters
    ----------
    score : FloatArray, shape (nights, ...)
        Independent scores of unit variance, positive for a loss; NaN where a night has none. [1]
    allowance : float
        What a score must exceed to raise the sum, κ. [1]
    limit : float
        Sum that alarms, h. [1]

    Returns
    -------
    tuple of (FloatArray, BoolArray), shape (nights, ...)
        The sum of each night before it is reset, and whether it alarms that night. [1]

    Notes
    -----
    A night without a score leaves the sum as it stands; after an alarm the sum begins anew::

        S ← max(0, S + z − κ);  alarm where S > h, then S ← 0        (1)

    References
    ----------
    .. [1] E. S. Page, Biometrika 41 (1954) 100–115.
    """
    sums, alarms = np.zeros(score.shape), np.zeros(score.shape, dtype=np.bool_)
    state = np.zeros(score.shape[1:])
    for night, own in enumerate(score):
        state = np.where(np.isnan(own), state, np.maximum(0.0, state + own - allowance))  # eq. 1
        sums[night], alarms[night] = state, state > limit
        state = np.where(alarms[night], 0.0, state)
    return sums, alarms
