"""Parameters of a query: instants, and cursors that are read strictly."""

from __future__ import annotations

import re
from typing import Annotated, Any

from fastapi import Path, Query
from pydantic import BeforeValidator, WithJsonSchema

from app.errors import FieldError, Unprocessable
from app.schemas.listing import LARGEST_LIMIT, LIMIT
from app.schemas.types import ID_PATTERN, parse_instant, worded

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
PathId = Annotated[str, *worded(ID_PATTERN), Path(description="Chosen by the client")]


_NUMBER = re.compile(r"-?[0-9]{1,18}|-?[1-8][0-9]{18}", re.ASCII)  # what 64 bits hold
_NAME = re.compile(r"[^\u0000-\u001f\u007f-\u009f\ud800-\udfff]*")


def open_cursor(text: str | None, *, name: re.Pattern[str] = _NAME) -> tuple[int, str, int] | None:
    """A cursor as instant, name and ``known_at``; anything else is refused, not guessed."""
    if text is None:
        return None
    instant, _, rest = text.partition("~")
    middle, _, known = rest.rpartition("~")  # a source may hold the separator, a number cannot
    if not (_NUMBER.fullmatch(instant) and _NUMBER.fullmatch(known) and name.fullmatch(middle)):
        raise _no_cursor()
    return int(instant), middle, int(known)


def open_numbers(text: str | None) -> tuple[int, str, int] | None:
    """A cursor of a listing of periods, whose name is an instant too."""
    return open_cursor(text, name=_NUMBER)


def cursor_of(instant: int, name: str, known: int) -> str:
    """The cursor behind an item, with the watermark that all pages of the listing share."""
    return f"{instant}~{name}~{known}"


def open_name(text: str | None, as_of: int | None) -> tuple[str, int | None]:
    """A cursor of a listing by id: the id that it is behind, and the watermark that its pages share."""
    if text is None:
        return "", as_of
    name, _, known = text.partition("~")
    if not (re.fullmatch(ID_PATTERN, name) and _NUMBER.fullmatch(known)):
        raise _no_cursor()
    return name, int(known)


def name_cursor(name: str | None, known: int) -> str | None:
    """The cursor behind an id; none on the last page."""
    return None if name is None else f"{name}~{known}"


def _no_cursor() -> Unprocessable:
    return Unprocessable(
        "That is no cursor of this listing: take next of the page before as it stands",
        code="not_a_cursor",
        errors=[FieldError("/query/cursor", "not_a_cursor", "cursor is the next of the page before")],
    )
