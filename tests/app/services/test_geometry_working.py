"""The geometry's steps: the head of the liquid by its courses, the trade's shell factor, a table as it was made."""

from __future__ import annotations

import math
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from app.services.working import working_steps
from tests.app.services.worked import BULLET, TANK, compiled, masses

EXACT = 1e-12
COURSES = [[2.5, 0.022], [2.5, 0.018], [10.0, 0.010]]
CRUDE = {"name": "crude", "liquid": {"model": "petroleum", "commodity": "crude", "density_kg_m3": 850.0}}
ROOF = {"mass_kg": 1.2e5, "lands_at_m": 1.8, "floats_at_m": 2.1}


def steps_of(vessel: Any, row: dict[str, Any]) -> dict[str, float]:
    return {step["symbol"]: step["value"] for step in working_steps(masses(vessel, row), 0)}


@settings(max_examples=30, deadline=None, derandomize=True)
@given(fill=st.floats(0.2, 0.9), water=st.sampled_from([0.0, 0.8]), celsius=st.floats(5.0, 35.0))
def test_the_head_of_the_liquid_is_redone_from_its_courses(fill: float, water: float, celsius: float) -> None:
    """ρ S(h|h_w) by thin hoops, course by course: the wall at z widens by ρ g (h − z) D/(2 E t)."""
    vessel = compiled(TANK, CRUDE, shell={"courses": COURSES})
    row = {"level_m": fill * 15.0, "liquid_temperature_c": celsius, "ambient_temperature_c": celsius,
           "free_water_level_m": water}  # fmt: skip
    s = steps_of(vessel, row)
    stiffness, foot, room = math.pi * 9.80665 * 30.0**3 / (8.0 * 207e9), 0.0, 0.0
    for height, thickness in COURSES:
        low, high = max(foot, water), max(foot + height, water)
        room += (max(s["h"] - low, 0.0) ** 2 - max(s["h"] - high, 0.0) ** 2) / thickness
        foot += height
    assert s["ΔV_head"] == pytest.approx(s["K"] * s["ρ"] * stiffness * room, rel=1e-11)
    assert s["ρ_t"] == 0.0
    plain = compiled(TANK, CRUDE)
    assert s["GOV"] == pytest.approx(steps_of(plain, row)["GOV"] + s["ΔV_head"], rel=EXACT)


def test_a_table_that_holds_the_head_without_courses_says_that_it_stands_as_made() -> None:
    table = {"kind": "capacity_table", "of": "vertical_cylinder", "diameter_m": 30.0,
             "rows": [[0.0, 0.0], [15.0, 10602.9]], "head_included_at_kg_m3": 850.0}  # fmt: skip
    vessel = compiled(table, CRUDE)
    found = {step["symbol"]: step for step in working_steps(
        masses(vessel, {"level_m": 8.0, "liquid_temperature_c": 15.0, "ambient_temperature_c": 15.0}), 0
    )}  # fmt: skip
    assert found["ρ_t"]["value"] == 850.0
    assert "no courses are given" in found["ρ_t"]["method"]


@pytest.mark.parametrize("shape", [TANK, BULLET], ids=["upright", "lying"])
def test_the_trades_shell_factor_is_that_of_upright_cylinders(shape: dict[str, Any]) -> None:
    """C_TSh = (1 + α ΔT)² of API MPMS 12.1.1 for an upright shell: 129 and 60 °F, 6.2e-6 /°F give 1.0008558."""
    vessel = compiled(
        shape, CRUDE,
        shell={"expansion_per_k": 6.2e-6 * 1.8, "at_temperature_c": (60.0 - 32.0) / 1.8, "insulated": True},
    )  # fmt: skip
    s = steps_of(vessel, {"level_m": 1.4, "liquid_temperature_c": (129.0 - 32.0) / 1.8})
    if shape is TANK:
        assert s["K"] == pytest.approx(1.0008558, abs=5e-8)
    else:
        assert abs(s["K"] - 1.0008558) > 1e-5


def test_snow_on_a_roof_displaces_and_is_no_part_of_the_table() -> None:
    """50 t of water on a roof in oil of 850 kg/m³ displace 58.8 m³: recomputed, common practice."""
    table = {"kind": "capacity_table", "of": "vertical_cylinder", "diameter_m": 30.0,
             "rows": [[0.0, 0.0], [15.0, 10602.9]], "roof_deducted_at_kg_m3": 850.0}  # fmt: skip
    vessel = compiled(table, CRUDE, floating_roof=ROOF)
    row = {"level_m": 9.0, "liquid_temperature_c": 15.0, "ambient_temperature_c": 15.0}
    bare, snowed = steps_of(vessel, row), steps_of(vessel, row | {"roof_load_kg": 50_000.0})
    assert bare["ΔV_roof"] == pytest.approx(0.0, abs=1e-9)
    assert snowed["ΔV_roof"] == pytest.approx(-50_000.0 / 850.0, rel=EXACT)
    assert snowed["W"] == bare["W"] + 50_000.0
    assert snowed["GOV"] == pytest.approx(bare["GOV"] - 58.8235, abs=1e-4)
    assert bare["M"] - snowed["M"] == pytest.approx(50_000.0, rel=1e-9)
