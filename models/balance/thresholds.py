"""How far chance alone reaches: the largest of many dependent scores, many groups, and a month of nights."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy.optimize import brentq
from scipy.special import ndtr, ndtri, owens_t

from models.arrays import ArrayLike, BoolArray, FloatArray, IntArray, blocks
from models.errors import DefinitionError

DAYS_PER_MONTH = 30.44  # days; a twelfth of the mean year of the calendar, 365.2425 days, to its digits
SIGNATURE_SHARE = 0.8  # of a night's alarm rate: the rest is left to the tests of slow drifts
PAGE_SHARE = 0.2  # of a night's alarm rate: drifts are few beside the faults that have a day on which they began
CRITICAL_TOLERANCE = 1e-9  # of a critical score
BLOCK_OF_SCORES = 512  # rows of correlations that are held at once; 40 MB with 10,000 scores


@dataclass(frozen=True)
class SpanningTree:
    """The strongest dependences that tie a family of scores together without a cycle.

    Parameters
    ----------
    size : int
        Number of scores. [1]
    strength : FloatArray, shape (size - 1,)
        Magnitudes of the correlations along the edges. [1]
    """

    size: int
    strength: FloatArray


NO_SCORES = SpanningTree(0, np.zeros(0))


def alarm_rate(false_alarms_per_month: float) -> float:
    """Chance that anything at all is flagged in one night when nothing is wrong.

    Parameters
    ----------
    false_alarms_per_month : float
        Nights with a flag that the reader accepts in a month without faults. [1/month]

    Returns
    -------
    float
        Chance for one night. [1]

    Raises
    ------
    DefinitionError
        If it is not above zero, or leaves no night of a month without a flag.

    Notes
    -----
    With a night's chance of one in 30.44 for each, the number of nights flagged in a month has the mean that
    was asked for, however much the nights' tests share.
    """
    rate = false_alarms_per_month / DAYS_PER_MONTH
    if not 0.0 < rate < 1.0:
        raise DefinitionError(
            f"false_alarms_per_month is {false_alarms_per_month}; it must be above 0 and below {DAYS_PER_MONTH}, "
            "one for every night: ask for fewer, for example 0.5",
            field="false_alarms_per_month",
        )
    return rate


def spanning_tree(rho: FloatArray) -> SpanningTree:
    """Maximum spanning tree of the magnitudes of a correlation matrix.

    Parameters
    ----------
    rho : FloatArray, shape (k, k)
        Correlations of the scores. [1]

    Returns
    -------
    SpanningTree
        Its edges, in the order in which they were found from the first score. [1]

    References
    ----------
    .. [1] R. C. Prim, Bell Syst. Tech. J. 36 (1957) 1389–1401.
    """
    size = len(rho)
    if size == 0:
        return NO_SCORES
    strength = np.empty(size - 1)
    nearest = np.zeros(size)  # to the tree so far; below zero for what is in it
    inside = np.zeros(size, dtype=bool)
    newest = 0
    for edge in range(size - 1):
        inside[newest] = True
        np.maximum(nearest, np.abs(rho[newest]), out=nearest)
        nearest[inside] = -1.0
        newest = int(np.argmax(nearest))
        strength[edge] = nearest[newest]
    return SpanningTree(size, np.minimum(strength, 1.0))


def spanning_tree_by_rows(rows: Callable[[slice], FloatArray], size: int) -> SpanningTree:
    """The same tree where the whole matrix is too large to hold: its rows are asked for block by block.

    Parameters
    ----------
    rows : callable
        Correlations of the scores of one slice with all, shape (slice, k). [1]
    size : int
        Number of scores. [1]

    Returns
    -------
    SpanningTree
        Its edges. Every block is asked for at most log2(k) times. [1]

    References
    ----------
    .. [1] J. Nešetřil, E. Milková, H. Nešetřilová, "Otakar Borůvka on minimum spanning tree problem",
       Discrete Math. 233 (2001) 3–36.
    """
    label = np.arange(size)  # of the trees that are being joined
    strength: list[float] = []
    while len(strength) < size - 1:
        best, other = np.empty(size), np.empty(size, dtype=np.intp)
        for block in blocks(size, BLOCK_OF_SCORES):
            near = np.abs(rows(block))
            near[label[block, None] == label] = -1.0
            other[block] = np.argmax(near, axis=1)
            best[block] = near[np.arange(len(near)), other[block]]
        order = np.lexsort((np.arange(size), -best, label))
        leaders = order[np.unique(label[order], return_index=True)[1]]  # the strongest way out of each tree
        label = _joined(label, leaders, other, best, strength)
    return SpanningTree(size, np.minimum(strength, 1.0)) if size else NO_SCORES


def _joined(
    label: IntArray, leaders: IntArray, other: IntArray, best: FloatArray, strength: list[float]
) -> IntArray:  # fmt: skip
    """Labels after each tree's strongest way out; an edge that two trees chose counts once."""
    parent = np.arange(len(label))

    def root(one: int) -> int:
        while parent[one] != one:
            parent[one] = parent[parent[one]]
            one = int(parent[one])
        return one

    for leader in leaders:
        here, there = root(label[leader]), root(label[other[leader]])
        if here != there:
            parent[here] = there
            strength.append(float(best[leader]))
    return np.array([root(one) for one in range(len(label))], dtype=np.intp)[label]


def family_p_value(m: float, rho: FloatArray | SpanningTree) -> float:
    """Chance that the largest of dependent normal scores is at least so large in magnitude: an upper bound.

    Parameters
    ----------
    m : float
        The largest magnitude. [1]
    rho : FloatArray, shape (k, k), or SpanningTree
        Correlations of the scores, or their tree where it is known. [1]

    Returns
    -------
    float
        The bound, 1 where there is no score. It is exact for one score and for two. [1]

    Notes
    -----
    Each of k scores adds its chance, and each edge (i, j) of the maximum spanning tree of abs ρ takes off
    the chance of both::

        p(m) = min(1, 2 k Φ̄(m) − Σ P(abs z_i > m, abs z_j > m))        (1)
        P = 4 Φ̄(m) − 4 T(m, a) − 4 T(m, 1/a),  a = √((1 − abs ρ_ij)/(1 + abs ρ_ij))        (2)

    with Φ̄ the upper tail of the normal law and T Owen's function.

    References
    ----------
    .. [1] D. Hunter, J. Appl. Probab. 13 (1976) 597–603.
    .. [2] K. J. Worsley, Biometrika 69 (1982) 297–302.
    .. [3] D. B. Owen, Ann. Math. Statist. 27 (1956) 1075–1090.
    """
    tree = _tree(rho)
    if tree.size == 0 or m <= 0.0:
        return 1.0
    tail = float(ndtr(-m))
    with np.errstate(divide="ignore"):
        slope = np.sqrt((1.0 - tree.strength) / (1.0 + tree.strength))
        both = 4.0 * (tail - owens_t(m, slope) - owens_t(m, 1.0 / slope))  # eq. 2
    # A score and an edge together, so that a large family loses no digits.
    return min(1.0, 2.0 * tail + float(np.sum(np.maximum(2.0 * tail - both, 0.0))))  # eq. 1


def family_critical(alpha: float, rho: FloatArray | SpanningTree) -> float:
    """Magnitude that the largest of dependent normal scores passes with at most a given chance.

    Parameters
    ----------
    alpha : float
        The chance when nothing is wrong. [1]
    rho : FloatArray, shape (k, k), or SpanningTree
        Correlations of the scores, or their tree where it is known. [1]

    Returns
    -------
    float
        Critical magnitude, infinite where there is no score. [1]

    Notes
    -----
    The root c of ``family_p_value(c, rho) = alpha``; it lies between the critical value of one score and
    that of as many scores that never pass together (Bonferroni's).

    References
    ----------
    .. [1] K. J. Worsley, Biometrika 69 (1982) 297–302.
    """
    tree = _tree(rho)
    if tree.size == 0:
        return math.inf
    low, high = (float(-ndtri(0.5 * alpha / count)) for count in (1, tree.size))
    if family_p_value(low, tree) <= alpha:  # one score, or all of them the same
        return low
    high += CRITICAL_TOLERANCE
    return float(brentq(lambda m: family_p_value(m, tree) - alpha, low, high, rtol=CRITICAL_TOLERANCE))


def benjamini_hochberg(p: ArrayLike, alpha: float) -> BoolArray:
    """Which of many independent tests count, when a given share of those that count may be chance.

    Parameters
    ----------
    p : array_like, shape (n,)
        Chance of each under no fault. [1]
    alpha : float
        Expected share of false ones among those that count. [1]

    Returns
    -------
    BoolArray, shape (n,)
        True for those that count. [1]

    Notes
    -----
    With the chances in rising order, those up to the last that satisfies::

        p_(i) ≤ α i / n        (1)

    References
    ----------
    .. [1] Y. Benjamini, Y. Hochberg, J. R. Stat. Soc. B 57 (1995) 289–300.
    """
    chance = np.asarray(p, dtype=np.float64)
    rising = np.sort(chance)
    low = rising <= alpha * np.arange(1, len(rising) + 1) / max(len(rising), 1)  # eq. 1
    if not low.any():
        return np.zeros(chance.shape, dtype=np.bool_)
    return np.asarray(chance <= rising[np.flatnonzero(low)[-1]])


def _tree(rho: FloatArray | SpanningTree) -> SpanningTree:
    return rho if isinstance(rho, SpanningTree) else spanning_tree(rho)
