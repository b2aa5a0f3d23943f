"""β and κ of a liquid from densities that a laboratory measured, by least squares in the logarithm of density."""

from __future__ import annotations

from dataclasses import dataclass
from math import comb

import numpy as np

from models.arrays import ArrayLike, FloatArray, as_floats, first_index
from models.errors import DefinitionError, at_index

HIGHEST_DEGREE = 3
# What the weather does to an open sample, within which κ cannot be seen: κ · 10 kPa is 1e-5 of a density.
PRESSURE_SPAN = 1e4  # Pa
SAME_TEMPERATURE = 1e-3  # K: what no laboratory thermometer tells apart
_RANK_TOLERANCE = 1e-8  # of the largest singular value of scaled columns


@dataclass(frozen=True)
class ExpansivityFit:
    """What least squares make of densities at temperatures and pressures.

    Parameters
    ----------
    density : float
        Density at the reference state. [kg/m³]
    temperature, pressure : float
        The reference state; the powers of temperature begin there. [K, Pa]
    coefficients : FloatArray, shape (d+1,)
        b_0 … b_d of β. [1/K, 1/K², …]
    compressibility : float or None
        κ: fitted, or as it was given; none where neither. [1/Pa]
    fitted : bool
        Whether κ is among the parameters of the covariance. [1]
    covariance : FloatArray, shape (k, k)
        Of the density, the coefficients and, where fitted, κ, in this order; NaN where neither an uncertainty
        was given nor any degree of freedom is left. [products of their units]
    residuals : FloatArray, shape (n,)
        Measured less fitted density, row by row. [kg/m³]
    deviation : float
        Residual standard deviation; NaN without a degree of freedom. [kg/m³]
    degrees_of_freedom : int
        Rows less parameters. [1]
    """

    density: float
    temperature: float
    pressure: float
    coefficients: FloatArray
    compressibility: float | None
    fitted: bool
    covariance: FloatArray
    residuals: FloatArray
    deviation: float
    degrees_of_freedom: int


def fit_expansivity(
    temperature: ArrayLike,
    pressure: ArrayLike,
    density: ArrayLike,
    *,
    temperature_ref: float,
    pressure_ref: float,
    degree: int = 0,
    compressibility: float | None = None,
    density_uncertainty: float | None = None,
) -> ExpansivityFit:
    """β as a polynomial of temperature, and κ where pressures differ, from measured densities.

    Parameters
    ----------
    temperature : array_like, shape (n,)
        Temperatures. [K]
    pressure : array_like, shape (n,)
        Pressures. [Pa]
    density : array_like, shape (n,)
        Measured densities. [kg/m³]
    temperature_ref, pressure_ref : float
        State that the density of the answer belongs to, t₀ of the polynomial. [K, Pa]
    degree : int
        Degree of β in temperature, 0 to 3; 0 is a constant β. [1]
    compressibility : float or None
        κ, where it is known and not to be fitted. [1/Pa]
    density_uncertainty : float or None
        One standard uncertainty of each density, independent from row to row; without it the residuals
        say what it was. [kg/m³]

    Returns
    -------
    ExpansivityFit
        Parameters, their covariance, and the residuals. [1/K, 1/Pa, kg/m³]

    Raises
    ------
    DefinitionError
        Too few rows, temperatures that do not differ enough, temperature and pressure that change together.

    Notes
    -----
    With x = T − t₀ the unknowns ln ρ₀, b_j and κ stand linearly in::

        ln ρ = ln ρ₀ − Σ_j b_j x^(j+1)/(j+1) + κ (P − P₀)        (1)

    Each row has the weight ρ/u: an uncertainty u of ρ is u/ρ of its logarithm. The powers are taken of a
    temperature that is centred and scaled to −1 … 1, the columns to length 1, and solved by orthogonal
    factors; the shift back to t₀ is exact, and its linear map A takes the covariance along::

        u = (x + t₀ − t_c)/s,  a_m = Σ_j C(j, m) (t₀ − t_c)^(j−m)/s^j c_j,  b_j = −(j+1) a_(j+1)        (2)
        cov = A (Xᵀ W X)⁻¹ Aᵀ,  times the residual variance where u is not given                        (3)

    References
    ----------
    .. [1] Å. Björck, "Numerical Methods for Least Squares Problems", SIAM, 1996, ch. 1 and 2.
    .. [2] JCGM 102:2011, "Extension to any number of output quantities", 6.2: propagation of a covariance.
    """
    t, p, rho = (np.atleast_1d(column) for column in as_floats(temperature, pressure, density))
    _refuse_rows(t, p, rho)
    _refuse_degree(degree, t)
    if density_uncertainty is not None and not 0.0 < density_uncertainty < np.inf:
        raise DefinitionError(
            f"the uncertainty of a density is {density_uncertainty:.6g} kg/m³; it is above 0 kg/m³: leave it out "
            "where it is not known",
            field="density_uncertainty",
        )
    if compressibility is not None and not 0.0 <= compressibility < np.inf:
        detail = f"the compressibility is {compressibility:.6g} 1/Pa; it is 0 or above: leave it out to fit it"
        raise DefinitionError(detail, field="compressibility")
    fitted = compressibility is None and float(np.ptp(p)) >= PRESSURE_SPAN
    count = degree + 2 + fitted
    if len(t) < count:
        raise DefinitionError(
            f"there are {len(t)} rows for {count} unknowns: the density, {degree + 1} of β"
            f"{' and κ' if fitted else ''}; measure more, or fit a lower degree",
            field="rows",
        )
    kappa = compressibility or 0.0
    log_density = np.log(rho) - (0.0 if fitted else kappa * (p - pressure_ref))
    weight = rho / (density_uncertainty or 1.0)
    design, back = _design(t, p, temperature_ref, pressure_ref, degree, fitted)
    centre = float(np.mean(log_density))  # as small a right-hand side as there is
    solution, inverse = _solve(design * weight[:, None], (log_density - centre) * weight, fitted)
    found = back @ solution
    with np.errstate(over="ignore"):  # a reference state far beyond the rows: infinite, and seen to be
        reference = float(np.exp(found[0] + centre))
    coefficients = found[1 : degree + 2]
    residuals = rho - np.exp(design @ solution + centre + (0.0 if fitted else kappa * (p - pressure_ref)))  # eq. 1
    free = len(t) - count
    deviation = float(np.sqrt(np.sum(residuals**2) / free)) if free else np.nan
    unit = np.ones(count)
    unit[0] = reference  # from ln ρ₀ to ρ₀
    covariance = back @ inverse @ back.T * unit * unit[:, None]  # eq. 3
    covariance *= 1.0 if density_uncertainty else deviation**2
    return ExpansivityFit(
        reference, temperature_ref, pressure_ref, coefficients, float(found[-1]) if fitted else compressibility,
        fitted, covariance, residuals, deviation, free,
    )  # fmt: skip


def _refuse_rows(t: FloatArray, p: FloatArray, rho: FloatArray) -> None:
    limits = ((t, t > 0.0, "temperature", "K", "above 0 K"), (p, p >= 0.0, "pressure", "Pa", "not below 0 Pa"),
              (rho, rho > 0.0, "density", "kg/m³", "above 0 kg/m³"))  # fmt: skip
    for column, good, name, unit, limit in limits:
        bad = first_index(~(good & np.isfinite(column)))
        if bad is not None:
            detail = f"the {name}{at_index(bad)} is {column[bad]:.6g} {unit}; it is {limit}"
            raise DefinitionError(detail, field="rows", index=bad)


def _refuse_degree(degree: int, t: FloatArray) -> None:
    if not 0 <= degree <= HIGHEST_DEGREE:
        raise DefinitionError(f"the degree of β is {degree}; it is 0 to {HIGHEST_DEGREE}", field="degree")
    ordered = np.sort(t)
    differ = 1 + int(np.count_nonzero(np.diff(ordered) > SAME_TEMPERATURE)) if len(t) else 0
    if differ < degree + 2:
        lower = ", or fit a lower degree" if degree else ""
        raise DefinitionError(
            f"a β of degree {degree} needs {degree + 2} temperatures that differ by more than {SAME_TEMPERATURE:g} K; "
            f"the rows have {differ}: measure at more{lower}",
            field="rows",
        )


def _design(
    t: FloatArray, p: FloatArray, temperature_ref: float, pressure_ref: float, degree: int, fitted: bool
) -> tuple[FloatArray, FloatArray]:
    """Columns of eq. 1 in scaled variables, and the map of their factors to ln ρ₀, b_j and κ."""
    middle, half = 0.5 * float(t.max() + t.min()), 0.5 * float(np.ptp(t))
    powers = np.arange(degree + 2)
    columns = [((t - middle) / half) ** power for power in powers]
    back = np.zeros((degree + 2 + fitted, degree + 2 + fitted))
    shift = temperature_ref - middle
    for j in powers:  # eq. 2
        for m in range(j + 1):
            back[m, j] = comb(j, m) * shift ** (j - m) / half**j * (1.0 if m == 0 else -m)
    if fitted:
        level, span = float(np.mean(p)), float(np.ptp(p))
        columns.append((p - level) / span)
        back[0, -1], back[-1, -1] = (pressure_ref - level) / span, 1.0 / span
    return np.stack(columns, axis=1), back


def _solve(design: FloatArray, wanted: FloatArray, fitted: bool) -> tuple[FloatArray, FloatArray]:
    """Least squares by orthogonal factors, and the inverse of the normal matrix."""
    length = np.linalg.norm(design, axis=0)
    q, r = np.linalg.qr(design / length)
    singular = np.linalg.svd(r, compute_uv=False)
    if singular[-1] < _RANK_TOLERANCE * singular[0]:
        raise DefinitionError(
            "temperature and pressure change together in these rows, so that β and κ cannot be told apart: give "
            "the compressibility, or measure one temperature at two pressures"
            if fitted
            else "the temperatures of these rows lie too close together for this degree: fit a lower one",
            field="rows",
        )
    inverse = np.linalg.solve(r, np.eye(len(r))) / length[:, None]
    return inverse @ (q.T @ wanted), inverse @ inverse.T
