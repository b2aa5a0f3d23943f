"""Rows of any kind of batch are judged one by one, and a body that is no batch is refused whole."""

from __future__ import annotations

import pytest
from pydantic import ValidationError

from app.schemas.batch import rows_in, validate_each
from app.schemas.types import Body


class Row(Body):
    """A row for these tests."""

    size_m: float


class Rows(Body):
    """A batch for these tests."""

    rows: tuple[Row, ...]


def test_good_rows_keep_their_positions() -> None:
    rows, errors = validate_each(Row, [{"size_m": 1}, {"size_m": "1"}, {}, {"size_m": 4, "x": 1}, {"size_m": 5}])
    assert [(at, one.size_m) for at, one in rows] == [(0, 1.0), (4, 5.0)]
    assert [(one.index, one.field, one.code) for one in errors] == [
        (1, "size_m", "wrong_type"), (2, "size_m", "missing"), (3, "x", "unknown_field"),
    ]  # fmt: skip
    assert errors[0].detail == "size_m is a number, in m."


def test_all_errors_of_a_row_are_listed() -> None:
    _, errors = validate_each(Row, [{"size_m": None, "x": 1, "y": 2}])
    assert [one.field for one in errors] == ["size_m", "x", "y"]


def test_rows_are_taken_from_the_body_unseen() -> None:
    assert rows_in(Rows, "rows", b'{"rows": [1, {"size_m": NaN}]}')[0] == 1


@pytest.mark.parametrize("text", [b"", b"[]", b'{"rows": 1}', b'{"rows": [], "x": 1}', b"{}", b'{"row": []}'])
def test_body_that_is_no_batch_is_refused(text: bytes) -> None:
    with pytest.raises(ValidationError):
        rows_in(Rows, "rows", text)
