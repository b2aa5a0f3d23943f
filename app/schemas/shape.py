"""The shape of a vessel: what turns a level into a volume."""

from __future__ import annotations

from itertools import pairwise
from typing import Annotated, Literal, Self

from pydantic import AfterValidator, ConfigDict, Discriminator, Field, model_validator

from app.schemas.types import UNTAGGED, Body, Items, refusal

LEAST_KNUCKLE_M = 1e-3  # m; no plate is bent more sharply
TABLE_ROWS = 100_000
"""Rows of one capacity table, at most."""

# --- heads, bottoms and tops ---------------------------------------------------------------------


class FlatHead(Body):
    """A flat end."""

    model_config = ConfigDict(json_schema_extra={"examples": [{"kind": "flat"}]})

    kind: Literal["flat"] = Field(description="A plane")


class HemisphericalHead(Body):
    """Half a sphere of the vessel's diameter."""

    model_config = ConfigDict(json_schema_extra={"examples": [{"kind": "hemispherical"}]})

    kind: Literal["hemispherical"] = Field(description="Half a sphere")


class EllipsoidalHead(Body):
    """Half an ellipsoid of revolution."""

    model_config = ConfigDict(json_schema_extra={"examples": [{"kind": "ellipsoidal", "depth_m": 0.6}]})

    kind: Literal["ellipsoidal"] = Field(description="Half an ellipsoid of revolution")
    depth_m: float = Field(ge=1e-3, le=100, description="Inside depth [m]")


class TorisphericalHead(Body):
    """A spherical crown joined to the shell by a toroidal knuckle."""

    model_config = ConfigDict(
        json_schema_extra={"examples": [{"kind": "torispherical", "crown_radius_m": 2.4, "knuckle_radius_m": 0.24}]}
    )

    kind: Literal["torispherical"] = Field(description="Crown and knuckle")
    crown_radius_m: float = Field(ge=1e-3, le=500, description="Inside radius of the crown [m]")
    knuckle_radius_m: float = Field(ge=0, le=100, description="Inside radius of the knuckle; 0 for none [m]")


class ConicalHead(Body):
    """A cone that points away from the vessel."""

    model_config = ConfigDict(json_schema_extra={"examples": [{"kind": "cone", "depth_m": 0.35}]})

    kind: Literal["cone"] = Field(description="A cone")
    depth_m: float = Field(ge=1e-3, le=100, description="Inside depth [m]")


class ConicalBottom(ConicalHead):
    """A cone down from the shell, or up into the tank."""

    model_config = ConfigDict(json_schema_extra={"examples": [{"kind": "cone", "depth_m": 0.35, "inverted": True}]})

    inverted: bool = Field(default=False, description="Whether it points up into the tank")


Head = Annotated[
    FlatHead | HemisphericalHead | EllipsoidalHead | TorisphericalHead | ConicalHead,
    Discriminator("kind"),
    UNTAGGED,
]
Bottom = Annotated[
    FlatHead | HemisphericalHead | EllipsoidalHead | TorisphericalHead | ConicalBottom,
    Discriminator("kind"),
    UNTAGGED,
]


def _head_fits(head: Head | Bottom, diameter: float, place: str) -> None:
    """A crown at least as wide as the shell, and a knuckle that fits inside: otherwise they do not meet."""
    if not isinstance(head, TorisphericalHead):
        return
    if head.crown_radius_m < diameter / 2:
        detail = "crown_radius_m is at least half the diameter, in m"
        raise refusal("impossible", detail, place, "crown_radius_m")
    if head.knuckle_radius_m > diameter / 2:
        detail = "knuckle_radius_m is at most half the diameter, in m"
        raise refusal("impossible", detail, place, "knuckle_radius_m")
    if 0.0 < head.knuckle_radius_m < LEAST_KNUCKLE_M:
        detail = f"knuckle_radius_m is 0, for none, or at least {LEAST_KNUCKLE_M:g} m"
        raise refusal("impossible", detail, place, "knuckle_radius_m")


# --- shapes -------------------------------------------------------------------------------------

FLAT = FlatHead(kind="flat")


class VerticalCylinder(Body):
    """An upright cylinder with a bottom and a top."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "kind": "vertical_cylinder",
                    "diameter_m": 30.0,
                    "height_m": 14.5,
                    "bottom": {"kind": "cone", "depth_m": 0.25},
                    "top": {"kind": "flat"},
                }
            ]
        }
    )

    kind: Literal["vertical_cylinder"] = Field(description="An upright cylinder")
    diameter_m: float = Field(ge=1e-3, le=200, description="Inside diameter [m]")
    height_m: float = Field(ge=1e-3, le=200, description="Height of the cylindrical part [m]")
    bottom: Bottom = Field(default=FLAT, description="The bottom; flat if left out")
    top: Head = Field(default=FLAT, description="The top; flat if left out")

    @model_validator(mode="after")
    def _ends_fit(self) -> Self:
        _head_fits(self.bottom, self.diameter_m, "bottom")
        _head_fits(self.top, self.diameter_m, "top")
        bottom = self.bottom
        if isinstance(bottom, ConicalBottom) and bottom.inverted and bottom.depth_m >= self.height_m:
            raise refusal("impossible", "depth_m of an inverted bottom is less than height_m", "bottom", "depth_m")
        return self


class HorizontalCylinder(Body):
    """A lying cylinder with two heads, level or tilted."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "kind": "horizontal_cylinder",
                    "diameter_m": 2.4,
                    "length_m": 12.0,
                    "left_head": {"kind": "torispherical", "crown_radius_m": 2.4, "knuckle_radius_m": 0.24},
                    "right_head": {"kind": "ellipsoidal", "depth_m": 0.6},
                    "tilt_deg": 0.5,
                    "gauge_at_m": 3.0,
                }
            ]
        }
    )

    kind: Literal["horizontal_cylinder"] = Field(description="A lying cylinder")
    diameter_m: float = Field(ge=1e-3, le=50, description="Inside diameter [m]")
    length_m: float = Field(ge=1e-3, le=1000, description="Length between the tangent lines [m]")
    left_head: Head = Field(default=FLAT, description="The left head; flat if left out")
    right_head: Head = Field(default=FLAT, description="The right head; flat if left out")
    tilt_deg: float = Field(default=0.0, ge=-45, le=45, description="Tilt; positive raises the right end [°]")
    gauge_at_m: float | None = Field(
        default=None,
        ge=0,
        description="The gauge, from the left tangent line; in the middle if level and left out [m]",
    )

    @model_validator(mode="after")
    def _fits(self) -> Self:
        _head_fits(self.left_head, self.diameter_m, "left_head")
        _head_fits(self.right_head, self.diameter_m, "right_head")
        if self.tilt_deg != 0 and self.gauge_at_m is None:
            raise refusal("missing", "A tilted vessel also gives gauge_at_m, in m", "gauge_at_m")
        if self.gauge_at_m is not None and self.gauge_at_m > self.length_m:
            raise refusal("out_of_range", "gauge_at_m is at most length_m, in m", "gauge_at_m")
        return self


class Sphere(Body):
    """A sphere."""

    model_config = ConfigDict(json_schema_extra={"examples": [{"kind": "sphere", "diameter_m": 15.8}]})

    kind: Literal["sphere"] = Field(description="A sphere")
    diameter_m: float = Field(ge=1e-3, le=100, description="Inside diameter [m]")


class Box(Body):
    """A box with upright sides."""

    model_config = ConfigDict(
        json_schema_extra={"examples": [{"kind": "box", "length_m": 6.0, "width_m": 2.5, "height_m": 2.0}]}
    )

    kind: Literal["box"] = Field(description="A box")
    length_m: float = Field(ge=1e-3, le=500, description="Inside length [m]")
    width_m: float = Field(ge=1e-3, le=500, description="Inside width [m]")
    height_m: float = Field(ge=1e-3, le=200, description="Inside height [m]")


Level = Annotated[float, Field(ge=-10, le=200)]
Volume = Annotated[float, Field(ge=0, le=1e7)]


def _rises(rows: tuple[tuple[float, float], ...]) -> tuple[tuple[float, float], ...]:
    for at, (below, above) in enumerate(pairwise(rows), start=1):
        if above[0] <= below[0]:
            raise refusal("table_falls", "level_m rises from row to row, in m; here it does not", at)
        if above[1] < below[1]:
            raise refusal("table_falls", "volume_m3 never falls, in m³; here it does", at)
    return rows


class CapacityTable(Body):
    """A calibrated table of volumes by level, on its own zero, net of deadwood."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "kind": "capacity_table",
                    "of": "vertical_cylinder",
                    "diameter_m": 50.0,
                    "rows": [[0.0, 12.4], [0.01, 32.1]],
                    "total_volume_m3": 35300.0,
                }
            ]
        }
    )

    kind: Literal["capacity_table"] = Field(description="A table of volumes by level")
    rows: Annotated[
        Items[Annotated[tuple[Level, Volume], Field(strict=False)]],
        Field(min_length=2, max_length=TABLE_ROWS),
        AfterValidator(_rises),
    ] = Field(description="Rows of [level_m, volume_m3]; levels rise, volumes never fall [m, m³]")
    total_volume_m3: float | None = Field(
        default=None, ge=1e-6, le=1e7, description="Volume of the whole vessel; the last row's if left out [m³]"
    )
    of: Literal["vertical_cylinder", "horizontal_cylinder", "sphere", "box"] | None = Field(
        default=None, description="The shape that the table is of"
    )
    diameter_m: float | None = Field(default=None, ge=1e-3, le=200, description="Inside diameter of that shape [m]")
    interpolation: Literal["linear", "monotone_cubic"] = Field(
        default="linear", description="Between rows; beyond them there is nothing"
    )
    roof_deducted_at_kg_m3: float | None = Field(
        default=None, ge=1e-3, le=25000,
        description="Density at which the table deducts the floating roof; none: it does not [kg/m³]",
    )  # fmt: skip
    head_included_at_kg_m3: float | None = Field(
        default=None, ge=1e-3, le=25000,
        description="Density at which the table already holds the strain by the liquid's head; "
        "left out, it does not [kg/m³]",
    )  # fmt: skip

    @model_validator(mode="after")
    def _total_holds_the_rows(self) -> Self:
        if self.total_volume_m3 is not None and self.total_volume_m3 < self.rows[-1][1]:
            detail = "total_volume_m3 is at least the volume of the last row, in m³"
            raise refusal("impossible", detail, "total_volume_m3")
        return self


class FixedVolume(Body):
    """A vessel of one volume and no level: a gas receiver, a line kept full."""

    model_config = ConfigDict(json_schema_extra={"examples": [{"kind": "fixed_volume", "volume_m3": 5.0}]})

    kind: Literal["fixed_volume"] = Field(description="One volume, no level")
    volume_m3: float = Field(ge=1e-6, le=1e7, description="Stamped or measured volume [m³]")


class Junction(Body):
    """No inventory: a manifold where one meter feeds several tanks."""

    model_config = ConfigDict(json_schema_extra={"examples": [{"kind": "junction"}]})

    kind: Literal["junction"] = Field(description="No inventory")


Shape = Annotated[
    VerticalCylinder | HorizontalCylinder | Sphere | Box | CapacityTable | FixedVolume | Junction,
    Discriminator("kind"),
    UNTAGGED,
]
