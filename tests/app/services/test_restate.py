"""An opening is stated anew by the table, shell and roof of the close, from the same readings: never a loss."""

from __future__ import annotations

import math
from typing import Any

import pytest

from tests.app.services.plant import BOX, KG_PER_M, OIL, Plant, row

DAY, NIGHT = "2026-03-14", "2026-03-13"
OPENED, CLOSED = "2026-03-14T06:00", "2026-03-15T06:00"
RACK = "boundary:rack-1"
WIDER = BOX["shape"] | {"length_m": 10.04}  # 80,320 kg to the metre


def opened(plant: Plant, level: float = 5.0, **vessel: Any) -> None:
    """A tank whose night before is closed at 5.000 m, 400,000 kg."""
    plant.tank("tk-1", **vessel)
    for at in ("2026-03-13T06:00", OPENED):
        plant.read("tk-1", at, level_m=level)
    plant.close(NIGHT)


def books(plant: Plant, level: float = 5.0) -> dict[str, Any]:
    plant.read("tk-1", CLOSED, level_m=level)
    return row(plant.close(DAY), "tk-1")


@pytest.mark.parametrize("since", [OPENED, "2026-03-14T18:00"], ids=["at-the-opening", "in-the-middle"])
def test_a_recalibrated_table_restates_the_opening_as_closed(plant: Plant, since: str) -> None:
    opened(plant)
    plant.tank("tk-1", shape=WIDER, effective_from=f"{since}:00Z")
    own = books(plant)
    assert own["opening_mass_kg"] == pytest.approx(400_000.0, rel=1e-12)
    assert own["restated_kg"] == pytest.approx(1_600.0, rel=1e-9)
    assert own["book_mass_kg"] == pytest.approx(401_600.0, rel=1e-12)
    assert own["closing_mass_kg"] == pytest.approx(401_600.0, rel=1e-12)
    assert own["imbalance_kg"] == pytest.approx(0.0, abs=1e-6)
    # The night after opens with what was closed, and restates nothing.
    plant.read("tk-1", "2026-03-16T06:00", level_m=5.0)
    after = row(plant.close("2026-03-15"), "tk-1")
    assert (after["opening_mass_kg"], after["restated_kg"]) == (own["closing_mass_kg"], None)


def test_a_restated_opening_carries_the_error_of_the_table_of_the_close(plant: Plant) -> None:
    opened(plant)
    plant.tank("tk-1", shape=WIDER, effective_from=f"{OPENED}:00Z")
    plant.ticket("out", "tk-1", RACK, "2026-03-14T09:00", "2026-03-14T10:00", mass_kg=80_320.0)
    own = books(plant, 4.0)
    assert own["imbalance_kg"] == pytest.approx(0.0, abs=1e-6)
    # One table and one density at both ends: 0.1 % and 2 of 800 of what left; two readings of 1 mm; the ticket.
    expected = math.sqrt(80.32**2 + 200.8**2 + 2 * 80.32**2 + 10.0**2)
    assert own["imbalance_uncertainty_kg"] == pytest.approx(expected, rel=1e-9)


def test_a_table_with_another_error_brings_it(plant: Plant) -> None:
    opened(plant)
    instruments = BOX["instruments"] | {"capacity_pct": {"systematic": 0.5, "local": 0.0}}
    plant.tank("tk-1", shape=WIDER, instruments=instruments, effective_from=f"{OPENED}:00Z")
    plant.ticket("out", "tk-1", RACK, "2026-03-14T09:00", "2026-03-14T10:00", mass_kg=80_320.0)
    expected = math.sqrt(401.6**2 + 200.8**2 + 2 * 80.32**2 + 10.0**2)
    assert books(plant, 4.0)["imbalance_uncertainty_kg"] == pytest.approx(expected, rel=1e-9)


TALLER = {"expansion_per_k": 1e-4, "at_temperature_c": 5.0, "insulated": True}
ROUND = {"shape": {"kind": "vertical_cylinder", "diameter_m": 12.0, "height_m": 10.0}}
ROOFED = ROUND | {"floating_roof": {"mass_kg": 20_000.0, "lands_at_m": 1.0, "floats_at_m": 1.2}}
GEOMETRIES: list[tuple[str, dict[str, Any], float]] = [
    # The shell at 15 °C, 10 K above its table: two strains of 1e-3 upon the area, (1 + 1e-3)² − 1; the third and the
    # level's take each other away.
    ("shell", {"shell": TALLER}, 400_000.0 * 2.001e-3),
    ("roof", ROOFED, -20_000.0),
    ("datum", {"gauging": {"datum_m": 0.05}}, 0.05 * KG_PER_M),
    ("deadwood", {"deadwood": [[1.0, 2.0, 3.0]]}, -2_400.0),
]


@pytest.mark.parametrize(("changed", "restated"), [case[1:] for case in GEOMETRIES], ids=[one[0] for one in GEOMETRIES])
def test_whatever_belongs_to_the_geometry_restates(plant: Plant, changed: dict[str, Any], restated: float) -> None:
    opened(plant, **(ROUND if "floating_roof" in changed else {}))
    plant.tank("tk-1", effective_from=f"{OPENED}:00Z", **changed)
    own = books(plant)
    assert own["restated_kg"] == pytest.approx(restated, rel=1e-6)
    assert own["imbalance_kg"] == pytest.approx(0.0, abs=1e-6)


@pytest.mark.parametrize(
    "changed",
    [
        {"name": "another name"},
        {"max_age_s": 7200},
        {"sources": [{"source": "radar"}]},
        {"dead_stock_m3": 20.0},
        {"instruments": BOX["instruments"] | {"level_m": {"random": 0.001, "systematic": 0.003, "offset": 0.02}}},
    ],
    ids=lambda one: next(iter(one)),
)
def test_nothing_else_restates(plant: Plant, changed: dict[str, Any]) -> None:
    """A gauge's offset from now on is a new reading's: the old reading was made by the old gauge."""
    opened(plant)
    plant.tank("tk-1", effective_from=f"{OPENED}:00Z", **changed)
    own = books(plant, 4.98 if "instruments" in changed else 5.0)
    assert own["restated_kg"] is None
    assert own["imbalance_kg"] == pytest.approx(0.0, abs=1e-6)


def test_a_regrade_restates_nothing_and_with_a_new_table_only_by_the_table(plant: Plant) -> None:
    """Mass is mass: 500 m³ of 800 kg/m³ stay 400,000 kg, whatever they are called and sampled as from then on."""
    heavy = OIL | {"name": "heavy", "liquid": OIL["liquid"] | {"density_kg_m3": 900.0}}
    plant.put("substance", "heavy", heavy)
    for name, said in (("tk-1", {}), ("tk-2", {"shape": WIDER})):
        plant.tank(name)
        for at in ("2026-03-13T06:00", OPENED, CLOSED):
            plant.read(name, at, level_m=5.0)
        plant.tank(name, substance="heavy", effective_from=f"{OPENED}:00Z", **said)
    plant.close(NIGHT)
    night = plant.close(DAY)
    assert row(night, "tk-1")["restated_kg"] is None
    assert row(night, "tk-2")["restated_kg"] == pytest.approx(5.0 * 0.4 * 800.0, rel=1e-9)


def test_the_difference_of_the_tables_is_added_to_the_opening_as_it_was_closed(plant: Plant) -> None:
    """A late reading about the opening does not move it until its night is closed anew; the tables differ there."""
    opened(plant)
    plant.read("tk-1", OPENED, level_m=4.0)
    plant.tank("tk-1", shape=WIDER, effective_from=f"{OPENED}:00Z")
    own = books(plant, 4.0)
    assert own["opening_mass_kg"] == pytest.approx(400_000.0, rel=1e-12)
    assert own["restated_kg"] == pytest.approx(4.0 * 0.4 * 800.0, rel=1e-9)
    plant.close(NIGHT)
    own = row(plant.close(DAY), "tk-1")
    assert own["opening_mass_kg"] == pytest.approx(320_000.0, rel=1e-12)
    assert own["imbalance_kg"] == pytest.approx(0.0, abs=1e-6)


def test_an_opening_that_was_carried_is_restated_at_its_reading(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.read("tk-1", "2026-03-13T06:00", level_m=5.0)
    plant.read("tk-1", "2026-03-14T05:30", level_m=5.0)
    plant.ticket("in", "boundary:jetty-1", "tk-1", "2026-03-14T05:40", "2026-03-14T05:50", mass_kg=16_000.0)
    plant.close(NIGHT)
    plant.tank("tk-1", shape=WIDER, effective_from=f"{OPENED}:00Z")
    own = books(plant, 417_600.0 / 80_320.0)
    assert own["opening_mass_kg"] == pytest.approx(416_000.0, rel=1e-12)
    # The tables differ by what was read at 5.000 m; what came since is mass already.
    assert own["restated_kg"] == pytest.approx(1_600.0, rel=1e-9)
    assert own["imbalance_kg"] == pytest.approx(0.0, abs=1e-6)


def test_what_was_not_measured_is_not_restated(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.close(NIGHT)
    plant.tank("tk-1", shape=WIDER, effective_from=f"{OPENED}:00Z")
    own = books(plant)
    assert (own["opening_mass_kg"], own["restated_kg"], own["imbalance_kg"]) == (None, None, None)


def test_a_receiver_that_becomes_a_tank_with_a_floating_roof_restates_nothing(plant: Plant) -> None:
    """A gas under a floating roof cannot be: what it held is reclassified, and the night closes."""
    gas = {"model": "virial", "components": [{"id": "nitrogen", "mole_fraction": 1.0}]}
    plant.put("substance", "gas", {"name": "gas", "vapour": gas})
    upright = {"kind": "vertical_cylinder", "diameter_m": 10.0, "height_m": 8.0}
    plant.put("vessel", "tk-1", {"name": "one", "substance": "gas", "shape": upright})
    for at in ("2026-03-13T06:00", OPENED):
        plant.read("tk-1", at, pressure_kpa=10.0, vapour_temperature_c=15.0)
    held = row(plant.close(NIGHT), "tk-1")["closing_mass_kg"]
    assert held > 0.0
    roof = {"mass_kg": 20_000.0, "lands_at_m": 1.0, "floats_at_m": 1.5, "gauge_sees": "liquid"}
    plant.tank("tk-1", shape=upright, floating_roof=roof, effective_from="2026-03-14T18:00:00Z")
    plant.read("tk-1", CLOSED, level_m=3.0)
    own = row(plant.close(DAY), "tk-1")
    assert own["restated_kg"] is None
    assert own["opening_mass_kg"] == held
    assert own["closing_mass_kg"] > 0.0
