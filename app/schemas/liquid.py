"""How a substance's liquid gets its density: one model a body."""

from __future__ import annotations

from typing import Annotated, Literal, Self

from pydantic import AfterValidator, ConfigDict, Discriminator, Field, Tag, model_validator

from app.schemas.component import NUMBER_OR_LIST, Component, Temperature, temperatures_rise, whole
from app.schemas.types import UNTAGGED, Body, Items, refusal

Density = Annotated[float, Field(ge=1e-3, le=25000)]
GIVEN = {"conflicting": "both are given", "missing": "neither is given"}


Expansivity = Annotated[
    Annotated[float, Field(ge=-0.01, le=0.05), Tag("number")]
    | Annotated[Items[float], Field(min_length=1, max_length=8), Tag("list")],
    NUMBER_OR_LIST,
    UNTAGGED,
]
DensityRows = Annotated[
    Items[Annotated[tuple[Temperature, Density], Field(strict=False)]],
    Field(min_length=2, max_length=1000),
    AfterValidator(temperatures_rise),
]


class _Uncertain(Body):
    """A liquid whose own density figure is known so well."""

    density_uncertainty_kg_m3: float | None = Field(
        default=None, ge=0, le=5000,
        description="Standard uncertainty of the density that counts where none was read; left out: 1 % of a density "
        "that is given, the method's own of one that is computed [kg/m³]",
    )  # fmt: skip

    @model_validator(mode="after")
    def _uncertainty_below_density(self) -> Self:
        density = getattr(self, "density_kg_m3", None)
        if density is not None and (self.density_uncertainty_kg_m3 or 0.0) >= density:
            detail = "density_uncertainty_kg_m3 is less than density_kg_m3, in kg/m³"
            raise refusal("impossible", detail, "density_uncertainty_kg_m3")
        return self


class _Sampled(_Uncertain):
    """A liquid that is known by its density at one state."""

    density_kg_m3: Density = Field(description="Density at the state below, in vacuo [kg/m³]")
    at_temperature_c: float = Field(default=15.0, ge=-273.15, le=1000, description="Temperature t₀ of the density [°C]")
    at_pressure_kpa_abs: float | None = Field(
        default=None, ge=0, le=1e6,
        description="Absolute pressure of the density; left out: the site's base pressure or, where higher, "
        "the vapour pressure at at_temperature_c [kPa absolute]",
    )  # fmt: skip


class ExpansivityLiquid(_Sampled):
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
    expansivity_per_k: Expansivity = Field(
        description="β: a number, or the coefficients c₀, c₁, … of powers of (t − t₀): "
        "β = c₀ + c₁ (t − t₀) + … [1/K, 1/K², …]"
    )
    compressibility_per_kpa: float = Field(
        default=0.0, ge=0, le=1e-3, description="κ, isothermal compressibility [1/kPa]"
    )


class PetroleumLiquid(_Sampled):
    """A petroleum by its density at one state and its commodity: ASTM D1250-04 / API MPMS 11.1-2004.

    Defined from −50 to 150 °C and from 0 to 103.4 bar gauge, for 610.6 to 1163.5 kg/m³ at 60 °F (a lubricating oil:
    from 800.9); a hotter or heavier one is a density_table.
    """

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {"model": "petroleum", "commodity": "refined", "density_kg_m3": 745.2, "at_temperature_c": 15.0},
                {"model": "petroleum", "commodity": "special", "alpha60_per_f": 5.1e-4, "density_kg_m3": 880.0},
            ]
        }
    )

    model: Literal["petroleum"] = Field(description="The generalised volume correction of petroleum")
    commodity: Literal["crude", "refined", "lubricating", "special"] = Field(
        description="Crude oil; a refined product, whose group follows from its density at 60 °F; a lubricating oil; "
        "or a special application with a measured α60"
    )
    alpha60_per_f: float | None = Field(
        default=None, ge=230e-6, le=930e-6,
        description="Thermal expansion at 60 °F of a special application, as measured: the procedure takes 230e-6 to "
        "930e-6; a liquid beyond it is a density_table [1/°F]",
    )

    @model_validator(mode="after")
    def _alpha_if_special(self) -> Self:
        if self.commodity == "special" and self.alpha60_per_f is None:
            raise refusal("missing", "The commodity special needs its measured alpha60_per_f, in 1/°F", "alpha60_per_f")
        if self.commodity != "special" and self.alpha60_per_f is not None:
            raise refusal("conflicting", "alpha60_per_f goes with the commodity special only", "alpha60_per_f")
        return self


class WaterLiquid(_Uncertain):
    """Water by G. S. Kell (1975), scaled to M. Tanaka et al. (2001): 0 to 150 °C, up to 100 bar."""

    model_config = ConfigDict(json_schema_extra={"examples": [{"model": "water"}]})

    model: Literal["water"] = Field(description="Water by its published density and compressibility")


class EthanolWaterLiquid(_Uncertain):
    """Ethanol and water by their strength, or by a density: OIML R 22 (1973), −20 to 40 °C, up to 10 bar."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {"model": "ethanol_water", "alcohol_volume_pct": 96.0},
                {"model": "ethanol_water", "density_kg_m3": 807.42, "at_temperature_c": 20.0},
            ]
        }
    )

    model: Literal["ethanol_water"] = Field(description="The international alcoholometric tables")
    alcohol_volume_pct: float | None = Field(
        default=None, ge=0, le=100, description="Strength, volume of ethanol in the volume at 20 °C [%]"
    )
    density_kg_m3: Density | None = Field(
        default=None, description="Density at the temperature below, in vacuo; instead of the strength [kg/m³]"
    )
    at_temperature_c: float = Field(default=20.0, ge=-20, le=40, description="Temperature of the density [°C]")

    @model_validator(mode="after")
    def _by_one_of_them(self) -> Self:
        if (self.alcohol_volume_pct is None) == (self.density_kg_m3 is None):
            code = "missing" if self.density_kg_m3 is None else "conflicting"
            detail = "Ethanol and water take either alcohol_volume_pct or density_kg_m3"
            raise refusal(code, f"{detail}: {GIVEN[code]}", "alcohol_volume_pct")
        return self


class LightHydrocarbonLiquid(_Uncertain):
    """A liquefied gas: by its density (GPA TP-27 / API MPMS 11.2.4), or by its composition (COSTALD).

    By density paraffins from −46 to 93 °C, of relative densities at 60 °F from 0.350 to 0.688. By composition from
    0.25 to 0.95 of the mixture's critical temperature; a reading's liquid_composition then takes the place of
    components.
    """

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {"model": "light_hydrocarbon", "density_kg_m3": 507.0, "at_temperature_c": 15.0},
                {"model": "light_hydrocarbon", "components": [{"id": "propane", "mole_fraction": 1.0}]},
            ]
        }
    )

    model: Literal["light_hydrocarbon"] = Field(description="A liquefied gas by its density, or by its composition")
    components: Items[Component] | None = Field(
        default=None, min_length=1, max_length=50,
        description="Composition of the liquid, mole fractions that sum to 1 within 0.01; instead of density_kg_m3",
    )
    density_kg_m3: Density | None = Field(
        default=None, description="Density at the state below, in vacuo; instead of components [kg/m³]"
    )
    at_temperature_c: float = Field(default=15.0, ge=-273.15, le=1000, description="Temperature of the density [°C]")
    at_pressure_kpa_abs: float | None = Field(
        default=None, ge=0, le=1e6,
        description="Absolute pressure of the density; left out: its equilibrium pressure, or the site's base "
        "pressure where that is higher [kPa absolute]",
    )  # fmt: skip

    @model_validator(mode="after")
    def _by_one_of_them(self) -> Self:
        if (self.components is None) == (self.density_kg_m3 is None):
            code = "conflicting" if self.components else "missing"
            detail = "A light hydrocarbon takes either components or density_kg_m3"
            raise refusal(code, f"{detail}: {GIVEN[code]}", "density_kg_m3")
        if self.components is None:
            return self
        if given := {"at_temperature_c", "at_pressure_kpa_abs"} & self.model_fields_set:
            detail = "A temperature or pressure of a density goes with density_kg_m3, not with components"
            raise refusal("conflicting", detail, sorted(given)[0])
        whole(self.components)
        return self


class DensityTableLiquid(_Uncertain):
    """A liquid by a table of its densities: for what no published method reaches, such as hot bitumen.

    Between the rows it is interpolated, beyond them there is no density. Where the site's base temperature lies
    beyond them the mass is measured all the same, and standard volumes are unknown.
    """

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "model": "density_table", "rows": [[120.0, 1004.1], [160.0, 979.6], [200.0, 955.2]],
                    "compressibility_per_kpa": 5e-7,
                }
            ]
        }
    )  # fmt: skip

    model: Literal["density_table"] = Field(
        description="A table of densities: monotone cubic of ln ρ between its rows, never extrapolated"
    )
    rows: DensityRows = Field(description="Rows of [t_c, density_kg_m3], rising in temperature [°C, kg/m³]")
    at_pressure_kpa_abs: float | None = Field(
        default=None, ge=0, le=1e6,
        description="Absolute pressure of the table; the site's base pressure if left out [kPa absolute]",
    )  # fmt: skip
    compressibility_per_kpa: float = Field(
        default=0.0, ge=0, le=1e-3, description="κ, isothermal compressibility [1/kPa]"
    )


Liquid = Annotated[
    ExpansivityLiquid
    | PetroleumLiquid
    | LightHydrocarbonLiquid
    | WaterLiquid
    | DensityTableLiquid
    | EthanolWaterLiquid,
    Discriminator("model"),
    UNTAGGED,
]
