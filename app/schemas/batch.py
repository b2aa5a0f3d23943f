"""Batches: good rows are kept, bad rows are named, all are counted."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, TypeVar

from pydantic import BaseModel, ConfigDict, Field, TypeAdapter, ValidationError
from pydantic_core import from_json

from app.schemas.errors import explain, field_of
from app.schemas.types import Answer, AnsweredInstant, Items

M = TypeVar("M", bound=BaseModel)

ERRORS_LISTED = 1_000
"""Errors of a batch that are listed; all are counted."""


class RowError(Answer):
    """One thing wrong with one row of a batch."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "index": 17,
                    "field": "liquid_temperature_c",
                    "code": "out_of_range",
                    "detail": "liquid_temperature_c is at most 1000 °C.",
                }
            ]
        }
    )

    index: int = Field(ge=0, description="Position of the row in the batch, from 0")
    field: str = Field(description="The field; empty where it is the row as a whole")
    code: str = Field(description="Stable word for the kind of error")
    detail: str = Field(description="One sentence: the field, its limit and its unit")


class BatchAnswer(Answer):
    """What became of a batch, counted in readings."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "stored": 9982, "revised": 1, "unchanged": 0, "rejected": 17,
                    "errors": [
                        {
                            "index": 17, "field": "liquid_temperature_c", "code": "out_of_range",
                            "detail": "liquid_temperature_c is at most 1000 °C.",
                        }
                    ],
                    "known_at": "2026-03-14T05:00:02.417311Z",
                }
            ]
        }
    )  # fmt: skip

    stored: int = Field(ge=0, description="Readings with a value that was new")
    revised: int = Field(ge=0, description="Readings that gave a known value anew, and differently")
    unchanged: int = Field(ge=0, description="Readings that said what was known")
    rejected: int = Field(ge=0, description="Readings that were not kept")
    errors: Items[RowError] = Field(description="Why; the first 1,000")
    known_at: AnsweredInstant | None = Field(description="The latest record that the answer includes")


def validate_each(model: type[M], raw: Sequence[object]) -> tuple[list[tuple[int, M]], list[RowError]]:
    """The good rows with their positions, and what is wrong with the others.

    All rows at once first, which is the usual case; one by one where any of them is bad.

    Parameters
    ----------
    model : type
        What a row is.
    raw : sequence of object
        Rows as parsed from JSON, or put together from another format with the same types.
    """
    try:
        return list(enumerate(TypeAdapter(list[model]).validate_python(list(raw)))), []  # type: ignore[valid-type]
    except ValidationError:
        pass
    rows: list[tuple[int, M]] = []
    errors: list[RowError] = []
    for index, one in enumerate(raw):
        try:
            rows.append((index, model.model_validate(one)))
        except ValidationError as refused:
            errors.extend(
                RowError(index=index, field=field_of(pointer), code=code, detail=detail)
                for pointer, code, detail in explain(refused)
            )
    return rows, errors


def rows_in(envelope: type[BaseModel], key: str, text: bytes) -> list[Any]:
    """Rows of a JSON body of one list, not looked at yet.

    A body that is no JSON, or no object of that one list, raises the ``ValidationError`` of ``envelope``,
    which is the model of the whole body.
    """
    try:
        document = from_json(text)
    except ValueError:
        document = None
    if isinstance(document, dict) and list(document) == [key] and isinstance(document[key], list):
        return list(document[key])
    envelope.model_validate_json(text)
    raise AssertionError("a body that is no batch was taken for one")
