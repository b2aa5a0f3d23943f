"""How many nights pass, on average, before a control chart alarms: by the integral equation of its state."""

from __future__ import annotations

import math
from functools import lru_cache

import numpy as np
from scipy.special import ndtr

from models.arrays import FloatArray

GAUSS_NODES = 40  # at least; the kernel is a normal density, so that the quadrature converges as exp(−nodes)
GAUSS_NODES_PER_STEP = 6.0  # for one standard deviation of the step that the statistic makes in a night


def shewhart(limit: float, *, shift: float = 0.0) -> float:
    """Mean run length of single scores held against a limit on both sides.

    Parameters
    ----------
    limit : float
        Magnitude that alarms. [1]
    shift : float
        Mean of the scores, whose standard deviation is one. [1]

    Returns
    -------
    float
        Mean number of nights up to the alarm and with it. [nights]

    References
    ----------
    .. [1] W. A. Shewhart, "Economic Control of Quality of Manufactured Product", Van Nostrand, 1931.
    """
    return float(1.0 / (ndtr(shift - limit) + ndtr(-shift - limit)))


def page_one_sided(allowance: float, limit: float, *, shift: float = 0.0, start: float = 0.0) -> float:
    """Mean run length of Page's sum of scores above an allowance.

    Parameters
    ----------
    allowance : float
        What a score must exceed to raise the sum, κ. [1]
    limit : float
        Sum that alarms, h. [1]
    shift : float
        Mean of the scores, whose standard deviation is one. [1]
    start : float
        The sum at the start, from 0 to the limit. [1]

    Returns
    -------
    float
        Mean number of nights up to the alarm and with it. [nights]

    Notes
    -----
    ::

        S ← max(0, S + z − κ),  alarm at S > h
        L(s) = 1 + Φ(κ − s − μ) L(0) + ∫_0^h φ(t − s + κ − μ) L(t) dt        (1)

    References
    ----------
    .. [1] E. S. Page, Biometrika 41 (1954) 100–115.
    """
    if limit <= 0.0:
        return float(1.0 / ndtr(shift - allowance))
    node, weight = _gauss(0.0, limit, 1.0)
    drift = shift - allowance
    states = np.concatenate([[0.0, start], node])[:, None]
    kernel = np.concatenate([ndtr(-states - drift), weight * _normal(node - states - drift)], axis=1)  # eq. 1
    known = [0, *range(2, len(states))]  # the start is only asked for
    runs = np.linalg.solve(np.eye(len(known)) - kernel[known], np.ones(len(known)))
    return float(1.0 + kernel[1] @ runs)


def page_two_sided(allowance: float, limit: float, *, shift: float = 0.0, start: float = 0.0) -> float:
    """Mean run length of two of Page's sums, one upwards and one downwards, the same limit for both.

    Parameters
    ----------
    allowance : float
        What a score must exceed to raise a sum, κ. [1]
    limit : float
        Sum that alarms, h. [1]
    shift : float
        Mean of the scores, whose standard deviation is one. [1]
    start : float
        Both sums at the start, from 0 to the limit. [1]

    Returns
    -------
    float
        Mean number of nights up to the first alarm and with it. [nights]

    Notes
    -----
    Where one sum alarms the other is at zero, so that with a = L of the upward sum and b of the downward one::

        L(s) = (a(s) b(0) + b(s) a(0) − a(0) b(0)) / (a(0) + b(0))        (1)

    References
    ----------
    .. [1] K. W. Kemp, J. R. Stat. Soc. B 23 (1961) 149–153.
    .. [2] J. M. Lucas, R. B. Crosier, Technometrics 24 (1982) 199–205.
    """
    up, down = (
        [page_one_sided(allowance, limit, shift=side, start=s) for s in (0.0, start)] for side in (shift, -shift)
    )
    return (up[1] * down[0] + down[1] * up[0] - up[0] * down[0]) / (up[0] + down[0])  # eq. 1


def ewma(weight: float, limit: float, *, shift: float = 0.0) -> float:
    """Mean run length of an exponentially weighted mean of scores, held against a limit on both sides.

    Parameters
    ----------
    weight : float
        Weight of the newest score, λ. [1]
    limit : float
        Magnitude that alarms, in standard deviations of the mean after many nights. [1]
    shift : float
        Mean of the scores, whose standard deviation is one. [1]

    Returns
    -------
    float
        Mean number of nights up to the alarm and with it, from a mean of zero. [nights]

    Notes
    -----
    ::

        E ← (1 − λ) E + λ z,  alarm at abs E > b = limit √(λ/(2 − λ))        (1)
        L(s) = 1 + (1/λ) ∫_−b^b φ((t − (1 − λ) s)/λ − μ) L(t) dt        (2)

    References
    ----------
    .. [1] S. V. Crowder, Technometrics 29 (1987) 401–407.
    """
    bound = limit * math.sqrt(weight / (2.0 - weight))  # eq. 1
    node, share = _gauss(-bound, bound, weight)
    states = np.concatenate([[0.0], node])[:, None]
    kernel = share * _normal((node - (1.0 - weight) * states) / weight - shift) / weight  # eq. 2
    runs = np.linalg.solve(np.eye(len(node)) - kernel[1:], np.ones(len(node)))
    return float(1.0 + kernel[0] @ runs)


def _gauss(low: float, high: float, step: float) -> tuple[FloatArray, FloatArray]:
    node, weight = _legendre(max(GAUSS_NODES, math.ceil(GAUSS_NODES_PER_STEP * (high - low) / step)))
    half = 0.5 * (high - low)
    return low + half * (node + 1.0), half * weight


@lru_cache(maxsize=64)
def _legendre(count: int) -> tuple[FloatArray, FloatArray]:
    return np.polynomial.legendre.leggauss(count)


def _normal(x: FloatArray) -> FloatArray:
    return np.asarray(np.exp(-0.5 * x * x) / math.sqrt(2.0 * math.pi))
