"""Readings come in one value at a time: counted by reading, good rows kept, bad rows named."""

from __future__ import annotations

from typing import Any

import pytest

from app.errors import NotFound
from app.schemas.batch import ERRORS_LISTED, RowError
from app.schemas.reading import Reading
from app.schemas.types import format_instant
from app.services import ingest, read_back
from tests.app.services.plant import Plant, instant

FROM, TO = instant("2026-03-14T00:00"), instant("2026-03-15T00:00")
AT = "2026-03-14T06:00:00Z"


def reading(**said: Any) -> Reading:
    return Reading.model_validate({"vessel": "tk-1", "taken_at": AT} | said)


def post(plant: Plant, *rows: Reading) -> tuple[ingest.Outcome, list[RowError]]:
    errors: list[RowError] = []
    return ingest.ingest(plant.store, plant.clock, plant.site, list(enumerate(rows)), errors), errors


def counts(outcome: ingest.Outcome) -> tuple[int, int, int, int]:
    return outcome.stored, outcome.revised, outcome.unchanged, outcome.rejected


def stored(plant: Plant, **asked: Any) -> list[dict[str, Any]]:
    found, _, _ = read_back.values(plant.store, plant.site, "tk-1", (FROM, TO), None, None, 1000, asked.get("as_of"))
    return found


def test_a_reading_is_stored_once_and_a_retry_changes_nothing(plant: Plant) -> None:
    plant.tank("tk-1")
    assert counts(post(plant, reading(level_m=5.0))[0]) == (1, 0, 0, 0)
    assert counts(post(plant, reading(level_m=5.0))[0]) == (0, 0, 1, 0)
    assert counts(post(plant, reading(level_m=5.0, liquid_temperature_c=15.0))[0]) == (1, 0, 0, 0)
    assert counts(post(plant, reading(level_m=6.0, liquid_temperature_c=15.0))[0]) == (0, 1, 0, 0)
    # A late retry of what was corrected undoes nothing.
    assert counts(post(plant, reading(level_m=5.0))[0]) == (0, 0, 1, 0)
    assert {one["quantity"]: one["value"] for one in stored(plant)} == {"level_m": 6.0, "liquid_temperature_c": 15.0}


def test_an_earlier_value_comes_back_only_by_saying_what_it_corrects(plant: Plant) -> None:
    plant.tank("tk-1")
    post(plant, reading(level_m=5.0))
    first = stored(plant)[0]["recorded_at"]
    post(plant, reading(level_m=6.0))
    second = stored(plant)[0]["recorded_at"]

    stale, errors = post(plant, reading(level_m=5.0, corrects=format_instant(first)))
    assert counts(stale) == (0, 0, 0, 1)
    assert [(one.index, one.field, one.code) for one in errors] == [(0, "corrects", "stale_correction")]
    assert counts(post(plant, reading(level_m=5.0, corrects=format_instant(second)))[0]) == (0, 1, 0, 0)
    (now,) = stored(plant)
    assert (now["value"], now["revision"]) == (5.0, 3)


def test_good_rows_are_kept_and_bad_rows_are_named(plant: Plant) -> None:
    plant.tank("tk-1")
    rows = [
        reading(level_m=5.0),
        reading(vessel="tk-9", level_m=5.0),
        reading(taken_at="1999-12-31T23:59:59Z", level_m=5.0),
        reading(taken_at="2026-12-31T00:05:01Z", level_m=5.0),
        reading(taken_at="2026-12-31T00:05:00Z", level_m=5.0),
        Reading.model_validate({"taken_at": AT, "ambient_temperature_c": 3.0}),
    ]
    outcome, errors = post(plant, *rows)
    assert counts(outcome) == (3, 0, 0, 3)
    assert [(one.index, one.field, one.code) for one in errors] == [
        (1, "vessel", "unknown_vessel"), (2, "taken_at", "too_old"), (3, "taken_at", "future"),
    ]  # fmt: skip
    assert outcome.known_at == plant.known()


def test_the_same_key_twice_in_a_batch_is_taken_in_order(plant: Plant) -> None:
    plant.tank("tk-1")
    outcome, _ = post(plant, reading(level_m=5.0), reading(level_m=6.0), reading(level_m=6.0))
    assert counts(outcome) == (1, 1, 1, 0)
    assert stored(plant)[0]["value"] == 6.0


def test_a_level_that_this_vessel_cannot_have_is_evidence_and_is_kept(plant: Plant) -> None:
    plant.tank("tk-1")
    assert counts(post(plant, reading(level_m=10.5))[0]) == (1, 0, 0, 0)
    answer = plant.vessel("tk-1", "2026-03-14T06:00")
    assert (answer["status"], answer["mass_kg"], answer["reason"]["code"]) == ("unmeasured", None, "outside_vessel")
    assert stored(plant)[0]["value"] == 10.5


def test_an_order_of_a_sample_does_not_matter_and_a_composition_has_one_spelling(plant: Plant) -> None:
    plant.tank("tk-1")
    post(plant, reading(vapour_composition={"nitrogen": 0.01, "propane": 0.99}))
    again, _ = post(plant, reading(vapour_composition={"propane": 0.99, "nitrogen": 0.01}))
    assert counts(again) == (0, 0, 1, 0)
    assert stored(plant)[0]["composition"] == {"nitrogen": 0.01, "propane": 0.99}


def test_each_quantity_has_its_own_quality(plant: Plant) -> None:
    plant.tank("tk-1")
    post(plant, reading(level_m=5.0, liquid_temperature_c=15.0, quality={"level_m": "uncertain"}))
    assert {one["quantity"]: one["quality"] for one in stored(plant)} == {
        "level_m": "uncertain", "liquid_temperature_c": "good",
    }  # fmt: skip


@pytest.mark.parametrize(("rows", "transactions"), [(7, 1), (12, 4)])
def test_a_large_upload_is_committed_in_blocks(
    plant: Plant, monkeypatch: pytest.MonkeyPatch, rows: int, transactions: int
) -> None:
    # The limits are 10,000 and 5,000; the same rule at 10 and 3.
    monkeypatch.setattr(ingest, "WHOLE", 10)
    monkeypatch.setattr(ingest, "BLOCK", 3)
    plant.tank("tk-1")
    post(plant, *(reading(taken_at=f"2026-03-14T06:{minute:02}:00Z", level_m=5.0) for minute in range(rows)))
    assert len(stored(plant)) == rows
    assert len({one["recorded_at"] for one in stored(plant)}) == transactions


def test_nothing_is_written_where_nothing_is_good(plant: Plant) -> None:
    before = plant.known()
    outcome, _ = post(plant, reading(vessel="tk-9", level_m=5.0))
    assert (counts(outcome), outcome.known_at, plant.known()) == ((0, 0, 0, 1), before, before)
    with pytest.raises(NotFound):
        ingest.ingest(plant.store, plant.clock, "no-such-site", [], [])


def test_an_answer_lists_a_thousand_errors() -> None:
    many = [RowError(index=index, field="vessel", code="unknown_vessel", detail="") for index in range(1200)]
    assert ERRORS_LISTED == 1000  # as the contract of the service says
    assert [one.index for one in ingest.listed(many)] == list(range(1000))
