"""Periods are closed once for the same inputs, anew for others, in a chain, and found by their ids."""

from __future__ import annotations

import threading
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from typing import Any

import pytest

from app.errors import Conflict, NotFound
from app.services import close
from app.store import books
from app.store.sites import number
from tests.app.services.plant import OIL, Plant, instant, row

RACK, JETTY = "boundary:rack-1", "boundary:jetty-1"


@pytest.fixture
def month(plant: Plant) -> Plant:
    """A tank read at six every morning, a metered delivery on the 14th."""
    plant.put("meter", "m-1", {"name": "m", "random_pct": 0.02, "systematic_pct": 0.1})
    plant.tank("tk-1", sources=[{"source": "radar"}, {"source": "hand"}])
    for day, level in ((14, 5.0), (15, 4.0), (16, 4.0), (17, 4.0)):
        plant.read("tk-1", f"2026-03-{day}T06:00", "radar", level_m=level)
    plant.read(
        "tk-1", "2026-03-01T06:00", "laboratory", observed_density_kg_m3=800.0, observed_density_temperature_c=15.0
    )
    delivery(plant)
    return plant


def delivery(plant: Plant, name: str = "t-1", **said: Any) -> None:
    quantity = said if "standard_volume_m3" in said else {"mass_kg": 80_000.0} | said
    plant.ticket(name, "tk-1", RACK, "2026-03-14T08:00", "2026-03-14T09:00", by="meter", meter="m-1", **quantity)


def revisions(plant: Plant, day: int) -> list[books.Book]:
    with plant.store.reading() as connection:
        opening, closing = instant(f"2026-03-{day}T06:00"), instant(f"2026-03-{day + 1}T06:00")
        return books.revisions(connection, number(connection, plant.site), opening, closing, 2**62)


def find(plant: Plant, name: str, as_of: int | None = None, *, detail: bool = False) -> dict[str, Any]:
    return close.find(plant.store, plant.site, name, as_of, detail=detail)


def test_books_chain(month: Plant) -> None:
    first = row(month.close("2026-03-14"), "tk-1")
    assert (first["opening_mass_kg"], first["closing_mass_kg"]) == pytest.approx((400_000.0, 320_000.0), rel=1e-12)
    assert first["opening_read_at"] == instant("2026-03-14T06:00")
    second = row(month.close("2026-03-15"), "tk-1")
    assert second["opening_mass_kg"] == first["closing_mass_kg"]
    assert second["opening_read_at"] == first["closing_read_at"] == instant("2026-03-15T06:00")
    # Every error of the opening is the closing's of the night before: none but fresh ones are left, 2 × 80 kg.
    assert second["imbalance_uncertainty_kg"] == pytest.approx(80.0 * 2**0.5, rel=1e-9)


def test_late_data_make_a_revision_that_the_next_night_opens_with(month: Plant) -> None:
    month.close("2026-03-14")
    month.close("2026-03-15")
    month.read("tk-1", "2026-03-15T06:00", "radar", level_m=4.5)
    revised = month.close("2026-03-14")
    assert (revised["id"], revised["revision"]) == ("2026-03-14.2", 2)
    assert row(revised, "tk-1")["imbalance_kg"] == pytest.approx(40_000.0, rel=1e-9)
    next_night = month.close("2026-03-15")
    assert next_night["id"] == "2026-03-15.2"
    assert row(next_night, "tk-1")["opening_mass_kg"] == pytest.approx(360_000.0, rel=1e-12)
    # What was closed first is never overwritten.
    assert row(find(month, "2026-03-14.1"), "tk-1")["imbalance_kg"] == pytest.approx(0.0, abs=1e-9)


def test_a_night_that_opens_as_it_did_stands(month: Plant) -> None:
    """A late delivery revises its night and closes it at the same mass: the nights after it have nothing new to say."""
    for day in (14, 15):
        month.close(f"2026-03-{day}")
    month.ticket("t-2", "tk-1", RACK, "2026-03-14T10:00", "2026-03-14T11:00", mass_kg=9.0)
    assert month.close("2026-03-14")["id"] == "2026-03-14.2"
    assert (instant("2026-03-15T06:00"), instant("2026-03-16T06:00")) in month.due()
    assert month.close("2026-03-15")["id"] == "2026-03-15.1"
    # A receipt is another thing: the sample of the 1st says less about every close since then.
    month.ticket("t-3", JETTY, "tk-1", "2026-03-14T10:00", "2026-03-14T11:00", mass_kg=9.0)
    assert month.close("2026-03-14")["id"] == "2026-03-14.3"
    assert month.close("2026-03-15")["id"] == "2026-03-15.2"


def test_the_opening_of_a_night_does_not_move_with_readings_about_it(month: Plant) -> None:
    month.close("2026-03-14")
    month.read("tk-1", "2026-03-15T06:00", "radar", level_m=4.5)
    # Until the night before is closed anew, its closing as it stands is the opening.
    assert row(month.close("2026-03-15"), "tk-1")["opening_mass_kg"] == pytest.approx(320_000.0, rel=1e-12)


def test_the_same_inputs_are_the_same_revision(month: Plant) -> None:
    first, made = close.close(month.store, month.clock, month.site, "2026-03-14")
    again, anew = close.close(month.store, month.clock, month.site, "2026-03-14")
    assert (made, anew) == (True, False)
    assert again == first


CHANGES: dict[str, Callable[[Plant], Any]] = {
    "another level": lambda p: p.read("tk-1", "2026-03-15T06:00", "radar", level_m=4.1),
    "a doubtful level": lambda p: p.read("tk-1", "2026-03-15T06:00", "radar", level_m=4.0, quality="uncertain"),
    "a withdrawn level": lambda p: p.read("tk-1", "2026-03-15T06:00", "radar", level_m=4.0, quality="bad"),
    "a temperature where one was assumed": lambda p: p.read("tk-1", "2026-03-15T05:30", liquid_temperature_c=15.0),
    "a later sample": lambda p: p.read("tk-1", "2026-03-15T03:00", "laboratory", observed_density_kg_m3=801.0,
                                       observed_density_temperature_c=15.0),
    "the temperature of the sample": lambda p: p.read("tk-1", "2026-03-01T06:00", "laboratory",
                                                      observed_density_temperature_c=16.0),
    "free water": lambda p: p.read("tk-1", "2026-03-15T03:00", free_water_level_m=0.1),
    "a barometer": lambda p: p.read(None, "2026-03-15T05:00", barometric_pressure_kpa_abs=99.0),
    "another ticket": lambda p: p.ticket("t-2", JETTY, "tk-1", "2026-03-14T10:00", "2026-03-14T11:00", mass_kg=9.0),
    "a ticket corrected": lambda p: delivery(p, mass_kg=80_001.0),
    "a ticket struck": lambda p: delivery(p, void=True),
    "the meter proved": lambda p: p.put("meter", "m-1", {"name": "m", "effective_from": "2026-03-14T07:00:00Z",
                                                         "provings": [{"at": "2026-03-14T07:00:00Z"}]}),
    "the vessel's instruments": lambda p: p.tank("tk-1", sources=[{"source": "radar"}, {"source": "hand"}],
                                                 instruments={"level_m": {"offset": 0.01}},
                                                 effective_from="2026-03-15T00:00:00Z"),
    "the substance": lambda p: p.put("substance", "oil", OIL | {"name": "o", "effective_from": "2026-03-15T00:00:00Z"}),
    "the site's alarms": lambda p: p.put_site(false_alarms_per_month=2.0, effective_from="2026-03-15T00:00:00Z"),
    "another vessel": lambda p: p.tank("tk-2"),
}  # fmt: skip


@pytest.mark.parametrize("change", CHANGES, ids=lambda name: name.replace(" ", "-"))
def test_each_kind_of_changed_input_is_another_digest(month: Plant, change: str) -> None:
    first = month.close("2026-03-14")
    CHANGES[change](month)
    assert (instant("2026-03-14T06:00"), instant("2026-03-15T06:00")) in month.due()
    again = month.close("2026-03-14")
    assert again["revision"] == 2
    assert again["digest"] != first["digest"]
    assert (instant("2026-03-14T06:00"), instant("2026-03-15T06:00")) not in month.due()


IDLE: dict[str, Callable[[Plant], Any]] = {
    "a check by hand": lambda p: p.read("tk-1", "2026-03-15T06:00", "hand", level_m=4.2),
    "a reading at noon": lambda p: p.read("tk-1", "2026-03-14T12:00", "radar", level_m=4.2),
    "a repeat": lambda p: p.read("tk-1", "2026-03-15T06:00", "radar", level_m=4.0),
    "a substance of nothing": lambda p: p.put("substance", "unused", OIL),
    "a definition from the close on": lambda p: p.tank("tk-1", name="later", effective_from="2026-03-15T06:00:00Z"),
    "a ticket of the next day": lambda p: p.ticket("t-9", JETTY, "tk-1", "2026-03-15T06:00", "2026-03-15T06:00",
                                                   mass_kg=9.0),
}  # fmt: skip


@pytest.mark.parametrize("change", IDLE, ids=lambda name: name.replace(" ", "-"))
def test_what_does_not_count_makes_no_revision_and_leaves_nothing_due(month: Plant, change: str) -> None:
    first = month.close("2026-03-14")
    IDLE[change](month)
    assert month.close("2026-03-14") == first
    assert len(revisions(month, 14)) == 1
    assert month.due() == []


def test_sixteen_closers_write_one_revision(month: Plant) -> None:
    start = threading.Barrier(16)

    def one(_: int) -> tuple[str, bool]:
        start.wait()
        body, new = close.close(month.store, month.clock, month.site, "2026-03-14")
        return body["id"], new

    with ThreadPoolExecutor(16) as pool:
        done = list(pool.map(one, range(16)))
    assert {name for name, _ in done} == {"2026-03-14.1"}
    assert sum(new for _, new in done) == 1
    assert len(revisions(month, 14)) == 1
    month.read("tk-1", "2026-03-15T06:00", "radar", level_m=4.1)
    with ThreadPoolExecutor(16) as pool:
        done = list(pool.map(one, range(16)))
    assert {name for name, _ in done} == {"2026-03-14.2"}
    assert sum(new for _, new in done) == 1
    assert len(revisions(month, 14)) == 2
    assert month.due() == []


def test_what_comes_while_a_close_computes_keeps_the_night_due(month: Plant, monkeypatch: pytest.MonkeyPatch) -> None:
    month.close("2026-03-14")
    month.read("tk-1", "2026-03-15T06:00", "radar", level_m=4.1)
    computed = close._compute

    def slow(*said: Any) -> Any:
        done = computed(*said)
        month.read("tk-1", "2026-03-15T06:00", "radar", level_m=4.2)
        return done

    monkeypatch.setattr(close, "_compute", slow)
    assert row(month.close("2026-03-14"), "tk-1")["closing_mass_kg"] == pytest.approx(328_000.0, rel=1e-12)
    monkeypatch.undo()
    night = (instant("2026-03-14T06:00"), instant("2026-03-15T06:00"))
    assert night in month.due()
    assert row(month.close("2026-03-14"), "tk-1")["closing_mass_kg"] == pytest.approx(336_000.0, rel=1e-12)
    assert month.due() == []


def test_a_period_is_found_by_day_by_revision_and_as_it_was_known(month: Plant) -> None:
    first = month.close("2026-03-14")
    known = month.known()
    month.read("tk-1", "2026-03-15T06:00", "radar", level_m=4.5)
    second = month.close("2026-03-14")
    assert find(month, "2026-03-14") == find(month, "2026-03-14.2") == second
    assert find(month, "2026-03-14.1") == find(month, "2026-03-14", known) == first
    for missing, as_of in (("2026-03-14.3", None), ("2026-03-14.2", known), ("2026-03-13", None)):
        with pytest.raises(NotFound) as refused:
            find(month, missing, as_of)
        assert refused.value.code == "unknown_reconciliation"


def test_any_period_may_be_closed_and_is_named_by_its_instants(month: Plant) -> None:
    bounds = (instant("2026-03-14T06:00"), instant("2026-03-17T06:00"))
    body, _ = close.close(month.store, month.clock, month.site, bounds=bounds)
    assert body["id"] == "20260314T060000Z--20260317T060000Z.1"
    assert find(month, "20260314T060000Z--20260317T060000Z")["closing"] == bounds[1]
    assert row(body, "tk-1")["delivered_kg"] == 80_000.0
    # Two instants that are a day are that day.
    day, new = close.close(month.store, month.clock, month.site, bounds=(bounds[0], instant("2026-03-15T06:00")))
    assert (day["id"], new) == ("2026-03-14.1", True)
    assert close.close(month.store, month.clock, month.site, "2026-03-14") == (day, False)


def test_a_period_that_has_not_ended_is_refused(month: Plant) -> None:
    # The clock of these tests stands at 2026-12-31T00:00Z.
    with pytest.raises(Conflict) as refused:
        month.close("2026-12-30")
    assert (refused.value.status, refused.value.code) == (409, "period_open")
    month.put_site(day_starts_at="00:00", effective_from="2026-12-01T00:00:00Z")
    assert month.close("2026-12-30")["closing"] == month.clock.now()


@pytest.mark.parametrize(("day", "hours"), [("2026-03-27", 24), ("2026-03-28", 23), ("2026-10-24", 25)])
def test_days_of_23_and_25_hours_are_closed_by_the_local_clock(plant: Plant, day: str, hours: int) -> None:
    # Directive 2000/84/EC: summer time ends on 25 October 2026, begins on 29 March, 01:00 UTC.
    plant.put_site(time_zone="Europe/Oslo", effective_from="2026-01-01T00:00:00Z")
    plant.tank("tk-1")
    opening = instant(f"{day}T06:00:00+02:00" if "10" in day[5:7] else f"{day}T06:00:00+01:00")
    night = plant.close(day)
    assert (night["opening"], night["closing"] - night["opening"]) == (opening, hours * 3_600_000_000)
    assert night["id"] == f"{day}.1"


def test_listings_hold_each_period_once_at_its_newest_revision(month: Plant) -> None:
    for day in ("14", "15", "16"):
        month.close(f"2026-03-{day}")
    month.read("tk-1", "2026-03-15T06:00", "radar", level_m=4.5)
    month.close("2026-03-14")
    period = (instant("2026-03-14T06:00"), instant("2026-03-17T06:00"))

    def page(place: tuple[int, str, int] | None, limit: int, as_of: int | None = None) -> Any:
        return close.listing(month.store, month.site, period, place, limit, as_of)

    found, following, known = page(None, 2)
    assert [one["id"] for one in found] == ["2026-03-14.2", "2026-03-15.1"]
    month.close("2026-03-15")  # between two pages
    rest, end, _ = page((*following, known), 2)
    assert ([one["id"] for one in rest], end) == (["2026-03-16.1"], None)
    whole, _, _ = page(None, 10)
    assert [one["id"] for one in whole] == ["2026-03-14.2", "2026-03-15.2", "2026-03-16.1"]
    flat = close.imbalances(whole, flagged=None)
    assert [(one["reconciliation"], one["vessel"]) for one in flat] == [(one["id"], "tk-1") for one in whole]
    flagged = close.imbalances(whole, flagged=True)
    assert [one["reconciliation"] for one in flagged] == ["2026-03-14.2", "2026-03-15.2"]
    assert [one["reconciliation"] for one in close.imbalances(whole, flagged=False)] == ["2026-03-16.1"]


def test_statistics_come_with_detail_only(month: Plant) -> None:
    assert "statistic" not in month.close("2026-03-14")["groups"][0]
    assert "statistic" in month.close("2026-03-14", detail=True)["groups"][0]
    assert "statistic" in find(month, "2026-03-14", detail=True)["groups"][0]
    assert "p_value" in find(month, "2026-03-14")["groups"][0]


def test_a_vessel_that_comes_into_service_within_the_chain_is_measured_at_its_first_opening(month: Plant) -> None:
    month.close("2026-03-14")
    month.tank("tk-2", effective_from="2026-03-15T05:00:00Z")
    month.read("tk-2", "2026-03-15T06:00", level_m=2.0)
    month.read("tk-2", "2026-03-16T06:00", level_m=2.0)
    second = month.close("2026-03-15")
    assert row(second, "tk-2")["opening_mass_kg"] == pytest.approx(160_000.0, rel=1e-12)
    assert second["complete"] is True


def test_a_site_without_vessels_closes_an_empty_balanced_night(plant: Plant) -> None:
    night = plant.close("2026-03-14")
    assert (night["status"], night["complete"], night["vessels"], night["totals"]) == ("balanced", True, [], [])
