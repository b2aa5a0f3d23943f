"""What is in force at an instant: the site, its vessels in service, its meters; and which period a label names."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, TypeVar

import pytest

from app.errors import Conflict, NotFound, Unprocessable
from app.services import in_force
from app.services.instants import Period
from app.store.sites import number
from tests.app.services.plant import BOX, OIL, Plant, instant

T = TypeVar("T")
ALL = 2**62


def ask(plant: Plant, act: Callable[..., T], *said: Any) -> T:
    with plant.store.reading() as connection:
        return act(connection, number(connection, plant.site), *said)


def site_at(plant: Plant, at: str, known: int = ALL, only: str | None = None) -> in_force.SiteInForce:
    return ask(plant, in_force.site_in_force, plant.site, instant(at), known, only)


def test_vessels_are_those_of_the_instant_and_of_what_was_known(plant: Plant) -> None:
    plant.tank("tk-1")
    known = plant.known()
    plant.tank("tk-2", effective_from="2026-03-14T06:00:00Z")
    plant.tank("tk-1", service="out", effective_from="2026-03-14T07:00:00Z")
    plant.put("vessel", "manifold", {"name": "manifold", "shape": {"kind": "junction"}})
    early, late = site_at(plant, "2026-03-14T05:59"), site_at(plant, "2026-03-14T07:00")
    assert [one.name for one in early.vessels] == ["tk-1"]
    assert [one.name for one in late.vessels] == ["tk-2"]
    assert [one.name for one in late.out] == ["tk-1"]
    assert (late.vessel("tk-1"), late.vessel("tk-2")) == (None, late.vessels[0])
    assert [one.name for one in site_at(plant, "2026-03-14T07:00", known).vessels] == ["tk-1"]
    assert [one.name for one in site_at(plant, "2026-03-14T06:30", only="tk-2").vessels] == ["tk-2"]
    with pytest.raises(NotFound):
        site_at(plant, "2026-03-14T05:00", only="tk-2")


def test_a_vessel_cites_the_definitions_that_it_rests_on(plant: Plant) -> None:
    plant.tank("tk-1")
    since = instant("2026-03-14T06:00")
    plant.put("substance", "oil", OIL | {"name": "better oil", "effective_from": "2026-03-14T06:00:00Z"})
    (vessel,) = site_at(plant, "2026-03-14T06:00").vessels
    assert [tuple(one) for one in vessel.definitions] == [
        ("site", plant.site, None, 1), ("vessel", "tk-1", None, 1), ("substance", "oil", since, 1),
    ]  # fmt: skip


def test_a_site_rests_on_its_texts_and_on_nothing_else(plant: Plant) -> None:
    plant.tank("tk-1")
    before = site_at(plant, "2026-03-14T06:00").texts
    plant.put("substance", "unused", OIL)
    plant.put("meter", "m-1", {"name": "m"})
    assert site_at(plant, "2026-03-14T06:00").texts == before
    plant.tank("tk-1", dead_stock_m3=3.0, effective_from="2026-03-14T06:00:00Z")
    assert site_at(plant, "2026-03-14T05:59").texts == before
    assert site_at(plant, "2026-03-14T06:00").texts != before


def test_a_substance_that_is_not_there_yet_is_a_conflict_and_no_fault(plant: Plant) -> None:
    plant.put("substance", "later", OIL | {"effective_from": "2027-01-01T00:00:00Z"})
    plant.tank("tk-1", substance="later")
    with pytest.raises(Conflict) as refused:
        site_at(plant, "2026-03-14T06:00")
    assert refused.value.code == "unknown_substance"
    assert len(site_at(plant, "2027-01-01T00:00").vessels) == 1


def test_meters_are_those_of_the_instant(plant: Plant) -> None:
    plant.put("meter", "m-1", {"name": "m", "random_pct": 0.1})
    plant.put("meter", "m-1", {"name": "m", "random_pct": 0.2, "effective_from": "2026-03-14T06:00:00Z"})

    def at(text: str) -> float | None:
        return ask(plant, in_force.meters_in_force, instant(text), ALL)["m-1"].random_pct

    assert (at("2026-03-14T05:59"), at("2026-03-14T06:00")) == (0.1, 0.2)


@pytest.mark.parametrize(
    ("day", "opening", "closing"),
    # Directive 2000/84/EC: summer time in Oslo from 29 March 2026 to 25 October, 01:00 UTC.
    [("2026-03-27", "27T05:00", "28T05:00"), ("2026-03-28", "28T05:00", "29T04:00"),
     ("2026-03-29", "29T04:00", "30T04:00")],
)  # fmt: skip
def test_a_day_is_the_sites_own(plant: Plant, day: str, opening: str, closing: str) -> None:
    plant.put_site(time_zone="Europe/Oslo", effective_from="2026-01-01T00:00:00Z")
    period = ask(plant, in_force.period_of, plant.site, day, ALL)
    bounds = (instant(f"2026-03-{opening}"), instant(f"2026-03-{closing}"))
    assert (period.opening, period.closing, period.label) == (*bounds, day)
    # And its two instants are that day again.
    assert ask(plant, in_force.labelled, plant.site, bounds, ALL).label == day


def test_a_period_that_is_no_day_is_named_by_its_instants(plant: Plant) -> None:
    bounds = (instant("2026-03-01T05:00"), instant("2026-04-01T05:00"))
    label = "20260301T050000Z--20260401T050000Z"
    assert ask(plant, in_force.labelled, plant.site, bounds, ALL).label == label
    assert ask(plant, in_force.period_of, plant.site, label, ALL) == Period(*bounds)


@pytest.mark.parametrize(
    "label", ["2026-02-30", "20261301T000000Z--20270101T000000Z", "20260101T250000Z--20270101T000000Z"]
)
def test_a_date_that_does_not_exist_is_refused(plant: Plant, label: str) -> None:
    with pytest.raises(Unprocessable):
        ask(plant, in_force.period_of, plant.site, label, ALL)


def test_a_site_that_begins_later_is_not_defined_before(plant: Plant) -> None:
    with pytest.raises(NotFound):
        ask(plant, in_force.site_body, "another", instant("2026-03-14T06:00"), ALL)
    body, own = ask(plant, in_force.site_body, plant.site, instant("2026-03-14T06:00"), ALL)
    assert (body.name, in_force.named("site", own).effective_from) == ("Invented", None)
    assert BOX["name"] not in own.body
