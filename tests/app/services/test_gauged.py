"""A level by a volume, a percentage or a head: arithmetic by hand, and slopes of the whole chain."""

from __future__ import annotations

import math

import numpy as np
import pytest

from app.services.compile import CompiledVessel, stack
from app.services.gauged import HEAD, levels_per_unit, state_density, volume_level
from app.services.measure import Measured
from tests.app.services.worked import GAS_OIL, HYDROGEN, RECEIVER, Body, compiled, masses

GRAVITY = 9.80665  # m/s², 3rd CGPM, 1901
BOX: Body = {"kind": "box", "length_m": 10.0, "width_m": 10.0, "height_m": 5.0}
CURVED: Body = {**GAS_OIL, "liquid": {**GAS_OIL["liquid"], "expansivity_per_k": [8.3e-4, 4.0e-6]}}
STILL: Body = {
    "name": "gas oil", "liquid": {"model": "expansivity", "density_kg_m3": 800.0, "expansivity_per_k": 0.0}
}  # fmt: skip
READ: Body = {
    HEAD: 15.0, "liquid_temperature_c": 41.0, "ambient_temperature_c": 41.0, "observed_density_kg_m3": 800.0,
    "observed_density_temperature_c": 15.0,
}  # fmt: skip


def box(substance: Body = STILL, **vessel: object) -> CompiledVessel:
    given: Body = {"gauging": {"tap_m": 0.2}, "vapour_space": {"kind": "open"}, "shell": {"expansion_per_k": 0.0}}
    return compiled(BOX, substance, **(given | vessel))


@pytest.mark.parametrize(
    ("quantity", "value", "level"),
    [("liquid_volume_m3", 250.0, 2.5), ("liquid_volume_m3", 0.0, 0.0), ("liquid_volume_m3", 500.0, 5.0),
     ("liquid_volume_pct", 40.0, 2.0), ("liquid_volume_pct", 100.0, 5.0)],
)  # fmt: skip
def test_an_indicated_volume_is_the_level_that_holds_it(quantity: str, value: float, level: float) -> None:
    found = volume_level(box(), quantity)
    assert found is not None and found(value) == pytest.approx(level, abs=1e-12)


@pytest.mark.parametrize(("value", "outside"), [(-0.1, True), (500.1, True), (499.9, False)])
def test_what_no_vessel_holds_is_a_level_outside_it(value: float, outside: bool) -> None:
    found = volume_level(box(), "liquid_volume_m3")
    assert found is not None
    assert (not 0.0 <= found(value) <= 5.0) == outside


def test_other_quantities_and_vessels_without_a_level_have_no_such_level() -> None:
    assert volume_level(box(), "level_m") is None
    assert volume_level(compiled(RECEIVER, HYDROGEN), "liquid_volume_pct") is None


def test_a_head_weighs_what_stands_above_the_tap() -> None:
    # 15,000 Pa × 100 m² / 9.80665 m/s² = 152,957.4 kg above the tap; 0.2 m × 100 m² × 800 kg/m³ below it.
    measured = masses(box(), {HEAD: 15.0, "liquid_temperature_c": 15.0})
    assert float(measured.result["mass"][0]) == pytest.approx(152_957.43 + 16_000.0, abs=0.01)
    assert float(measured.state.level[0]) == pytest.approx(0.2 + 15_000.0 / (GRAVITY * 800.0), rel=1e-12)


def test_one_unit_of_each_is_so_much_level() -> None:
    vessel = box()
    measured = masses(vessel, {HEAD: 15.0, "liquid_temperature_c": 15.0})
    found = levels_per_unit((vessel,), stack((vessel,)), measured.state, measured.result)
    assert float(found["liquid_volume_m3"][0]) == pytest.approx(0.01, rel=1e-12)  # 1 m³ on 100 m²
    assert float(found["liquid_volume_pct"][0]) == pytest.approx(0.05, rel=1e-12)  # 5 m³ on 100 m²
    assert float(found[HEAD][0]) == pytest.approx(1000.0 / (GRAVITY * 800.0), rel=1e-12)


def test_the_density_of_a_state_is_that_of_its_temperature() -> None:
    # β = 8.3e-4 + 4e-6 (T − 15 °C), 26 K up from the sample: ln(ρ/800) = −(8.3e-4 × 26 + 4e-6 × 26²/2).
    vessel = box({**CURVED, "liquid": {**CURVED["liquid"], "compressibility_per_kpa": 0.0}})
    expected = 800.0 * math.exp(-(8.3e-4 * 26.0 + 4e-6 * 338.0))
    found = state_density((vessel,), stack((vessel,)), masses(vessel, READ).state)
    assert float(found[0]) == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize("substance", [GAS_OIL, CURVED], ids=["constant", "polynomial"])
@pytest.mark.parametrize(
    ("input_name", "field", "step"),
    [("density", "observed_density_kg_m3", 0.01), ("liquid_temperature", "liquid_temperature_c", 0.01),
     ("density_temperature", "observed_density_temperature_c", 0.01)],
)  # fmt: skip
def test_the_slopes_of_a_mass_by_head_are_those_of_the_chain(
    substance: Body, input_name: str, field: str, step: float
) -> None:
    vessel = box(substance)
    low, high = (float(masses(vessel, READ | {field: READ[field] + d}).result["mass"][0]) for d in (-step, step))
    found = float(masses(vessel, READ).result.sensitivities[input_name][0])
    assert found == pytest.approx((high - low) / (2.0 * step), rel=1e-5, abs=1e-4)


def test_a_share_of_the_expansion_moves_a_mass_by_head_as_the_chain_does() -> None:
    def read(share: float) -> float:
        liquid = CURVED["liquid"] | {"expansivity_per_k": [b * share for b in CURVED["liquid"]["expansivity_per_k"]]}
        return float(masses(box({**CURVED, "liquid": liquid}), READ).result["mass"][0])

    found = float(masses(box(CURVED), READ).result.sensitivities["expansion"][0])
    assert found == pytest.approx((read(1.001) - read(0.999)) / 0.002, rel=1e-5)


def test_a_row_by_head_leaves_its_neighbours_by_level_alone() -> None:
    level = {name: value for name, value in READ.items() if name != HEAD} | {"level_m": 2.0}
    vessel = box(GAS_OIL)

    def slopes(measured: Measured, row: int) -> list[float]:
        return [float(column[row]) for _, column in sorted(measured.result.sensitivities.items()) if len(column) > row]

    both, alone = masses(vessel, READ, level), masses(vessel, level)
    assert float(both.result["mass"][1]) == float(alone.result["mass"][0])
    assert np.allclose(slopes(both, 1), slopes(alone, 0), rtol=1e-14, atol=0.0)
