"""A refusal is a place, a code and a sentence with the unit and the limit, and never the input."""

from __future__ import annotations

import json
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from pydantic import ValidationError

from app.schemas.errors import code_of, explain, field_of, unit_of
from app.schemas.reading import Reading
from app.schemas.substance import Substance
from app.schemas.vessel import Vessel

READING = {"vessel": "tk-1", "taken_at": "2026-03-14T06:00:00Z", "level_m": 1.0}


def told(document: dict[str, Any]) -> list[tuple[str, str, str]]:
    with pytest.raises(ValidationError) as refused:
        Reading.model_validate_json(json.dumps(document))
    return explain(refused.value)


def test_limit_is_named_with_its_unit() -> None:
    assert told({**READING, "liquid_temperature_c": 1e6}) == [
        ("/liquid_temperature_c", "out_of_range", "liquid_temperature_c is at most 1000 °C.")
    ]
    assert told({**READING, "liquid_temperature_c": -300}) == [
        ("/liquid_temperature_c", "out_of_range", "liquid_temperature_c is at least -273.15 °C.")
    ]
    assert told({**READING, "observed_density_kg_m3": 0}) == [
        ("/observed_density_kg_m3", "out_of_range", "observed_density_kg_m3 is at least 0.001 kg/m³.")
    ]


@pytest.mark.parametrize(
    ("change", "code", "detail"),
    [
        ({"pressure_kpa": float("nan")}, "not_finite", "pressure_kpa is a finite number, in kPa."),
        ({"pressure_kpa": "12"}, "wrong_type", "pressure_kpa is a number, in kPa."),
        ({"empty": 1}, "wrong_type", "empty is true or false."),
        ({"colour": 1}, "unknown_field", "colour is no field of this body."),
        ({"taken_at": None}, "not_an_instant", None),
        ({"vessel": "TK"}, "wrong_form", None),
        ({"source": "s" * 64}, "wrong_length", "source has at most 63 characters."),
        ({"observed_density_by": "eye"}, "not_one_of", "observed_density_by is one of 'digital' or 'hydrometer'."),
    ],
)
def test_each_kind_has_a_code_and_a_sentence(change: dict[str, Any], code: str, detail: str | None) -> None:
    (one,) = told({**READING, **change})
    assert one[:2] == (f"/{next(iter(change))}", code)
    assert detail is None or one[2] == detail
    assert one[2].endswith(".") and "Input" not in one[2] and "^" not in one[2]


def test_every_mistake_is_told() -> None:
    found = told({**READING, "level_m": "x", "liquid_temperature_c": 1e6, "sediment_water_pct": -1})
    assert [pointer for pointer, _, _ in found] == ["/level_m", "/liquid_temperature_c", "/sediment_water_pct"]


def test_choice_leaves_no_tag_in_the_pointer() -> None:
    document = {"name": "a", "substance": "b", "shape": {"kind": "sphere", "diameter_m": -1}}
    with pytest.raises(ValidationError) as refused:
        Vessel.model_validate_json(json.dumps(document))
    assert [one[:2] for one in explain(refused.value)] == [("/shape/diameter_m", "out_of_range")]


def test_list_of_one_bad_element_is_one_mistake() -> None:
    rows = [[0, 1], [1, "much"]]
    document = {"name": "a", "substance": "b", "shape": {"kind": "capacity_table", "rows": rows}}
    with pytest.raises(ValidationError) as refused:
        Vessel.model_validate_json(json.dumps(document))
    assert [one[:2] for one in explain(refused.value)] == [("/shape/rows/1/1", "wrong_type")]


def test_broken_json_is_one_mistake() -> None:
    with pytest.raises(ValidationError) as refused:
        Substance.model_validate_json(b'{"name": ')
    assert explain(refused.value) == [("", "malformed_json", "The body cannot be read as JSON.")]


SECRET = "Xq7-never-said-again"


@settings(max_examples=50, derandomize=True, deadline=None)
@given(st.sampled_from([name for name in Reading.model_fields if name != "source"]))
def test_input_is_never_repeated(name: str) -> None:
    for value in (SECRET, [SECRET], {"a": SECRET}, 917_364_528_190.5, -917_364_528_190.5):
        for one in told({**READING, name: value}) if name != "sample" or value != SECRET else []:
            assert SECRET not in one[2] and "917364528190" not in one[2]


def test_key_that_is_no_name_is_not_repeated() -> None:
    (one,) = told({**READING, "x\n<script>": 1})
    assert one == ("", "unknown_field", "The body has a field that it does not know.")


def test_names_of_fields_codes_and_units() -> None:
    assert field_of("/vapour_composition/nitrogen") == "vapour_composition.nitrogen"
    assert field_of("") == ""
    assert code_of("float_type") == "wrong_type"
    assert code_of("table_falls") == "table_falls"
    assert unit_of("level_m") == "m"
