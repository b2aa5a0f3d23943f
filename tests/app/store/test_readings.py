"""Values are classified, revised and found exactly as a plain dictionary would have it."""

from __future__ import annotations

import math
import random
from collections.abc import Iterable
from dataclasses import dataclass, field

import pytest
import sqlalchemy as sa

from app.store import readings
from app.store.engine import Store
from app.store.readings import Found, Listed, Value
from app.store.sites import number, watermark
from app.store.tables import READING, SERIES

T0 = 1_767_200_000_000_000  # near the end of 2025: the batches fall into two months
HOUR = 3_600_000_000
Key = tuple[str, str, str]  # vessel, quantity, source

VESSELS = ("tk-1", "tk-2", "")
NUMBERS = ("level_m", "liquid_temperature_c", "observed_density_kg_m3")
SOURCES = ("", "radar", "hand")


@dataclass(frozen=True)
class Kept:
    recorded_at: int
    value: float | None
    cited: str | None
    quality: int


@dataclass
class Model:
    """What the store promises, in a dictionary."""

    kept: dict[Key, dict[int, list[Kept]]] = field(default_factory=dict)

    def write(self, recorded_at: int, values: Iterable[Value]) -> list[str]:
        return [self.write_one(recorded_at, value) for value in values]

    def write_one(self, recorded_at: int, value: Value) -> str:
        series = self.kept.setdefault((value.vessel, value.quantity, value.source), {})
        former = series.get(value.taken_at, [])
        new = Kept(recorded_at, value.value, value.cited, value.quality)
        same = [one for one in former if (one.value, one.cited, one.quality) == (new.value, new.cited, new.quality)]
        if value.corrects is not None:
            if former and former[-1] in same:
                return "unchanged"
            if not former or former[-1].recorded_at != value.corrects:
                return "stale_correction"
        elif same:
            return "unchanged"
        series[value.taken_at] = [*former, new]
        return "revised" if former else "stored"

    def known(self, key: Key, known: int) -> dict[int, tuple[int, Kept]]:
        """Instant to number and content of the newest known revision."""
        found: dict[int, tuple[int, Kept]] = {}
        for instant, kept in sorted(self.kept.get(key, {}).items()):
            for revision, one in enumerate(kept, 1):
                if one.recorded_at <= known:
                    found[instant] = (revision, one)
        return found

    def usable(self, key: Key, known: int) -> dict[int, tuple[int, Kept]]:
        return {at: found for at, found in self.known(key, known).items() if found[1].quality < 2}


def plain(found: Found) -> tuple[int, float | None, str | None, int, int, int]:
    return found[1:]


def as_found(instant: int, revision: int, kept: Kept) -> tuple[int, float | None, str | None, int, int, int]:
    return (instant, kept.value, kept.cited, kept.quality, revision, kept.recorded_at)


def random_value(dice: random.Random, recorded: list[int]) -> Value:
    vessel, source = dice.choice(VESSELS), dice.choice(SOURCES)
    instant = T0 + dice.randrange(0, 30) * HOUR
    quality = dice.choice((0, 0, 0, 0, 1, 2))
    corrects = dice.choice(recorded) if recorded and dice.random() < 0.15 else None
    kind = dice.random()
    if kind < 0.15:
        text = dice.choice(('{"nitrogen":1.0}', '{"nitrogen":0.5,"hydrogen":0.5}'))
        return Value(vessel, "vapour_composition", source, instant, None, text, quality, corrects)
    sample = dice.choice(("S17", "S18", "naïve — 試料")) if kind < 0.3 else None
    value = dice.choice((0.0, -0.0, 1.5, 0.1 + 0.2, 0.3, 5e-324, 1.7976931348623157e308))
    return Value(vessel, dice.choice(NUMBERS), source, instant, value, sample, quality, corrects)


def test_random_batches_are_kept_and_found_as_a_dictionary_would(store: Store, site_id: str) -> None:
    dice = random.Random(20260314)
    model, recorded, outcomes = Model(), list[int](), set[str]()
    for _ in range(300):
        batch = [random_value(dice, recorded[-8:]) for _ in range(dice.randrange(1, 25))]
        with store.writing(site_id, create=True) as writing:
            told = readings.write_values(writing, batch)
        assert told == model.write(writing.recorded_at, batch)
        assert not recorded or writing.recorded_at > recorded[-1]
        recorded.append(writing.recorded_at)
        outcomes.update(told)
    assert outcomes == {"stored", "revised", "unchanged", "stale_correction"}

    with store.reading() as connection:
        site = number(connection, site_id)
        assert watermark(connection, site) == recorded[-1]
        series = {one.series_id: (one.vessel, one.quantity, one.source) for one in readings.series_of(connection, site)}
        assert set(series.values()) == set(model.kept)
        for _ in range(150):
            at = T0 + dice.randrange(-1, 31) * HOUR + dice.choice((-1, 0, 1))
            known = dice.choice([*recorded, recorded[0] - 1])
            asked = dice.sample(sorted(series), dice.randrange(1, len(series)))
            check_neighbours(store, model, site, series, asked, at, known, dice.randrange(0, 20) * HOUR)
        for _ in range(30):
            lo = T0 + dice.randrange(0, 30) * HOUR
            check_course(store, model, site, series, lo, lo + dice.randrange(0, 20) * HOUR, dice.choice(recorded))
            check_listing(store, model, site, lo, lo + dice.randrange(0, 20) * HOUR, dice.choice(recorded), dice)


def check_neighbours(
    store: Store, model: Model, site: int, series: dict[int, Key], asked: list[int], at: int, known: int, age: int
) -> None:
    before, after = {}, {}
    for one in asked:
        usable = model.usable(series[one], known)
        earlier = [instant for instant in usable if at - age <= instant <= at]
        later = [instant for instant in usable if at < instant <= at + age]
        if earlier:
            before[one] = as_found(max(earlier), *usable[max(earlier)])
        if later:
            after[one] = as_found(min(later), *usable[min(later)])
    with store.reading() as connection:
        newest = readings.newest(connection, site, [(one, at - age) for one in asked], at, known)
        following = readings.following(connection, site, [(one, at + age) for one in asked], at, known)
    assert {found.series_id: plain(found) for found in newest} == before
    assert {found.series_id: plain(found) for found in following} == after
    assert len(newest) == len(before)


def check_course(store: Store, model: Model, site: int, series: dict[int, Key], lo: int, hi: int, known: int) -> None:
    expected = {
        (one, instant, kept.value, kept.cited, kept.quality, revision)
        for one, key in series.items()
        for instant, (revision, kept) in model.usable(key, known).items()
        if lo <= instant <= hi
    }
    with store.reading() as connection:
        course = readings.course(connection, site, list(series), lo, hi, known)
    rows = list(zip(*course, strict=True))
    assert set(rows) == expected
    assert len(rows) == len(expected)
    for one in series:
        instants = [row[1] for row in rows if row[0] == one]
        assert instants == sorted(instants)


def check_listing(
    store: Store, model: Model, site: int, lo: int, hi: int, known: int, dice: random.Random
) -> None:
    vessel, source = dice.choice(VESSELS), dice.choice((None, *SOURCES))
    expected: dict[tuple[int, str], dict[str, tuple[object, ...]]] = {}
    for key in model.kept:
        if key[0] == vessel and source in (None, key[2]):
            for instant, (revision, kept) in model.known(key, known).items():
                if lo <= instant < hi:
                    expected.setdefault((instant, key[2]), {})[key[1]] = as_found(instant, revision, kept)
    listed: list[Listed] = []
    cursor, limit = None, dice.randrange(1, 9)
    with store.reading() as connection:
        while True:
            page, cursor = readings.listing(
                connection, site, vessel, lo, hi, known, source=source, cursor=cursor, limit=limit
            )
            listed += page
            assert len(page) == limit or cursor is None
            if cursor is None:
                break
    assert [(one.taken_at, one.source) for one in listed] == sorted(expected)
    for one in listed:
        found = {quantity: plain(value) for quantity, value in one.values.items()}
        assert found == expected[one.taken_at, one.source]


def level(value: float | None, taken_at: int = T0, **more: object) -> Value:
    return Value("tk-1", "level_m", "radar", taken_at, value, **more)  # type: ignore[arg-type]


def write(store: Store, site: str, *values: Value) -> tuple[list[str], int]:
    with store.writing(site, create=True) as writing:
        told = readings.write_values(writing, values)
    return list(told), writing.recorded_at


def newest_level(store: Store, site: str, at: int = T0, known: int | None = None) -> float | None:
    with store.reading() as connection:
        found = number(connection, site)
        wanted = [(one.series_id, at - HOUR) for one in readings.series_of(connection, found)]
        rows = readings.newest(connection, found, wanted, at, known or watermark(connection, found))
    return rows[0].value if rows else None


def test_a_late_retry_never_undoes_a_correction(store: Store, site_id: str) -> None:
    _, first = write(store, site_id, level(8.231))
    assert write(store, site_id, level(8.213))[0] == ["revised"]
    assert write(store, site_id, level(8.231))[0] == ["unchanged"]
    assert newest_level(store, site_id) == 8.213
    assert newest_level(store, site_id, known=first) == 8.231


def test_an_earlier_value_is_restored_by_saying_what_it_corrects(store: Store, site_id: str) -> None:
    _, first = write(store, site_id, level(8.231))
    _, second = write(store, site_id, level(8.213))
    assert write(store, site_id, level(8.231, corrects=first))[0] == ["stale_correction"]
    assert write(store, site_id, level(8.231, corrects=second))[0] == ["revised"]
    assert newest_level(store, site_id) == 8.231
    assert write(store, site_id, level(8.231, corrects=second))[0] == ["unchanged"]
    assert write(store, site_id, level(1.0, T0 + 1, corrects=second))[0] == ["stale_correction"]


def test_a_bad_value_withdraws_its_instant_and_only_that(store: Store, site_id: str) -> None:
    write(store, site_id, level(8.1, T0 - 60_000_000), level(8.2))
    _, before = write(store, site_id, level(8.3))
    assert write(store, site_id, level(8.3, quality=2))[0] == ["revised"]
    assert newest_level(store, site_id) == 8.1
    assert newest_level(store, site_id, known=before) == 8.3


def test_a_key_twice_in_one_batch_is_taken_in_order(store: Store, site_id: str) -> None:
    told, _ = write(store, site_id, level(1.0), level(2.0), level(1.0), level(2.0, quality=1))
    assert told == ["stored", "revised", "unchanged", "revised"]
    assert newest_level(store, site_id) == 2.0


def test_equal_means_to_the_last_bit(store: Store, site_id: str) -> None:
    write(store, site_id, level(0.3))
    assert write(store, site_id, level(0.1 + 0.2))[0] == ["revised"]
    assert write(store, site_id, level(math.nextafter(0.3, 1)), level(0.3))[0] == ["unchanged", "unchanged"]


def test_zero_has_one_sign(store: Store, site_id: str) -> None:
    assert write(store, site_id, level(-0.0), level(0.0))[0] == ["stored", "unchanged"]
    found = newest_level(store, site_id)
    assert found == 0.0
    assert math.copysign(1.0, found) == 1.0


@pytest.mark.parametrize("value", [math.nan, math.inf, -math.inf, None])
def test_what_is_no_value_is_refused_and_nothing_of_its_batch_is_kept(
    store: Store, site_id: str, value: float | None
) -> None:
    write(store, site_id, level(1.0))
    with pytest.raises(ValueError, match="index 1"):
        write(store, site_id, level(2.0), level(value))
    assert newest_level(store, site_id) == 1.0


def test_bits_survive(store: Store, site_id: str) -> None:
    dice = random.Random(7)
    values = [dice.uniform(-1, 1) * 10.0 ** dice.randrange(-300, 300) for _ in range(400)]
    write(store, site_id, *(level(value, T0 + index) for index, value in enumerate(values)))
    with store.reading() as connection:
        site = number(connection, site_id)
        (series,) = readings.series_of(connection, site)
        course = readings.course(connection, site, [series.series_id], T0, T0 + 400, watermark(connection, site))
    assert [value.hex() for value in course.value if value is not None] == [value.hex() for value in values]


def test_instants_without_end_are_no_trouble(store: Store, site_id: str) -> None:
    """A value that holds until it is replaced is asked for since for ever."""
    density = Value("tk-1", "observed_density_kg_m3", "lab", T0 - 10**15, 742.1, "S1")
    write(store, site_id, density)
    with store.reading() as connection:
        site = number(connection, site_id)
        (series,) = readings.series_of(connection, site, ["tk-1"])
        found = readings.newest(connection, site, [(series.series_id, -(2**62))], T0, 2**62)
        later = readings.following(connection, site, [(series.series_id, 2**62)], T0 - 2 * 10**15, 2**62)
        assert [(one.value, one.cited) for one in found] == [(742.1, "S1")]
        assert later == found
        assert readings.newest(connection, site, [], T0, 2**62) == []
        assert readings.course(connection, site, [], 0, T0, 2**62).value == []
        assert readings.series_of(connection, site, []) == []
        assert readings.listing(connection, site, "nobody", 0, T0, 2**62) == ([], None)


@pytest.mark.parametrize("text", ["\ud800", "a\x00b", "\udfff\ud800 S1"])
def test_text_that_no_database_should_see_is_kept_as_it_is_or_not_at_all(
    store: Store, site_id: str, text: str
) -> None:
    """The door refuses it; should it come through, nothing else may come of it."""
    write(store, site_id, level(1.0))
    odd = Value("tk-1", "sample", "lab", T0, None, text)
    try:
        write(store, site_id, level(2.0, T0 + 1), odd)
    except (UnicodeEncodeError, sa.exc.DBAPIError):
        assert newest_level(store, site_id, T0 + 1) == 1.0
        return
    with store.reading() as connection:
        site = number(connection, site_id)
        page, _ = readings.listing(connection, site, "tk-1", T0, T0 + 1, 2**62, source="lab")
    assert page[0].values["sample"].cited == text


def test_two_sites_do_not_meet(store: Store, site_id: str) -> None:
    other = f"{site_id}-b"
    assert write(store, site_id, level(1.0))[0] == ["stored"]
    assert write(store, other, level(2.0))[0] == ["stored"]
    assert (newest_level(store, site_id), newest_level(store, other)) == (1.0, 2.0)


def test_every_value_belongs_to_a_series_and_a_recording(store: Store, site_id: str) -> None:
    """Stands in for the foreign keys that readings do without."""
    write(store, site_id, level(1.0), Value("tk-2", "sample", "lab", T0, None, "S1"))
    orphans = """SELECT count(*) FROM {table} r
        LEFT JOIN series s ON s.site_id = r.site_id AND s.series_id = r.series_id
        LEFT JOIN recording w ON w.site_id = r.site_id AND w.recorded_at = r.recorded_at
        LEFT JOIN cited c ON c.site_id = r.site_id AND c.cited_id = r.cited_id
        WHERE s.series_id IS NULL OR w.recorded_at IS NULL OR (r.cited_id IS NOT NULL AND c.cited_id IS NULL)"""
    with store.reading() as connection:
        for table in ("reading", "analysis"):
            assert connection.scalar(sa.text(orphans.format(table=table))) == 0
        misplaced = sa.select(sa.func.count()).select_from(READING).where(READING.c.series_id <= 0)
        assert connection.scalar(misplaced) == 0
        assert connection.scalar(sa.select(sa.func.count()).select_from(SERIES).where(SERIES.c.series_id == 0)) == 0


def test_what_was_recorded_in_between_is_found_by_its_key(store: Store, site_id: str) -> None:
    """A key that came and was revised is found once, at its last revision, as new; one of before is not new."""
    level = ("tk-1", "level_m", "radar")
    density = ("tk-1", "observed_density_kg_m3", "lab")

    def write(*values: Value) -> int:
        with store.writing(site_id, create=True) as writing:
            readings.write_values(writing, values)
            return writing.recorded_at

    first = write(Value(*level, T0, 1.0), Value(*density, T0, 800.0))
    second = write(Value(*level, T0, 2.0), Value(*level, T0 + HOUR, 3.0))
    third = write(Value(*level, T0 + HOUR, 4.0), Value(*density, T0, 801.0))
    with store.reading() as connection:
        here = number(connection, site_id)
        series = {(one.quantity): one.series_id for one in readings.series_of(connection, here)}
        keys = [(series["level_m"], T0), (series["level_m"], T0 + HOUR), (series["observed_density_kg_m3"], T0)]

        def between(since: int, known: int) -> set[tuple[int, int, float | None, int, int, bool]]:
            found = readings.recorded(connection, here, keys, since, known)
            return {(one.series_id, one.taken_at, one.value, one.revision, one.recorded_at, new) for one, new in found}

        level_id, density_id = keys[0][0], keys[2][0]
        assert between(first, third) == {
            (level_id, T0, 2.0, 2, second, False), (level_id, T0 + HOUR, 4.0, 2, third, True),
            (density_id, T0, 801.0, 2, third, False),
        }  # fmt: skip
        assert between(first, second) == {
            (level_id, T0, 2.0, 2, second, False),
            (level_id, T0 + HOUR, 3.0, 1, second, True),
        }
        assert between(third, third + 1) == set() == between(0, first - 1)
