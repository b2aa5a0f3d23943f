"""A tank statement names its units, shows what is unknown as null, and has API gravity at 60 °F alone."""

from __future__ import annotations

import json
import math

import pytest
from pydantic import ValidationError

from app.schemas.statement import AT_20, At60F, AtBase, TankStatement

EXAMPLE = TankStatement.model_json_schema()["examples"][0]


def test_its_words_in_the_order_of_calculation() -> None:
    assert list(TankStatement.model_fields) == [
        "at", "level_m", "free_water_level_m", "liquid_temperature_c", "shell_factor", "total_observed_volume_m3",
        "free_water_volume_m3", "roof_correction_m3", "gross_observed_volume_m3", "sediment_water_pct",
        "liquid_density_kg_m3", "temperature_factor", "temperature_factor_table", "pressure_factor",
        "at_15_c", "at_20_c", "at_60_f",
        "mass_kg", "weight_in_air_kg", "weight_in_air_long_ton", "weight_in_air_short_ton",
    ]  # fmt: skip
    assert set(At60F.model_fields) - set(AtBase.model_fields) == {"relative_density_60_60", "api_gravity"}


def test_unknown_is_null_and_an_instant_that_nobody_said_is_absent() -> None:
    nowhere = AtBase.model_validate(AT_20 | {"density_kg_m3": math.nan, "net_standard_volume_bbl": None})
    sent = json.loads(nowhere.model_dump_json())
    assert sent["density_kg_m3"] is sent["net_standard_volume_bbl"] is None
    undated = TankStatement.model_validate({name: value for name, value in EXAMPLE.items() if name != "at"})
    assert "at" not in json.loads(undated.model_dump_json())


@pytest.mark.parametrize("name", ["level_m", "at_20_c", "mass_kg"])
def test_nothing_of_it_may_be_left_out(name: str) -> None:
    with pytest.raises(ValidationError):
        TankStatement.model_validate({field: value for field, value in EXAMPLE.items() if field != name})


def test_the_example_is_the_readings_of_one_tank() -> None:
    """840 kg/m³ at 15 °C, β = 8.3e-4 and κ = 7.5e-7: 17.4 °C, 5,700.544 m³; by hand."""
    for name, celsius in (("at_15_c", 15.0), ("at_20_c", 20.0), ("at_60_f", 28.0 / 1.8)):
        at, factor = EXAMPLE[name], math.exp(-8.3e-4 * (17.4 - celsius))
        density = 840.0 * math.exp(-8.3e-4 * (celsius - 15.0))
        assert at["base_temperature_c"] == pytest.approx(celsius, abs=1e-9)
        assert at["temperature_factor"] == pytest.approx(factor, abs=5e-9)
        assert at["temperature_factor_table"] == pytest.approx(factor, abs=5e-6)
        assert at["density_kg_m3"] == pytest.approx(density, abs=5e-4)
        assert at["density_in_air_kg_m3"] == pytest.approx((density - 1.2) / (1 - 1.2 / 8000), abs=1e-3)
        assert at["gross_standard_volume_m3"] == pytest.approx(4778927.1 / density, abs=1e-2)
        assert at["net_standard_volume_bbl"] == pytest.approx(at["net_standard_volume_m3"] * 6.289811, abs=0.1)
    at_60 = EXAMPLE["at_60_f"]
    assert at_60["relative_density_60_60"] == pytest.approx(at_60["density_kg_m3"] / 999.016, abs=5e-6)
    assert at_60["api_gravity"] == pytest.approx(141.5 / at_60["relative_density_60_60"] - 131.5, abs=5e-3)
