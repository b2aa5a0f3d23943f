"""Lower sources check the one that counts: what they differ by at their own instant, and how well that is known."""

from __future__ import annotations

import math
from bisect import bisect_right
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from sqlalchemy import Connection

from app.services.choose import ALWAYS
from app.services.collect import Collected, Slot
from app.services.compile import CompiledVessel
from app.services.measure import Measured
from app.services.warmed import correction, temperatures
from app.store import readings
from app.store.readings import Found

if TYPE_CHECKING:
    from app.services.carry import Moves

ROUNDS = 4  # checks of one series that are asked one after the other; of more it is read as a course
COVERAGE = 2.0  # standard uncertainties of a difference before the sources are said to disagree


@dataclass(frozen=True)
class _Asked:
    """One value of a lower source, and the series that counts."""

    row: int
    lower: Slot
    winner: Slot
    taken_at: int
    value: float

    @property
    def key(self) -> tuple[int, int, int]:
        """The value, and what it is held against."""
        return self.lower.series, self.winner.series, self.taken_at


@dataclass(frozen=True)
class _Answered:
    """The source that counts at the instant of a check, how much of one reading's scatter it has, and when it was
    read: at that instant or around it, or before it."""

    value: float
    scatter: float
    read_at: int


def check(
    connection: Connection, site_id: int, collected: Collected, measured: Measured, moves: Moves, known: int
) -> None:
    """Every usable value of a lower source into its row's checks, with a warning where the two disagree.

    ``collected`` are the candidates at the instant that was asked for: a check that came after the reading
    that counts is one all the same.
    """
    found: dict[int, list[dict[str, Any]]] = {}
    rows = list(_asked(collected, measured))
    # In a course one check stands for many instants: it is answered once.
    once = list({one.key: one for one in rows}.values())
    answers = {one.key: found for one, found in _answered(connection, site_id, once, collected, known)}
    for asked in rows:
        vessel = collected.vessel(asked.row)
        answered = answers.get(asked.key)
        if answered is None or _between_them(moves, vessel.name, answered.read_at, asked.taken_at):
            continue
        scatter = answered.scatter
        random, systematic = _errors(vessel, asked.winner, asked.taken_at)
        spread = math.hypot(*_errors(vessel, asked.lower, asked.taken_at), scatter * random, systematic)
        value, counts = asked.value, answered.value
        if measured.warmed is not None and asked.winner.spec.name == "level":
            value += _warmth(measured, asked, asked.lower, value)
            counts += _warmth(measured, asked, asked.winner, counts)
        difference = value - counts
        quantity = asked.winner.spec.quantities[0]
        found.setdefault(asked.row, []).append(
            {"quantity": quantity, "source": asked.lower.source, "at": asked.taken_at, "value": value,
             "difference": difference, "standard_uncertainty": spread}
        )  # fmt: skip
        carried = measured.carried.get(asked.row)
        if carried is not None and abs(difference) > COVERAGE * spread:
            carried.warn(
                "sources_disagree",
                f"{quantity} from source '{asked.lower.source}' differs by {difference:.4g} from the one that counts, "
                f"more than {COVERAGE:g} times its standard uncertainty of {spread:.2g}",
            )
    measured.checks = found


def _warmth(measured: Measured, asked: _Asked, slot: Slot, level: float) -> float:
    """What temperature adds to a level from one of the two sources. [m]"""
    vessel, at = measured.vessel(asked.row), temperatures(measured.state, asked.row)
    return sum(correction(vessel, slot.quantity, slot.source, level, at, asked.taken_at))


def _asked(collected: Collected, measured: Measured) -> Iterator[_Asked]:
    """Usable values of sources that come after the one that counts in the vessel's order."""
    by_input: dict[tuple[str, int], list[Slot]] = {}
    for slot in collected.slots:
        if slot.spec.interpolates and not slot.spec.of_site and not slot.companion:
            by_input.setdefault((slot.spec.name, slot.rows[0]), []).append(slot)
    for (name, owner), slots in by_input.items():
        if len(slots) < 2 or not collected.vessels[owner].body.sources:
            continue
        for row in [owner] if len(collected.vessels) > 1 else range(collected.rows):
            yield from _lower(collected, measured, name, slots, row)


def _lower(collected: Collected, measured: Measured, name: str, slots: Sequence[Slot], row: int) -> Iterator[_Asked]:
    """Usable values of one row's lower sources for one input."""
    chosen = measured.chosen[name]
    winner = next((slot for slot in slots if slot.column == chosen.source[row]), None)
    if winner is None:
        return
    columns, at = collected.candidates[name], int(collected.at[row])
    for slot in slots:
        taken = int(columns.before_at[row, slot.column])
        if slot.rank > winner.rank and taken > -ALWAYS and at - taken <= slot.max_age:
            yield _Asked(row, slot, winner, taken, float(columns.before[row, slot.column]))


def _answered(
    connection: Connection, site_id: int, asked: Sequence[_Asked], collected: Collected, known: int
) -> Iterator[tuple[_Asked, _Answered]]:
    """The source that counts at the instant of each check; a series is asked once a round, and one of many checks
    is read once."""
    groups: dict[int, list[_Asked]] = {}
    for one in asked:
        groups.setdefault(one.winner.series, []).append(one)
    for group in groups.values():
        if len(group) > ROUNDS:
            yield from _along(connection, site_id, group, collected, known)
    rest = [one for group in groups.values() if len(group) <= ROUNDS for one in group]
    while rest:
        first: dict[int, _Asked] = {}
        later: list[_Asked] = []
        for one in rest:
            if one.winner.series in first:
                later.append(one)
            else:
                first[one.winner.series] = one
        rest = later
        before = [
            (series, max(one.taken_at - one.winner.max_age, _since(collected, one)), one.taken_at)
            for series, one in first.items()
        ]
        after = [(series, one.taken_at + 1, one.taken_at + one.winner.max_age) for series, one in first.items()]
        earlier = {found.series_id: found for found in readings.newest_each(connection, site_id, before, known)}
        following = {found.series_id: found for found in readings.following_each(connection, site_id, after, known)}
        for series, one in first.items():
            answered = _between(one, earlier.get(series), following.get(series))
            if answered is not None:
                yield one, answered


def _along(
    connection: Connection, site_id: int, group: Sequence[_Asked], collected: Collected, known: int
) -> Iterator[tuple[_Asked, _Answered]]:
    """Many checks of one series, which is read once and searched for its neighbours of each."""
    age, series = group[0].winner.max_age, group[0].winner.series
    first, last = min(one.taken_at for one in group) - age, max(one.taken_at for one in group) + age
    course = readings.course(connection, site_id, [series], first, last, known)
    kept = [
        Found(number, at, value, text, quality, revision, 0)
        for number, at, value, text, quality, revision in zip(*course, strict=True)
    ]
    times = course.taken_at
    for one in group:
        place = bisect_right(times, one.taken_at)
        oldest = max(one.taken_at - age, _since(collected, one))
        before = kept[place - 1] if place and times[place - 1] >= oldest else None
        after = kept[place] if place < len(kept) and times[place] <= one.taken_at + age else None
        answered = _between(one, before, after)
        if answered is not None:
            yield one, answered


def _since(collected: Collected, one: _Asked) -> int:
    return min(collected.vessel(one.row).since, one.taken_at)


def _between(one: _Asked, before: Found | None, after: Found | None) -> _Answered | None:
    """The winner at the instant of the check: between two of its values, which halves their scatter, or the one
    before."""
    if before is None or before.value is None:
        return None
    start = one.winner.convert(before.value, before.taken_at)
    found = _Answered(start, 1.0, before.taken_at)
    if after is not None and after.value is not None and before.taken_at < one.taken_at:
        gap = after.taken_at - before.taken_at
        if gap <= one.winner.max_age:
            share = (one.taken_at - before.taken_at) / gap
            value = (1.0 - share) * start + share * one.winner.convert(after.value, after.taken_at)
            found = _Answered(value, math.hypot(1.0 - share, share), one.taken_at)
    return found if math.isfinite(found.value) else None


def _between_them(moves: Moves, vessel: str, first: int, last: int) -> bool:
    """Whether a ticket ran between two readings: they are of two contents, and neither checks the other."""
    own = moves.of(vessel) if first < last else ()
    return any(ticket.started_at < last and ticket.ended_at > first for ticket, _ in own)


def _errors(vessel: CompiledVessel, slot: Slot, at: int) -> tuple[float, float]:
    own = vessel.instrument(slot.quantity, slot.source, at if vessel.history else None)
    if not own.declared and slot.quantity != slot.spec.quantities[0]:
        own = vessel.instrument(slot.spec.quantities[0], slot.source, at if vessel.history else None)
    return own.random, own.systematic
