"""What the instruments of a vessel should show for a mass: what is known, and the readings that follow."""

from __future__ import annotations

from typing import Literal, Self

from pydantic import ConfigDict, Field, model_validator

from app.schemas.calculation import CalculationVessel
from app.schemas.inventory import Said, WarningSaid
from app.schemas.site import Conditions
from app.schemas.substance import Substance
from app.schemas.types import Answer, Body, Items, Known, Source, is_none, refusal


class ExpectedReadingCalculation(Body):
    """A vessel, a substance, a mass, and what else is known; each name and limit is that of a reading."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "vessel": {
                        "name": "box",
                        "shape": {"kind": "box", "length_m": 6.0, "width_m": 2.5, "height_m": 2.0},
                    },
                    "substance": {
                        "name": "gas oil, house grade",
                        "liquid": {
                            "model": "expansivity", "density_kg_m3": 840.0, "at_temperature_c": 15,
                            "expansivity_per_k": 8.3e-4,
                        },
                    },
                    "mass_kg": 15044.9,
                    "liquid_temperature_c": 31.0,
                }
            ]
        }
    )  # fmt: skip

    site: Conditions = Field(default=Conditions(), description="The states that standard volumes refer to, and the air")
    vessel: CalculationVessel = Field(description="The vessel")
    substance: Substance = Field(description="What it holds")
    source: Source = Field(
        default="", description="The source whose instruments should show it: known offsets are counted back"
    )
    mass_kg: float = Field(
        gt=0, le=1e9, description="Liquid plus vapour of the substance, as an inventory's mass_kg [kg]"
    )
    liquid_temperature_c: float | None = Field(
        default=None, ge=-273.15, le=1000, description="Mean temperature of the liquid; needed where there is one [°C]"
    )
    vapour_temperature_c: float | None = Field(
        default=None, ge=-273.15, le=1000,
        description="Temperature of the vapour or gas; of a gas alone, its pressure is answered [°C]",
    )  # fmt: skip
    ambient_temperature_c: float | None = Field(
        default=None, ge=-100, le=100, description="Temperature of the air outside; left out, the product's [°C]"
    )
    pressure_kpa: float | None = Field(
        default=None, ge=-120, le=1e6,
        description="Gauge pressure of the space above the liquid, or of the gas; of a gas alone, its temperature is "
        "answered; left out of a product space, the liquid's vapour pressure [kPa]",
    )  # fmt: skip
    pressure_kpa_abs: float | None = Field(
        default=None, ge=0, le=1e6, description="The same, absolute, in place of pressure_kpa [kPa absolute]"
    )
    barometric_pressure_kpa_abs: float | None = Field(
        default=None, ge=40, le=120, description="Station pressure of the air [kPa absolute]"
    )
    observed_density_kg_m3: float | None = Field(
        default=None, ge=1e-3, le=25000, description="Density of a sample; left out, the substance's own [kg/m³]"
    )
    observed_density_temperature_c: float | None = Field(
        default=None, ge=-273.15, le=1000, description="Temperature of the sample when its density was read [°C]"
    )
    observed_density_pressure_kpa_abs: float | None = Field(
        default=None, ge=0, le=1e6,
        description="Absolute pressure of the sample when its density was read [kPa absolute]",
    )  # fmt: skip
    observed_density_by: Literal["digital", "hydrometer"] | None = Field(
        default=None, description="Instrument of the density; a hydrometer is of glass, which expands"
    )
    sediment_water_pct: float | None = Field(
        default=None, ge=0, le=100, description="Sediment and water, suspended [%]"
    )
    density_basis: Literal["wet", "dry"] | None = Field(
        default=None, description="Whether the observed density is of the wet sample or of the dry substance"
    )
    free_water_level_m: float | None = Field(
        default=None, ge=-10, le=150, description="Level of free water above the zero; left out, none [m]"
    )
    roof_load_kg: float | None = Field(
        default=None, ge=0, le=1e7, description="Rain, snow and other load on the floating roof [kg]"
    )

    @model_validator(mode="after")
    def _one_pressure(self) -> Self:
        if self.pressure_kpa is not None and self.pressure_kpa_abs is not None:
            raise refusal("one_of", "Give pressure_kpa or pressure_kpa_abs, not both", "pressure_kpa_abs")
        return self


class ExpectedReading(Answer):
    """What the instruments should show; null where there is nothing to show, and a reason where nothing fits."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "level_m": 1.2098, "liquid_volume_m3": 18.147, "fill_pct": 60.5,
                    "differential_pressure_kpa": 9.834, "pressure_kpa": 0.0, "pressure_kpa_abs": 101.325,
                    "liquid_density_kg_m3": 828.9, "liquid_mass_kg": 15044.9, "mass_kg": 15044.9,
                    "level_standard_uncertainty_m": 0.0071, "warnings": [],
                }
            ]
        }
    )  # fmt: skip

    reason: Said | None = Field(
        default=None, exclude_if=is_none, description="Why no reading goes with this mass; the readings are then null"
    )
    level_m: Known = Field(default=None, description="Level above the zero [m]")
    ullage_m: Known = Field(
        default=None, description="From the reference point to the surface, where the vessel gives its height [m]"
    )
    liquid_volume_m3: Known = Field(
        default=None, description="Liquid and free water as a gauge with the capacity table indicates them [m³]"
    )
    fill_pct: Known = Field(default=None, description="Liquid and water in parts of the capacity [%]")
    differential_pressure_kpa: Known = Field(
        default=None,
        description="Pressure at the bottom tap less that of the vapour space; null where the tap is not in the "
        "liquid: above it, or in free water [kPa]",
    )
    pressure_kpa: Known = Field(
        default=None, description="Gauge pressure of the space above the liquid, or of the gas [kPa]"
    )
    pressure_kpa_abs: Known = Field(default=None, description="The same, absolute [kPa absolute]")
    vapour_temperature_c: Known = Field(default=None, description="Temperature of the vapour or gas [°C]")
    liquid_density_kg_m3: Known = Field(default=None, description="Density of the liquid in the vessel [kg/m³]")
    liquid_mass_kg: Known = Field(default=None, description="Of the mass, what is liquid [kg]")
    vapour_mass_kg: Known = Field(default=None, description="Of the mass, what is vapour or gas [kg]")
    mass_kg: Known = Field(default=None, description="The mass that an inventory makes of these readings [kg]")
    level_standard_uncertainty_m: Known = Field(
        default=None,
        description="Of level_m for the given mass, by every error but that of the level gauge itself [m]",
    )
    liquid_full_temperature_c: Known = Field(
        default=None,
        description="Of a closed vessel: at which this mass, all of it liquid, would fill it whole; null in others, "
        "and where the methods do not reach [°C]",
    )
    liquid_full_caution: str | None = Field(
        default=None, exclude_if=is_none, description="What that temperature must not be used for; in closed vessels"
    )
    warnings: Items[WarningSaid] = Field(default=(), description="What is doubtful, as in an inventory")
