"""Which value counts, through the store: sources, ages, interpolation, withdrawal, offsets, and what was known."""

from __future__ import annotations

from typing import Any

import pytest

from app.errors import NotFound, Unprocessable
from app.services import take_stock
from tests.app.services.plant import BOX, KG_PER_M, OIL, Plant, instant, row

SECOND = 1_000_000
INSTRUMENTS = BOX["instruments"]


def level(answer: dict[str, Any]) -> dict[str, Any]:
    return next(one for one in answer["inputs"] if one["quantity"] == "level_m")


def quantity(answer: dict[str, Any], name: str) -> dict[str, Any]:
    return next(one for one in answer["inputs"] if one["quantity"] == name)


def codes(answer: dict[str, Any]) -> list[str]:
    return [one["code"] for one in answer["warnings"]]


def course(plant: Plant, name: str, first: str, last: str, every_s: int, as_of: int | None = None) -> dict[str, Any]:
    return take_stock.course(
        plant.store, plant.site, name, instant(first), instant(last), every_s * SECOND, as_of
    )  # fmt: skip


def test_a_level_becomes_a_mass_with_its_uncertainty(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.read("tk-1", "2026-03-14T06:00", level_m=5.0)
    answer = plant.vessel("tk-1", "2026-03-14T06:00")
    assert answer["status"] == "measured"
    assert answer["mass_kg"] == pytest.approx(400_000.0, rel=1e-12)
    # Level 1 mm and 3 mm at 80,000 kg/m: 80 and 240 kg; capacity 0.1 %: 400; density 2 of 800: 1,000.
    assert answer["mass_uncertainty_kg"] == pytest.approx((80**2 + 240**2 + 400**2 + 1000**2) ** 0.5, rel=1e-9)
    assert level(answer) == {"quantity": "level_m", "value": 5.0, "age_s": 0.0, "source": "", "quality": "good"}


def test_the_first_source_counts_until_it_is_too_old_and_then_the_next(plant: Plant) -> None:
    plant.tank("tk-1", sources=[{"source": "radar"}, {"source": "hand"}], max_age_s={"level_m": 900})
    plant.read("tk-1", "2026-03-14T06:00", "radar", level_m=5.0)
    plant.read("tk-1", "2026-03-14T06:10", "hand", level_m=6.0)
    plant.read("tk-1", "2026-03-14T06:12", "other", level_m=7.0)
    found = [level(plant.vessel("tk-1", f"2026-03-14T06:{minute}")) for minute in ("14", "16", "26")]
    assert [(one["source"], one["value"]) for one in found] == [("radar", 5.0), ("hand", 6.0), ("other", 7.0)]
    assert found[1]["age_s"] == 360.0
    late = plant.vessel("tk-1", "2026-03-14T06:28")
    assert (late["status"], late["mass_kg"]) == ("unmeasured", None)
    assert late["reason"]["code"] == "input_missing"


def test_without_an_order_the_newest_source_counts_and_is_said_to(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.read("tk-1", "2026-03-14T06:00", "radar", level_m=5.0)
    plant.read("tk-1", "2026-03-14T06:10", "hand", level_m=6.0)
    answer = plant.vessel("tk-1", "2026-03-14T06:20")
    assert level(answer)["source"] == "hand"
    assert "two_sources" in codes(answer)


def test_between_two_readings_the_level_is_on_the_line_and_a_sample_is_not(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.read(
        "tk-1", "2026-03-14T06:00", level_m=5.0, observed_density_kg_m3=800.0, observed_density_temperature_c=15.0
    )
    plant.read(
        "tk-1", "2026-03-14T06:40", level_m=6.0, observed_density_kg_m3=900.0, observed_density_temperature_c=15.0
    )
    answer = plant.vessel("tk-1", "2026-03-14T06:10")
    assert level(answer)["value"] == pytest.approx(5.25, abs=1e-12)
    assert answer["mass_kg"] == pytest.approx(5.25 * KG_PER_M, rel=1e-12)
    assert quantity(answer, "observed_density_kg_m3")["value"] == 800.0
    # Further apart than the age: the one before counts, and its age is said.
    plant.read("tk-1", "2026-03-14T08:00", level_m=9.0)
    apart = plant.vessel("tk-1", "2026-03-14T07:00")
    assert (level(apart)["value"], level(apart)["age_s"]) == (6.0, 1200.0)


def test_laboratory_values_hold_until_they_are_replaced(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.read(
        "tk-1", "2024-03-14T06:00", "laboratory", observed_density_kg_m3=820.0, observed_density_temperature_c=15.0
    )
    plant.read("tk-1", "2026-03-14T06:00", level_m=5.0)
    answer = plant.vessel("tk-1", "2026-03-14T06:00")
    assert answer["standard_density_kg_m3"] == pytest.approx(820.0, rel=1e-12)
    assert answer["mass_kg"] == pytest.approx(500.0 * 820.0, rel=1e-12)
    plant.read(
        "tk-1", "2026-03-14T05:00", "laboratory", observed_density_kg_m3=830.0, observed_density_temperature_c=15.0
    )
    assert plant.vessel("tk-1", "2026-03-14T06:00")["mass_kg"] == pytest.approx(500.0 * 830.0, rel=1e-12)


def test_a_withdrawn_value_is_passed_over_for_the_one_before(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.read("tk-1", "2026-03-14T05:50", level_m=5.0)
    plant.read("tk-1", "2026-03-14T06:00", level_m=8.0)
    assert level(plant.vessel("tk-1", "2026-03-14T06:00"))["value"] == 8.0
    plant.read("tk-1", "2026-03-14T06:00", level_m=8.0, quality="bad")
    answer = plant.vessel("tk-1", "2026-03-14T06:00")
    assert (level(answer)["value"], level(answer)["age_s"]) == (5.0, 600.0)
    # Nor does it stand at the far end of a line.
    assert level(plant.vessel("tk-1", "2026-03-14T05:55"))["value"] == 5.0


def test_an_uncertain_value_counts_and_makes_the_inventory_uncertain(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.read("tk-1", "2026-03-14T06:00", level_m=5.0, quality="uncertain")
    answer = plant.vessel("tk-1", "2026-03-14T06:00")
    assert answer["status"] == "uncertain"
    assert "input_uncertain" in codes(answer)


def test_what_is_assumed_counts_where_nothing_is_read_and_says_so(plant: Plant) -> None:
    plant.tank("tk-1", assumed=BOX["assumed"] | {"level_m": {"value": 2.0, "standard_uncertainty": 0.5}})
    answer = plant.vessel("tk-1", "2026-03-14T06:00")
    assert answer["mass_kg"] == pytest.approx(2.0 * KG_PER_M, rel=1e-12)
    assert level(answer) == {"quantity": "level_m", "value": 2.0, "quality": "assumed"}
    assert "input_assumed" in codes(answer)
    # 0.5 m: 40,000 kg; capacity 0.1 % of 160,000: 160; density 2 of 800: 400.
    assert answer["mass_uncertainty_kg"] == pytest.approx((40_000**2 + 160**2 + 400**2) ** 0.5, rel=1e-9)
    plant.read("tk-1", "2026-03-14T06:00", level_m=5.0)
    assert level(plant.vessel("tk-1", "2026-03-14T06:00"))["quality"] == "good"


def test_an_offset_is_added_and_an_ullage_is_taken_from_the_reference_height(plant: Plant) -> None:
    instruments = INSTRUMENTS | {"level_m": INSTRUMENTS["level_m"] | {"offset": -0.02}, "ullage_m": {"offset": 0.01}}
    plant.tank("tk-1", gauging={"reference_height_m": 12.0}, instruments=instruments)
    plant.read("tk-1", "2026-03-14T06:00", level_m=5.0)
    assert plant.vessel("tk-1", "2026-03-14T06:00")["mass_kg"] == pytest.approx(4.98 * KG_PER_M, rel=1e-12)
    plant.read("tk-1", "2026-03-14T06:30", ullage_m=5.0)
    answer = plant.vessel("tk-1", "2026-03-14T06:30")
    assert level(answer)["value"] == pytest.approx(12.0 - 5.01, abs=1e-12)
    assert answer["mass_kg"] == pytest.approx(6.99 * KG_PER_M, rel=1e-12)


def test_a_vessels_own_ambient_reading_wins_over_the_sites(plant: Plant) -> None:
    # 12e-6/K bare wall, 7/8 of the liquid's temperature: 15 °C of liquid leave 1/8 of the ambient's distance.
    shell = {"expansion_per_k": 1.2e-5, "at_temperature_c": 15.0}
    for name in ("tk-1", "tk-2"):
        plant.tank(name, shell=shell)
        plant.read(name, "2026-03-14T06:00", level_m=5.0)
    plant.read(None, "2026-03-14T05:00", ambient_temperature_c=-25.0)
    plant.read("tk-2", "2026-03-14T04:00", ambient_temperature_c=23.0)
    found = plant.inventory("2026-03-14T06:00")
    one, other = found["vessels"]
    # Two sides of the box move: the area by the square of 1 + α ΔT, to the second order.
    assert one["mass_kg"] == pytest.approx(400_000.0 * (1.0 + 2.0 * 1.2e-5 * -40.0 / 8.0), rel=1e-8)
    assert other["mass_kg"] == pytest.approx(400_000.0 * (1.0 + 2.0 * 1.2e-5 * 8.0 / 8.0), rel=1e-8)


def test_what_is_out_of_service_holds_nothing_and_no_total_lacks_it(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.tank("tk-2", service="out")
    plant.read("tk-1", "2026-03-14T06:00", level_m=5.0)
    found = plant.inventory("2026-03-14T06:00")
    assert [(one["status"], one["mass_kg"]) for one in found["vessels"]] == [
        ("measured", 400_000.0), ("out_of_service", 0.0),
    ]  # fmt: skip
    (total,) = found["totals"]
    assert (total["complete"], total["vessels"], total["missing"]) == (True, ["tk-1"], [])


def test_totals_add_shared_errors_as_shared_and_name_what_is_missing(plant: Plant) -> None:
    gauge = {"level_m": {"random": 0.0, "systematic": 0.003, "instrument": "tape 7"},
             "capacity_pct": {"systematic": 0.0, "local": 0.0}}  # fmt: skip
    for name in ("tk-1", "tk-2", "tk-3"):
        plant.tank(name, instruments=INSTRUMENTS | gauge)
    plant.read("tk-1", "2026-03-14T06:00", level_m=5.0)
    plant.read("tk-2", "2026-03-14T06:00", level_m=3.0)
    (total,) = plant.inventory("2026-03-14T06:00")["totals"]
    assert total["mass_kg"] == pytest.approx(640_000.0, rel=1e-12)
    # One tape: 240 + 240 kg; one density, 2 of 800 kg/m³: 1,000 + 600 kg.
    assert total["mass_uncertainty_kg"] == pytest.approx((480.0**2 + 1600.0**2) ** 0.5, rel=1e-9)
    assert (total["complete"], total["missing"]) == (False, ["tk-3"])
    unmeasured = row(plant.inventory("2026-03-14T06:00"), "tk-3")
    assert (unmeasured["status"], unmeasured["mass_kg"]) == ("unmeasured", None)


def numbers(answer: dict[str, Any]) -> dict[str, Any]:
    """An answer without the sentence that says why there is none: a course knows of values out of reach, too."""
    return answer | {"reason": answer.get("reason", {}).get("code")}


def test_the_course_says_the_same_as_the_inventory_of_each_instant(plant: Plant) -> None:
    hand = {"source": "hand", "instruments": {"level_m": {"random": 0.002, "offset": 0.05}}}
    plant.put("substance", "warm", OIL | {"liquid": OIL["liquid"] | {"expansivity_per_k": 8e-4}})
    plant.tank(
        "tk-1", substance="warm", sources=[{"source": "radar"}, hand], max_age_s={"level_m": 1200, "ullage_m": 1200},
        shell={"thickness_m": 0.01}, gauging={"reference_height_m": 12.0}, assumed={},
    )  # fmt: skip
    plant.tank("tk-2", substance="warm")
    for minute, value in ((0, 5.0), (10, 5.1), (20, 5.4), (50, 5.5)):
        temperature = 20.0 + minute / 10
        plant.read("tk-1", f"2026-03-14T06:{minute:02}", "radar", level_m=value, liquid_temperature_c=temperature)
    plant.read("tk-1", "2026-03-14T06:20", "radar", level_m=5.4, quality="bad")
    plant.read("tk-1", "2026-03-14T06:40", "hand", ullage_m=6.55, free_water_level_m=0.1)
    plant.read("tk-1", "2026-03-14T06:35", "hand", level_m=5.42, quality="uncertain")
    plant.read("tk-1", "2026-03-14T06:15", "laboratory", observed_density_kg_m3=790.0,
               observed_density_temperature_c=25.0, sediment_water_pct=0.2)  # fmt: skip
    plant.read(None, "2026-03-14T06:20", ambient_temperature_c=3.0, barometric_pressure_kpa_abs=100.2)
    plant.read("tk-1", "2026-03-14T06:40", ambient_temperature_c=4.0)
    found = course(plant, "tk-1", "2026-03-14T05:50", "2026-03-14T08:10", 300)["items"]
    assert len(found) == 28
    states = []
    for item in found:
        asked = take_stock.vessel_inventory(plant.store, plant.site, "tk-1", item["at"], None)
        among = take_stock.site_inventory(plant.store, plant.site, item["at"], None)
        assert numbers(asked) == numbers(row(among, "tk-1"))
        assert item["status"] == asked["status"]
        levels = [one for one in item["inputs"] if one["quantity"] == "level_m"]
        if levels and levels[0]["age_s"] == 0.0:  # read at that instant, or on the line between two readings
            assert numbers(item) == numbers(asked)
            states.append(item["status"])
    # 06:00 to 06:10 on the line, 06:35, 06:40, 06:50.
    assert states == ["measured"] * 3 + ["uncertain"] + ["measured"] * 2


def test_a_course_is_cut_where_a_definition_changes(plant: Plant) -> None:
    plant.tank("tk-1")
    for hour in ("06", "07", "08", "09"):
        plant.read("tk-1", f"2026-03-14T{hour}:00", level_m=5.0)
    wider = BOX["shape"] | {"length_m": 11.0}
    plant.tank("tk-1", shape=wider, effective_from="2026-03-14T07:00:00Z")
    plant.put("substance", "oil", OIL | {"liquid": OIL["liquid"] | {"density_kg_m3": 900.0},
                                         "effective_from": "2026-03-14T08:00:00Z"})  # fmt: skip
    plant.tank("tk-1", shape=wider, service="out", effective_from="2026-03-14T09:00:00Z")
    found = course(plant, "tk-1", "2026-03-14T06:30", "2026-03-14T09:30", 1800)["items"]
    assert [one["mass_kg"] for one in found] == pytest.approx(
        [400_000.0, 440_000.0, 440_000.0, 495_000.0, 495_000.0, 0.0], rel=1e-12
    )
    assert found[-1]["status"] == "out_of_service"
    cited = [[one["effective_from"] for one in item["definitions"] if one["kind"] == "vessel"] for item in found]
    assert cited[0] == [None] and cited[1] == [instant("2026-03-14T07:00")]


def test_as_of_gives_an_answer_again_whatever_was_written_since(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.read("tk-1", "2026-03-14T06:00", level_m=5.0)
    first = plant.inventory("2026-03-14T06:10")
    course_then = course(plant, "tk-1", "2026-03-14T06:00", "2026-03-14T07:00", 600)
    plant.read("tk-1", "2026-03-14T06:00", level_m=5.5)
    plant.read("tk-1", "2026-03-14T06:20", level_m=7.0)
    plant.read(
        "tk-1", "2026-03-14T05:00", "laboratory", observed_density_kg_m3=700.0, observed_density_temperature_c=15.0
    )
    plant.tank("tk-1", shape=BOX["shape"] | {"length_m": 20.0}, effective_from="2026-01-01T00:00:00Z")
    plant.tank("tk-2")
    now = plant.inventory("2026-03-14T06:10")
    assert now["known_at"] > first["known_at"]
    # Half way from 5.5 to 7.0 m, 200 m², 700 kg/m³.
    assert row(now, "tk-1")["mass_kg"] == pytest.approx(6.25 * 200.0 * 700.0, rel=1e-12)
    assert plant.inventory("2026-03-14T06:10", as_of=first["known_at"]) == first
    assert plant.inventory("2026-03-14T06:10", as_of=now["known_at"]) == now
    then = course(plant, "tk-1", "2026-03-14T06:00", "2026-03-14T07:00", 600, as_of=course_then["known_at"])
    assert then == course_then


def test_what_cannot_be_asked_is_refused(plant: Plant) -> None:
    plant.put("vessel", "manifold", {"name": "manifold", "shape": {"kind": "junction"}})
    with pytest.raises(NotFound):
        plant.vessel("tk-9", "2026-03-14T06:00")
    with pytest.raises(Unprocessable, match="junction"):
        plant.vessel("manifold", "2026-03-14T06:00")
    with pytest.raises(Unprocessable, match="after from"):
        course(plant, "manifold", "2026-03-14T06:00", "2026-03-14T06:00", 60)
    with pytest.raises(Unprocessable, match="10,000 points"):
        course(plant, "manifold", "2026-03-14T06:00", "2026-03-15T06:00", 8)
    with pytest.raises(NotFound):
        take_stock.site_inventory(plant.store, "no-such-site", 0, None)
