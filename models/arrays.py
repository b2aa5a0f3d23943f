"""Array types and the one way in which columns are cut into blocks."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]
IntArray = NDArray[np.intp]

__all__ = ["ArrayLike", "BoolArray", "FloatArray", "IntArray", "as_floats", "blocks", "first_index"]

BLOCK_ROWS = 16_384  # rows; a block's columns fit the second-level cache


def as_floats(*values: ArrayLike) -> tuple[FloatArray, ...]:
    """Values as float arrays that broadcast against each other, without a copy where none is needed.

    Parameters
    ----------
    *values : array_like, shape (...)
        Numbers in any unit. [any]

    Returns
    -------
    tuple of FloatArray, shape (...)
        The same numbers, each in its own shape. [any]
    """
    return tuple(np.asarray(value, dtype=np.float64) for value in values)


def blocks(rows: int, size: int = BLOCK_ROWS) -> Iterator[slice]:
    """Slices that cover ``rows`` rows in order, at most ``size`` each.

    Parameters
    ----------
    rows : int
        Number of rows. [1]
    size : int
        Rows in a block. [1]

    Yields
    ------
    slice
        The next block. [1]
    """
    for start in range(0, rows, size):
        yield slice(start, min(start + size, rows))


def first_index(mask: BoolArray) -> int | None:
    """Flat index of the first true element; None where there is none.

    Parameters
    ----------
    mask : BoolArray, shape (...)
        True where something is wrong. [1]

    Returns
    -------
    int or None
        Position in row-major order. [1]
    """
    flat = np.asarray(mask).reshape(-1)
    if not flat.any():
        return None
    return int(np.argmax(flat))
