"""A site names a real zone, one atmosphere, and limits that mean something."""

from __future__ import annotations

from typing import Any

import pytest

from app.schemas.site import Conditions, Site

SITE = {"name": "Northbank terminal", "time_zone": "Europe/Oslo"}


def test_defaults_are_those_of_the_contract() -> None:
    site = Site.model_validate(SITE)
    assert site.day_starts_at == "06:00"
    assert (site.base_temperature_c, site.base_pressure_kpa_abs) == (15.0, 101.325)
    assert (site.gas_base_temperature_c, site.barometer_uncertainty_kpa) == (0.0, 1.0)
    assert (site.false_alarms_per_month, site.window_nights, site.close_delay_s) == (0.5, 30, 1800.0)
    assert (site.elevation_m, site.atmospheric_pressure_kpa_abs, site.imbalance_limit) == (None, None, None)


@pytest.mark.parametrize("zone", ["Europe/Oslo", "UTC", "America/Argentina/Buenos_Aires", "Etc/GMT+3"])
def test_zone_is_taken(zone: str) -> None:
    assert Site.model_validate({**SITE, "time_zone": zone}).time_zone == zone


@pytest.mark.parametrize(
    ("change", "place", "code"),
    [
        ({"time_zone": "Europe/Atlantis"}, "/time_zone", "unknown_zone"),
        ({"time_zone": "localtime"}, "/time_zone", "unknown_zone"),
        ({"time_zone": "right/Europe/Oslo"}, "/time_zone", "unknown_zone"),
        ({"time_zone": "../../etc/passwd"}, "/time_zone", "wrong_form"),
        ({"time_zone": "Europe"}, "/time_zone", "unknown_zone"),
        ({"time_zone": "+01:00"}, "/time_zone", "wrong_form"),
        ({"day_starts_at": "24:00"}, "/day_starts_at", "wrong_form"),
        ({"day_starts_at": "6:00"}, "/day_starts_at", "wrong_form"),
        ({"elevation_m": 9000}, "/elevation_m", "out_of_range"),
        (
            {"elevation_m": 10, "atmospheric_pressure_kpa_abs": 101.0},
            "/atmospheric_pressure_kpa_abs",
            "one_of",
        ),
        ({"imbalance_limit": {}}, "/imbalance_limit", "missing"),
        ({"imbalance_limit": {"kg": -1}}, "/imbalance_limit/kg", "out_of_range"),
        ({"window_nights": 30.5}, "/window_nights", "wrong_type"),
        ({"false_alarms_per_month": 0}, "/false_alarms_per_month", "out_of_range"),
        ({"effective_from": "2026-03-14T06:00:00"}, "/effective_from", "no_offset"),
        ({"effective_from": 1773464400}, "/effective_from", "not_an_instant"),
        ({"name": None}, "/name", "wrong_type"),
    ],
)
def test_site_is_refused(refusals: Any, change: dict[str, Any], place: str, code: str) -> None:
    assert refusals(Site, {**SITE, **change}) == {place: code}


def test_conditions_need_nothing() -> None:
    assert Conditions.model_validate({}).base_temperature_c == 15.0
