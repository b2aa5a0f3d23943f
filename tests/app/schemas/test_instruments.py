"""Instruments, sources, ages and assumptions say what the contract lets them say."""

from __future__ import annotations

from typing import Any

import pytest

from app.schemas.instruments import LONGEST_AGE_S, UNTIL_REPLACED, Assumptions, Instruments, MaxAge
from app.schemas.types import Body


class Holder(Body):
    """The parts of a vessel that this is about."""

    instruments: Instruments = {}
    max_age_s: MaxAge | None = None
    assumed: Assumptions = {}


def test_longest_age_is_35_days() -> None:
    assert LONGEST_AGE_S == 3_024_000


@pytest.mark.parametrize("age", [900, 3_024_000, {"level_m": 900, "observed_density_kg_m3": None},
                                 {"free_water_level_m": 1e8}, {}])  # fmt: skip
def test_age_is_taken(refusals: Any, age: Any) -> None:
    assert refusals(Holder, {"max_age_s": age}) == {}


@pytest.mark.parametrize("quantity", sorted(UNTIL_REPLACED))
def test_laboratory_and_free_water_hold_until_replaced(refusals: Any, quantity: str) -> None:
    assert refusals(Holder, {"max_age_s": {quantity: None}}) == {}


@pytest.mark.parametrize("quantity", ["level_m", "ullage_m", "pressure_kpa", "liquid_temperature_c", "weighed_mass_kg"])
def test_fast_quantities_do_not(refusals: Any, quantity: str) -> None:
    assert refusals(Holder, {"max_age_s": {quantity: None}}) == {f"/max_age_s/{quantity}": "impossible"}
    assert refusals(Holder, {"max_age_s": {quantity: 3_024_001}}) == {f"/max_age_s/{quantity}": "out_of_range"}


@pytest.mark.parametrize(
    ("part", "place", "code"),
    [
        ({"max_age_s": 0}, "/max_age_s", "out_of_range"),
        ({"max_age_s": 3_024_001}, "/max_age_s", "out_of_range"),
        ({"max_age_s": "900"}, "/max_age_s", "wrong_type"),
        ({"max_age_s": {"depth_m": 900}}, "/max_age_s/depth_m", "not_one_of"),
        ({"max_age_s": {"level_m": -1}}, "/max_age_s/level_m", "out_of_range"),
        ({"instruments": {"depth_m": {}}}, "/instruments/depth_m", "not_one_of"),
        ({"instruments": {"level_m": {"random": -0.1}}}, "/instruments/level_m/random", "out_of_range"),
        ({"instruments": {"level_m": {"local": 0.1}}}, "/instruments/level_m/local", "conflicting"),
        ({"instruments": {"capacity_pct": {"offset": 0.1}}}, "/instruments/capacity_pct/offset", "conflicting"),
        ({"instruments": {"level_m": {"bias": 1}}}, "/instruments/level_m/bias", "unknown_field"),
        ({"assumed": {"pressure_kpa": {}}}, "/assumed/pressure_kpa/value", "missing"),
        ({"assumed": {"pressure_kpa": {"value": -200}}}, "/assumed/pressure_kpa/value", "out_of_range"),
        ({"assumed": {"liquid_temperature_c": {"value": 1e6}}}, "/assumed/liquid_temperature_c/value", "out_of_range"),
        ({"assumed": {"capacity_pct": {"value": 1}}}, "/assumed/capacity_pct", "not_one_of"),
    ],
)  # fmt: skip
def test_part_is_refused(refusals: Any, part: dict[str, Any], place: str, code: str) -> None:
    assert refusals(Holder, part) == {place: code}


def test_parts_of_the_contract_are_taken(refusals: Any) -> None:
    document = {
        "instruments": {
            "level_m": {
                "random": 0.001, "systematic": 0.002, "offset": -0.011,
                "calibrated_at": "2026-03-14T14:00:00+01:00",
            },
            "capacity_pct": {"systematic": 0.05, "local": 0.02, "local_span_m": 2},
        },
        "assumed": {"pressure_kpa": {"value": 0.0, "standard_uncertainty": 0.2}},
    }  # fmt: skip
    assert refusals(Holder, document) == {}
