"""A line is a row of its own: what is wrong with it is said of it, at its place, and of nothing else."""

from __future__ import annotations

import json

import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.schemas.lines import parse_once, validate_lines
from app.schemas.reading import Reading

GOOD = {"vessel": "tk-1", "taken_at": "2026-03-14T06:00:00+01:00", "level_m": 8.231}


def line(**fields: object) -> bytes:
    return json.dumps(GOOD | fields).encode()


def test_good_lines_are_rows_in_their_order() -> None:
    rows, errors = validate_lines(Reading, b"\r\n".join([line(), b"", line(level_m=2), line(vessel="tk-2")]))
    assert errors == []
    assert [(index, row.vessel, row.level_m) for index, row in rows] == [
        (0, "tk-1", 8.231), (1, "tk-1", 2.0), (2, "tk-2", 8.231),
    ]  # fmt: skip


def test_a_bad_line_is_named_at_its_place() -> None:
    text = b"\n".join(
        [
            b"{", line(), b'{"vessel": "tk-1", "vessel": "tk-2"}', line(level_m="1.5"), b"[]", b"\xff", line(),
            line().replace(b"8.231", b"NaN"), b"[" * 100_000, line().replace(b"8.231", b"9" * 5_000),
            line().replace(b"tk-1", b"\\ud800"), line(surprise=1),
        ]
    )  # fmt: skip
    rows, errors = validate_lines(Reading, text)
    assert [index for index, _ in rows] == [1, 6]
    assert [(error.index, error.field, error.code) for error in errors] == [
        (0, "", "malformed_json"),
        (2, "", "malformed_json"),
        (3, "level_m", "wrong_type"),
        (4, "", "wrong_type"),
        (5, "", "malformed_json"),
        (7, "level_m", "not_finite"),
        (8, "", "malformed_json"),
        (9, "", "malformed_json"),
        (10, "", "malformed_json"),
        (11, "surprise", "unknown_field"),
    ]


@pytest.mark.parametrize("text", ["{", '{"a": 1, "a": 2}', '[{"a": {"b": 1, "b": 1}}]', "", "[" * 10_000])
def test_what_cannot_be_meant_is_not_parsed(text: str) -> None:
    with pytest.raises((ValueError, RecursionError)):
        parse_once(text)


def test_what_can_be_is() -> None:
    assert parse_once('{"a": {"a": 1}, "b": [1.5, null]}') == {"a": {"a": 1}, "b": [1.5, None]}


@given(st.binary(max_size=200))
def test_any_bytes_are_rows_or_errors(text: bytes) -> None:
    rows, errors = validate_lines(Reading, text)
    lines = [one for one in text.split(b"\n") if one.strip()]
    assert {index for index, _ in rows} | {error.index for error in errors} == set(range(len(lines)))
