"""The liquid of a substance: its method, its own density figure, and densities from state to state."""

from __future__ import annotations

from typing import Any

import pytest

from app.schemas.site import Conditions as Site
from app.schemas.substance import Substance, VirialVapour
from app.services.compositions import Boiling, fractions_of
from app.services.liquids import (
    density_between,
    key_of,
    liquid_columns,
    liquid_of,
    own_density,
    reference,
    standard_pressure,
    state_of,
    why_outside,
)
from models.components import component
from models.errors import DefinitionError
from models.liquid import definition

ATMOSPHERE = 101_325.0
SITE = Site()
CRUDE = {"model": "petroleum", "commodity": "crude", "density_kg_m3": 850.0}


def body(given: dict[str, Any]) -> Any:
    return Substance.model_validate({"name": "x", "liquid": given}).liquid


def figure(given: dict[str, Any], site: Site = SITE) -> tuple[float, ...]:
    own = body(given)
    return reference(own, liquid_of(own, site), site, None)


def test_each_body_becomes_its_method_in_si() -> None:
    expanding = body({"model": "expansivity", "density_kg_m3": 840.0, "at_temperature_c": 20, "expansivity_per_k": 8e-4,
                      "compressibility_per_kpa": 7.5e-7})  # fmt: skip
    assert liquid_of(expanding, SITE) == definition.ExpansivityLiquid((8e-4,), 293.15, 7.5e-10)
    assert liquid_of(body(CRUDE), SITE) == definition.PetroleumLiquid("crude")
    assert liquid_of(body({"model": "water"}), SITE) == definition.WaterLiquid()
    table = {"model": "density_table", "rows": [[0, 900.0], [50, 870.0]], "compressibility_per_kpa": 6e-7}
    assert liquid_of(body(table), SITE) == definition.TableLiquid(
        ((273.15, 900.0), (323.15, 870.0)), 6e-10, ATMOSPHERE
    )
    assert liquid_of(body(table | {"at_pressure_kpa_abs": 500.0}), SITE) == definition.TableLiquid(
        ((273.15, 900.0), (323.15, 870.0)), 6e-10, 500_000.0
    )
    assert liquid_of(body({"model": "ethanol_water", "alcohol_volume_pct": 96.0}), SITE) == (
        definition.EthanolWaterLiquid()
    )


def test_a_density_that_is_given_has_one_percent_and_one_that_is_computed_its_methods_own() -> None:
    assert figure(CRUDE) == (850.0, 288.15, ATMOSPHERE, 8.5)
    assert figure(CRUDE | {"density_uncertainty_kg_m3": 0.7})[3] == 0.7
    density, temperature, pressure, spread = figure({"model": "water"}, Site(base_temperature_c=20.0))
    assert density == pytest.approx(998.2067, abs=0.002)  # M. Tanaka et al., Metrologia 38 (2001) 301
    assert (temperature, pressure, spread) == (293.15, ATMOSPHERE, pytest.approx(0.0998, abs=1e-4))


def test_a_hot_table_is_read_at_the_row_nearest_to_the_base() -> None:
    bitumen = {"model": "density_table", "rows": [[120.0, 1004.1], [200.0, 955.2]]}
    assert figure(bitumen)[:2] == (pytest.approx(1004.1, rel=1e-14), 393.15)


@pytest.mark.parametrize(("strength", "density"), [(10.0, 984.71), (40.0, 948.05), (70.0, 885.56), (96.0, 807.42)])
def test_a_strength_by_volume_is_a_density_at_20_degrees(strength: float, density: float) -> None:
    """OIML R 22 (1973): recomputed from its general formula."""
    found = figure({"model": "ethanol_water", "alcohol_volume_pct": strength})
    assert found[:3] == (pytest.approx(density, abs=0.005), 293.15, ATMOSPHERE)


def test_a_figure_from_which_the_method_finds_nothing_is_refused_with_the_limit() -> None:
    with pytest.raises(DefinitionError, match="kg/m³") as refused:
        figure(CRUDE | {"density_kg_m3": 300.0})
    assert refused.value.field == "liquid/density_kg_m3"
    for to_blame, value in (("at_temperature_c", 160.0), ("at_pressure_kpa_abs", 2e4)):
        with pytest.raises(DefinitionError) as refused:
            figure(CRUDE | {to_blame: value})
        assert refused.value.field == f"liquid/{to_blame}"
    with pytest.raises(DefinitionError) as refused:
        liquid_columns((definition.MixtureLiquid(((component("helium"), 1.0),)),))
    assert refused.value.field == "liquid/components"
    with pytest.raises(DefinitionError, match="0 to 150 °C"):
        figure({"model": "water"}, Site(base_temperature_c=-5.0))


def test_the_standard_pressure_is_that_of_equilibrium_where_it_is_higher() -> None:
    vapour = VirialVapour.model_validate({"model": "virial", "components": [{"id": "propane", "mole_fraction": 1.0}]})
    propane = Boiling(fractions_of(vapour.components))
    expanding = definition.ExpansivityLiquid((3e-3,), 288.15, 0.0)
    # propane at 15 °C: Lemmon et al. 2009, by CoolProp 8.0.0
    assert standard_pressure(expanding, SITE, propane) == pytest.approx(7.3151e5, rel=5e-4)
    assert standard_pressure(definition.LightHydrocarbonLiquid(), SITE, propane) == ATMOSPHERE  # it finds its own
    assert standard_pressure(expanding, SITE, None) == ATMOSPHERE


def test_a_density_goes_from_state_to_state_by_its_method() -> None:
    """850 kg/m³ at 15 °C, crude, 40 °C: C_T = 0.97861576 (recomputed from ASTM D1250-04)."""
    crude = definition.PetroleumLiquid("crude")
    warm = density_between(crude, 850.0, (288.15, ATMOSPHERE), (313.15, ATMOSPHERE), ATMOSPHERE)
    assert warm / 850.0 == pytest.approx(0.97861576, abs=5e-9)
    back = density_between(crude, warm, (313.15, ATMOSPHERE), (288.15, ATMOSPHERE), ATMOSPHERE)
    assert back == pytest.approx(850.0, rel=1e-13)
    found = state_of(crude, 850.0, (288.15, ATMOSPHERE), (313.15, ATMOSPHERE), (293.15, ATMOSPHERE))
    assert found.density[0] == pytest.approx(warm, rel=1e-14)
    assert key_of(crude, 850.0, (288.15, ATMOSPHERE), ATMOSPHERE) == pytest.approx(849.59848, abs=5e-6)
    assert "150 °C" in why_outside(crude, 850.0, (288.15, ATMOSPHERE), (450.0, ATMOSPHERE))


def test_a_method_that_needs_a_sample_has_no_density_of_its_own() -> None:
    with pytest.raises(DefinitionError):
        own_density(definition.PetroleumLiquid("crude"), (288.15, ATMOSPHERE))


def test_pitfall_1_gauge_or_absolute_petroleum_takes_the_gauge_pressure_of_the_place() -> None:
    """845 kg/m³ at 15 °C, refined, 60 °C and 1 000 kPa gauge: C_P = 1.00096695 (recomputed from ASTM D1250-04)."""
    oil, sample = definition.PetroleumLiquid("refined"), (288.15, ATMOSPHERE)
    high = 77_000.0  # a site at 2 250 m
    there = state_of(oil, 845.0, sample, (333.15, high + 1e6), (288.15, ATMOSPHERE), high)
    vented = state_of(oil, 845.0, sample, (333.15, high), (288.15, ATMOSPHERE), high)
    assert there.density[0] / vented.density[0] == pytest.approx(1.00096695, abs=5e-9)
    assert vented.density[0] / 845.0 == pytest.approx(0.96192667, abs=5e-9)
