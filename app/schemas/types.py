"""The words that every body is built of: ids, instants, texts, compositions, and two bases.

``Body`` is what a client sends: strict, closed, frozen. ``Answer`` is what the service says; it also
takes an instant as the integer that the inside works with. Both write an instant as text with ``Z``.
"""

from __future__ import annotations

import json
import math
import re
from collections.abc import Collection
from datetime import UTC, datetime, timedelta
from typing import Annotated, Any, Literal, TypeVar, get_args

from pydantic import (
    AfterValidator,
    BaseModel,
    BeforeValidator,
    ConfigDict,
    Field,
    PlainSerializer,
    Strict,
    StringConstraints,
    ValidationError,
    ValidatorFunctionWrapHandler,
    WithJsonSchema,
    WrapValidator,
)
from pydantic_core import InitErrorDetails, PydanticCustomError

T = TypeVar("T")


class Body(BaseModel):
    """A body that a client sends: nothing is guessed, nothing unknown is taken, nothing changes later."""

    model_config = ConfigDict(
        strict=True,
        extra="forbid",
        frozen=True,
        allow_inf_nan=False,
        validate_by_name=False,
        serialize_by_alias=True,
    )


class Answer(BaseModel):
    """A body that the service answers with."""

    model_config = ConfigDict(
        strict=True,
        extra="forbid",
        frozen=True,
        allow_inf_nan=False,
        validate_by_name=True,
        serialize_by_alias=True,
    )


# --- instants -----------------------------------------------------------------------------------

EPOCH = datetime(1970, 1, 1, tzinfo=UTC)
FIRST_YEAR, LAST_YEAR = 1970, 2200
# RFC 3339 date-time; the offset may be missing here so that a naive instant gets its own refusal.
_INSTANT = re.compile(r"(\d{4}-\d\d-\d\d)[Tt](\d\d:\d\d:\d\d)(?:\.(\d{1,9}))?([Zz]|[+-]\d\d:\d\d)?", re.ASCII)
_FORM = "an RFC 3339 text with an offset, such as 2026-03-14T06:00:00+01:00"


def parse_instant(text: object) -> int:
    """Microseconds since 1970 UTC of an RFC 3339 instant.

    Up to nine digits of a second are read (historians stamp in steps of 100 ns); what is below a
    microsecond is cut off toward the past, so that one stamp always gives the same instant. A naive
    instant is refused as ``no_offset``, anything else that is no instant of these years as
    ``not_an_instant``; a leap second and 24:00 are among them.
    """
    if not isinstance(text, str):
        raise PydanticCustomError("not_an_instant", f"An instant is {_FORM}; a number is not read as one")
    found = _INSTANT.fullmatch(text)
    if found is None:
        raise PydanticCustomError("not_an_instant", f"An instant is {_FORM}")
    day, clock, fraction, offset = found.groups()
    if offset is None:
        raise PydanticCustomError("no_offset", f"An instant needs its offset from UTC: {_FORM}")
    try:
        whole = datetime.fromisoformat(f"{day}T{clock}{'+00:00' if offset in 'Zz' else offset}")
        microseconds = (whole - EPOCH) // timedelta(seconds=1) * 1_000_000
    except (ValueError, OverflowError):
        raise PydanticCustomError("not_an_instant", "There is no such date, time or offset") from None
    microseconds += int(fraction[:6].ljust(6, "0")) if fraction else 0
    if not _FIRST <= microseconds < _END:
        raise PydanticCustomError("not_an_instant", f"An instant lies in the years {FIRST_YEAR} to {LAST_YEAR}")
    return microseconds


_FIRST = 0
_END = (datetime(LAST_YEAR + 1, 1, 1, tzinfo=UTC) - EPOCH) // timedelta(seconds=1) * 1_000_000


def format_instant(microseconds: int) -> str:
    """RFC 3339 text in UTC; a fraction only where there is one."""
    moment = EPOCH + timedelta(microseconds=microseconds)
    return moment.isoformat(timespec="microseconds" if microseconds % 1_000_000 else "seconds")[:-6] + "Z"


def _instant_or_microseconds(value: object) -> int:
    if isinstance(value, int) and not isinstance(value, bool):
        return value
    return parse_instant(value)


_AS_TEXT = PlainSerializer(format_instant, return_type=str)
_INSTANT_SCHEMA = WithJsonSchema({"type": "string", "format": "date-time", "examples": ["2026-03-14T06:00:00+01:00"]})
Instant = Annotated[int, BeforeValidator(parse_instant), _AS_TEXT, _INSTANT_SCHEMA]
AnsweredInstant = Annotated[int, BeforeValidator(_instant_or_microseconds), _AS_TEXT, _INSTANT_SCHEMA]


# --- texts --------------------------------------------------------------------------------------

ID_PATTERN = r"^[a-z0-9][a-z0-9._-]{0,62}$"
# No control characters: NUL cannot be stored everywhere, and the others have no place in one line.
PLAIN_PATTERN = r"^[^\u0000-\u001f\u007f-\u009f]*$"
Id = Annotated[str, StringConstraints(pattern=ID_PATTERN)]
END_PATTERN = r"^(boundary:)?[a-z0-9][a-z0-9._-]{0,62}$"
COMPONENT_PATTERN = r"^[a-z0-9][a-z0-9-]{0,39}$"
End = Annotated[str, StringConstraints(pattern=END_PATTERN)]
ComponentId = Annotated[str, StringConstraints(pattern=COMPONENT_PATTERN)]
Text = Annotated[str, StringConstraints(min_length=1, max_length=200, pattern=PLAIN_PATTERN)]
LOCAL_TIME_PATTERN = r"^([01][0-9]|2[0-3]):[0-5][0-9]$"
ZONE_PATTERN = r"^[A-Za-z][A-Za-z0-9_+-]*(/[A-Za-z0-9_+-]+)*$"
DAY_PATTERN = r"^(19[7-9][0-9]|2[01][0-9]{2})-[0-9]{2}-[0-9]{2}$"
RECONCILIATION_PATTERN = r"^([0-9]{4}-[0-9]{2}-[0-9]{2}|[0-9]{8}T[0-9]{6}Z--[0-9]{8}T[0-9]{6}Z)(\.[1-9][0-9]{0,8})?$"
FORMS: dict[str, str] = {
    ID_PATTERN: "1 to 63 of a-z, 0-9, dot, underscore and hyphen, a letter or digit first",
    END_PATTERN: "the id of a vessel, or boundary: and a name of the same form",
    COMPONENT_PATTERN: "the name of a component in small letters, such as carbon-dioxide",
    PLAIN_PATTERN: "one line of plain text, without control characters",
    LOCAL_TIME_PATTERN: "an hour and a minute of the day, from 00:00 to 23:59, such as 06:00",
    ZONE_PATTERN: "a name of the IANA data base, such as Europe/Oslo",
    RECONCILIATION_PATTERN: "a local date or two instants in basic UTC, with a revision or without: 2026-03-14, "
    "2026-03-14.2, 20260301T050000Z--20260401T050000Z",
    DAY_PATTERN: "a local date such as 2026-03-14, in the years 1970 to 2199",
}
"""What each pattern asks for, in words."""


def worded(pattern: str) -> tuple[AfterValidator, WithJsonSchema]:
    """The form of a parameter, which its refusal tells in words where the framework would show the pattern."""

    def check(text: str) -> str:
        if re.fullmatch(pattern, text) is None:
            raise PydanticCustomError("wrong_form", "It is {form}", {"form": FORMS[pattern]})
        return text

    return AfterValidator(check), WithJsonSchema({"type": "string", "pattern": pattern})


# Where a value comes from may be left out, and is then the empty text.
Source = Annotated[str, StringConstraints(max_length=63, pattern=PLAIN_PATTERN)]

# A list; taken as a tuple so that a body never changes. Its elements stay strict.
Items = Annotated[tuple[T, ...], Strict(False)]


# --- quantities ---------------------------------------------------------------------------------

Measured = Literal[
    "level_m", "ullage_m", "liquid_volume_m3", "liquid_volume_pct", "differential_pressure_kpa",
    "weighed_mass_kg", "free_water_level_m", "liquid_temperature_c", "ambient_temperature_c",
    "vapour_temperature_c", "pressure_kpa", "pressure_kpa_abs", "barometric_pressure_kpa_abs",
    "observed_density_kg_m3", "observed_density_temperature_c", "observed_density_pressure_kpa_abs",
    "sediment_water_pct", "roof_load_kg",
]  # fmt: skip
"""Quantities of a reading that are one number."""
Quantity = Literal[Measured, "liquid_composition", "vapour_composition", "empty"]
MEASURED: tuple[str, ...] = get_args(Measured)
QUANTITIES: tuple[str, ...] = get_args(Quantity)
QualityWord = Literal["good", "uncertain", "bad"]


def _sums_to_one(composition: dict[str, float]) -> dict[str, float]:
    if not 0.99 <= math.fsum(composition.values()) <= 1.01:
        raise PydanticCustomError("fractions_sum", "Mole fractions sum to 1 within 0.01; these do not")
    return composition


Fraction = Annotated[float, Field(ge=0, le=1)]
Composition = Annotated[
    dict[ComponentId, Fraction],
    Field(min_length=1, max_length=50, description="Mole fractions by component; sum 1 ± 0.01 [1]"),
    AfterValidator(_sums_to_one),
]


# --- refusals -----------------------------------------------------------------------------------


def refusal(code: str, detail: str, *place: str | int) -> ValidationError:
    """What a rule between several fields raises, pointing at one of them.

    Parameters
    ----------
    code : str
        Stable word for the kind of error.
    detail : str
        One sentence that repeats nothing of what was sent.
    place : str or int
        Steps from the body that the rule belongs to; none points at the body itself.
    """
    error = InitErrorDetails(type=PydanticCustomError(code, "{detail}", {"detail": detail}), loc=place, input=None)
    return ValidationError.from_exception_data("body", [error])


# --- answers ------------------------------------------------------------------------------------


def _null_for_missing(value: object) -> object:
    return None if isinstance(value, float) and math.isnan(value) else value


def is_none(value: object) -> bool:
    """For ``Field(exclude_if=is_none)``: a block that was not asked for or not computed is absent."""
    return value is None


# A number of an answer. Missing is NaN in the models and null on the wire; infinite is neither.
Known = Annotated[float | None, BeforeValidator(_null_for_missing)]
Warned = Literal[
    "two_sources", "sources_disagree", "input_uncertain", "input_assumed", "atmosphere_assumed",
    "sample_predates_receipt", "water_predates_receipt", "roof_landing_zone", "level_unchanged",
    "saturation_low", "saturation_high", "vapour_saturated", "vapour_left_out", "guard_wide", "guard_refused",
    "outside_table", "outside_vessel", "outside_method", "liquid_full",
]  # fmt: skip
"""Codes of warnings."""


# --- choices ------------------------------------------------------------------------------------


def _untagged(value: object, handler: ValidatorFunctionWrapHandler) -> object:
    """Errors of a choice point into the client's document, where the choice's tag does not stand."""
    try:
        return handler(value)
    except ValidationError as refused:
        raise ValidationError.from_exception_data(
            refused.title, [_without_tag(error) for error in refused.errors(include_url=False)]
        ) from None


def _without_tag(error: Any) -> InitErrorDetails:
    kind, place, limits = error["type"], error["loc"][1:], dict(error.get("ctx", {}))
    detail = error["msg"]
    if kind in ("union_tag_invalid", "union_tag_not_found"):  # pydantic's sentence would quote the tag
        name = limits.pop("discriminator").strip("'")
        place = (name,)
        kind = "missing" if kind == "union_tag_not_found" else "not_one_of"
        expected = limits.get("expected_tags")
        limits.pop("tag", None)
        detail = f"{name} is one of {expected}" if expected else f"{name} is missing"
    own = PydanticCustomError(kind, "{detail}", {**limits, "detail": detail})
    return InitErrorDetails(type=own, loc=place, input=None)


UNTAGGED = WrapValidator(_untagged)


# --- what was sent ------------------------------------------------------------------------------


def canonical(body: BaseModel, *, without: Collection[str] = ()) -> str:
    """What was sent, in one spelling: defaults not filled in, keys sorted, instants in UTC.

    Two bodies that say the same give the same text, so a repeat is recognised; a default that changes
    later is no revision of a body that never named it.

    Parameters
    ----------
    body : BaseModel
        A validated body.
    without : collection of str
        Fields that stand elsewhere, and make no difference here: an id that the path also names.
    """
    sent = body.model_dump(mode="json", exclude_unset=True, by_alias=True, exclude=set(without))
    return json.dumps(sent, sort_keys=True, separators=(",", ":"), ensure_ascii=False, allow_nan=False)
