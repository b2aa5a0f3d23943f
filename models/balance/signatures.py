"""Explanations as columns: what one unit of each would add to a group's balances."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from scipy.sparse import csc_array

from models.arrays import BoolArray, FloatArray, IntArray
from models.balance.rows import BEYOND

KINDS = (
    "vessel_loss", "slow_loss", "level_bias", "temperature_bias", "density_bias", "bad_stock_take", "meter_bias",
    "unrecorded_transfer", "wrong_transfer", "late_transfer", "duplicated_transfer", "misrouted_transfer",
)  # fmt: skip
LOSS, SLOW, LEVEL, TEMPERATURE, DENSITY, STOCK_TAKE, METER, UNRECORDED, WRONG, LATE, DUPLICATED, MISROUTED = range(12)
UNITS = ("kg", "kg/day", "mm", "°C", "kg/m³", "kg", "%", "kg", "kg", "kg", "kg", "kg")
OUTSIDE = ""  # the subject's end that is beyond the books

@dataclass(frozen=True, eq=False)
class Candidates:
    """Explanations of a group's balances, one for each column.

    Parameters
    ----------
    columns : csc_array, shape (rows, k)
        What one unit of the fault adds to each row. [kg per unit]
    kind, subject, onset : IntArray, shape (k,)
        Place in ``KINDS`` and in ``subjects``, and the close or night with which it began. [1]
    fixed : BoolArray, shape (k,)
        Whether its size can only be one. [1]
    scale : FloatArray, shape (k,)
        A plausible size, one standard deviation. [unit]
    unit : FloatArray, shape (k,)
        Magnitude for a size of one. [unit]
    moved : FloatArray, shape (k,)
        What a size of one has moved in the books by the end of the window. [kg]
    prior : FloatArray, shape (k,)
        How many times as likely as others of its kind. [1]
    subjects : sequence of tuple of str
        Names: a vessel, an error, a meter, a movement; for an unrecorded transfer its two ends, for a misrouted
        one the movement, the vessel named and the true one, for a late one the movement and whither. [1]
    """

    columns: csc_array
    kind: IntArray
    subject: IntArray
    onset: IntArray
    fixed: BoolArray
    scale: FloatArray
    unit: FloatArray
    moved: FloatArray
    prior: FloatArray
    subjects: Sequence[tuple[str, ...]]

    def __len__(self) -> int:
        return len(self.kind)


class Columns:
    """Columns as they are found, kept as triplets."""

    def __init__(self) -> None:
        self.triplets: list[tuple[IntArray, IntArray, FloatArray]] = []
        self.fields: list[tuple[FloatArray, ...]] = []
        self.places: dict[tuple[str, ...], int] = {}
        self.count = 0

    def subject(self, *names: str) -> int:
        """Place of a subject.

        Parameters
        ----------
        *names : str
            Its names. [1]

        Returns
        -------
        int
            The same for the same names. [1]
        """
        return self.places.setdefault(names, len(self.places))

    def add(
        self, kind: int, subject: IntArray | int, onset: IntArray, entries: Sequence[tuple[IntArray, FloatArray]],
        *, fixed: bool = False, scale: FloatArray | float = 1.0, unit: FloatArray | float = 1.0,
        moved: FloatArray | float = 1.0, prior: FloatArray | float = 1.0,
    ) -> None:  # fmt: skip
        """Columns of one kind, one for each onset.

        Parameters
        ----------
        kind : int
            Place in ``KINDS``. [1]
        subject : IntArray or int, shape () or (k,)
            Place of the subject. [1]
        onset : IntArray, shape (k,)
            When it began. [1]
        entries : sequence of (IntArray, FloatArray), shapes (k,) or (k, m)
            Rows and what is added to each; −1 is beyond the books. [1, kg per unit]
        fixed, scale, unit, moved, prior : bool or array_like, shape () or (k,)
            As in ``Candidates``. [1, unit, unit, kg, 1]
        """
        count = len(onset)
        for row, value in entries:
            row = np.asarray(row).reshape(count, -1)
            value = np.broadcast_to(np.asarray(value, dtype=np.float64).reshape(count, -1), row.shape)
            column = np.broadcast_to(np.arange(self.count, self.count + count)[:, None], row.shape)
            keep = (row != BEYOND) & (value != 0.0)
            self.triplets.append((row[keep], column[keep], value[keep]))
        own = (kind, subject, onset, fixed, scale, unit, moved, prior)
        self.fields.append(tuple(np.broadcast_to(np.asarray(one, dtype=np.float64), (count,)) for one in own))
        self.count += count

    def gather(self, rows: int) -> Candidates:
        """All columns, without those that leave no trace.

        Parameters
        ----------
        rows : int
            Number of balances. [1]

        Returns
        -------
        Candidates
            What was added. [kg per unit]
        """
        row, column, value = (np.concatenate(one) for one in zip(*self.triplets, strict=True))
        columns = csc_array((value, (row, column)), shape=(rows, self.count))
        columns.sum_duplicates()
        columns.eliminate_zeros()
        seen = np.flatnonzero(np.diff(columns.indptr))  # what leaves no trace is no explanation
        kind, subject, onset, fixed, scale, unit, moved, prior = (
            np.concatenate(one)[seen] for one in zip(*self.fields, strict=True)
        )
        return Candidates(
            columns[:, seen], kind.astype(np.intp), subject.astype(np.intp), onset.astype(np.intp), fixed > 0.0,
            scale, unit, moved, prior, tuple(self.places),
        )  # fmt: skip
