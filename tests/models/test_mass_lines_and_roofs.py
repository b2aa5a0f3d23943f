"""A line that is kept full has a mass without a level; what lies on a floating roof weighs as the roof does."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from models.columns import Inventory, Mark, Method
from models.geometry.shell import pressure_strain
from models.mass import inventory
from tests.models.mass_cases import ATMOSPHERE, CRUDE, DEDUCTED, FLOATING, STEEL, Case, state, vessels

# 12 m³ of a line of 0.3 m, 8 mm of steel: its table was made at 15 °C, without pressure.
STRAINS = pressure_strain("horizontal_cylinder", 0.3, 0.008, 207e9, 0.3)
LINE = Case(
    "line kept full", Method.LIQUID | Method.FULL, None,
    {"liquid_weight": 1.0, "strain_sum": STRAINS[0], "strain_vertical": STRAINS[1]},
    {"liquid_temperature": 303.4, "density": 846.0, "density_temperature": 293.7, "pressure": ATMOSPHERE + 2e6},
    capacity=12.0, liquid=CRUDE,
)  # fmt: skip
STEPS = {
    "liquid_temperature": 1e-2, "ambient_temperature": 1e-1, "pressure": 3e2, "density": 1e-2,
    "density_temperature": 1e-2, "sediment_water": 1e-5,
}  # fmt: skip


def of(case: Case, load: float | None = None) -> Inventory:
    """One case's columns, with a load on its roof."""
    read = state([case])
    return inventory(vessels([case]), None, read if load is None else replace(read, roof_load=np.array([load])))


def mass(case: Case, load: float | None = None) -> float:
    return float(of(case, load)["mass"][0])


# --- lines kept full ------------------------------------------------------------------------------


def test_a_line_kept_full_holds_its_capacity_stretched_at_the_density_of_the_state() -> None:
    own = of(LINE)
    density = 846.0 * math.exp(-8.3e-4 * 9.7 + 7.5e-10 * 2e6)
    # All three strains of a full vessel: no part of the shell is dry.
    factor = (1.0 + STEEL * (303.4 - 288.15) + STRAINS[0] * 2e6 / 3.0) ** 3
    assert own["mass"][0] == pytest.approx(12.0 * factor * density, rel=1e-12)
    assert own["liquid_density"][0] == pytest.approx(density, rel=1e-12)
    assert own["gross_observed_volume"][0] == pytest.approx(12.0 * factor, rel=1e-12)
    # At 15 °C and one atmosphere, where the sample was at 20.55 °C and one atmosphere.
    standard = 846.0 * math.exp(8.3e-4 * (293.7 - 288.15))
    assert own["standard_density"][0] == pytest.approx(standard, rel=1e-12)
    assert own["gross_standard_volume"][0] == pytest.approx(12.0 * factor * density / standard, rel=1e-12)
    assert (own["level_fraction"][0], own["free_water_volume"][0]) == (1.0, 0.0)
    assert own.marks[0] == 0


def test_the_strain_of_a_closed_cylinder_under_pressure_is_the_textbooks() -> None:
    # Thin shell with closed ends, Young's and Poisson's definitions: pD/(4tE) · (5 − 4ν) of the volume.
    assert STRAINS[0] == pytest.approx(0.3 / (4.0 * 0.008 * 207e9) * (5.0 - 4.0 * 0.3), rel=1e-12)


def test_a_line_does_not_ask_for_a_level_nor_for_free_water() -> None:
    assert mass(LINE.reads(level=3.0, water_level=1.0)) == mass(LINE)
    assert of(LINE).sensitivities["level"][0] == 0.0
    assert of(LINE).sensitivities["water_level"][0] == 0.0


@pytest.mark.parametrize("name", ["liquid_temperature", "density", "density_temperature"])
def test_a_line_without_its_temperature_or_density_has_no_mass(name: str) -> None:
    own = of(LINE.reads(**{name: math.nan}))
    assert math.isnan(own["mass"][0])
    assert own.marks[0] & Mark.MISSING


@pytest.mark.parametrize("weight", [1.0, 7.0 / 8.0], ids=["insulated", "bare"])
@pytest.mark.parametrize("name", STEPS)
def test_each_sensitivity_of_a_line_is_the_slope_of_its_mass(name: str, weight: float) -> None:
    case = replace(LINE, vessel=LINE.vessel | {"liquid_weight": weight}).reads(sediment_water=0.004)
    step = STEPS[name]
    value = float(getattr(state([case]), name)[0])
    slope = (mass(case.reads(**{name: value + step})) - mass(case.reads(**{name: value - step}))) / (2.0 * step)
    nothing = 1e-15 * mass(case) / step
    assert of(case).sensitivities[name][0] == pytest.approx(slope, rel=2e-6, abs=nothing)


def test_the_capacity_and_the_density_of_a_line_scale_its_mass() -> None:
    own = of(LINE)
    assert own.sensitivities["capacity"][0] == pytest.approx(own["mass"][0], rel=1e-12)
    assert own.sensitivities["density"][0] == pytest.approx(own["mass"][0] / 846.0, rel=1e-12)
    assert mass(replace(LINE, capacity=24.0)) == pytest.approx(2.0 * mass(LINE), rel=1e-12)


def test_lines_and_tanks_are_computed_together_as_alone() -> None:
    cases = [FLOATING, LINE, FLOATING.reads(level=3.0), LINE.reads(pressure=ATMOSPHERE)]
    together = inventory(vessels(cases), np.arange(4), state(cases))["mass"]
    np.testing.assert_allclose(together, [mass(case) for case in cases], rtol=1e-14)


# --- what lies on a roof --------------------------------------------------------------------------

LOAD = 30_000.0
DRY = {"sediment_water": 0.0}


@pytest.mark.parametrize("case", [FLOATING, DEDUCTED], ids=["free table", "table that deducts the roof"])
def test_a_load_displaces_its_own_weight_while_the_roof_floats(case: Case) -> None:
    """The table's deduction is of the roof alone: of the load nothing is in it."""
    afloat = case.reads(level=8.0, **DRY)
    assert mass(afloat) - mass(afloat, LOAD) == pytest.approx(LOAD, rel=1e-9)
    own, loaded = of(afloat), of(afloat, LOAD)
    volumes = own["gross_observed_volume"][0] - loaded["gross_observed_volume"][0]
    assert volumes == pytest.approx(LOAD / own["liquid_density"][0], rel=1e-9)


@pytest.mark.parametrize("case", [FLOATING, DEDUCTED], ids=["free table", "table that deducts the roof"])
@pytest.mark.parametrize(("level", "share"), [(1.0, 0.0), (1.8, 0.0), (1.95, 0.5), (2.1, 1.0)])
def test_legs_carry_the_load_as_they_carry_the_roof(case: Case, level: float, share: float) -> None:
    # Lands at 1.8 m, floats at 2.1 m, linear between them.
    landing = case.reads(level=level, water_level=0.1, **DRY)
    assert mass(landing) - mass(landing, LOAD) == pytest.approx(share * LOAD, rel=1e-9, abs=1e-6)


def test_a_load_in_the_landing_zone_may_be_afloat_or_not() -> None:
    landing = FLOATING.reads(level=1.93, water_level=0.1, **DRY)
    assert of(landing, LOAD).sensitivities["roof"][0] == pytest.approx(1.2e5 + LOAD, rel=1e-12)
    assert of(landing, LOAD).marks[0] & Mark.ROOF_LANDING_ZONE


@pytest.mark.parametrize("level", [1.93, 8.0])
def test_the_slope_by_level_knows_the_load(level: float) -> None:
    case, step = FLOATING.reads(level=level, water_level=0.1), 1e-4
    slope = (mass(case.reads(level=level + step), LOAD) - mass(case.reads(level=level - step), LOAD)) / (2.0 * step)
    # dK/dh is left out of it, at most a strain of 5e-4 times a number near 1 to 3.
    assert of(case, LOAD).sensitivities["level"][0] == pytest.approx(slope, rel=2e-3)


def test_no_load_is_a_load_of_nothing() -> None:
    case = FLOATING.reads(level=8.0)
    assert mass(case, 0.0) == mass(case)


def test_each_row_has_its_own_load() -> None:
    cases = [FLOATING.reads(level=8.0, **DRY)] * 3
    read = replace(state(cases), roof_load=np.array([0.0, 1e4, 2e4]))
    found = inventory(vessels(cases[:1]), None, read)["mass"]
    np.testing.assert_allclose(found[0] - found, [0.0, 1e4, 2e4], rtol=1e-9, atol=1e-6)
