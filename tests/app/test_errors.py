"""Refusals carry their status; fields are named where they stand in the client's own document."""

from __future__ import annotations

import json
from typing import Annotated, Literal

import pydantic_core
import pytest
from pydantic import BaseModel, ConfigDict, Field, ValidationError

from app import errors
from app.errors import AppError, Conflict, FieldError, Unavailable, field_errors


class Sphere(BaseModel):
    kind: Literal["sphere"]
    diameter_m: float


class Table(BaseModel):
    kind: Literal["table"]
    rows: list[tuple[float, float]]


class Vessel(BaseModel):
    model_config = ConfigDict(extra="forbid")

    name: str = Field(max_length=5)
    shape: Annotated[Sphere | Table, Field(discriminator="kind")]
    limits: dict[str, float] = {}


def refused(document: object) -> list[FieldError]:
    text = json.dumps(document)
    with pytest.raises(ValidationError) as caught:
        Vessel.model_validate_json(text, strict=True)
    return field_errors(caught.value, pydantic_core.from_json(text))


def places(document: object) -> list[tuple[str, str, int | None]]:
    return [(error.pointer, error.code, error.index) for error in refused(document)]


def test_a_pointer_leads_through_the_document_and_not_through_the_tags_of_a_union() -> None:
    shape = {"kind": "table", "rows": [[0.0, 1.0], [0.5, "x"]]}
    assert places({"name": "a", "shape": shape}) == [("/shape/rows/1/1", "wrong_type", 1)]


def test_a_missing_field_is_named_where_it_should_stand() -> None:
    assert places({"shape": {"kind": "sphere"}}) == [
        ("/name", "missing", None),
        ("/shape/diameter_m", "missing", None),
    ]


def test_an_unknown_tag_is_answered_with_the_tags_there_are_and_not_repeated() -> None:
    (error,) = refused({"name": "a", "shape": {"kind": "pyramid", "diameter_m": 1.0}})
    assert (error.pointer, error.code) == ("/shape", "not_one_of")
    assert "sphere" in error.detail and "table" in error.detail and "pyramid" not in error.detail


@pytest.mark.parametrize("key", ["a" * 65, "a/b", "a~b", "<script>", "ü", ""])
def test_a_key_that_does_not_look_like_a_name_is_not_repeated(key: str) -> None:
    for document in (
        {"name": "a", "shape": None, key: 1},
        {"name": "a", "shape": None, "limits": {key: "x"}},
    ):
        assert all(error.pointer in ("", "/shape", "/limits") for error in refused(document))


def test_at_most_a_thousand_mistakes_are_listed() -> None:
    rows = [["x", 0.0]] * 3000
    assert len(refused({"name": "a", "shape": {"kind": "table", "rows": rows}})) == 1000


def test_the_raiser_may_name_a_finer_code_and_the_class_keeps_the_status() -> None:
    assert (Conflict("Not over.").code, Conflict("Not over.", code="period_open").code) == (
        "conflict",
        "period_open",
    )
    assert Unavailable("Away.", retry_after_s=7).headers == {"Retry-After": "7"}


def test_statuses_are_those_of_the_contract() -> None:
    kinds = [kind for kind in vars(errors).values() if isinstance(kind, type) and issubclass(kind, AppError)]
    statuses = {kind.__name__: kind.status for kind in kinds if kind is not AppError}
    assert statuses == {
        "BadRequest": 400,
        "Forbidden": 403,
        "NotFound": 404,
        "Conflict": 409,
        "Gone": 410,
        "TooLarge": 413,
        "UnsupportedMedia": 415,
        "Misdirected": 421,
        "Unprocessable": 422,
        "Unavailable": 503,
        "StorageFull": 507,
    }
