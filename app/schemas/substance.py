"""A substance: how its liquid and its vapour get their densities."""

from __future__ import annotations

from typing import Annotated, Any, Literal, Self

from pydantic import (
    AfterValidator,
    ConfigDict,
    Field,
    Tag,
    ValidatorFunctionWrapHandler,
    WrapValidator,
    model_validator,
)
from pydantic_core import PydanticCustomError

from app.schemas.component import NUMBER_OR_LIST, Component, Temperature, temperatures_rise, whole
from app.schemas.liquid import Liquid
from app.schemas.types import UNTAGGED, Body, Instant, Items, Text, refusal

LIQUID_MODELS = ("expansivity", "petroleum", "light_hydrocarbon", "water", "density_table", "ethanol_water")
"""Values of ``liquid.model`` that this version computes."""
VAPOUR_MODELS = ("virial",)
"""Values of ``vapour.model`` that this version computes."""


def _computed(part: str, models: tuple[str, ...]) -> WrapValidator:
    """Refuse a model that this version does not compute before its unknown fields are refused one by one."""

    def check(value: Any, handler: ValidatorFunctionWrapHandler) -> Any:
        if isinstance(value, dict) and value.get("model") not in models:
            raise PydanticCustomError(
                "not_computed", f"This version computes {part}.model {', '.join(models)}, and no other"
            )
        return handler(value)

    return WrapValidator(check)


Rows = Annotated[
    Items[Annotated[tuple[Temperature, float], Field(strict=False)]],
    Field(min_length=2, max_length=1000),
    AfterValidator(temperatures_rise),
]
NumberOrRows = Annotated[
    Annotated[float, Tag("number")] | Annotated[Rows, Tag("list")], NUMBER_OR_LIST, UNTAGGED
]


# --- vapour -------------------------------------------------------------------------------------


class VirialVapour(Body):
    """A vapour by the virial equation of state."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {"model": "virial", "components": [{"id": "propane", "mole_fraction": 1.0}]},
                {
                    "model": "virial",
                    "components": [{"id": "nitrogen", "mole_fraction": 1.0}],
                    "form": "density",
                    "terms": 2,
                    "coefficients": "measured",
                    "second_virial_cm3_mol": [[0.0, -10.3], [50.0, -0.4]],
                },
            ]
        }
    )

    model: Literal["virial"] = Field(description="The virial equation of state")
    components: Items[Component] = Field(min_length=1, max_length=50, description="The mixture")
    form: Literal["density", "pressure"] = Field(default="density", description="Series in density, or in pressure")
    terms: Literal[2, 3] = Field(default=3, description="Terms kept: to the second, or to the third coefficient")
    coefficients: Literal["fitted", "correlation", "measured"] | None = Field(
        default=None,
        description="Where B and C come from; left out: fitted where all components are, else correlation",
    )
    second_virial: Literal["tsonopoulos", "abbott"] = Field(default="tsonopoulos", description="Correlation for B")
    third_virial: Literal["orbey_vera"] = Field(default="orbey_vera", description="Correlation for C")
    second_virial_cm3_mol: NumberOrRows | None = Field(
        default=None, description="Measured B: a number, or rows of [t_c, value] with their range [cm³/mol]"
    )
    third_virial_cm6_mol2: NumberOrRows | None = Field(
        default=None, description="Measured C: a number, or rows of [t_c, value] with their range [cm⁶/mol²]"
    )

    @model_validator(mode="after")
    def _mixture(self) -> Self:
        whole(self.components)
        return self

    @model_validator(mode="after")
    def _coefficients(self) -> Self:
        measured = {"second_virial_cm3_mol", "third_virial_cm6_mol2"}
        named = {name for name in measured if getattr(self, name) is not None}
        if self.coefficients != "measured":
            if named:
                detail = "Virial coefficients are given with coefficients measured only"
                raise refusal("conflicting", detail, sorted(named)[0])
            return self
        needed = measured if self.terms == 3 else {"second_virial_cm3_mol"}
        if lacking := sorted(needed - named):
            detail = f"coefficients measured with {self.terms} terms need {', '.join(lacking)}"
            raise refusal("missing", detail, lacking[0])
        if named - needed:
            raise refusal("conflicting", "Two terms have no third coefficient", "third_virial_cm6_mol2")
        return self


class Substance(Body):
    """What a vessel holds: a liquid model, a vapour model, or both."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "name": "gas oil, house grade",
                    "liquid": {
                        "model": "expansivity", "density_kg_m3": 840.0, "density_uncertainty_kg_m3": 1.0,
                        "at_temperature_c": 15, "at_pressure_kpa_abs": 101.325, "expansivity_per_k": 8.3e-4,
                        "compressibility_per_kpa": 7.5e-7,
                    },
                }
            ]
        }
    )  # fmt: skip

    name: Text = Field(description="Name for people")
    effective_from: Instant | None = Field(
        default=None, description="From when this definition holds; the first may leave it out"
    )
    liquid: Annotated[Liquid, _computed("liquid", LIQUID_MODELS)] | None = Field(
        default=None, description="Model of the liquid; none for a gas"
    )
    vapour: Annotated[VirialVapour, _computed("vapour", VAPOUR_MODELS)] | None = Field(
        default=None, description="Model of the vapour or gas; an open tank needs none"
    )

    @model_validator(mode="after")
    def _holds_something(self) -> Self:
        if self.liquid is None and self.vapour is None:
            raise refusal("missing", "A substance has a liquid, a vapour, or both")
        return self
