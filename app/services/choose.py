"""Which value counts: for each quantity the first usable source, aged, and interpolated where it may be."""

from __future__ import annotations

from dataclasses import dataclass

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

    before_at: IntColumns
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
        return cls(
            np.full(shape, NEVER), np.full(shape, np.nan), np.zeros(shape, np.int64),
            np.full(shape, NEVER), np.full(shape, np.nan), np.zeros(shape, np.int64),
            np.zeros(shape, np.int64), np.zeros(shape, np.int64),
        )  # fmt: skip


@dataclass(frozen=True)
class Chosen:
    """The value that counts in each row, and where it comes from.

    ``source`` is the column of the candidates, −1 where nothing is usable; ``share`` is the weight of the
    value after the instant, 0 where nothing is interpolated.
    """

    source: IntColumns
    value: FloatColumns
    taken_at: IntColumns
    after_at: IntColumns
    share: FloatColumns
    age_us: IntColumns
    quality: IntColumns
    contenders: IntColumns

    @property
    def usable(self) -> NDArray[np.bool_]:
        """True where a value counts."""
        return self.source >= 0


def choose(candidates: Candidates, at: IntColumns, *, interpolates: bool) -> Chosen:
    """The value of the first usable source at each instant; of equal rank the newest.

    A value is usable from its instant on until its greatest age; between two values of one source that
    are no further apart than that age, level, pressure and temperatures are interpolated linearly.
    """
    c, when = candidates, at[:, None]
    age = when - c.before_at
    usable = (c.before_at > NEVER) & (age <= c.max_age) & (age >= 0)
    newest_first = np.where(usable, c.before_at, NEVER)
    best_rank = np.where(usable, c.rank, np.iinfo(np.int64).max).min(axis=1)
    eligible = usable & (c.rank == best_rank[:, None])
    column = np.where(eligible, newest_first, NEVER).argmax(axis=1)
    rows = np.arange(len(at))
    found = usable.any(axis=1)
    before_at, after_at = c.before_at[rows, column], c.after_at[rows, column]
    value, later = c.before[rows, column], c.after[rows, column]
    gap = after_at - before_at
    between = found & interpolates & (after_at > at) & (before_at < at) & (gap <= c.max_age[rows, column])
    share = np.where(between, (at - before_at) / np.where(between, gap, 1), 0.0)
    quality = np.maximum(c.before_quality[rows, column], np.where(between, c.after_quality[rows, column], 0))
    return Chosen(
        source=np.where(found, column, -1),
        value=np.where(found, np.where(between, (1.0 - share) * value + share * later, value), np.nan),
        taken_at=np.where(found, before_at, NEVER),
        after_at=np.where(between, after_at, NEVER),
        share=share,
        age_us=np.where(found, np.where(between, 0, at - before_at), 0),
        quality=np.where(found, quality, 0),
        contenders=eligible.sum(axis=1),
    )
