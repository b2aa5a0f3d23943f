"""A ticket entered twice, and voided.

What happened: tank 26 (100 m², 800 kg/m³: 80 kg to the millimetre) stands at 10.000 m on the 13th at 06:00,
800,000 kg. One road tanker is loaded on the 13th, 28,000 kg by the weighbridge ± 20 kg. The rack's system sends its
ticket as `road-4711`; in the evening the dispatcher types the same slip in by hand, as `slip-4711`. On the 14th at
06:00 the tank stands at 9.650 m: 772,000 kg, and so it does on the 15th.

What the books must say: while both tickets stand, 56,000 kg have left by the book and 28,000 kg by the gauge: the
tank is 28,000 kg over, with 1 mm at either end (113 kg) and two tickets of 20 kg (28 kg): flagged. The second ticket
is struck, not deleted: it stays readable, counts for nothing, and the night has a second revision in which nothing
is missing. The night after keeps its figures: it opens with what was measured, not with what was booked.

A ticket that is *sent* twice under its own name is no second ticket.
"""

from __future__ import annotations

import math

import pytest

NIGHT, NEXT = "2026-03-13", "2026-03-14"
LEVELS = {"2026-03-13 06:00": 10.0, "2026-03-14 06:00": 9.65, "2026-03-15 06:00": 9.65}
LEVEL_U = math.sqrt(2.0) * 80.0


def loads(site, ticket):
    return site.delivers("tk-26", ticket, "2026-03-13 14:10", "2026-03-13 14:40", by_way_of="road",
                         by="weighbridge", mass_kg=28_000.0, mass_uncertainty_kg=20.0)  # fmt: skip


@pytest.fixture
def tank(site):
    """The tank at three mornings, and the rack's own ticket."""
    site.liquid("gas-oil", 800.0)
    site.tank("tk-26", "gas-oil")
    for at, level in LEVELS.items():
        site.reads("tk-26", at, level_m=level)
    assert loads(site, "road-4711") == "created"
    return site


def test_one_ticket_one_tanker(tank):
    """800,000 − 28,000 = 772,000 kg; 1 mm at either end and 20 kg of the weighbridge."""
    night = tank.closes(NIGHT)
    book = night.of("tk-26")
    assert book["book_mass_kg"] == pytest.approx(772_000.0, abs=0.5)
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert book["imbalance_uncertainty_kg"] == pytest.approx(math.hypot(LEVEL_U, 20.0), abs=0.1)
    assert not night.flagged


def test_the_same_ticket_sent_again_is_no_second_one(tank):
    """The rack's system repeats its message, alone and in a batch: unchanged, and the night is not due again."""
    first = tank.closes(NIGHT)
    assert loads(tank, "road-4711") == "unchanged"
    again = tank.get("/transfers/road-4711")["transfer"]
    batch = [{"id": "road-4711", **again}, {"id": "road-4711", **again}]
    answer = tank.post("/transfers", {"transfers": batch})
    assert (answer["stored"], answer["revised"], answer["unchanged"]) == (0, 0, 2)
    assert tank.closes(NIGHT)["id"] == first["id"] == f"{NIGHT}.1"


def test_two_tickets_of_one_tanker_are_a_false_gain(tank):
    """Book 744,000 kg, tank 772,000 kg: 28,000 kg over."""
    loads(tank, "slip-4711")
    night = tank.closes(NIGHT)
    book = night.of("tk-26")
    assert book["delivered_kg"] == pytest.approx(56_000.0, abs=0.5)
    assert book["imbalance_kg"] == pytest.approx(28_000.0, abs=0.5)
    assert book["imbalance_uncertainty_kg"] == pytest.approx(math.hypot(LEVEL_U, math.sqrt(2.0) * 20.0), abs=0.1)
    assert night.flagged == {"tk-26"}
    assert night.total("gas-oil")["imbalance_kg"] == pytest.approx(28_000.0, abs=0.5)


def test_the_struck_ticket_revises_the_night_and_stays_readable(tank):
    loads(tank, "slip-4711")
    tank.closes(NIGHT)
    assert tank.voids("slip-4711") == "revised"
    night = tank.closes(NIGHT)
    assert night["id"] == f"{NIGHT}.2" and not night.flagged
    assert night.of("tk-26")["delivered_kg"] == pytest.approx(28_000.0, abs=0.5)
    assert night.of("tk-26")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert [one["transfer"] for one in night["transfers"]] == ["road-4711"]
    # What was booked on the first evening stands as it was booked, and the slip can still be read.
    assert tank.book(f"{NIGHT}.1").of("tk-26")["imbalance_kg"] == pytest.approx(28_000.0, abs=0.5)
    told = {one["field"]: one for one in tank.changes(f"{NIGHT}.2") if "vessel" in one}
    assert (told["delivered_kg"]["before"], told["delivered_kg"]["after"]) == pytest.approx((56_000.0, 28_000.0))
    assert (told["imbalance_kg"]["before"], told["imbalance_kg"]["after"]) == pytest.approx((28_000.0, 0.0), abs=0.5)
    assert [one["subject"] for one in told["delivered_kg"]["because"]] == ["slip-4711"]
    struck = tank.get("/transfers/slip-4711")["transfer"]
    assert struck["void"] is True and struck["mass_kg"] == 28_000.0


def test_striking_it_again_changes_nothing(tank):
    loads(tank, "slip-4711")
    tank.voids("slip-4711")
    first = tank.closes(NIGHT)
    assert tank.voids("slip-4711") == "unchanged"
    assert tank.closes(NIGHT)["id"] == first["id"]


def test_the_night_after_keeps_its_figures(tank):
    """It opens with the 772,000 kg that were measured, before the slip was struck and after."""
    loads(tank, "slip-4711")
    tank.closes(NIGHT)
    before = tank.closes(NEXT).of("tk-26")
    assert before["opening_mass_kg"] == pytest.approx(772_000.0, abs=0.5)
    tank.voids("slip-4711")
    tank.closes(NIGHT)
    after = tank.closes(NEXT).of("tk-26")
    assert after["opening_mass_kg"] == before["opening_mass_kg"]
    assert after["imbalance_kg"] == pytest.approx(0.0, abs=0.5) == before["imbalance_kg"]


def test_the_wrong_one_of_the_two_was_struck(tank):
    """The rack's ticket is struck instead of the slip: the same 28,000 kg stand, and the night is even as well.

    Then the rack's ticket is put back as it was: both stand again, and so does the false gain.
    """
    loads(tank, "slip-4711")
    tank.voids("road-4711")
    night = tank.closes(NIGHT)
    assert night.of("tk-26")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert [one["transfer"] for one in night["transfers"]] == ["slip-4711"]
    assert loads(tank, "road-4711") == "revised"
    night = tank.closes(NIGHT)
    assert night["id"] == f"{NIGHT}.2"
    assert night.of("tk-26")["imbalance_kg"] == pytest.approx(28_000.0, abs=0.5)


def test_a_live_answer_between_two_dips_follows_the_tickets_that_stand(tank):
    """15:00 on the 13th by the dip of 06:00 (an age of a day is allowed): 800,000 kg less what the tickets say."""
    tank.tank("tk-26", "gas-oil", max_age_s={"level_m": 32_400}, effective_from="2026-03-13 05:00")
    loads(tank, "slip-4711")
    moved = tank.inventory("2026-03-13 15:00").of("tk-26")
    assert moved["moved_kg"] == pytest.approx(-56_000.0, abs=0.5)
    assert moved["mass_kg"] == pytest.approx(744_000.0, abs=0.5)
    tank.voids("slip-4711")
    moved = tank.inventory("2026-03-13 15:00").of("tk-26")
    assert moved["moved_kg"] == pytest.approx(-28_000.0, abs=0.5)
    assert moved["mass_kg"] == pytest.approx(772_000.0, abs=0.5)
