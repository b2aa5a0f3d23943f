"""Columns, blocks and the first wrong index."""

import numpy as np
import pytest

from models.arrays import BLOCK_ROWS, as_floats, blocks, first_index


def test_numbers_become_floats_in_their_own_shapes():
    one, two, three = as_floats(1, [2, 3], np.array([[4]], dtype=np.int32))
    assert (one.shape, two.shape, three.shape) == ((), (2,), (1, 1))
    assert all(value.dtype == np.float64 for value in (one, two, three))


def test_a_column_of_floats_is_not_copied():
    column = np.array([1.0, 2.0])
    assert as_floats(column)[0] is column


@pytest.mark.parametrize("rows", [0, 1, 5, 6, 7, 12])
def test_blocks_cover_every_row_once_and_in_order(rows):
    covered = [row for block in blocks(rows, 6) for row in range(rows)[block]]
    assert covered == list(range(rows))
    assert all(block.stop - block.start <= 6 for block in blocks(rows, 6))


def test_a_block_is_sixteen_thousand_rows_unless_said():
    assert BLOCK_ROWS == 16_384
    assert [block.stop for block in blocks(20_000)] == [16_384, 20_000]


def test_the_first_wrong_element_is_found_in_reading_order():
    assert first_index(np.array([[False, False], [True, True]])) == 2
    assert first_index(np.array(True)) == 0
    assert first_index(np.zeros(3, dtype=bool)) is None
    assert first_index(np.zeros(0, dtype=bool)) is None
