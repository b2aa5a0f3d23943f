"""The tank statement: its parts add up, each base is the same content, and the pitfalls of its numbers."""

from __future__ import annotations

from typing import Any

import pytest

from app.services.explain import answers
from app.services.statement import in_air
from app.services.working import working_steps
from tests.app.services.worked import (
    BULLET,
    GAS_OIL,
    GAS_READ,
    HYDROGEN,
    LPG_READ,
    OIL_READ,
    PROPANE,
    RECEIVER,
    TANK,
    Body,
    answer,
    compiled,
    masses,
)

EXACT = 1e-12
NAMES = ("at_15_c", "at_20_c", "at_60_f")
ROOF = {"mass_kg": 1.2e5, "lands_at_m": 1.8, "floats_at_m": 2.1}
COURSES = {"courses": [[5.0, 0.02], [5.0, 0.015], [5.0, 0.01]]}
SEA: Body = {"elevation_m": 0.0}
PLAIN: Body = {"level_m": 8.0, "liquid_temperature_c": 40.0, "ambient_temperature_c": 9.0}


def liquid(model: str, **fields: Any) -> Body:
    return {"name": model.replace("_", " "), "liquid": {"model": model, **fields}}


def petroleum(commodity: str, density: float, at: float = 15.0, **fields: Any) -> Body:
    return liquid("petroleum", commodity=commodity, density_kg_m3=density, at_temperature_c=at, **fields)


def statement(substance: Body, row: Body, shape: Body = TANK, site: Body = SEA, **vessel: Any) -> Body:
    found: Body = answer(compiled(shape, substance, site=site, **vessel), row, statement=True)["statement"]
    return found


WATER, ETHANOL = liquid("water"), liquid("ethanol_water", alcohol_volume_pct=96.0)
TABLE = liquid("density_table", rows=[[10.0, 905.0], [30.0, 893.0], [60.0, 874.0]], compressibility_per_kpa=6e-7)
GAS = PROPANE["vapour"]
BY_DENSITY = liquid("light_hydrocarbon", density_kg_m3=507.0, at_temperature_c=15.0) | {"vapour": GAS}
BY_COMPOSITION = liquid("light_hydrocarbon", components=GAS["components"]) | {"vapour": GAS}
CLOSED = PLAIN | {"pressure_kpa": 350.0}
LIQUIDS = [
    pytest.param(GAS_OIL, OIL_READ | {"sediment_water_pct": 0.0}, TANK, id="expansivity"),
    pytest.param(petroleum("crude", 850.0), CLOSED, TANK, id="crude"),
    pytest.param(petroleum("refined", 745.0), PLAIN, TANK, id="refined"),
    pytest.param(petroleum("special", 845.0, alpha60_per_f=4.5e-4), PLAIN, TANK, id="special"),
    pytest.param(WATER, CLOSED, TANK, id="water"),
    pytest.param(TABLE, CLOSED, TANK, id="density table"),
    pytest.param(ETHANOL, PLAIN | {"liquid_temperature_c": 28.0}, TANK, id="ethanol"),
    pytest.param(PROPANE, LPG_READ, BULLET, id="propane"),
    pytest.param(BY_DENSITY, LPG_READ, BULLET, id="light hydrocarbon by density"),
    pytest.param(BY_COMPOSITION, LPG_READ, BULLET, id="light hydrocarbon by composition"),
]


# --- each base is the same content ---------------------------------------------------------------


@pytest.mark.parametrize("base", [10.0, 15.0, 20.0, 25.0])
@pytest.mark.parametrize(("substance", "row", "shape"), LIQUIDS)
def test_volume_by_density_is_the_mass_at_every_base(substance: Body, row: Body, shape: Body, base: float) -> None:
    """GOV ρ(T) = GSV ρ_b of a dry liquid, and the factors lead from one to the other."""
    site = {"elevation_m": 12.0, "base_temperature_c": base}
    found = statement(substance, row, shape, site)
    gross, here = found["gross_observed_volume_m3"], found["liquid_density_kg_m3"]
    assert gross * here == pytest.approx(found["mass_kg"], rel=EXACT)
    for name in NAMES:
        at = found[name]
        assert at["gross_standard_volume_m3"] * at["density_kg_m3"] == pytest.approx(gross * here, rel=EXACT)
        assert at["net_standard_volume_m3"] == at["gross_standard_volume_m3"]
        factors = at["temperature_factor"] * at["pressure_factor"]
        assert gross * factors == pytest.approx(at["gross_standard_volume_m3"], rel=EXACT)


@pytest.mark.parametrize("basis", ["wet", "dry"])
@pytest.mark.parametrize("more", [{}, {"floating_roof": ROOF}, {"shell": COURSES}], ids=["plain", "roof", "courses"])
@pytest.mark.parametrize("substance", [GAS_OIL, petroleum("crude", 850.0)], ids=["expansivity", "crude"])
def test_net_volume_by_dry_density_is_the_mass_of_a_wet_content(substance: Body, more: Body, basis: str) -> None:
    found = statement(substance, OIL_READ | {"sediment_water_pct": 1.7, "density_basis": basis}, **more)
    assert found["sediment_water_pct"] == pytest.approx(1.7, rel=EXACT)
    for name in NAMES:
        at = found[name]
        assert at["net_standard_volume_m3"] * at["density_kg_m3"] == pytest.approx(found["mass_kg"], rel=EXACT)
        assert at["net_standard_volume_m3"] == pytest.approx(0.983 * at["gross_standard_volume_m3"], rel=EXACT)


@pytest.mark.parametrize(("base", "name"), [(15.0, "at_15_c"), (20.0, "at_20_c"), (28.0 / 1.8, "at_60_f")])
@pytest.mark.parametrize(("substance", "row", "shape"), [*LIQUIDS, pytest.param(GAS_OIL, OIL_READ, TANK, id="wet")])
def test_the_sites_own_base_is_the_inventory(
    substance: Body, row: Body, shape: Body, base: float, name: str
) -> None:
    whole = answer(compiled(shape, substance, site={"base_temperature_c": base}), row, statement=True)
    found = whole["statement"]
    for field in ("gross_standard_volume_m3", "net_standard_volume_m3"):
        assert found[name][field] == pytest.approx(whole[field], rel=EXACT)
    assert found[name]["density_kg_m3"] == pytest.approx(whole["standard_density_kg_m3"], rel=EXACT)
    for field in ("temperature_factor", "temperature_factor_table", "pressure_factor"):
        assert found[name][field] == pytest.approx(found[field], rel=EXACT)


@pytest.mark.parametrize(("substance", "row", "shape"), [one for one in LIQUIDS if one.id != "ethanol"])
def test_the_bases_do_not_depend_on_the_sites_own(substance: Body, row: Body, shape: Body) -> None:
    """Where the sample says its pressure; one left out is that of the site's own standard state."""
    density = 845.0 if shape is TANK else 507.0
    sampled = row | {"observed_density_kg_m3": density, "observed_density_temperature_c": 18.0,
                     "observed_density_pressure_kpa_abs": 101.325}  # fmt: skip
    at_15, at_20 = (statement(substance, sampled, shape, {"base_temperature_c": base}) for base in (15.0, 20.0))
    for name in NAMES:
        assert at_15[name] == pytest.approx(at_20[name], rel=1e-10)


def test_a_liquefied_gas_refers_to_its_equilibrium_pressure_at_each_base() -> None:
    # Propane boils at 732 kPa at 15 °C and at 836 kPa at 20 °C (reference equation of state, from memory).
    found = statement(PROPANE, LPG_READ, BULLET)
    assert found["at_15_c"]["base_pressure_kpa_abs"] == pytest.approx(732.0, rel=0.005)
    assert found["at_20_c"]["base_pressure_kpa_abs"] == pytest.approx(836.0, rel=0.005)
    assert statement(GAS_OIL, OIL_READ)["at_20_c"]["base_pressure_kpa_abs"] == 101.325
    own = statement(BY_DENSITY, LPG_READ, BULLET)["at_15_c"]  # 507 kg/m³ at 15 °C is that of its equilibrium
    assert own["density_kg_m3"] == pytest.approx(507.0, rel=1e-11)


def test_a_base_that_the_method_does_not_reach_is_unknown_and_hides_no_other() -> None:
    bitumen = liquid("density_table", rows=[[18.0, 905.0], [30.0, 898.0], [60.0, 880.0]])
    found = statement(bitumen, PLAIN, site={"base_temperature_c": 20.0})
    for name in ("at_15_c", "at_60_f"):
        known = {field for field, value in found[name].items() if value is not None}
        assert known == {"base_temperature_c", "base_pressure_kpa_abs"}
    assert {"api_gravity", "relative_density_60_60"} <= set(found["at_60_f"])
    assert found["at_20_c"]["density_kg_m3"] == pytest.approx(903.83, abs=0.1)
    far = statement(bitumen, PLAIN, site={"base_temperature_c": 15.0})
    assert far["temperature_factor"] is far["temperature_factor_table"] is far["pressure_factor"] is None
    assert far["at_20_c"]["density_kg_m3"] == pytest.approx(found["at_20_c"]["density_kg_m3"], rel=EXACT)
    assert far["mass_kg"] == pytest.approx(found["mass_kg"], rel=EXACT)


# --- the order of calculation --------------------------------------------------------------------


@pytest.mark.parametrize("more", [{}, {"floating_roof": ROOF}, {"shell": COURSES}], ids=["plain", "roof", "courses"])
def test_the_parts_add_up_to_the_gross_observed_volume(more: Body) -> None:
    vessel = compiled(TANK, **more)
    whole = answer(vessel, OIL_READ, statement=True)
    found = whole["statement"]
    steps = {one["symbol"]: one["value"] for one in working_steps(masses(vessel, OIL_READ), 0)}
    assert found["shell_factor"] == steps["K"]
    total = found["total_observed_volume_m3"]
    if "shell" not in more:
        assert total == pytest.approx(steps["K"] * steps["V(h)"], rel=EXACT)
    else:  # (πρgD³/8E) Σ [(H − z_k)² − (H − z_k+1)²]/t_k = 4.226e-4 (57.31/0.020 + 10.44/0.015) m³, thin-shell theory
        assert total - steps["K"] * steps["V(h)"] == pytest.approx(1.505, rel=0.005)
    parts = total - found["free_water_volume_m3"] + found["roof_correction_m3"]
    assert parts == pytest.approx(found["gross_observed_volume_m3"], rel=EXACT)
    assert found["gross_observed_volume_m3"] == whole["gross_observed_volume_m3"]
    assert found["free_water_volume_m3"] == whole["free_water_volume_m3"]
    displaced = -1.2e5 / found["liquid_density_kg_m3"] if "floating_roof" in more else 0.0
    assert found["roof_correction_m3"] == pytest.approx(displaced, rel=EXACT)
    assert (found["level_m"], found["free_water_level_m"]) == (8.231, 0.21)
    assert found["liquid_temperature_c"] == 24.3


def test_free_water_that_was_not_read_has_no_level_and_a_full_line_none_at_all() -> None:
    assert statement(GAS_OIL, PLAIN)["free_water_level_m"] is None
    line = statement(GAS_OIL, {"liquid_temperature_c": 24.0, "ambient_temperature_c": 9.0}, RECEIVER)
    assert line["level_m"] is line["free_water_level_m"] is None
    assert line["total_observed_volume_m3"] == line["gross_observed_volume_m3"] == pytest.approx(95.0, rel=1e-3)


def test_there_is_none_without_a_measured_liquid() -> None:
    assert "statement" not in answer(compiled(RECEIVER, HYDROGEN), GAS_READ, statement=True)
    assert "statement" not in answer(compiled(TANK), {"liquid_temperature_c": 15.0}, statement=True)
    assert "statement" not in answer(compiled(TANK), OIL_READ)


def test_rows_keep_their_own_statements() -> None:
    rows = [OIL_READ, {"liquid_temperature_c": 15.0}, OIL_READ | {"level_m": 4.0}]
    found = answers(masses(compiled(TANK), *rows), statement=True)
    assert [one.get("statement", {}).get("level_m") for one in found] == [8.231, None, 4.0]
    for row in (0, 2):
        assert found[row]["statement"] == answer(compiled(TANK), rows[row], statement=True)["statement"]


# --- its units -----------------------------------------------------------------------------------


def test_a_cubic_metre_is_6_289811_barrels() -> None:
    # Published to six decimals; exactly 42 US gallons of 231 in³, 9,702 in³ of (0.0254 m)³.
    at = statement(GAS_OIL, OIL_READ)["at_60_f"]
    ratio = at["net_standard_volume_bbl"] / at["net_standard_volume_m3"]
    assert ratio == pytest.approx(6.289811, abs=5e-7)
    assert 1.0 / ratio == pytest.approx(42 * 231 * 0.0254**3, rel=EXACT)


def test_water_of_60_f_has_10_degrees_api() -> None:
    # Published: API = 141.5/(ρ60/999.016) − 131.5, API MPMS 11.1-2004.
    water = liquid("expansivity", density_kg_m3=999.016, at_temperature_c=28.0 / 1.8, expansivity_per_k=2e-4)
    at = statement(water, PLAIN)["at_60_f"]
    assert at["api_gravity"] == pytest.approx(10.0, abs=1e-9)
    assert at["relative_density_60_60"] == pytest.approx(1.0, rel=EXACT)


def test_weight_in_air_is_that_of_the_inventory_in_three_units() -> None:
    whole = answer(compiled(TANK), OIL_READ, statement=True)
    found = whole["statement"]
    assert found["mass_kg"] == whole["liquid_mass_kg"]
    assert found["weight_in_air_kg"] == whole["weight_in_air_kg"]
    # 2,240 and 2,000 pounds of 0.45359237 kg: NIST Handbook 44, appendix C.
    assert found["weight_in_air_long_ton"] == pytest.approx(found["weight_in_air_kg"] / (2240 * 0.45359237), rel=EXACT)
    assert found["weight_in_air_short_ton"] == pytest.approx(found["weight_in_air_kg"] / (2000 * 0.45359237), rel=EXACT)
    for name in NAMES:  # by the density at a base instead of the one in the vessel: a few millionths
        by_base = found[name]["net_standard_volume_m3"] * found[name]["density_in_air_kg_m3"]
        assert by_base == pytest.approx(found["weight_in_air_kg"], rel=2e-5)


@pytest.mark.parametrize("density", [500.0, 700.0, 850.0, 1000.0])
def test_density_in_air_is_the_published_one_but_for_the_airs_density(density: float) -> None:
    """API MPMS 11.5.3, published: ρ_apparent = 1.000149926 ρ − 1.199407795, which is air of 1.199228 kg/m³.

    By its 1.2 kg/m³ OIML D 28 lies (1.2 − 1.199228)(1 − ρ/8000) kg/m³ lower, at most 0.0008.
    """
    published = 1.000149926 * density - 1.199407795
    ours = density * in_air(density)
    assert published - ours == pytest.approx((1.2 - 1.199228) * (1.0 - density / 8000.0), abs=1e-6)
    assert 0.0 < published - ours < 8e-4


# recomputed from W/M = (1 − ρ_a/ρ)/(1 − ρ_a/ρ_w) with 1.2 and 8000 kg/m³
@pytest.mark.parametrize(
    ("density", "factor"), [(500.0, 0.997750), (700.0, 0.998435), (850.0, 0.998738), (1000.0, 0.998950)]
)
def test_weight_in_air_over_mass(density: float, factor: float) -> None:
    assert in_air(density) == pytest.approx(factor, abs=5e-7)


# --- factors, against printed tables and the procedure -------------------------------------------


# Printed answers of the tables of 1980, four or five decimals; API and relative densities to 999.012 kg/m³ there.
@pytest.mark.parametrize(
    ("substance", "celsius", "base", "printed", "digits"),
    [
        (petroleum("refined", 141.5 / 194.5 * 999.016, 28 / 1.8), (75 - 32) / 1.8, "at_60_f", 0.9895, 4),  # 6B, API 63
        (petroleum("special", 850.0, alpha60_per_f=910e-6), (30 - 32) / 1.8, "at_60_f", 1.0271, 4),  # 6C
        (petroleum("special", 850.0, alpha60_per_f=650e-6), (30 - 32) / 1.8, "at_60_f", 1.0194, 4),  # 24C
    ],
    ids=["6B", "6C", "24C"],
)
def test_the_factor_to_five_decimals_is_the_printed_one(
    substance: Body, celsius: float, base: str, printed: float, digits: int
) -> None:
    at = statement(substance, PLAIN | {"liquid_temperature_c": celsius})[base]
    assert round(at["temperature_factor_table"], digits) == printed


# The procedure of 2004, recomputed in 40-digit decimals: commodity, density, its base, C_T at a temperature.
@pytest.mark.parametrize(
    ("commodity", "density", "base", "celsius", "factor"),
    [
        ("crude", 850.0, 15, 40.0, 0.97861576), ("crude", 850.0, 20, 40.0, 0.98294529),
        ("refined", 745.0, 15, 30.0, 0.98170215), ("refined", 745.0, 20, 30.0, 0.98781894),
        ("refined", 780.0, 15, 30.0, 0.98422612), ("refined", 820.0, 15, 30.0, 0.98667929),
        ("refined", 960.0, 15, 60.0, 0.96779026), ("lubricating", 880.0, 15, 60.0, 0.96760618),
    ],
)  # fmt: skip
def test_the_factor_unrounded_is_that_of_the_procedure(
    commodity: str, density: float, base: int, celsius: float, factor: float
) -> None:
    at = statement(petroleum(commodity, density, float(base)), PLAIN | {"liquid_temperature_c": celsius})
    assert at[f"at_{base}_c"]["density_kg_m3"] == pytest.approx(density, rel=1e-11)
    assert at[f"at_{base}_c"]["temperature_factor"] == pytest.approx(factor, abs=5e-9)


# --- pitfalls ------------------------------------------------------------------------------------


def test_pitfall_5_a_density_says_its_base() -> None:
    # 850 kg/m³ of crude at 15 °C, or at 20 °C: 849.59848 or 853.20265 at 60 °F (recomputed from API MPMS 11.1-2004).
    at_15, at_20 = (statement(petroleum("crude", 850.0, at), PLAIN) for at in (15.0, 20.0))
    assert at_15["at_60_f"]["density_kg_m3"] == pytest.approx(849.59848, abs=5e-6)
    assert at_20["at_60_f"]["density_kg_m3"] == pytest.approx(853.20265, abs=5e-6)
    # 849.59848/999.016 and 141.5/0.85043531 − 131.5; over the water of 4 °C, 999.975 kg/m³, 850 would be 0.85002.
    assert at_15["at_60_f"]["relative_density_60_60"] == pytest.approx(0.85043531, abs=5e-9)
    assert at_15["at_60_f"]["api_gravity"] == pytest.approx(34.885377, abs=5e-6)
    assert not {"api_gravity", "relative_density_60_60"} & {*at_15["at_15_c"], *at_15["at_20_c"]}
    # Taking the one for the other is 0.44 % of the mass: 0.98294529/0.97861576.
    assert at_20["mass_kg"] / at_15["mass_kg"] == pytest.approx(1.0044241, abs=5e-7)


def test_pitfall_6_a_refined_products_group_follows_its_density_and_crude_is_declared() -> None:
    """C_T from 15 to 30 °C, recomputed from API MPMS 11.1-2004 with the constants of each group."""
    warm = PLAIN | {"liquid_temperature_c": 30.0}
    for density, group, factor in ((745.0, "gasolines", 0.98170215), (780.0, "transition", 0.98422612),
                                   (820.0, "jet fuels", 0.98667929)):  # fmt: skip
        vessel = compiled(TANK, petroleum("refined", density), site=SEA)
        texts = {one["symbol"]: one["method"] for one in working_steps(masses(vessel, warm), 0)}
        assert texts["ρ60"].endswith(group)
        at = answer(vessel, warm, statement=True)["statement"]["at_15_c"]
        assert at["temperature_factor"] == pytest.approx(factor, abs=5e-9)
    # 836.9 kg/m³ declared as crude instead of refined: 2.1e-4 of the volume at 22.45 °C.
    here = PLAIN | {"liquid_temperature_c": 22.45}
    crude, refined = (statement(petroleum(kind, 836.9), here)["at_15_c"] for kind in ("crude", "refined"))
    volumes = refined["gross_standard_volume_m3"] / crude["gross_standard_volume_m3"]
    assert volumes - 1.0 == pytest.approx(2.1e-4, abs=5e-6)


def test_pitfall_8_nothing_is_computed_by_a_rounded_factor() -> None:
    # 850 kg/m³ of crude from 40 to 15 °C: 0.97861576, in a table 0.97862; 4.33e-6 of the volume between them.
    found = statement(petroleum("crude", 850.0), PLAIN)
    at, gross = found["at_15_c"], found["gross_observed_volume_m3"]
    assert at["temperature_factor_table"] == 0.97862
    assert at["gross_standard_volume_m3"] / gross == pytest.approx(0.97861576, abs=5e-9)
    rounded = gross * at["temperature_factor_table"]
    assert rounded / at["gross_standard_volume_m3"] - 1.0 == pytest.approx(4.33e-6, abs=1e-8)


def test_pitfall_18_net_volume_by_the_wet_density_is_too_much() -> None:
    """f (ρ_w − ρ)/ρ: 0.5 % of water in 850 kg/m³, 0.005 (999.1 − 850)/850 = 0.088 % of the mass."""
    row = PLAIN | {"liquid_temperature_c": 15.0, "observed_density_kg_m3": 850.0,
                   "observed_density_temperature_c": 15.0, "sediment_water_pct": 0.5}  # fmt: skip
    found = statement(petroleum("crude", 845.0), row)
    net = found["at_15_c"]["net_standard_volume_m3"]
    assert net * 850.0 / found["mass_kg"] - 1.0 == pytest.approx(8.77e-4, rel=0.01)
    # (850 − 0.005 · 999.10)/0.995, with water of 999.10 kg/m³ at 15 °C
    assert found["at_15_c"]["density_kg_m3"] == pytest.approx(849.2508, abs=1e-3)
