"""What a vessel's readings are worth: errors of instruments, order of sources, ages, assumed values."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Annotated, Literal

from pydantic import AfterValidator, ConfigDict, Discriminator, Field, Tag, ValidationError

from app.schemas.reading import Values
from app.schemas.types import UNTAGGED, Body, Instant, Measured, Quantity, Source, Text, refusal

DAY_S = 86_400.0
LONGEST_AGE_S = 35 * DAY_S
"""Age that no level, pressure or temperature may pass; every night touched by late data is within it."""
UNTIL_REPLACED = frozenset(
    {
        "free_water_level_m", "observed_density_kg_m3", "observed_density_temperature_c",
        "observed_density_pressure_kpa_abs", "sediment_water_pct", "liquid_composition", "vapour_composition",
    }
)  # fmt: skip
"""Quantities of the laboratory, and free water: they may hold until replaced, and longer than 35 days."""


class Instrument(Body):
    """Errors of one instrument, in the unit of its quantity; each is one standard uncertainty."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "random": 0.001, "systematic": 0.002, "offset": -0.011,
                    "calibrated_at": "2026-03-14T14:00:00+01:00",
                }
            ]
        }
    )  # fmt: skip

    random: float | None = Field(
        default=None, ge=0, le=1e6, description="Fresh at every reading [unit of the quantity]"
    )
    systematic: float | None = Field(
        default=None,
        ge=0,
        le=1e6,
        description="One unknown offset while calibrated_at stands [unit of the quantity]",
    )
    offset: float | None = Field(
        default=None, ge=-1e6, le=1e6, description="Correction added to each reading [unit of the quantity]"
    )
    calibrated_at: Instant | None = Field(default=None, description="When its unknown offset was last renewed")
    instrument: Text | None = Field(default=None, description="Name, where several vessels share it and its error")
    local: float | None = Field(
        default=None, ge=0, le=100, description="Error of a capacity table that varies along the level [%]"
    )
    local_span_m: float | None = Field(
        default=None, gt=0, le=200, description="Length over which that error changes; 1 m if left out [m]"
    )
    expansion_per_k: float | None = Field(
        default=None, ge=0, le=1e-3,
        description="Linear expansion of a tape, of level_m and ullage_m only: the level is then corrected for its "
        "temperature; left out, as of a radar, it is not [1/K]",
    )  # fmt: skip
    at_temperature_c: float | None = Field(
        default=None, ge=-60, le=100,
        description="Temperature at which the tape's marks are true; 20 °C if left out [°C]",
    )  # fmt: skip


def _of_their_kind(instruments: dict[str, Instrument]) -> dict[str, Instrument]:
    for quantity, one in instruments.items():
        wrong = ("random", "offset") if quantity == "capacity_pct" else ("local", "local_span_m")
        for name in wrong:
            if getattr(one, name) is not None:
                owner = "no part of capacity_pct" if quantity == "capacity_pct" else "a part of capacity_pct only"
                raise refusal("conflicting", f"{name} is {owner}", quantity, name)
        for name in ("expansion_per_k", "at_temperature_c"):
            if getattr(one, name) is not None and quantity not in ("level_m", "ullage_m"):
                raise refusal("conflicting", f"{name} is a part of level_m and ullage_m only", quantity, name)
    return instruments


Instruments = Annotated[
    dict[Literal[Measured, "capacity_pct"], Instrument],
    AfterValidator(_of_their_kind),
]


class SourceOfValues(Body):
    """A source that readings come from; the order of sources is the order in which they count."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "source": "hand",
                    "instruments": {"level_m": {"random": 0.0015, "systematic": 0.001, "instrument": "tape 7"}},
                }
            ]
        }
    )

    source: Source = Field(description="Name of the source, as readings give it")
    instruments: Instruments = Field(
        default_factory=dict, description="Errors of this source's own instruments by quantity"
    )


class Assumed(Body):
    """A value for what is never read."""

    model_config = ConfigDict(json_schema_extra={"examples": [{"value": 0.0, "standard_uncertainty": 0.2}]})

    value: float = Field(description="The value [unit of the quantity]")
    standard_uncertainty: float = Field(
        default=0.0, ge=0, le=1e6, description="Its standard uncertainty [unit of the quantity]"
    )


def _could_be_read(assumed: dict[str, Assumed]) -> dict[str, Assumed]:
    """An assumed value keeps the limits of a reading."""
    for quantity, one in assumed.items():
        try:
            Values.model_validate({quantity: one.value})
        except ValidationError:
            detail = f"value keeps the limits that a reading of {quantity} has"
            raise refusal("out_of_range", detail, quantity, "value") from None
    return assumed


def _no_older_than_may_be(ages: dict[str, float | None]) -> dict[str, float | None]:
    for quantity, age in ages.items():
        if quantity in UNTIL_REPLACED:
            continue
        if age is None:
            raise refusal("impossible", f"{quantity} cannot hold until replaced; give an age in s", quantity)
        if age > LONGEST_AGE_S:
            raise refusal("out_of_range", f"{quantity} holds at most 35 days, {LONGEST_AGE_S:.0f} s", quantity)
    return ages


def _number_or_map(value: object) -> str:
    return "map" if isinstance(value, Mapping) else "number"


Age = Annotated[float, Field(gt=0, le=100 * 366 * DAY_S)]
MaxAge = Annotated[
    Annotated[float, Field(gt=0, le=LONGEST_AGE_S), Tag("number")]
    | Annotated[dict[Quantity, Age | None], AfterValidator(_no_older_than_may_be), Tag("map")],
    Discriminator(_number_or_map),
    UNTAGGED,
]
Assumptions = Annotated[dict[Measured, Assumed], AfterValidator(_could_be_read)]
