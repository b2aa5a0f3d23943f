"""A reconciliation: one period of one site closed, and every vessel's imbalance judged."""

from __future__ import annotations

from datetime import date
from typing import Annotated, Literal, Self

from pydantic import AfterValidator, ConfigDict, Field, StringConstraints, model_validator
from pydantic_core import PydanticCustomError

from app.schemas.inventory import Status
from app.schemas.types import (
    DAY_PATTERN,
    RECONCILIATION_PATTERN,
    Answer,
    AnsweredInstant,
    Body,
    Instant,
    Items,
    Known,
    is_none,
    refusal,
)

ReconciliationId = Annotated[str, StringConstraints(pattern=RECONCILIATION_PATTERN)]
"""A day or two instants in basic UTC, and the revision; without one, the newest."""
Observability = Literal["redundant", "nonredundant", "observable", "unobservable"]


def _real_date(text: str) -> str:
    try:
        date.fromisoformat(text)
    except ValueError:
        raise PydanticCustomError("not_a_date", "There is no such date; a day is a text such as 2026-03-14") from None
    return text


Day = Annotated[
    str,
    StringConstraints(pattern=DAY_PATTERN),
    AfterValidator(_real_date),
]


class ReconciliationRequest(Body):
    """The period to close: a day of the site, or two instants."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {"day": "2026-03-14"},
                {"opening": "2026-03-01T06:00:00+01:00", "closing": "2026-04-01T06:00:00+02:00"},
            ]
        }
    )

    day: Day | None = Field(default=None, description="The local date on which the day begins")
    opening: Instant | None = Field(default=None, description="Start of the period, within it")
    closing: Instant | None = Field(default=None, description="End of the period, no longer within it")

    @model_validator(mode="after")
    def _one_period(self) -> Self:
        if (self.day is None) == (self.opening is None and self.closing is None):
            raise refusal("one_of", "A period is given by day, or by opening and closing")
        if self.day is None and (self.opening is None or self.closing is None):
            raise refusal("missing", "opening and closing come together", "closing" if self.opening else "opening")
        if self.opening is not None and self.closing is not None and self.closing <= self.opening:
            raise refusal("impossible", "closing is after opening", "closing")
        for name, end in (("opening", self.opening), ("closing", self.closing)):
            if end is not None and end % 1_000_000:
                raise refusal("impossible", f"{name} falls on a whole second", name)
        return self


class LimitedBy(Answer):
    """An instrument that keeps smaller imbalances from being seen."""

    model_config = ConfigDict(
        json_schema_extra={"examples": [{"instrument": "tk-12 level", "detectable_without_it_kg": 4100.0}]}
    )

    instrument: str = Field(description="The instrument")
    detectable_without_it_kg: Known = Field(description="Imbalance that could be seen if it had no error [kg]")


class VesselBook(Answer):
    """The books of one vessel over the period; an imbalance is physical less book, a loss is negative."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "vessel": "tk-12", "status": "measured", "verdict": "pass", "flagged": False,
                    "opening_mass_kg": 11852380.0, "closing_mass_kg": 21700130.0, "received_kg": 9850000.0,
                    "delivered_kg": 0.0, "book_mass_kg": 21702380.0, "imbalance_kg": -2250.0,
                    "imbalance_uncertainty_kg": 6100.0, "score": -0.37, "p_value": 0.71,
                    "detectable_imbalance_kg": 31000.0, "opening_read_at": "2026-03-14T05:00:00Z",
                    "closing_read_at": "2026-03-15T05:00:00Z",
                }
            ]
        }
    )  # fmt: skip

    vessel: str = Field(description="The vessel")
    status: Status = Field(description="Whether its masses are measured, uncertain, unmeasured, or out of service")
    verdict: Literal["pass", "fail", "inconclusive"] | None = Field(
        default=None,
        description="fail if flagged; inconclusive if a limit is set that could not be seen or is passed",
    )
    flagged: bool = Field(description="Whether its imbalance is larger than chance allows")
    opening_mass_kg: Known = Field(default=None, description="Mass at the opening [kg]")
    closing_mass_kg: Known = Field(default=None, description="Measured mass at the close [kg]")
    received_kg: Known = Field(default=None, description="Receipts of the period [kg]")
    delivered_kg: Known = Field(default=None, description="Deliveries of the period [kg]")
    book_mass_kg: Known = Field(default=None, description="Opening plus receipts less deliveries [kg]")
    imbalance_kg: Known = Field(default=None, description="Measured closing mass less book mass [kg]")
    imbalance_uncertainty_kg: Known = Field(default=None, description="Its standard uncertainty [kg]")
    score: Known = Field(default=None, description="Imbalance in parts of its standard uncertainty [1]")
    p_value: Known = Field(default=None, description="Chance of such a score or a larger if nothing is wrong [1]")
    detectable_imbalance_kg: Known = Field(
        default=None, description="Imbalance that would be flagged with a chance of 95 % [kg]"
    )
    opening_read_at: AnsweredInstant | None = Field(default=None, description="When the opening was read")
    closing_read_at: AnsweredInstant | None = Field(default=None, description="When the close was read")
    moved_kg: Known = Field(
        default=None,
        exclude_if=is_none,
        description="Mass that transfers moved between reading and close [kg]",
    )
    restated_kg: Known = Field(
        default=None,
        exclude_if=is_none,
        description="Opening by the definition at the close, less opening as closed [kg]",
    )
    judged_with: Items[str] = Field(default=(), description="Vessels merged with it by unmetered transfers")
    over_limit: bool | None = Field(
        default=None, exclude_if=is_none, description="Whether the imbalance passes the limit that is set"
    )
    limited_by: Items[LimitedBy] | None = Field(
        default=None,
        exclude_if=is_none,
        description="Instruments that keep smaller imbalances from being seen",
    )
    reconciled_closing_mass_kg: Known = Field(
        default=None,
        exclude_if=is_none,
        description="Closing mass that agrees best with all that was measured [kg]",
    )


class Imbalance(VesselBook):
    """One vessel of one closed period, in a flat list over many."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "reconciliation": "2026-03-14.1", "opening": "2026-03-14T05:00:00Z",
                    "closing": "2026-03-15T05:00:00Z", "vessel": "tk-12", "status": "measured", "flagged": False,
                }
            ]
        }
    )  # fmt: skip

    reconciliation: str = Field(description="The period, with its revision")
    opening: AnsweredInstant = Field(description="Start of the period")
    closing: AnsweredInstant = Field(description="End of the period")


class TransferBook(Answer):
    """One transfer, as measured and as reconciled."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {"transfer": "ship-0313", "measured_mass_kg": 9850000.0, "observability": "redundant"},
            ]
        }
    )

    transfer: str = Field(description="The transfer")
    measured_mass_kg: Known = Field(
        default=None, description="Its part in the period, as measured; null unmetered [kg]"
    )
    reconciled_mass_kg: Known = Field(default=None, exclude_if=is_none, description="The same as reconciled [kg]")
    reconciled_uncertainty_kg: Known = Field(
        default=None, exclude_if=is_none, description="Standard uncertainty of the reconciled mass [kg]"
    )
    observability: Observability | None = Field(
        default=None,
        exclude_if=is_none,
        description="Whether the other measurements determine it, and check it",
    )


class VesselGroup(Answer):
    """Vessels that transfers tie together, tested as one."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [{"members": ["tk-12", "tk-14"], "degrees_of_freedom": 2, "p_value": 0.44, "statistic": 1.64}]
        }
    )

    members: Items[str] = Field(description="The vessels")
    degrees_of_freedom: int = Field(ge=0, description="Independent balances")
    p_value: Known = Field(default=None, description="Chance of such a statistic or a larger if nothing is wrong [1]")
    statistic: Known = Field(
        default=None, exclude_if=is_none, description="Weighted sum of squares, with detail=true [1]"
    )


class PeriodTotal(Answer):
    """One substance of the whole site over the period."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "substance": "gasoline-95", "opening_mass_kg": 23704740.0, "closing_mass_kg": 33552490.0,
                    "received_kg": 9850000.0, "delivered_kg": 0.0, "reclassified_kg": 0.0,
                    "imbalance_kg": -2250.0,
                    "imbalance_uncertainty_kg": 6900.0, "complete": True,
                }
            ]
        }
    )  # fmt: skip

    substance: str = Field(description="The substance")
    opening_mass_kg: Known = Field(default=None, description="Mass at the opening [kg]")
    closing_mass_kg: Known = Field(default=None, description="Measured mass at the close [kg]")
    received_kg: Known = Field(default=None, description="Receipts from beyond the site's books [kg]")
    delivered_kg: Known = Field(default=None, description="Deliveries to beyond the site's books [kg]")
    reclassified_kg: Known = Field(
        default=None, exclude_if=is_none, description="What came from or went to another substance [kg]"
    )
    imbalance_kg: Known = Field(default=None, description="Measured closing mass less book mass [kg]")
    imbalance_uncertainty_kg: Known = Field(default=None, description="Its standard uncertainty [kg]")
    complete: bool = Field(description="Whether no vessel of it is missing")


class Reconciliation(Answer):
    """One closed period of one site, at one revision; blocks that were not computed are absent."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "id": "2026-03-14.1", "site": "northbank", "opening": "2026-03-14T05:00:00Z",
                    "closing": "2026-03-15T05:00:00Z", "revision": 1, "status": "balanced", "complete": True,
                    "known_at": "2026-03-15T05:31:00.118402Z", "method": "2",
                    "vessels": [], "transfers": [], "groups": [], "totals": [],
                }
            ]
        }
    )  # fmt: skip

    id: str = Field(description="The day or the two instants, and the revision")
    site: str = Field(description="The site")
    opening: AnsweredInstant = Field(description="Start of the period")
    closing: AnsweredInstant = Field(description="End of the period")
    revision: int = Field(ge=1, description="1 for the first close of the period, then counted up")
    status: Literal["balanced", "imbalanced"] = Field(description="imbalanced if any vessel is flagged")
    complete: bool = Field(description="Whether every vessel in service is measured")
    known_at: AnsweredInstant | None = Field(default=None, description="The latest record that it includes")
    method: str | None = Field(default=None, description="Version of the calculation")
    digest: str | None = Field(default=None, exclude_if=is_none, description="Digest of its inputs")
    vessels: Items[VesselBook] = Field(description="One for each vessel")
    transfers: Items[TransferBook] | None = Field(
        default=None, exclude_if=is_none, description="One for each transfer that touches the period"
    )
    groups: Items[VesselGroup] | None = Field(
        default=None, exclude_if=is_none, description="Vessels tied together by transfers, tested as one"
    )
    totals: Items[PeriodTotal] | None = Field(default=None, exclude_if=is_none, description="One for each substance")


class Because(Answer):
    """What was recorded between two revisions and changed a figure."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "kind": "revised_reading", "subject": "tk-12 level_m 2026-03-14T05:57:00Z from radar",
                    "recorded_at": "2026-03-16T09:12:44.120031Z",
                }
            ]
        }
    )  # fmt: skip

    kind: Literal["late_reading", "revised_reading", "late_transfer", "definition", "method"] = Field(
        description="late_reading: a value of which nothing was kept; revised_reading: another value, or a withdrawal, "
        "of one; late_transfer: a ticket that came, was corrected or struck; definition: the text of a site, "
        "substance, vessel or meter; method: another version of the calculation"
    )
    subject: str = Field(
        description="Of a reading: vessel (or site), quantity, instant and source; of a transfer: its id; of a "
        "definition: its kind and id; of a method: both versions"
    )
    recorded_at: AnsweredInstant = Field(description="When it was recorded")


class BookChange(Answer):
    """One figure that a revision changed. A vessel or a ticket that only one revision has is null in the other."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "vessel": "tk-12", "field": "closing_mass_kg", "before": 4412415.0, "after": 4412002.0,
                    "because": [
                        {
                            "kind": "revised_reading", "subject": "tk-12 level_m 2026-03-14T05:57:00Z from radar",
                            "recorded_at": "2026-03-16T09:12:44.120031Z",
                        }
                    ],
                }
            ]
        }
    )  # fmt: skip

    vessel: str | None = Field(default=None, exclude_if=is_none, description="The vessel, or")
    transfer: str | None = Field(default=None, exclude_if=is_none, description="the transfer, or")
    substance: str | None = Field(
        default=None, exclude_if=is_none, description="the substance, of whose totals no vessel's figures tell"
    )
    field: Literal[
        "opening_mass_kg", "closing_mass_kg", "received_kg", "delivered_kg", "restated_kg", "reclassified_kg",
        "imbalance_kg", "flagged", "verdict", "measured_mass_kg",
    ] = Field(description="What changed; masses that differ by less than a gram did not")  # fmt: skip
    before: float | bool | str | None = Field(description="As it stood in the revision before [unit of the field]")
    after: float | bool | str | None = Field(description="As it stands in this revision [unit of the field]")
    because: Items[Because] = Field(
        description="What it comes from. An opening is the close of the night before: its causes are what changed "
        "that close. A judgement rests on the masses, or on the other vessels that it was made beside"
    )


class BookChanges(Answer):
    """What a revision changed against the one before; the first changes nothing."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "id": "2026-03-14.2", "before": "2026-03-14.1", "changes": [],
                    "words": [
                        "tk-12: closing mass 4,412,415 → 4,412,002 kg because the level of tk-12 of "
                        "2026-03-14T05:57:00Z from radar was revised on 2026-03-16T09:12:44Z"
                    ],
                }
            ]
        }
    )  # fmt: skip

    id: str = Field(description="The period and its revision")
    before: str | None = Field(description="The revision before; null for the first")
    changes: Items[BookChange] = Field(description="Vessels by name, then transfers and substances by name")
    words: Items[str] = Field(description="Each change as a sentence, in the same order")
