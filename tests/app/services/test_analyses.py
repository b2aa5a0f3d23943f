"""Analyses: of a liquid they make its density and its vapour pressure, of a vapour its series and its dew point."""

from __future__ import annotations

from typing import Any

import pytest

from tests.app.services.worked import SPHERE, answer, compiled, masses

PROPANE = [{"id": "propane", "mole_fraction": 1.0}]
VAPOUR = {"model": "virial", "components": PROPANE}
LPG: dict[str, Any] = {
    "name": "lpg", "liquid": {"model": "light_hydrocarbon", "components": PROPANE}, "vapour": VAPOUR,
}  # fmt: skip
READ: dict[str, Any] = {
    "level_m": 9.0, "liquid_temperature_c": 20.0, "ambient_temperature_c": 20.0, "vapour_temperature_c": 20.0,
}  # fmt: skip
BUTANE = {"liquid_composition": {"propane": 0.5, "n-butane": 0.5}}


def test_an_analysed_liquid_has_the_density_of_its_composition() -> None:
    """At 20 °C propane has 500.06 kg/m³, and half of it by moles with n-butane 544.61: CoolProp 8.0.0, multi-fluid."""
    plain, mixed = answer(compiled(SPHERE, LPG), READ), answer(compiled(SPHERE, LPG), READ | BUTANE)
    assert plain["liquid_density_kg_m3"] == pytest.approx(500.06, rel=2e-3)
    assert mixed["liquid_density_kg_m3"] == pytest.approx(544.61, rel=1e-3)


def test_what_boils_is_the_analysed_liquid() -> None:
    """Raoult's law at 20 °C: (8.365 + 2.077)/2 bar = 5.22 bar (saturation pressures by CoolProp 8.0.0)."""
    vessel = compiled(SPHERE, LPG)
    boils = masses(vessel, READ | BUTANE)
    assert boils.result["vapour_pressure"][0] == pytest.approx(5.221e5, rel=5e-3)
    assert masses(vessel, READ).result["vapour_pressure"][0] == pytest.approx(8.365e5, rel=2e-3)
    high = answer(vessel, READ | BUTANE | {"pressure_kpa_abs": 836.5})
    assert "saturation_high" in [one["code"] for one in high["warnings"]]


def test_a_vapour_that_alone_is_known_condenses_at_its_dew_pressure() -> None:
    """1/P = 0.5/8.365 + 0.5/2.077 bar: 3.33 bar at 20 °C, below the bubble pressure of the same numbers."""
    parts = [{"id": "propane", "mole_fraction": 0.5}, {"id": "n-butane", "mole_fraction": 0.5}]
    known = {"name": "lpg", "liquid": {"model": "light_hydrocarbon", "density_kg_m3": 545.0},
             "vapour": {"model": "virial", "components": parts}}  # fmt: skip
    found = masses(compiled(SPHERE, known), READ)
    assert found.result["vapour_pressure"][0] == pytest.approx(3.328e5, rel=5e-3)
    lighter = masses(compiled(SPHERE, known), READ | {"vapour_composition": {"propane": 0.8, "n-butane": 0.2}})
    assert lighter.result["vapour_pressure"][0] == pytest.approx(1.0 / (0.8 / 8.365e5 + 0.2 / 2.077e5), rel=5e-3)


def test_an_analysis_of_the_liquid_goes_before_one_of_the_vapour() -> None:
    both = READ | BUTANE | {"vapour_composition": {"propane": 0.8, "n-butane": 0.2}}
    assert masses(compiled(SPHERE, LPG), both).result["vapour_pressure"][0] == pytest.approx(5.221e5, rel=5e-3)


def test_an_analysis_that_the_method_cannot_take_leaves_the_vessel_unmeasured_and_says_why() -> None:
    found = answer(compiled(SPHERE, LPG), READ | {"liquid_composition": {"propane": 0.1, "helium": 0.9}})
    assert found["status"] == "unmeasured"
    said = found["reason"]["detail"]
    assert said.startswith("the substance's liquid model cannot take the analysis: ") and "helium" in said


def test_a_liquid_by_expansivity_keeps_its_density_and_boils_as_analysed() -> None:
    liquid = {"model": "expansivity", "density_kg_m3": 507.0, "expansivity_per_k": 3e-3}
    plain: dict[str, Any] = {**LPG, "liquid": liquid}
    vessel = compiled(SPHERE, plain)
    assert masses(vessel, READ | BUTANE).result["vapour_pressure"][0] == pytest.approx(5.221e5, rel=5e-3)
    same = answer(vessel, READ)["liquid_density_kg_m3"]
    assert answer(vessel, READ | BUTANE)["liquid_density_kg_m3"] == pytest.approx(same, rel=1e-12)
