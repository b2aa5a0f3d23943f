"""Candidates become a state: pressures, temperatures and samples as the chain takes them, by hand."""

from __future__ import annotations

import math

import numpy as np
import pytest

from app.services.measure import standard_density
from app.services.parts import at_row
from tests.app.services.plant import Plant
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
    compiled,
    masses,
)


def value(column: np.ndarray[tuple[int, ...], np.dtype[np.float64]]) -> float:
    return at_row(column, 0)


@pytest.mark.parametrize(
    ("site", "row", "pascal"),
    [
        ({"atmospheric_pressure_kpa_abs": 98.0}, {"pressure_kpa": 500.0}, 598_000.0),
        ({"atmospheric_pressure_kpa_abs": 98.0}, {"pressure_kpa_abs": 500.0}, 500_000.0),
        ({}, {"pressure_kpa": 500.0}, 601_325.0),
        ({}, {"pressure_kpa": 500.0, "barometric_pressure_kpa_abs": 96.5}, 596_500.0),
    ],
)
def test_a_gauge_pressure_stands_on_the_air(site: Body, row: Body, pascal: float) -> None:
    state = masses(compiled(RECEIVER, HYDROGEN, site=site), {"vapour_temperature_c": 20.0} | row).state
    assert value(state.pressure) == pytest.approx(pascal, rel=1e-12)


def test_pitfall_1_at_altitude_a_gauge_stands_on_a_thinner_air() -> None:
    """At 2,250 m ISO 2533 gives 101.325 × (1 − 0.0065 × 2250/288.15)^5.25588 = 77.08 kPa, not 101.325.

    Nitrogen at 500 kPa gauge and 25 °C: 577.08 kPa and 6.5282 kg/m³, where 601.325 kPa would be 6.8028 kg/m³, 4.2 %
    too much (R. Span et al., J. Phys. Chem. Ref. Data 29 (2000) 1361, by CoolProp 8.0.0).
    """
    nitrogen = {"name": "n2", "vapour": {"model": "virial", "components": [{"id": "nitrogen", "mole_fraction": 1.0}]}}
    row = {"vapour_temperature_c": 25.0, "pressure_kpa": 500.0}
    found = {}
    for name, site in (("mountain", {"elevation_m": 2250.0}), ("shore", {"elevation_m": 0.0})):
        vessel = compiled(RECEIVER, nitrogen, site=site, shell={"expansion_per_k": 0.0})
        found[name] = float(masses(vessel, row).result["mass"][0]) / 95.0
    assert found == pytest.approx({"mountain": 6.5282, "shore": 6.8028}, rel=2e-4)


def test_the_air_is_an_error_of_a_gauge_pressure_only() -> None:
    site = {"elevation_m": 0.0, "barometer_uncertainty_kpa": 0.7}
    for row, expected in (({"pressure_kpa": 500.0}, [700.0]), ({"pressure_kpa_abs": 600.0}, [])):
        measured = masses(compiled(RECEIVER, HYDROGEN, site=site), {"vapour_temperature_c": 20.0} | row)
        air = [value(part.sigma) for part in measured.parts if part.quantity == "barometric_pressure_kpa_abs"]
        assert air == pytest.approx(expected)


def test_a_vented_tank_is_at_the_pressure_of_the_air_within_its_valves() -> None:
    measured = masses(compiled(TANK), OIL_READ)
    assert value(measured.state.pressure) == value(measured.state.atmosphere)
    valves = [value(part.sigma) for part in measured.parts if part.name(0) == "pressure-open:tk-1"]
    assert valves == pytest.approx([200.0])  # 0.2 kPa, common practice
    read = masses(compiled(TANK), OIL_READ | {"pressure_kpa": 1.5})
    assert not [part for part in read.parts if part.name(0) == "pressure-open:tk-1"]


def test_an_ambient_temperature_that_nobody_reads_is_the_products() -> None:
    plain = {name: v for name, v in OIL_READ.items() if name != "ambient_temperature_c"}
    assert value(masses(compiled(TANK), plain).state.ambient_temperature) == pytest.approx(24.3 + 273.15)
    gas = {name: v for name, v in GAS_READ.items() if name != "ambient_temperature_c"}
    assert value(masses(compiled(RECEIVER, HYDROGEN), gas).state.ambient_temperature) == pytest.approx(298.15)


def test_a_sample_brings_its_own_state_and_else_the_base() -> None:
    full = OIL_READ | {"observed_density_pressure_kpa_abs": 150.0}
    state = masses(compiled(TANK), full).state
    assert [value(state.density), value(state.density_temperature), value(state.density_pressure)] == pytest.approx(
        [843.1, 294.15, 150_000.0]
    )
    bare = {name: v for name, v in OIL_READ.items() if name != "observed_density_temperature_c"}
    state = masses(compiled(TANK, site={"base_temperature_c": 20.0, "base_pressure_kpa_abs": 100.0}), bare).state
    assert [value(state.density_temperature), value(state.density_pressure)] == pytest.approx([293.15, 100_000.0])


def test_a_sample_of_a_boiling_liquid_was_under_its_vapour_pressure() -> None:
    row = LPG_READ | {"observed_density_kg_m3": 506.0, "observed_density_temperature_c": 20.0}
    state = masses(compiled(BULLET, PROPANE), row).state
    # propane at 20 °C: 8.3646 bar, Lemmon et al. 2009 by CoolProp 8.0.0
    assert value(state.density_pressure) == pytest.approx(8.3646e5, rel=3e-4)


def test_without_a_sample_the_substances_own_figure_counts_with_its_own_error() -> None:
    measured = masses(compiled(TANK), {"level_m": 8.0, "liquid_temperature_c": 20.0})
    assert value(measured.state.density) == 840.0
    own = [part for part in measured.parts if part.quantity == "density_kg_m3"]
    assert [(value(part.sigma), part.name(0)) for part in own] == [(1.0, "density:substance:gas-oil")]
    sampled = masses(compiled(TANK), OIL_READ)
    assert not [part for part in sampled.parts if part.quantity == "density_kg_m3"]


@pytest.mark.parametrize(("basis", "dry"), [("wet", 0.0), ("dry", 1.0), (None, 0.0)])
def test_a_sample_is_wet_unless_it_says_dry(basis: str | None, dry: float) -> None:
    row = OIL_READ | ({} if basis is None else {"density_basis": basis})
    state = masses(compiled(TANK), row).state
    assert value(state.density_is_dry) == dry
    assert value(state.sediment_water) == pytest.approx(0.004)


def test_free_water_that_was_never_read_is_none() -> None:
    plain = {name: v for name, v in OIL_READ.items() if name != "free_water_level_m"}
    measured = masses(compiled(TANK), plain)
    assert value(measured.state.water_level) == -math.inf
    assert measured.result["free_water_volume"][0] == 0.0


@pytest.mark.parametrize(
    ("row", "assumed"), [(LPG_READ, []), ({"level_m": 1.4, "liquid_temperature_c": 18.0, "pressure_kpa": 690.0}, [3.0])]
)
def test_a_vapour_temperature_that_nothing_reads_has_an_error_of_its_own(row: Body, assumed: list[float]) -> None:
    measured = masses(compiled(BULLET, PROPANE), row)
    own = [part for part in measured.parts if part.name(0) == "vapour-temperature-assumed:tk-1"]
    assert [value(part.sigma) for part in own] == assumed


def test_a_standard_density_carries_its_samples_errors() -> None:
    measured = masses(compiled(TANK), OIL_READ)
    found = standard_density(measured, 0)
    assert found.value == measured.result["standard_density"][0]
    # 0.25 K as a limit on the sample's thermometer, by β = 8.3e-4
    thermometer = [part for name, part in found.parts.items() if name.startswith("density-temperature:")]
    assert thermometer == pytest.approx([found.value * 8.3e-4 * 0.25 / 3.0**0.5], rel=1e-6)
    assert standard_density(masses(compiled(RECEIVER, HYDROGEN), GAS_READ), 0).parts == {}


def test_an_analysis_that_the_vapour_model_cannot_take_stops_its_own_vessel_and_no_other(plant: Plant) -> None:
    """A component that another substance gives in full, and one without fitted coefficients where these are asked."""
    full = {"id": "gas-x", "mole_fraction": 1.0, "molar_mass_g_mol": 40.0, "critical_temperature_k": 150.0,
            "critical_pressure_kpa_abs": 4_900.0, "acentric_factor": 0.0}  # fmt: skip
    nitrogen = [{"id": "nitrogen", "mole_fraction": 1.0}]
    given = {
        "other": {"model": "virial", "components": [full]},
        "plain": {"model": "virial", "components": nitrogen},
        "fitted": {"model": "virial", "components": nitrogen, "coefficients": "fitted"},
    }
    for name, vapour in given.items():
        plant.put("substance", name, {"name": name, "vapour": vapour})
        shape = {"kind": "fixed_volume", "volume_m3": 10.0}
        plant.put("vessel", f"r-{name}", {"name": name, "substance": name, "shape": shape})
        plant.read(f"r-{name}", "2026-03-14T06:00", pressure_kpa=900.0, vapour_temperature_c=20.0)
    for name in ("plain", "fitted"):
        plant.read(f"r-{name}", "2026-03-14T05:00", "lab", vapour_composition={"nitrogen": 0.9, "gas-x": 0.1})
    answers = {one["vessel"]: one for one in plant.inventory("2026-03-14T06:00")["vessels"]}
    assert answers["r-other"]["mass_kg"] > 0.0
    for name in ("r-plain", "r-fitted"):
        assert (answers[name]["status"], answers[name]["mass_kg"]) == ("unmeasured", None)
        assert answers[name]["reason"]["code"] == "outside_method"
        assert "gas-x" in answers[name]["reason"]["detail"]
    night = plant.close("2026-03-14")
    assert {one["vessel"] for one in night["vessels"]} == {"r-other", "r-plain", "r-fitted"}


@pytest.mark.parametrize(("level", "status"), [(2.98, "measured"), (1.4, "unmeasured")])
def test_beside_a_liquid_a_vapour_that_the_model_cannot_take_is_left_out_where_it_is_small(
    level: float, status: str
) -> None:
    """Of a full bullet 1.4 m³ are room: with twice the ideal gas, 27 kg/m³, 37 kg beside 52.6 t. Else it counts."""
    row = LPG_READ | {"level_m": level, "vapour_composition": {"propane": 0.9, "gas-x": 0.1}}
    found = answer(compiled(BULLET, PROPANE), row)
    assert found["status"] == status
    if status == "measured":
        assert found["mass_kg"] == found["liquid_mass_kg"]
        assert "gas-x" in next(one["detail"] for one in found["warnings"] if one["code"] == "vapour_left_out")
        assert answer(compiled(BULLET, PROPANE), row, budget=True, working=True)["vapour_mass_kg"] == 0.0
    else:
        assert found["reason"]["code"] == "outside_method" and "gas-x" in found["reason"]["detail"]
