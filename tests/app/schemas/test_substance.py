"""A substance has a liquid, a vapour, or both, by the models that this version computes."""

from __future__ import annotations

from typing import Any

import pytest
from pydantic import ValidationError

from app.schemas.errors import explain
from app.schemas.substance import Substance
from app.schemas.types import canonical

LIQUID = {"model": "expansivity", "density_kg_m3": 840.0, "expansivity_per_k": 8.3e-4}
PROPANE = [{"id": "propane", "mole_fraction": 1.0}]
VAPOUR = {"model": "virial", "components": PROPANE}


def test_example_of_the_contract_is_taken() -> None:
    substance = Substance.model_validate_json(
        '{"name": "gas oil, house grade", "liquid": {"model": "expansivity", "density_kg_m3": 840.0,'
        '"density_uncertainty_kg_m3": 1.0, "at_temperature_c": 15, "at_pressure_kpa_abs": 101.325,'
        '"expansivity_per_k": 8.3e-4, "compressibility_per_kpa": 7.5e-7}}'
    )
    assert substance.liquid is not None and substance.liquid.compressibility_per_kpa == 7.5e-7
    assert substance.vapour is None


def test_defaults_are_those_of_the_contract() -> None:
    substance = Substance.model_validate({"name": "a", "liquid": LIQUID, "vapour": VAPOUR})
    assert substance.liquid is not None and substance.vapour is not None
    assert substance.liquid.at_temperature_c == 15.0
    assert substance.liquid.at_pressure_kpa_abs is None and substance.liquid.density_uncertainty_kg_m3 is None
    assert (substance.vapour.form, substance.vapour.terms, substance.vapour.coefficients) == ("density", 3, None)


def test_expansivity_is_a_number_or_a_list() -> None:
    liquid = {**LIQUID, "expansivity_per_k": [8.3e-4, 1.2e-6]}
    substance = Substance.model_validate({"name": "a", "liquid": liquid})
    assert substance.liquid is not None and substance.liquid.expansivity_per_k == (8.3e-4, 1.2e-6)
    assert '"expansivity_per_k":[0.00083,1.2e-06]' in canonical(substance)


def test_measured_coefficients_are_numbers_or_rows() -> None:
    measured = {
        **VAPOUR, "coefficients": "measured", "second_virial_cm3_mol": -388.0,
        "third_virial_cm6_mol2": [[0, 21000.0], [50, 19000]],
    }  # fmt: skip
    substance = Substance.model_validate({"name": "a", "vapour": measured})
    assert substance.vapour is not None and substance.vapour.second_virial_cm3_mol == -388.0
    assert substance.vapour.third_virial_cm6_mol2 == ((0.0, 21000.0), (50.0, 19000.0))


@pytest.mark.parametrize("model", ["magic", "Petroleum", "", None, 3])
def test_model_that_is_not_computed_is_one_refusal_that_names_those_that_are(model: Any) -> None:
    with pytest.raises(ValidationError) as refused:
        Substance.model_validate({"name": "a", "liquid": {"model": model, "commodity": "crude"}})
    assert explain(refused.value) == [
        (
            "/liquid", "not_computed",
            "This version computes liquid.model expansivity, petroleum, light_hydrocarbon, water, density_table, "
            "ethanol_water, and no other.",
        )
    ]  # fmt: skip


MEASURED = {**VAPOUR, "coefficients": "measured"}


@pytest.mark.parametrize(
    ("part", "place", "code"),
    [
        ({}, "", "missing"),
        ({"liquid": None}, "", "missing"),
        ({"liquid": "water"}, "/liquid", "wrong_type"),
        ({"liquid": {**LIQUID, "density_kg_m3": 0}}, "/liquid/density_kg_m3", "out_of_range"),
        ({"liquid": {**LIQUID, "density_kg_m3": 1e6}}, "/liquid/density_kg_m3", "out_of_range"),
        ({"liquid": {**LIQUID, "density_kg_m3": float("nan")}}, "/liquid/density_kg_m3", "not_finite"),
        ({"liquid": {**LIQUID, "density_kg_m3": 10**400}}, "/liquid/density_kg_m3", "wrong_type"),
        (
            {"liquid": {**LIQUID, "density_uncertainty_kg_m3": 840}},
            "/liquid/density_uncertainty_kg_m3",
            "impossible",
        ),
        ({"liquid": {**LIQUID, "expansivity_per_k": "8e-4"}}, "/liquid/expansivity_per_k", "wrong_type"),
        ({"liquid": {**LIQUID, "expansivity_per_k": []}}, "/liquid/expansivity_per_k", "wrong_length"),
        ({"liquid": {**LIQUID, "expansivity_per_k": [1e-3, None]}}, "/liquid/expansivity_per_k/1", "wrong_type"),
        ({"liquid": {**LIQUID, "expansivity_per_k": 8.3}}, "/liquid/expansivity_per_k", "out_of_range"),
        ({"liquid": {**LIQUID, "compressibility_per_kpa": -1e-7}}, "/liquid/compressibility_per_kpa", "out_of_range"),
        ({"vapour": {**VAPOUR, "model": "ideal"}}, "/vapour", "not_computed"),
        ({"vapour": {**VAPOUR, "components": []}}, "/vapour/components", "wrong_length"),
        ({"vapour": {**VAPOUR, "components": PROPANE * 2}}, "/vapour/components", "fractions_sum"),
        (
            {"vapour": {**VAPOUR, "components": [{"id": "propane", "mole_fraction": 0.5}] * 2}},
            "/vapour/components",
            "twice",
        ),
        (
            {"vapour": {**VAPOUR, "components": [{"id": "propane", "mole_fraction": 0.9}]}},
            "/vapour/components",
            "fractions_sum",
        ),
        (
            {"vapour": {**VAPOUR, "components": [{**PROPANE[0], "molar_mass_g_mol": 44.1}]}},
            "/vapour/components/0/acentric_factor",
            "missing",
        ),
        ({"vapour": {**VAPOUR, "terms": 4}}, "/vapour/terms", "not_one_of"),
        ({"vapour": {**VAPOUR, "terms": True}}, "/vapour/terms", "not_one_of"),
        ({"vapour": {**VAPOUR, "form": "temperature"}}, "/vapour/form", "not_one_of"),
        ({"vapour": {**VAPOUR, "second_virial_cm3_mol": -1}}, "/vapour/second_virial_cm3_mol", "conflicting"),
        ({"vapour": MEASURED}, "/vapour/second_virial_cm3_mol", "missing"),
        (
            {"vapour": {**MEASURED, "second_virial_cm3_mol": -1}},
            "/vapour/third_virial_cm6_mol2",
            "missing",
        ),
        (
            {"vapour": {**MEASURED, "terms": 2, "second_virial_cm3_mol": -1, "third_virial_cm6_mol2": 1}},
            "/vapour/third_virial_cm6_mol2",
            "conflicting",
        ),
        (
            {"vapour": {**MEASURED, "terms": 2, "second_virial_cm3_mol": [[10, -1], [0, -2]]}},
            "/vapour/second_virial_cm3_mol",
            "table_falls",
        ),
    ],
)
def test_substance_is_refused(refusals: Any, part: dict[str, Any], place: str, code: str) -> None:
    assert refusals(Substance, {"name": "a", **part}) == {place: code}
