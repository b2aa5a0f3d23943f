"""What a row is, what it rests on, and why it has no mass: names, values and limits."""

from __future__ import annotations

import pytest

from app.services.explain import answers, inputs_read, read_at
from tests.app.services.worked import (
    BULLET,
    GAS_READ,
    HYDROGEN,
    LPG_READ,
    OIL_READ,
    PROPANE,
    RECEIVER,
    TANK,
    Body,
    answer,
    codes,
    compiled,
    masses,
)

TABLE: Body = {"kind": "capacity_table", "rows": [[0.5, 300.0], [14.0, 9800.0]]}
BLANKET: Body = {"vapour_space": {"kind": "blanketed", "blanket": "nitrogen"}}


@pytest.mark.parametrize(
    ("shape", "row", "code", "said"),
    [
        (TANK, {"level_m": 15.2}, "outside_vessel", ["level_m is 15.2 m", "from 0 to 15 m"]),
        (TABLE, {"level_m": 0.31}, "outside_table", ["level_m is 0.31 m", "from 0.5 to 14 m"]),
        (TANK, {"free_water_level_m": 8.5}, "outside_vessel", ["free_water_level_m is 8.5 m", "level_m is 8.231 m"]),
        (TANK, {"level_m": None}, "input_missing", ["level_m", "3600 s"]),
        (TANK, {"level_m": None, "ullage_m": 2.0}, "input_missing", ["reference_height_m", "not given"]),
        (TANK, {"liquid_temperature_c": None}, "input_missing", ["liquid_temperature_c"]),
    ],
)
def test_a_tank_without_a_mass_names_the_value_and_the_limit(
    shape: Body, row: Body, code: str, said: list[str]
) -> None:
    body = {name: value for name, value in (OIL_READ | row).items() if value is not None}
    found = answer(compiled(shape), body)
    assert found["status"] == "unmeasured"
    assert found["mass_kg"] is None
    assert found["mass_uncertainty_kg"] is None
    assert found["reason"]["code"] == code
    for words in said:
        assert words in found["reason"]["detail"]


@pytest.mark.parametrize(
    ("row", "code", "said"),
    [
        ({"vapour_temperature_c": 700.0}, "outside_method", ["at 700 °C", "hold from"]),
        ({"vapour_temperature_c": -200.0}, "guard_refused", ["at -200 °C", "of its critical density"]),
        ({"pressure_kpa": 390000.0}, "guard_refused", ["at 25 °C", "of its critical density"]),
        ({"pressure_kpa": None}, "input_missing", ["pressure_kpa"]),
        ({"vapour_temperature_c": None}, "input_missing", ["vapour_temperature_c"]),
    ],
)
def test_a_gas_without_a_mass_names_the_value_and_the_limit(row: Body, code: str, said: list[str]) -> None:
    body = {name: value for name, value in (GAS_READ | row).items() if value is not None}
    found = answer(compiled(RECEIVER, HYDROGEN), body)
    assert found["reason"]["code"] == code
    for words in said:
        assert words in found["reason"]["detail"]
    assert "nan" not in found["reason"]["detail"]


def test_a_blanketed_tank_needs_its_pressure_and_says_so() -> None:
    found = answer(compiled(TANK, **BLANKET), OIL_READ)
    assert found["reason"] == {
        "code": "input_missing",
        "detail": found["reason"]["detail"],
    }
    assert "pressure_kpa" in found["reason"]["detail"]
    assert answer(compiled(TANK, **BLANKET), OIL_READ | {"pressure_kpa": 2.0})["status"] == "measured"


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


def test_no_ambient_temperature_is_said_and_is_uncertain() -> None:
    found = answer(compiled(TANK), {"level_m": 8.0, "liquid_temperature_c": 18.0}, budget=True)
    assert "input_assumed" in codes(found)
    spread = [line["standard_uncertainty"] for line in found["budget"] if line["input"] == "ambient_temperature_c"]
    assert spread == [10.0]


def test_an_atmosphere_that_nobody_gave_is_said_where_it_matters() -> None:
    gas, tank = compiled(RECEIVER, HYDROGEN, site={}), compiled(TANK, site={})
    assert "atmosphere_assumed" in codes(answer(gas, GAS_READ))
    assert "atmosphere_assumed" not in codes(answer(tank, OIL_READ))
    assert "atmosphere_assumed" not in codes(answer(gas, GAS_READ | {"barometric_pressure_kpa_abs": 100.1}))
    assert "atmosphere_assumed" not in codes(answer(compiled(RECEIVER, HYDROGEN), GAS_READ))


def test_an_uncertain_input_makes_an_uncertain_mass() -> None:
    found = answer(compiled(TANK), OIL_READ | {"quality": {"level_m": "uncertain"}})
    assert found["status"] == "uncertain"
    assert "input_uncertain" in codes(found)
    unused = answer(
        compiled(TANK, shell={"insulated": True}), OIL_READ | {"quality": {"ambient_temperature_c": "uncertain"}}
    )
    assert unused["status"] == "measured"


def test_two_sources_without_an_order_are_said() -> None:
    measured = masses(compiled(TANK), OIL_READ)
    measured.chosen["level"].contenders[:] = 2
    assert "two_sources" in codes(answers(measured)[0])
    ordered = masses(compiled(TANK, sources=[{"source": "radar"}]), OIL_READ)
    ordered.chosen["level"].contenders[:] = 2
    assert "two_sources" not in codes(answers(ordered)[0])


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
