"""A mixture's B(T) and C(T) as one polynomial each, so that a composition costs nothing a row."""

from __future__ import annotations

from functools import lru_cache
from typing import NamedTuple

import numpy as np

from models.arrays import FloatArray
from models.errors import DefinitionError
from models.vapour.correlations import REFERENCES
from models.vapour.definition import Measured, VapourMixture
from models.vapour.fitted import FITTED, SOURCE, fitted_coefficients
from models.vapour.guard import MEASURED, Trust, correlated_trust, fitted_trust
from models.vapour.mixtures import correlated_coefficients

NODES = 64
HIGHEST_DEGREE = 24
NEGLIGIBLE = 1e-14  # of the largest coefficient
COLDEST, HOTTEST = 60.0, 700.0  # K, of a correlation
COLDEST_REDUCED, HOTTEST_REDUCED = 0.4, 1.2  # of its heaviest component
MEASURED_DEGREE = 4  # in 1/T; fewer rows are met exactly


class Note(NamedTuple):
    """One line of the working: what was taken, by which method, from which source."""

    quantity: str
    symbol: str
    method: str
    reference: str


class Compiled(NamedTuple):
    """B and C of one mixture between two temperatures, in x = (1/T - middle)/half."""

    lowest: float
    highest: float
    second: FloatArray  # powers of x, rising [m3/mol]
    third: FloatArray  # [m6/mol2]
    trust: Trust
    notes: tuple[Note, ...]


def inverse_scale(lowest: float, highest: float) -> tuple[float, float]:
    """Middle and half width of the range in 1/T, over which x runs from -1 to 1.

    Parameters
    ----------
    lowest, highest : float
        Range of temperature. [K]

    Returns
    -------
    tuple of float
        Middle and half width. [1/K]
    """
    return 0.5 * (1.0 / lowest + 1.0 / highest), 0.5 * (1.0 / lowest - 1.0 / highest)


@lru_cache(maxsize=4096)
def compile_mixture(mixture: VapourMixture) -> tuple[Compiled, ...]:
    """The polynomials of a mixture: its own, and the correlation for temperatures outside them.

    Parameters
    ----------
    mixture : VapourMixture
        The mixture. [1]

    Returns
    -------
    tuple of Compiled
        One, or two where a mixture that names no source has fits of a smaller range. [1]

    References
    ----------
    .. [1] L. N. Trefethen, "Approximation Theory and Approximation Practice", SIAM, 2013: interpolation
       in Chebyshev points.
    """
    correlated = _correlated(mixture)
    if mixture.source == "correlation":
        return (correlated,)
    if mixture.source == "measured":
        return (_measured(mixture, correlated),)
    if mixture.coefficients is not None:
        return (_fitted(mixture),)
    lowest, highest = _fitted_range(mixture)
    if lowest >= highest:
        return (correlated,)
    return (_fitted(mixture), correlated)


def _correlated_range(mixture: VapourMixture) -> tuple[float, float]:
    """Below 0.4 Tc of the heaviest component its vapour is too thin to matter and its C too large to fit."""
    critical = [c.critical_temperature for c in mixture.substances if not c.quantum]
    heaviest = max(critical, default=0.0)
    return max(COLDEST, COLDEST_REDUCED * heaviest), max(HOTTEST, HOTTEST_REDUCED * heaviest)


def _fitted_range(mixture: VapourMixture) -> tuple[float, float]:
    fits = [FITTED[c.id] for c in mixture.substances]
    return max(fit.lowest for fit in fits), min(fit.highest for fit in fits)


def _nodes(lowest: float, highest: float) -> tuple[FloatArray, FloatArray]:
    """Chebyshev points x and their temperatures."""
    x = np.cos(np.pi * (np.arange(NODES) + 0.5) / NODES)
    middle, half = inverse_scale(lowest, highest)
    return x, 1.0 / (middle + half * x)


def _polynomial(x: FloatArray, values: FloatArray) -> FloatArray:
    """Powers of x of the interpolating polynomial, cut where nothing more is felt."""
    chebyshev = np.polynomial.chebyshev.chebvander(x, HIGHEST_DEGREE).T @ values * (2.0 / NODES)
    chebyshev[0] *= 0.5
    felt = np.flatnonzero(np.abs(chebyshev) > NEGLIGIBLE * np.abs(chebyshev).max(initial=0.0))
    kept = chebyshev[: felt[-1] + 1] if len(felt) else chebyshev[:1]
    return np.asarray(np.polynomial.chebyshev.cheb2poly(kept), dtype=np.float64)


def _correlated(mixture: VapourMixture) -> Compiled:
    lowest, highest = _correlated_range(mixture)
    x, t = _nodes(lowest, highest)
    second, third = correlated_coefficients(
        mixture.substances, mixture.fractions, t, mixture.second_virial, mixture.third_virial
    )
    trust = correlated_trust(mixture.substances, mixture.fractions)
    limits = f"{lowest:.0f} to {highest:.0f} K"
    chosen = (("second", "B", mixture.second_virial), ("third", "C", mixture.third_virial))
    own = (
        Note(f"{which} virial coefficient", symbol, f"{method}, {limits}", REFERENCES[method])
        for which, symbol, method in chosen
    )
    notes = (*own, *_mixture_notes(mixture))
    return _built(mixture, lowest, highest, x, second, third, trust, notes)


def _mixture_notes(mixture: VapourMixture) -> tuple[Note, ...]:
    if len(mixture.substances) == 1:
        return ()
    method = "corresponding states of pairs, reduced means of triples"
    reference = (
        "Smith, Van Ness, Abbott, 7th ed., 2005, ch. 11; Meng, Duan, 2005; Orentlicher, Prausnitz, 1967"
    )
    return (Note("pair coefficients", "B_ij, C_ijk", method, reference),)


def _fitted(mixture: VapourMixture) -> Compiled:
    """Fitted polynomials; in a mixture each pure departure from the correlation is carried into the pairs.

    ``B_ij = B_ij(correlation) + (D_i + D_j)/2`` summed over pairs is ``B(correlation) + sum y_i D_i``.
    Of the third coefficients only those of like triples are fitted ones.
    """
    lowest, highest = _fitted_range(mixture)
    if lowest >= highest:
        ranges = ", ".join(
            f"{c.id} {FITTED[c.id].lowest:g} to {FITTED[c.id].highest:g} K" for c in mixture.substances
        )
        raise _no_common_range(ranges)
    x, t = _nodes(lowest, highest)
    if len(mixture.substances) == 1:
        second, third = fitted_coefficients(mixture.substances[0].id, t)
    else:
        methods = (mixture.second_virial, mixture.third_virial)
        second, third = correlated_coefficients(mixture.substances, mixture.fractions, t, *methods)
        for substance, fraction in zip(mixture.substances, mixture.fractions, strict=True):
            own, correlated = (
                fitted_coefficients(substance.id, t),
                correlated_coefficients((substance,), (1.0,), t, *methods),
            )
            second = second + fraction * (own[0] - correlated[0])
            third = third + fraction**3 * (own[1] - correlated[1])
    trust = fitted_trust(mixture.substances, mixture.fractions)
    method = f"fitted polynomial in 298.15 K/T - 1, {lowest:g} to {highest:g} K"
    notes = (
        Note("second virial coefficient", "B", method, SOURCE),
        Note("third virial coefficient", "C", method, SOURCE),
        *_mixture_notes(mixture),
    )
    return _built(mixture, lowest, highest, x, second, third, trust, notes)


def _no_common_range(ranges: str) -> DefinitionError:
    """Why coefficients whose ranges have no temperature in common are refused."""
    return DefinitionError(
        f"the coefficients of this mixture have no temperature in common ({ranges}); use correlation",
        field="coefficients",
    )


def _measured(mixture: VapourMixture, correlated: Compiled) -> Compiled:
    """Measured values; C is the correlation's where it was not measured."""
    assert mixture.measured_second is not None
    lowest, highest = correlated.lowest, correlated.highest
    for measured in (mixture.measured_second, mixture.measured_third):
        if isinstance(measured, tuple):
            lowest, highest = (max(lowest, measured[0][0]), min(highest, measured[-1][0]))
    if lowest >= highest:
        raise _no_common_range("of the measured rows, and of the correlation for what was not measured")
    x, t = _nodes(lowest, highest)
    second = _through(mixture.measured_second, t)
    if mixture.measured_third is not None:
        third = _through(mixture.measured_third, t)
        third_notes: tuple[Note, ...] = (Note("third virial coefficient", "C", "measured", "given with the substance"),)
    else:
        third = correlated_coefficients(
            mixture.substances, mixture.fractions, t, mixture.second_virial, mixture.third_virial
        )[1]
        third_notes = tuple(note for note in correlated.notes if note.symbol == "C")  # none of two terms
    method = f"measured, {lowest:.0f} to {highest:.0f} K"
    notes = (Note("second virial coefficient", "B", method, "given with the substance"), *third_notes)
    return _built(mixture, lowest, highest, x, second, third, MEASURED, notes)


def _through(measured: Measured, temperature: FloatArray) -> FloatArray:
    """A polynomial in 1/T through measured rows, by least squares where there are more than five."""
    if not isinstance(measured, tuple):
        return np.full(temperature.shape, float(measured))
    at, values = np.array(measured, dtype=np.float64).T
    middle, half = inverse_scale(at[0], at[-1])
    degree = min(len(at) - 1, MEASURED_DEGREE)
    fit = np.polynomial.chebyshev.chebfit((1.0 / at - middle) / half, values, degree)
    return np.asarray(np.polynomial.chebyshev.chebval((1.0 / temperature - middle) / half, fit))


def _built(
    mixture: VapourMixture, lowest: float, highest: float, x: FloatArray, second: FloatArray,
    third: FloatArray, trust: Trust, notes: tuple[Note, ...],
) -> Compiled:  # fmt: skip
    """The polynomials of one source. The density form without C is the three-term form with C = 0."""
    if mixture.terms == 2:
        third = np.zeros_like(third)
        notes = tuple(note for note in notes if note.symbol != "C")
    trust = trust.of_form(mixture.form, mixture.terms)
    return Compiled(lowest, highest, _polynomial(x, second), _polynomial(x, third), trust, notes)
