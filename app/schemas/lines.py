"""JSON by the line: each line is a row of its own, so one that cannot be read spoils no other."""

from __future__ import annotations

import json
from typing import Any, TypeVar

from pydantic import BaseModel
from pydantic_core import from_json

from app.schemas.batch import RowError, validate_each

M = TypeVar("M", bound=BaseModel)


def parse_once(text: str) -> Any:
    """A value from JSON text; ``ValueError`` where it is none, or where a key stands twice in an object."""
    value = from_json(text)  # refuses what nests too deep, before the parser below could fail on it
    json.loads(text, object_pairs_hook=_once)
    return value


def _once(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    found = dict(pairs)
    if len(found) != len(pairs):
        raise ValueError("a key stands twice")
    return found


def validate_lines(model: type[M], text: bytes) -> tuple[list[tuple[int, M]], list[RowError]]:
    """Good rows with their positions, and what is wrong with the others.

    Parameters
    ----------
    model : type
        What a row is.
    text : bytes
        One JSON object a line, in UTF-8. Empty lines are no rows, and are not counted.
    """
    raw: list[object] = []
    places: list[int] = []
    unread: list[RowError] = []
    for index, line in enumerate(line for line in text.split(b"\n") if line.strip()):
        try:
            raw.append(parse_once(line.decode()))
            places.append(index)
        except (ValueError, RecursionError):
            detail = "The line is not one JSON object in UTF-8, with every key once."
            unread.append(RowError(index=index, field="", code="malformed_json", detail=detail))
    rows, errors = validate_each(model, raw)
    placed = [error.model_copy(update={"index": places[error.index]}) for error in errors]
    return [(places[at], row) for at, row in rows], sorted(unread + placed, key=lambda error: error.index)
