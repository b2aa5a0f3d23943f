"""A sample stands from when it says, whenever it was drawn; what was drawn and reported late is found all the same."""

from __future__ import annotations

import random
from collections.abc import Iterator
from datetime import datetime, timedelta

import pytest

from app.services import mark, samples
from app.services.samples import HOLDS, Kind, Sample, samples_at, samples_of
from app.store import readings
from app.store.engine import Store
from app.store.sites import number, watermark
from tests.app.services.plant import Plant, instant

MAIN = "observed_density_kg_m3"
HOUR = 3_600_000_000
START = instant("2026-03-14T00:00")


def at_hour(hours: float) -> str:
    return (datetime(2026, 3, 14) + timedelta(hours=hours)).isoformat(timespec="minutes")


def drawn(
    plant: Plant, hour: float, density: float, holds: float | None = None, vessel: str = "tk-1", **said: str
) -> None:
    """A sample drawn at an hour of the 14th, which stands from another where that is said."""
    since = {} if holds is None else {"sample_holds_from": f"{at_hour(holds)}:00Z"}
    plant.read(vessel, at_hour(hour), "lab", observed_density_kg_m3=density, observed_density_temperature_c=15.0,
               **since, **said)  # fmt: skip


class Laboratory:
    """The samples of a site as the two readers find them."""

    def __init__(self, plant: Plant) -> None:
        self.store: Store = plant.store
        self.name = plant.site

    def kinds(self) -> list[Kind]:
        with self.store.reading() as connection:
            found = readings.series_of(connection, number(connection, self.name), ["tk-1", "tk-2"])
        by_owner: dict[tuple[str, str], dict[str, int]] = {}
        for one in found:
            by_owner.setdefault((one.vessel, one.source), {})[one.quantity] = one.series_id
        return [(owner, source, MAIN, own) for (owner, source), own in by_owner.items() if MAIN in own]

    def standing(self, at: int, owner: str = "tk-1", known: int | None = None) -> Sample | None:
        """The sample that stands by the reader of one instant."""
        kinds = self.kinds()
        with self.store.reading() as connection:
            site_id = number(connection, self.name)
            mark = watermark(connection, site_id) if known is None else known
            found = samples_at(connection, site_id, kinds, {name: at for name, *_ in kinds}, mark)
        return newest(found[(owner, "lab", MAIN)], at)

    def course(self, latest: int, owner: str = "tk-1") -> list[Sample]:
        """All samples by the reader of a course."""
        with self.store.reading() as connection:
            site_id = number(connection, self.name)
            found = samples_of(connection, site_id, self.kinds(), latest, watermark(connection, site_id))
        return found[(owner, "lab", MAIN)]


def newest(found: list[Sample], at: int) -> Sample | None:
    standing = [one for one in found if one.begins <= at]
    return standing[-1] if standing else None


def density(sample: Sample | None) -> float | None:
    return None if sample is None else sample.values[MAIN].value


@pytest.fixture
def laboratory(plant: Plant) -> Iterator[Laboratory]:
    plant.tank("tk-1")
    plant.tank("tk-2")
    yield Laboratory(plant)


def asked(plant: Plant, laboratory: Laboratory, *hours: float) -> list[float | None]:
    """What stands at each hour, which both readers must say."""
    result = []
    for hour in hours:
        at = START + round(hour * HOUR)
        one, other = laboratory.standing(at), newest(laboratory.course(at), at)
        assert density(one) == density(other)
        result.append(density(one))
    return result


def test_a_sample_stands_from_when_it_was_drawn_until_the_next(plant: Plant, laboratory: Laboratory) -> None:
    drawn(plant, 6, 800.0)
    drawn(plant, 12, 810.0)
    assert asked(plant, laboratory, 5.99, 6, 11.99, 12, 700) == [None, 800.0, 800.0, 810.0, 810.0]


def test_a_sample_drawn_after_the_instant_stands_from_when_it_says(plant: Plant, laboratory: Laboratory) -> None:
    drawn(plant, 6, 800.0)
    drawn(plant, 32, 810.0, holds=20)
    assert asked(plant, laboratory, 19.99, 20, 31, 33) == [800.0, 810.0, 810.0, 810.0]
    # Drawn as long after it begins as a sample may be, 35 days; and later than that it is another's.
    drawn(plant, 20.5 + 35 * 24, 820.0, holds=20.5)
    assert asked(plant, laboratory, 20.5) == [820.0]


def test_a_sample_that_stands_only_from_later_on_leaves_its_elder(plant: Plant, laboratory: Laboratory) -> None:
    drawn(plant, 2, 790.0)
    drawn(plant, 6, 800.0)
    for hour in (7, 8, 9):
        drawn(plant, hour, 803.0 + hour, holds=20 + hour)
    assert asked(plant, laboratory, 10, 26.99, 27, 28, 29) == [800.0, 800.0, 810.0, 811.0, 812.0]


def test_one_drawn_in_between_counts_before_one_that_stands_from_long_ago(plant: Plant, laboratory: Laboratory) -> None:
    drawn(plant, 10, 800.0)
    drawn(plant, 12, 810.0, holds=8)
    assert asked(plant, laboratory, 7, 8, 9.99, 10, 13) == [None, 810.0, 810.0, 800.0, 800.0]


def test_one_that_began_last_counts_although_it_was_drawn_first(plant: Plant, laboratory: Laboratory) -> None:
    drawn(plant, 10, 800.0, holds=14)
    drawn(plant, 12, 810.0, holds=11)
    assert asked(plant, laboratory, 10.5, 11, 13.99, 14, 15) == [None, 810.0, 810.0, 800.0, 800.0]


def test_of_two_that_begin_together_the_one_drawn_last_counts(plant: Plant, laboratory: Laboratory) -> None:
    drawn(plant, 10, 800.0, holds=8)
    drawn(plant, 12, 810.0, holds=8)
    assert asked(plant, laboratory, 8, 20) == [810.0, 810.0]


def test_a_sample_brings_only_what_was_read_of_it(plant: Plant, laboratory: Laboratory) -> None:
    drawn(plant, 6, 800.0, sample="s-1")
    plant.read("tk-1", at_hour(12), "lab", sediment_water_pct=0.2, sample="s-2")
    found = laboratory.standing(START + 13 * HOUR)
    assert found is not None
    assert (found.taken_at, found.begins) == (START + 6 * HOUR, START + 6 * HOUR)
    assert {"sediment_water_pct", HOLDS} & set(found.values) == set()
    assert found.values["sample"].cited == "s-1"
    assert found.values["observed_density_temperature_c"].value == 15.0


def test_a_withdrawn_sample_leaves_its_elder_and_what_was_known_stays(plant: Plant, laboratory: Laboratory) -> None:
    drawn(plant, 6, 800.0)
    drawn(plant, 12, 810.0, holds=8)
    known = plant.known()
    plant.read("tk-1", at_hour(12), "lab", observed_density_kg_m3=810.0, quality="bad")
    assert asked(plant, laboratory, 9, 13) == [800.0, 800.0]
    assert density(laboratory.standing(START + 9 * HOUR, known=known)) == 810.0


def test_each_vessel_is_asked_at_its_own_instant(plant: Plant, laboratory: Laboratory) -> None:
    for name in ("tk-1", "tk-2"):
        drawn(plant, 6, 800.0, vessel=name)
        drawn(plant, 12, 810.0, holds=10, vessel=name)
    kinds = laboratory.kinds()
    with plant.store.reading() as connection:
        site_id = number(connection, plant.site)
        instants = {"tk-1": START + 7 * HOUR, "tk-2": START + 11 * HOUR}
        found = samples_at(connection, site_id, kinds, instants, watermark(connection, site_id))
    assert density(newest(found[("tk-1", "lab", MAIN)], instants["tk-1"])) == 800.0
    assert density(newest(found[("tk-2", "lab", MAIN)], instants["tk-2"])) == 810.0


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_the_sample_of_an_instant_is_that_of_the_course_whatever_was_drawn_when(
    plant: Plant, laboratory: Laboratory, seed: int
) -> None:
    rng = random.Random(seed)
    rows: list[tuple[float, float, float]] = []
    for place in range(18):
        hour = rng.randrange(0, 200) + 0.5 * (place % 2)
        if any(hour == one for one, *_ in rows):
            continue
        holds = None if rng.random() < 0.4 else float(rng.randrange(max(0, int(hour) - 60), int(hour) + 30))
        drawn(plant, hour, 800.0 + place, holds)
        rows.append((hour, hour if holds is None else holds, 800.0 + place))
    for hour in [rng.uniform(-5.0, 240.0) for _ in range(40)]:
        standing = [(begins, taken, value) for taken, begins, value in rows if begins <= hour]
        expected = max(standing)[2] if standing else None
        assert asked(plant, laboratory, hour) == [expected], hour


def test_nothing_is_asked_where_nothing_was_ever_sampled(plant: Plant, laboratory: Laboratory) -> None:
    with plant.store.reading() as connection:
        site_id = number(connection, plant.site)
        assert samples_of(connection, site_id, [], START, 2**62) == {}
        assert samples_at(connection, site_id, [], {}, 2**62) == {}
    assert laboratory.kinds() == []


def test_a_night_that_a_late_sample_stands_in_is_due(plant: Plant, laboratory: Laboratory) -> None:
    plant.read("tk-1", "2026-03-14T06:00", level_m=5.0)
    plant.read("tk-1", "2026-03-15T06:00", level_m=5.0)
    plant.close("2026-03-14")
    drawn(plant, 33, 810.0, holds=20)
    assert plant.due() == [(instant("2026-03-14T06:00"), instant("2026-03-15T06:00"))]
    assert mark.LONGEST_AGE_US >= samples.LATEST_US
