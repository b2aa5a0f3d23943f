"""A site: vessels, one time zone, one hour at which its day starts."""

from __future__ import annotations

from typing import Annotated, Self
from zoneinfo import ZoneInfo, ZoneInfoNotFoundError

from pydantic import AfterValidator, ConfigDict, Field, StringConstraints, model_validator
from pydantic_core import PydanticCustomError

from app.schemas.types import LOCAL_TIME_PATTERN, ZONE_PATTERN, Body, Instant, Text, refusal


class ImbalanceLimit(Body):
    """How much may be missing over one night; the two parts add up."""

    model_config = ConfigDict(json_schema_extra={"examples": [{"kg": 500.0, "pct_of_throughput": 0.1}]})

    kg: float = Field(default=0.0, ge=0, le=1e9, description="Fixed part of the limit [kg]")
    pct_of_throughput: float = Field(
        default=0.0, ge=0, le=100, description="Part that grows with the larger of received and delivered [%]"
    )

    @model_validator(mode="after")
    def _says_something(self) -> Self:
        if not self.model_fields_set:
            raise refusal("missing", "An imbalance_limit names kg, pct_of_throughput, or both")
        return self


def _known_zone(name: str) -> str:
    """A zone of the IANA data base; what a machine calls its own is no zone."""
    try:
        if name not in ("Factory", "localtime") and not name.startswith(("posix", "right/")):
            ZoneInfo(name)
            return name
    except (ZoneInfoNotFoundError, ValueError, OSError):
        pass
    raise PydanticCustomError("unknown_zone", "time_zone is a name of the IANA data base, such as Europe/Oslo")


ZoneName = Annotated[str, StringConstraints(pattern=ZONE_PATTERN, max_length=64), AfterValidator(_known_zone)]
LocalTime = Annotated[str, StringConstraints(pattern=LOCAL_TIME_PATTERN)]


class Conditions(Body):
    """The states that standard volumes refer to, and the air."""

    model_config = ConfigDict(json_schema_extra={"examples": [{"base_temperature_c": 15.0, "elevation_m": 12.0}]})

    base_temperature_c: float = Field(
        default=15.0, ge=-50, le=100, description="Temperature of standard volumes of liquid [°C]"
    )
    base_pressure_kpa_abs: float = Field(
        default=101.325, ge=50, le=200, description="Absolute pressure of standard volumes [kPa]"
    )
    gas_base_temperature_c: float = Field(
        default=0.0, ge=-50, le=100, description="Temperature of standard volumes of gas [°C]"
    )
    elevation_m: float | None = Field(
        default=None,
        ge=-500,
        le=6000,
        description="Height above mean sea level, for the pressure of the air [m]",
    )
    atmospheric_pressure_kpa_abs: float | None = Field(
        default=None, ge=40, le=120, description="Station pressure where no barometer is read [kPa absolute]"
    )
    barometer_uncertainty_kpa: float = Field(
        default=1.0,
        ge=0,
        le=20,
        description="Standard uncertainty of the air's pressure, shared by all vessels [kPa]",
    )

    @model_validator(mode="after")
    def _one_atmosphere(self) -> Self:
        if self.elevation_m is not None and self.atmospheric_pressure_kpa_abs is not None:
            detail = "A site gives elevation_m or atmospheric_pressure_kpa_abs, not both"
            raise refusal("one_of", detail, "atmospheric_pressure_kpa_abs")
        return self


class Site(Conditions):
    """One site as defined from an instant on."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "name": "Northbank terminal",
                    "time_zone": "Europe/Oslo",
                    "day_starts_at": "06:00",
                    "elevation_m": 12.0,
                    "imbalance_limit": {"kg": 500.0, "pct_of_throughput": 0.1},
                }
            ]
        }
    )

    name: Text = Field(description="Name for people")
    time_zone: ZoneName = Field(description="Time zone by its IANA name, such as Europe/Oslo")
    effective_from: Instant | None = Field(
        default=None, description="From when this definition holds; the first may leave it out"
    )
    day_starts_at: LocalTime = Field(default="06:00", description="Local time of day at which the site's day starts")
    false_alarms_per_month: float = Field(
        default=0.5,
        gt=0,
        le=31,
        description="Mean number of nights with any flag when nothing is wrong [per month]",
    )
    window_nights: int = Field(default=30, ge=2, le=400, description="Nights that trends look back over")
    imbalance_limit: ImbalanceLimit | None = Field(default=None, description="How much may be missing over a night")
    close_delay_s: float = Field(
        default=1800.0,
        ge=0,
        le=7 * 86400,
        description="Wait after the end of a day before it is closed by itself [s]",
    )
