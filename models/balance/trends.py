"""What builds up over nights: decorrelated imbalances, sums that watch them, rates of loss and what they add up to."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from scipy.special import ndtri

from models.arrays import BoolArray, FloatArray, IntArray
from models.balance.page import page_sums
from models.estimate import Estimate, combine

COVERAGE = 0.95  # of an interval
POWER = 0.95  # chance that a detectable rate is flagged


@dataclass(frozen=True, eq=False)
class Innovations:
    """What each balance adds to what all nights before its own had told.

    Parameters
    ----------
    value : FloatArray, shape (rows,)
        Physical less book, less what was expected of it; a loss is negative. [kg]
    variance : FloatArray, shape (rows,)
        Its variance under no fault. [kg2]
    night_of : IntArray, shape (rows,)
        The night that completes each row. [1]
    """

    value: FloatArray
    variance: FloatArray
    night_of: IntArray

    def scores(self, row_of: IntArray) -> FloatArray:
        """Each vessel's score of each night, positive for a loss.

        Parameters
        ----------
        row_of : IntArray, shape (vessels, nights)
            Row of each vessel's night; -1 where it has none. [1]

        Returns
        -------
        FloatArray, shape (nights, vessels)
            z; NaN where no row is completed that night. [1]

        Notes
        -----
        The innovation over its standard deviation, with the sign changed.
        """
        if not len(self.value):
            return np.full(row_of.T.shape, np.nan)
        own = (row_of >= 0) & (self.night_of[row_of] == np.arange(1, row_of.shape[1] + 1))
        score = -self.value / np.sqrt(self.variance)
        return np.where(own, score[row_of], np.nan).T


def innovations(lower: FloatArray, white: FloatArray, night_of: IntArray) -> Innovations:
    """Decorrelated imbalances of a group: those of one night are independent of those of every other.

    Parameters
    ----------
    lower : FloatArray, shape (rows, rows)
        L of the covariance H = L L' of the balances, ordered by night. [kg]
    white : FloatArray, shape (rows,)
        w = L⁻¹ r of their imbalances r. [1]
    night_of : IntArray, shape (rows,)
        The night that completes each row, from 1 and never falling. [1]

    Returns
    -------
    Innovations
        One for each row. [kg]

    Notes
    -----
    With L_KK the diagonal block of night K, the balances of one night taken together::

        innovation_K = L_KK w_K,  variance = sums of the squares of the rows of L_KK        (1)

    References
    ----------
    .. [1] R. R. Picard, J. Inst. Nucl. Mater. Manage. 15 (1987) 38–42.
    """
    value, variance = np.zeros(len(white)), np.zeros(len(white))
    starts = np.unique(night_of, return_index=True)[1]
    for start, stop in pairwise([*starts, len(white)]):
        block = lower[start:stop, start:stop]
        value[start:stop] = block @ white[start:stop]  # eq. 1
        variance[start:stop] = (block**2).sum(axis=1)
    return Innovations(value, variance, night_of)


@dataclass(frozen=True, eq=False)
class Watched:
    """Of the sums that watch each vessel, the one that stands nearest to its limit.

    Parameters
    ----------
    statistic, limit : FloatArray, shape (nights, vessels)
        Its value before a reset, and its limit. [1]
    flagged : BoolArray, shape (nights, vessels)
        Whether any of them alarms that night. [1]
    """

    statistic: FloatArray
    limit: FloatArray
    flagged: BoolArray


def watch(score: FloatArray, limits: Sequence[tuple[float, float]]) -> Watched:
    """Page's sums of every vessel over the window.

    Parameters
    ----------
    score : FloatArray, shape (nights, vessels)
        Decorrelated scores, positive for a loss; NaN where a night has none. [1]
    limits : sequence of (float, float)
        Allowance κ and limit h of each sum. [1]

    Returns
    -------
    Watched
        For each night and vessel. [1]

    References
    ----------
    .. [1] E. S. Page, Biometrika 41 (1954) 100–115.
    """
    runs = [page_sums(score, allowance, limit) for allowance, limit in limits]
    sums = np.array([one for one, _ in runs])
    height = np.array([limit for _, limit in limits])
    nearest = np.argmax(sums / height[:, None, None], axis=0)
    statistic = np.take_along_axis(sums, nearest[None], axis=0)[0]
    return Watched(statistic, height[nearest], np.any([alarm for _, alarm in runs], axis=0))


@dataclass(frozen=True)
class LossRate:
    """A steady loss over the last nights, and what would have been seen of one.

    Parameters
    ----------
    nights : int
        Number of nights. [1]
    rate, low, high : float
        Mass lost in a day and its interval of 95 %; a gain is negative. [kg/d]
    detectable : float
        Rate that would be flagged with a chance of 95 %. [kg/d]
    """

    nights: int
    rate: float
    low: float
    high: float
    detectable: float


def loss_rate(nights: int, along: float, weight: float, critical: float) -> LossRate | None:
    """Rate of loss of one vessel over the last nights, from its evidence in the window.

    Parameters
    ----------
    nights : int
        Number of nights since it is taken to have begun. [1]
    along : float
        f' H⁻¹ r, with f what a loss of one kilogram a day since then adds to the balances r. [d/kg]
    weight : float
        f' H⁻¹ f. [d2/kg2]
    critical : float
        Magnitude of a score that is flagged. [1]

    Returns
    -------
    LossRate or None
        None where the balances say nothing of it. [kg/d]

    Notes
    -----
    ::

        rate = f' H⁻¹ r / f' H⁻¹ f,  u = 1/√(f' H⁻¹ f)        (1)
        interval = rate ± 1.960 u,  detectable = (c + 1.645) u        (2)

    References
    ----------
    .. [1] S. Narasimhan, R. S. H. Mah, AIChE J. 33 (1987) 1514–1521.
    .. [2] L. A. Currie, Anal. Chem. 40 (1968) 586–593: what can be decided and what can be detected.
    """
    if not weight > 0.0:
        return None
    rate, u = along / weight, 1.0 / math.sqrt(weight)  # eq. 1
    half = float(ndtri(0.5 + 0.5 * COVERAGE)) * u  # eq. 2
    return LossRate(nights, rate, rate - half, rate + half, (critical + float(ndtri(POWER))) * u)


def cumulative(imbalances: Iterable[Estimate]) -> Estimate:
    """Imbalance of several nights of one vessel together: of its inventories only the first and the last count.

    Parameters
    ----------
    imbalances : iterable of Estimate
        Closing less opening less received plus delivered, of each night. [kg]

    Returns
    -------
    Estimate
        Their sum; errors that two nights share are added before they are squared. [kg]

    References
    ----------
    .. [1] JCGM 100:2008 (GUM), F.1.2.3.
    """
    return combine((1.0, imbalance) for imbalance in imbalances)
