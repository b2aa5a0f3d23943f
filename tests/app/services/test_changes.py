"""A revision says what it changed, and which late reading, ticket or definition it comes from."""

from __future__ import annotations

from typing import Any

import pytest

from app.services import close
from app.services.because import Cause
from app.services.changes import Change, changes, sentence
from tests.app.services.plant import KG_PER_M, Plant

JETTY, RACK = "boundary:jetty-1", "boundary:rack-1"


@pytest.fixture
def nights(plant: Plant) -> Plant:
    """Two tanks that stand at 5 m (400,000 kg) for three mornings; the nights of the 14th and 15th are closed."""
    for tank in ("tk-1", "tk-2"):
        plant.tank(tank)
        for day in (14, 15, 16):
            plant.read(tank, f"2026-03-{day}T06:00", "radar", level_m=5.0)
    for day in (14, 15):
        plant.close(f"2026-03-{day}")
    return plant


def told(plant: Plant, name: str) -> dict[str, Any]:
    return changes(plant.store, plant.site, name)


def fields(answer: dict[str, Any], owner: str) -> dict[str, tuple[Any, Any]]:
    """Before and after of each field of a vessel or a ticket."""
    named = [one for one in answer["changes"] if owner in (one.get("vessel"), one.get("transfer"))]
    return {one["field"]: (one["before"], one["after"]) for one in named}


def causes(answer: dict[str, Any]) -> set[tuple[str, str]]:
    return {(cause["kind"], cause["subject"]) for one in answer["changes"] for cause in one["because"]}


def test_the_first_revision_changes_nothing(nights: Plant) -> None:
    assert told(nights, "2026-03-14") == {"id": "2026-03-14.1", "before": None, "changes": [], "words": []}


def test_a_revised_reading_changes_the_close_and_what_is_judged_by_it(nights: Plant) -> None:
    """0.1 m more at the close are 8,000 kg more, and an imbalance of as much; the other tank is left alone."""
    recorded = nights.read("tk-1", "2026-03-15T06:00", "radar", level_m=5.1).known_at
    nights.close("2026-03-14")
    found = told(nights, "2026-03-14")
    assert (found["id"], found["before"]) == ("2026-03-14.2", "2026-03-14.1")
    assert fields(found, "tk-2") == {}
    changed = fields(found, "tk-1")
    assert changed["closing_mass_kg"] == pytest.approx((5.0 * KG_PER_M, 5.1 * KG_PER_M), rel=1e-12)
    assert changed["imbalance_kg"] == pytest.approx((0.0, 0.1 * KG_PER_M), abs=1e-6)
    assert (changed["flagged"], changed["verdict"]) == ((False, True), ("pass", "fail"))
    subject = "tk-1 level_m 2026-03-15T06:00:00Z from radar"
    for one in found["changes"]:
        assert one["because"] == [{"kind": "revised_reading", "subject": subject, "recorded_at": recorded}]
    assert found["words"][0].startswith(
        "tk-1: closing mass 400,000 → 408,000 kg because the level of tk-1 of 2026-03-15T06:00:00Z from radar "
        "was revised on "
    )


def test_the_night_after_opens_otherwise_for_the_same_reason(nights: Plant) -> None:
    nights.read("tk-1", "2026-03-15T06:00", "radar", level_m=5.1)
    nights.close("2026-03-14")
    nights.close("2026-03-15")
    found = told(nights, "2026-03-15")
    assert found["id"] == "2026-03-15.2"
    assert fields(found, "tk-1")["opening_mass_kg"] == pytest.approx((400_000.0, 408_000.0), rel=1e-12)
    assert causes(found) == {("revised_reading", "tk-1 level_m 2026-03-15T06:00:00Z from radar")}


def test_a_late_reading_nearer_to_the_close_is_a_late_one(nights: Plant) -> None:
    """Beside what was read at six, what counts is the hand dip of an order of sources that puts it first."""
    nights.tank("tk-3")
    nights.read("tk-3", "2026-03-14T06:00", "radar", level_m=5.0)
    nights.read("tk-3", "2026-03-15T05:30", "radar", level_m=5.0)
    nights.close("2026-03-14")
    nights.read("tk-3", "2026-03-15T05:58", "hand", level_m=5.2)
    nights.close("2026-03-14")
    found = told(nights, "2026-03-14.3")
    assert found["before"] == "2026-03-14.2"
    assert causes(found) == {("late_reading", "tk-3 level_m 2026-03-15T05:58:00Z from hand")}


def test_a_withdrawn_reading_is_a_revised_one(nights: Plant) -> None:
    """Nothing is left to count: the close is not known any more."""
    nights.read("tk-1", "2026-03-15T06:00", "radar", level_m=5.0, quality="bad")
    nights.close("2026-03-14")
    found = told(nights, "2026-03-14")
    assert fields(found, "tk-1")["closing_mass_kg"] == (pytest.approx(400_000.0), None)
    assert causes(found) == {("revised_reading", "tk-1 level_m 2026-03-15T06:00:00Z from radar")}
    assert found["words"][0].startswith("tk-1: closing mass 400,000 → unknown kg because ")


@pytest.mark.parametrize(("started", "inside_kg"), [("2026-03-14T08:00", 24_000.0), ("2026-03-13T22:00", 13_333.333)])
def test_a_late_ticket_adds_itself_and_what_was_received(nights: Plant, started: str, inside_kg: float) -> None:
    """24,000 kg until 16:00 on the 14th; of the 18 hours since 22:00 the day before ten are this night's."""
    nights.ticket("t-9", JETTY, "tk-2", started, "2026-03-14T16:00", mass_kg=24_000.0)
    nights.close("2026-03-14")
    found = told(nights, "2026-03-14")
    assert fields(found, "tk-2")["received_kg"] == pytest.approx((0.0, inside_kg))
    assert fields(found, "t-9") == {"measured_mass_kg": (None, pytest.approx(inside_kg))}
    assert causes(found) == {("late_transfer", "t-9")}
    line = f"ticket t-9: measured mass none → {inside_kg:,.0f} kg because ticket t-9 came on "
    assert found["words"][-1].startswith(line)


@pytest.mark.parametrize(("said", "after_kg", "did"), [({"void": True}, None, "struck"),
                                                       ({"mass_kg": 9_000.0}, 9_000.0, "corrected")])  # fmt: skip
def test_a_ticket_struck_or_corrected(nights: Plant, said: dict[str, Any], after_kg: float | None, did: str) -> None:
    body = {"mass_kg": 8_000.0}
    nights.ticket("t-1", "tk-1", RACK, "2026-03-14T08:00", "2026-03-14T09:00", **body)
    nights.close("2026-03-14")
    nights.ticket("t-1", "tk-1", RACK, "2026-03-14T08:00", "2026-03-14T09:00", **body | said)
    nights.close("2026-03-14")
    found = told(nights, "2026-03-14")
    assert fields(found, "tk-1")["delivered_kg"] == pytest.approx((8_000.0, after_kg or 0.0))
    assert fields(found, "t-1")["measured_mass_kg"] == (8_000.0, after_kg)
    assert causes(found) == {("late_transfer", "t-1")}
    assert f"because ticket t-1 was {did} on " in found["words"][0]


def test_a_ticket_of_another_vessel_changes_both(nights: Plant) -> None:
    """Booked to the wrong tank: its mass stays, and both receipts change because of it."""
    for tank in ("tk-1", "tk-2"):
        nights.ticket("t-1", JETTY, tank, "2026-03-14T08:00", "2026-03-14T09:00", mass_kg=8_000.0)
        nights.close("2026-03-14")
    found = told(nights, "2026-03-14")
    assert fields(found, "tk-1")["received_kg"] == pytest.approx((8_000.0, 0.0))
    assert fields(found, "tk-2")["received_kg"] == pytest.approx((0.0, 8_000.0))
    assert fields(found, "t-1") == {}
    assert causes(found) == {("late_transfer", "t-1")}


def test_a_proving_changes_the_tickets_of_its_meter(nights: Plant) -> None:
    """Found to read 1 % high, known to 0.1 % from both sides: weighed, 0.5 % of 8,000 kg are off the ticket."""
    meter = {"name": "m", "random_pct": 0.0, "systematic_pct": 0.1}
    nights.put("meter", "m-1", meter)
    ticket = {"by": "meter", "meter": "m-1", "mass_kg": 8_000.0}
    nights.ticket("t-1", JETTY, "tk-1", "2026-03-14T08:00", "2026-03-14T09:00", **ticket)
    nights.close("2026-03-14")
    proving = {"at": "2026-03-15T08:00:00Z", "as_found_pct": 1.0, "as_found_uncertainty_pct": 0.1}
    nights.put("meter", "m-1", meter | {"provings": [proving], "effective_from": "2026-03-15T08:00:00Z"})
    nights.close("2026-03-14")
    found = told(nights, "2026-03-14")
    assert fields(found, "t-1")["measured_mass_kg"] == pytest.approx((8_000.0, 8_000.0 / 1.005), rel=1e-9)
    assert causes(found) == {("definition", "meter m-1")}
    assert "because the definition of meter m-1 was changed on " in found["words"][0]


def test_a_density_that_came_changes_a_ticket_by_volume(nights: Plant) -> None:
    """10 m³ that took the substance's 800 kg/m³, and then a sample of 810 of the night before: 8,100 kg."""
    nights.ticket("t-1", "tk-1", RACK, "2026-03-14T08:00", "2026-03-14T09:00", standard_volume_m3=10.0)
    nights.close("2026-03-14")
    sample = {"observed_density_kg_m3": 810.0, "observed_density_temperature_c": 15.0}
    nights.read("tk-1", "2026-03-13T08:00", "lab", **sample)
    nights.close("2026-03-14")
    found = told(nights, "2026-03-14")
    assert fields(found, "t-1")["measured_mass_kg"] == pytest.approx((8_000.0, 8_100.0))
    (ticket,) = (one for one in found["changes"] if one.get("transfer") == "t-1")
    subjects = {cause["subject"] for cause in ticket["because"]}
    assert subjects == {f"tk-1 {quantity} 2026-03-13T08:00:00Z from lab" for quantity in sample}


def test_a_table_dated_back_is_a_definition_and_no_loss(nights: Plant) -> None:
    """A box 10.1 m long from seven in the morning: the close is 1 % more, and the opening is restated by as much."""
    shape = {"kind": "box", "length_m": 10.1, "width_m": 10.0, "height_m": 10.0}
    nights.tank("tk-1", shape=shape, effective_from="2026-03-14T07:00:00Z")
    nights.close("2026-03-14")
    found = told(nights, "2026-03-14")
    changed = fields(found, "tk-1")
    assert changed["closing_mass_kg"] == pytest.approx((400_000.0, 404_000.0))
    assert changed["restated_kg"][1] == pytest.approx(4_000.0)
    assert "flagged" not in changed and "imbalance_kg" not in changed
    assert causes(found) == {("definition", "vessel tk-1")}


def test_a_limit_that_came_changes_a_verdict_and_no_mass(nights: Plant) -> None:
    nights.put_site(imbalance_limit={"kg": 1.0, "pct_of_throughput": 0.0}, effective_from="2026-03-14T06:00:00Z")
    nights.close("2026-03-14")
    found = told(nights, "2026-03-14")
    assert fields(found, "tk-1") == {"verdict": ("pass", "inconclusive")}
    assert causes(found) == {("definition", "site " + nights.site)}


def test_a_first_night_opens_with_its_reading(nights: Plant) -> None:
    """Nothing was closed before it: a late reading at the opening is the opening's own cause."""
    nights.read("tk-1", "2026-03-14T06:00", "radar", level_m=4.9)
    nights.close("2026-03-14")
    found = told(nights, "2026-03-14")
    assert fields(found, "tk-1")["opening_mass_kg"] == pytest.approx((400_000.0, 392_000.0))
    assert causes(found) == {("revised_reading", "tk-1 level_m 2026-03-14T06:00:00Z from radar")}


def test_a_vessel_that_came_is_nothing_in_the_revision_before(nights: Plant) -> None:
    nights.tank("tk-9")
    for day in (14, 15):
        nights.read("tk-9", f"2026-03-{day}T06:00", "radar", level_m=1.0)
    nights.close("2026-03-14")
    found = told(nights, "2026-03-14")
    assert fields(found, "tk-9")["closing_mass_kg"] == (None, pytest.approx(KG_PER_M))
    assert fields(found, "tk-9")["flagged"] == (None, False)
    assert ("definition", "vessel tk-9") in causes(found)
    assert ("late_reading", "tk-9 level_m 2026-03-15T06:00:00Z from radar") in causes(found)


def test_another_method_is_a_cause_of_its_own(nights: Plant, monkeypatch: pytest.MonkeyPatch) -> None:
    """It changes every mass that it computes otherwise; here the reading would have been enough."""
    monkeypatch.setattr(close, "METHOD", "3")
    nights.read("tk-1", "2026-03-15T06:00", "radar", level_m=5.1)
    nights.close("2026-03-14")
    found = told(nights, "2026-03-14")
    assert ("method", "2 to 3") in causes(found)
    assert "the method of calculation is 3 and was 2" in found["words"][0]


def test_vessels_judged_together_share_their_causes(nights: Plant) -> None:
    """An unmetered transfer merges them: what changes one close changes the imbalance of both."""
    nights.ticket("t-1", "tk-1", "tk-2", "2026-03-14T08:00", "2026-03-14T09:00", unmetered=True)
    nights.close("2026-03-14")
    nights.read("tk-2", "2026-03-15T06:00", "radar", level_m=5.1)
    nights.close("2026-03-14")
    found = told(nights, "2026-03-14")
    assert set(fields(found, "tk-1")) >= {"imbalance_kg", "flagged"}
    assert causes(found) == {("revised_reading", "tk-2 level_m 2026-03-15T06:00:00Z from radar")}


def test_an_old_revision_says_what_it_changed(nights: Plant) -> None:
    for level in (5.1, 5.2):
        nights.read("tk-1", "2026-03-15T06:00", "radar", level_m=level)
        nights.close("2026-03-14")
    second, third = told(nights, "2026-03-14.2"), told(nights, "2026-03-14.3")
    assert fields(second, "tk-1")["closing_mass_kg"] == pytest.approx((400_000.0, 408_000.0))
    assert fields(third, "tk-1")["closing_mass_kg"] == pytest.approx((408_000.0, 416_000.0))
    assert causes(second) == causes(third)
    at = [one["changes"][0]["because"][0]["recorded_at"] for one in (second, third)]
    assert at[0] < at[1]


def test_a_sentence_tells_three_causes_and_counts_the_others() -> None:
    change = Change("vessel", "tk-1", "imbalance_kg", 0.25, 0.5)
    causes = [Cause("late_transfer", f"t-{n}", n, f"ticket t-{n} came") for n in range(5)]
    line = "tk-1: imbalance 0.250 → 0.500 kg"
    assert sentence(change, ()) == line
    assert sentence(change, causes) == f"{line} because ticket t-0 came; ticket t-1 came; ticket t-2 came; and 2 more"


def test_a_judgement_in_words() -> None:
    assert sentence(Change("vessel", "tk-1", "flagged", False, True), ()) == "tk-1: flagged no → yes"
    assert sentence(Change("vessel", "tk-1", "verdict", None, "pass"), ()) == "tk-1: verdict none → pass"
