"""A reading: what was measured on one vessel, or on the site, at one instant."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Annotated, Any, Literal, Self

from pydantic import ConfigDict, Discriminator, Field, Tag, TypeAdapter, ValidationError, model_validator
from pydantic_core import from_json

from app.schemas.errors import explain, field_of
from app.schemas.types import (
    QUANTITIES,
    UNTAGGED,
    Answer,
    AnsweredInstant,
    Body,
    Composition,
    Id,
    Instant,
    Items,
    QualityWord,
    Quantity,
    Source,
    Text,
    refusal,
)


def _word_or_map(value: object) -> str:
    return "map" if isinstance(value, dict) else "word"


Quality = Annotated[
    Annotated[QualityWord, Tag("word")] | Annotated[dict[Quantity, QualityWord], Tag("map")],
    Discriminator(_word_or_map),
    UNTAGGED,
]

ERRORS_LISTED = 1_000
"""Errors of a batch that are listed; all are counted."""
QUANTITIES_OF_SITE = frozenset({"ambient_temperature_c", "barometric_pressure_kpa_abs"})
"""What a reading without a vessel may hold."""
_EITHER = (("level_m", "ullage_m"), ("pressure_kpa", "pressure_kpa_abs"))


class Values(Body):
    """The quantities of a reading; each is kept on its own. Limits are what no vessel could pass."""

    source: Source = Field(
        default="", description="Where the values come from, such as radar, hand or laboratory"
    )
    quality: Quality = Field(default="good", description="One word for all, or a map from quantity to word")

    level_m: float | None = Field(default=None, ge=-10, le=150, description="Level above the zero [m]")
    ullage_m: float | None = Field(
        default=None, ge=-10, le=150, description="Distance from the reference point down to the surface [m]"
    )
    liquid_volume_m3: float | None = Field(
        default=None, ge=-1e4, le=1e7, description="Volume of liquid as indicated [m³]"
    )
    liquid_volume_pct: float | None = Field(
        default=None, ge=-10, le=150, description="Volume of liquid in parts of the capacity [%]"
    )
    differential_pressure_kpa: float | None = Field(
        default=None,
        ge=-1e3,
        le=1e5,
        description="Pressure at the bottom tap less that of the vapour space [kPa]",
    )
    weighed_mass_kg: float | None = Field(
        default=None, ge=-1e5, le=1e9, description="Mass by load cells; counts as it stands [kg]"
    )
    free_water_level_m: float | None = Field(
        default=None, ge=-10, le=150, description="Level of free water above the zero [m]"
    )
    liquid_temperature_c: float | None = Field(
        default=None, ge=-273.15, le=1000, description="Mean temperature of the liquid [°C]"
    )
    ambient_temperature_c: float | None = Field(
        default=None, ge=-100, le=100, description="Temperature of the air outside [°C]"
    )
    vapour_temperature_c: float | None = Field(
        default=None, ge=-273.15, le=1000, description="Temperature of the vapour or gas [°C]"
    )
    pressure_kpa: float | None = Field(
        default=None,
        ge=-120,
        le=1e6,
        description="Gauge pressure of the space above the liquid, or of the gas [kPa]",
    )
    pressure_kpa_abs: float | None = Field(
        default=None, ge=0, le=1e6,
        description="Absolute pressure of the space above the liquid, or of the gas [kPa absolute]",
    )  # fmt: skip
    barometric_pressure_kpa_abs: float | None = Field(
        default=None, ge=40, le=120, description="Station pressure of the air [kPa absolute]"
    )
    observed_density_kg_m3: float | None = Field(
        default=None, gt=0, le=25000, description="Density of a sample, mass over volume in vacuo [kg/m³]"
    )
    observed_density_temperature_c: float | None = Field(
        default=None,
        ge=-273.15,
        le=1000,
        description="Temperature of the sample when its density was read [°C]",
    )
    observed_density_pressure_kpa_abs: float | None = Field(
        default=None,
        ge=0,
        le=1e6,
        description="Absolute pressure of the sample when its density was read [kPa absolute]",
    )
    observed_density_by: Literal["digital", "hydrometer"] | None = Field(
        default=None, description="Instrument of the density; a hydrometer is of glass, which expands"
    )
    sediment_water_pct: float | None = Field(
        default=None, ge=0, le=100, description="Sediment and water, suspended [%]"
    )
    density_basis: Literal["wet", "dry"] | None = Field(
        default=None, description="Whether the observed density is of the wet sample or of the dry substance"
    )
    liquid_composition: Composition | None = Field(
        default=None, description="Mole fractions of the liquid by component; sum 1 ± 0.01 [1]"
    )
    vapour_composition: Composition | None = Field(
        default=None, description="Mole fractions of the vapour by component; sum 1 ± 0.01 [1]"
    )
    roof_load_kg: float | None = Field(
        default=None, ge=0, le=1e7, description="Rain, snow and other load on the floating roof [kg]"
    )
    empty: bool | None = Field(default=None, description="True: a stock-take of 0 ± 0; false says nothing")
    sample: Text | None = Field(
        default=None, description="Id of the sample; values that cite one share its error"
    )
    sample_holds_from: Instant | None = Field(
        default=None, description="From when the sample stands for the content; taken_at if left out"
    )

    @model_validator(mode="after")
    def _means_one_thing(self) -> Self:
        for one, other in _EITHER:
            if getattr(self, one) is not None and getattr(self, other) is not None:
                raise refusal("one_of", f"A reading gives {one} or {other}, not both", other)
        return self

    def named(self) -> list[str]:
        """Quantities that the reading gives a value of; null is the same as leaving out."""
        return [
            name
            for name in self.model_fields_set
            if name in QUANTITIES and getattr(self, name) is not None and getattr(self, name) is not False
        ]


class Reading(Values):
    """One reading, as posted."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "vessel": "tk-12",
                    "taken_at": "2026-03-14T06:00:00+01:00",
                    "source": "radar",
                    "quality": "good",
                    "level_m": 8.231,
                    "liquid_temperature_c": 17.4,
                },
                {"taken_at": "2026-03-14T06:00:00+01:00", "barometric_pressure_kpa_abs": 100.9},
            ]
        }
    )

    vessel: Id | None = Field(default=None, description="The vessel; left out, the reading is the site's")
    taken_at: Instant = Field(description="When it was measured")
    corrects: Instant | None = Field(
        default=None, description="recorded_at of the value that this one replaces, to restore an earlier one"
    )

    @model_validator(mode="after")
    def _belongs_somewhere(self) -> Self:
        named = self.named()
        if not named:
            raise refusal("no_value", "A reading gives a value of at least one quantity")
        site = [name for name in named if name in QUANTITIES_OF_SITE]
        if self.vessel is None and len(site) < len(named):
            detail = (
                "Without a vessel a reading holds ambient_temperature_c and barometric_pressure_kpa_abs only"
            )
            raise refusal("missing", detail, "vessel")
        if self.vessel is not None and "barometric_pressure_kpa_abs" in named:
            detail = "barometric_pressure_kpa_abs is the site's: send it in a reading without vessel"
            raise refusal("quantity_of_site", detail, "barometric_pressure_kpa_abs")
        return self


class ReadingBatch(Body):
    """Readings posted together; each row is judged on its own."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "readings": [
                        {"vessel": "tk-12", "taken_at": "2026-03-14T06:00:00+01:00", "level_m": 8.231},
                        {"vessel": "tk-14", "taken_at": "2026-03-14T06:00:00+01:00", "ullage_m": 4.02},
                    ]
                }
            ]
        }
    )

    readings: Items[Reading] = Field(description="The rows, in the order in which they count")


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


_ROW = TypeAdapter(Reading)
_ROWS = TypeAdapter(list[Reading])


def validate_rows(raw: Sequence[object]) -> tuple[list[tuple[int, Reading]], list[RowError]]:
    """The good rows with their positions, and what is wrong with the others.

    All rows at once first, which is the usual case; one by one where any of them is bad.

    Parameters
    ----------
    raw : sequence of object
        Rows as parsed from JSON, or put together from another format with the same types.
    """
    try:
        return list(enumerate(_ROWS.validate_python(list(raw)))), []
    except ValidationError:
        pass
    rows: list[tuple[int, Reading]] = []
    errors: list[RowError] = []
    for index, one in enumerate(raw):
        try:
            rows.append((index, _ROW.validate_python(one)))
        except ValidationError as refused:
            errors.extend(
                RowError(index=index, field=field_of(pointer), code=code, detail=detail)
                for pointer, code, detail in explain(refused)
            )
    return rows, errors


class _Envelope(Body):
    """A batch whose rows are not looked at yet."""

    readings: Items[Any]


def validate_batch(text: bytes) -> tuple[list[tuple[int, Reading]], list[RowError]]:
    """Rows of a JSON batch: like ``validate_rows``, from the bytes of the body.

    A body that is no JSON object with a list ``readings`` raises pydantic's ``ValidationError``.
    """
    try:
        return list(enumerate(ReadingBatch.model_validate_json(text).readings)), []
    except ValidationError as refused:
        if any(error["type"] == "json_invalid" for error in refused.errors(include_url=False)):
            raise
    return validate_rows(_Envelope.model_validate(from_json(text)).readings)
