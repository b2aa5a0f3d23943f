"""Errors bear the name of their cause: what vessels share is one error, and what two days do not share is two."""

from __future__ import annotations

import pytest

from app.services.parts import at_row
from tests.app.services.worked import GAS_READ, HYDROGEN, LPG_READ, PROPANE, RECEIVER, SPHERE, Body, compiled, masses

AIR = "barometric_pressure_kpa_abs"
HIGH_PLACE = {"elevation_m": 2_250.0, "barometer_uncertainty_kpa": 0.7}


def air_of(taken_at: str, name: str = "v-1", **row: float) -> str:
    """The name of the error of the atmosphere's pressure in a reading."""
    vessel = compiled(RECEIVER, HYDROGEN, site=HIGH_PLACE, name=name)
    (part,) = [one for one in masses(vessel, GAS_READ | row | {"taken_at": taken_at}).parts if one.quantity == AIR]
    return part.name(0)


def test_the_weather_is_shared_by_the_vessels_of_a_site_and_not_by_two_days() -> None:
    morning, minutes_later, tomorrow = "2026-03-13T05:57:00Z", "2026-03-13T06:02:00Z", "2026-03-14T05:57:00Z"
    assert air_of(morning) == air_of(minutes_later, "v-2")
    assert air_of(morning) != air_of(tomorrow)


def test_a_barometers_error_is_that_of_its_reading() -> None:
    morning = "2026-03-13T06:00:00Z"
    read = air_of(morning, barometric_pressure_kpa_abs=77.0)
    assert read == air_of(morning, "v-2", barometric_pressure_kpa_abs=77.0)
    assert read != air_of(morning)


@pytest.mark.parametrize(("row", "air"), [({}, 0.7e3), ({"pressure_kpa": None, "pressure_kpa_abs": 760.0}, 0.0)])
def test_a_gauge_pressure_is_checked_for_saturation_with_the_weather(row: Body, air: float) -> None:
    """√(0.3² + 0.4² + 0.7²) kPa of a gauge; of an absolute transmitter its own 0.5 kPa."""
    exact = {"pressure_kpa": {"random": 0.3, "systematic": 0.4}}
    read = {name: value for name, value in (LPG_READ | row).items() if value is not None}
    state = masses(compiled(SPHERE, PROPANE, site=HIGH_PLACE, instruments=exact), read).state
    assert at_row(state.pressure_uncertainty, 0) == pytest.approx((0.5e3**2 + air**2) ** 0.5, rel=1e-12)
