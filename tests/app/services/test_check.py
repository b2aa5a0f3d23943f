"""Lower sources check the one that counts at their own instants, in either order of posting."""

from __future__ import annotations

import itertools
import math
from typing import Any

import pytest

from app.services import take_stock
from tests.app.services.plant import BOX, KG_PER_M, OIL, Plant, instant

DAY = "2026-03-14T"
SOURCES = [
    {"source": "radar"},
    {"source": "hand", "instruments": {"level_m": {"random": 0.002, "systematic": 0.0015, "instrument": "tape 7"}}},
    {"source": "float", "instruments": {"level_m": {"random": 0.004, "systematic": 0.0}}},
]
# The boxes' radar reads with 1 mm at random and 3 mm as a whole.
AT_ONE = math.sqrt(0.001**2 + 0.003**2 + 0.002**2 + 0.0015**2)
HALFWAY = math.sqrt(0.001**2 / 2.0 + 0.003**2 + 0.002**2 + 0.0015**2)


def codes(answer: dict[str, Any]) -> list[str]:
    return [one["code"] for one in answer["warnings"] if one["code"] != "input_assumed"]


def checked(answer: dict[str, Any]) -> list[tuple[str, int, float, float]]:
    return [(one["source"], one["at"], one["value"], one["difference"]) for one in answer["checks"]]


def test_a_dip_is_held_against_the_gauge_at_its_own_instant(plant: Plant) -> None:
    plant.tank("tk-1", sources=SOURCES)
    plant.read("tk-1", f"{DAY}06:00", "radar", level_m=5.0)
    plant.read("tk-1", f"{DAY}06:10", "hand", level_m=5.103)
    plant.read("tk-1", f"{DAY}06:20", "radar", level_m=5.2)
    answer = plant.vessel("tk-1", f"{DAY}06:20")
    (check,) = answer["checks"]
    assert (check["quantity"], check["source"], check["at"]) == ("level_m", "hand", instant(f"{DAY}06:10"))
    # The gauge stood at 5.1 m then: half of each of its two readings, so half of one's variance.
    assert check["value"] == 5.103
    assert check["difference"] == pytest.approx(0.003, abs=1e-12)
    assert check["standard_uncertainty"] == pytest.approx(HALFWAY, rel=1e-12)
    # It counts for nothing.
    assert answer["mass_kg"] == pytest.approx(5.2 * KG_PER_M, rel=1e-12)
    assert (answer["status"], codes(answer)) == ("measured", [])


@pytest.mark.parametrize(("off", "said"), [(1.99, False), (2.01, True), (-1.99, False), (-2.01, True)])
def test_sources_disagree_beyond_twice_their_differences_uncertainty(plant: Plant, off: float, said: bool) -> None:
    plant.tank("tk-1", sources=SOURCES)
    plant.read("tk-1", f"{DAY}06:00", "radar", level_m=5.0)
    plant.read("tk-1", f"{DAY}06:00", "hand", level_m=5.0 + off * AT_ONE)
    answer = plant.vessel("tk-1", f"{DAY}06:00")
    assert codes(answer) == (["sources_disagree"] if said else [])
    assert answer["status"] == "measured"
    assert answer["checks"][0]["standard_uncertainty"] == pytest.approx(AT_ONE, rel=1e-12)


def test_the_order_of_posting_does_not_matter(plant: Plant) -> None:
    posts = [("radar", f"{DAY}06:00", 5.0), ("hand", f"{DAY}06:05", 5.055), ("float", f"{DAY}06:05", 4.99),
             ("radar", f"{DAY}06:10", 5.1)]  # fmt: skip
    answers = []
    for place, order in enumerate(itertools.permutations(posts)):
        if place % 5:
            continue
        name = f"tk-{place}"
        plant.tank(name, sources=SOURCES)
        for source, at, level in order:
            plant.read(name, at, source, level_m=level)
        answer = plant.vessel(name, f"{DAY}06:12")
        answers.append((answer["mass_kg"], answer["status"], codes(answer), sorted(checked(answer))))
    assert all(one == answers[0] for one in answers)
    mass, _, warned, checks = answers[0]
    assert mass == pytest.approx(5.1 * KG_PER_M, rel=1e-12)
    assert warned == ["sources_disagree"]  # the float is 60 mm off, the hand 5 mm, of 2 × 4.0
    assert [(source, round(off, 9)) for source, _, _, off in checks] == [("float", -0.06), ("hand", 0.005)]


def test_a_dip_after_the_reading_that_counts_is_a_check_too(plant: Plant) -> None:
    plant.tank("tk-1", sources=SOURCES)
    plant.read("tk-1", f"{DAY}06:00", "radar", level_m=5.0)
    plant.read("tk-1", f"{DAY}06:10", "hand", level_m=5.002)
    answer = plant.vessel("tk-1", f"{DAY}06:30")
    assert checked(answer) == [("hand", instant(f"{DAY}06:10"), 5.002, pytest.approx(0.002, abs=1e-12))]
    assert answer["mass_kg"] == pytest.approx(400_000.0, rel=1e-12)


@pytest.mark.parametrize("of", [None, "water"])
def test_two_readings_with_a_ticket_between_them_do_not_check_each_other(plant: Plant, of: str | None) -> None:
    plant.tank("tk-1", sources=SOURCES)
    plant.read("tk-1", f"{DAY}05:00", "radar", level_m=5.0)
    plant.read("tk-1", f"{DAY}05:40", "hand", level_m=5.667)
    assert codes(plant.vessel("tk-1", f"{DAY}05:45")) == ["sources_disagree"]
    said = {"mass_kg": 80_000.0} if of is None else {"mass_kg": 80_000.0, "of": of}
    plant.ticket("in", "boundary:jetty-1", "tk-1", f"{DAY}05:00", f"{DAY}06:00", **said)
    answer = plant.vessel("tk-1", f"{DAY}05:45")
    assert (answer["checks"], "sources_disagree" in codes(answer)) == ([], False)
    # Between two readings of the gauge the line is what it read then; at one of them, that.
    plant.read("tk-1", f"{DAY}05:50", "radar", level_m=5.835)
    (check,) = plant.vessel("tk-1", f"{DAY}05:50")["checks"]
    assert check["difference"] == pytest.approx(5.667 - (5.0 + 0.835 * 40 / 50), abs=1e-12)
    plant.read("tk-1", f"{DAY}05:55", "hand", level_m=5.91)
    plant.read("tk-1", f"{DAY}05:55", "radar", level_m=5.92)
    assert len(plant.vessel("tk-1", f"{DAY}05:55")["checks"]) == 1


def test_a_ticket_before_or_after_both_readings_leaves_the_check(plant: Plant) -> None:
    plant.tank("tk-1", sources=SOURCES)
    plant.read("tk-1", f"{DAY}05:00", "radar", level_m=5.0)
    plant.read("tk-1", f"{DAY}05:40", "hand", level_m=5.001)
    for name, first, last in (("a", "04:00", "05:00"), ("b", "05:40", "06:00")):
        plant.ticket(name, "boundary:jetty-1", "tk-1", f"{DAY}{first}", f"{DAY}{last}", mass_kg=80_000.0)
    assert len(plant.vessel("tk-1", f"{DAY}05:45")["checks"]) == 1


def test_an_ullage_and_an_offset_are_made_innages_before_they_are_compared(plant: Plant) -> None:
    hand = {"source": "hand", "instruments": {"ullage_m": {"random": 0.002, "systematic": 0.0, "offset": 0.01}}}
    plant.tank("tk-1", sources=[SOURCES[0], hand], gauging={"reference_height_m": 12.0})
    plant.read("tk-1", f"{DAY}06:00", "radar", level_m=5.0)
    plant.read("tk-1", f"{DAY}06:00", "hand", ullage_m=6.985)
    (check,) = plant.vessel("tk-1", f"{DAY}06:00")["checks"]
    assert check["value"] == pytest.approx(12.0 - 6.995, abs=1e-12)
    assert check["difference"] == pytest.approx(0.005, abs=1e-12)
    assert check["standard_uncertainty"] == pytest.approx(math.sqrt(0.001**2 + 0.003**2 + 0.002**2), rel=1e-12)


def test_temperatures_and_pressures_are_checked_as_levels_are(plant: Plant) -> None:
    plant.tank("tk-1", sources=SOURCES, assumed={}, instruments=BOX["instruments"] | {
        "liquid_temperature_c": {"random": 0.1, "systematic": 0.3}})  # fmt: skip
    plant.read("tk-1", f"{DAY}06:00", "radar", level_m=5.0, liquid_temperature_c=15.0)
    plant.read("tk-1", f"{DAY}06:00", "hand", liquid_temperature_c=16.5)
    answer = plant.vessel("tk-1", f"{DAY}06:00")
    (check,) = answer["checks"]
    assert (check["quantity"], check["difference"]) == ("liquid_temperature_c", pytest.approx(1.5, abs=1e-12))
    assert check["standard_uncertainty"] == pytest.approx(math.sqrt(2.0 * (0.1**2 + 0.3**2)), rel=1e-12)
    assert codes(answer) == ["sources_disagree"]


def test_without_an_order_of_sources_nothing_is_a_check(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.read("tk-1", f"{DAY}06:00", "radar", level_m=5.0)
    plant.read("tk-1", f"{DAY}06:10", "hand", level_m=6.0)
    answer = plant.vessel("tk-1", f"{DAY}06:20")
    assert (answer["checks"], codes(answer)) == ([], ["two_sources"])


def test_what_is_withdrawn_too_old_or_of_another_content_checks_nothing(plant: Plant) -> None:
    plant.tank("tk-1", sources=SOURCES, max_age_s={"level_m": 1200})
    plant.read("tk-1", f"{DAY}06:00", "radar", level_m=5.0)
    plant.read("tk-1", f"{DAY}06:20", "radar", level_m=5.0)
    plant.read("tk-1", f"{DAY}06:10", "hand", level_m=5.5)
    assert len(plant.vessel("tk-1", f"{DAY}06:25")["checks"]) == 1
    assert plant.vessel("tk-1", f"{DAY}06:31")["checks"] == []
    plant.put("substance", "other", OIL)
    plant.tank("tk-1", sources=SOURCES, max_age_s={"level_m": 1200}, substance="other",
               effective_from=f"{DAY}06:15:00Z")  # fmt: skip
    assert plant.vessel("tk-1", f"{DAY}06:25")["checks"] == []
    plant.read("tk-1", f"{DAY}06:20", "hand", level_m=5.5)
    assert len(plant.vessel("tk-1", f"{DAY}06:25")["checks"]) == 1
    plant.read("tk-1", f"{DAY}06:20", "hand", level_m=5.5, quality="bad")
    assert plant.vessel("tk-1", f"{DAY}06:25")["checks"] == []


def test_a_course_has_the_checks_of_each_instant(plant: Plant) -> None:
    plant.tank("tk-1", sources=SOURCES, max_age_s={"level_m": 1800})
    for minute in range(0, 60, 6):
        plant.read("tk-1", f"{DAY}06:{minute:02}", "radar", level_m=5.0 + minute / 100)
        plant.read("tk-1", f"{DAY}06:{minute + 2:02}", "hand", level_m=5.0 + minute / 90)
    plant.read("tk-1", f"{DAY}06:40", "float", level_m=5.1)
    found = take_stock.course(
        plant.store, plant.site, "tk-1", instant(f"{DAY}05:58"), instant(f"{DAY}07:40"), 180_000_000, None
    )["items"]
    seen = set()
    for item in found:
        alone = take_stock.vessel_inventory(plant.store, plant.site, "tk-1", item["at"], None)
        assert sorted(checked(item)) == sorted(checked(alone))
        assert [one["standard_uncertainty"] for one in item["checks"]] == [
            one["standard_uncertainty"] for one in alone["checks"]
        ]
        assert codes(item) == codes(alone)
        seen.add((len(item["checks"]), *codes(item)))
    assert {(0,), (1,), (1, "sources_disagree")} <= seen
    assert max(count for count, *_ in seen) == 2
