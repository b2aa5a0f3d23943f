"""What is known beside a mass has the names and the limits of a reading, and one pressure."""

from __future__ import annotations

from typing import Any

import pytest

from app.schemas.calculation import CalculationReading
from app.schemas.expected import ExpectedReadingCalculation

BODY: dict[str, Any] = {
    "vessel": {"shape": {"kind": "box", "length_m": 6.0, "width_m": 2.5, "height_m": 2.0}},
    "substance": {"name": "water", "liquid": {"model": "water"}},
    "mass_kg": 2e4,
}
READING = CalculationReading.model_fields
SHARED = sorted(set(READING) & set(ExpectedReadingCalculation.model_fields))


@pytest.mark.parametrize(
    "more",
    [
        {},
        {"liquid_temperature_c": 20, "pressure_kpa": 0.0, "source": "hand"},
        {"vapour_temperature_c": 20, "site": {"elevation_m": 12.0}},
        {"observed_density_kg_m3": 998, "observed_density_by": "hydrometer", "density_basis": "wet"},
    ],
)
def test_a_mass_and_what_is_known_are_taken(refusals: Any, more: dict[str, Any]) -> None:
    assert refusals(ExpectedReadingCalculation, BODY | more) == {}


@pytest.mark.parametrize(
    ("change", "place", "code"),
    [
        ({"mass_kg": 0}, "/mass_kg", "out_of_range"),
        ({"mass_kg": 2e9}, "/mass_kg", "out_of_range"),
        ({"mass_kg": "20000"}, "/mass_kg", "wrong_type"),
        ({"liquid_temperature_c": -274}, "/liquid_temperature_c", "out_of_range"),
        ({"pressure_kpa": 1.0, "pressure_kpa_abs": 102.0}, "/pressure_kpa_abs", "one_of"),
        ({"level_m": 1.0}, "/level_m", "unknown_field"),
        ({"density_basis": "moist"}, "/density_basis", "not_one_of"),
    ],
)
def test_what_no_reading_could_have_is_refused(refusals: Any, change: dict[str, Any], place: str, code: str) -> None:
    found = refusals(ExpectedReadingCalculation, BODY | change)
    assert found.get(place) == code


@pytest.mark.parametrize("name", SHARED)
def test_limits_are_those_of_a_reading(name: str) -> None:
    asked, read = ExpectedReadingCalculation.model_fields[name], READING[name]
    assert (asked.annotation, asked.metadata, asked.default) == (read.annotation, read.metadata, read.default)


def test_all_that_may_be_known_is_shared() -> None:
    assert len(SHARED) == 15
