"""A transfer: substance moved between two vessels, or between a vessel and a boundary."""

from __future__ import annotations

from typing import Annotated, Literal, Self

from pydantic import ConfigDict, Discriminator, Field, Tag, ValidationError, model_validator

from app.schemas.batch import RowError, rows_in, validate_each
from app.schemas.types import UNTAGGED, Answer, AnsweredInstant, Body, End, Id, Instant, Items, refusal

LONGEST_S = 31 * 86_400
"""How long a transfer lasts at most; transfers that touch a night are found by it."""
QUANTITIES_OF_TRANSFER = ("mass_kg", "weight_in_air_kg", "standard_volume_m3", "observed_volume_m3")
NEEDS_UNCERTAINTY = frozenset({"weighbridge", "ship", "statement"})


class MovedQuantity(Body):
    """A quantity in one of four ways."""

    model_config = ConfigDict(json_schema_extra={"examples": [{"mass_kg": 21840.0}]})

    mass_kg: float | None = Field(default=None, ge=0, le=1e10, description="Mass [kg]")
    weight_in_air_kg: float | None = Field(default=None, ge=0, le=1e10, description="Weight in air [kg]")
    standard_volume_m3: float | None = Field(
        default=None, ge=0, le=1e7, description="Volume at the site's base temperature and pressure [m³]"
    )
    observed_volume_m3: float | None = Field(
        default=None, ge=0, le=1e7, description="Volume at the temperature and pressure of the transfer [m³]"
    )

    def quantities(self) -> list[str]:
        """Names of the quantities that are given."""
        return [name for name in QUANTITIES_OF_TRANSFER if getattr(self, name) is not None]


class Progress(MovedQuantity):
    """The running quantity at an instant on the way."""

    model_config = ConfigDict(
        json_schema_extra={"examples": [{"at": "2026-03-14T06:00:00+01:00", "standard_volume_m3": 17990.0}]}
    )

    at: Instant = Field(description="When the running quantity was read")


class VapourReturn(Body):
    """Vapour that came back: its mass, or its volume with temperature and pressure."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {"mass_kg": 120.0},
                {"volume_m3": 40.0, "temperature_c": 18.0, "pressure_kpa": 610.0},
            ]
        }
    )

    mass_kg: float | None = Field(default=None, ge=0, le=1e9, description="Mass [kg]")
    volume_m3: float | None = Field(default=None, ge=0, le=1e7, description="Volume [m³]")
    temperature_c: float | None = Field(default=None, ge=-273.15, le=1000, description="Its temperature [°C]")
    pressure_kpa: float | None = Field(default=None, ge=-120, le=1e6, description="Its gauge pressure [kPa]")

    @model_validator(mode="after")
    def _one_way(self) -> Self:
        if (self.mass_kg is None) == (self.volume_m3 is None):
            raise refusal("one_of", "vapour_return gives mass_kg or volume_m3, exactly one")
        for name in ("temperature_c", "pressure_kpa"):
            if (getattr(self, name) is None) != (self.volume_m3 is None):
                raise refusal("missing", "temperature_c and pressure_kpa come with volume_m3", name)
        return self


def _word_or_object(value: object) -> str:
    return "word" if isinstance(value, str) else "object"


SameVolume = Annotated[
    Annotated[VapourReturn, Tag("object")] | Annotated[Literal["same_volume"], Tag("word")],
    Discriminator(_word_or_object),
    UNTAGGED,
]


class Transfer(MovedQuantity):
    """One transfer, net: what ``from`` lost and ``to`` gained of the substance."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "id": "ship-0313",
                    "from": "boundary:jetty-1",
                    "to": "tk-12",
                    "by": "meter",
                    "meter": "m-7",
                    "started_at": "2026-03-13T20:00:00+01:00",
                    "ended_at": "2026-03-14T16:00:00+01:00",
                    "standard_volume_m3": 35500.0,
                    "density_kg_m3": 745.2,
                    "density_temperature_c": 15.0,
                    "sediment_water_pct": 0.02,
                    "progress": [{"at": "2026-03-14T06:00:00+01:00", "standard_volume_m3": 17990.0}],
                }
            ]
        }
    )

    id: Id | None = Field(default=None, description="Its id; in a batch, where no path names it")
    from_: End = Field(
        alias="from", description="The vessel or boundary that lost it, such as tk-12 or boundary:jetty-1"
    )
    to: End = Field(description="The vessel or boundary that gained it")
    by: Literal["meter", "weighbridge", "ship", "gauging", "statement"] = Field(description="How it was measured")
    meter: Id | None = Field(default=None, description="The meter, where it was measured by one")
    started_at: Instant = Field(description="When it started")
    ended_at: Instant | None = Field(default=None, description="When it ended; left out: still running")
    unmetered: bool = Field(default=False, description="True: the quantity is unknown")
    temperature_c: float | None = Field(
        default=None, ge=-273.15, le=1000, description="Temperature of the observed volume [°C]"
    )
    pressure_kpa: float | None = Field(
        default=None, ge=-120, le=1e6, description="Gauge pressure of the observed volume [kPa]"
    )
    density_kg_m3: float | None = Field(
        default=None,
        ge=1e-3,
        le=25000,
        description="Density in vacuo; the vessel's at that time if left out [kg/m³]",
    )
    density_temperature_c: float | None = Field(
        default=None, ge=-273.15, le=1000, description="Temperature of the density [°C]"
    )
    sediment_water_pct: float = Field(
        default=0.0, ge=0, le=100, description="Sediment and water, which the net quantity leaves out [%]"
    )
    mass_uncertainty_kg: float | None = Field(
        default=None, ge=0, le=1e10, description="Standard uncertainty of the mass [kg]"
    )
    progress: Items[Progress] = Field(
        default=(), max_length=10_000, description="The running quantity at instants on the way"
    )
    vapour_return: SameVolume | None = Field(
        default=None, description="Vapour that came back, or same_volume: the volume of the liquid moved"
    )
    of: Literal["water"] | None = Field(
        default=None,
        description="water: free water, which is no part of the balance; left out: the substance",
    )
    void: bool = Field(default=False, description="True strikes the ticket; it stays readable")

    @model_validator(mode="after")
    def _goes_somewhere(self) -> Self:
        if self.from_ == self.to:
            raise refusal("impossible", "from and to are two different ends", "to")
        if self.from_.startswith("boundary:") and self.to.startswith("boundary:"):
            raise refusal("impossible", "from or to is a vessel: between boundaries there are no books", "to")
        return self

    @model_validator(mode="after")
    def _takes_its_time(self) -> Self:
        if self.ended_at is None:
            return self
        if self.ended_at < self.started_at:
            raise refusal("impossible", "ended_at is not before started_at", "ended_at")
        if self.ended_at - self.started_at > LONGEST_S * 1_000_000:
            raise refusal("out_of_range", "A transfer lasts at most 31 days", "ended_at")
        return self

    @model_validator(mode="after")
    def _one_quantity(self) -> Self:
        given = [*self.quantities(), *(["unmetered"] if self.unmetered else [])]
        if len(given) != 1 and not (self.void and not given):
            names = ", ".join(QUANTITIES_OF_TRANSFER)
            detail = f"A transfer gives exactly one of {names}, or unmetered: true"
            raise refusal("one_of" if given else "missing", detail, *given[1:2])
        if self.observed_volume_m3 is not None and self.temperature_c is None:
            raise refusal("missing", "observed_volume_m3 needs temperature_c, in °C", "temperature_c")
        if (self.density_kg_m3 is None) != (self.density_temperature_c is None):
            lacking = "density_kg_m3" if self.density_kg_m3 is None else "density_temperature_c"
            raise refusal("missing", "density_kg_m3 and density_temperature_c come together", lacking)
        return self

    @model_validator(mode="after")
    def _measured_somehow(self) -> Self:
        if self.by == "meter" and self.meter is None:
            raise refusal("missing", "A transfer by meter names its meter", "meter")
        if self.by != "meter" and self.meter is not None:
            raise refusal("conflicting", "Only a transfer by meter names a meter", "meter")
        if self.by in NEEDS_UNCERTAINTY and self.quantities() and self.mass_uncertainty_kg is None:
            detail = "A quantity by weighbridge, ship or statement needs mass_uncertainty_kg, in kg"
            raise refusal("missing", detail, "mass_uncertainty_kg")
        return self

    @model_validator(mode="after")
    def _progresses(self) -> Self:
        """The running quantity is of the same kind, moves on in time, never falls, ends at the whole."""
        mine = self.quantities()
        earlier, at_least = self.started_at, 0.0
        for at, one in enumerate(self.progress):
            if one.quantities() != mine:
                raise refusal("conflicting", "progress gives the quantity that the transfer gives", "progress", at)
            running = float(getattr(one, mine[0])) if mine else 0.0
            late = self.ended_at is not None and one.at > self.ended_at
            if one.at < earlier or late:
                raise refusal("impossible", "progress stands in order, within the transfer", "progress", at, "at")
            if not at_least <= running <= (getattr(self, mine[0]) if mine else 0.0):
                raise refusal("impossible", "progress never falls, and ends at the whole", "progress", at, *mine)
            earlier, at_least = one.at, running
        return self


class NamedTransfer(Transfer):
    """A transfer of a batch, where no path names it."""

    id: Id = Field(description="Its id")


class TransferBatch(Body):
    """Transfers posted together, each with its id."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "transfers": [
                        {
                            "id": "road-77", "from": "tk-12", "to": "boundary:rack-2", "by": "weighbridge",
                            "started_at": "2026-03-14T09:00:00+01:00",
                            "ended_at": "2026-03-14T09:40:00+01:00",
                            "mass_kg": 21840.0, "mass_uncertainty_kg": 20.0,
                        }
                    ]
                }
            ]
        }
    )  # fmt: skip

    transfers: Items[NamedTransfer] = Field(description="The transfers, in the order in which they count")


class StoredTransfer(Answer):
    """A transfer as stored."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "id": "road-77", "revision": 1, "recorded_at": "2026-03-14T08:52:11.003120Z",
                    "transfer": {
                        "from": "tk-12", "to": "boundary:rack-2", "by": "weighbridge",
                        "started_at": "2026-03-14T08:00:00Z", "ended_at": "2026-03-14T08:40:00Z",
                        "mass_kg": 21840.0, "mass_uncertainty_kg": 20.0,
                    },
                }
            ]
        }
    )  # fmt: skip

    id: str = Field(description="Its id")
    revision: int = Field(ge=1, description="1 for the first text of this ticket, then counted up")
    recorded_at: AnsweredInstant = Field(description="When it was recorded")
    transfer: Transfer = Field(description="The ticket, defaults filled in; void if it was struck")


def validate_transfers(text: bytes) -> tuple[list[tuple[int, NamedTransfer]], list[RowError]]:
    """Transfers of a JSON batch with their positions, and what is wrong with the rows that are none.

    A body that is no object with a list ``transfers`` raises pydantic's ``ValidationError``.
    """
    try:
        return list(enumerate(TransferBatch.model_validate_json(text).transfers)), []
    except ValidationError:
        return validate_each(NamedTransfer, rows_in(TransferBatch, "transfers", text))
