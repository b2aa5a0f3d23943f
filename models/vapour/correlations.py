"""Virial coefficients by corresponding states: from critical constants and the acentric factor alone."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from models.arrays import ArrayLike, FloatArray, as_floats
from models.constants import GAS_CONSTANT

# Classical critical constants of the quantum gases: K, Pa, m3/mol.
QUANTUM: dict[str, tuple[float, float, float]] = {
    "hydrogen": (43.6, 20.5e5, 51.5e-6),
    "helium": (10.47, 6.76e5, 37.5e-6),
    "neon": (45.5, 27.3e5, 40.3e-6),
}


def abbott(reduced_temperature: ArrayLike, acentric_factor: ArrayLike) -> FloatArray:
    """Reduced second virial coefficient ``B Pc / (R Tc)`` of a nonpolar gas, two terms.

    Parameters
    ----------
    reduced_temperature : array_like, shape (...)
        T/Tc. [1]
    acentric_factor : array_like, shape (...)
        Acentric factor. [1]

    Returns
    -------
    FloatArray, shape (...)
        B Pc / (R Tc). [1]

    Notes
    -----
    ::

        f0 = 0.083 - 0.422 / Tr^1.6,  f1 = 0.139 - 0.172 / Tr^4.2,  f0 + omega f1        (1)

    References
    ----------
    .. [1] J. M. Smith, H. C. Van Ness, M. M. Abbott, "Introduction to Chemical Engineering
       Thermodynamics", 7th ed., McGraw-Hill, 2005, eqs 3.65 and 3.66 (equation numbers from memory).
    """
    tr, omega = as_floats(reduced_temperature, acentric_factor)
    return 0.083 - 0.422 / tr**1.6 + omega * (0.139 - 0.172 / tr**4.2)  # eq. 1


def tsonopoulos(
    reduced_temperature: ArrayLike, acentric_factor: ArrayLike, a: ArrayLike = 0.0, b: ArrayLike = 0.0
) -> FloatArray:
    """Reduced second virial coefficient ``B Pc / (R Tc)``, with the polar terms a and b.

    Parameters
    ----------
    reduced_temperature : array_like, shape (...)
        T/Tc. [1]
    acentric_factor : array_like, shape (...)
        Acentric factor. [1]
    a, b : array_like, shape (...)
        Polar parameters, zero for a nonpolar gas. [1]

    Returns
    -------
    FloatArray, shape (...)
        B Pc / (R Tc). [1]

    Notes
    -----
    ::

        f0 = 0.1445 - 0.330/Tr - 0.1385/Tr^2 - 0.0121/Tr^3 - 0.000607/Tr^8        (1)
        f1 = 0.0637 + 0.331/Tr^2 - 0.423/Tr^3 - 0.008/Tr^8                        (2)
        f0 + omega f1 + a/Tr^6 - b/Tr^8                                           (3)

    References
    ----------
    .. [1] C. Tsonopoulos, AIChE J. 20 (1974) 263-272.
    """
    tr, omega, polar_a, polar_b = as_floats(reduced_temperature, acentric_factor, a, b)
    u = 1.0 / tr
    u2 = u * u
    u3, u6, u8 = u2 * u, u2**3, u2**4
    simple = 0.1445 - 0.330 * u - 0.1385 * u2 - 0.0121 * u3 - 0.000607 * u8  # eq. 1
    shape = 0.0637 + 0.331 * u2 - 0.423 * u3 - 0.008 * u8  # eq. 2
    return simple + omega * shape + polar_a * u6 - polar_b * u8  # eq. 3


def orbey_vera(reduced_temperature: ArrayLike, acentric_factor: ArrayLike) -> FloatArray:
    """Reduced third virial coefficient ``C (Pc / (R Tc))^2`` of a nonpolar gas.

    Parameters
    ----------
    reduced_temperature : array_like, shape (...)
        T/Tc. [1]
    acentric_factor : array_like, shape (...)
        Acentric factor. [1]

    Returns
    -------
    FloatArray, shape (...)
        C (Pc / (R Tc))^2. [1]

    Notes
    -----
    ::

        g0 = 0.01407 + 0.02432/Tr^2.8 - 0.00313/Tr^10.5                                     (1)
        g1 = -0.02676 + 0.01770/Tr^2.8 + 0.040/Tr^3 - 0.003/Tr^6 - 0.00228/Tr^10.5          (2)
        g0 + omega g1                                                                       (3)

    A textbook prints eq. 1 with ``0.02432/Tr``; against reference equations that is 20 to 60 % off
    between Tr 1.2 and 3, the original at most a few per cent: the original stands here.

    References
    ----------
    .. [1] H. Orbey, J. H. Vera, AIChE J. 29 (1983) 107-113.
    """
    tr, omega = as_floats(reduced_temperature, acentric_factor)
    u = 1.0 / tr
    u28, u105 = u**2.8, u**10.5
    simple = 0.01407 + 0.02432 * u28 - 0.00313 * u105  # eq. 1
    shape = -0.02676 + 0.01770 * u28 + 0.040 * u**3 - 0.003 * u**6 - 0.00228 * u105  # eq. 2
    return simple + omega * shape  # eq. 3


def _abbott_without_polar(
    tr: ArrayLike, omega: ArrayLike, a: ArrayLike = 0.0, b: ArrayLike = 0.0
) -> FloatArray:
    """Abbott's correlation in the shape of the table; it has no polar term."""
    return abbott(tr, omega)


SecondVirial = Callable[[ArrayLike, ArrayLike, ArrayLike, ArrayLike], FloatArray]
ThirdVirial = Callable[[ArrayLike, ArrayLike], FloatArray]

SECOND_VIRIAL: dict[str, SecondVirial] = {"tsonopoulos": tsonopoulos, "abbott": _abbott_without_polar}
THIRD_VIRIAL: dict[str, ThirdVirial] = {"orbey_vera": orbey_vera}
REFERENCES = {
    "tsonopoulos": "C. Tsonopoulos, AIChE J. 20 (1974) 263",
    "abbott": "M. M. Abbott in Smith, Van Ness, Abbott, Introduction to Chemical Engineering"
    " Thermodynamics, 7th ed., 2005",
    "orbey_vera": "H. Orbey, J. H. Vera, AIChE J. 29 (1983) 107",
}


def quantum_constants(
    component_id: str, molar_mass: float, temperature: ArrayLike
) -> tuple[FloatArray, FloatArray, FloatArray] | None:
    """Effective critical constants of a quantum gas; None for a substance without them.

    Parameters
    ----------
    component_id : str
        ``hydrogen``, ``helium`` or ``neon``. [1]
    molar_mass : float
        Molar mass. [kg/mol]
    temperature : array_like, shape (...)
        Temperature. [K]

    Returns
    -------
    tuple of FloatArray, shape (...), or None
        Effective Tc, Pc and Vc; the acentric factor that goes with them is zero. [K, Pa, m3/mol]

    Notes
    -----
    With M in g/mol and T in K::

        Tc = Tc0 / (1 + 21.8/(M T)),  Pc = Pc0 / (1 + 44.2/(M T)),  Vc = Vc0 / (1 - 9.91/(M T))    (1)

    References
    ----------
    .. [1] J. M. Prausnitz, R. N. Lichtenthaler, E. G. de Azevedo, "Molecular Thermodynamics of
       Fluid-Phase Equilibria", 3rd ed., Prentice Hall, 1999, ch. 5 (from memory).
    """
    classical = QUANTUM.get(component_id)
    if classical is None:
        return None
    (t,) = as_floats(temperature)
    inverse = 1.0 / (molar_mass * 1e3 * t)
    tc, pc, vc = classical
    return (
        np.asarray(tc / (1.0 + 21.8 * inverse)),  # eq. 1
        np.asarray(pc / (1.0 + 44.2 * inverse)),
        np.asarray(vc / (1.0 - 9.91 * inverse)),
    )


def second_virial(
    method: str, temperature: ArrayLike, critical_temperature: ArrayLike, critical_pressure: ArrayLike,
    acentric_factor: ArrayLike, a: ArrayLike = 0.0, b: ArrayLike = 0.0,
) -> FloatArray:  # fmt: skip
    """Second virial coefficient by one of the methods of ``SECOND_VIRIAL``.

    Parameters
    ----------
    method : str
        ``tsonopoulos`` or ``abbott``. [1]
    temperature, critical_temperature : array_like, shape (...)
        Temperature and critical temperature. [K]
    critical_pressure : array_like, shape (...)
        Critical pressure. [Pa]
    acentric_factor, a, b : array_like, shape (...)
        Acentric factor and polar parameters. [1]

    Returns
    -------
    FloatArray, shape (...)
        B. [m3/mol]

    References
    ----------
    .. [1] The functions of ``SECOND_VIRIAL``.
    """
    t, tc, pc = as_floats(temperature, critical_temperature, critical_pressure)
    return SECOND_VIRIAL[method](t / tc, acentric_factor, a, b) * GAS_CONSTANT * tc / pc


def third_virial(
    method: str, temperature: ArrayLike, critical_temperature: ArrayLike, critical_pressure: ArrayLike,
    acentric_factor: ArrayLike,
) -> FloatArray:  # fmt: skip
    """Third virial coefficient by one of the methods of ``THIRD_VIRIAL``.

    Parameters
    ----------
    method : str
        ``orbey_vera``. [1]
    temperature, critical_temperature : array_like, shape (...)
        Temperature and critical temperature. [K]
    critical_pressure : array_like, shape (...)
        Critical pressure. [Pa]
    acentric_factor : array_like, shape (...)
        Acentric factor. [1]

    Returns
    -------
    FloatArray, shape (...)
        C. [m6/mol2]

    References
    ----------
    .. [1] The functions of ``THIRD_VIRIAL``.
    """
    t, tc, pc = as_floats(temperature, critical_temperature, critical_pressure)
    return THIRD_VIRIAL[method](t / tc, acentric_factor) * (GAS_CONSTANT * tc / pc) ** 2
