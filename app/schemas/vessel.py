"""A vessel: shape, shell, instruments, what it holds."""

from __future__ import annotations

from typing import Annotated, Literal, Self

from pydantic import ConfigDict, Field, model_validator

from app.schemas.instruments import Assumptions, Instruments, MaxAge, SourceOfValues
from app.schemas.shape import CapacityTable, Junction, Shape, VerticalCylinder
from app.schemas.site import ImbalanceLimit
from app.schemas.types import Body, ComponentId, Id, Instant, Items, Text, refusal

Course = Annotated[
    tuple[Annotated[float, Field(gt=0, le=200)], Annotated[float, Field(gt=0, le=2)]],
    Field(strict=False),
]


class Shell(Body):
    """What the wall does when it warms and when it is under pressure."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "expansion_per_k": 1.12e-5, "at_temperature_c": 15.0, "insulated": False,
                    "thickness_m": 0.012, "elastic_modulus_gpa": 207, "poisson_ratio": 0.3,
                }
            ]
        }
    )  # fmt: skip

    expansion_per_k: float = Field(
        default=1.12e-5,
        ge=0,
        le=1e-3,
        description="Linear expansion of the wall; carbon steel if left out [1/K]",
    )
    at_temperature_c: float = Field(
        default=15.0,
        ge=-273.15,
        le=1000,
        description="Temperature of the dimensions or the table [°C]",
    )
    insulated: bool = Field(default=False, description="Whether the wall has the liquid's temperature")
    at_pressure_kpa: float = Field(
        default=0.0,
        ge=-120,
        le=1e6,
        description="Gauge pressure of the dimensions or the table [kPa]",
    )
    thickness_m: float | None = Field(
        default=None,
        ge=1e-4,
        le=2,
        description="Thickness of the wall, for pressure; left out, pressure does not strain it [m]",
    )
    elastic_modulus_gpa: float = Field(default=207.0, ge=1e-3, le=2000, description="Young's modulus of the wall [GPa]")
    poisson_ratio: float = Field(default=0.3, ge=0, lt=0.5, description="Poisson's ratio of the wall [1]")
    courses: Items[Course] = Field(
        default=(), max_length=100,
        description="Rows of [height_m, thickness_m], one for each course from the bottom up: the height of the "
        "course itself, not of its upper edge above the bottom. Together they reach the end of the shell, or the "
        "highest row of a capacity table, at whose zero they begin. Given, the shell widens under the head of "
        "its liquid; thickness_m alone is for pressure [m, m]",
    )  # fmt: skip


class FloatingRoof(Body):
    """A roof that floats on the liquid."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [{"mass_kg": 412000, "lands_at_m": 1.80, "floats_at_m": 2.10, "gauge_sees": "liquid"}]
        }
    )

    mass_kg: float = Field(gt=0, le=1e8, description="Mass of the roof [kg]")
    lands_at_m: float = Field(ge=0, le=150, description="Liquid level at which it starts to stand on legs [m]")
    floats_at_m: float = Field(ge=0, le=150, description="Liquid level from which it is fully afloat [m]")
    gauge_sees: Literal["liquid", "roof"] = Field(default="liquid", description="What the level gauge sees")

    @model_validator(mode="after")
    def _lands_below(self) -> Self:
        if self.floats_at_m < self.lands_at_m:
            raise refusal("impossible", "floats_at_m is at least lands_at_m, in m", "floats_at_m")
        return self


class VapourSpace(Body):
    """What fills the vessel above its liquid."""

    model_config = ConfigDict(json_schema_extra={"examples": [{"kind": "blanketed", "blanket": "nitrogen"}]})

    kind: Literal["product", "blanketed", "open", "none"] = Field(
        description="The substance's own vapour, a blanket of gas, vented, or nothing (floating roof)"
    )
    blanket: ComponentId | None = Field(default=None, description="The gas of the blanket, such as nitrogen")

    @model_validator(mode="after")
    def _blanket_if_blanketed(self) -> Self:
        if self.kind == "blanketed" and self.blanket is None:
            raise refusal("missing", "A blanketed vapour space names its blanket", "blanket")
        if self.kind != "blanketed" and self.blanket is not None:
            raise refusal("conflicting", "Only a blanketed vapour space has a blanket", "blanket")
        return self


class Gauging(Body):
    """Heights from which levels are measured."""

    model_config = ConfigDict(json_schema_extra={"examples": [{"reference_height_m": 19.432}]})

    reference_height_m: float | None = Field(
        default=None,
        ge=1e-3,
        le=200,
        description="Height of the reference point above the zero; ullage needs it [m]",
    )
    reference_on: Literal["ground", "shell", "still_pipe"] = Field(
        default="ground",
        description="What carries the reference point: a shell or a pipe that grows with its temperature, and the "
        "point with it; or something that does not",
    )
    reference_height_at_temperature_c: float = Field(
        default=15.0,
        ge=-60,
        le=400,
        description="Temperature of what carries it when the height was measured [°C]",
    )
    datum_m: float = Field(
        default=0.0,
        ge=-50,
        le=150,
        description="Height of the zero above the lowest inside point below the gauge [m]",
    )
    tap_m: float = Field(
        default=0.0,
        ge=-10,
        le=150,
        description="Height of the tap of the differential pressure above the zero [m]",
    )


Deadwood = Annotated[
    tuple[
        Annotated[float, Field(ge=-50, le=150)],
        Annotated[float, Field(ge=-50, le=150)],
        Annotated[float, Field(ge=-1e5, le=1e5)],
    ],
    Field(strict=False),
]


class Vessel(Body):
    """One vessel as defined from an instant on."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "name": "gasoline 12",
                    "substance": "gasoline-95",
                    "effective_from": "2026-03-14T06:00:00+01:00",
                    "service": "in",
                    "shape": {
                        "kind": "capacity_table",
                        "of": "vertical_cylinder",
                        "diameter_m": 50.0,
                        "rows": [[0.0, 12.4], [0.01, 32.1]],
                        "total_volume_m3": 35300.0,
                        "roof_deducted_at_kg_m3": 740.0,
                        "head_included_at_kg_m3": 850.0,
                    },
                    "shell": {
                        "expansion_per_k": 1.12e-5,
                        "at_temperature_c": 15.0,
                        "insulated": False,
                        "thickness_m": 0.012,
                        "elastic_modulus_gpa": 207,
                        "poisson_ratio": 0.3,
                    },
                    "floating_roof": {
                        "mass_kg": 412000, "lands_at_m": 1.80, "floats_at_m": 2.10, "gauge_sees": "liquid",
                    },
                    "vapour_space": {"kind": "none"},
                    "gauging": {"reference_height_m": 19.432},
                    "sources": [
                        {"source": "radar"},
                        {
                            "source": "hand",
                            "instruments": {
                                "level_m": {"random": 0.0015, "systematic": 0.001, "instrument": "tape 7"}
                            },
                        },
                    ],
                    "instruments": {
                        "level_m": {
                            "random": 0.001, "systematic": 0.002, "offset": -0.011,
                            "calibrated_at": "2026-03-14T14:00:00+01:00",
                        },
                        "observed_density_kg_m3": {
                            "random": 0.35, "systematic": 0.25, "instrument": "lab densitometer",
                        },
                        "capacity_pct": {"systematic": 0.05, "local": 0.02},
                    },
                    "max_age_s": {"level_m": 900, "observed_density_kg_m3": None},
                    "assumed": {"pressure_kpa": {"value": 0.0, "standard_uncertainty": 0.2}},
                    "hand_gauging": True,
                }
            ]
        }
    )  # fmt: skip

    name: Text = Field(description="Name for people")
    substance: Id | None = Field(default=None, description="What it holds; a junction holds nothing")
    effective_from: Instant | None = Field(
        default=None, description="From when this definition holds; the first may leave it out"
    )
    service: Literal["in", "out"] = Field(default="in", description="In service, or out: empty, cleaned, isolated")
    shape: Shape = Field(description="What turns a level into a volume")
    shell: Shell = Field(default=Shell(), description="Strain of the wall by temperature and pressure")
    floating_roof: FloatingRoof | None = Field(default=None, description="The floating roof, where there is one")
    vapour_space: VapourSpace | None = Field(
        default=None,
        description="What is above the liquid; left out: product where the substance has a vapour model "
        "and the vessel no roof, none under a floating roof, else open",
    )
    gauging: Gauging = Field(default=Gauging(), description="Heights from which levels are measured")
    sources: Items[SourceOfValues] = Field(
        default=(),
        max_length=50,
        description="Sources in the order in which they count; none: the newest value",
    )
    instruments: Instruments = Field(default_factory=dict, description="Errors of the instruments by quantity")
    max_age_s: MaxAge | None = Field(
        default=None,
        description="How long a value counts: one number, or one by quantity; null: until replaced [s]",
    )
    assumed: Assumptions = Field(default_factory=dict, description="Values for what is never read, by quantity")
    deadwood: Items[Deadwood] = Field(
        default=(), max_length=1000,
        description="Rows of [from_m, to_m, volume_m3], positive where it takes room [m, m, m³]",
    )  # fmt: skip
    dead_stock_m3: float = Field(
        default=0.0,
        ge=0,
        le=1e7,
        description="Volume that cannot be drawn; only available_mass_kg knows it [m³]",
    )
    expected_loss_kg_per_day: float = Field(
        default=0.0, ge=0, le=1e7, description="Known evaporation, which no trend flags [kg/day]"
    )
    expected_loss_uncertainty_kg_per_day: float = Field(
        default=0.0, ge=0, le=1e7, description="Standard uncertainty of the known evaporation [kg/day]"
    )
    imbalance_limit: ImbalanceLimit | None = Field(
        default=None, description="How much may be missing over a night; the site's if left out"
    )
    hand_gauging: bool | None = Field(
        default=None,
        description="Whether a hand dip may be proposed; left out: where the space is open or none",
    )

    @model_validator(mode="after")
    def _holds_something(self) -> Self:
        if self.substance is None and not isinstance(self.shape, Junction):
            raise refusal("missing", "A vessel names its substance; only a junction has none", "substance")
        return self

    @model_validator(mode="after")
    def _sources_once(self) -> Self:
        names = [one.source for one in self.sources]
        for at, name in enumerate(names):
            if name in names[:at]:
                raise refusal("twice", "A source stands once in sources", "sources", at, "source")
        return self

    @model_validator(mode="after")
    def _roof_floats_somewhere(self) -> Self:
        upright = isinstance(self.shape, VerticalCylinder) or (
            isinstance(self.shape, CapacityTable) and self.shape.of in (None, "vertical_cylinder")
        )
        if self.floating_roof is not None and not upright:
            raise refusal("conflicting", "Only an upright cylinder has a floating roof", "floating_roof")
        deducted = isinstance(self.shape, CapacityTable) and self.shape.roof_deducted_at_kg_m3 is not None
        if deducted and self.floating_roof is None:
            raise refusal("missing", "A table that deducts a roof needs floating_roof", "floating_roof")
        return self

    @model_validator(mode="after")
    def _deadwood_stands(self) -> Self:
        if self.deadwood and isinstance(self.shape, CapacityTable):
            raise refusal("conflicting", "A capacity table is net of deadwood already", "deadwood")
        for at, (bottom, top, _) in enumerate(self.deadwood):
            if top <= bottom:
                raise refusal("impossible", "Deadwood ends above its beginning: from_m < to_m, in m", "deadwood", at)
        return self
