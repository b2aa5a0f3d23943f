"""Every liquid model's body: what it takes, what it needs, and which two ways exclude each other."""

from __future__ import annotations

from typing import Any

import pytest
from pydantic import ValidationError

from app.schemas.errors import explain
from app.schemas.substance import Substance

PROPANE = [{"id": "propane", "mole_fraction": 1.0}]
GOOD: dict[str, dict[str, Any]] = {
    "petroleum": {"model": "petroleum", "commodity": "crude", "density_kg_m3": 850.0},
    "special": {"model": "petroleum", "commodity": "special", "alpha60_per_f": 5e-4, "density_kg_m3": 850.0},
    "water": {"model": "water"},
    "light by density": {"model": "light_hydrocarbon", "density_kg_m3": 507.0, "at_temperature_c": 20.0},
    "light by components": {"model": "light_hydrocarbon", "components": PROPANE},
    "table": {"model": "density_table", "rows": [[0, 900.0], [50, 870.0]], "compressibility_per_kpa": 6e-7},
    "strength": {"model": "ethanol_water", "alcohol_volume_pct": 96.0},
    "ethanol by density": {"model": "ethanol_water", "density_kg_m3": 807.4, "at_temperature_c": 20.0},
}


def liquid(body: dict[str, Any]) -> Any:
    return Substance.model_validate({"name": "x", "liquid": body}).liquid


@pytest.mark.parametrize("kind", GOOD)
def test_a_body_of_each_model_is_taken(kind: str) -> None:
    found = liquid(GOOD[kind])
    assert found.model == GOOD[kind]["model"]
    assert found.density_uncertainty_kg_m3 is None


@pytest.mark.parametrize(
    ("kind", "change", "place", "code"),
    [
        ("petroleum", {"commodity": "tar"}, "/liquid/commodity", "not_one_of"),
        ("petroleum", {"commodity": "special"}, "/liquid/alpha60_per_f", "missing"),
        ("petroleum", {"alpha60_per_f": 5e-4}, "/liquid/alpha60_per_f", "conflicting"),
        ("petroleum", {"density_kg_m3": None}, "/liquid/density_kg_m3", None),
        ("petroleum", {"density_uncertainty_kg_m3": 900.0}, "/liquid/density_uncertainty_kg_m3", "impossible"),
        ("light by density", {"components": PROPANE}, "/liquid/density_kg_m3", "conflicting"),
        ("light by components", {"at_temperature_c": 20.0}, "/liquid/at_temperature_c", "conflicting"),
        ("light by components", {"components": PROPANE * 2}, "/liquid/components", "fractions_sum"),
        ("table", {"rows": [[0, 900.0]]}, "/liquid/rows", "wrong_length"),
        ("table", {"rows": [[50, 900.0], [0, 870.0]]}, "/liquid/rows", "table_falls"),
        ("strength", {"density_kg_m3": 807.4}, "/liquid/alcohol_volume_pct", "conflicting"),
        ("strength", {"alcohol_volume_pct": 101.0}, "/liquid/alcohol_volume_pct", "out_of_range"),
        ("ethanol by density", {"at_temperature_c": 45.0}, "/liquid/at_temperature_c", "out_of_range"),
        ("water", {"density_kg_m3": 998.0}, "/liquid/density_kg_m3", "unknown_field"),
    ],
)
def test_what_a_model_cannot_take_is_named_with_its_place(
    kind: str, change: dict[str, Any], place: str, code: str | None
) -> None:
    with pytest.raises(ValidationError) as refused:
        liquid(GOOD[kind] | change)
    found = {one[0]: one[1] for one in explain(refused.value)}
    assert place in found, found
    assert code is None or found[place] == code


def test_a_light_hydrocarbon_or_a_spirit_is_known_by_something() -> None:
    for model, place in (("light_hydrocarbon", "density_kg_m3"), ("ethanol_water", "alcohol_volume_pct")):
        with pytest.raises(ValidationError) as refused:
            liquid({"model": model})
        assert explain(refused.value)[0][:2] == (f"/liquid/{place}", "missing")
