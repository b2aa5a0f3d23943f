"""What the warm or cold glass of a hydrometer does to its reading."""

from __future__ import annotations

import numpy as np

from models.arrays import ArrayLike, FloatArray, as_floats
from models.constants import ZERO_CELSIUS

# The glass correction of API MPMS 11.1-1980 inside tables 5 and 23 (°F) and 53 (°C), outside the procedure of 2004.
_LINE_F, _SQUARE_F = 1.278e-5, 6.2e-9  # 1/°F, 1/°F²
_LINE_C, _SQUARE_C = 2.3e-5, 2e-8  # 1/°C, 1/°C²
_CELSIUS = (15.0, 20.0)  # °C, calibrations that the °C form knows
_FAHRENHEIT = 60.0  # °F
_SAME = 1e-3  # K, two names of one temperature


def hydrometer_factor(temperature: ArrayLike, calibration_temperature: ArrayLike) -> FloatArray:
    """Density of a liquid over the reading of a glass hydrometer in it.

    Parameters
    ----------
    temperature : array_like, shape (...)
        Liquid temperature at the reading. [K]
    calibration_temperature : array_like, shape (...)
        Temperature for which the scale is right: 60 °F, 15 °C or 20 °C. [K]

    Returns
    -------
    FloatArray, shape (...)
        Factor by which the reading is multiplied, NaN for any other calibration. [1]

    Notes
    -----
    For a scale right at 60 °F, and for one right at t_c of 15 or 20 °C::

        1 − 1.278e-5 (t − 60) − 6.2e-9 (t − 60)²        (1)
        1 − 2.3e-5 (t − t_c) − 2e-8 (t − t_c)²          (2)

    Never for an oscillating tube, which has no glass that floats.

    References
    ----------
    .. [1] API MPMS 11.1-1980, tables 5, 23 and 53; ASTM D1298.
    """
    kelvin, calibration = as_floats(temperature, calibration_temperature)
    scale = calibration - ZERO_CELSIUS
    away = kelvin - calibration
    metric = 1.0 - _LINE_C * away - _SQUARE_C * away**2  # eq. 2
    away_f = 1.8 * away
    imperial = 1.0 - _LINE_F * away_f - _SQUARE_F * away_f**2  # eq. 1
    is_metric = np.any([np.abs(scale - c) < _SAME for c in _CELSIUS], axis=0)
    is_imperial = np.abs(scale - (_FAHRENHEIT - 32.0) / 1.8) < _SAME
    return np.where(is_metric, metric, np.where(is_imperial, imperial, np.nan))
