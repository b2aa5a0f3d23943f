"""Definitions: created, revised, dated, corrected, refused; and readable as they were known."""

from __future__ import annotations

from typing import Any

import pytest

from app.errors import AppError, Conflict, NotFound, Unprocessable
from app.services import define
from app.services.find import ALL_TIME
from tests.app.services.plant import BOX, OIL, Plant, instant

SPHERE = {"kind": "sphere", "diameter_m": 3.0}
UPRIGHT = {"kind": "vertical_cylinder", "diameter_m": 20.0, "height_m": 15.0}
GAS = {"name": "nitrogen", "vapour": {"model": "virial", "components": [{"id": "nitrogen", "mole_fraction": 1.0}]}}


def newest(plant: Plant, name: str, at: int | None = None, as_of: int | None = None) -> dict[str, Any]:
    return define.newest(plant.store, plant.site, "vessel", name, at, as_of)


def refusal(plant: Plant, body: dict[str, Any], kind: str = "vessel") -> tuple[str, str]:
    """Code and pointer of the refusal of a body."""
    before = plant.known()
    with pytest.raises(Unprocessable) as refused:
        plant.put(kind, "new", body)
    assert plant.known() == before
    return refused.value.code, refused.value.errors[0].pointer


def test_a_put_creates_repeats_and_revises(plant: Plant) -> None:
    first = plant.tank("tk-1")
    assert first.outcome == "created"
    assert plant.tank("tk-1").outcome == "unchanged"
    revised = plant.tank("tk-1", name="other", effective_from="2026-03-14T06:00:00Z")
    assert (revised.outcome, revised.known_at > first.known_at) == ("revised", True)
    corrected = plant.tank("tk-1", name="third", effective_from="2026-03-14T06:00:00Z")
    assert corrected.outcome == "revised"
    assert newest(plant, "tk-1")["definition"].name == "third"
    assert newest(plant, "tk-1", at=instant("2026-03-14T05:59"))["definition"].name == "box"
    assert newest(plant, "tk-1", as_of=revised.known_at)["definition"].name == "other"
    assert newest(plant, "tk-1", as_of=first.known_at)["effective_from"] is None
    assert [(one["revision"], one["definition"].name) for one in define.revisions(
        plant.store, plant.site, "vessel", "tk-1", None
    )[0]] == [(1, "box"), (1, "other"), (2, "third")]  # fmt: skip


def test_another_definition_must_say_from_when_it_holds(plant: Plant) -> None:
    plant.tank("tk-1")
    with pytest.raises(Unprocessable) as refused:
        plant.tank("tk-1", name="other")
    assert (refused.value.code, refused.value.errors[0].pointer) == ("effective_from_missing", "/effective_from")


def test_what_does_not_fit_is_refused_by_its_field(plant: Plant) -> None:
    assert refusal(plant, BOX | {"substance": "tea"}) == ("unknown_substance", "/substance")
    assert refusal(plant, BOX | {"shell": {"courses": [[2.0, 0.02]]}}) == ("impossible_definition", "/shell/courses")
    plant.put("substance", "n2", GAS)
    code, pointer = refusal(plant, BOX | {"substance": "n2", "vapour_space": {"kind": "open"}})
    assert pointer == "/substance", code
    unknown = {"model": "virial", "components": [{"id": "unobtainium", "mole_fraction": 1.0}]}
    code, pointer = refusal(plant, GAS | {"vapour": unknown}, "substance")
    assert pointer.startswith("/"), pointer



def test_a_vessel_may_come_before_the_substance_that_it_takes_later(plant: Plant) -> None:
    plant.put("substance", "later", OIL | {"effective_from": "2027-01-01T00:00:00Z"})
    assert plant.tank("tk-1", substance="later").outcome == "created"


def test_a_closed_day_holds_the_zone_and_the_hour(plant: Plant) -> None:
    plant.put_site()
    plant.close("2026-03-14")
    dated = {"effective_from": "2026-03-15T05:00:00Z"}
    with pytest.raises(Conflict) as refused:
        plant.put_site(time_zone="Europe/Oslo", **dated)
    assert (refused.value.status, refused.value.code) == (409, "zone_in_use")
    with pytest.raises(Conflict):
        plant.put_site(day_starts_at="07:00", **dated)
    assert plant.put_site(name="renamed", **dated).outcome == "revised"
    # From the end of the last closed day on it may.
    assert plant.put_site(day_starts_at="07:00", effective_from="2026-03-15T06:00:00Z").outcome == "revised"


def test_listings_are_pages_by_id_and_know_what_they_include(plant: Plant) -> None:
    for name in ("c", "a", "b"):
        plant.tank(name)
    known = plant.known()
    plant.tank("d")
    page, following, seen = define.listing(plant.store, plant.site, "vessel", None, known, None, 2)
    assert ([one["id"] for one in page], following, seen) == (["a", "b"], "b", known)
    page, following, _ = define.listing(plant.store, plant.site, "vessel", None, known, following, 2)
    assert ([one["id"] for one in page], following) == (["c"], None)
    page, _, _ = define.listing(plant.store, plant.site, "vessel", None, None, "c", 2)
    assert [one["id"] for one in page] == ["d"]


def test_sites_are_listed_by_id(plant: Plant) -> None:
    # Other tests' sites stand beside this one: it is found behind the id before it.
    before = plant.site[:-1]
    page, _ = define.site_listing(plant.store, before, 1)
    assert [one["id"] for one in page] == [plant.site]
    assert page[0]["definition"].name == "Invented"
    everything, following = define.site_listing(plant.store, None, 10_000)
    assert following is None
    assert [one["id"] for one in everything] == sorted(one["id"] for one in everything)


@pytest.mark.parametrize("kind", ["substance", "vessel", "meter"])
def test_what_is_not_there_is_said_to_be_missing(plant: Plant, kind: str) -> None:
    with pytest.raises(NotFound) as missing:
        define.newest(plant.store, plant.site, kind, "tk-9", None, None)
    assert missing.value.code == f"unknown_{kind}"
    with pytest.raises(NotFound):
        define.revisions(plant.store, plant.site, kind, "tk-9", None)
    with pytest.raises(AppError) as unknown:
        define.listing(plant.store, "no-such-site", kind, ALL_TIME, None, None, 1)
    assert unknown.value.code == "unknown_site"
