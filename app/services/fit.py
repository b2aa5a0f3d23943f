"""β and κ from densities that stand in the request: nothing is read, nothing is stored."""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from app.errors import FieldError, Unprocessable
from app.schemas.fit import ExpansivityCalculation
from models.arrays import FloatArray
from models.constants import STANDARD_ATMOSPHERE, ZERO_CELSIUS
from models.liquid.fit import PRESSURE_SPAN, ExpansivityFit, fit_expansivity

USUAL_TEMPERATURE_C = 15.0
"""Of a density that names no temperature."""
KILO = 1e3


def fit(body: ExpansivityCalculation) -> dict[str, Any]:
    """The fit and the substance that it makes, as ``FittedExpansivity`` takes them."""
    celsius, kilopascal, density = np.array(body.rows, dtype=np.float64).T
    at_c = _nearest(body.at_temperature_c, celsius, USUAL_TEMPERATURE_C)
    at_kpa = _nearest(body.at_pressure_kpa_abs, kilopascal, STANDARD_ATMOSPHERE / KILO)
    given = body.compressibility_per_kpa
    _refuse_pressure(body, at_kpa, kilopascal)
    found = fit_expansivity(
        celsius + ZERO_CELSIUS,
        kilopascal * KILO,
        density,
        temperature_ref=at_c + ZERO_CELSIUS,
        pressure_ref=at_kpa * KILO,
        degree=body.degree,
        compressibility=None if given is None else given / KILO,
        density_uncertainty=body.density_uncertainty_kg_m3,
    )
    _refuse_no_liquid(found)
    coefficients: list[float] = found.coefficients.tolist()
    beta = coefficients[0] if body.degree == 0 else coefficients
    kappa = given if given is not None else _per_kpa(found.compressibility)
    liquid = {
        "model": "expansivity",
        "density_kg_m3": found.density,
        "at_temperature_c": at_c,
        "at_pressure_kpa_abs": at_kpa,
        "expansivity_per_k": beta,
    }
    return {
        "expansivity_per_k": beta,
        "compressibility_per_kpa": kappa,
        **_parameters(found, coefficients),
        "residuals_kg_m3": found.residuals.tolist(),
        "residual_deviation_kg_m3": found.deviation,
        "degrees_of_freedom": found.degrees_of_freedom,
        "substance": {
            "name": body.name,
            "liquid": liquid if kappa is None else {**liquid, "compressibility_per_kpa": kappa},
        },
    }


def _nearest(given: float | None, rows: FloatArray, usual: float) -> float:
    """What was given, or the usual state as far as it lies within the rows."""
    return given if given is not None else float(min(max(usual, rows.min()), rows.max()))


def _per_kpa(per_pascal: float | None) -> float | None:
    return None if per_pascal is None else per_pascal * KILO


def _parameters(found: ExpansivityFit, coefficients: list[float]) -> dict[str, Any]:
    """Parameters and their covariance, in the units of the wire."""
    rows: list[tuple[str, float, str]] = [("rho0", found.density, "kg/m³")]
    rows += [
        (f"b{power}", value, f"1/K{'²³⁴'[power - 1] if power else ''}") for power, value in enumerate(coefficients)
    ]
    scale = np.ones(len(found.covariance))
    if found.fitted:
        rows.append(("kappa", float(found.compressibility or 0.0) * KILO, "1/kPa"))
        scale[-1] = KILO
    covariance = found.covariance * scale * scale[:, None]
    uncertainty = np.sqrt(np.diagonal(covariance)).tolist()
    return {
        "parameters": [
            {"symbol": symbol, "value": value, "standard_uncertainty": u, "unit": unit}
            for (symbol, value, unit), u in zip(rows, uncertainty, strict=True)
        ],
        "covariance": None if math.isnan(uncertainty[0]) else covariance.tolist(),
    }


def _refuse_pressure(body: ExpansivityCalculation, at_kpa: float, rows: FloatArray) -> None:
    """Refuse a density at a pressure that no row has where nothing says how the liquid gives way."""
    beyond = max(at_kpa - rows.max(), rows.min() - at_kpa) * KILO >= PRESSURE_SPAN
    if beyond and body.compressibility_per_kpa is None and np.ptp(rows) * KILO < PRESSURE_SPAN:
        detail = (
            "at_pressure_kpa_abs lies 10 kPa or more from every row, and the rows tell no κ: give "
            "compressibility_per_kpa, or leave at_pressure_kpa_abs out"
        )
        raise Unprocessable(detail, code="missing", errors=[FieldError("/compressibility_per_kpa", "missing", detail)])


def _refuse_no_liquid(found: ExpansivityFit) -> None:
    """Refuse what no substance may have: rows that were typed wrong, or pressures too close to tell κ."""
    detail = ""
    if found.fitted and not 0.0 <= (found.compressibility or 0.0) * KILO <= 1e-3:
        detail = (
            f"κ comes out as {(found.compressibility or 0.0) * KILO:.3g} 1/kPa; a liquid's is 0 to 0.001: look at the "
            "rows, measure at pressures further apart, or give compressibility_per_kpa"
        )
    elif len(found.coefficients) == 1 and not -0.01 <= found.coefficients[0] <= 0.05:
        detail = f"β comes out as {found.coefficients[0]:.3g} 1/K; a liquid's is -0.01 to 0.05: look at the rows"
    elif not 1e-3 <= found.density <= 25000.0:
        detail = (
            f"the density at the reference state comes out as {found.density:.3g} kg/m³; a liquid's is 0.001 to 25000: "
            "give an at_temperature_c within the rows"
        )
    if detail:
        raise Unprocessable(detail, code="impossible_fit", errors=[FieldError("/rows", "impossible_fit", detail)])
