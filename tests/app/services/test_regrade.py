"""What a ticket moved is told by the substances of its ends, and by the density of the tank that it left then."""

from __future__ import annotations

from typing import Any

import pytest

from app.services import close
from tests.app.services.plant import OIL, Plant, instant, row

OPENED, NOON, CLOSED = "2026-03-14T06:00", "2026-03-14T12:00", "2026-03-15T06:00"
HEAVY: dict[str, Any] = {**OIL, "name": "heavy", "liquid": {**OIL["liquid"], "density_kg_m3": 900.0}}


def total(night: dict[str, Any], substance: str) -> dict[str, Any]:
    return next(one for one in night["totals"] if one["substance"] == substance)


def stands(plant: Plant, name: str, opened: float, closed: float) -> None:
    plant.read(name, OPENED, level_m=opened)
    plant.read(name, CLOSED, level_m=closed)


@pytest.fixture
def turning(plant: Plant) -> Plant:
    """tk-1 holds oil of 800 until noon, and heavy oil of 900 from then on."""
    plant.put("substance", "heavy", HEAVY)
    plant.tank("tk-1")
    plant.tank("tk-1", substance="heavy", effective_from=f"{NOON}:00Z")
    stands(plant, "tk-1", 5.0, 4.0)
    return plant


def rack(plant: Plant, started: str, ended: str, **said: Any) -> None:
    plant.ticket(
        "out", "tk-1", "boundary:rack", started, ended, standard_volume_m3=100.0, mass_uncertainty_kg=0.0, **said
    )


def delivered(plant: Plant) -> float:
    return float(row(plant.close("2026-03-14"), "tk-1")["delivered_kg"])


def test_a_volume_that_left_before_the_regrade_was_of_the_former_substance(turning: Plant) -> None:
    rack(turning, "2026-03-14T08:00", "2026-03-14T09:00")
    assert delivered(turning) == pytest.approx(80_000.0, rel=1e-12)


def test_a_volume_that_left_after_it_is_of_the_new_one(turning: Plant) -> None:
    rack(turning, "2026-03-14T13:00", "2026-03-14T14:00")
    assert delivered(turning) == pytest.approx(90_000.0, rel=1e-12)


def test_a_density_of_its_own_goes_first(turning: Plant) -> None:
    rack(turning, "2026-03-14T08:00", "2026-03-14T09:00", density_kg_m3=810.0, density_temperature_c=15.0)
    assert delivered(turning) == pytest.approx(81_000.0, rel=1e-12)


def test_the_book_mass_at_noon_turns_into_the_new_substance(turning: Plant) -> None:
    """5.000 m × 100 m² × 800 less 80,000 kg."""
    rack(turning, "2026-03-14T08:00", "2026-03-14T09:00")
    night = turning.close("2026-03-14")
    assert total(night, "oil")["reclassified_kg"] == pytest.approx(-320_000.0, rel=1e-12)
    assert total(night, "oil")["imbalance_kg"] == pytest.approx(0.0, abs=1e-6)
    assert total(night, "heavy")["reclassified_kg"] == pytest.approx(320_000.0, rel=1e-12)


def test_an_unmetered_ticket_of_the_afternoon_leaves_the_heel_of_noon_known(turning: Plant) -> None:
    turning.ticket("out", "tk-1", "boundary:rack", "2026-03-14T13:00", "2026-03-14T14:00", unmetered=True, by="gauging")
    assert total(turning.close("2026-03-14"), "heavy")["reclassified_kg"] == pytest.approx(400_000.0, rel=1e-12)


def test_what_left_before_a_receipt_left_with_the_density_of_before(plant: Plant) -> None:
    """100 m³ of 800 leave at eight; at nine 90,000 kg of 900 come in: the close's blend is not what left."""
    plant.tank("tk-1")
    plant.read("tk-1", "2026-03-13T20:00", "lab", observed_density_kg_m3=800.0, observed_density_temperature_c=15.0)
    stands(plant, "tk-1", 5.0, 5.0)
    rack(plant, "2026-03-14T08:00", "2026-03-14T08:30")
    plant.ticket("in", "boundary:jetty", "tk-1", "2026-03-14T09:00", "2026-03-14T10:00", mass_kg=90_000.0,
                 density_kg_m3=900.0, density_temperature_c=15.0)  # fmt: skip
    night = row(plant.close("2026-03-14"), "tk-1")
    assert night["delivered_kg"] == pytest.approx(80_000.0, rel=1e-12)
    assert night["closing_mass_kg"] == pytest.approx(400 * 800.0 + 90_000.0, rel=1e-12)
    assert night["imbalance_kg"] == pytest.approx(0.0, abs=1e-6)


def test_a_sample_after_a_delivery_is_not_of_what_was_delivered(plant: Plant) -> None:
    """The sample of six says 800, that of ten 820; what left at eight left with 800. A late one revises the night."""
    plant.tank("tk-1")
    for at, density in (("2026-03-14T00:00", 800.0), ("2026-03-14T10:00", 820.0)):
        plant.read("tk-1", at, "lab", observed_density_kg_m3=density, observed_density_temperature_c=15.0)
    stands(plant, "tk-1", 5.0, 4.0)
    rack(plant, "2026-03-14T08:00", "2026-03-14T08:30")
    assert delivered(plant) == pytest.approx(80_000.0, rel=1e-12)
    plant.read("tk-1", "2026-03-14T07:00", "lab", observed_density_kg_m3=810.0, observed_density_temperature_c=15.0)
    night = plant.close("2026-03-14")
    assert (night["revision"], row(night, "tk-1")["delivered_kg"]) == (2, pytest.approx(81_000.0, rel=1e-12))


def test_a_receipt_is_the_same_mass_in_a_night_and_in_a_longer_period(plant: Plant) -> None:
    """100 m³ in the night of the 14th, a sample of 840 the day after: 80,000 kg, whichever period counts them."""
    plant.tank("tk-1")
    for day, level in ((14, 2.0), (15, 3.0), (16, 3.0)):
        plant.read("tk-1", f"2026-03-{day}T06:00", level_m=level)
    said = {"standard_volume_m3": 100.0, "mass_uncertainty_kg": 0.0}
    plant.ticket("in", "boundary:jetty", "tk-1", "2026-03-14T08:00", "2026-03-14T09:00", **said)
    plant.read("tk-1", "2026-03-15T12:00", observed_density_kg_m3=840.0, observed_density_temperature_c=15.0)
    night = row(plant.close("2026-03-14"), "tk-1")
    bounds = instant("2026-03-14T06:00"), instant("2026-03-16T06:00")
    both = row(close.close(plant.store, plant.clock, plant.site, bounds=bounds)[0], "tk-1")
    assert night["received_kg"] == both["received_kg"] == pytest.approx(80_000.0, rel=1e-12)


def test_a_tank_that_is_out_at_the_close_delivered_what_it_held(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.read("tk-1", OPENED, level_m=1.0)
    rack(plant, "2026-03-14T08:00", "2026-03-14T09:00")
    plant.tank("tk-1", service="out", effective_from=f"{NOON}:00Z")
    night = plant.close("2026-03-14")
    assert row(night, "tk-1")["delivered_kg"] == pytest.approx(80_000.0, rel=1e-12)
    assert total(night, "oil")["imbalance_kg"] == pytest.approx(0.0, abs=1e-6)


def test_a_manifold_of_two_substances_passes_on_none(plant: Plant) -> None:
    """Where the tanks beside a junction differ, nobody knows what passed it; where they agree, it is theirs."""
    plant.put("substance", "heavy", HEAVY)
    plant.put("vessel", "mf", {"name": "manifold", "shape": {"kind": "junction"}})
    for name, substance in (("tk-1", "oil"), ("tk-2", "oil")):
        plant.tank(name, substance=substance)
        stands(plant, name, 1.0, 2.0)
        plant.ticket(f"to-{name}", "mf", name, "2026-03-14T08:00", "2026-03-14T09:00", mass_kg=80_000.0)
    plant.ticket("in", "boundary:jetty", "mf", "2026-03-14T08:00", "2026-03-14T09:00", mass_kg=161_000.0)
    night = plant.close("2026-03-14")
    assert total(night, "oil")["received_kg"] == pytest.approx(161_000.0, rel=1e-12)
    assert total(night, "oil")["imbalance_kg"] == pytest.approx(-1_000.0, rel=1e-9)
    plant.tank("tk-2", substance="heavy", effective_from="2026-03-14T00:00:00Z")
    night = plant.close("2026-03-14")
    assert total(night, "oil")["received_kg"] == pytest.approx(80_000.0, rel=1e-12)
    assert total(night, "heavy")["received_kg"] == pytest.approx(80_000.0, rel=1e-12)
