"""Rows of a fit are triples within what a laboratory can measure."""

from __future__ import annotations

from typing import Any

import pytest

from app.schemas.fit import HIGHEST_DEGREE, ExpansivityCalculation
from models.liquid.fit import HIGHEST_DEGREE as MODELS_HIGHEST_DEGREE

ROWS: list[list[float]] = [[15, 101.325, 840.02], [45, 101.325, 819.31]]


@pytest.mark.parametrize(
    "more",
    [
        {},
        {"name": "gas oil", "degree": 3, "at_temperature_c": 20, "at_pressure_kpa_abs": 0},
        {"compressibility_per_kpa": 0, "density_uncertainty_kg_m3": 0.05},
        {"rows": ROWS * 5000},
    ],
)
def test_rows_are_taken(refusals: Any, more: dict[str, Any]) -> None:
    assert refusals(ExpansivityCalculation, {"rows": ROWS, **more}) == {}


@pytest.mark.parametrize(
    ("change", "place", "code"),
    [
        ({"rows": ROWS[:1]}, "/rows", "wrong_length"),
        ({"rows": ROWS * 5001}, "/rows", "wrong_length"),
        ({"rows": [ROWS[0], [45, 101.325, 819.31, 0.1]]}, "/rows/1", "wrong_length"),
        ({"rows": [ROWS[0], [-274, 101.325, 819.31]]}, "/rows/1/0", "out_of_range"),
        ({"rows": [ROWS[0], [45, -0.1, 819.31]]}, "/rows/1/1", "out_of_range"),
        ({"rows": [ROWS[0], [45, 101.325, 0]]}, "/rows/1/2", "out_of_range"),
        ({"rows": [ROWS[0], [45, 101.325, None]]}, "/rows/1/2", "wrong_type"),
        ({"degree": -1}, "/degree", "out_of_range"),
        ({"degree": 1.5}, "/degree", "wrong_type"),
        ({"compressibility_per_kpa": -1e-9}, "/compressibility_per_kpa", "out_of_range"),
        ({"density_uncertainty_kg_m3": 0}, "/density_uncertainty_kg_m3", "out_of_range"),
        ({"name": ""}, "/name", "wrong_length"),
    ],
)
def test_what_no_laboratory_measures_is_refused(refusals: Any, change: dict[str, Any], place: str, code: str) -> None:
    found = refusals(ExpansivityCalculation, {"rows": ROWS, **change})
    assert found.get(place) == code


def test_the_wire_takes_the_degrees_that_the_model_fits() -> None:
    assert HIGHEST_DEGREE == MODELS_HIGHEST_DEGREE
