"""The tank statement: one measured liquid in the trade's order of calculation, at 15 °C, 20 °C and 60 °F."""

from __future__ import annotations

from typing import Any

from pydantic import ConfigDict, Field

from app.schemas.types import Answer, AnsweredInstant, Known, is_none

AT_15: dict[str, Any] = {
    "base_temperature_c": 15.0, "base_pressure_kpa_abs": 101.325, "temperature_factor": 0.998009983,
    "temperature_factor_table": 0.99801, "pressure_factor": 0.99999993, "gross_standard_volume_m3": 5689.199,
    "net_standard_volume_m3": 5689.199, "net_standard_volume_bbl": 35783.98, "density_kg_m3": 840.0,
    "density_in_air_kg_m3": 838.926,
}  # fmt: skip
AT_20 = AT_15 | {
    "base_temperature_c": 20.0, "temperature_factor": 1.00216033, "temperature_factor_table": 1.00216,
    "gross_standard_volume_m3": 5712.858, "net_standard_volume_m3": 5712.858, "net_standard_volume_bbl": 35932.8,
    "density_kg_m3": 836.5212, "density_in_air_kg_m3": 835.4465,
}  # fmt: skip
AT_60F = AT_15 | {
    "base_temperature_c": 15.5555555556, "temperature_factor": 0.998470282, "temperature_factor_table": 0.99847,
    "gross_standard_volume_m3": 5691.823, "net_standard_volume_m3": 5691.823, "net_standard_volume_bbl": 35800.49,
    "density_kg_m3": 839.6128, "density_in_air_kg_m3": 838.5385, "relative_density_60_60": 0.84044,
    "api_gravity": 36.864,
}  # fmt: skip


class AtBase(Answer):
    """The liquid at one base; null where its method does not reach there."""

    model_config = ConfigDict(json_schema_extra={"examples": [AT_15]})

    base_temperature_c: float = Field(description="Temperature of the base [°C]")
    base_pressure_kpa_abs: float = Field(
        description="Its absolute pressure: the site's base pressure or, where higher, the vapour pressure; "
        "a light_hydrocarbon's own method counts what lies below its equilibrium as that [kPa absolute]"
    )
    temperature_factor: Known = Field(description="C_T from this base to the liquid's temperature, unrounded [1]")
    temperature_factor_table: Known = Field(
        description="The same to five decimals, as a table prints it: for comparison, nothing is computed by it [1]"
    )
    pressure_factor: Known = Field(description="C_P from the base's pressure to that above the liquid [1]")
    gross_standard_volume_m3: Known = Field(description="Gross observed volume by C_T and C_P [m³]")
    net_standard_volume_m3: Known = Field(description="The same without sediment and water [m³]")
    net_standard_volume_bbl: Known = Field(description="The same in barrels of 42 US gallons [bbl]")
    density_kg_m3: Known = Field(description="Density at the base, net and dry, in vacuo: mass over volume [kg/m³]")
    density_in_air_kg_m3: Known = Field(
        description="The same by weight in air of 1.2 kg/m³ with weights of 8000 kg/m³, OIML D 28 [kg/m³]"
    )


class At60F(AtBase):
    """The liquid at 60 °F, with the two measures that exist there alone."""

    model_config = ConfigDict(json_schema_extra={"examples": [AT_60F]})

    relative_density_60_60: Known = Field(description="Density over that of water, 999.016 kg/m³, both at 60 °F [1]")
    api_gravity: Known = Field(description="API gravity at 60 °F [°API]")


class TankStatement(Answer):
    """What a tank statement shows of one reading: what moved since is no part of it."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "at": "2026-03-14T05:00:00Z", "level_m": 8.231, "free_water_level_m": None,
                    "liquid_temperature_c": 17.4, "shell_factor": 1.00003547, "total_observed_volume_m3": 5700.544,
                    "free_water_volume_m3": 0.0, "roof_correction_m3": 0.0, "gross_observed_volume_m3": 5700.544,
                    "sediment_water_pct": 0.0, "liquid_density_kg_m3": 838.3283, "temperature_factor": 0.99800998,
                    "temperature_factor_table": 0.99801, "pressure_factor": 0.99999993,
                    "at_15_c": AT_15, "at_20_c": AT_20, "at_60_f": AT_60F,
                    "mass_kg": 4778927.1, "weight_in_air_kg": 4772802.4,
                    "weight_in_air_long_ton": 4697.423, "weight_in_air_short_ton": 5261.114,
                }
            ]
        }
    )  # fmt: skip

    at: AnsweredInstant | None = Field(
        default=None, exclude_if=is_none, description="When it was read; absent in a calculation without instants"
    )
    level_m: Known = Field(description="Level above the datum of the capacity; null of a line kept full [m]")
    free_water_level_m: Known = Field(description="Level of the free water; null where none was read [m]")
    liquid_temperature_c: Known = Field(description="Mean temperature of the liquid [°C]")
    shell_factor: Known = Field(description="K, what the shell's strain makes of the tabulated volume [1]")
    total_observed_volume_m3: Known = Field(
        description="Volume below the level, free water too, shell-corrected, before the roof [m³]"
    )
    free_water_volume_m3: Known = Field(description="Of it free water, from the bottom up [m³]")
    roof_correction_m3: Known = Field(description="What the floating roof displaces, below 0; 0 without a roof [m³]")
    gross_observed_volume_m3: Known = Field(description="Total less free water plus the roof's correction [m³]")
    sediment_water_pct: Known = Field(description="Sediment and water in suspension, by volume [%]")
    liquid_density_kg_m3: Known = Field(description="Density in the vessel, with its sediment and water [kg/m³]")
    temperature_factor: Known = Field(description="C_T from the site's own base temperature, unrounded [1]")
    temperature_factor_table: Known = Field(description="The same to five decimals, as a table prints it [1]")
    pressure_factor: Known = Field(description="C_P from the site's standard pressure [1]")
    at_15_c: AtBase = Field(description="The liquid at 15 °C")
    at_20_c: AtBase = Field(description="The liquid at 20 °C")
    at_60_f: At60F = Field(description="The liquid at 60 °F")
    mass_kg: Known = Field(description="Mass of the liquid, without sediment and water [kg]")
    weight_in_air_kg: Known = Field(description="Its weight in air, by its density in the vessel, OIML D 28 [kg]")
    weight_in_air_long_ton: Known = Field(description="The same in tons of 2240 lb [long ton]")
    weight_in_air_short_ton: Known = Field(description="The same in tons of 2000 lb [short ton]")
