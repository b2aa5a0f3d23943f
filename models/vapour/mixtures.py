"""Virial coefficients of mixtures by corresponding states: pair rules, then sums over pairs and triples."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from models.arrays import ArrayLike, FloatArray, as_floats
from models.components import GIVEN, Component
from models.constants import GAS_CONSTANT
from models.vapour.correlations import quantum_constants, second_virial, third_virial

HYDROCARBONS = frozenset(("alkane", "hydrocarbon"))


class Constants(NamedTuple):
    """Critical constants of a substance or of a pair, at each temperature. [K, Pa, m3/mol, 1, 1, 1]"""

    critical_temperature: FloatArray
    critical_pressure: FloatArray
    critical_volume: FloatArray
    acentric_factor: FloatArray
    a: FloatArray
    b: FloatArray


def pair_interaction(first: Component, second: Component) -> tuple[float, bool]:
    """Binary parameter kij of two substances, and whether it is known.

    Parameters
    ----------
    first, second : Component
        The two substances. [1]

    Returns
    -------
    tuple of float and bool
        kij, zero where nothing better is known; False where it is a guess. [1]

    Notes
    -----
    With n the number of carbon atoms of an alkane, s the smaller of two and d their difference::

        alkane with alkane           kij = 0.00678/(1 + 0.336 s) [ln(d + 1)]^3.5              (1)
        alkane with nitrogen         kij = 0.04311 [ln(n + 1)]^1.5                            (2)
        alkane with carbon dioxide   kij = 0.07475 [ln(n + 1)]^1.5                            (3)
        other hydrocarbons           kij = 1 - 8 sqrt(Vi Vj) / (Vi^(1/3) + Vj^(1/3))^3        (4)

    Two small nonpolar inorganic gases take zero.

    References
    ----------
    .. [1] L. Meng, Y.-Y. Duan, Fluid Phase Equilibria 238 (2005) 229-238: eqs 1 to 3.
    .. [2] C. Tsonopoulos, Adv. Chem. Ser. 182 (1979) 143-162: eq. 4 (source from memory).
    """
    families = {first.family, second.family}
    if families == {"alkane"}:
        fewer, apart = min(first.carbons, second.carbons), abs(first.carbons - second.carbons)
        return 0.00678 / (1.0 + 0.336 * fewer) * math.log(apart + 1.0) ** 3.5, True  # eq. 1
    if "alkane" in families:
        carbons = first.carbons + second.carbons
        other = {first.id, second.id}
        if "nitrogen" in other:
            return 0.04311 * math.log(carbons + 1.0) ** 1.5, True  # eq. 2
        if "carbon-dioxide" in other:
            return 0.07475 * math.log(carbons + 1.0) ** 1.5, True  # eq. 3
    if families <= HYDROCARBONS:
        v1, v2 = first.critical_volume, second.critical_volume
        return 1.0 - 8.0 * math.sqrt(v1 * v2) / (v1 ** (1 / 3) + v2 ** (1 / 3)) ** 3, True  # eq. 4
    return 0.0, families == {"simple"} and GIVEN not in (first.source, second.source)


def pair_constants(first: Constants, second: Constants, interaction: float) -> Constants:
    """Critical constants of a pair of unlike molecules.

    Parameters
    ----------
    first, second : Constants
        Constants of the two substances. [K, Pa, m3/mol, 1, 1, 1]
    interaction : float
        Binary parameter kij. [1]

    Returns
    -------
    Constants
        Constants of the pair. [K, Pa, m3/mol, 1, 1, 1]

    Notes
    -----
    ::

        Tc = (1 - kij) sqrt(Tci Tcj),  Vc = ((Vci^(1/3) + Vcj^(1/3))/2)^3                   (1)
        Zc = (Zci + Zcj)/2,  omega = (omega_i + omega_j)/2,  Pc = Zc R Tc / Vc              (2)

    The polar parameters are the means of two polar substances, zero for a polar with a nonpolar one.

    References
    ----------
    .. [1] J. M. Smith, H. C. Van Ness, M. M. Abbott, "Introduction to Chemical Engineering
       Thermodynamics", 7th ed., McGraw-Hill, 2005, eqs 11.70 to 11.74 (numbers from memory).
    """
    tc = (1.0 - interaction) * np.sqrt(first.critical_temperature * second.critical_temperature)
    vc = (0.5 * (np.cbrt(first.critical_volume) + np.cbrt(second.critical_volume))) ** 3  # eq. 1
    zc = sum(
        0.5 * s.critical_pressure * s.critical_volume / (GAS_CONSTANT * s.critical_temperature)
        for s in (first, second)
    )
    pc = zc * GAS_CONSTANT * tc / vc  # eq. 2
    omega = 0.5 * (first.acentric_factor + second.acentric_factor)
    polar = [bool(np.any(s.a != 0.0) or np.any(s.b != 0.0)) for s in (first, second)]
    share = 0.5 if all(polar) else 0.0
    return Constants(tc, pc, vc, omega, share * (first.a + second.a), share * (first.b + second.b))


def constants_at(substance: Component, temperature: ArrayLike) -> Constants:
    """Critical constants of a substance as a correlation needs them; a quantum gas's depend on T.

    Parameters
    ----------
    substance : Component
        The substance. [1]
    temperature : array_like, shape (m,)
        Temperatures. [K]

    Returns
    -------
    Constants
        Constants, each of shape (m,). [K, Pa, m3/mol, 1, 1, 1]

    References
    ----------
    .. [1] ``correlations.quantum_constants`` and ``components.polar_terms``.
    """
    (t,) = as_floats(temperature)
    effective = quantum_constants(substance.id, substance.molar_mass, t) if substance.quantum else None
    a, b = substance.polar_terms
    if effective is not None:
        return Constants(*effective, 0.0 * t, 0.0 * t, 0.0 * t)
    values = (
        substance.critical_temperature, substance.critical_pressure, substance.critical_volume,
        substance.acentric_factor, a, b,
    )  # fmt: skip
    return Constants(*(np.full(t.shape, value) for value in values))


def correlated_coefficients(
    components: Sequence[Component], mole_fractions: ArrayLike, temperature: ArrayLike,
    second_method: str = "tsonopoulos", third_method: str = "orbey_vera",
) -> tuple[FloatArray, FloatArray]:  # fmt: skip
    """Second and third virial coefficient of a gas or gas mixture by corresponding states.

    Parameters
    ----------
    components : sequence of Component, k of them
        The substances. [1]
    mole_fractions : array_like, shape (k,)
        Mole fractions. [1]
    temperature : array_like, shape (m,)
        Temperatures. [K]
    second_method, third_method : str
        Keys of ``SECOND_VIRIAL`` and ``THIRD_VIRIAL``. [1]

    Returns
    -------
    tuple of FloatArray, shape (m,)
        B and C. [m3/mol, m6/mol2]

    Notes
    -----
    The size of a triple is the geometric mean of its pairs' critical volumes, its reduced coefficient the
    arithmetic mean of theirs::

        B = sum_ij y_i y_j B_ij,   C = sum_ijk y_i y_j y_k C_ijk                                      (1)
        C_ijk = (V_ij V_ik V_jk)^(2/3) (C_ij/V_ij^2 + C_ik/V_ik^2 + C_jk/V_jk^2)/3                    (2)

    Where the pairs' coefficients have one sign this is the cube root of their product [1]_ to second order
    in their differences. That root has an infinite slope where a pair's C passes through zero, near a
    reduced temperature of 0.75, and so would the mass's sensitivity to temperature; eq. 2 is smooth, the
    same for a pure gas, and as close to the reference equations of ten mixtures or closer. The sums are a
    quadratic form and the trace of a product of three matrices.

    References
    ----------
    .. [1] H. Orentlicher, J. M. Prausnitz, Can. J. Chem. Eng. 45 (1967) 373-378.
    """
    y, t = as_floats(mole_fractions, temperature)
    count = len(components)
    own = [constants_at(substance, t) for substance in components]
    second, size, third = (np.empty((len(t), count, count)) for _ in range(3))
    for i in range(count):
        for j in range(i, count):
            pair = own[i]
            if i != j:
                pair = pair_constants(own[i], own[j], pair_interaction(components[i], components[j])[0])
            tc, pc, vc, omega, a, b = pair
            second[:, i, j] = second[:, j, i] = second_virial(second_method, t, tc, pc, omega, a, b)
            size[:, i, j] = size[:, j, i] = np.cbrt(vc * vc)
            third[:, i, j] = third[:, j, i] = third_virial(third_method, t, tc, pc, omega) / (vc * vc)
    weighted = np.sqrt(y)[:, None] * size * np.sqrt(y)
    total = np.einsum("tij,tji->t", weighted @ weighted, weighted * third)  # eq. 2
    return np.einsum("tij,i,j->t", second, y, y), total  # eq. 1
