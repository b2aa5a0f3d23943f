"""Columns are gathered as they were added, and what leaves no trace is left out."""

from __future__ import annotations

import numpy as np

from models.balance.rows import BEYOND
from models.balance.signatures import KINDS, LEVEL, LOSS, METER, MISROUTED, UNITS, Columns


def test_entries_of_one_row_add_and_those_beyond_the_books_are_dropped() -> None:
    columns = Columns()
    first = columns.subject("a")
    assert columns.subject("b") == first + 1
    assert columns.subject("a") == first
    row = np.array([[0, 1], [2, BEYOND], [1, 1]])
    value = np.array([[1.0, 2.0], [3.0, 4.0], [5.0, -5.0]])
    columns.add(LEVEL, first, np.array([1, 2, 3]), [(row, value)], scale=7.0)
    columns.add(LOSS, np.array([1]), np.array([4]), [(np.array([0]), np.array([2.0]))], fixed=True, unit=9.0, prior=3.0)
    found = columns.gather(3)
    assert found.columns.toarray().T.tolist() == [[1.0, 2.0, 0.0], [0.0, 0.0, 3.0], [2.0, 0.0, 0.0]]
    assert len(found) == 3  # the third cancels and is no explanation
    assert found.kind.tolist() == [LEVEL, LEVEL, LOSS]
    assert found.subject.tolist() == [0, 0, 1]
    assert found.onset.tolist() == [1, 2, 4]
    assert found.fixed.tolist() == [False, False, True]
    assert found.scale.tolist() == [7.0, 7.0, 1.0]
    assert found.unit.tolist() == [1.0, 1.0, 9.0]
    assert found.prior.tolist() == [1.0, 1.0, 3.0]
    assert found.moved.tolist() == [1.0, 1.0, 1.0]
    assert found.subjects == (("a",), ("b",))


def test_kinds_have_names_and_units() -> None:
    assert len(KINDS) == len(UNITS) == len(set(KINDS)) == MISROUTED + 1
    assert (KINDS[LOSS], UNITS[LOSS]) == ("vessel_loss", "kg")
    assert (KINDS[METER], UNITS[METER]) == ("meter_bias", "%")
    assert (KINDS[MISROUTED], UNITS[LEVEL]) == ("misrouted_transfer", "mm")
