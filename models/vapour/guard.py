"""Where the virial equation stops being true, and how far it may be off before that.

The limits were found by comparing densities with reference equations of state (CoolProp 8.0.0) over
2,700 states of twelve gases and 790 states of seven mixtures; ``tests/models/vapour`` repeats the
comparison. ρr is the density relative to the critical one, ψ = Z ∂lnP/∂lnρ is 1 for an ideal gas and
0 at the spinodal.
"""

from __future__ import annotations

from collections.abc import Sequence
from enum import IntEnum
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from models.arrays import FloatArray
from models.components import Component
from models.vapour.fitted import FITTED
from models.vapour.mixtures import pair_interaction


class Verdict(IntEnum):
    """What may be said of a vapour density."""

    OK = 0
    WIDE = 1
    UNCERTAIN = 2
    REFUSED = 3
    NO_VAPOUR_ROOT = 4
    OUTSIDE_RANGE = 5


DENSEST = 0.5  # reduced density above which every form is refused
PSI_OK, PSI_LEAST = 0.5, 0.3
LOWEST_REDUCED_TEMPERATURE = 0.7  # of a correlation; a fit knows its own range
NOTICEABLE_FRACTION = 0.05  # of polar or quantum gases in a correlated mixture
# Reduced density up to which a form is good, and up to which it is good with a wider uncertainty.
LIMITS: dict[tuple[str, int], tuple[float, float]] = {
    ("density", 3): (0.2, 0.3),
    ("density", 2): (0.02, 0.049),
    ("pressure", 3): (0.049, 0.104),
    ("pressure", 2): (0.02, 0.049),
}
# Error of a shortened form: 0.25 % at this reduced density, growing with this power.
SHORTENED: dict[tuple[str, int], tuple[float, float]] = {
    ("density", 2): (0.02, 1.59),
    ("pressure", 3): (0.049, 1.84),
    ("pressure", 2): (0.02, 1.59),
}
SHORTENED_ERROR = 0.0025
OMITTED, OMITTED_COLD = 0.5, 0.1  # fourth virial coefficient over Vc cubed, and its growth in the cold
COLD = 0.85  # reduced temperature below which a correlated B loses accuracy


Value = float | NDArray[np.float64]


class Trust(NamedTuple):
    """Terms of the expanded uncertainty (``expanded_uncertainty``) and limits of the verdict (``judge``).

    ``lowest`` is the reduced temperature below which the answer is uncertain, ``doubtful`` is 1 where it
    always is. ``good`` and ``wide`` are the reduced densities of ``LIMITS``; a shortened form adds 0.25 %
    at ``short``, growing with ``power``. Each is a number, or an array of one a row.
    """

    constant: Value
    linear: Value
    quadratic: Value
    second: Value
    omitted: Value = 1.0
    lowest: Value = 0.0
    doubtful: Value = 0.0
    good: Value = 0.2
    wide: Value = 0.3
    short: Value = np.inf
    power: Value = 1.0

    def of_form(self, form: str, terms: int) -> Trust:
        """The same coefficients in one of the forms of ``LIMITS``.

        Parameters
        ----------
        form, terms : str and int
            Form of the series and its number of terms. [1]

        Returns
        -------
        Trust
            With the form's limits and its own error. [1]
        """
        good, wide = LIMITS[form, terms]
        short, power = SHORTENED.get((form, terms), (np.inf, 1.0))
        return self._replace(good=good, wide=wide, short=short, power=power)


MEASURED = Trust(0.0003, 0.0, 0.04, 0.02)  # 2 % of B: a good measurement's class


def fitted_trust(components: Sequence[Component], mole_fractions: Sequence[float]) -> Trust:
    """Trust in coefficients that rest on the fitted polynomials.

    Parameters
    ----------
    components : sequence of Component
        The substances. [1]
    mole_fractions : sequence of float
        Mole fractions. [1]

    Returns
    -------
    Trust
        Expanded uncertainty and marks. [1]
    """
    if len(components) == 1:
        fit = FITTED[components[0].id]
        return Trust(0.0003, 0.0, fit.growth / 100.0, 0.0, fit.omitted)
    correlated = correlated_trust(components, mole_fractions)
    return correlated._replace(lowest=0.0, doubtful=0.0)


def correlated_trust(components: Sequence[Component], mole_fractions: Sequence[float]) -> Trust:
    """Trust in coefficients by corresponding states.

    Parameters
    ----------
    components : sequence of Component
        The substances. [1]
    mole_fractions : sequence of float
        Mole fractions. [1]

    Returns
    -------
    Trust
        Expanded uncertainty and marks. [1]
    """
    polar = sum(y for c, y in zip(components, mole_fractions, strict=True) if c.polar)
    quantum = sum(y for c, y in zip(components, mole_fractions, strict=True) if c.quantum)
    doubtful = float(polar > NOTICEABLE_FRACTION or quantum > NOTICEABLE_FRACTION)
    pairs = [(c, d) for i, c in enumerate(components) for d in components[i + 1 :]]
    if polar > NOTICEABLE_FRACTION:
        trust = Trust(0.004, 0.06, 0.0, 0.03)
    elif quantum > NOTICEABLE_FRACTION:
        trust = Trust(0.001, 0.11, 0.0, 0.0)
    elif not pairs:
        trust = Trust(0.001, 0.02, 0.0, 0.0)
    elif all(pair_interaction(c, d)[1] for c, d in pairs):
        trust = Trust(0.0015, 0.02, 0.0, 0.0)
    else:
        trust = Trust(0.0025, 0.06, 0.0, 0.0)
    return trust._replace(lowest=LOWEST_REDUCED_TEMPERATURE, doubtful=doubtful)


def expanded_uncertainty(
    trust: Trust, reduced_density: FloatArray, reduced_temperature: FloatArray,
    second_by_density: FloatArray, psi: FloatArray,
) -> FloatArray:  # fmt: skip
    """Relative model uncertainty of a density, about 95 %.

    Parameters
    ----------
    trust : Trust
        Uncertainty of the coefficients, each a number or one a row. [1]
    reduced_density, reduced_temperature : FloatArray, shape (...)
        Density and temperature relative to the critical ones. [1]
    second_by_density : FloatArray, shape (...)
        B ρ. [1]
    psi : FloatArray, shape (...)
        ψ. [1]

    Returns
    -------
    FloatArray, shape (...)
        Expanded relative uncertainty of the density. [1]

    Notes
    -----
    What the coefficients leave, growing near the spinodal and, for a correlation, with the cold; and the
    fourth virial coefficient, which the series omits, by its size in reference equations::

        U = k0 + k1 max(1, (0.85/Tr)^6) ρr/ψ + k2 ρr² + k3 |Bρ|/ψ + k4 (0.5 + 0.1/Tr^18) ρr³/ψ    (1)

    References
    ----------
    .. [1] CoolProp 8.0.0 (HEOS): the sizes of B, C and D, and the departures that the k were set by.
    """
    worth = 1.0 / np.maximum(psi, PSI_LEAST)
    inverse = 1.0 / reduced_temperature
    to_2 = inverse * inverse
    to_6 = to_2 * to_2 * to_2
    omitted = trust.omitted * (OMITTED + OMITTED_COLD * to_6 * to_6 * to_6)
    squared = reduced_density * reduced_density
    result = trust.constant + squared * (trust.quadratic + omitted * reduced_density * worth)  # eq. 1
    if np.any(trust.linear):
        colder = np.maximum(COLD**6 * to_6, 1.0)
        result += trust.linear * colder * reduced_density * worth
    if np.any(trust.second):
        result += trust.second * np.abs(second_by_density) * worth
    if np.any(np.isfinite(trust.short)):
        result += SHORTENED_ERROR * (reduced_density / trust.short) ** trust.power
    return np.asarray(result)


def judge(
    trust: Trust, reduced_density: FloatArray, reduced_temperature: FloatArray, psi: FloatArray,
) -> np.ndarray[tuple[int, ...], np.dtype[np.int8]]:  # fmt: skip
    """Verdict on each density, from the model's own solution.

    Parameters
    ----------
    trust : Trust
        Marks of the coefficients, each a number or one a row. [1]
    reduced_density, reduced_temperature : FloatArray, shape (...)
        Density and temperature relative to the critical ones. [1]
    psi : FloatArray, shape (...)
        ψ. [1]

    Returns
    -------
    int8 array, shape (...)
        A ``Verdict``: ok, wide, uncertain or refused. [1]
    """
    verdict = np.asarray(reduced_density > trust.good).astype(np.int8)
    doubtful = (reduced_density > trust.wide) | (psi < PSI_OK)
    if np.any(trust.lowest) or np.any(trust.doubtful):
        doubtful |= (reduced_temperature < trust.lowest) | (np.asarray(trust.doubtful) > 0.0)
    if doubtful.any():
        verdict[doubtful] = Verdict.UNCERTAIN
        refused = (reduced_density > DENSEST) | ~(psi >= PSI_LEAST)
        verdict[refused] = Verdict.REFUSED
    return verdict
