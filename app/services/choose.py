"""Which value counts: for each quantity the first usable source, aged, and interpolated where it may be."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

IntColumns = NDArray[np.int64]
FloatColumns = NDArray[np.float64]

NEVER = np.int64(-(2**62))  # µs; an instant before every other: nothing was read
ALWAYS = np.int64(2**61)  # µs; an age that nothing reaches: a value holds until it is replaced


@dataclass
class Candidates:
    """What could count for one quantity: n instants (or vessels) by k sources.

    Instants and ages are in microseconds, values in the quantity's unit; ``NEVER`` and NaN where a
    source has nothing. ``rank`` is the place in the vessel's order of sources, equal where there is none.
    """

    before_at: IntColumns  # from when it counts; a sample's may differ from when it was drawn
    before_taken: IntColumns
    before: FloatColumns
    before_quality: IntColumns
    after_at: IntColumns
    after: FloatColumns
    after_quality: IntColumns
    rank: IntColumns
    max_age: IntColumns

    @classmethod
    def empty(cls, rows: int, sources: int) -> Candidates:
        """Columns in which nothing was read yet."""
        shape = (rows, max(sources, 1))

        def never() -> IntColumns:
            return np.full(shape, NEVER)

        def nothing() -> FloatColumns:
            return np.full(shape, np.nan)

        def zero() -> IntColumns:
            return np.zeros(shape, np.int64)

        return cls(never(), never(), nothing(), zero(), never(), nothing(), zero(), zero(), zero())


@dataclass(frozen=True)
class Chosen:
    """The value that counts in each row, and where it comes from.

    ``source`` is the column of the candidates, −1 where nothing is usable; ``share`` is the weight of the
    value after the instant, 0 where nothing is interpolated.
    """

    source: IntColumns
    value: FloatColumns
    taken_at: IntColumns
    begins: IntColumns
    after_at: IntColumns
    share: FloatColumns
    age_us: IntColumns
    quality: IntColumns
    contenders: IntColumns

    @cached_property
    def usable(self) -> NDArray[np.bool_]:
        """True where a value counts."""
        return self.source >= 0


def choose(candidates: Candidates, at: IntColumns, *, interpolates: bool, ahead: IntColumns | None = None) -> Chosen:
    """The value of the first usable source at each instant; of equal rank the newest.

    A value is usable from its instant on until its greatest age; between two values of one source that
    are no further apart than that age, level, pressure and temperatures are interpolated linearly. Where
    ``ahead`` allows it (a close), a source that has nothing before the instant is usable by its first value
    after it, within its age and at most so far ahead.
    """
    c, when = candidates, at[:, None]
    age = when - c.before_at
    before = (c.before_at > NEVER) & (age <= c.max_age) & (age >= 0)
    after = np.zeros_like(before)
    if ahead is not None and interpolates:
        lead = c.after_at - when
        after = ~before & (lead > 0) & (lead <= np.minimum(c.max_age, ahead[:, None]))
    usable = before | after
    newest_first = np.where(before, c.before_at, np.where(after, c.after_at, NEVER))
    best_rank = np.where(usable, c.rank, np.iinfo(np.int64).max).min(axis=1)
    eligible = usable & (c.rank == best_rank[:, None])
    # A value before the instant goes before one after it.
    column = np.where(eligible, np.where(before, newest_first, NEVER // 2 - newest_first), NEVER).argmax(axis=1)
    rows = np.arange(len(at))
    found = usable.any(axis=1)
    before_at, after_at = c.before_at[rows, column], c.after_at[rows, column]
    value, later = c.before[rows, column], c.after[rows, column]
    gap = after_at - before_at
    later_only = after[rows, column] & found
    between = found & interpolates & ~later_only & (after_at > at) & (before_at < at) & (before_at > NEVER)
    between &= gap <= c.max_age[rows, column]
    share = np.where(between, (at - before_at) / np.where(between, gap, 1), 0.0)
    quality = np.maximum(
        np.where(later_only, 0, c.before_quality[rows, column]),
        np.where(between | later_only, c.after_quality[rows, column], 0),
    )
    alone = np.where(later_only, later, value)
    return Chosen(
        source=np.where(found, column, -1),
        value=np.where(found, np.where(between, (1.0 - share) * value + share * later, alone), np.nan),
        taken_at=np.where(found, np.where(later_only, after_at, c.before_taken[rows, column]), NEVER),
        begins=np.where(found, np.where(later_only, after_at, before_at), NEVER),
        after_at=np.where(between, after_at, NEVER),
        share=share,
        age_us=np.where(
            found, np.where(between, 0, at - np.where(later_only, after_at, c.before_taken[rows, column])), 0
        ),
        quality=np.where(found, quality, 0),
        contenders=eligible.sum(axis=1),
    )
