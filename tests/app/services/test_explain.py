"""What a row is and what it rests on: values, sources and spreads."""

from __future__ import annotations

import pytest

from app.services.explain import inputs_read, read_at
from tests.app.services.worked import (
    BULLET,
    LPG_READ,
    OIL_READ,
    PROPANE,
    TANK,
    Body,
    answer,
    codes,
    compiled,
    masses,
)


def test_without_a_pressure_a_two_phase_vessel_is_saturated_at_its_liquid() -> None:
    row = {name: value for name, value in LPG_READ.items() if name != "pressure_kpa"}
    vessel = compiled(BULLET, PROPANE)
    found = answer(vessel, row, budget=True)
    bare = answer(vessel, {name: value for name, value in row.items() if name != "vapour_temperature_c"}, budget=True)
    assert found["mass_kg"] == bare["mass_kg"]
    assert "vapour_temperature_c" not in {entry["quantity"] for entry in found["inputs"]}
    assert 3.0 in {line["standard_uncertainty"] for line in found["budget"] if line["input"] == "vapour_temperature_c"}


def test_what_was_not_read_is_listed_as_assumed() -> None:
    vessel = compiled(TANK, assumed={"liquid_temperature_c": {"value": 18.0, "standard_uncertainty": 1.5}})
    found = answer(vessel, {"level_m": 8.0}, budget=True)
    listed = {entry["quantity"]: entry for entry in found["inputs"]}
    assert listed["liquid_temperature_c"] == {"quantity": "liquid_temperature_c", "value": 18.0, "quality": "assumed"}
    assert listed["free_water_level_m"] == {"quantity": "free_water_level_m", "value": 0.0, "quality": "assumed"}
    assert "input_assumed" in codes(found)
    lines = {line["input"]: line for line in found["budget"]}
    assert lines["liquid_temperature_c"]["standard_uncertainty"] == 1.5
    read = answer(vessel, {"level_m": 8.0, "liquid_temperature_c": 18.0})
    assert read["mass_kg"] == pytest.approx(found["mass_kg"], rel=1e-12)


@pytest.mark.parametrize(
    ("quantity", "wire", "spread"),
    [
        ("sediment_water_pct", {"sediment_water_pct": 0.3}, 0.1),
        ("pressure_kpa", {"pressure_kpa": 3.0}, 0.4),
        ("pressure_kpa_abs", {"pressure_kpa_abs": 104.0}, 0.4),
        ("ambient_temperature_c", {"ambient_temperature_c": 4.0}, 5.0),
        ("observed_density_kg_m3", {"observed_density_kg_m3": 851.0}, 2.0),
    ],
)
def test_an_assumed_value_counts_as_if_it_was_read(quantity: str, wire: Body, spread: float) -> None:
    row = {"level_m": 8.0, "liquid_temperature_c": 18.0}
    assumed = {quantity: {"value": wire[quantity], "standard_uncertainty": spread}}
    found = answer(compiled(TANK, assumed=assumed), row, budget=True)
    read = answer(compiled(TANK), row | wire)
    assert found["mass_kg"] == pytest.approx(read["mass_kg"], rel=1e-12)
    own = [line for line in found["budget"] if line["input"] == quantity]
    assert spread in [pytest.approx(line["standard_uncertainty"]) for line in own]


def test_an_uncertain_input_makes_an_uncertain_mass() -> None:
    found = answer(compiled(TANK), OIL_READ | {"quality": {"level_m": "uncertain"}})
    assert found["status"] == "uncertain"
    assert "input_uncertain" in codes(found)
    unused = answer(
        compiled(TANK, shell={"insulated": True}), OIL_READ | {"quality": {"ambient_temperature_c": "uncertain"}}
    )
    assert unused["status"] == "measured"


def test_dead_stock_is_mass_that_cannot_be_drawn() -> None:
    found = answer(compiled(TANK, dead_stock_m3=100.0), OIL_READ)
    assert found["available_mass_kg"] == pytest.approx(found["mass_kg"] - 100.0 * found["liquid_density_kg_m3"])
    assert answer(compiled(TANK, dead_stock_m3=1e6), OIL_READ)["available_mass_kg"] == 0.0


def test_what_counted_is_named_with_its_key() -> None:
    measured = masses(compiled(TANK), OIL_READ | {"taken_at": "2026-03-14T06:00:00Z"})
    found = {entry[0]: entry for entry in inputs_read(measured, 0)}
    assert found["level_m"][2] == 1_773_468_000_000_000
    assert found["level_m"][4] == 8.231
    assert read_at(measured, 0) == 1_773_468_000_000_000
    assert read_at(masses(compiled(TANK), {"liquid_temperature_c": 3.0}), 0) is None
