"""Instants, ids, texts and compositions take one form each; a body has one spelling."""

from __future__ import annotations

import json
from datetime import UTC, datetime, timedelta, timezone

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from pydantic import ConfigDict, Field, TypeAdapter, ValidationError
from pydantic_core import PydanticCustomError

from app.schemas.types import (
    Answer,
    AnsweredInstant,
    Body,
    Composition,
    End,
    Id,
    Instant,
    Known,
    Text,
    canonical,
    format_instant,
    parse_instant,
    refusal,
)

INSTANT: TypeAdapter[int] = TypeAdapter(Instant)


def code_of(text: object) -> str:
    with pytest.raises(PydanticCustomError) as refused:
        parse_instant(text)
    return refused.value.type


# Seconds since 1970 by the rule of RFC 3339 and the calendar: 2026-03-14 is day 20,526 of the epoch.
MARCH_14 = 20_526 * 86_400 * 1_000_000


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("1970-01-01T00:00:00Z", 0),
        ("2026-03-14T00:00:00Z", MARCH_14),
        ("2026-03-14T06:00:00+01:00", MARCH_14 + 5 * 3_600_000_000),
        ("2026-03-13T20:30:00-03:30", MARCH_14),
        ("2026-03-14t00:00:00.5z", MARCH_14 + 500_000),
        ("2026-03-14T00:00:00.000001Z", MARCH_14 + 1),
        ("2026-03-14T00:00:00.1234567Z", MARCH_14 + 123_456),
        ("2026-03-14T00:00:00.999999999Z", MARCH_14 + 999_999),
        ("2026-03-14T00:00:00-00:00", MARCH_14),
    ],
)
def test_instant_is_read(text: str, expected: int) -> None:
    assert parse_instant(text) == expected


@pytest.mark.parametrize("text", ["2026-03-14T06:00:00", "2026-03-14T06:00:00.25"])
def test_naive_instant_is_refused(text: str) -> None:
    assert code_of(text) == "no_offset"


@pytest.mark.parametrize(
    "text",
    [
        "", "2026-03-14", "06:00:00Z", "2026-03-14 06:00:00Z", "20260314T060000Z", "2026-W11-6T06:00:00Z",
        "2026-02-30T06:00:00Z", "2026-03-14T24:00:00Z", "2026-12-31T23:59:60Z", "2026-03-14T06:00:00+25:00",
        "2026-03-14T06:00Z", "2026-03-14T06:00:00.Z", "2026-03-14T06:00:00.1234567890Z", "2026-03-14T06:00:00Z\n",
        " 2026-03-14T06:00:00Z", "1969-12-31T23:59:59Z", "2201-01-01T00:00:00Z", "0001-01-01T00:00:00+23:00",
        "9999-12-31T23:59:59-23:00", "٢٠٢٦-03-14T06:00:00Z", "1773464400",
        1773464400, 1773464400.0, True, None, [], {},
    ],
)  # fmt: skip
def test_what_is_no_instant_is_refused(text: object) -> None:
    assert code_of(text) == "not_an_instant"


def test_instant_is_written_in_utc() -> None:
    assert format_instant(MARCH_14 + 5 * 3_600_000_000) == "2026-03-14T05:00:00Z"
    assert format_instant(MARCH_14 + 250_000) == "2026-03-14T00:00:00.250000Z"


@settings(max_examples=50, derandomize=True, deadline=None)
@given(
    st.datetimes(datetime(1970, 1, 3), datetime(2200, 12, 30)),  # noqa: DTZ001
    st.integers(-14 * 60, 14 * 60),
)
def test_instant_agrees_with_the_calendar(moment: datetime, offset: int) -> None:
    there = moment.replace(tzinfo=timezone(timedelta(minutes=offset)))
    expected = (there - datetime(1970, 1, 1, tzinfo=UTC)) // timedelta(microseconds=1)
    assert parse_instant(there.isoformat()) == expected
    assert parse_instant(format_instant(expected)) == expected


def test_request_refuses_a_number_where_an_answer_takes_it() -> None:
    answered: TypeAdapter[int] = TypeAdapter(AnsweredInstant)
    assert answered.validate_python(MARCH_14) == MARCH_14
    assert answered.dump_python(MARCH_14) == "2026-03-14T00:00:00Z"
    for adapter in (INSTANT, answered):
        with pytest.raises(ValidationError):
            adapter.validate_python(True)
    with pytest.raises(ValidationError):
        INSTANT.validate_python(MARCH_14)


@pytest.mark.parametrize("text", ["tk-12", "a", "9", "a.b_c-d", "a" * 63])
def test_id_is_taken(text: str) -> None:
    assert TypeAdapter(Id).validate_python(text) == text


@pytest.mark.parametrize("text", ["", "TK-12", "-a", ".a", "a b", "a/b", "é", "a" * 64, "a\n", "a\x00", 12, None])
def test_id_is_refused(text: object) -> None:
    with pytest.raises(ValidationError):
        TypeAdapter(Id).validate_python(text)


@pytest.mark.parametrize("text", ["tk-12", "boundary:jetty-1"])
def test_end_is_taken(text: str) -> None:
    assert TypeAdapter(End).validate_python(text) == text


@pytest.mark.parametrize("text", ["boundary:", "boundary:Jetty", "boundary:a:b", "port:a"])
def test_end_is_refused(text: str) -> None:
    with pytest.raises(ValidationError):
        TypeAdapter(End).validate_python(text)


@pytest.mark.parametrize("text", ["", "a\x00b", "a\nb", "\x7f", "\x85", "\ud800", "a" * 201, 1])
def test_text_is_refused(text: object) -> None:
    with pytest.raises(ValidationError):
        TypeAdapter(Text).validate_python(text)


def test_text_is_taken() -> None:
    assert TypeAdapter(Text).validate_python("Öltank 3, «nord» 油 🛢") == "Öltank 3, «nord» 油 🛢"


@pytest.mark.parametrize("fractions", [{"nitrogen": 1}, {"nitrogen": 0.99}, {"nitrogen": 0.5, "helium": 0.51}])
def test_composition_is_taken(fractions: dict[str, float]) -> None:
    assert TypeAdapter(Composition).validate_python(fractions) == fractions


@pytest.mark.parametrize(
    "fractions",
    [{}, {"nitrogen": 0.98}, {"nitrogen": 0.6, "helium": 0.42}, {"nitrogen": 1.2, "helium": -0.2},
     {"Nitrogen": 1.0}, {"nitrogen": float("nan")}, {"nitrogen": "1"}, {"nitrogen": True}],
)  # fmt: skip
def test_composition_is_refused(fractions: object) -> None:
    with pytest.raises(ValidationError):
        TypeAdapter(Composition).validate_python(fractions, strict=True)


def test_missing_is_null_and_infinite_is_refused() -> None:
    known: TypeAdapter[float | None] = TypeAdapter(Known, config=ConfigDict(strict=True, allow_inf_nan=False))
    assert known.validate_python(float("nan")) is None
    assert known.validate_python(2.5) == 2.5
    with pytest.raises(ValidationError):
        known.validate_python(float("inf"))


class Thing(Body):
    """A body for these tests."""

    size_m: float = Field(default=1.0)
    at: Instant | None = None
    origin: str | None = Field(default=None, alias="from")


def test_body_takes_no_guess() -> None:
    for document in (
        '{"size_m": "1.5"}', '{"size_m": true}', '{"size_m": NaN}', '{"size_m": Infinity}', '{"size_m": 1e400}',
        '{"size_m": -1e999}', '{"size_m": null}', '{"origin": "a"}', '{"colour": 1}', "[]", "1", "",
        '{"from": "\\ud800"}',
    ):  # fmt: skip
        with pytest.raises(ValidationError):
            Thing.model_validate_json(document)


def test_answer_takes_a_field_by_its_name() -> None:
    class Told(Answer):
        origin: str = Field(alias="from")

    assert Told(origin="a").model_dump_json() == '{"from":"a"}'  # type: ignore[call-arg]


@pytest.mark.parametrize(
    "document",
    [
        '{"size_m": 2, "at": "2026-03-14T06:00:00+01:00", "from": "é"}',
        '{"from": "é", "at": "2026-03-14T05:00:00.000Z", "size_m": 2.0}',
        '{ "at":"2026-03-13T19:00:00-10:00","size_m":2e0,"from":"\\u00e9"}',
    ],
)
def test_canonical_text_is_one_for_all_spellings(document: str) -> None:
    assert canonical(Thing.model_validate_json(document)) == '{"at":"2026-03-14T05:00:00Z","from":"é","size_m":2.0}'


def test_canonical_text_fills_in_nothing() -> None:
    assert canonical(Thing.model_validate_json("{}")) == "{}"
    named = Thing.model_validate_json('{"size_m": 1.0, "from": "a"}')
    assert canonical(named) == '{"from":"a","size_m":1.0}'
    assert canonical(named, without={"origin"}) == '{"size_m":1.0}'


@settings(max_examples=50, derandomize=True, deadline=None)
@given(st.floats(allow_nan=False, allow_infinity=False))
def test_canonical_text_keeps_a_number_to_the_last_bit(size: float) -> None:
    text = canonical(Thing.model_validate_json(json.dumps({"size_m": size})))
    again = Thing.model_validate_json(text)
    assert again.size_m.hex() == size.hex()
    assert canonical(again) == text


def test_refusal_points_at_a_field() -> None:
    (error,) = refusal("impossible", "a {b} c", "rows", 3).errors()
    assert (error["type"], error["loc"], error["msg"]) == ("impossible", ("rows", 3), "a {b} c")
