"""A shape as a capacity table: what is asked for, and a table that was made or read."""

from __future__ import annotations

from typing import Annotated, Literal, Self

from pydantic import BaseModel, ConfigDict, Field, model_validator

from app.schemas.calculation import CalculationVessel
from app.schemas.shape import TABLE_ROWS, CapacityTable, Shape
from app.schemas.types import Answer, Body, Items, Known, is_none, refusal

Interpolation = Literal["linear", "monotone_cubic"]
Kind = Literal["vertical_cylinder", "horizontal_cylinder", "sphere", "box"]
Row = Annotated[tuple[float, float], Field(strict=False)]


class Tabulation(Body):
    """A shape, alone or in a vessel with its deadwood and its datum, and the step of the rows."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "shape": {
                        "kind": "horizontal_cylinder", "diameter_m": 3.0, "length_m": 16.0,
                        "left_head": {"kind": "ellipsoidal", "depth_m": 0.75},
                        "right_head": {"kind": "ellipsoidal", "depth_m": 0.75},
                    },
                    "step_m": 0.05,
                    "interpolation": "monotone_cubic",
                }
            ]
        }
    )  # fmt: skip

    shape: Shape | None = Field(default=None, description="The shape alone, on its own zero; or vessel")
    vessel: CalculationVessel | None = Field(
        default=None,
        description="A vessel, whose shape is tabulated less its deadwood and on its gauge's datum; or shape",
    )
    step_m: float = Field(ge=1e-4, le=200, description=f"Step of the rows; at most {TABLE_ROWS} rows [m]")
    interpolation: Interpolation = Field(
        default="linear", description="How the table will be read between its rows; monotone_cubic for round shapes"
    )

    @model_validator(mode="after")
    def _one_of_both(self) -> Self:
        if (self.shape is None) == (self.vessel is None):
            code = "missing" if self.shape is None else "conflicting"
            raise refusal(code, "Give shape or vessel, one of both", "shape")
        return self


class InterpolationError(Answer):
    """How far a reading between two rows is from the shape at the worst level."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [{"interpolation": "linear", "error_m3": 0.0619, "error_pct": 79.9, "level_m": 0.0137}]
        }
    )

    interpolation: Interpolation = Field(description="How the table is read between its rows")
    error_m3: float = Field(description="Table less shape where that is greatest; above 0: the table overstates [m³]")
    error_pct: Known = Field(description="The same, of the volume there; null where there is none [%]")
    level_m: float = Field(description="The level at which it is greatest [m]")


class TableFinding(Answer):
    """What is wrong, or odd, with neighbouring rows of a table."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "code": "slope_off_nominal", "index": 120, "count": 2, "level_m": 1.2, "departure_pct": -9.8,
                    "detail": "Rows 120 to 122, from 1.2 to 1.22 m, add 38.1 m³; the nominal area adds 42.2 m³",
                }
            ]
        }
    )  # fmt: skip

    code: Literal["level_does_not_rise", "volume_falls", "slope_off_nominal"] = Field(
        description="The first two forbid the table; the third is to be explained: a bottom, deadwood, a roof, a slip"
    )
    index: int = Field(description="The first of the rows, counted from 0 without the header")
    count: int = Field(description="How many steps from row to row it is true of, one after another")
    level_m: float = Field(description="Level of the first of the rows [m]")
    departure_pct: Known = Field(
        default=None, exclude_if=is_none, description="What they add together, relative to the nominal area [%]"
    )
    detail: str = Field(description="The same in words")


class TabulatedShape(Answer):
    """A capacity table that was made of a shape, or read and checked."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "rows": [[0.0, 0.0], [1.0, 15.0], [2.0, 30.0]],
                    "total_volume_m3": 30.0,
                    "interpolation_errors": [
                        {"interpolation": "linear", "error_m3": 0.0, "error_pct": None, "level_m": 0.0}
                    ],
                    "shape": {
                        "kind": "capacity_table", "of": "box", "rows": [[0.0, 0.0], [1.0, 15.0], [2.0, 30.0]],
                        "total_volume_m3": 30.0, "interpolation": "linear",
                    },
                }
            ]
        }
    )  # fmt: skip

    rows: Items[Row] = Field(description="Rows of [level_m, volume_m3], both ends among them [m, m³]")
    total_volume_m3: float = Field(description="Volume of the whole vessel [m³]")
    interpolation_errors: Items[InterpolationError] | None = Field(
        default=None, exclude_if=is_none,
        description="Of each way to read between the rows, the one that was asked for first; absent of a table "
        "that was read, whose shape is not known",
    )  # fmt: skip
    findings: Items[TableFinding] | None = Field(
        default=None, exclude_if=is_none, description="Of a table that was read, in the order of its rows"
    )
    shape: CapacityTable | None = Field(
        default=None, exclude_if=is_none,
        description="The shape of a vessel's body, ready to be put; absent where a finding forbids it. The table is "
        "net of deadwood and on the datum: that body then has neither",
    )  # fmt: skip


class TableOptions(BaseModel):
    """What the header of a table cannot say; with text/csv only."""

    model_config = ConfigDict(extra="forbid", allow_inf_nan=False)

    of: Kind | None = Field(default=None, description="The shape that the table is of")
    diameter_m: float | None = Field(
        default=None, ge=1e-3, le=200,
        description="Inside diameter of that shape; of an upright cylinder each step is held against its area [m]",
    )  # fmt: skip
    total_volume_m3: float | None = Field(
        default=None, ge=1e-6, le=1e7, description="Volume of the whole vessel; the last row's if left out [m³]"
    )
    interpolation: Interpolation = Field(default="linear", description="How the table is read between its rows")
    roof_deducted_at_kg_m3: float | None = Field(
        default=None, ge=1e-3, le=25000, description="Density at which the table deducts the floating roof [kg/m³]"
    )
    head_included_at_kg_m3: float | None = Field(
        default=None, ge=1e-3, le=25000, description="Density at which the table holds the strain by the head [kg/m³]"
    )
