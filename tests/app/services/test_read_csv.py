"""A table is refused by its header as a whole, and by its rows one by one."""

from __future__ import annotations

import io

import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.errors import AppError, BadRequest, Unprocessable
from app.services.read_csv import blocks, header, readings

SIX = "2026-03-14T06:00:00+01:00"
SIX_US = 1_773_464_400_000_000  # microseconds of 2026-03-14T05:00Z


def table(*lines: str) -> bytes:
    return "\n".join(lines).encode()


def refused(*names: str) -> list[tuple[str, str, str]]:
    with pytest.raises(Unprocessable) as caught:
        header(list(names))
    return [(error.pointer, error.code, error.detail) for error in caught.value.errors]


def test_fields_by_their_names_and_quantities_in_their_units() -> None:
    rows, errors = readings(
        table(
            "vessel,taken_at,source,quality,level [ft-in-16],liquid_temperature [degF],pressure [psi],"
            "observed_density [degAPI],liquid_volume [%],vapour_composition,empty,sample_holds_from",
            f'tk-12,{SIX},hand,uncertain,23-04-11,50,2,10,81.5,"{{""propane"": 1}}",false,{SIX}',
        )
    )
    (index, one), *others = rows
    assert (index, others, errors) == (0, [], [])
    assert (one.vessel, one.taken_at, one.source, one.quality) == ("tk-12", SIX_US, "hand", "uncertain")
    assert one.level_m == 7.1294625
    assert one.liquid_temperature_c == 10.0
    assert one.pressure_kpa == 2 * 6.894757293168361
    assert one.pressure_kpa_abs is None
    assert one.observed_density_kg_m3 == 999.016
    assert one.liquid_volume_pct == 81.5
    assert one.vapour_composition == {"propane": 1.0}
    assert one.empty is False
    assert one.sample_holds_from == SIX_US


def test_a_blank_cell_was_not_read() -> None:
    rows, errors = readings(table("vessel,taken_at,level_m,pressure_kpa", f"tk-1,{SIX},  ,1.5", f"tk-1,{SIX},2,"))
    assert errors == []
    assert [row.named() for _, row in rows] == [["pressure_kpa"], ["level_m"]]


def test_a_row_that_is_wrong_is_named_and_spoils_no_other() -> None:
    rows, errors = readings(
        table(
            "vessel,taken_at,level [ft-in-16],liquid_temperature_c,vapour_composition,empty",
            f"tk-1,{SIX},23-04-11,,,",
            f"tk-1,{SIX},23-12-00,,,",
            f'tk-1,{SIX},,"17,5",,',
            "",
            f"tk-1,{SIX},1-0-0",
            f"tk-1,{SIX},1-0-0,,{{bad,",
            f"tk-1,{SIX},1-0-0,,,perhaps",
            f"tk-1,{SIX},999-0-0,,,",
            f"tk-1,{SIX},,nan,,",
            f'tk-1,{SIX},,,"{{""propane"": 1, ""propane"": 1}}",',
            "tk-1,yesterday,1-0-0,,,",
            f"tk-1,{SIX},,,,true",
        )
    )
    assert [index for index, _ in rows] == [0, 10]
    assert [(error.index, error.field, error.code) for error in errors] == [
        (1, "level_m", "wrong_type"),
        (2, "liquid_temperature_c", "wrong_type"),
        (3, "", "wrong_length"),
        (4, "vapour_composition", "wrong_type"),
        (5, "empty", "wrong_type"),
        (6, "level_m", "out_of_range"),
        (7, "liquid_temperature_c", "wrong_type"),
        (8, "vapour_composition", "wrong_type"),
        (9, "taken_at", "not_an_instant"),
    ]
    assert "23-04-11" in errors[0].detail and "23-12-00" not in errors[0].detail
    assert errors[2].detail == "The row has 3 cells; the header has 6."


def test_a_header_that_cannot_be_is_refused_by_the_number_of_the_column() -> None:
    names = ["vessel", "taken_at", "lvl", "level [degF]", "level [cubits]", "level_m", "level [ft]", "", "empty [m]"]
    found = refused(*names)
    assert [(place, code) for place, code, _ in found] == [
        ("/header/2", "unknown_column"),
        ("/header/3", "other_dimension"),
        ("/header/4", "unknown_unit"),
        ("/header/6", "repeated_column"),
        ("/header/7", "unknown_column"),
        ("/header/8", "unknown_column"),
    ]
    assert [detail.split(":")[0] for _, _, detail in found] == [f"Column {n}" for n in (3, 4, 5, 7, 8, 9)]


@pytest.mark.parametrize(
    "name", ["<script>", "level_m [<script>]", "level [<script>]", "<script> [m]", "lev\nel", "é" * 99]
)
def test_a_header_is_not_repeated(name: str) -> None:
    ((_, _, detail),) = refused(name)
    assert "script" not in detail and "lev\nel" not in detail and "é" not in detail


def test_a_column_with_its_unit_in_the_name_takes_no_second_one() -> None:
    assert refused("level_m [ft]")[0][1] == "unknown_column"


def test_a_table_without_a_header_is_refused() -> None:
    for text in (b"", b"\n\n", b"\xef\xbb\xbf"):
        with pytest.raises(Unprocessable) as caught:
            readings(text)
        assert caught.value.errors[0].code == "missing"


def test_a_table_parted_by_semicolons_is_refused_with_the_way_out() -> None:
    ((_, code, detail),) = refused("vessel;taken_at;level_m")
    assert code == "unknown_column" and "commas" in detail


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
@pytest.mark.parametrize("mark", ["", "\ufeff"])
def test_lines_may_end_as_they_do_anywhere(end: str, mark: str) -> None:
    text = mark + end.join(["vessel , taken_at,level_m", f"tk-1,{SIX}, 2.5", f'"tk-2",{SIX},3', ""])
    rows, errors = readings(text.encode())
    assert errors == []
    assert [(row.vessel, row.level_m) for _, row in rows] == [("tk-1", 2.5), ("tk-2", 3.0)]


@pytest.mark.parametrize(
    "tail", [b'"tk-1,2026', b'"a"b,2026-03-14T06:00:00Z,1\n', b"\xff,2026-03-14T06:00:00Z,1\n", b"x" * 200_000]
)
def test_what_is_no_csv_is_refused_as_a_whole(tail: bytes) -> None:
    with pytest.raises(BadRequest) as caught:
        readings(table("vessel,taken_at,level_m", f"tk-1,{SIX},2") + b"\n" + tail)
    assert caught.value.code == "malformed_csv"


def test_blocks_count_on_and_know_their_lines() -> None:
    text = f'vessel,taken_at,level_m,sample\ntk-1,{SIX},1,\n\ntk-1,{SIX},x,"two\nlines"\ntk-1,{SIX},3,\n'
    first, second = blocks(io.StringIO(text, newline=""), 2)
    assert [index for index, _ in first.rows + second.rows] == [0, 2]
    assert {error.index for error in first.errors} == {1}
    assert [first.line(0), first.line(1), second.line(2)] == [2, 5, 6]


@given(st.lists(st.floats(-10, 150), min_size=1, max_size=30), st.integers(1, 7))
def test_a_block_says_what_the_whole_says(levels: list[float], size: int) -> None:
    text = "\n".join(["vessel,taken_at,level_m", *(f"tk-1,{SIX},{level!r}" for level in levels)])
    whole, _ = readings(text.encode())
    apart = [row for block in blocks(io.StringIO(text), size) for row in block.rows]
    assert apart == whole
    assert [row.level_m for _, row in whole] == levels


@given(st.binary(max_size=200))
def test_any_bytes_are_a_table_or_are_refused(body: bytes) -> None:
    for text in (body, b"vessel,taken_at,level [ft-in-16],quality,empty\n" + body):
        try:
            rows, errors = readings(text)
        except AppError as known:
            assert known.status in (400, 422)
        else:
            assert {index for index, _ in rows}.isdisjoint(error.index for error in errors)
