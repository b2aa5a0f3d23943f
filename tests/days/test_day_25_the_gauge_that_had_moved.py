"""The fault was found: a gauge that had moved 11 mm four days ago is re-zeroed at 14:00.

What happened: tank 25 (1,000 m², 800 kg/m³: 800 kg to the millimetre) stands still at 8.220 m, 6,576,000 kg, all
week. On the 10th at 14:00 somebody knocked the gauge: from then on it shows 8.231 m. On the 14th at 14:00 the
instrument technician finds it 11 mm high and sets it right; from then on it shows 8.220 m again.

What is declared of the gauge: 1 mm at every reading, 2 mm of unknown offset for as long as it is not touched.

What the books say meanwhile, closed each morning at six:

- The night of the 10th: 11 mm more than the day before, 8,800 kg from nowhere, against √2 × 800 = 1,131 kg (its
  unknown offset is the same at both ends): flagged. The nights of the 11th, 12th and 13th: nothing, the fault is
  at both ends. The night of the 14th: 8,800 kg gone, flagged. Two false alarms of opposite sign.

What they must say after the fault was found:

- *With the offset declared*: the vessel's text from the 10th 14:00 says that 11 mm are to be taken off, the text
  from the 14th 14:00 that it was calibrated. Every night is 0 kg, none is flagged; the readings stay as they were
  sent, the books show their second revision, and the gauge's calibration is a new unknown offset: in the night of
  the 14th 2 mm count at either end, √(1² + 1² + 2² + 2²) = 3.162 mm or 2,530 kg.
- *Without it*, only with the calibration: the four nights stay as they are, and in the night of the 14th 8,800 kg
  are missing against 2,530 kg: 3.5 times, flagged still.
- A table that is untouched is restated in neither case: `restated_kg` is for tables.
"""

from __future__ import annotations

import math

import pytest

KG_PER_MM = 800.0
TRUE_KG = 8.220 * 1000.0 * 800.0
MOVED, FOUND = "2026-03-10 14:00", "2026-03-14 14:00"
NIGHTS = ["2026-03-10", "2026-03-11", "2026-03-12", "2026-03-13", "2026-03-14"]
MORNINGS = ["2026-03-10", "2026-03-11", "2026-03-12", "2026-03-13", "2026-03-14", "2026-03-15"]
UNTOUCHED_U = math.sqrt(2.0) * KG_PER_MM
TOUCHED_U = math.sqrt(1.0 + 1.0 + 4.0 + 4.0) * KG_PER_MM
OFFSET_NIGHTS = [8_800.0, 0.0, 0.0, 0.0, -8_800.0]


def gauge(**more):
    return {"level_m": {"random": 0.001, "systematic": 0.002, **more}}


@pytest.fixture
def tank(site):
    """The tank and six mornings by a gauge that shows 11 mm too much from the second to the fifth."""
    site.liquid("gas-oil", 800.0)
    site.tank("tk-25", "gas-oil", area_m2=1000.0, instruments=gauge())
    for day in MORNINGS:
        high = MORNINGS[0] < day < MORNINGS[-1]
        site.reads("tk-25", f"{day} 06:00", source="radar", level_m=8.231 if high else 8.220)
    return site


def closes_all(site):
    return [site.closes(day) for day in NIGHTS]


def imbalances(nights):
    return [night.of("tk-25")["imbalance_kg"] for night in nights]


def declares_the_offset(site):
    site.tank("tk-25", "gas-oil", area_m2=1000.0, instruments=gauge(offset=-0.011), effective_from=MOVED)


def declares_the_calibration(site):
    site.tank("tk-25", "gas-oil", area_m2=1000.0, instruments=gauge(calibrated_at="2026-03-14T14:00:00Z"),
              effective_from=FOUND)  # fmt: skip


def test_two_false_alarms_of_opposite_sign_before_anybody_knows(tank):
    """11 mm × 800 = 8,800 kg up and, four nights later, down: 7.8 times 1,131 kg each."""
    nights = closes_all(tank)
    assert imbalances(nights) == pytest.approx(OFFSET_NIGHTS, abs=0.5)
    assert [night.of("tk-25")["imbalance_uncertainty_kg"] for night in nights] == pytest.approx(
        [UNTOUCHED_U] * 5, abs=0.5
    )
    assert [bool(night.flagged) for night in nights] == [True, False, False, False, True]
    assert nights[0].of("tk-25")["score"] == pytest.approx(8_800.0 / UNTOUCHED_U, abs=0.01)


def test_with_the_offset_declared_every_night_is_even(tank):
    closes_all(tank)
    declares_the_offset(tank)
    declares_the_calibration(tank)
    nights = closes_all(tank)
    assert [night["id"] for night in nights] == [f"{day}.2" for day in NIGHTS]
    assert imbalances(nights) == pytest.approx([0.0] * 5, abs=0.5)
    assert not any(night.flagged for night in nights)
    assert [night.of("tk-25")["closing_mass_kg"] for night in nights] == pytest.approx([TRUE_KG] * 5, abs=0.5)
    assert not any(night.of("tk-25").get("restated_kg") for night in nights)
    told = next(one for one in tank.changes(f"{NIGHTS[0]}.2") if one["field"] == "closing_mass_kg")
    assert (told["before"], told["after"]) == pytest.approx((TRUE_KG + 8_800.0, TRUE_KG), abs=0.5)
    assert {one["kind"] for one in told["because"]} == {"definition"}


def test_the_calibration_is_a_new_unknown_offset_in_its_night_only(tank):
    """√2 mm where the same offset stands at both ends, √10 mm across the calibration."""
    declares_the_offset(tank)
    declares_the_calibration(tank)
    told = [night.of("tk-25")["imbalance_uncertainty_kg"] for night in closes_all(tank)]
    assert told == pytest.approx([UNTOUCHED_U] * 4 + [TOUCHED_U], abs=0.5)


def test_without_the_offset_the_night_of_the_calibration_stays_a_false_loss(tank):
    """8,800 kg against 2,530 kg: 3.48 times. The nights before were not touched by the new text."""
    closes_all(tank)
    declares_the_calibration(tank)
    nights = closes_all(tank)
    assert imbalances(nights) == pytest.approx(OFFSET_NIGHTS, abs=0.5)
    assert [night["revision"] for night in nights] == [1, 1, 1, 1, 2]
    last = nights[-1].of("tk-25")
    assert last["imbalance_uncertainty_kg"] == pytest.approx(TOUCHED_U, abs=0.5)
    assert last["score"] == pytest.approx(-8_800.0 / TOUCHED_U, abs=0.01)
    assert nights[-1].flagged == {"tk-25"}


def test_what_was_said_then_stands_as_it_was_said(tank):
    """The first revisions keep the false alarms, and the readings keep the 8.231 m that the gauge sent."""
    closes_all(tank)
    declares_the_offset(tank)
    declares_the_calibration(tank)
    closes_all(tank)
    first = [tank.book(f"{day}.1") for day in NIGHTS]
    assert imbalances(first) == pytest.approx(OFFSET_NIGHTS, abs=0.5)
    rows = tank.get("/vessels/tk-25/readings", from_="2026-03-12 00:00", to="2026-03-13 00:00")["items"]
    assert [row["value"] for row in rows if row["quantity"] == "level_m"] == [8.231]


def test_the_live_answer_takes_each_reading_by_the_text_in_force_at_that_reading(tank):
    """On the 14th at 13:50 the gauge shows 8.231 m, at 14:05 8.220 m. Both are 6,576,000 kg, before and after 14:00."""
    declares_the_offset(tank)
    declares_the_calibration(tank)
    tank.reads("tk-25", "2026-03-14 13:50", source="radar", level_m=8.231)
    tank.reads("tk-25", "2026-03-14 14:05", source="radar", level_m=8.220)
    for at in ("2026-03-14 13:50", "2026-03-14 13:58", "2026-03-14 14:00", "2026-03-14 14:02", "2026-03-14 14:05"):
        assert tank.inventory(at).of("tk-25")["mass_kg"] == pytest.approx(TRUE_KG, abs=0.5), at
    # The value that counted is the corrected one.
    assert tank.inventory("2026-03-14 13:50").input("tk-25", "level_m")["value"] == pytest.approx(8.220, abs=1e-9)


def test_an_offset_without_an_end_would_be_wrong_the_other_way(tank):
    """The offset declared and the calibration forgotten: from the 14th on 11 mm too little. 8,800 kg short again."""
    declares_the_offset(tank)
    assert imbalances(closes_all(tank)) == pytest.approx([0.0, 0.0, 0.0, 0.0, -8_800.0], abs=0.5)
