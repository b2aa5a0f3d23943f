"""A reading holds what some vessel could have; of a batch the good rows are kept and the bad ones named."""

from __future__ import annotations

import json
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from pydantic import ValidationError

from app.schemas.reading import Reading, ReadingBatch, Values, validate_batch, validate_rows
from app.schemas.types import MEASURED, QUANTITIES, canonical

AT = "2026-03-14T06:00:00+01:00"
ROW = {"vessel": "tk-12", "taken_at": AT, "level_m": 8.231}

# One value that every quantity takes, and one or two beyond what any vessel could have.
LIMITS: dict[str, tuple[float, list[float]]] = {
    "level_m": (12.5, [-11, 151]),
    "ullage_m": (2.5, [-11, 151]),
    "liquid_volume_m3": (2500.0, [-2e4, 2e7]),
    "liquid_volume_pct": (45.0, [-11, 151]),
    "differential_pressure_kpa": (61.0, [-1001, 1.1e5]),
    "weighed_mass_kg": (18000.0, [-2e5, 2e9]),
    "free_water_level_m": (0.02, [-11, 151]),
    "liquid_temperature_c": (-162.0, [-273.16, 1e6]),
    "ambient_temperature_c": (-40.0, [-101, 101]),
    "vapour_temperature_c": (17.0, [-273.16, 1001]),
    "pressure_kpa": (20_000.0, [-121, 1.1e6]),
    "pressure_kpa_abs": (0.0, [-0.001, 1.1e6]),
    "barometric_pressure_kpa_abs": (100.9, [39.9, 1009]),
    "observed_density_kg_m3": (13_595.0, [0, -1, 25_001]),
    "observed_density_temperature_c": (20.0, [-273.16, 1001]),
    "observed_density_pressure_kpa_abs": (101.325, [-1, 1.1e6]),
    "sediment_water_pct": (0.0, [-0.001, 100.1]),
    "roof_load_kg": (0.0, [-1, 1.1e7]),
}


def test_limits_are_tested_for_every_quantity() -> None:
    assert set(LIMITS) == set(MEASURED)
    assert set(QUANTITIES) == set(MEASURED) | {"liquid_composition", "vapour_composition", "empty"}
    assert set(QUANTITIES) <= set(Values.model_fields)


@pytest.mark.parametrize("name", MEASURED)
def test_quantity_keeps_its_limits(refusals: Any, name: str) -> None:
    good, bad = LIMITS[name]
    assert refusals(Values, {name: good}) == {}
    for beyond in bad:
        assert refusals(Values, {name: beyond}) == {f"/{name}": "out_of_range"}
    wrong: list[tuple[Any, str]] = [(float("nan"), "not_finite"), (float("inf"), "not_finite"), ("1", "wrong_type")]
    for value, code in [*wrong, (True, "wrong_type"), ([1], "wrong_type")]:
        assert refusals(Values, {name: value}) == {f"/{name}": code}


def test_null_is_the_same_as_leaving_out() -> None:
    reading = Reading.model_validate({**ROW, "liquid_temperature_c": None})
    assert reading.named() == ["level_m"]
    assert reading.source == "" and reading.quality == "good"


@pytest.mark.parametrize(
    "change",
    [
        {"quality": "uncertain"},
        {"quality": {"level_m": "bad", "liquid_composition": "good"}},
        {"corrects": "2026-03-14T05:00:02.417311Z"},
        {"level_m": None, "empty": True},
        {"vapour_composition": {"nitrogen": 0.01, "hydrogen": 0.99}},
        {"sample": "lab 7/1", "sample_holds_from": "2026-03-14T00:00:00Z", "density_basis": "dry"},
        {"ambient_temperature_c": 4},
        {"vessel": None, "level_m": None, "ambient_temperature_c": 4, "barometric_pressure_kpa_abs": 101},
    ],
)
def test_reading_is_taken(refusals: Any, change: dict[str, Any]) -> None:
    assert refusals(Reading, {**ROW, **change}) == {}


@pytest.mark.parametrize(
    ("change", "place", "code"),
    [
        ({"taken_at": "2026-03-14T06:00:00"}, "/taken_at", "no_offset"),
        ({"taken_at": 1773464400}, "/taken_at", "not_an_instant"),
        ({"vessel": "Tk-12"}, "/vessel", "wrong_form"),
        ({"vessel": None}, "/vessel", "missing"),
        ({"level_m": None}, "", "no_value"),
        ({"level_m": None, "empty": False}, "", "no_value"),
        ({"ullage_m": 3}, "/ullage_m", "one_of"),
        ({"pressure_kpa": 3, "pressure_kpa_abs": 104}, "/pressure_kpa_abs", "one_of"),
        ({"barometric_pressure_kpa_abs": 101}, "/barometric_pressure_kpa_abs", "quantity_of_site"),
        ({"quality": "fine"}, "/quality", "not_one_of"),
        ({"quality": 192}, "/quality", "not_one_of"),
        ({"quality": {"level_m": "fine"}}, "/quality/level_m", "not_one_of"),
        ({"quality": {"depth": "good"}}, "/quality/depth", "not_one_of"),
        ({"liquid_composition": {"ethanol": 0.5, "water": 0.6}}, "/liquid_composition", "fractions_sum"),
        ({"liquid_composition": {"ethanol": 2}}, "/liquid_composition/ethanol", "out_of_range"),
        ({"liquid_composition": [0.5, 0.5]}, "/liquid_composition", "wrong_type"),
        ({"sample": "a\u0000"}, "/sample", "wrong_form"),
        ({"source": "a\nb"}, "/source", "wrong_form"),
        ({"density": 1}, "/density", "unknown_field"),
    ],
)
def test_reading_is_refused(refusals: Any, change: dict[str, Any], place: str, code: str) -> None:
    assert refusals(Reading, {**ROW, **change}) == {place: code}


def ten_thousand() -> list[dict[str, Any]]:
    return [{**ROW, "vessel": f"tk-{at % 40}", "level_m": at / 1000} for at in range(10_000)]


BAD: list[tuple[int, Any, str, str]] = [
    (0, {"liquid_temperature_c": 1e6}, "liquid_temperature_c", "out_of_range"),
    (7, {"level_m": float("nan")}, "level_m", "not_finite"),
    (8, {"level_m": float("inf")}, "level_m", "not_finite"),
    (9, {"level_m": "8.2"}, "level_m", "wrong_type"),
    (10, {"taken_at": "2026-03-14T06:00:00"}, "taken_at", "no_offset"),
    (11, {"taken_at": 1773464400}, "taken_at", "not_an_instant"),
    (4_999, {"vessel": "TK"}, "vessel", "wrong_form"),
    (5_000, {"vapour_composition": {"nitrogen": 0.5}}, "vapour_composition", "fractions_sum"),
    (5_001, {"vapour_composition": {"Nitrogen": 1.0}}, "vapour_composition.Nitrogen", "wrong_form"),
    (6_000, {"quality": {"level_m": "fine"}}, "quality.level_m", "not_one_of"),
    (6_001, {"colour": 1}, "colour", "unknown_field"),
    (7_000, {"vessel": None}, "vessel", "missing"),
    (7_001, {"level_m": None}, "", "no_value"),
    (8_000, {"source": None}, "source", "wrong_type"),
    (8_001, {"sample": "\x00"}, "sample", "wrong_form"),
    (9_998, {"ullage_m": 1}, "ullage_m", "one_of"),
    (9_999, {"sediment_water_pct": -1}, "sediment_water_pct", "out_of_range"),
]


def test_17_bad_rows_of_10_000_are_named_and_the_others_kept() -> None:
    rows = ten_thousand()
    for at, change, _, _ in BAD:
        rows[at].update(change)
    kept, errors = validate_batch(json.dumps({"readings": rows}).encode())
    assert [(one.index, one.field, one.code) for one in errors] == [(at, field, code) for at, _, field, code in BAD]
    assert len(BAD) == 17 and len(kept) == 9_983
    assert {at for at, _ in kept} == set(range(10_000)) - {at for at, _, _, _ in BAD}
    assert all(reading.level_m == at / 1000 for at, reading in kept)


def test_good_batch_is_taken_whole() -> None:
    kept, errors = validate_batch(json.dumps({"readings": ten_thousand()}).encode())
    assert len(kept) == 10_000 and errors == []


def test_rows_that_are_no_objects_are_named() -> None:
    kept, errors = validate_rows([ROW, None, 3, "x", [], dict(ROW)])
    assert [at for at, _ in kept] == [0, 5]
    assert [(one.index, one.field, one.code) for one in errors] == [(at, "", "wrong_type") for at in (1, 2, 3, 4)]


@pytest.mark.parametrize(
    "text",
    [b"", b"{", b"[]", b"3", b'"x"', b"{}", b'{"readings": {}}', b'{"readings": null}', b'{"rows": []}',
     b'{"readings": [], "more": 1}', b'{"readings": [{"level_m": "\\ud800"}]}', b"\xff\xfe"],
)  # fmt: skip
def test_body_that_is_no_batch_is_refused(text: bytes) -> None:
    with pytest.raises(ValidationError):
        validate_batch(text)


def test_empty_batch_is_taken() -> None:
    assert validate_batch(b'{"readings": []}') == ([], [])


VALUES = st.fixed_dictionaries(
    {},
    optional={
        name: st.floats(1.0, 90.0)
        for name in MEASURED
        if name not in ("ullage_m", "pressure_kpa_abs", "barometric_pressure_kpa_abs")
    },
)


@settings(max_examples=50, derandomize=True, deadline=None)
@given(VALUES)
def test_values_come_back_to_the_last_bit(values: dict[str, float]) -> None:
    read = Values.model_validate_json(json.dumps(values))
    assert set(read.named()) == set(values)
    assert all(getattr(read, name) == value for name, value in values.items())
    assert json.loads(canonical(read)) == values


ANYTHING = st.recursive(
    st.none() | st.booleans() | st.integers() | st.floats() | st.text(max_size=20),
    lambda below: st.lists(below, max_size=4) | st.dictionaries(st.text(max_size=12), below, max_size=4),
    max_leaves=12,
)


@settings(max_examples=50, derandomize=True, deadline=None)
@given(st.dictionaries(st.sampled_from(sorted(Reading.model_fields)), ANYTHING, max_size=8))
def test_whatever_is_sent_is_kept_or_named(row: dict[str, Any]) -> None:
    kept, errors = validate_rows([row, ROW])
    assert [at for at, _ in kept] == ([1] if errors else [0, 1])
    assert {one.index for one in errors} <= {0}


def test_batch_is_documented() -> None:
    schema = ReadingBatch.model_json_schema()
    assert "Reading" in schema["$defs"] and "°C" in json.dumps(schema, ensure_ascii=False)
