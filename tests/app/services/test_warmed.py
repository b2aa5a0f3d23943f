"""A warm tape and a warm reference point: what they add to a level, and that a dip then agrees with a gauge."""

from __future__ import annotations

from typing import Any

import pytest

from app.services.compile import CompiledVessel
from app.services.warmed import Temperatures, as_shown, correction
from tests.app.services.worked import GAS_OIL, TANK, answer, compiled, masses

STEEL = 1.1e-5  # 1/K, of a tape: common practice
TAPED: dict[str, Any] = {"instruments": {"level_m": {"expansion_per_k": STEEL}}}
HUNG: dict[str, Any] = {
    "gauging": {"reference_height_m": 20.0, "reference_on": "shell"}, "shell": {"expansion_per_k": 1.116e-5},
}  # fmt: skip
WARM = Temperatures(313.15, 303.15, 298.15)


def test_a_tape_that_dips_has_the_liquids_temperature() -> None:
    assert correction(compiled(TANK, **TAPED), "level_m", "", 10.0, WARM) == (pytest.approx(10.0 * STEEL * 20.0), 0.0)
    assert correction(compiled(TANK), "level_m", "", 10.0, WARM) == (0.0, 0.0)
    cold = {"instruments": {"level_m": {"expansion_per_k": STEEL, "at_temperature_c": 15.0}}}
    assert correction(compiled(TANK, **cold), "level_m", "", 10.0, WARM)[0] == pytest.approx(10.0 * STEEL * 25.0)


def test_a_tape_that_hangs_has_the_spaces_temperature_and_takes_away() -> None:
    vessel = compiled(TANK, gauging={"reference_height_m": 20.0}, instruments={"ullage_m": {"expansion_per_k": STEEL}})
    assert correction(vessel, "ullage_m", "", 14.0, WARM) == (pytest.approx(-6.0 * STEEL * 10.0), 0.0)


@pytest.mark.parametrize(
    ("carrier", "warmer"), [("shell", 7.0 / 8.0 * 25.0 + 10.0 / 8.0), ("still_pipe", 25.0), ("ground", 0.0)]
)
def test_a_reference_point_rises_with_what_carries_it(carrier: str, warmer: float) -> None:
    vessel = compiled(TANK, **(HUNG | {"gauging": {"reference_height_m": 20.0, "reference_on": carrier}}))
    expected = 20.0 * 1.116e-5 * warmer
    assert correction(vessel, "ullage_m", "", 14.0, WARM) == (0.0, pytest.approx(expected, abs=1e-15))
    assert correction(vessel, "level_m", "", 14.0, WARM) == (0.0, 0.0)


def test_20_metres_and_20_kelvin_are_four_and_a_half_millimetres() -> None:
    """Recomputed from linear expansion of carbon steel, 1.116e-5 1/K: 4.464 mm."""
    vessel = compiled(TANK, **HUNG)
    assert correction(vessel, "ullage_m", "", 14.0, Temperatures(308.15, 308.15, 308.15))[1] == pytest.approx(0.004464)


def level(vessel: CompiledVessel, row: dict[str, Any]) -> float:
    return float(masses(vessel, row).state.level[0])


def test_a_level_of_an_inventory_is_the_corrected_one() -> None:
    row = {"level_m": 10.0, "liquid_temperature_c": 40.0, "ambient_temperature_c": 25.0}
    assert level(compiled(TANK, **TAPED), row) == pytest.approx(10.0 + 10.0 * STEEL * 20.0, rel=1e-14)
    assert level(compiled(TANK), row) == 10.0
    plain = answer(compiled(TANK, GAS_OIL), row)["mass_kg"]
    assert answer(compiled(TANK, GAS_OIL, **TAPED), row)["mass_kg"] == pytest.approx(plain * (1.0 + STEEL * 20.0))


def test_an_ullage_and_a_dip_of_one_level_agree_when_both_are_corrected() -> None:
    """The level stands at 6 m; the shell is 20 K warm, the reference point 4.464 mm higher than measured cold."""
    vessel = compiled(TANK, **HUNG)
    warm = {"liquid_temperature_c": 35.0, "ambient_temperature_c": 35.0}
    assert level(vessel, {"ullage_m": 14.004464} | warm) == pytest.approx(6.0, abs=1e-12)


def test_pitfall_10_ullage_needs_the_reference_height_of_this_tank() -> None:
    assert answer(compiled(TANK), {"ullage_m": 5.0, "liquid_temperature_c": 20.0})["status"] == "unmeasured"
    low, high = (compiled(TANK, gauging={"reference_height_m": height}) for height in (14.9, 15.0))
    row = {"ullage_m": 5.0, "liquid_temperature_c": 20.0}
    assert level(high, row) - level(low, row) == pytest.approx(0.1, abs=1e-12)


@pytest.mark.parametrize("quantity", ["level_m", "ullage_m"])
def test_what_an_instrument_shows_is_the_correction_undone(quantity: str) -> None:
    tapes = {name: {"expansion_per_k": STEEL} for name in ("level_m", "ullage_m")}
    vessel = compiled(TANK, **(HUNG | {"instruments": tapes}))
    for wanted in (0.3, 6.0, 14.9):
        shown = as_shown(vessel, quantity, "", wanted, WARM)
        read = shown if quantity == "level_m" else 20.0 - shown
        assert read + sum(correction(vessel, quantity, "", read, WARM)) == pytest.approx(wanted, abs=1e-12)
        assert read != wanted
    assert as_shown(compiled(TANK, gauging={"reference_height_m": 20.0}), quantity, "", 6.0, WARM) in (6.0, 14.0)
