"""Every vessel's imbalance, its uncertainty and its verdict, by arithmetic that stands beside each check."""

from __future__ import annotations

import math
from statistics import NormalDist
from typing import Any

import pytest

from app.services import judge
from tests.app.services.plant import BOX, OIL, Plant, row

JETTY, RACK = "boundary:jetty-1", "boundary:rack-1"
DAY = ("2026-03-14T06:00", "2026-03-15T06:00")
LEVEL, CAPACITY = BOX["instruments"]["level_m"], BOX["instruments"]["capacity_pct"]


def critical(rows: int, false_alarms_per_month: float = 0.5) -> float:
    """Šidák's value for so many balances: 30.44 days a month, no more than so many nights with a flag."""
    rate = false_alarms_per_month / 30.44
    return NormalDist().inv_cdf(1.0 - (1.0 - (1.0 - rate) ** (1.0 / rows)) / 2.0)


def levels(plant: Plant, name: str, opening: float, closing: float) -> None:
    for at, level in zip(DAY, (opening, closing), strict=True):
        plant.read(name, at, level_m=level)


def moved(plant: Plant, name: str, source: str, target: str, **said: Any) -> None:
    plant.ticket(name, source, target, "2026-03-14T10:00", "2026-03-14T12:00", **said)


def night(plant: Plant) -> dict[str, Any]:
    return plant.close("2026-03-14")


def test_an_imbalance_is_physical_less_book(plant: Plant) -> None:
    plant.tank("tk-1")
    levels(plant, "tk-1", 5.0, 6.0)
    moved(plant, "in", JETTY, "tk-1", mass_kg=95_000.0)
    moved(plant, "out", "tk-1", RACK, mass_kg=14_500.0, mass_uncertainty_kg=24.0)
    books = row(night(plant), "tk-1")
    assert books["opening_mass_kg"] == pytest.approx(400_000.0)
    assert (books["received_kg"], books["delivered_kg"]) == (95_000.0, 14_500.0)
    assert books["book_mass_kg"] == pytest.approx(480_500.0)
    assert books["imbalance_kg"] == pytest.approx(-500.0, abs=1e-6)
    # Level 3 mm is on both sides and gone; capacity 0.1 % and density 2 of 800 of the 80,000 kg between them:
    # 80 and 200 kg; 1 mm fresh at each reading: 80 and 80; tickets 10 and 24.
    u = math.sqrt(80.0**2 + 200.0**2 + 80.0**2 + 80.0**2 + 10.0**2 + 24.0**2)
    assert books["imbalance_uncertainty_kg"] == pytest.approx(u, rel=1e-9)
    assert books["score"] == pytest.approx(-500.0 / u, rel=1e-9)
    assert books["p_value"] == pytest.approx(2.0 * NormalDist().cdf(-500.0 / u), rel=1e-9)
    assert books["detectable_imbalance_kg"] == pytest.approx((critical(1) + NormalDist().inv_cdf(0.95)) * u, rel=1e-9)
    assert (books["flagged"], books["verdict"], books["judged_with"]) == (False, "pass", [])


def test_an_idle_vessel_keeps_only_what_is_fresh_at_each_reading(plant: Plant) -> None:
    plant.tank("tk-1")
    levels(plant, "tk-1", 5.0, 5.0)
    books = row(night(plant), "tk-1")
    # Either inventory alone: 80, 240, 400 and 1,000 kg; their squares add up to 1,224,000 kg².
    assert plant.vessel("tk-1", DAY[0])["mass_uncertainty_kg"] == pytest.approx(math.sqrt(1_224_000.0), rel=1e-9)
    assert books["imbalance_uncertainty_kg"] == pytest.approx(80.0 * math.sqrt(2.0), rel=1e-9)


def test_a_new_calibration_is_a_new_error(plant: Plant) -> None:
    plant.tank("tk-1")
    again = {"level_m": LEVEL | {"calibrated_at": "2026-03-14T12:00:00Z"}}
    plant.tank("tk-1", instruments=BOX["instruments"] | again, effective_from="2026-03-14T12:00:00Z")
    levels(plant, "tk-1", 5.0, 5.0)
    books = row(night(plant), "tk-1")
    # 240 kg of level on either side, each under its own name; the table and the density are the same.
    u = math.sqrt(2.0 * (80.0**2 + 240.0**2))
    assert books["imbalance_uncertainty_kg"] == pytest.approx(u, rel=1e-9)


def test_a_volume_received_shares_the_sample_of_the_tank(plant: Plant) -> None:
    plant.tank("tk-1", instruments=BOX["instruments"] | {"observed_density_kg_m3": {"random": 0.8, "systematic": 0.6}})
    plant.read("tk-1", "2026-03-13T06:00", observed_density_kg_m3=810.0, observed_density_temperature_c=15.0)
    levels(plant, "tk-1", 1.0, 5.0)
    moved(plant, "in", JETTY, "tk-1", standard_volume_m3=400.0)
    books = row(night(plant), "tk-1")
    # 100 m³ and 400 m³ make 500 m³ whatever they weigh: the density is gone. Left are 0.1 % of capacity over
    # 400 m³, two readings of 0.1 m³, at 810 kg/m³, and the ticket's 10 kg; and, as no sample was drawn since,
    # 3 kg/m³ × 4/5 of the content received, over the 100 m³ that the ticket did not bring.
    assert books["imbalance_kg"] == pytest.approx(0.0, abs=1e-6)
    u = math.sqrt((810.0 * 0.4) ** 2 + 2.0 * 81.0**2 + 10.0**2 + (3.0 * 0.8 * 100.0) ** 2)
    assert books["imbalance_uncertainty_kg"] == pytest.approx(u, rel=1e-9)


def test_two_tanks_and_the_transfer_between_them(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.tank("tk-2")
    levels(plant, "tk-1", 5.0, 4.0)
    levels(plant, "tk-2", 2.0, 3.0)
    moved(plant, "t", "tk-1", "tk-2", mass_kg=79_000.0, mass_uncertainty_kg=100.0)
    found = night(plant)
    assert row(found, "tk-1")["imbalance_kg"] == pytest.approx(-1000.0, abs=1e-6)
    assert row(found, "tk-2")["imbalance_kg"] == pytest.approx(1000.0, abs=1e-6)
    (group,) = found["groups"]
    assert (group["members"], group["degrees_of_freedom"]) == (["tk-1", "tk-2"], 2)
    (total,) = found["totals"]
    assert (total["received_kg"], total["delivered_kg"]) == (0.0, 0.0)
    assert total["imbalance_kg"] == pytest.approx(0.0, abs=1e-6)
    # Over the site the ticket and the density cancel: each table's 80 kg and four fresh readings are left.
    assert total["imbalance_uncertainty_kg"] == pytest.approx(math.sqrt(2 * 80.0**2 + 4 * 80.0**2), rel=1e-9)
    (ticket,) = found["transfers"]
    assert (ticket["measured_mass_kg"], ticket["observability"]) == (79_000.0, "redundant")


def test_totals_add_an_error_that_two_tanks_share_before_it_is_squared(plant: Plant) -> None:
    for name in ("tk-1", "tk-2"):
        plant.tank(name, instruments={"level_m": {"random": 0.0, "systematic": 0.0}, "capacity_pct": CAPACITY})
        levels(plant, name, 5.0, 6.0)
        moved(plant, f"in-{name}", JETTY, name, mass_kg=80_000.0, mass_uncertainty_kg=0.0)
    (total,) = night(plant)["totals"]
    # One density: 200 + 200 kg. Two tables: 80 and 80 kg.
    assert total["imbalance_uncertainty_kg"] == pytest.approx(math.sqrt(400.0**2 + 2 * 80.0**2), rel=1e-9)


def test_what_left_for_another_substance_is_reclassified_and_neither_received_nor_delivered(plant: Plant) -> None:
    plant.put("substance", "slops", OIL)
    plant.tank("tk-1")
    plant.tank("tk-2", substance="slops")
    levels(plant, "tk-1", 5.0, 4.0)
    levels(plant, "tk-2", 2.0, 3.0)
    moved(plant, "t", "tk-1", "tk-2", mass_kg=80_000.0)
    totals = {one["substance"]: one for one in night(plant)["totals"]}
    for substance, sign in (("oil", -1.0), ("slops", 1.0)):
        total = totals[substance]
        assert (total["received_kg"], total["delivered_kg"]) == (0.0, 0.0)
        assert total["reclassified_kg"] == pytest.approx(sign * 80_000.0)
        assert total["imbalance_kg"] == pytest.approx(0.0, abs=1e-6)


def test_tanks_that_a_ticket_without_a_quantity_ties_are_judged_as_one(plant: Plant) -> None:
    for name in ("tk-1", "tk-2", "tk-3"):
        plant.tank(name)
    levels(plant, "tk-1", 5.0, 3.0)
    levels(plant, "tk-2", 2.0, 3.9)
    levels(plant, "tk-3", 2.0, 2.0)
    moved(plant, "u", "tk-1", "tk-2", unmetered=True, by="statement")
    moved(plant, "g", "tk-2", "tk-1", mass_kg=1.0, by="gauging")  # measured by its own ends: the same
    moved(plant, "in", JETTY, "tk-2", mass_kg=500.0)
    found = night(plant)
    one, two, three = (row(found, name) for name in ("tk-1", "tk-2", "tk-3"))
    assert (one["judged_with"], two["judged_with"], three["judged_with"]) == (["tk-2"], ["tk-1"], [])
    assert one["imbalance_kg"] == two["imbalance_kg"] == pytest.approx(-8500.0, abs=1e-6)
    assert one["book_mass_kg"] == two["book_mass_kg"] == pytest.approx(560_500.0)
    assert one["closing_mass_kg"] == pytest.approx(240_000.0)
    assert {one["transfer"]: one["measured_mass_kg"] for one in found["transfers"]} == {
        "u": None, "g": None, "in": 500.0,
    }  # fmt: skip
    # Judged are two balances, not three.
    reach = critical(2) + NormalDist().inv_cdf(0.95)
    assert three["detectable_imbalance_kg"] == pytest.approx(reach * 80.0 * math.sqrt(2.0), rel=1e-9)


def test_a_ticket_without_a_quantity_to_a_boundary_leaves_no_balance(plant: Plant) -> None:
    plant.tank("tk-1")
    levels(plant, "tk-1", 5.0, 4.0)
    moved(plant, "u", "tk-1", RACK, unmetered=True, by="statement")
    found = night(plant)
    books = row(found, "tk-1")
    assert (books["imbalance_kg"], books["score"], books["verdict"]) == (None, None, "inconclusive")
    assert (found["complete"], found["status"]) == (False, "balanced")
    assert found["totals"][0]["complete"] is False and "imbalance_kg" not in found["totals"][0]
    assert found["transfers"][0]["observability"] == "observable"


def test_a_loss_is_flagged_and_the_night_is_imbalanced(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.tank("tk-2")
    # u = 113.1 kg; of two balances at 0.5 nights a month 2.64 of them are chance, 299 kg or 3.7 mm.
    levels(plant, "tk-1", 5.0, 4.995)
    levels(plant, "tk-2", 5.0, 4.997)
    found = night(plant)
    assert 3.0 * KG_PER_MM < critical(2) * 80.0 * math.sqrt(2.0) < 5.0 * KG_PER_MM
    assert [(one["vessel"], one["flagged"], one["verdict"]) for one in found["vessels"]] == [
        ("tk-1", True, "fail"), ("tk-2", False, "pass"),
    ]  # fmt: skip
    assert found["status"] == "imbalanced"


KG_PER_MM = 80.0


def test_the_site_says_how_many_false_alarms_it_takes(plant: Plant) -> None:
    plant.put_site(false_alarms_per_month=5.0, effective_from="2026-01-01T00:00:00Z")
    plant.tank("tk-1")
    levels(plant, "tk-1", 5.0, 4.997)
    assert critical(1, 5.0) * 80.0 * math.sqrt(2.0) < 3.0 * KG_PER_MM
    assert row(night(plant), "tk-1")["flagged"] is True


@pytest.mark.parametrize(
    ("limit", "closing", "verdict", "over"),
    [
        # 113.1 kg of uncertainty (level alone); (2.40 + 1.645) of it, 457 kg, would be flagged.
        ({"kg": 500.0}, 4.999, "pass", False),
        ({"kg": 400.0}, 4.999, "inconclusive", False),  # the instruments cannot see so little
        ({"kg": 500.0}, 4.993, "fail", True),  # 560 kg
        ({"kg": 100.0}, 4.998, "inconclusive", True),  # 160 kg, passes the limit and is no more than chance
        ({"pct_of_throughput": 5.0}, 5.0, "inconclusive", False),  # idle: judged by kg alone, of which there is none
        ({"kg": 450.0, "pct_of_throughput": 100.0}, 4.999, "inconclusive", False),  # 100 % of nothing adds nothing
    ],
)
def test_a_limit_makes_a_verdict(
    plant: Plant, limit: dict[str, float], closing: float, verdict: str, over: bool
) -> None:
    plant.tank("tk-1", imbalance_limit=limit)
    levels(plant, "tk-1", 5.0, closing)
    books = row(night(plant), "tk-1")
    assert books["detectable_imbalance_kg"] == pytest.approx(457.0, abs=2.0)
    assert (books["verdict"], books["over_limit"]) == (verdict, over)


def test_a_share_of_the_throughput_adds_to_the_limit(plant: Plant) -> None:
    # 300 kg and 0.5 % of the larger of 60,000 and 40,000 kg: 600 kg.
    plant.put_site(imbalance_limit={"kg": 300.0, "pct_of_throughput": 0.5}, effective_from="2026-01-01T00:00:00Z")
    plant.tank("tk-1")
    plant.tank("tk-2", imbalance_limit={"kg": 10.0})
    for name in ("tk-1", "tk-2"):
        levels(plant, name, 5.0, 5.25)
        moved(plant, f"in-{name}", JETTY, name, mass_kg=60_000.0)
        moved(plant, f"out-{name}", name, RACK, mass_kg=40_000.0 - 200.0)
    found = night(plant)
    own = row(found, "tk-1")
    assert own["imbalance_kg"] == pytest.approx(-200.0, abs=1e-6)
    # Of 20,000 kg, 0.1 % and 2 of 800: 20 and 50 kg; two readings of 80 kg, two tickets of 10 kg.
    u = math.sqrt(20.0**2 + 50.0**2 + 2 * 80.0**2 + 2 * 10.0**2)
    reach = critical(2) + NormalDist().inv_cdf(0.95)
    assert own["detectable_imbalance_kg"] == pytest.approx(reach * u, rel=1e-9)
    assert 300.0 < reach * u < 600.0
    assert (own["verdict"], own["over_limit"]) == ("pass", False)
    # A vessel's own limit stands in place of the site's.
    assert (row(found, "tk-2")["verdict"], row(found, "tk-2")["over_limit"]) == ("inconclusive", True)


def test_what_limits_a_balance_is_named_with_what_could_be_seen_without_it(plant: Plant) -> None:
    plant.tank("tk-1")
    levels(plant, "tk-1", 5.0, 6.0)
    moved(plant, "in", JETTY, "tk-1", mass_kg=80_000.0, mass_uncertainty_kg=300.0)
    books = row(night(plant), "tk-1")
    parts = {"ticket in": 300.0**2, "density substance:oil": 200.0**2, "tk-1 level_m, each reading": 2 * 80.0**2}
    whole = sum(parts.values()) + 80.0**2  # and the table
    reach = critical(1) + NormalDist().inv_cdf(0.95)
    assert [(one["instrument"], one["detectable_without_it_kg"]) for one in books["limited_by"]] == [
        (name, pytest.approx(reach * math.sqrt(whole - part), rel=1e-9)) for name, part in parts.items()
    ]


@pytest.mark.parametrize(
    ("error", "said"),
    [
        ("r:tk-1/radar:level_m:20260314T060000.000000Z", "tk-1/radar level_m, each reading"),
        ("stale:tk-1:pressure_kpa:20260314T060000.000000Z", "tk-1 pressure_kpa, carried forward"),
        ("t:in", "ticket in"),
        ("meter:m-7:", "meter m-7:"),
        ("capacity:tk-1:None.1", "capacity tk-1:None.1"),
    ],
)
def test_an_error_is_named_by_what_a_reader_would_go_and_look_at(error: str, said: str) -> None:
    assert judge.instrument(error) == said


def test_a_vessel_that_was_not_read_makes_the_night_incomplete_and_the_others_stand(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.tank("tk-2")
    plant.tank("tk-3", service="out")
    levels(plant, "tk-1", 5.0, 5.0)
    moved(plant, "in", JETTY, "tk-2", standard_volume_m3=10.0)
    found = night(plant)
    assert (found["complete"], found["status"]) == (False, "balanced")
    missing = row(found, "tk-2")
    assert (missing["status"], missing["closing_mass_kg"], missing["imbalance_kg"]) == ("unmeasured", None, None)
    assert missing["received_kg"] == pytest.approx(8000.0)
    assert row(found, "tk-1")["imbalance_kg"] == pytest.approx(0.0, abs=1e-6)
    assert row(found, "tk-3")["status"] == "out_of_service"
    assert found["totals"][0]["closing_mass_kg"] is None


def test_a_vessel_out_of_service_makes_no_night_incomplete(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.tank("tk-3", service="out")
    levels(plant, "tk-1", 5.0, 5.0)
    found = night(plant)
    assert found["complete"] is True
    assert [one["substance"] for one in found["totals"]] == ["oil"]


def test_water_that_was_drained_is_no_part_of_the_balance(plant: Plant) -> None:
    plant.tank("tk-1")
    levels(plant, "tk-1", 5.0, 5.0)
    moved(plant, "w", "tk-1", RACK, mass_kg=3000.0, of="water")
    found = night(plant)
    assert (row(found, "tk-1")["delivered_kg"], found["transfers"]) == (0.0, [])
    assert row(found, "tk-1")["imbalance_kg"] == pytest.approx(0.0, abs=1e-6)


def test_a_ticket_across_the_close_is_in_both_nights_and_its_division_cancels(plant: Plant) -> None:
    plant.tank("tk-1")
    for at, level in (("2026-03-14T06:00", 5.0), ("2026-03-15T06:00", 5.5), ("2026-03-16T06:00", 6.0)):
        plant.read("tk-1", at, level_m=level)
    # 24 h, of which 18 before the close: 60,000 and 20,000 kg by time, ± 4,000 kg (5 % of the whole).
    plant.ticket("in", JETTY, "tk-1", "2026-03-14T12:00", "2026-03-15T12:00", mass_kg=80_000.0)
    first, second = (row(plant.close(f"2026-03-{day}"), "tk-1") for day in (14, 15))
    assert (first["received_kg"], second["received_kg"]) == pytest.approx((60_000.0, 20_000.0), rel=1e-12)
    assert first["imbalance_kg"] == pytest.approx(-20_000.0, abs=1e-6)
    assert second["imbalance_kg"] == pytest.approx(20_000.0, abs=1e-6)
    half = 40.0**2 + 100.0**2  # capacity and density of half a metre
    assert first["imbalance_uncertainty_kg"] == pytest.approx(
        math.sqrt(4000.0**2 + half + 2 * 80.0**2 + 7.5**2), rel=1e-9
    )
