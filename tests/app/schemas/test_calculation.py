"""Calculations take a vessel with nothing stored, and a network whose streams end somewhere."""

from __future__ import annotations

from typing import Any

import pytest

from app.schemas.calculation import BalanceCalculation, InventoryCalculation

CALCULATION: dict[str, Any] = {
    "vessel": {"shape": {"kind": "box", "length_m": 6, "width_m": 2.5, "height_m": 2}},
    "substance": {
        "name": "oil",
        "liquid": {"model": "expansivity", "density_kg_m3": 840, "expansivity_per_k": 8.3e-4},
    },
    "readings": [{"level_m": 1.2, "liquid_temperature_c": 21, "barometric_pressure_kpa_abs": 100.9}],
}


@pytest.mark.parametrize("change", [{}, {"site": {"elevation_m": 12}}, {"readings": []}, {"readings": [{}]}])
def test_calculation_is_taken(refusals: Any, change: dict[str, Any]) -> None:
    assert refusals(InventoryCalculation, {**CALCULATION, **change}) == {}


@pytest.mark.parametrize(
    ("change", "place", "code"),
    [
        ({"readings": [{"vessel": "tk-12", "level_m": 1}]}, "/readings/0/vessel", "unknown_field"),
        ({"readings": [{"level_m": 1}, {"level_m": 1e6}]}, "/readings/1/level_m", "out_of_range"),
        ({"readings": [{"level_m": 1, "ullage_m": 1}]}, "/readings/0/ullage_m", "one_of"),
        ({"readings": {"level_m": 1}}, "/readings", "wrong_type"),
        ({"site": {"time_zone": "UTC"}}, "/site/time_zone", "unknown_field"),
        ({"substance": {"name": "oil"}}, "/substance", "missing"),
        ({"vessel": {"shape": {"kind": "cube"}}}, "/vessel/shape/kind", "not_one_of"),
        ({"readings": [{"level_m": 1}] * 10_001}, "/readings", "wrong_length"),
    ],
)
def test_calculation_is_refused(refusals: Any, change: dict[str, Any], place: str, code: str) -> None:
    assert refusals(InventoryCalculation, {**CALCULATION, **change}) == {place: code}


ONE: dict[str, Any] = {"id": "1", "from": "boundary:feed", "to": "A", "value": 101.9, "random": 1.0,
       "systematic": [{"instrument": "meter M1", "value": 0.5}]}  # fmt: skip
TWO: dict[str, Any] = {"id": "2", "from": "A", "to": "boundary:product", "value": None}


def test_network_is_taken(refusals: Any) -> None:
    assert refusals(BalanceCalculation, {"nodes": ["A"], "streams": [ONE, TWO], "false_alarm_rate": 0.01}) == {}


@pytest.mark.parametrize(
    ("document", "place", "code"),
    [
        ({"nodes": [], "streams": [ONE]}, "/nodes", "wrong_length"),
        ({"nodes": ["A", "A"], "streams": [ONE]}, "/nodes", "twice"),
        ({"nodes": ["A", "boundary:x"], "streams": [ONE]}, "/nodes/1", "impossible"),
        ({"nodes": ["A"], "streams": [ONE, ONE]}, "/streams", "twice"),
        ({"nodes": ["A"], "streams": [ONE, {**TWO, "from": "B"}]}, "/streams/1/from", "unknown_node"),
        ({"nodes": ["A"], "streams": [{**ONE, "to": "B"}]}, "/streams/0/to", "unknown_node"),
        ({"nodes": ["A"], "streams": [{**ONE, "from": "A"}]}, "/streams/0/to", "impossible"),
        ({"nodes": ["A"], "streams": [{**TWO, "value": 1}]}, "/streams/0/random", "missing"),
        ({"nodes": ["A"], "streams": [{**ONE, "random": -1}]}, "/streams/0/random", "out_of_range"),
        (
            {"nodes": ["A"], "streams": [{**ONE, "systematic": ONE["systematic"] * 2}]},
            "/streams/0/systematic",
            "twice",
        ),
        ({"nodes": ["A"], "streams": [ONE], "false_alarm_rate": 1}, "/false_alarm_rate", "out_of_range"),
    ],
)
def test_network_is_refused(refusals: Any, document: dict[str, Any], place: str, code: str) -> None:
    assert refusals(BalanceCalculation, document) == {place: code}
