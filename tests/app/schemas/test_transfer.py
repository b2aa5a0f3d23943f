"""A transfer has two ends, one quantity, and progress that goes forward."""

from __future__ import annotations

import json
from typing import Any

import pytest
from pydantic import ValidationError

from app.schemas.transfer import Transfer, TransferBatch, validate_transfers
from app.schemas.types import canonical

# As the contract prints it.
EXAMPLE: dict[str, Any] = json.loads("""
{"id": "ship-0313", "from": "boundary:jetty-1", "to": "tk-12", "by": "meter", "meter": "m-7",
 "started_at": "2026-03-13T20:00:00+01:00", "ended_at": "2026-03-14T16:00:00+01:00",
 "standard_volume_m3": 35500.0, "density_kg_m3": 745.2, "density_temperature_c": 15.0, "sediment_water_pct": 0.02,
 "progress": [{"at": "2026-03-14T06:00:00+01:00", "standard_volume_m3": 17990.0}]}
""")
TICKET: dict[str, Any] = {
    "from": "tk-12", "to": "boundary:rack-2", "by": "weighbridge", "mass_uncertainty_kg": 20, "mass_kg": 21840.0,
    "started_at": "2026-03-14T09:00:00Z", "ended_at": "2026-03-14T09:40:00Z",
}  # fmt: skip


def test_example_of_the_contract_is_taken() -> None:
    transfer = Transfer.model_validate_json(json.dumps(EXAMPLE))
    assert (transfer.from_, transfer.to, transfer.quantities()) == ("boundary:jetty-1", "tk-12", ["standard_volume_m3"])
    assert '"from":"boundary:jetty-1"' in canonical(transfer)


@pytest.mark.parametrize(
    "change",
    [
        {"ended_at": None},
        {"void": True},
        {"void": True, "mass_kg": None, "mass_uncertainty_kg": None},
        {"mass_kg": None, "mass_uncertainty_kg": None, "unmetered": True},
        {"mass_kg": None, "observed_volume_m3": 30, "temperature_c": 20, "pressure_kpa": 3},
        {"mass_kg": None, "weight_in_air_kg": 21800, "density_kg_m3": 745, "density_temperature_c": 15},
        {"of": "water"},
        {"by": "gauging", "mass_uncertainty_kg": None},
        {"to": "boundary:loss"},
        {"vapour_return": "same_volume"},
        {"vapour_return": {"mass_kg": 120}},
        {"vapour_return": {"volume_m3": 40, "temperature_c": 18, "pressure_kpa": 610}},
        {"started_at": "2026-03-14T00:00:00Z", "ended_at": "2026-04-14T00:00:00Z"},
    ],
)
def test_transfer_is_taken(refusals: Any, change: dict[str, Any]) -> None:
    assert refusals(Transfer, {**TICKET, **change}) == {}


def steps(*running: tuple[int, float]) -> dict[str, Any]:
    return {"progress": [{"at": f"2026-03-14T09:{minute:02}:00Z", "mass_kg": mass} for minute, mass in running]}


@pytest.mark.parametrize(
    ("change", "place", "code"),
    [
        ({"to": "tk-12"}, "/to", "impossible"),
        ({"from": "boundary:a"}, "/to", "impossible"),
        ({"from": "TK"}, "/from", "wrong_form"),
        ({"by": "guess"}, "/by", "not_one_of"),
        ({"by": "meter"}, "/meter", "missing"),
        ({"meter": "m-7"}, "/meter", "conflicting"),
        ({"mass_kg": None}, "", "missing"),
        ({"standard_volume_m3": 30}, "/standard_volume_m3", "one_of"),
        ({"unmetered": True}, "/unmetered", "one_of"),
        ({"void": True, "standard_volume_m3": 30}, "/standard_volume_m3", "one_of"),
        ({"mass_kg": -1}, "/mass_kg", "out_of_range"),
        ({"mass_uncertainty_kg": None}, "/mass_uncertainty_kg", "missing"),
        ({"by": "ship", "mass_uncertainty_kg": None}, "/mass_uncertainty_kg", "missing"),
        ({"by": "statement", "mass_uncertainty_kg": None}, "/mass_uncertainty_kg", "missing"),
        ({"mass_kg": None, "observed_volume_m3": 30}, "/temperature_c", "missing"),
        ({"density_kg_m3": 745}, "/density_temperature_c", "missing"),
        ({"density_temperature_c": 15}, "/density_kg_m3", "missing"),
        ({"ended_at": "2026-03-14T08:59:59Z"}, "/ended_at", "impossible"),
        ({"ended_at": "2026-04-14T09:00:01Z"}, "/ended_at", "out_of_range"),
        ({"of": "oil"}, "/of", "not_one_of"),
        ({"vapour_return": "some"}, "/vapour_return", "not_one_of"),
        ({"vapour_return": {}}, "/vapour_return", "one_of"),
        ({"vapour_return": {"volume_m3": 40, "temperature_c": 18}}, "/vapour_return/pressure_kpa", "missing"),
        (steps((10, 9000.0), (10, 8000.0)), "/progress/1/mass_kg", "impossible"),
        (steps((10, 30000.0)), "/progress/0/mass_kg", "impossible"),
        (steps((41, 21840.0)), "/progress/0/at", "impossible"),
        (steps((20, 9000.0), (10, 9500.0)), "/progress/1/at", "impossible"),
        (
            {"progress": [{"at": "2026-03-14T09:10:00Z", "standard_volume_m3": 3}]},
            "/progress/0",
            "conflicting",
        ),
        ({"progress": [{"mass_kg": 3}]}, "/progress/0/at", "missing"),
    ],
)
def test_transfer_is_refused(refusals: Any, change: dict[str, Any], place: str, code: str) -> None:
    assert refusals(Transfer, {**TICKET, **change}) == {place: code}


def test_batch_names_each_transfer(refusals: Any) -> None:
    named = {**TICKET, "id": "road-77"}
    assert refusals(TransferBatch, {"transfers": [named]}) == {}
    assert refusals(TransferBatch, {"transfers": [named, TICKET]}) == {"/transfers/1/id": "missing"}


def test_bad_tickets_of_a_batch_are_named_and_the_others_kept() -> None:
    tickets = [{**TICKET, "id": f"road-{at}"} for at in range(6)]
    tickets[1]["mass_kg"] = -1
    del tickets[3]["id"]
    tickets[4]["void"] = True
    kept, errors = validate_transfers(json.dumps({"transfers": tickets}).encode())
    assert [(at, one.id) for at, one in kept] == [(0, "road-0"), (2, "road-2"), (4, "road-4"), (5, "road-5")]
    assert [(one.index, one.field, one.code) for one in errors] == [
        (1, "mass_kg", "out_of_range"), (3, "id", "missing"),
    ]  # fmt: skip


@pytest.mark.parametrize("text", [b"", b"[]", b'{"readings": []}', b'{"transfers": {}}'])
def test_body_that_is_no_batch_is_refused(text: bytes) -> None:
    with pytest.raises(ValidationError):
        validate_transfers(text)
