"""Why a mass is doubtful, and why there is none: codes, names, values and limits."""

from __future__ import annotations

from functools import lru_cache

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from app.services.compile import CompiledVessel
from app.services.explain import answers
from models.saturation import SaturationColumns
from tests.app.services.worked import (
    BULLET,
    GAS_READ,
    HYDROGEN,
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


# Propane's vapour pressure by its reference equation (E. W. Lemmon et al., 2009; CoolProp 8.0.0): 795.36 kPa at
# 18.1 °C, 904.51 kPa at 23 °C. A wide barometer and wide gauges, so that 2u can be had by hand.
AT_18, AT_23, AIR = 795.36, 904.51, 95.0
HIGH_SITE: Body = {"atmospheric_pressure_kpa_abs": AIR, "barometer_uncertainty_kpa": 3.0}
GAUGES: Body = {
    "pressure_kpa": {"random": 4.0, "systematic": 0.0}, "pressure_kpa_abs": {"random": 4.0, "systematic": 0.0},
    "liquid_temperature_c": {"random": 0.0, "systematic": 0.0},
}  # fmt: skip
TEMPERATURES: Body = {"level_m": 1.4, "liquid_temperature_c": 18.1, "vapour_temperature_c": 23.0}
LOW, HIGH = "saturation_low", "saturation_high"
SLIPS = {
    "pressure_kpa": "fits if the transmitter reads absolute pressure",
    "pressure_kpa_abs": "fits if the transmitter reads gauge pressure",
}


def detail(inventory: Body, code: str) -> str:
    return next(str(one["detail"]) for one in inventory["warnings"] if one["code"] == code)


def bullet_read(row: Body) -> Body:
    vessel = compiled(BULLET, PROPANE, site=HIGH_SITE, instruments=GAUGES)
    return answer(vessel, {name: value for name, value in (TEMPERATURES | row).items() if value is not None})


def test_a_saturation_warning_says_everything_that_made_it() -> None:
    """700 kPa under 795.36 kPa by 95.36 kPa; 2u = 2 √(4² + 3² + 0.14²) kPa = 10.0 kPa of gauge, barometer, equation."""
    said = detail(bullet_read({"pressure_kpa": 605.0}), LOW)
    for words in ("700 kPa absolute", "95.", "kPa below", "795.4", "18.1 °C of the liquid", "904.5", "23 °C of the va",
                  "2u = 10.00", "u = 5 kPa in the pressure", "0 K at 23.3", "0.13", "gauge and absolute"):  # fmt: skip
        assert words in said, words
    alone = detail(bullet_read({"pressure_kpa": 605.0, "vapour_temperature_c": None}), LOW)
    assert "of the liquid" in alone and "of the vapour;" not in alone and "nan" not in alone


@pytest.mark.parametrize(
    ("quantity", "number", "code", "slips"),
    [
        ("pressure_kpa", AT_18 + 40.0, HIGH, True),
        ("pressure_kpa", AT_18 - 8.0, None, False),  # and as a gauge's it agrees as well: 882 kPa
        ("pressure_kpa", AT_23 + 8.0, HIGH, True),  # taken as absolute it is 8 of 10 kPa above the interval
        ("pressure_kpa", AT_23 + 12.0, HIGH, False),
        ("pressure_kpa", AT_18 - AIR - 40.0, LOW, False),
        ("pressure_kpa_abs", AT_18 - AIR + 30.0, LOW, True),
        ("pressure_kpa_abs", AT_18 - AIR - 12.0, LOW, False),
        ("pressure_kpa_abs", AT_23 + AIR, HIGH, False),
    ],
)
def test_a_slip_of_gauge_and_absolute_is_recognised_where_the_number_fits_as_the_other(
    quantity: str, number: float, code: str | None, slips: bool
) -> None:
    found = bullet_read({quantity: number})
    assert {LOW, HIGH} & codes(found) == ({code} if code else set())
    if code is None:
        return
    said = detail(found, code)
    assert (SLIPS[quantity] in said) == slips
    if slips:
        other = ({*SLIPS} - {quantity}).pop()
        assert f"{number:.5g} kPa" in said and f"whether {quantity} was meant as {other}" in said
    assert found["mass_kg"] is not None  # nothing is refused for it, and nothing corrected
    assert [one["value"] for one in found["inputs"] if one["quantity"] == quantity] == [number]


def test_an_assumed_pressure_can_be_a_slip_too() -> None:
    given = {"pressure_kpa_abs": {"value": AT_18 - AIR + 30.0, "standard_uncertainty": 1.0}}
    vessel = compiled(BULLET, PROPANE, site=HIGH_SITE, instruments=GAUGES, assumed=given)
    assert SLIPS["pressure_kpa_abs"] in detail(answer(vessel, TEMPERATURES), LOW)


def test_of_a_gas_alone_and_of_a_blanket_nothing_is_said_about_slips() -> None:
    gas = answer(compiled(RECEIVER, HYDROGEN), GAS_READ | {"pressure_kpa": 10.0})
    assert not {LOW, HIGH} & codes(gas)
    tank = compiled(BULLET, PROPANE, site=HIGH_SITE, **BLANKET)
    lost = detail(answer(tank, TEMPERATURES | {"pressure_kpa_abs": 850.0}), LOW)
    assert "23 °C of the vapour" in lost and "blanket" in lost
    assert "of the liquid" not in lost and "transmitter" not in lost


SUBSTANCES: dict[str, tuple[dict[str, float], float, float]] = {  # composition, kg/m³, g/mol
    "propane": ({"propane": 1.0}, 507.0, 44.1),
    "n-butane": ({"n-butane": 1.0}, 584.0, 58.1),
    "ammonia": ({"ammonia": 1.0}, 618.0, 17.0),
    "lpg": ({"propane": 0.6, "n-butane": 0.4}, 540.0, 49.7),
}


@lru_cache
def bullet_of(name: str) -> tuple[CompiledVessel, SaturationColumns]:
    composition, density, _ = SUBSTANCES[name]
    components = [{"id": one, "mole_fraction": share} for one, share in composition.items()]
    body = {
        "name": name, "liquid": {"model": "expansivity", "density_kg_m3": density, "expansivity_per_k": 2e-3,
                                 "compressibility_per_kpa": 3e-6},
        "vapour": {"model": "virial", "components": components},
    }  # fmt: skip
    vessel = compiled({"kind": "box", "length_m": 10.0, "width_m": 3.0, "height_m": 1.0}, body)
    return vessel, SaturationColumns.from_compositions([composition])


@settings(max_examples=50, deadline=None, derandomize=True)
@given(
    name=st.sampled_from(sorted(SUBSTANCES)), celsius=st.floats(-50.0, 90.0), fill=st.floats(0.01, 0.98),
    times=st.one_of(st.none(), st.floats(0.1, 3.0)), warmer=st.one_of(st.none(), st.floats(-8.0, 15.0)),
)  # fmt: skip
def test_a_vessel_with_liquid_is_never_refused_for_its_vapour(
    name: str, celsius: float, fill: float, times: float | None, warmer: float | None
) -> None:
    """Whatever is read of its pressure and of its gas: what cannot be computed is left out, or bracketed."""
    vessel, saturation = bullet_of(name)
    pressure = float(saturation.pressure(celsius + 273.15)[0])
    row: Body = {"level_m": fill, "liquid_temperature_c": celsius}
    row |= {} if times is None else {"pressure_kpa_abs": times * pressure / 1e3}
    row |= {} if warmer is None else {"vapour_temperature_c": celsius + warmer}
    found = answer(vessel, row)
    assert found["status"] != "unmeasured", found["reason"]


@pytest.mark.parametrize(
    ("fill", "status", "code"), [(0.99, "measured", "vapour_left_out"), (0.5, "uncertain", "guard_refused")]
)
def test_a_vapour_that_is_refused_is_left_out_where_it_is_small_and_else_bracketed(
    fill: float, status: str, code: str
) -> None:
    """Propane at 88 °C: half its critical density at 36.3 bar (reference equation), and near its spinodal."""
    vessel, _ = bullet_of("propane")
    found = answer(vessel, {"level_m": fill, "liquid_temperature_c": 88.0})
    assert found["status"] == status
    assert code in codes(found)
    if status == "uncertain":
        assert "halfway" in next(one["detail"] for one in found["warnings"] if one["code"] == code)
        steps = {one["symbol"]: one["value"] for one in answer(vessel, {
            "level_m": fill, "liquid_temperature_c": 88.0}, working=True)["working"]}  # fmt: skip
        assert steps["Z"] == pytest.approx(0.4)  # of one to four times the ideal gas: 1/2.5
        density = steps["P"] * steps["m"] / (0.4 * 8.314462618 * 361.15)
        assert steps["ρ_v"] == pytest.approx(density, rel=1e-8)
        assert steps["M"] == pytest.approx(steps["M_liquid"] + steps["ρ_v"] * steps["V_v"], rel=1e-12)
