"""What a signal is called: shares of its explanations, how large each would be, since when, and which are alike."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from scipy.optimize import brentq
from scipy.special import logsumexp, ndtr, ndtri

from models.arrays import BoolArray, FloatArray, IntArray
from models.balance.evidence import Search
from models.balance.signatures import DUPLICATED, KINDS, UNITS, UNRECORDED, Candidates

WIDTHS = np.array([0.5, 2.0, 8.0, 32.0])  # times the plausible size: so that none is absurd
PRIOR = {DUPLICATED: 0.3}  # of a kind, against 1 of every other
SET_SHARE = 0.95  # of all shares, that the named explanations have together
GAP = 3.84  # of the statistic, 95 % of chi-square with one degree of freedom: less tells nothing apart
POWER = 0.95  # chance that what is called detectable is flagged
QUANTILES = (0.025, 0.5, 0.975)
BRACKET_TOLERANCE = 12.0  # standard deviations beyond every component, between which a quantile lies


@dataclass(frozen=True)
class Suspect:
    """One explanation of a signal.

    Parameters
    ----------
    kind : str
        Of ``KINDS``, or level_stuck. [1]
    subject : tuple of str
        Its names, as in ``Candidates``; an unrecorded transfer's from where to where. [1]
    magnitude : float
        Its size, positive when an instrument reads high, when mass is lost, when a movement left. [unit]
    interval : tuple of float
        In which the size lies with a chance of 95 %. [unit]
    unit : str
        Of magnitude and interval. [1]
    mass : float
        What it has moved in the books by the end of the window. [kg]
    onset : int
        The night with which it began; 0 is before the window. [1]
    statistic : float
        T of its best onset. [1]
    share : float
        Of all explanations. [1]
    equivalent_to : tuple of (str, tuple of str)
        Kinds and subjects among those named that the window cannot tell from it. [1]
    column : int
        Its best column. [1]
    """

    kind: str
    subject: tuple[str, ...]
    magnitude: float
    interval: tuple[float, float]
    unit: str
    mass: float
    onset: int
    statistic: float
    share: float
    equivalent_to: tuple[tuple[str, tuple[str, ...]], ...]
    column: int


def widths(num: FloatArray, q: FloatArray, scale: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Log-likelihood of each plausible width of a free size, and how far it lets the size be taken.

    Parameters
    ----------
    num, q : FloatArray, shape (k,)
        Evidence. [1/unit, 1/unit²]
    scale : FloatArray, shape (k,)
        Plausible size. [unit]

    Returns
    -------
    tuple of FloatArray, shape (k, widths)
        Log-likelihoods against no fault, and t/(1+t). [1]

    Notes
    -----
    For a normal prior of standard deviation g τ about nought::

        ln L = ½ z² t/(1+t) − ½ ln(1+t),  t = (g τ)² q        (1)

    References
    ----------
    .. [1] J. Wakefield, Genet. Epidemiol. 33 (2009) 79–86: Bayes factors from an estimate and its variance.
    """
    t = np.square(WIDTHS[None, :] * scale[:, None]) * q[:, None]
    taken = t / (1.0 + t)
    square = np.where(q > 0.0, num**2 / np.where(q > 0.0, q, 1.0), 0.0)
    return 0.5 * square[:, None] * taken - 0.5 * np.log1p(t), taken  # eq. 1


def shares(found: Candidates, num: FloatArray, q: FloatArray) -> FloatArray:
    """Share of each explanation, by evidence and by how many of its kind there are.

    Parameters
    ----------
    found : Candidates
        Explanations. [kg per unit]
    num, q : FloatArray, shape (k,)
        Evidence. [1/unit, 1/unit²]

    Returns
    -------
    FloatArray, shape (k,)
        Shares, together one. [1]

    Notes
    -----
    ::

        ln L = ln mean over g of exp(½ z² t/(1+t))/√(1+t), free size        (1)
        ln L = f' H⁻¹ r − ½ f' H⁻¹ f, size one        (2)
        share ∝ prior(kind) / (number of its kind) × L        (3)

    References
    ----------
    .. [1] R. E. Kass, A. E. Raftery, J. Am. Stat. Assoc. 90 (1995) 773–795: Bayes factors.
    """
    free = logsumexp(widths(num, q, found.scale)[0], axis=1) - np.log(len(WIDTHS))  # eq. 1
    likelihood = np.where(found.fixed, num - 0.5 * q, free)  # eq. 2
    count = np.bincount(found.kind, minlength=len(KINDS))
    weight = np.array([PRIOR.get(kind, 1.0) for kind in range(len(KINDS))]) / np.maximum(count, 1)
    log = likelihood + np.log(weight[found.kind] * found.prior)  # eq. 3
    share = np.exp(log - log.max())
    return np.asarray(share / share.sum())


def mixture_quantiles(
    weight: FloatArray, mean: FloatArray, sd: FloatArray, quantiles: Sequence[float] = QUANTILES
) -> tuple[float, ...]:
    """Quantiles of a mixture of normal laws.

    Parameters
    ----------
    weight, mean, sd : FloatArray, shape (k,)
        Of each component; the weights need no norm, a deviation of nought is a certain value. [1, unit, unit]
    quantiles : sequence of float
        Chances. [1]

    Returns
    -------
    tuple of float
        One for each chance. [unit]
    """
    weight = weight / weight.sum()
    kept = weight > 1e-12
    weight, mean, sd = weight[kept], mean[kept], sd[kept]
    if np.ptp(mean) == 0.0 and not sd.any():
        return tuple(float(mean[0]) for _ in quantiles)
    width = np.maximum(sd, 1e-9 * np.abs(mean).max())
    low, high = float(np.min(mean - BRACKET_TOLERANCE * width)), float(np.max(mean + BRACKET_TOLERANCE * width))
    return tuple(
        float(brentq(lambda x, chance=chance: weight @ ndtr((x - mean) / width) - chance, low, high))
        for chance in quantiles
    )


def _size(found: Candidates, search: Search, own: IntArray, share: FloatArray) -> tuple[float, float, float]:
    """2.5, 50 and 97.5 % of the size of one kind and subject, over its onsets and widths."""
    num, q = search.evidence.num[own], search.evidence.q[own]
    if found.fixed[own[0]]:
        ones = found.unit[own]
        low, middle, high = mixture_quantiles(share[own], ones, np.zeros(len(own)))
        return low, middle, high
    log, taken = widths(num, q, found.scale[own])
    log -= logsumexp(log, axis=1, keepdims=True)
    weight = share[own][:, None] * np.exp(log)
    known = np.where(q > 0.0, q, 1.0)
    mean = (num / known)[:, None] * taken
    prior = np.square(WIDTHS[None, :] * found.scale[own][:, None])
    variance = np.where(q[:, None] > 0.0, taken / known[:, None], prior)
    low, middle, high = mixture_quantiles(weight.ravel(), mean.ravel(), np.sqrt(variance.ravel()))
    return low, middle, high


def _leaders(found: Candidates, share: FloatArray) -> tuple[FloatArray, list[IntArray]]:
    """Kinds and subjects, largest share first, up to 95 % together, with their columns."""
    key = found.kind * len(found.subjects) + found.subject
    names, place = np.unique(key, return_inverse=True)
    total = np.bincount(place, weights=share)
    order = np.argsort(-total, kind="stable")
    count = int(np.searchsorted(np.cumsum(total[order]), SET_SHARE)) + 1
    chosen = order[:count]
    columns = np.argsort(place, kind="stable")
    starts = np.searchsorted(place[columns], chosen), np.searchsorted(place[columns], chosen, side="right")
    return np.asarray(total[chosen], dtype=np.float64), [columns[start:end] for start, end in zip(*starts, strict=True)]


def name(found: Candidates, search: Search) -> tuple[Suspect, ...]:
    """Explanations of what is left beside those already named.

    Parameters
    ----------
    found : Candidates
        All explanations. [kg per unit]
    search : Search
        Evidence beside those already named. [1]

    Returns
    -------
    tuple of Suspect
        Largest share first, together 95 % of it. [unit]

    Notes
    -----
    Two explanations whose whitened signatures enclose an angle φ are alike where the one, if true, would be
    expected to exceed the other by no more than chance::

        z² (1 − cos² φ) < 3.84        (1)

    References
    ----------
    .. [1] M. J. Bagajewicz, Q. Jiang, Comput. Chem. Eng. 22 (1998) 1789–1809: sets of faults that are equivalent.
    """
    share = shares(found, search.evidence.num, search.evidence.q)
    total, groups = _leaders(found, share)
    best = np.array([own[np.argmax(share[own])] for own in groups])
    white = search.whites(best)
    length = np.sqrt(np.einsum("ij,ij->i", white, white))
    white = white / np.where(length > 0.0, length, 1.0)[:, None]
    alike = _alike(search.evidence.statistic[best], white)
    drafts = [_describe(found, search, own, share, int(column)) for own, column in zip(groups, best, strict=True)]
    labels = [(draft.kind, draft.subject) for draft in drafts]
    return tuple(
        Suspect(**{
            **draft.__dict__, "share": float(total[at]),
            "equivalent_to": tuple(labels[other] for other in np.flatnonzero(alike[at])),
        })
        for at, draft in enumerate(drafts)
    )  # fmt: skip


def _alike(statistic: FloatArray, white: FloatArray) -> BoolArray:
    """Which of others, given by unit vectors, cannot be told from each."""
    gap = statistic[:, None] * (1.0 - np.square(white @ white.T))  # eq. 1
    return np.asarray((gap < GAP) & ~np.eye(len(statistic), dtype=bool))


def _describe(found: Candidates, search: Search, own: IntArray, share: FloatArray, column: int) -> Suspect:
    kind = int(found.kind[column])
    low, middle, high = _size(found, search, own, share)
    subject = found.subjects[found.subject[column]]
    order = np.argsort(found.onset[own], kind="stable")
    rising = np.cumsum(share[own][order])
    onset = int(found.onset[own][order][np.searchsorted(rising, 0.5 * rising[-1])])
    mass = float(found.moved[column]) * (1.0 if found.fixed[column] else middle)
    if kind == UNRECORDED and middle < 0.0:  # it went the other way
        subject, low, middle, high, mass = subject[::-1], -high, -middle, -low, -mass
    statistic = float(search.evidence.statistic[column])
    return Suspect(KINDS[kind], subject, middle, (low, high), UNITS[kind], mass, onset, statistic, 0.0, (), column)


def detectable(critical: float, q: FloatArray) -> FloatArray:
    """Size that would be flagged with a chance of 95 %.

    Parameters
    ----------
    critical : float
        Score that flags. [1]
    q : FloatArray, shape (...)
        f' H⁻¹ f. [1/unit²]

    Returns
    -------
    FloatArray, shape (...)
        (c + 1.645)/√q. [unit]
    """
    return np.asarray((critical + float(ndtri(POWER))) / np.sqrt(q))
