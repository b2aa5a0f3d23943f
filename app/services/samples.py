"""Samples of the laboratory: each stands from when it says, whenever it was drawn or reported."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from sqlalchemy import Connection

from app.services.choose import NEVER
from app.store import readings
from app.store.readings import Found

HOLDS = "sample_holds_from"
LATEST_US = 35 * 86_400_000_000  # µs; a sample is drawn at most so long before or after it begins to stand
STEPS_BACK = 20  # samples that stand only from later on, one after the other

Key = tuple[str, str, str]  # owner, source, main quantity
Kind = tuple[str, str, str, dict[str, int]]  # and the series of all that such a sample may hold


@dataclass(frozen=True)
class Sample:
    """One sample: from when it stands for the content, when it was drawn, and what was found."""

    begins: int
    taken_at: int
    values: Mapping[str, Found]


def samples_at(
    connection: Connection, site_id: int, kinds: Sequence[Kind], at: Mapping[str, int], known: int
) -> dict[Key, list[Sample]]:
    """Of each kind the sample that stands at its owner's instant, with others that were looked at."""
    wanted = {(owner, source, main): at[owner] for owner, source, main, _ in kinds}
    series = {(owner, source, main): own for owner, source, main, own in kinds}
    drawn: dict[Key, set[int]] = {key: set() for key in series}
    _dated_otherwise(connection, site_id, series, wanted, drawn, known)
    result: dict[Key, list[Sample]] = {key: [] for key in series}
    asked = {key: (int(NEVER), instant) for key, instant in wanted.items()}
    for _ in range(STEPS_BACK):
        before = readings.newest_each(
            connection, site_id, [(series[key][key[2]], *within) for key, within in asked.items()], known
        )
        found = {one.series_id: one.taken_at for one in before}
        asked = {key: within for key, within in asked.items() if series[key][key[2]] in found}
        for key in asked:
            drawn[key].add(found[series[key][key[2]]])
        result = _read(connection, site_id, series, drawn, known)
        # A sample that stands only from later on makes room for its elder, one that stands from long before it was
        # drawn for every other that was drawn in between.
        asked = {key: (_stands(result[key], wanted[key]) + 1, found[series[key][key[2]]] - 1) for key in asked}
        asked = {key: (first, last) for key, (first, last) in asked.items() if first <= last}
        if not asked:
            break
    return result


def _stands(samples: Sequence[Sample], at: int) -> int:
    """When the newest sample that begins at or before an instant began."""
    return max((one.begins for one in samples if one.begins <= at), default=int(NEVER))


def _dated_otherwise(
    connection: Connection, site_id: int, series: Mapping[Key, Mapping[str, int]], at: Mapping[Key, int],
    drawn: dict[Key, set[int]], known: int,
) -> None:  # fmt: skip
    """Samples that stand at the instant and were drawn after it, or before they began to stand."""
    keys: dict[int, list[Key]] = {}
    for key, own in series.items():
        if HOLDS in own:
            keys.setdefault(own[HOLDS], []).append(key)
    if not keys:
        return
    first, last = min(at.values()) - LATEST_US, max(at.values()) + LATEST_US
    course = readings.course(connection, site_id, sorted(keys), first, last, known)
    for number, taken_at, begins in zip(course.series_id, course.taken_at, course.value, strict=True):
        for key in keys[number]:
            if begins is not None and begins <= at[key] and (taken_at > at[key] or taken_at < begins):
                drawn[key].add(taken_at)


def _read(
    connection: Connection, site_id: int, series: Mapping[Key, Mapping[str, int]], drawn: Mapping[Key, set[int]],
    known: int,
) -> dict[Key, list[Sample]]:  # fmt: skip
    """Everything that was found of samples drawn at given instants."""
    wanted = sorted(
        {
            (number, taken, taken)
            for key, instants in drawn.items()
            for taken in instants
            for number in series[key].values()
        }
    )
    found = {(one.series_id, one.taken_at): one for one in readings.newest_each(connection, site_id, wanted, known)}
    result: dict[Key, list[Sample]] = {}
    for key, instants in drawn.items():
        own = series[key]
        values = {
            taken: {name: found[(number, taken)] for name, number in own.items() if (number, taken) in found}
            for taken in instants
        }
        result[key] = _ordered(key[2], values)
    return result


def samples_of(
    connection: Connection, site_id: int, kinds: Sequence[Kind], latest: int, known: int
) -> dict[Key, list[Sample]]:
    """Every sample of each kind that may stand up to an instant."""
    numbers = sorted({number for *_, own in kinds for number in own.values()})
    if not numbers:
        return {}
    course = readings.course(connection, site_id, numbers, int(NEVER), latest + LATEST_US, known)
    by_series: dict[int, dict[int, Found]] = {}
    for number, taken, value, text, quality, revision in zip(*course, strict=True):
        by_series.setdefault(number, {})[taken] = Found(number, taken, value, text, quality, revision, 0)
    result: dict[Key, list[Sample]] = {}
    for owner, source, main, own in kinds:
        values: dict[int, dict[str, Found]] = {}
        for name, number in own.items():
            for taken, one in by_series.get(number, {}).items():
                values.setdefault(taken, {})[name] = one
        result[(owner, source, main)] = _ordered(main, values)
    return result


def _ordered(main: str, values: Mapping[int, Mapping[str, Found]]) -> list[Sample]:
    """Samples that hold the main quantity, by when they begin to stand; of equal ones the one drawn last."""
    samples = []
    for taken, found in values.items():
        if main in found:
            begins = found[HOLDS].value if HOLDS in found else None
            samples.append(Sample(taken if begins is None else int(begins), taken, found))
    return sorted(samples, key=lambda one: (one.begins, one.taken_at))
