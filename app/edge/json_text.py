"""What JSON allows and a measurement cannot: keys that stand twice, numbers that are none, NUL in text.

The parser that fills the models is fast and forgiving: of a key that stands twice the last one wins, in
silence. A reading whose level stands twice is a mistake of its sender, so it is named.
"""

from __future__ import annotations

import json
from typing import Any, NoReturn

from app.errors import SAFE_SEGMENT, FieldError, Unprocessable


class _TwiceError(Exception):
    pass


class _Pairs(list[tuple[str, Any]]):
    """An object of the document with every key that it had."""


def check(text: bytes, *, rows_judged_alone: bool = False) -> None:
    """Raise ``Unprocessable`` where a key stands twice, a number is not finite, or text holds NUL.

    Parameters
    ----------
    text : bytes
        JSON that has been parsed once already, so its nesting is known to be shallow.
    rows_judged_alone : bool
        True for a batch: a number that is not finite is named with its row by the row's own model.
    """
    if b"\\u0000" in text:
        raise _refusal("", "control_character", "Text must not hold the character NUL.")
    try:
        json.loads(text, object_pairs_hook=_once, parse_constant=_no_opinion if rows_judged_alone else _no_number)
    except _TwiceError:
        place = _first_twice(json.loads(text, object_pairs_hook=_Pairs), "") or ""
        detail = "A key stands twice in this object; which of the two counts cannot be known."
        raise _refusal(place, "duplicate_key", detail) from None


def _refusal(pointer: str, code: str, detail: str) -> Unprocessable:
    return Unprocessable(detail, errors=[FieldError(pointer, code, detail)])


def _once(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    found = dict(pairs)
    if len(found) != len(pairs):
        raise _TwiceError
    return found


def _no_number(_: str) -> NoReturn:
    raise _refusal("", "not_finite", "NaN and Infinity are no numbers of JSON; leave the value out.")


def _no_opinion(_: str) -> float:
    return 0.0


def _below(pointer: str, key: str) -> str:
    return f"{pointer}/{key}" if SAFE_SEGMENT.fullmatch(key) else pointer


def _first_twice(value: object, pointer: str) -> str | None:
    """Pointer to an object that has a key twice; it stops above a key that is not safe to say again."""
    if isinstance(value, _Pairs):
        keys = [key for key, _ in value]
        if len(set(keys)) != len(keys):
            return pointer
        inside = [(_below(pointer, key), item) for key, item in value]
    elif isinstance(value, list):
        inside = [(f"{pointer}/{position}", item) for position, item in enumerate(value)]
    else:
        return None
    return next((found for place, item in inside if (found := _first_twice(item, place)) is not None), None)
