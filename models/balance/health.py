"""Whether the uncertainties that were declared for a vessel are those that its balances show."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

import numpy as np
from scipy.special import chdtr, chdtrc

from models.arrays import BoolArray, FloatArray

FEWEST_NIGHTS = 15  # below, a wrong budget and a right one look the same
DOUBTED_AT = 0.01  # chance of such a spread, or one as rare on the other side, under the declared uncertainties
LEFT_OUT_AFTER = 3  # nights after a flagged one, which a one-off fault still moves

Verdict = Literal["sound", "understated", "overstated", "too_few"]


@dataclass(frozen=True)
class Health:
    """Declared against shown uncertainty of one vessel.

    Parameters
    ----------
    nights : int
        Number of nights that count. [1]
    ratio : float or None
        Shown over declared uncertainty; None without a night. [1]
    p_value : float or None
        Chance of a ratio so far from one under what was declared; None without a night. [1]
    verdict : str
        sound; understated, which raises false alarms; overstated, which hides losses; or too_few nights. [1]
    """

    nights: int
    ratio: float | None
    p_value: float | None
    verdict: Verdict


def quiet(flagged: BoolArray) -> BoolArray:
    """Nights that neither are flagged nor follow closely on one that is.

    Parameters
    ----------
    flagged : BoolArray, shape (nights, ...)
        Whether a vessel was flagged. [1]

    Returns
    -------
    BoolArray, shape (nights, ...)
        True where a night counts. [1]
    """
    disturbed = flagged.copy()
    for after in range(1, LEFT_OUT_AFTER + 1):
        disturbed[after:] |= flagged[:-after]
    return ~disturbed


def budget_health(score: FloatArray, flagged: BoolArray) -> tuple[Health, ...]:
    """Declared against shown uncertainty of every vessel over a window of nights.

    Parameters
    ----------
    score : FloatArray, shape (nights, vessels)
        Decorrelated scores; NaN where a night has none. [1]
    flagged : BoolArray, shape (nights, vessels)
        Whether a vessel was flagged. [1]

    Returns
    -------
    tuple of Health
        One for each vessel. [1]

    Notes
    -----
    Over the n nights that count, under what was declared::

        Q = Σ z² ~ χ²_n,  ratio = √(Q/n),  p = 2 min(P(χ²_n ≤ Q), P(χ²_n ≥ Q))        (1)

    References
    ----------
    .. [1] G. W. Snedecor, W. G. Cochran, "Statistical Methods", 8th ed., Iowa State University Press, 1989,
       ch. 5: test of a variance.
    """
    counts = quiet(flagged) & ~np.isnan(score)
    nights = counts.sum(axis=0)
    total = np.where(counts, score, 0.0) ** 2
    return tuple(_judged(int(n), float(q)) for n, q in zip(nights, total.sum(axis=0), strict=True))


def _judged(nights: int, total: float) -> Health:
    if nights == 0:
        return Health(0, None, None, "too_few")
    below, above = float(chdtr(nights, total)), float(chdtrc(nights, total))
    chance = min(1.0, 2.0 * min(below, above))  # eq. 1
    verdict: Verdict = "sound"
    if nights < FEWEST_NIGHTS:
        verdict = "too_few"
    elif chance < DOUBTED_AT:
        verdict = "understated" if above < below else "overstated"
    return Health(nights, math.sqrt(total / nights), chance, verdict)
