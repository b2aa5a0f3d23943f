"""A substance: how its liquid and its vapour get their densities."""

from __future__ import annotations

from itertools import pairwise
from typing import Annotated, Any, Literal, Self

from pydantic import (
    AfterValidator,
    ConfigDict,
    Discriminator,
    Field,
    Tag,
    ValidatorFunctionWrapHandler,
    WrapValidator,
    model_validator,
)
from pydantic_core import PydanticCustomError

from app.schemas.types import UNTAGGED, Body, ComponentId, Instant, Items, Text, refusal

LIQUID_MODELS = ("expansivity",)
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


# --- a number, or a list of them ----------------------------------------------------------------


def _number_or_list(value: object) -> str:
    return "list" if isinstance(value, list | tuple) else "number"


_NUMBER_OR_LIST = Discriminator(_number_or_list)
Row = tuple[float, float]


def _temperatures_rise(rows: tuple[Row, ...]) -> tuple[Row, ...]:
    if any(after[0] <= before[0] for before, after in pairwise(rows)):
        raise PydanticCustomError("table_falls", "Rows of [t_c, value] rise in temperature, none twice [°C]")
    return rows


Temperature = Annotated[float, Field(ge=-273.15, le=1000)]
Rows = Annotated[
    Items[Annotated[tuple[Temperature, float], Field(strict=False)]],
    Field(min_length=2, max_length=1000),
    AfterValidator(_temperatures_rise),
]
NumberOrRows = Annotated[Annotated[float, Tag("number")] | Annotated[Rows, Tag("list")], _NUMBER_OR_LIST, UNTAGGED]
Expansivity = Annotated[
    Annotated[float, Field(ge=-0.01, le=0.05), Tag("number")]
    | Annotated[Items[float], Field(min_length=1, max_length=8), Tag("list")],
    _NUMBER_OR_LIST,
    UNTAGGED,
]


# --- liquid -------------------------------------------------------------------------------------


class ExpansivityLiquid(Body):
    """A liquid by its density at one state, its thermal expansivity β and its compressibility κ."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "model": "expansivity",
                    "density_kg_m3": 840.0,
                    "density_uncertainty_kg_m3": 1.0,
                    "at_temperature_c": 15.0,
                    "at_pressure_kpa_abs": 101.325,
                    "expansivity_per_k": 8.3e-4,
                    "compressibility_per_kpa": 7.5e-7,
                }
            ]
        }
    )

    model: Literal["expansivity"] = Field(description="β constant or a polynomial of temperature, κ constant")
    density_kg_m3: float = Field(ge=1e-3, le=25000, description="Density at the state below, in vacuo [kg/m³]")
    density_uncertainty_kg_m3: float | None = Field(
        default=None, ge=0, le=5000,
        description="Standard uncertainty of the density; 1 % of it if left out [kg/m³]",
    )  # fmt: skip
    at_temperature_c: float = Field(default=15.0, ge=-273.15, le=1000, description="Temperature t₀ of the density [°C]")
    at_pressure_kpa_abs: float | None = Field(
        default=None, ge=0, le=1e6,
        description="Absolute pressure of the density; left out: the site's base pressure or, where higher, "
        "the vapour pressure at at_temperature_c [kPa absolute]",
    )  # fmt: skip
    expansivity_per_k: Expansivity = Field(
        description="β: a number, or the coefficients c₀, c₁, … of powers of (t − t₀): "
        "β = c₀ + c₁ (t − t₀) + … [1/K, 1/K², …]"
    )
    compressibility_per_kpa: float = Field(
        default=0.0, ge=0, le=1e-3, description="κ, isothermal compressibility [1/kPa]"
    )

    @model_validator(mode="after")
    def _uncertainty_below_density(self) -> Self:
        if (self.density_uncertainty_kg_m3 or 0.0) >= self.density_kg_m3:
            detail = "density_uncertainty_kg_m3 is less than density_kg_m3, in kg/m³"
            raise refusal("impossible", detail, "density_uncertainty_kg_m3")
        return self


# --- vapour -------------------------------------------------------------------------------------


class Component(Body):
    """One component of a mixture; an id that is not listed comes with its critical constants."""

    model_config = ConfigDict(json_schema_extra={"examples": [{"id": "propane", "mole_fraction": 1.0}]})

    id: ComponentId = Field(description="Name of the component, such as propane or carbon-dioxide")
    mole_fraction: float = Field(ge=1e-12, le=1, description="Mole fraction [1]")
    critical_temperature_k: float | None = Field(default=None, ge=1, le=5000, description="Critical temperature [K]")
    critical_pressure_kpa_abs: float | None = Field(
        default=None, ge=1, le=1e6, description="Critical pressure [kPa absolute]"
    )
    acentric_factor: float | None = Field(default=None, ge=-1, le=3, description="Acentric factor [1]")
    molar_mass_g_mol: float | None = Field(default=None, ge=1, le=2000, description="Molar mass [g/mol]")

    @model_validator(mode="after")
    def _all_constants_or_none(self) -> Self:
        constants = {
            "critical_temperature_k",
            "critical_pressure_kpa_abs",
            "acentric_factor",
            "molar_mass_g_mol",
        }
        given = {name for name in constants if getattr(self, name) is not None}
        if given and given != constants:
            lacking = sorted(constants - given)
            raise refusal("missing", f"A component in full also gives {', '.join(lacking)}", lacking[0])
        return self


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
        if not 0.99 <= sum(one.mole_fraction for one in self.components) <= 1.01:
            raise refusal("fractions_sum", "Mole fractions sum to 1 within 0.01; these do not", "components")
        if len({one.id for one in self.components}) < len(self.components):
            raise refusal("twice", "A component stands once in components", "components")
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
    liquid: Annotated[ExpansivityLiquid, _computed("liquid", LIQUID_MODELS)] | None = Field(
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
