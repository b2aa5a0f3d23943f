"""What the service refuses, and how a client is told.

::

    AppError
    ├── BadRequest          400  a body or a request that cannot be read at all
    ├── Forbidden           403  not from here, or not with this key
    ├── NotFound            404  names what is missing
    ├── Conflict            409  the state of the books does not allow it
    ├── Gone                410  was known once, has been archived
    ├── TooLarge            413  over a limit
    ├── UnsupportedMedia    415  a body of another type
    ├── Misdirected         421  a Host that this service does not answer to
    ├── Unprocessable       422  a value that cannot be
    ├── Unavailable         503  the store cannot be reached; try again
    └── StorageFull         507  the disk of the store is full

``code`` is the stable word that a client may act on; where the class's own is too coarse, the raiser
names a finer one (``Conflict("...", code="period_open")``). One handler, in ``edge/problems.py``,
renders them all. No message repeats text that the client sent.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any, ClassVar

from pydantic import ValidationError

ERRORS_LISTED = 1_000
Sentence = Callable[[Mapping[str, Any], Sequence[int | str]], str]


@dataclass(frozen=True)
class FieldError:
    """One thing wrong with a request: where, which kind, and a sentence."""

    pointer: str
    code: str
    detail: str
    index: int | None = None


class AppError(Exception):
    """Base of everything that is answered with a problem document."""

    status: ClassVar[int] = 500
    title: ClassVar[str] = "Fault of the service"
    default_code: ClassVar[str] = "fault"

    def __init__(
        self,
        detail: str,
        *,
        code: str | None = None,
        errors: Iterable[FieldError] = (),
        headers: Mapping[str, str] | None = None,
    ) -> None:
        super().__init__(detail)
        self.detail = detail
        self.code = code or self.default_code
        self.errors = tuple(errors)
        self.headers = dict(headers or {})


class BadRequest(AppError):
    """A request that cannot be read."""

    status, title, default_code = 400, "Request cannot be read", "malformed"


class Forbidden(AppError):
    """A request that is not allowed from there."""

    status, title, default_code = 403, "Not allowed", "forbidden"


class NotFound(AppError):
    """Something that is not there; the detail names it."""

    status, title, default_code = 404, "Not found", "not_found"


class Conflict(AppError):
    """The state of the books does not allow it."""

    status, title, default_code = 409, "Conflict", "conflict"


class Gone(AppError):
    """Was known once and has been archived."""

    status, title, default_code = 410, "Archived", "archived"


class TooLarge(AppError):
    """Over a limit."""

    status, title, default_code = 413, "Too large", "too_large"


class UnsupportedMedia(AppError):
    """A body of a type or encoding that is not read here."""

    status, title, default_code = 415, "Type of the body is not read here", "unsupported_media"


class Misdirected(AppError):
    """A host name that this service does not answer to."""

    status, title, default_code = 421, "Not this host", "foreign_host"


class Unprocessable(AppError):
    """A request that can be read, with something in it that cannot be."""

    status, title, default_code = 422, "The request cannot be taken as it stands", "invalid"


class Unavailable(AppError):
    """The store cannot be reached for the moment."""

    status, title, default_code = 503, "Store cannot be reached", "store_unavailable"

    def __init__(self, detail: str, *, code: str | None = None, retry_after_s: int = 5) -> None:
        super().__init__(detail, code=code, headers={"Retry-After": str(retry_after_s)})


class StorageFull(AppError):
    """The disk of the store is full."""

    status, title, default_code = 507, "Disk of the store is full", "disk_full"


# pydantic's error types, folded into the few codes that a client can act on. A type that is not here
# (a model's own PydanticCustomError) is its own code.
_CODES: dict[str, str] = {
    "missing": "missing",
    "extra_forbidden": "unknown_field",
    "json_invalid": "malformed_json",
    "finite_number": "not_finite",
    "string_pattern_mismatch": "wrong_form",
    "literal_error": "not_one_of",
    "enum": "not_one_of",
    "union_tag_invalid": "not_one_of",
    "union_tag_not_found": "missing",
    "timezone_aware": "no_offset",
    "value_error": "impossible",
    "assertion_error": "impossible",
    **dict.fromkeys(("greater_than", "greater_than_equal", "less_than", "less_than_equal"), "out_of_range"),
    **dict.fromkeys(("string_too_short", "string_too_long", "too_short", "too_long"), "wrong_length"),
    **dict.fromkeys(("datetime_parsing", "datetime_from_date_parsing"), "not_an_instant"),
    **dict.fromkeys(("date_parsing", "date_from_datetime_parsing"), "not_a_date"),
    **dict.fromkeys(("int_parsing", "float_parsing", "bool_parsing", "int_from_float"), "wrong_type"),
}
# Keys of a document are the client's text: only those that look like a name are said again in a pointer.
SAFE_SEGMENT = re.compile(r"[A-Za-z0-9._:-]{1,64}")
_UNPRINTABLE = re.compile(r"[\x00-\x1f\x7f\ud800-\udfff]")


def field_errors(
    refused: ValidationError, document: object, *, within: str = "", say: Sentence | None = None
) -> list[FieldError]:
    """Pydantic's errors as field errors that point into the client's own document.

    Parameters
    ----------
    refused : ValidationError
        What a model refused.
    document : object
        The parsed JSON that was validated; pointers are resolved against it, because pydantic's
        locations also hold the tags of unions, which stand nowhere in the document.
    within : str
        Pointer to ``document`` inside the body, where it is only a part of it.
    say : callable, optional
        Makes the sentence of one error of its mapping and its steps; pydantic's own words if left out.

    Returns
    -------
    list of FieldError
        At most ``ERRORS_LISTED``, in the order of the fields, none twice.
    """
    found: dict[tuple[str, str], FieldError] = {}
    for error in refused.errors(include_url=False, include_input=False):
        segments = _segments(error["loc"], document, absent=error["type"] == "missing")
        one = field_error(error, segments, within=within, say=say)
        found.setdefault((one.pointer, one.code), one)
        if len(found) == ERRORS_LISTED:
            break
    return list(found.values())


def field_error(
    error: Mapping[str, Any], segments: Sequence[int | str], *, within: str = "", say: Sentence | None = None
) -> FieldError:
    """One of pydantic's errors, at a place that is already known."""
    pointer = within + "".join(f"/{segment}" for segment in segments)
    index = next((segment for segment in segments if isinstance(segment, int)), None)
    return FieldError(pointer, _code(error["type"]), say(error, segments) if say else _sentence(error), index)


def _segments(location: Sequence[int | str], document: object, *, absent: bool) -> list[int | str]:
    """The part of a location that stands in the document, up to a key that is not safe to say again."""
    segments: list[int | str] = []
    here: object = document
    for position, part in enumerate(location):
        inside, found = _step(here, part)
        if inside:
            here = found
        elif not (absent and position == len(location) - 1):
            continue  # the tag of a union, or the name of a validator
        if isinstance(part, str) and not SAFE_SEGMENT.fullmatch(part):
            break
        segments.append(part)
    return segments


def _step(here: object, part: int | str) -> tuple[bool, object]:
    if isinstance(here, dict) and part in here:
        return True, here[part]
    if isinstance(here, list) and isinstance(part, int) and part < len(here):
        return True, here[part]
    return False, None


def _code(kind: str) -> str:
    if kind in _CODES:
        return _CODES[kind]
    return "wrong_type" if kind.endswith("_type") else kind


def _sentence(error: Mapping[str, Any]) -> str:
    """A sentence without the input: pydantic's own, but for the one kind that quotes it."""
    if error["type"] == "union_tag_invalid":
        return f"{error['ctx']['discriminator']} is not one of {error['ctx']['expected_tags']}"
    if error["type"] == "missing":
        return f"{error['loc'][-1]} is missing"
    sentence = str(error["msg"]).removeprefix("Value error, ").removeprefix("Assertion failed, ")
    return _UNPRINTABLE.sub("?", sentence)[:500]
