"""Why a body was refused: a place, a stable code, and a sentence that never repeats what was sent."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping, Sequence
from typing import Any

from pydantic import ValidationError

from app.schemas.types import FORMS

UNITS: dict[str, str] = {
    "_kg_m3": "kg/m³", "_kg_per_day": "kg/day", "_cm3_mol": "cm³/mol", "_cm6_mol2": "cm⁶/mol²",
    "_g_mol": "g/mol",
    "_kpa_abs": "kPa absolute", "_kpa": "kPa", "_per_kpa": "1/kPa", "_per_k": "1/K", "_per_f": "1/°F",
    "_m3": "m³", "_m": "m", "_mm": "mm", "_c": "°C", "_k": "K", "_kg": "kg", "_pct": "%", "_s": "s",
    "_deg": "°", "_gpa": "GPa", "_bbl": "bbl", "_long_ton": "long ton", "_short_ton": "short ton",
}  # fmt: skip
"""Unit that the end of a field's name stands for; the longest end counts."""
_ENDS = sorted(UNITS, key=len, reverse=True)

CODES: dict[str, str] = {
    "missing": "missing",
    "extra_forbidden": "unknown_field",
    "json_invalid": "malformed_json",
    "finite_number": "not_finite",
    "string_pattern_mismatch": "wrong_form",
    "literal_error": "not_one_of",
    "value_error": "impossible",
    "assertion_error": "impossible",
    **dict.fromkeys(("greater_than", "greater_than_equal", "less_than", "less_than_equal"), "out_of_range"),
    **dict.fromkeys(("string_too_short", "string_too_long", "too_short", "too_long"), "wrong_length"),
    **dict.fromkeys(("int_from_float", "int_parsing_size"), "wrong_type"),
}
"""Pydantic's kinds of error as the few codes that a client acts on; a model's own kind is its own code."""

_NAMES = re.compile(r"[A-Za-z0-9._:-]{1,64}")
_LIMITS = {
    "greater_than": ("gt", "more than"),
    "greater_than_equal": ("ge", "at least"),
    "less_than": ("lt", "less than"),
    "less_than_equal": ("le", "at most"),
}
_TYPES = {
    "float_type": "a number",
    "int_type": "a whole number",
    "int_from_float": "a whole number",
    "string_type": "a text",
    "bool_type": "true or false",
    "tuple_type": "a list",
    "list_type": "a list",
    "dict_type": "an object",
    "model_type": "an object",
    "model_attributes_type": "an object",
}


def unit_of(name: str) -> str:
    """Unit that a field's name ends in; empty where it has none."""
    return next((UNITS[end] for end in _ENDS if name.endswith(end)), "")


def field_of(pointer: str) -> str:
    """Name of the field that a pointer into a row leads to, its steps joined by dots."""
    return pointer.removeprefix("/").replace("/", ".")


def explain(refused: ValidationError) -> list[tuple[str, str, str]]:
    """Every mistake as a JSON pointer, a code, and one sentence with the field, its limit and its unit.

    Parameters
    ----------
    refused : ValidationError
        What one of these models refused.

    Returns
    -------
    list of (str, str, str)
        In the order of the fields, none twice. Nothing of the input is in it but the keys on the way.
    """
    found: dict[tuple[str, str], tuple[str, str, str]] = {}
    for error in refused.errors(include_url=False, include_input=False):
        steps = _steps(error["loc"])
        pointer = "".join(f"/{step}" for step in steps)
        code = code_of(error["type"])
        found.setdefault((pointer, code), (pointer, code, sentence(error, steps)))
    return [one for one in found.values() if not _follows_from_another(one, found)]


def _follows_from_another(one: tuple[str, str, str], found: Iterable[tuple[str, str]]) -> bool:
    """A list is also too short where one of its elements was refused: one mistake is said once."""
    pointer, code, _ = one
    return code == "wrong_length" and any(other.startswith(f"{pointer}/") for other, _ in found)


def code_of(kind: str) -> str:
    """Stable code of one of pydantic's kinds of error."""
    return CODES.get(kind) or ("wrong_type" if kind.endswith("_type") else kind)


def _steps(location: Sequence[int | str]) -> list[int | str]:
    """The location up to a key that is no name: such a key is text of the client's, and is not repeated."""
    steps: list[int | str] = []
    for step in location:
        if step == "[key]" or (isinstance(step, str) and not _NAMES.fullmatch(step)):
            break
        steps.append(step)
    return steps


def sentence(error: Mapping[str, Any], steps: Sequence[int | str]) -> str:
    """One of pydantic's errors in words: the field, its limit and its unit, nothing of the input.

    Parameters
    ----------
    error : mapping
        As ``ValidationError.errors`` lists it.
    steps : sequence
        Its place in the client's document.
    """
    kind = error["type"]
    name = _subject(steps)
    unit = unit_of(next((step for step in reversed(steps) if isinstance(step, str)), ""))
    measure = f" {unit}" if unit else ""
    limits = error.get("ctx", {})
    if kind == "extra_forbidden" and len(steps) < len(error["loc"]):
        return f"{name} has a field that it does not know."
    if kind in _LIMITS:
        key, words = _LIMITS[kind]
        return f"{name} is {words} {limits[key]:.10g}{measure}."
    if kind in _TYPES:
        return f"{name} is {_TYPES[kind]}{f', in {unit}' if unit and kind == 'float_type' else ''}."
    if kind == "string_pattern_mismatch" and (form := FORMS.get(limits["pattern"])):
        return f"{name} is {form}."
    if kind in _SENTENCES and not (kind == "missing" and error["msg"] != _PLAINLY_MISSING):
        return _SENTENCES[kind].format(name=name, unit=f", in {unit}" if unit else "", **limits)
    words = str(error["msg"]).removeprefix("Value error, ").removeprefix("Assertion failed, ")
    return words if words.endswith(".") else f"{words}."


# A rule between fields also says ``missing``, with a sentence of its own.
_PLAINLY_MISSING = "Field required"
_SENTENCES = {
    "missing": "{name} is missing.",
    "extra_forbidden": "{name} is no field of this body.",
    "finite_number": "{name} is a finite number{unit}.",
    "string_pattern_mismatch": "{name} does not have its form: it matches {pattern}.",
    "string_too_short": "{name} has at least {min_length} characters.",
    "string_too_long": "{name} has at most {max_length} characters.",
    "too_short": "{name} has at least {min_length} elements.",
    "too_long": "{name} has at most {max_length} elements.",
    "literal_error": "{name} is one of {expected}.",
    "json_invalid": "The body cannot be read as JSON.",
}


def _subject(steps: Sequence[int | str]) -> str:
    """The field as a sentence names it: ``rows`` at 3 becomes ``rows[3]``."""
    names = [position for position, step in enumerate(steps) if isinstance(step, str)]
    if not names:
        return f"Element {steps[-1]}" if steps else "The body"
    return str(steps[names[-1]]) + "".join(f"[{step}]" for step in steps[names[-1] + 1 :])
