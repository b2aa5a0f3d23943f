"""Densities in the units of the wire become a fit, its covariance in the same units, and a substance."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest

from app.errors import Unprocessable
from app.schemas.fit import ExpansivityCalculation, FittedExpansivity
from app.services.fit import fit
from models.errors import DefinitionError


def fitted(rows: list[list[float]], **more: Any) -> dict[str, Any]:
    found = fit(ExpansivityCalculation.model_validate({"rows": rows, **more}))
    FittedExpansivity.model_validate(found)
    return found


def noisy(seed: int, celsius: list[float], kpa: list[float], sigma: float) -> list[list[float]]:
    random = np.random.default_rng(seed)
    return [
        [t, p, 840.0 * math.exp(-8.3e-4 * (t - 15.0) + 7.5e-7 * (p - 101.325)) + float(random.normal(0.0, sigma))]
        for t in celsius
        for p in kpa
    ]


@pytest.mark.parametrize(
    ("celsius", "kpa", "at_c", "at_kpa"),
    [
        ([10.0, 20.0], 101.325, 15.0, 101.325),
        ([60.0, 90.0], 95.0, 60.0, 95.0),
        ([-40.0, -10.0], 900.0, -10.0, 900.0),
    ],
)
def test_the_reference_state_is_the_usual_one_within_the_rows(
    celsius: list[float], kpa: float, at_c: float, at_kpa: float
) -> None:
    liquid = fitted([[celsius[0], kpa, 850.0], [celsius[1], kpa, 840.0]])["substance"]["liquid"]
    assert (liquid["at_temperature_c"], liquid["at_pressure_kpa_abs"]) == (at_c, at_kpa)


def test_a_reference_state_that_is_asked_for_counts() -> None:
    found = fitted([[10.0, 101.0, 850.0], [20.0, 101.0, 840.0]], at_temperature_c=30.0, at_pressure_kpa_abs=105.0)
    liquid = found["substance"]["liquid"]
    assert (liquid["at_temperature_c"], liquid["at_pressure_kpa_abs"]) == (30.0, 105.0)
    assert liquid["density_kg_m3"] == pytest.approx(840.0**2 / 850.0, rel=1e-12)  # one more step of the same ratio


def test_the_covariance_is_in_the_units_of_the_wire() -> None:
    rows = noisy(3, [5.0, 15.0, 30.0, 45.0], [101.325, 1000.0, 3000.0], 0.03)
    found = fitted(rows, density_uncertainty_kg_m3=0.03)
    assert [one["symbol"] for one in found["parameters"]] == ["rho0", "b0", "kappa"]
    assert [one["unit"] for one in found["parameters"]] == ["kg/m³", "1/K", "1/kPa"]
    t, p, rho = np.array(rows).T
    design = np.stack([np.ones(12) / 840.0, -(t - 15.0), p - 101.325], axis=1) * rho[:, None] / 0.03
    expected = np.linalg.inv(design.T @ design)
    assert np.array(found["covariance"]) == pytest.approx(expected, rel=1e-3)
    for place, (one, truth) in enumerate(zip(found["parameters"], (840.0, 8.3e-4, 7.5e-7), strict=True)):
        assert one["standard_uncertainty"] == pytest.approx(expected[place, place] ** 0.5, rel=1e-3)
        assert abs(one["value"] - truth) < 4.0 * one["standard_uncertainty"]


def test_a_polynomial_names_each_coefficient_and_its_unit() -> None:
    found = fitted(noisy(4, [0.0, 10.0, 20.0, 30.0, 40.0, 50.0], [101.325], 0.01), degree=3)
    assert [(one["symbol"], one["unit"]) for one in found["parameters"]] == [
        ("rho0", "kg/m³"), ("b0", "1/K"), ("b1", "1/K²"), ("b2", "1/K³"), ("b3", "1/K⁴"),
    ]  # fmt: skip
    assert found["expansivity_per_k"] == [one["value"] for one in found["parameters"][1:]]
    assert found["degrees_of_freedom"] == 1
    assert "compressibility_per_kpa" not in found["substance"]["liquid"]


def test_an_extrapolation_that_ends_nowhere_is_refused() -> None:
    rows = [
        [80.0, 101.0, 840.0],
        [81.0, 101.0, 830.0],
        [82.0, 101.0, 840.0],
        [83.0, 101.0, 840.0],
        [84.0, 101.0, 840.0],
    ]
    with pytest.raises(Unprocessable, match="give an at_temperature_c within the rows"):
        fitted(rows, degree=3, at_temperature_c=1000.0)


def test_no_temperature_is_absolute_zero() -> None:
    with pytest.raises(DefinitionError, match="above 0 K"):
        fitted([[-273.15, 101.0, 840.0], [20.0, 101.0, 830.0]])
