"""Closed nights become due in the transaction that touches them, and others do not."""

from __future__ import annotations

import pytest

from tests.app.services.plant import OIL, Plant, instant

NIGHT = {day: (instant(f"2026-03-{day:02}T06:00"), instant(f"2026-03-{day + 1:02}T06:00")) for day in (10, 11, 12)}


@pytest.fixture
def closed(plant: Plant) -> Plant:
    plant.tank("tk-1")
    for day in (10, 11, 12, 13):
        plant.read("tk-1", f"2026-03-{day}T06:00", level_m=5.0)
    for day in NIGHT:
        plant.close(f"2026-03-{day}")
    assert plant.due() == []
    return plant


def test_before_the_first_close_nothing_is_due(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.read("tk-1", "2026-03-10T06:00", level_m=5.0)
    plant.ticket("t-1", "boundary:x", "tk-1", "2026-03-10T07:00", "2026-03-10T08:00", mass_kg=1.0)
    assert plant.due() == []


@pytest.mark.parametrize("level", [5.0, 5.5])
def test_a_late_reading_makes_its_nights_due_and_a_repeat_does_not(closed: Plant, level: float) -> None:
    closed.read("tk-1", "2026-03-12T06:00", level_m=level)
    if level == 5.0:
        assert closed.due() == []
    else:
        # A value may be interpolated to, or carried forward, for up to 35 days: all three may use it.
        assert closed.due() == list(NIGHT.values())


def test_a_late_sample_touches_every_night_from_then_on_and_none_before(closed: Plant) -> None:
    closed.read("tk-1", "2026-03-11T07:00", observed_density_kg_m3=810.0, observed_density_temperature_c=15.0)
    assert closed.due() == [NIGHT[11], NIGHT[12]]


def test_a_sample_touches_the_nights_since_when_it_stands_and_a_corrected_one_those_since_when_it_could(
    closed: Plant,
) -> None:
    sample = {"observed_density_kg_m3": 810.0, "observed_density_temperature_c": 15.0}
    closed.read("tk-1", "2026-03-12T07:00", sample_holds_from="2026-03-11T20:00:00Z", **sample)
    assert closed.due() == [NIGHT[11], NIGHT[12]]
    for day in (11, 12):
        closed.close(f"2026-03-{day}")
    closed.read("tk-1", "2026-03-12T07:00", sample_holds_from="2026-03-12T05:00:00Z", **sample)
    assert closed.due() == list(NIGHT.values())


def test_readings_long_after_the_last_close_touch_nothing(closed: Plant) -> None:
    closed.read("tk-1", "2026-04-18T06:00", level_m=5.0)  # 36 days
    assert closed.due() == []


def test_a_late_ticket_touches_the_nights_that_it_spans(closed: Plant) -> None:
    closed.ticket("t-1", "boundary:x", "tk-1", "2026-03-11T07:00", "2026-03-11T08:00", mass_kg=1.0)
    assert closed.due() == [NIGHT[11]]


def test_a_ticket_that_is_moved_touches_where_it_was_and_where_it_is(closed: Plant) -> None:
    closed.ticket("t-1", "boundary:x", "tk-1", "2026-03-10T07:00", "2026-03-10T08:00", mass_kg=1.0)
    closed.close("2026-03-10")
    assert closed.due() == [NIGHT[11]]  # its opening may be another now, so that books chain
    closed.close("2026-03-11")
    assert closed.due() == []  # it opened as it did and stands, and so does what follows
    closed.ticket("t-1", "boundary:x", "tk-1", "2026-03-12T07:00", "2026-03-12T08:00", mass_kg=1.0)
    assert closed.due() == [NIGHT[10], NIGHT[12]]


def test_a_definition_touches_the_nights_from_then_on(closed: Plant) -> None:
    closed.put("substance", "oil", OIL | {"name": "other", "effective_from": "2026-03-12T00:00:00Z"})
    assert closed.due() == [NIGHT[11], NIGHT[12]]


def test_a_close_ends_what_is_due_and_what_came_in_between_stays(closed: Plant) -> None:
    closed.ticket("t-1", "boundary:x", "tk-1", "2026-03-12T07:00", "2026-03-12T08:00", mass_kg=0.5)
    assert closed.due() == [NIGHT[12]]
    closed.close("2026-03-12")
    assert closed.due() == []
