"""A floating roof between its legs and the liquid."""

from __future__ import annotations

import numpy as np

from models.arrays import ArrayLike, BoolArray, FloatArray, as_floats


def afloat_fraction(level: ArrayLike, lands_at: ArrayLike, floats_at: ArrayLike) -> FloatArray:
    """Share of a floating roof's weight that the liquid carries.

    Parameters
    ----------
    level : array_like, shape (...)
        Liquid level above the datum; NaN stays NaN. [m]
    lands_at, floats_at : array_like, shape (...)
        Levels at which the roof starts to stand on its legs and at which it is fully afloat. [m]

    Returns
    -------
    FloatArray, shape (...)
        0 on its legs, 1 afloat, linear between. [1]

    Notes
    -----
    Between both levels h_1 and h_2 the share is a convention::

        f = (h − h_1)/(h_2 − h_1)        (1)

    References
    ----------
    .. [1] API MPMS ch. 12.1.1 and ISO 7507-1: the critical zone (form from memory); linear inside it is
       common practice.
    """
    h, low, high = as_floats(level, lands_at, floats_at)
    zone = high - low
    step = np.where(h >= high, 1.0, 0.0) + 0.0 * h
    inside = np.where(zone > 0.0, (h - low) / np.where(zone > 0.0, zone, 1.0), step)  # eq. 1
    return np.asarray(np.clip(inside, 0.0, 1.0))


def landing_zone(level: ArrayLike, lands_at: ArrayLike, floats_at: ArrayLike) -> BoolArray:
    """Where a roof is carried by its legs and by the liquid at once.

    Parameters
    ----------
    level : array_like, shape (...)
        Liquid level above the datum. [m]
    lands_at, floats_at : array_like, shape (...)
        Levels at which the roof starts to stand on its legs and at which it is fully afloat. [m]

    Returns
    -------
    BoolArray, shape (...)
        True strictly between both levels. [1]
    """
    h, low, high = as_floats(level, lands_at, floats_at)
    return np.asarray((h > low) & (h < high))
