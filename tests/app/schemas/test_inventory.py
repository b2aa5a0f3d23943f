"""An inventory speaks the contract's words; what was not asked for is absent, what is unknown is null."""

from __future__ import annotations

import json

import pytest
from pydantic import ValidationError

from app.schemas.inventory import Contribution, InputUsed, Inventory, Step, SubstanceTotal, WarningSaid

# The words as the contract lists them.
PROMISED = [
    "vessel",
    "at",
    "status",
    "fill_pct",
    "gross_observed_volume_m3",
    "free_water_volume_m3",
    "gross_standard_volume_m3",
    "net_standard_volume_m3",
    "liquid_density_kg_m3",
    "standard_density_kg_m3",
    "liquid_mass_kg",
    "vapour_volume_m3",
    "compressibility_factor",
    "vapour_mass_kg",
    "gas_standard_volume_m3",
    "mass_kg",
    "mass_uncertainty_kg",
    "available_mass_kg",
    "weight_in_air_kg",
    "inputs",
    "checks",
    "warnings",
    "definitions",
    "working",
    "budget",
]


def test_words_are_those_of_the_contract() -> None:
    assert set(Inventory.model_fields) == {*PROMISED, "substance", "reason", "moved_kg", "statement"}
    assert set(Step.model_fields) == {"step", "symbol", "value", "unit", "method", "reference"}
    assert set(Contribution.model_fields) == {
        "input", "instrument", "standard_uncertainty", "sensitivity", "contribution_kg", "kind", "declared",
    }  # fmt: skip
    assert set(InputUsed.model_fields) >= {"value", "age_s", "source", "quality"}
    assert set(SubstanceTotal.model_fields) == {
        "substance", "mass_kg", "mass_uncertainty_kg", "vessels", "missing", "complete",
    }  # fmt: skip


def test_unknown_is_null_and_unasked_is_absent() -> None:
    answer = json.loads(Inventory(status="unmeasured", mass_kg=float("nan")).model_dump_json())
    assert answer["mass_kg"] is None and answer["vapour_mass_kg"] is None
    assert not {"working", "budget", "statement", "reason", "vessel", "at"} & set(answer)
    asked = json.loads(Inventory(status="measured", working=(), budget=()).model_dump_json())
    assert (asked["working"], asked["budget"]) == ([], [])


def test_warning_has_a_code_of_the_contract() -> None:
    assert WarningSaid(code="roof_landing_zone", detail="a").code == "roof_landing_zone"
    with pytest.raises(ValidationError):
        WarningSaid(code="all_is_well", detail="a")  # type: ignore[arg-type]
