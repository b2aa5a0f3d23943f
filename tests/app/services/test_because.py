"""What was recorded between two states of knowledge, and whether it counted in a vessel's mass."""

from __future__ import annotations

from typing import Any

import pytest

from app.services.because import Cause, Compared, Side, ends, merged, method, told_at
from app.store.sites import number, watermark
from tests.app.services.plant import OIL, Plant, instant

CLOSE = instant("2026-03-15T06:00")


@pytest.fixture
def tank(plant: Plant) -> Plant:
    """A tank read at six by its radar, with a sample of the first of the month."""
    plant.tank("tk-1")
    plant.tank("tk-2")
    plant.read("tk-1", "2026-03-15T06:00", "radar", level_m=5.0)
    plant.read("tk-2", "2026-03-15T06:00", "radar", level_m=5.0)
    plant.read("tk-1", "2026-03-01T06:00", "lab", observed_density_kg_m3=800.0, observed_density_temperature_c=15.0)
    return plant


def known(plant: Plant) -> int:
    with plant.store.reading() as connection:
        return watermark(connection, number(connection, plant.site))


def of(plant: Plant, since: int, vessel: str = "tk-1") -> set[tuple[str, str]]:
    """Kinds and subjects of what changed a vessel's mass since then."""
    sides = Side(since, CLOSE - 1, "1"), Side(known(plant), CLOSE - 1, "1")
    with plant.store.reading() as connection:
        site_id = number(connection, plant.site)
        compared = Compared(connection, site_id, plant.site, CLOSE, *sides, 0)
        return {(one.kind, one.subject) for one in compared.of(vessel)}


def test_nothing_came_and_nothing_is_said(tank: Plant) -> None:
    assert of(tank, known(tank)) == set()


READ: dict[str, tuple[dict[str, Any], set[tuple[str, str]]]] = {
    "a level that counts": (
        {"at": "2026-03-15T06:00", "source": "radar", "level_m": 5.1},
        {("revised_reading", "tk-1 level_m 2026-03-15T06:00:00Z from radar")},
    ),
    "a level that does not": ({"at": "2026-03-15T05:00", "source": "radar", "level_m": 5.1}, set()),
    "a sample drawn since": (
        {"at": "2026-03-14T06:00", "source": "lab", "observed_density_kg_m3": 801.0,
         "observed_density_temperature_c": 16.0},
        {("late_reading", "tk-1 observed_density_kg_m3 2026-03-14T06:00:00Z from lab"),
         ("late_reading", "tk-1 observed_density_temperature_c 2026-03-14T06:00:00Z from lab")},
    ),
    "the sample's temperature alone": (
        {"at": "2026-03-01T06:00", "source": "lab", "observed_density_temperature_c": 16.0},
        {("revised_reading", "tk-1 observed_density_temperature_c 2026-03-01T06:00:00Z from lab")},
    ),
    "water without a source": (
        {"at": "2026-03-15T03:00", "free_water_level_m": 0.1},
        {("late_reading", "tk-1 free_water_level_m 2026-03-15T03:00:00Z")},
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", READ)
def test_a_reading_is_a_cause_where_it_counts(tank: Plant, name: str) -> None:
    said, expected = READ[name]
    since = known(tank)
    tank.read("tk-1", **said)
    assert of(tank, since) == expected
    assert of(tank, since, "tk-2") == set()


def test_a_barometer_is_the_sites(tank: Plant) -> None:
    since = known(tank)
    tank.read(None, "2026-03-15T05:00", barometric_pressure_kpa_abs=99.0)
    assert of(tank, since) == {("late_reading", "site barometric_pressure_kpa_abs 2026-03-15T05:00:00Z")}


def test_a_value_that_came_and_was_revised_since_is_late(tank: Plant) -> None:
    since = known(tank)
    for level in (0.1, 0.2):
        tank.read("tk-1", "2026-03-15T03:00", free_water_level_m=level)
    assert of(tank, since) == {("late_reading", "tk-1 free_water_level_m 2026-03-15T03:00:00Z")}


def test_definitions_that_hold_at_the_close_are_causes(tank: Plant) -> None:
    since = known(tank)
    tank.put("substance", "oil", OIL | {"name": "another name", "effective_from": "2026-03-15T00:00:00Z"})
    tank.tank("tk-2", hand_gauging=True, effective_from="2026-03-15T06:00:01Z")  # after the reading at the close
    assert of(tank, since) == of(tank, since, "tk-2") == {("definition", "substance oil")}


def test_an_offset_of_the_readings_own_instant_is_a_cause(tank: Plant) -> None:
    """The vessel's text of the first of the month is the one that the sample was drawn under."""
    tank.tank("tk-1", hand_gauging=True, effective_from="2026-03-10T06:00:00Z")
    since = known(tank)
    density = {"observed_density_kg_m3": {"offset": 0.5}}
    tank.tank("tk-1", instruments=density, effective_from="2026-02-01T06:00:00Z")
    assert of(tank, since) == {("definition", "vessel tk-1")}


def test_a_method_is_named_with_the_one_before() -> None:
    assert method(Side(1, None, "1"), Side(2, None, "1"), 7) == []
    (found,) = method(Side(1, None, "1"), Side(2, None, "2"), 7)
    assert (found.kind, found.subject, found.recorded_at) == ("method", "1 to 2", 7)
    assert found.answer() == {"kind": "method", "subject": "1 to 2", "recorded_at": 7}


def test_causes_stand_once_and_in_the_order_of_time() -> None:
    first, second = (Cause("late_transfer", name, at, "") for name, at in (("b", 1), ("a", 2)))
    assert merged([second, first, second]) == [first, second]


def test_an_instant_is_told_to_the_second() -> None:
    assert told_at(CLOSE + 999_999) == "2026-03-15T06:00:00Z"


def test_a_tickets_ends_stand_in_its_body() -> None:
    assert ends('{"from": "boundary:jetty-1", "to": "tk-1"}') == {"boundary:jetty-1", "tk-1"}
