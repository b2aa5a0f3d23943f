"""A meter: what measures transfers, with errors of its own."""

from __future__ import annotations

from typing import Self

from pydantic import ConfigDict, Field, model_validator

from app.schemas.types import Body, Instant, Items, Text, refusal


class Proving(Body):
    """A proving: from its instant on the meter's unknown error is another one."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "at": "2026-02-01T09:00:00+01:00",
                    "systematic_pct": 0.05,
                    "as_found_pct": 0.12,
                    "as_found_uncertainty_pct": 0.03,
                }
            ]
        }
    )

    at: Instant = Field(description="When it was proved")
    systematic_pct: float | None = Field(
        default=None, ge=0, le=100,
        description="Standard uncertainty of the unknown error from here on; the meter's if left out [%]",
    )  # fmt: skip
    as_found_pct: float | None = Field(
        default=None,
        ge=-100,
        le=100,
        description="Error found, of the interval before; positive: it read high [%]",
    )
    as_found_uncertainty_pct: float | None = Field(
        default=None, ge=0, le=100, description="Standard uncertainty of the error found [%]"
    )

    @model_validator(mode="after")
    def _found_with_uncertainty(self) -> Self:
        if (self.as_found_pct is None) != (self.as_found_uncertainty_pct is None):
            lacking = "as_found_pct" if self.as_found_pct is None else "as_found_uncertainty_pct"
            raise refusal("missing", "as_found_pct and as_found_uncertainty_pct come together, in %", lacking)
        return self


class Meter(Body):
    """One meter as defined from an instant on."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "name": "jetty 1, line A",
                    "random_pct": 0.03,
                    "systematic_pct": 0.1,
                    "provings": [{"at": "2026-02-01T09:00:00+01:00", "systematic_pct": 0.05}],
                }
            ]
        }
    )

    name: Text = Field(description="Name for people")
    effective_from: Instant | None = Field(
        default=None, description="From when this definition holds; the first may leave it out"
    )
    random_pct: float | None = Field(
        default=None, ge=0, le=100, description="Standard uncertainty, fresh at each transfer [%]"
    )
    systematic_pct: float | None = Field(
        default=None, ge=0, le=100,
        description="Standard uncertainty shared by every transfer that starts between two provings [%]",
    )  # fmt: skip
    provings: Items[Proving] = Field(default=(), max_length=10_000, description="Provings, oldest first")

    @model_validator(mode="after")
    def _in_order(self) -> Self:
        for at, (before, after) in enumerate(zip(self.provings, self.provings[1:], strict=False), start=1):
            if after.at <= before.at:
                raise refusal("impossible", "Provings stand oldest first, none twice", "provings", at, "at")
        return self
