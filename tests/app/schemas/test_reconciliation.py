"""A period is a real day or two instants, and blocks that were not computed are absent."""

from __future__ import annotations

import json
from typing import Any

import pytest
from pydantic import TypeAdapter, ValidationError

from app.schemas.reconciliation import (
    Reconciliation,
    ReconciliationId,
    ReconciliationRequest,
    TransferBook,
    VesselBook,
)

MARCH = {"opening": "2026-03-01T06:00:00+01:00", "closing": "2026-04-01T06:00:00+02:00"}


@pytest.mark.parametrize("document", [{"day": "2026-03-14"}, {"day": "2028-02-29"}, MARCH])
def test_period_is_taken(refusals: Any, document: dict[str, Any]) -> None:
    assert refusals(ReconciliationRequest, document) == {}


@pytest.mark.parametrize(
    ("document", "place", "code"),
    [
        ({}, "", "one_of"),
        ({"day": "2026-03-14", **MARCH}, "", "one_of"),
        ({"opening": MARCH["opening"]}, "/closing", "missing"),
        ({"closing": MARCH["closing"]}, "/opening", "missing"),
        ({"opening": MARCH["closing"], "closing": MARCH["opening"]}, "/closing", "impossible"),
        ({"opening": MARCH["opening"], "closing": MARCH["opening"]}, "/closing", "impossible"),
        (MARCH | {"closing": "2026-04-01T06:00:00.5+02:00"}, "/closing", "impossible"),
        ({"day": "2026-02-29"}, "/day", "not_a_date"),
        ({"day": "14.3.2026"}, "/day", "wrong_form"),
        ({"day": "20260314"}, "/day", "wrong_form"),
        ({"day": 20260314}, "/day", "wrong_type"),
        ({**MARCH, "opening": "2026-03-01T06:00:00"}, "/opening", "no_offset"),
    ],
)
def test_period_is_refused(refusals: Any, document: dict[str, Any], place: str, code: str) -> None:
    assert refusals(ReconciliationRequest, document) == {place: code}


@pytest.mark.parametrize(
    "text",
    ["2026-03-14", "2026-03-14.2", "20260301T050000Z--20260401T050000Z", "20260301T050000Z--20260401T050000Z.1"],
)
def test_id_is_taken(text: str) -> None:
    assert TypeAdapter(ReconciliationId).validate_python(text) == text


@pytest.mark.parametrize("text", ["", "2026-03-14.0", "2026-03-14.", "2026-03", "20260301T050000Z", "latest"])
def test_id_is_refused(text: str) -> None:
    with pytest.raises(ValidationError):
        TypeAdapter(ReconciliationId).validate_python(text)


def test_what_was_not_computed_is_absent_and_what_is_unknown_is_null() -> None:
    book = VesselBook(vessel="tk-12", status="unmeasured", flagged=False, closing_mass_kg=float("nan"))
    close = Reconciliation(
        id="2026-03-14.1", site="a", opening=0, closing=86_400_000_000, revision=1, status="balanced",
        complete=False, vessels=(book,),
    )  # fmt: skip
    answer = json.loads(close.model_dump_json())
    assert (answer["opening"], answer["closing"]) == ("1970-01-01T00:00:00Z", "1970-01-02T00:00:00Z")
    assert not {"transfers", "groups", "totals", "digest"} & set(answer)
    assert answer["vessels"][0]["closing_mass_kg"] is None
    assert not {"limited_by", "reconciled_closing_mass_kg", "restated_kg"} & set(answer["vessels"][0])
    assert json.loads(TransferBook(transfer="a", observability="observable").model_dump_json()) == {
        "transfer": "a", "measured_mass_kg": None, "observability": "observable",
    }  # fmt: skip
