"""A content is blended by mass and standard volume since its sample; what cannot be blended is known less well."""

from __future__ import annotations

import math
from typing import Any

import pytest

from tests.app.services.plant import Plant

DRAWN, RECEIVED, READ = "2026-03-14T00:00", ("2026-03-14T01:00", "2026-03-14T02:00"), "2026-03-14T03:00"
LAB = {
    "observed_density_kg_m3": {"random": 0.0, "systematic": 0.0},
    "observed_density_temperature_c": {"systematic": 0.0},
    "sediment_water_pct": {"random": 0.0, "systematic": 0.0},
    "level_m": {"random": 0.0, "systematic": 0.0},
    "liquid_temperature_c": {"random": 0.0, "systematic": 0.0},
    "capacity_pct": {"systematic": 0.0, "local": 0.0},
}
AT_15 = {"density_temperature_c": 15.0}


def sampled(plant: Plant, **said: Any) -> None:
    """A tank of 100 m² with a sample at midnight and an exact gauge."""
    plant.tank("tk-1", instruments=LAB)
    plant.read("tk-1", DRAWN, "lab", observed_density_kg_m3=800.0, observed_density_temperature_c=15.0, **said)


def came(plant: Plant, mass: float, name: str = "in", source: str = "boundary:jetty", **said: Any) -> None:
    plant.ticket(name, source, "tk-1", *RECEIVED, mass_kg=mass, mass_uncertainty_kg=0.0, **said)


def holds(plant: Plant, level: float) -> dict[str, Any]:
    plant.read("tk-1", READ, level_m=level)
    return plant.vessel("tk-1", READ)


def codes(answer: dict[str, Any]) -> list[str]:
    return [one["code"] for one in answer["warnings"] if one["code"] == "sample_predates_receipt"]


def test_densities_blend_by_volume(plant: Plant) -> None:
    """300 m³ × 800 and 100 m³ × 840: 324,000 kg in 400 m³; the shift of 10 kg/m³ over √3 is the error."""
    sampled(plant)
    came(plant, 84_000.0, density_kg_m3=840.0, **AT_15)
    answer = holds(plant, 4.0)
    assert answer["standard_density_kg_m3"] == pytest.approx(810.0, rel=1e-12)
    assert answer["mass_kg"] == pytest.approx(324_000.0, rel=1e-12)
    assert answer["mass_uncertainty_kg"] == pytest.approx(10.0 / math.sqrt(3.0) * 400.0, rel=1e-9)
    assert (answer["status"], codes(answer)) == ("uncertain", ["sample_predates_receipt"])


@pytest.mark.parametrize(
    ("started", "ended", "density"),
    [
        ("2026-03-14T00:10", "2026-03-14T00:50", 810.0),  # before the receipt: of the heel, 300 + 100 m³ remain
        ("2026-03-14T02:10", "2026-03-14T02:50", 808.0),  # after it: of the blend, 400 + 100 m³ were there
        (*RECEIVED, 808.0),  # at once: as if after it
    ],
)
def test_what_left_was_as_the_content_was_then(plant: Plant, started: str, ended: str, density: float) -> None:
    """80,000 kg left, 100 m³ by the sample's 800: 400 m³ of heel and 100 m³ of 840 were there in all."""
    sampled(plant)
    came(plant, 84_000.0, density_kg_m3=840.0, **AT_15)
    plant.ticket("out", "tk-1", "boundary:rack", started, ended, mass_kg=80_000.0, mass_uncertainty_kg=0.0)
    assert holds(plant, 4.0)["standard_density_kg_m3"] == pytest.approx(density, rel=1e-12)


def test_a_receipt_of_no_density_leaves_the_samples_and_three_on_its_share(plant: Plant) -> None:
    """A quarter came: 3 kg/m³ × ¼ × 400 m³ = 300 kg."""
    sampled(plant)
    came(plant, 80_000.0)
    answer = holds(plant, 4.0)
    assert answer["mass_kg"] == pytest.approx(320_000.0, rel=1e-12)
    assert answer["mass_uncertainty_kg"] == pytest.approx(300.0, rel=1e-9)


def test_an_unmetered_receipt_may_be_all_of_it(plant: Plant) -> None:
    """Nobody knows how much came: 3 kg/m³ on all of the 400 m³."""
    sampled(plant)
    plant.ticket("in", "boundary:jetty", "tk-1", *RECEIVED, unmetered=True, by="gauging")
    assert holds(plant, 4.0)["mass_uncertainty_kg"] == pytest.approx(1_200.0, rel=1e-9)


def test_the_waters_share_blends_by_volume(plant: Plant) -> None:
    """300 m³ with 10 % and 100 m³ with 50 %: 80 of 400 m³ are water; 320 m³ × 800 = 256,000 kg.

    The share went from 10 to 20 %: a tenth of 400 m³ × 800 over √3.
    """
    sampled(plant, sediment_water_pct=10.0, density_basis="dry")
    plant.ticket("in", "boundary:jetty", "tk-1", *RECEIVED, standard_volume_m3=100.0, sediment_water_pct=50.0,
                 density_kg_m3=800.0, mass_uncertainty_kg=0.0, **AT_15)  # fmt: skip
    answer = holds(plant, 4.0)
    assert answer["mass_kg"] == pytest.approx(256_000.0, rel=1e-12)
    assert answer["net_standard_volume_m3"] == pytest.approx(320.0, rel=1e-12)
    assert answer["mass_uncertainty_kg"] == pytest.approx(32_000.0 / math.sqrt(3.0), rel=1e-9)


def test_water_and_density_each_blend_since_their_own_sample(plant: Plant) -> None:
    """The water was sampled again after the receipt, 20 %; the density was not: 270 × 800 and 80 × 840 of 350 net m³.

    Heel: 400 m³ less the receipt's 80 net and 20 of water, 300 m³, of which by the new sample 240 are net.
    (240 × 800 + 80 × 840) / 320 = 810.
    """
    sampled(plant)
    plant.read("tk-1", DRAWN, "water lab", sediment_water_pct=10.0)
    plant.ticket("in", "boundary:jetty", "tk-1", *RECEIVED, standard_volume_m3=100.0, sediment_water_pct=20.0,
                 density_kg_m3=840.0, mass_uncertainty_kg=0.0, **AT_15)  # fmt: skip
    plant.read("tk-1", "2026-03-14T02:30", "water lab", sediment_water_pct=20.0, density_basis="dry")
    answer = holds(plant, 4.0)
    assert answer["standard_density_kg_m3"] == pytest.approx(810.0, rel=1e-12)
    assert answer["mass_kg"] == pytest.approx(320.0 * 810.0, rel=1e-12)
    assert answer["mass_uncertainty_kg"] == pytest.approx(10.0 / math.sqrt(3.0) * 320.0, rel=1e-9)


def test_a_tank_whose_water_was_never_sampled_stays_dry(plant: Plant) -> None:
    """The ticket's 20 % settle as free water, if at all: 320 m³ × 800 and 80 m³ net × 840 make 808."""
    sampled(plant)
    plant.ticket("in", "boundary:jetty", "tk-1", *RECEIVED, standard_volume_m3=100.0, sediment_water_pct=20.0,
                 density_kg_m3=840.0, mass_uncertainty_kg=0.0, **AT_15)  # fmt: skip
    answer = holds(plant, 4.0)
    assert answer["standard_density_kg_m3"] == pytest.approx(808.0, rel=1e-12)
    assert answer["net_standard_volume_m3"] == pytest.approx(400.0, rel=1e-12)


@pytest.mark.parametrize(
    ("started", "ended"),
    [("2026-03-13T22:00", "2026-03-14T00:00"), ("2026-03-14T03:00", "2026-03-14T04:00")],
)
def test_a_receipt_before_the_sample_or_after_the_reading_is_none(plant: Plant, started: str, ended: str) -> None:
    sampled(plant)
    plant.ticket("in", "boundary:jetty", "tk-1", started, ended, mass_kg=80_000.0, mass_uncertainty_kg=0.0)
    answer = holds(plant, 4.0)
    assert (answer["status"], codes(answer)) == ("measured", [])


def test_free_water_that_came_is_no_receipt(plant: Plant) -> None:
    sampled(plant)
    came(plant, 10_000.0, of="water")
    assert codes(holds(plant, 4.0)) == []


def test_a_gas_says_that_its_analysis_is_old(plant: Plant) -> None:
    gas = {"model": "virial", "components": [{"id": "nitrogen", "mole_fraction": 1.0}]}
    plant.put("substance", "gas", {"name": "gas", "vapour": gas})
    plant.put("vessel", "r-1", {"name": "r", "substance": "gas", "shape": {"kind": "fixed_volume", "volume_m3": 10.0}})
    plant.read("r-1", DRAWN, "lab", vapour_composition={"nitrogen": 0.99, "oxygen": 0.01})
    plant.read("r-1", READ, pressure_kpa=900.0, vapour_temperature_c=20.0)
    before = plant.vessel("r-1", READ)
    assert (before["status"], codes(before)) == ("measured", [])
    plant.ticket("in", "boundary:plant", "r-1", *RECEIVED, mass_kg=5.0)
    after = plant.vessel("r-1", READ)
    assert (after["status"], codes(after)) == ("uncertain", ["sample_predates_receipt"])
    assert after["mass_kg"] == before["mass_kg"]


def analysed_liquid(plant: Plant) -> None:
    """A tank of 100 m² whose liquid is known by an analysis of midnight."""
    parts = [{"id": "propane", "mole_fraction": 0.6}, {"id": "n-butane", "mole_fraction": 0.4}]
    plant.put("substance", "lpg", {"name": "lpg", "liquid": {"model": "light_hydrocarbon", "components": parts}})
    plant.tank("tk-1", instruments=LAB, substance="lpg")
    plant.read("tk-1", DRAWN, "lab", liquid_composition={"propane": 0.5, "n-butane": 0.5})


def test_a_liquid_by_its_analysis_is_less_well_known_after_a_receipt(plant: Plant) -> None:
    """A quarter came of no density: the analysis stands, with 3 kg/m³ × ¼ of the volume beside it."""
    analysed_liquid(plant)
    before = holds(plant, 4.0)
    assert (before["status"], codes(before)) == ("measured", [])
    came(plant, before["mass_kg"] / 4.0)
    after = holds(plant, 4.0)
    assert after["mass_kg"] == pytest.approx(before["mass_kg"], rel=1e-12)
    assert (after["status"], codes(after)) == ("uncertain", ["sample_predates_receipt"])
    added = math.sqrt(after["mass_uncertainty_kg"] ** 2 - before["mass_uncertainty_kg"] ** 2)
    assert added == pytest.approx(3.0 * 0.25 * before["gross_standard_volume_m3"], rel=1e-6)


def test_a_liquid_by_its_analysis_blends_with_what_came_by_its_density(plant: Plant) -> None:
    """A quarter of the standard volume came with 600 kg/m³ at 15 °C: ¾ of the analysis's density and ¼ of that."""
    analysed_liquid(plant)
    before = holds(plant, 4.0)
    volume, own = before["gross_standard_volume_m3"], before["standard_density_kg_m3"]
    came(plant, 600.0 * volume / 4.0, density_kg_m3=600.0, **AT_15)
    after = holds(plant, 4.0)
    assert after["standard_density_kg_m3"] == pytest.approx(0.75 * own + 150.0, rel=1e-5)
    assert codes(after) == ["sample_predates_receipt"]


def test_a_density_that_was_read_after_the_receipt_stands_beside_an_older_analysis(plant: Plant) -> None:
    analysed_liquid(plant)
    came(plant, 60_000.0)
    plant.read("tk-1", "2026-03-14T02:30", "lab", observed_density_kg_m3=560.0, observed_density_temperature_c=15.0)
    after = holds(plant, 4.0)
    assert after["standard_density_kg_m3"] == pytest.approx(560.0, rel=1e-12)
    (said,) = [one["detail"] for one in after["warnings"] if one["code"] == "sample_predates_receipt"]
    assert "analysis" in said
