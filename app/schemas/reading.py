"""A reading: what was measured on one vessel, or on the site, at one instant."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Annotated, Literal, Self

from pydantic import ConfigDict, Discriminator, Field, Tag, ValidationError, model_validator

from app.schemas.batch import RowError, rows_in, validate_each
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
    Known,
    QualityWord,
    Quantity,
    Source,
    Text,
    is_none,
    refusal,
)


def _word_or_map(value: object) -> str:
    return "map" if isinstance(value, dict) else "word"


Quality = Annotated[
    Annotated[QualityWord, Tag("word")] | Annotated[dict[Quantity, QualityWord], Tag("map")],
    Discriminator(_word_or_map),
    UNTAGGED,
]

QUANTITIES_OF_SITE = frozenset({"ambient_temperature_c", "barometric_pressure_kpa_abs"})
"""What a reading without a vessel may hold."""
_EITHER = (("level_m", "ullage_m"), ("pressure_kpa", "pressure_kpa_abs"))


class Values(Body):
    """The quantities of a reading; each is kept on its own. Limits are what no vessel could pass."""

    model_config = ConfigDict(json_schema_extra={"examples": [{"source": "radar", "level_m": 8.231}]})

    source: Source = Field(default="", description="Where the values come from, such as radar, hand or laboratory")
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
        default=None, ge=1e-3, le=25000, description="Density of a sample, mass over volume in vacuo [kg/m³]"
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
    sample: Text | None = Field(default=None, description="Id of the sample; values that cite one share its error")
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
            detail = "Without a vessel a reading holds ambient_temperature_c and barometric_pressure_kpa_abs only"
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


class StoredValue(Answer):
    """One value of a reading, as stored."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "vessel": "tk-12", "quantity": "level_m", "source": "radar",
                    "taken_at": "2026-03-14T05:00:00Z", "value": 8.231, "quality": "good",
                    "recorded_at": "2026-03-14T05:00:02.417311Z", "revision": 1,
                }
            ]
        }
    )  # fmt: skip

    vessel: str | None = Field(description="The vessel; null for the site's own")
    quantity: Quantity = Field(description="The quantity; its name ends in its unit")
    source: str = Field(description="Where the value comes from")
    taken_at: AnsweredInstant = Field(description="When it was measured")
    value: Known = Field(default=None, description="The value [unit of the quantity]")
    composition: dict[str, float] | None = Field(
        default=None, exclude_if=is_none, description="Mole fractions by component, of a composition [1]"
    )
    sample: str | None = Field(default=None, exclude_if=is_none, description="The sample that the value cites")
    sample_holds_from: AnsweredInstant | None = Field(
        default=None, exclude_if=is_none, description="From when the sample stands for the content, where it was said"
    )
    observed_density_by: Literal["digital", "hydrometer"] | None = Field(
        default=None, exclude_if=is_none, description="Instrument of a density, where it was said"
    )
    density_basis: Literal["wet", "dry"] | None = Field(
        default=None, exclude_if=is_none, description="Of the wet sample or of the dry substance, where it was said"
    )
    quality: QualityWord = Field(description="Its quality; bad: withdrawn")
    recorded_at: AnsweredInstant = Field(description="When it was recorded")
    revision: int = Field(ge=1, description="1 for the first value of this instant, then counted up")


def validate_rows(raw: Sequence[object]) -> tuple[list[tuple[int, Reading]], list[RowError]]:
    """Readings with their positions in the batch, and what is wrong with the rows that are none.

    Parameters
    ----------
    raw : sequence of object
        Rows as parsed from JSON, or put together from another format with the same types.
    """
    return validate_each(Reading, raw)


def validate_batch(text: bytes) -> tuple[list[tuple[int, Reading]], list[RowError]]:
    """Rows of a JSON batch: like ``validate_rows``, from the bytes of the body.

    A body that is no object with a list ``readings`` raises pydantic's ``ValidationError``.
    """
    try:
        return list(enumerate(ReadingBatch.model_validate_json(text).readings)), []
    except ValidationError:
        return validate_rows(rows_in(ReadingBatch, "readings", text))
