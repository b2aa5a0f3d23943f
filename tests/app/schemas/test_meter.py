"""A meter's provings stand in order, and an error found comes with its uncertainty."""

from __future__ import annotations

from typing import Any

import pytest

from app.schemas.meter import Meter

FIRST = {"at": "2026-02-01T09:00:00+01:00", "systematic_pct": 0.05}
LATER = {"at": "2026-03-01T09:00:00+01:00", "as_found_pct": 0.12, "as_found_uncertainty_pct": 0.03}


def test_meter_is_taken(refusals: Any) -> None:
    meter = {"name": "line A", "random_pct": 0.03, "systematic_pct": 0.1, "provings": [FIRST, LATER]}
    assert refusals(Meter, meter) == {}
    assert refusals(Meter, {"name": "line A"}) == {}


@pytest.mark.parametrize(
    ("change", "place", "code"),
    [
        ({"name": None}, "/name", "wrong_type"),
        ({"random_pct": -0.1}, "/random_pct", "out_of_range"),
        ({"systematic_pct": 101}, "/systematic_pct", "out_of_range"),
        ({"provings": [LATER, FIRST]}, "/provings/1/at", "impossible"),
        ({"provings": [FIRST, FIRST]}, "/provings/1/at", "impossible"),
        ({"provings": [{"systematic_pct": 0.05}]}, "/provings/0/at", "missing"),
        ({"provings": [{**FIRST, "as_found_pct": 0.1}]}, "/provings/0/as_found_uncertainty_pct", "missing"),
        ({"provings": [{**FIRST, "as_found_uncertainty_pct": 0.1}]}, "/provings/0/as_found_pct", "missing"),
    ],
)
def test_meter_is_refused(refusals: Any, change: dict[str, Any], place: str, code: str) -> None:
    assert refusals(Meter, {"name": "line A", **change}) == {place: code}
