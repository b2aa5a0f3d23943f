"""What was stored is read back in pages that share what they know."""

from __future__ import annotations

import pytest

from app.errors import NotFound, Unprocessable
from app.services import read_back
from tests.app.services.plant import Plant, instant

FROM, TO = instant("2026-03-14T00:00"), instant("2026-03-15T00:00")
Place = tuple[int, str, int] | None


def test_values_come_in_order_with_their_revision_and_source(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.read("tk-1", "2026-03-14T07:00", "radar", level_m=5.0, liquid_temperature_c=12.0)
    plant.read("tk-1", "2026-03-14T06:00", "hand", level_m=4.0, quality="uncertain")
    plant.read("tk-1", "2026-03-14T07:00", "radar", level_m=5.5)
    plant.read("tk-1", "2026-03-15T00:00", "radar", level_m=9.0)
    found, following, known = read_back.values(plant.store, plant.site, "tk-1", (FROM, TO), None, None, 100, None)
    assert [(one["source"], one["quantity"], one["value"], one["quality"], one["revision"]) for one in found] == [
        ("hand", "level_m", 4.0, "uncertain", 1),
        ("radar", "level_m", 5.5, "good", 2),
        ("radar", "liquid_temperature_c", 12.0, "good", 1),
    ]
    assert following is None and known == plant.known()
    only, _, _ = read_back.values(plant.store, plant.site, "tk-1", (FROM, TO), "hand", None, 100, None)
    assert [one["value"] for one in only] == [4.0]


def test_as_of_shows_what_was_known_then(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.read("tk-1", "2026-03-14T07:00", level_m=5.0)
    known = plant.known()
    plant.read("tk-1", "2026-03-14T07:00", level_m=6.0)
    plant.read("tk-1", "2026-03-14T07:00", level_m=6.0, quality="bad")
    then, _, seen = read_back.values(plant.store, plant.site, "tk-1", (FROM, TO), None, None, 100, known)
    assert ([one["value"] for one in then], seen) == ([5.0], known)
    (now,) = read_back.values(plant.store, plant.site, "tk-1", (FROM, TO), None, None, 100, None)[0]
    assert (now["value"], now["quality"], now["revision"]) == (6.0, "bad", 3)


def test_pages_of_values_share_what_they_know(plant: Plant) -> None:
    plant.tank("tk-1")
    for hour in range(5):
        plant.read("tk-1", f"2026-03-14T0{hour}:00", level_m=float(hour))
    place: Place = None
    seen: list[float] = []
    pages = 0
    while True:
        page, following, known = read_back.values(plant.store, plant.site, "tk-1", (FROM, TO), None, place, 2, None)
        seen.extend(one["value"] for one in page)
        pages += 1
        plant.read("tk-1", "2026-03-14T23:00", level_m=float(pages))  # between two pages
        if following is None:
            break
        place = (*following, known)
    assert (seen, pages) == ([0.0, 1.0, 2.0, 3.0, 4.0], 3)


def test_pages_of_tickets_hold_struck_ones_and_share_what_they_know(plant: Plant) -> None:
    plant.tank("tk-1")
    for name, hour in (("b", 3), ("a", 5), ("c", 4)):
        plant.ticket(name, "boundary:x", "tk-1", f"2026-03-14T0{hour}:00", f"2026-03-14T0{hour}:30", mass_kg=1.0)
    plant.ticket("c", "boundary:x", "tk-1", "2026-03-14T04:00", "2026-03-14T04:30", mass_kg=1.0, void=True)
    plant.ticket("z", "boundary:x", "tk-1", "2026-03-15T00:00", "2026-03-15T01:00", mass_kg=1.0)
    first, following, known = read_back.tickets(plant.store, plant.site, (FROM, TO), None, 2, None)
    assert [(one.name, body.void) for one, body in first] == [("b", False), ("c", True)]
    assert following is not None
    plant.ticket("d", "boundary:x", "tk-1", "2026-03-14T08:00", "2026-03-14T08:30", mass_kg=1.0)
    rest, end, _ = read_back.tickets(plant.store, plant.site, (FROM, TO), (*following, known), 2, None)
    assert ([one.name for one, _ in rest], end) == (["a"], None)


def test_what_cannot_be_asked_is_refused(plant: Plant) -> None:
    with pytest.raises(NotFound):
        read_back.values(plant.store, plant.site, "tk-9", (FROM, TO), None, None, 1, None)
    with pytest.raises(Unprocessable, match="after from"):
        read_back.values(plant.store, plant.site, "tk-9", (TO, FROM), None, None, 1, None)
    with pytest.raises(Unprocessable, match="after from"):
        read_back.tickets(plant.store, plant.site, (FROM, FROM), None, 1, None)
    with pytest.raises(NotFound):
        read_back.tickets(plant.store, "no-such-site", (FROM, TO), None, 1, None)
