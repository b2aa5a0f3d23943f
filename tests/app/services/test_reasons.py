"""Why a mass is doubtful, and why there is none: codes, names, values and limits."""

from __future__ import annotations

import pytest

from app.services.explain import answers
from tests.app.services.worked import (
    GAS_READ,
    HYDROGEN,
    OIL_READ,
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


def test_two_sources_without_an_order_are_said() -> None:
    measured = masses(compiled(TANK), OIL_READ)
    measured.chosen["level"].contenders[:] = 2
    assert "two_sources" in codes(answers(measured)[0])
    ordered = masses(compiled(TANK, sources=[{"source": "radar"}]), OIL_READ)
    ordered.chosen["level"].contenders[:] = 2
    assert "two_sources" not in codes(answers(ordered)[0])
