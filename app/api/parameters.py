"""Parameters of a query: instants, and cursors that are read strictly."""

from __future__ import annotations

import re
from typing import Annotated, Any

from fastapi import Path, Query
from pydantic import BeforeValidator, WithJsonSchema

from app.errors import FieldError, Unprocessable
from app.schemas.listing import LARGEST_LIMIT, LIMIT
from app.schemas.types import ID_PATTERN, parse_instant

_SCHEMA = {"type": "string", "format": "date-time", "examples": ["2026-03-14T06:00:00+01:00"]}


def _instant(text: Any) -> Any:
    """An instant of a query: a + that the client did not encode arrives as a space, and is meant as +."""
    return parse_instant(text.replace(" ", "+")) if isinstance(text, str) else text


QueryInstant = Annotated[int, BeforeValidator(_instant), WithJsonSchema(_SCHEMA)]
AsOf = Annotated[
    QueryInstant | None, Query(description="Answer from what was recorded up to this instant; now if left out")
]
At = Annotated[QueryInstant | None, Query(description="The instant; now if left out")]
Limit = Annotated[int, Query(ge=1, le=LARGEST_LIMIT, description=f"Items of a page; {LIMIT} if left out")]
Cursor = Annotated[str | None, Query(max_length=200, description="The `next` of the page before")]
PathId = Annotated[str, Path(pattern=ID_PATTERN, description="Chosen by the client")]


def open_cursor(text: str | None) -> tuple[int, str, int] | None:
    """A cursor as instant, name and ``known_at``; anything else is refused, not guessed."""
    if text is None:
        return None
    parts = text.split("~")
    if len(parts) != 3 or not all(_NUMBER.fullmatch(part) for part in (parts[0], parts[2])):
        raise Unprocessable(
            "That is no cursor of this listing: take next of the page before as it stands",
            code="not_a_cursor",
            errors=[FieldError("/cursor", "not_a_cursor", "cursor is the next of the page before")],
        )
    return int(parts[0]), parts[1], int(parts[2])


def cursor_of(instant: int, name: str, known: int) -> str:
    """The cursor behind an item, with the watermark that all pages of the listing share."""
    return f"{instant}~{name}~{known}"


_NUMBER = re.compile(r"-?[0-9]{1,19}", re.ASCII)
