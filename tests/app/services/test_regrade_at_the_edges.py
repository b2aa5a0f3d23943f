"""A tank takes another substance at the edge of a night and within it; manifolds balance without holding anything."""

from __future__ import annotations

import math
from typing import Any

import pytest

from tests.app.services.plant import OIL, Plant, row

JETTY, RACK = "boundary:jetty-1", "boundary:rack-1"
DAY = "2026-03-14T"
HEAVY: dict[str, Any] = OIL | {"name": "heavy"}


def total(night: dict[str, Any], substance: str) -> dict[str, Any]:
    return next(one for one in night["totals"] if one["substance"] == substance)


def balances(one: dict[str, Any]) -> float:
    """Closing − opening − received + delivered − reclassified, by the figures that are shown."""
    figures = ("closing_mass_kg", "opening_mass_kg", "received_kg", "delivered_kg")
    closing, opening, received, delivered = (float(one[name]) for name in figures)
    return closing - opening - received + delivered - float(one.get("reclassified_kg") or 0.0)


def regraded(plant: Plant, at: str) -> None:
    """tk-1 holds oil until an instant and heavy oil of the same density from then on."""
    plant.put("substance", "heavy", HEAVY)
    plant.tank("tk-1")
    plant.tank("tk-1", substance="heavy", effective_from=f"{at}:00Z")


def test_at_the_opening_the_whole_opening_is_reclassified(plant: Plant) -> None:
    regraded(plant, f"{DAY}06:00")
    plant.read("tk-1", "2026-03-13T06:00", level_m=5.0)
    plant.read("tk-1", f"{DAY}05:50", level_m=5.0)
    plant.read("tk-1", f"{DAY}05:59", level_m=5.0)
    plant.read("tk-1", "2026-03-15T06:00", level_m=6.0)
    plant.ticket("in", JETTY, "tk-1", f"{DAY}08:00", f"{DAY}09:00", mass_kg=80_000.0)
    before = plant.close("2026-03-13")
    # The night before closes by what held just before it ended.
    assert total(before, "oil")["closing_mass_kg"] == pytest.approx(400_000.0, rel=1e-12)
    assert [one["substance"] for one in before["totals"]] == ["oil"]
    night = plant.close("2026-03-14")
    oil, heavy = total(night, "oil"), total(night, "heavy")
    assert (oil["opening_mass_kg"], oil["closing_mass_kg"]) == (pytest.approx(400_000.0, rel=1e-12), 0.0)
    assert oil["reclassified_kg"] == pytest.approx(-400_000.0, rel=1e-12)
    assert heavy["reclassified_kg"] == pytest.approx(400_000.0, rel=1e-12)
    assert (heavy["received_kg"], oil["received_kg"]) == (pytest.approx(80_000.0), 0.0)
    for one in (oil, heavy):
        assert one["imbalance_kg"] == pytest.approx(balances(one), abs=1e-6)
        assert one["imbalance_kg"] == pytest.approx(0.0, abs=1e-6)
    assert row(night, "tk-1")["imbalance_kg"] == pytest.approx(0.0, abs=1e-6)


def test_at_the_close_it_is_the_next_nights(plant: Plant) -> None:
    regraded(plant, "2026-03-15T06:00")
    for at in (f"{DAY}06:00", "2026-03-15T05:59", "2026-03-16T06:00"):
        plant.read("tk-1", at, level_m=5.0)
    night = plant.close("2026-03-14")
    assert [one["substance"] for one in night["totals"]] == ["oil"]
    assert "reclassified_kg" not in total(night, "oil")
    after = plant.close("2026-03-15")
    assert total(after, "heavy")["reclassified_kg"] == pytest.approx(400_000.0, rel=1e-12)


def test_in_the_middle_the_tickets_before_are_of_the_one_and_those_after_of_the_other(plant: Plant) -> None:
    regraded(plant, f"{DAY}12:00")
    plant.read("tk-1", f"{DAY}06:00", level_m=5.0)
    plant.read("tk-1", "2026-03-15T06:00", level_m=4.8)
    plant.ticket("a", JETTY, "tk-1", f"{DAY}07:00", f"{DAY}08:00", mass_kg=30_000.0)
    plant.ticket("b", "tk-1", RACK, f"{DAY}09:00", f"{DAY}10:00", mass_kg=70_000.0)
    plant.ticket("c", "tk-1", RACK, f"{DAY}15:00", f"{DAY}16:00", mass_kg=16_000.0)
    plant.ticket("d", JETTY, "tk-1", f"{DAY}11:00", f"{DAY}13:00", mass_kg=40_000.0)
    night = plant.close("2026-03-14")
    oil, heavy = total(night, "oil"), total(night, "heavy")
    assert (oil["received_kg"], oil["delivered_kg"]) == pytest.approx((50_000.0, 70_000.0), rel=1e-12)
    assert (heavy["received_kg"], heavy["delivered_kg"]) == pytest.approx((20_000.0, 16_000.0), rel=1e-12)
    # 400,000 + 30,000 − 70,000 + half of 40,000.
    assert heavy["reclassified_kg"] == pytest.approx(380_000.0, rel=1e-12)
    assert oil["imbalance_kg"] == pytest.approx(0.0, abs=1e-6)
    assert heavy["imbalance_kg"] == pytest.approx(balances(heavy), abs=1e-6)
    assert heavy["imbalance_kg"] == pytest.approx(0.0, abs=1e-6)
    assert math.fsum(one["received_kg"] for one in (oil, heavy)) == row(night, "tk-1")["received_kg"]


def test_a_heel_that_nobody_knows_leaves_both_totals_open(plant: Plant) -> None:
    regraded(plant, f"{DAY}12:00")
    plant.read("tk-1", f"{DAY}06:00", level_m=5.0)
    plant.read("tk-1", "2026-03-15T06:00", level_m=4.0)
    plant.ticket("out", "tk-1", RACK, f"{DAY}07:00", f"{DAY}08:00", by="statement", unmetered=True)
    night = plant.close("2026-03-14")
    for one in (total(night, "oil"), total(night, "heavy")):
        assert (one["complete"], one["reclassified_kg"], one.get("imbalance_kg")) == (False, None, None)


def test_a_transfer_between_unlike_tanks_is_reclassified_and_crosses_no_boundary(plant: Plant) -> None:
    plant.put("substance", "slops", HEAVY)
    for name, substance, opened, closed in (("tk-1", "oil", 5.0, 4.5), ("tk-2", "slops", 1.0, 1.5)):
        plant.tank(name, substance=substance)
        plant.read(name, f"{DAY}06:00", level_m=opened)
        plant.read(name, "2026-03-15T06:00", level_m=closed)
    plant.ticket("over", "tk-1", "tk-2", f"{DAY}08:00", f"{DAY}09:00", mass_kg=40_000.0)
    night = plant.close("2026-03-14")
    oil, slops = total(night, "oil"), total(night, "slops")
    assert (oil["reclassified_kg"], slops["reclassified_kg"]) == pytest.approx((-40_000.0, 40_000.0), rel=1e-12)
    assert [one[name] for one in (oil, slops) for name in ("received_kg", "delivered_kg")] == [0.0] * 4
    assert [one["imbalance_kg"] for one in (oil, slops)] == pytest.approx([0.0, 0.0], abs=1e-6)


def test_what_is_read_before_the_regrade_says_nothing_after_it(plant: Plant) -> None:
    regraded(plant, f"{DAY}12:00")
    plant.read("tk-1", f"{DAY}11:50", level_m=5.0, free_water_level_m=0.2, observed_density_kg_m3=820.0,
               observed_density_temperature_c=15.0)  # fmt: skip
    assert plant.vessel("tk-1", f"{DAY}11:55")["mass_kg"] == pytest.approx(480.0 * 820.0, rel=1e-12)
    assert plant.vessel("tk-1", f"{DAY}12:00")["status"] == "unmeasured"
    plant.read("tk-1", f"{DAY}12:10", level_m=5.0)
    assert plant.vessel("tk-1", f"{DAY}12:10")["mass_kg"] == pytest.approx(400_000.0, rel=1e-12)
    # Nor is a level joined across it.
    assert plant.vessel("tk-1", f"{DAY}12:05")["status"] == "unmeasured"


# --- manifolds --------------------------------------------------------------------------------------


def manifold(plant: Plant, into: float, *out: float) -> dict[str, Any]:
    """One meter of 0.1 % feeds tanks behind a junction, over tickets by weighbridges of 10 kg."""
    plant.put("meter", "m-1", {"name": "m", "random_pct": 0.0, "systematic_pct": 0.1})
    plant.put("vessel", "mf", {"name": "manifold", "shape": {"kind": "junction"}})
    plant.ticket("in", JETTY, "mf", f"{DAY}08:00", f"{DAY}09:00", mass_kg=into, by="meter", meter="m-1")
    for place, mass in enumerate(out):
        plant.tank(f"tk-{place}")
        plant.read(f"tk-{place}", f"{DAY}06:00", level_m=1.0)
        plant.read(f"tk-{place}", "2026-03-15T06:00", level_m=1.0 + mass / 80_000.0)
        plant.ticket(f"to-{place}", "mf", f"tk-{place}", f"{DAY}08:00", f"{DAY}09:00", mass_kg=mass)
    return plant.close("2026-03-14")


def test_a_junction_is_judged_like_a_vessel_that_holds_nothing(plant: Plant) -> None:
    night = manifold(plant, 100_000.0, 60_000.0, 40_050.0)
    own = row(night, "mf")
    assert (own["status"], own["opening_mass_kg"], own["closing_mass_kg"]) == ("measured", 0.0, 0.0)
    assert (own["received_kg"], own["delivered_kg"]) == pytest.approx((100_000.0, 100_050.0), rel=1e-12)
    assert own["imbalance_kg"] == pytest.approx(50.0, abs=1e-6)
    assert own["imbalance_uncertainty_kg"] == pytest.approx(math.sqrt(100.0**2 + 2 * 10.0**2), rel=1e-9)
    assert own["score"] == pytest.approx(50.0 / math.sqrt(10_200.0), rel=1e-9)
    assert own["flagged"] is False
    assert night["complete"] is True
    assert "mf" not in [one["vessel"] for one in plant.inventory("2026-03-15T06:00")["vessels"]]


def test_a_junction_that_lost_something_is_flagged(plant: Plant) -> None:
    night = manifold(plant, 100_000.0, 60_000.0, 39_000.0)
    assert [one["vessel"] for one in night["vessels"] if one["flagged"]] == ["mf"]
    assert row(night, "mf")["imbalance_kg"] == pytest.approx(1_000.0 - 2_000.0, abs=1e-6)
