"""What temperature does to the instruments that tell a level: the tape, and the shell that carries the gauge."""

from __future__ import annotations

import numpy as np

from models.arrays import ArrayLike, FloatArray, as_floats


def tape_correction(
    length: ArrayLike, tape_temperature: ArrayLike, tape_reference: ArrayLike, expansion: ArrayLike
) -> FloatArray:
    """What has to be added to a length that was read off a tape at another temperature than its own.

    Parameters
    ----------
    length : array_like, shape (...)
        Length of tape that hangs in the vessel, as read: a dip, or an ullage. [m]
    tape_temperature : array_like, shape (...)
        Mean temperature of that length: the liquid's for a dip's wet part, the space's for an ullage. [K]
    tape_reference : array_like, shape (...)
        Temperature at which the tape's marks are true. [K]
    expansion : array_like, shape (...)
        Linear expansion of the tape. [1/K]

    Returns
    -------
    FloatArray, shape (...)
        Correction: above 0 where the tape is warm, because its marks are further apart. [m]

    Notes
    -----
    ::

        Δ = L α (T − T_ref)        (1)

    References
    ----------
    .. [1] Linear expansion; the form is that of API MPMS ch. 3.1A and ISO 4512 for dip tapes (from memory).
    """
    read, warm, own, alpha = as_floats(length, tape_temperature, tape_reference, expansion)
    return np.asarray(read * alpha * (warm - own))  # eq. 1


def reference_height_growth(
    reference_height: ArrayLike, shell_temperature: ArrayLike, shell_reference: ArrayLike, expansion: ArrayLike
) -> FloatArray:
    """How much higher the point stands from which ullage is read, when the shell that carries it is warm.

    Parameters
    ----------
    reference_height : array_like, shape (...)
        Height of that point above the datum, as it was measured. [m]
    shell_temperature : array_like, shape (...)
        Mean temperature of the shell, or of the still pipe that carries the point. [K]
    shell_reference : array_like, shape (...)
        Temperature at which the height was measured. [K]
    expansion : array_like, shape (...)
        Linear expansion of what carries it. [1/K]

    Returns
    -------
    FloatArray, shape (...)
        Growth: the level is reference height plus growth less ullage, so left out a warm shell reads low. [m]

    Notes
    -----
    ::

        Δ = H α (T − T_ref)        (1)

    A hatch or a gauge on the roof moves with the shell. One on a still pipe that stands on the bottom
    moves with the pipe, whose temperature is the liquid's as far as it is wet.

    References
    ----------
    .. [1] Linear expansion; API MPMS ch. 3.1B names the movement of the gauge reference point (from memory).
    """
    height, warm, own, alpha = as_floats(reference_height, shell_temperature, shell_reference, expansion)
    return np.asarray(height * alpha * (warm - own))  # eq. 1
