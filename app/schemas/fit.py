"""β and κ from a laboratory's densities, with nothing stored."""

from __future__ import annotations

from typing import Annotated

from pydantic import ConfigDict, Field

from app.schemas.component import Temperature
from app.schemas.liquid import Expansivity
from app.schemas.substance import Substance
from app.schemas.types import Answer, Body, Items, Known, Text

ROWS = 10_000
"""Rows of one fit, at most."""
HIGHEST_DEGREE = 3
"""Of β in temperature."""

MeasuredDensity = Annotated[
    tuple[
        Temperature,
        Annotated[float, Field(ge=0, le=1e6)],
        Annotated[float, Field(ge=1e-3, le=25000)],
    ],
    Field(strict=False),
]


class ExpansivityCalculation(Body):
    """Densities that a laboratory measured at temperatures and pressures."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "name": "gas oil, house grade",
                    "rows": [
                        [15.0, 101.325, 840.02], [25.0, 101.325, 833.06], [35.0, 101.325, 826.18],
                        [45.0, 101.325, 819.31], [15.0, 2101.325, 841.27], [45.0, 2101.325, 820.71],
                    ],
                    "degree": 0,
                    "density_uncertainty_kg_m3": 0.05,
                }
            ]
        }
    )  # fmt: skip

    name: Text = Field(default="fitted liquid", description="Name of the substance that is answered")
    rows: Items[MeasuredDensity] = Field(
        min_length=2,
        max_length=ROWS,
        description="Rows of [t_c, pressure_kpa_abs, density_kg_m3]; in any order, one temperature several times "
        "if you like [°C, kPa absolute, kg/m³]",
    )
    degree: int = Field(
        default=0, ge=0, le=HIGHEST_DEGREE,
        description="Degree of β in temperature: 0 is a constant β; d needs d + 2 temperatures that differ",
    )  # fmt: skip
    at_temperature_c: Temperature | None = Field(
        default=None,
        description="Temperature t₀ of the density that is answered, where the powers of β begin; left out: 15 or, "
        "where no row is as cold or as warm, the nearest of the rows [°C]",
    )
    at_pressure_kpa_abs: float | None = Field(
        default=None, ge=0, le=1e6,
        description="Absolute pressure of the density that is answered; left out: 101.325 or, where no row is as "
        "low or as high, the nearest of the rows [kPa absolute]",
    )  # fmt: skip
    compressibility_per_kpa: float | None = Field(
        default=None, ge=0, le=1e-3,
        description="κ where it is known; left out, it is fitted if the rows' pressures differ by 10 kPa or more, "
        "and is otherwise unknown [1/kPa]",
    )  # fmt: skip
    density_uncertainty_kg_m3: float | None = Field(
        default=None, gt=0, le=5000,
        description="One standard uncertainty of each density, independent from row to row; left out, the residuals "
        "tell it [kg/m³]",
    )  # fmt: skip


class FittedParameter(Answer):
    """One parameter of the fit."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [{"symbol": "b0", "value": 8.31e-4, "standard_uncertainty": 2.1e-6, "unit": "1/K"}]
        }
    )

    symbol: str = Field(description="rho0: the density at the reference state; b0, b1, … of β; kappa")
    value: float = Field(description="Its value [unit]")
    standard_uncertainty: Known = Field(
        description="Square root of its place in the covariance; null where nothing tells it [unit]"
    )
    unit: str = Field(description="Its unit")


class FittedExpansivity(Answer):
    """ln ρ = ln ρ₀ − Σ b_j (t − t₀)^(j+1)/(j+1) + κ (P − P₀), by least squares."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "expansivity_per_k": 8.31e-4, "compressibility_per_kpa": None,
                    "parameters": [
                        {"symbol": "rho0", "value": 840.02, "standard_uncertainty": None, "unit": "kg/m³"},
                        {"symbol": "b0", "value": 8.31e-4, "standard_uncertainty": None, "unit": "1/K"},
                    ],
                    "covariance": None, "residuals_kg_m3": [0.0, 0.0], "residual_deviation_kg_m3": None,
                    "degrees_of_freedom": 0,
                    "substance": {
                        "name": "gas oil, house grade",
                        "liquid": {
                            "model": "expansivity", "density_kg_m3": 840.02, "at_temperature_c": 15.0,
                            "at_pressure_kpa_abs": 101.325, "expansivity_per_k": 8.31e-4,
                        },
                    },
                }
            ]
        }
    )  # fmt: skip

    expansivity_per_k: Expansivity = Field(
        description="β: a number for degree 0, else the coefficients of powers of (t − t₀) [1/K, 1/K², …]"
    )
    compressibility_per_kpa: Known = Field(description="κ, fitted or as given; null where neither [1/kPa]")
    parameters: Items[FittedParameter] = Field(description="What was fitted, in the order of the covariance")
    covariance: Items[Items[float]] | None = Field(
        description="Covariance of the parameters: of density_uncertainty_kg_m3 where given, else of the residuals; "
        "null where there is neither [products of the parameters' units]"
    )
    residuals_kg_m3: Items[float] = Field(description="Measured less fitted density, for each row in order [kg/m³]")
    residual_deviation_kg_m3: Known = Field(
        description="Root of the squared residuals' sum over the degrees of freedom; null where none is left. Well "
        "above density_uncertainty_kg_m3, a higher degree is needed or a row is wrong [kg/m³]"
    )
    degrees_of_freedom: int = Field(description="Rows less parameters")
    substance: Substance = Field(
        description="A body for PUT …/substances/{substance}; density_uncertainty_kg_m3 is left to you: how much the "
        "next batch differs is not in these rows"
    )
