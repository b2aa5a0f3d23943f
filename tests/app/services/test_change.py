"""Why a mass differs between two instants: inputs one after another, which add up, beside what tickets moved."""

from __future__ import annotations

import math
import random
from typing import Any

import pytest

from app.errors import Conflict, NotFound, Unprocessable
from app.services import change
from tests.app.services.plant import BOX, KG_PER_M, OIL, Plant, instant

DAY = "2026-03-14T"
JETTY, RACK = "boundary:jetty-1", "boundary:rack-1"
BEFORE, AFTER = f"{DAY}06:00", f"{DAY}18:00"
PROPANE: dict[str, Any] = {
    "name": "propane",
    "liquid": {"model": "expansivity", "density_kg_m3": 507.4, "expansivity_per_k": [2.9e-3, 1.1e-5],
               "compressibility_per_kpa": 4.5e-6},
    "vapour": {"model": "virial", "components": [{"id": "propane", "mole_fraction": 1.0}]},
}  # fmt: skip
MIXED: dict[str, Any] = {
    "name": "gas",
    "vapour": {"model": "virial", "components": [{"id": "hydrogen", "mole_fraction": 0.9},
                                                 {"id": "nitrogen", "mole_fraction": 0.1}]},
}  # fmt: skip


def changed(plant: Plant, name: str = "tk-1", first: str = BEFORE, last: str = AFTER) -> dict[str, Any]:
    return change.change(plant.store, plant.site, name, instant(first), instant(last), None)


def steps(answer: dict[str, Any]) -> dict[str, float]:
    return {one["input"]: one["contribution_kg"] for one in answer["steps"]}


def adds_up(plant: Plant, answer: dict[str, Any], name: str = "tk-1") -> None:
    """The masses are those of the two inventories, the steps add up to their difference."""
    masses = [plant.vessel(name, at)["mass_kg"] for at in (BEFORE, AFTER)]
    assert [answer["mass_before_kg"], answer["mass_after_kg"]] == masses
    assert answer["difference_kg"] == pytest.approx(masses[1] - masses[0], abs=1e-9 * max(masses))
    total = math.fsum(one["contribution_kg"] for one in answer["steps"] if one["contribution_kg"] is not None)
    assert total == pytest.approx(answer["difference_kg"], abs=1e-9 * max(masses))


def test_each_input_is_replaced_after_the_one_before_it(plant: Plant) -> None:
    plant.put("substance", "warm", OIL | {"liquid": OIL["liquid"] | {"expansivity_per_k": 1e-3}})
    plant.tank("tk-1", substance="warm", assumed={})
    plant.read("tk-1", BEFORE, level_m=5.0, liquid_temperature_c=15.0, free_water_level_m=0.1)
    plant.read("tk-1", AFTER, level_m=5.2, liquid_temperature_c=25.0, free_water_level_m=0.3,
               observed_density_kg_m3=810.0, observed_density_temperature_c=15.0, sediment_water_pct=1.0,
               density_basis="dry")  # fmt: skip
    answer = changed(plant)
    warm = math.exp(-0.01)  # 10 K of β = 1e-3
    expected = {
        "level_m": 0.2 * KG_PER_M,
        "free_water_level_m": -0.2 * KG_PER_M,
        "liquid_temperature_c": 4.9 * KG_PER_M * (warm - 1.0),
        "observed_density_kg_m3": 490.0 * 10.0 * warm,
        "sediment_water_pct": -0.01 * 490.0 * 810.0 * warm,
    }
    found = {name: kilograms for name, kilograms in steps(answer).items() if kilograms}
    assert found == pytest.approx(expected, rel=1e-9)
    assert list(found) == list(expected)
    level = answer["steps"][0]
    assert (level["before"], level["after"], level["unit"]) == (5.0, 5.2, "m")
    temperature = next(one for one in answer["steps"] if one["input"] == "liquid_temperature_c")
    assert (temperature["before"], temperature["after"]) == pytest.approx((15.0, 25.0), abs=1e-9)
    adds_up(plant, answer)


def test_what_tickets_moved_stands_beside_and_the_rest_is_unexplained(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.tank("tk-2")
    plant.read("tk-1", BEFORE, level_m=5.0)
    plant.read("tk-1", AFTER, level_m=6.0)
    plant.ticket("ship", JETTY, "tk-1", f"{DAY}08:00", f"{DAY}10:00", mass_kg=100_000.0)
    plant.ticket("over", "tk-1", "tk-2", f"{DAY}12:00", f"{DAY}13:00", mass_kg=15_000.0)
    plant.ticket("half", "tk-1", RACK, f"{DAY}17:00", f"{DAY}19:00", mass_kg=8_000.0)
    plant.ticket("none", "tk-1", RACK, f"{DAY}11:00", f"{DAY}11:30", by="statement", unmetered=True)
    plant.ticket("drain", "tk-1", "boundary:drain", f"{DAY}11:00", f"{DAY}11:30", of="water", mass_kg=500.0)
    plant.ticket("next", JETTY, "tk-1", f"{DAY}18:00", f"{DAY}19:00", mass_kg=1.0)
    answer = changed(plant)
    moved = {one["transfer"]: one["mass_kg"] for one in answer["transfers"]}
    assert moved == {"ship": 100_000.0, "over": -15_000.0, "half": -4_000.0, "none": None}
    assert answer["difference_kg"] == pytest.approx(80_000.0, rel=1e-12)
    assert answer["unexplained_kg"] == pytest.approx(80_000.0 - 81_000.0, abs=1e-6)


def test_a_mass_that_was_carried_says_so_as_a_step(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.read("tk-1", f"{DAY}05:30", level_m=5.0)
    plant.read("tk-1", f"{DAY}17:30", level_m=5.1)
    plant.ticket("a", JETTY, "tk-1", f"{DAY}05:40", f"{DAY}05:50", mass_kg=3_000.0)
    plant.ticket("b", JETTY, "tk-1", f"{DAY}17:40", f"{DAY}17:50", mass_kg=5_000.0)
    answer = changed(plant)
    assert steps(answer) == pytest.approx({"level_m": 8_000.0, "moved_kg": 2_000.0}, rel=1e-9)
    adds_up(plant, answer)
    assert answer["unexplained_kg"] == pytest.approx(5_000.0, rel=1e-9)


def test_a_vessel_that_was_empty_or_weighed_changes_by_its_mass(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.read("tk-1", BEFORE, empty=True)
    plant.read("tk-1", f"{DAY}12:00", weighed_mass_kg=150_000.0)
    plant.read("tk-1", AFTER, level_m=2.0)
    answer = changed(plant)
    assert [(one["input"], one["before"], one["after"]) for one in answer["steps"]] == [
        ("mass_kg", 0.0, pytest.approx(160_000.0))
    ]
    adds_up(plant, answer)
    assert steps(changed(plant, last=f"{DAY}12:00")) == pytest.approx({"mass_kg": 150_000.0})
    assert steps(changed(plant, first=f"{DAY}12:00")) == pytest.approx({"mass_kg": 10_000.0})


def test_a_recalibrated_table_is_the_last_step(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.read("tk-1", BEFORE, level_m=5.0)
    plant.read("tk-1", AFTER, level_m=5.2)
    plant.tank("tk-1", shape=BOX["shape"] | {"length_m": 10.04}, effective_from=f"{DAY}12:00:00Z")
    answer = changed(plant)
    # 0.2 m of 100 m², then 0.4 m² over 5.2 m.
    assert steps(answer) == pytest.approx({"level_m": 16_000.0, "definition": 5.2 * 0.4 * 800.0}, rel=1e-9)
    adds_up(plant, answer)


def test_inputs_that_cannot_be_replaced_alone_are_told_together(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.read("tk-1", BEFORE, level_m=9.0, free_water_level_m=3.0)
    plant.read("tk-1", AFTER, level_m=1.0, free_water_level_m=0.5)
    answer = changed(plant)
    # A level of 1 m over 3 m of water is none: with the water's the two are 0.5 m less 6 m.
    assert steps(answer) == {"level_m": None, "free_water_level_m": pytest.approx(-5.5 * KG_PER_M, rel=1e-9)}
    adds_up(plant, answer)


def test_a_regraded_vessel_changes_by_its_definition_too(plant: Plant) -> None:
    plant.put("substance", "propane", PROPANE)
    plant.tank("tk-1", vapour_space={"kind": "open"})
    plant.read("tk-1", BEFORE, level_m=5.0)
    plant.tank("tk-1", substance="propane", vapour_space={"kind": "product"}, effective_from=f"{DAY}12:00:00Z")
    plant.read("tk-1", AFTER, level_m=3.0, pressure_kpa=650.0)
    answer = changed(plant)
    assert {"level_m", "definition"} <= set(steps(answer))
    adds_up(plant, answer)


SHAPES: dict[str, dict[str, Any]] = {
    "roof": {"shape": {"kind": "vertical_cylinder", "diameter_m": 30.0, "height_m": 15.0}, "assumed": {},
             "shell": {"expansion_per_k": 1.2e-5, "thickness_m": 0.012},
             "floating_roof": {"mass_kg": 120_000.0, "lands_at_m": 1.8, "floats_at_m": 2.1}},
    "bullet": {"shape": {"kind": "horizontal_cylinder", "diameter_m": 3.0, "length_m": 14.0, "tilt_deg": 1.0,
                         "gauge_at_m": 2.0, "left_head": {"kind": "hemispherical"},
                         "right_head": {"kind": "ellipsoidal", "depth_m": 0.75}},
               "substance": "propane", "assumed": {}, "shell": {"thickness_m": 0.018}},
    "receiver": {"shape": {"kind": "fixed_volume", "volume_m3": 95.0}, "substance": "gas", "assumed": {}},
    "table": {"shape": {"kind": "capacity_table", "of": "vertical_cylinder", "diameter_m": 30.0,
                        "rows": [[0.0, 3.0], [5.0, 3520.0], [15.0, 10_600.0]]}, "assumed": {},
              "shell": {"expansion_per_k": 1.2e-5}},
}  # fmt: skip


def reading(kind: str, draw: random.Random) -> dict[str, Any]:
    """Something of everything that such a vessel may read, some of it left out now and then."""
    surroundings = {"ambient_temperature_c": draw.uniform(-10.0, 30.0)}
    gas = {"pressure_kpa": draw.uniform(550.0, 700.0), "vapour_temperature_c": draw.uniform(10.0, 30.0)}
    if kind == "receiver":
        hydrogen = draw.uniform(0.7, 0.95)
        analysis = {"vapour_composition": {"hydrogen": hydrogen, "nitrogen": 1.0 - hydrogen}}
        return surroundings | gas | {"pressure_kpa": draw.uniform(1e3, 6e3)} | (analysis if draw.random() < 0.7 else {})
    highest = 2.8 if kind == "bullet" else 14.0
    liquid = {"level_m": draw.uniform(0.6, highest), "liquid_temperature_c": draw.uniform(5.0, 25.0)}
    if kind == "bullet":
        return surroundings | liquid | (gas if draw.random() < 0.6 else {})
    sample = {"observed_density_kg_m3": draw.uniform(780.0, 830.0), "sediment_water_pct": draw.uniform(0.0, 1.0),
              "observed_density_temperature_c": draw.uniform(10.0, 30.0), "density_basis": draw.choice(["wet", "dry"])}
    water = {"free_water_level_m": draw.uniform(0.0, 0.5)}
    load = {"roof_load_kg": draw.uniform(0.0, 30_000.0)} if kind == "roof" else {}
    said = surroundings | liquid | load
    return said | (sample if draw.random() < 0.7 else {}) | (water if draw.random() < 0.7 else {})


@pytest.mark.parametrize("recalibrated", [False, True], ids=["kept", "recalibrated"])
@pytest.mark.parametrize("kind", SHAPES)
def test_steps_add_up_for_whatever_was_read(plant: Plant, kind: str, recalibrated: bool) -> None:
    draw = random.Random(f"{kind} {recalibrated}")
    plant.put("substance", "propane", PROPANE)
    plant.put("substance", "gas", MIXED)
    plant.put("substance", "warm", OIL | {"liquid": OIL["liquid"] | {"expansivity_per_k": 8e-4,
                                                                     "compressibility_per_kpa": 7e-7}})  # fmt: skip
    body = {"substance": "warm"} | SHAPES[kind]
    for place in range(3):
        name = f"tk-{place}"
        plant.tank(name, **body)
        plant.read(name, BEFORE, **reading(kind, draw))
        plant.read(name, AFTER, **reading(kind, draw))
        if recalibrated:
            shell = body.get("shell", {}) | {"expansion_per_k": 1.5e-5}
            shape = dict(body["shape"])
            if kind == "table":
                shape["rows"] = [[0.0, 5.0], [15.0, 10_650.0]]
            elif kind == "receiver":
                shape["volume_m3"] = 94.2
            else:
                shape["diameter_m"] *= 1.01
            plant.tank(name, **body | {"shell": shell, "shape": shape}, effective_from=f"{DAY}12:00:00Z")
        answer = changed(plant, name)
        adds_up(plant, answer, name)
        assert ("definition" in steps(answer)) is recalibrated
        if kind == "receiver" and not recalibrated:
            assert set(steps(answer)) <= {"pressure_kpa_abs", "vapour_temperature_c", "ambient_temperature_c",
                                          "vapour_composition"}  # fmt: skip


def test_what_cannot_be_compared_is_refused(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.put("vessel", "manifold", {"name": "manifold", "shape": {"kind": "junction"}})
    plant.read("tk-1", BEFORE, level_m=5.0)
    with pytest.raises(Unprocessable, match="after from"):
        changed(plant, last=BEFORE)
    with pytest.raises(Conflict, match="no measured mass"):
        changed(plant)
    with pytest.raises(Conflict, match="junction"):
        changed(plant, "manifold")
    plant.tank("tk-1", service="out", effective_from=f"{DAY}12:00:00Z")
    with pytest.raises(Conflict, match="out of service"):
        changed(plant)
    with pytest.raises(NotFound):
        changed(plant, "tk-9")
