"""What was read becomes candidates: offsets corrected, sources apart, no further back than a value counts."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest

from app.services.choose import choose
from app.services.collect import INPUTS, collect, conversion, names_of
from app.services.in_force import site_in_force
from app.store.sites import number
from tests.app.services.plant import KG_PER_M, Plant, instant
from tests.app.services.worked import TANK, compiled


def test_an_offset_is_added_and_an_ullage_hangs_from_the_reference_height() -> None:
    vessel = compiled(
        TANK, gauging={"reference_height_m": 15.5},
        instruments={"level_m": {"offset": -0.011}, "ullage_m": {"offset": 0.02}},
    )  # fmt: skip
    assert conversion(vessel, "level_m", "radar")(8.0, 0) == pytest.approx(7.989, abs=1e-12)
    assert conversion(vessel, "ullage_m", "hand")(7.5, 0) == pytest.approx(15.5 - 7.52, abs=1e-12)
    assert conversion(vessel, "liquid_temperature_c", "radar")(20.0, 0) == 20.0


def test_every_input_looks_at_quantities_of_its_own() -> None:
    every = [quantity for spec in INPUTS if not spec.of_site for quantity in spec.quantities]
    assert len(every) == len(set(every))
    density = next(spec for spec in INPUTS if spec.name == "density")
    assert "observed_density_temperature_c" in names_of(density)
    assert names_of(density)[0] == "observed_density_kg_m3"


def mass(plant: Plant, at: str) -> float | None:
    found: dict[str, Any] = plant.vessel("tk", at)
    weighed = found["mass_kg"]
    return None if weighed is None else float(weighed)


def level_at(plant: Plant, at: str) -> float:
    """The level that counts at an instant, by its source's rank and age."""
    when = instant(at)
    with plant.store.reading() as connection:
        site = number(connection, plant.site)
        held = site_in_force(connection, site, plant.site, when, plant.known(), "tk")
        found = collect(connection, site, held.vessels, np.array([when]), plant.known())
    return float(choose(found.candidates["level"], found.at, interpolates=True).value[0])


def test_the_vessels_order_of_sources_chooses_and_age_hands_over(plant: Plant) -> None:
    plant.tank("tk", sources=[{"source": "radar"}, {"source": "hand"}], max_age_s={"level_m": 3600})
    plant.read("tk", "2026-03-14T06:00", "radar", level_m=4.0)
    plant.read("tk", "2026-03-14T06:30", "hand", level_m=5.0)
    assert level_at(plant, "2026-03-14T06:45") == 4.0
    assert level_at(plant, "2026-03-14T07:15") == 5.0
    assert math.isnan(level_at(plant, "2026-03-14T07:31"))


def test_between_two_values_of_one_source_a_level_is_interpolated(plant: Plant) -> None:
    plant.tank("tk")
    plant.read("tk", "2026-03-14T06:00", "radar", level_m=4.0)
    plant.read("tk", "2026-03-14T06:40", "radar", level_m=5.0)
    assert mass(plant, "2026-03-14T06:10") == pytest.approx(4.25 * KG_PER_M)
    assert mass(plant, "2026-03-14T06:40") == pytest.approx(5.0 * KG_PER_M)


def test_a_sample_keeps_its_temperature_and_another_reading_lends_none(plant: Plant) -> None:
    plant.tank("tk")
    plant.read("tk", "2026-03-14T06:00", level_m=4.0)
    plant.read("tk", "2026-03-14T05:00", "lab", observed_density_kg_m3=790.0, observed_density_temperature_c=25.0)
    plant.read("tk", "2026-03-14T05:30", "lab", observed_density_kg_m3=795.0)
    assert mass(plant, "2026-03-14T06:00") == pytest.approx(4.0 * KG_PER_M * 795.0 / 800.0)
    assert instant("2026-03-14T06:00") == 1_773_468_000_000_000
