"""Capacity tables from text: each cell a number in its unit, and every one that is not is named."""

from __future__ import annotations

import pytest

from app.errors import AppError, BadRequest, TooLarge, Unprocessable
from app.schemas.shape import TABLE_ROWS
from app.services.read_table import read


def refused(text: str, kind: type[AppError] = Unprocessable) -> list[tuple[str, str]]:
    with pytest.raises(kind) as error:
        read(text.encode())
    return [(one.pointer, one.code) for one in error.value.errors]


def test_columns_stand_in_the_units_that_they_declare() -> None:
    # An inch is 0.0254 m and a barrel 42 US gallons of 231 cubic inches: exact by definition.
    found = read(b"level [ft-in-16],volume [bbl]\n00-00-00,10\n01-00-08,20.5\n")
    assert found.levels == pytest.approx((0.0, 12.5 * 0.0254), rel=1e-15)
    assert found.volumes == pytest.approx((10 * 9702 * 0.0254**3, 20.5 * 9702 * 0.0254**3), rel=1e-14)
    assert found.resolution == pytest.approx(0.1 * 9702 * 0.0254**3, rel=1e-14)


def test_columns_may_stand_in_either_order_and_empty_lines_are_passed_over() -> None:
    found = read("\ufeffvolume_m3, level [mm]\r\n\r\n1.25, 0\r\n\r\n3.5,10\r\n".encode())
    assert (found.levels, found.volumes, found.resolution) == ((0.0, 0.01), (1.25, 3.5), 0.01)


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("", [("/header", "missing")]),
        ("level_m\n1\n", [("/header", "missing")]),
        ("level_m,level [mm]\n1,1\n", [("/header", "missing")]),
        ("level_m,volume_m3,note\n", [("/header/2", "unknown_column")]),
        ("level_m,ullage_m\n", [("/header/1", "unknown_column")]),
        ("level [bbl],volume [smoot]\n", [("/header/0", "other_dimension"), ("/header/1", "unknown_unit")]),
        ("level_m,volume_m3\n0,1\n", [("", "wrong_length")]),
        ("level_m,volume_m3\n0,1\n1\n2,x\n,4\n1e999,nan\n",
         [("/1", "wrong_length"), ("/2/volume_m3", "wrong_type"), ("/3/level_m", "wrong_type"),
          ("/4/volume_m3", "wrong_type")]),
        ("level [ft-in-16],volume_m3\n00-12-00,1\n1.5,2\n",
         [("/0/level_m", "wrong_type"), ("/1/level_m", "wrong_type")]),
    ],
)  # fmt: skip
def test_what_cannot_be_read_is_named_with_its_place(text: str, expected: list[tuple[str, str]]) -> None:
    assert refused(text) == expected


def test_what_is_no_csv_is_said_to_be_none() -> None:
    assert refused('level_m,volume_m3\n"0,1\n', BadRequest) == [("", "malformed_csv")]
    with pytest.raises(BadRequest, match="UTF-8"):
        read("level_m,volume_m3\n0,1\n1,2 \xb3\n".encode("latin-1"))


def test_a_table_has_its_limit() -> None:
    with pytest.raises(TooLarge, match="100000"):
        read(b"level_m,volume_m3\n" + b"0,1\n" * (TABLE_ROWS + 1))
