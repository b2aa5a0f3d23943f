"""A search over the chain finds what the chain was given, and says where nothing has the mass."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace

import numpy as np
import pytest
from numpy.typing import NDArray

from models.columns import Mark, Method, State
from models.constants import GAS_CONSTANT
from models.expected import Expected, full_temperature, level_of_mass, pressure_of_mass, temperature_of_mass
from models.geometry import shapes
from models.liquid.definition import ExpansivityLiquid
from models.mass import inventory
from models.saturation import SaturationColumns
from tests.models.mass_cases import (
    BULLET_CASE,
    CASES,
    FLOATING,
    NITROGEN,
    OIL,
    PROPANE,
    SPHERE_CASE,
    UPRIGHT,
    Case,
    state,
    vessels,
)  # fmt: skip

Column = NDArray[np.float64]
GAUGED = [case for case in CASES if case.method & Method.LIQUID and not case.method & Method.FULL]
STEEL_FREE = {"expansion": 0.0}


def ours(cases: Sequence[Case]) -> NDArray[np.intp]:
    return np.arange(len(cases), dtype=np.intp)


def masses(cases: Sequence[Case], **read: Column) -> Column:
    return np.array(inventory(vessels(cases), ours(cases), replace(state(cases), **read))["mass"])


def levels(cases: Sequence[Case], wanted: Column) -> Expected:
    return level_of_mass(vessels(cases), ours(cases), replace(state(cases), level=np.full(len(cases), np.nan)), wanted)


# --- levels --------------------------------------------------------------------------------------


def test_every_kind_of_vessel_gets_its_level_back_in_one_call() -> None:
    """Roofs afloat and landing, water, courses, vapour measured and saturated, a blanket: as they were read."""
    found = levels(GAUGED, masses(GAUGED))
    assert found.value == pytest.approx(state(GAUGED).level, rel=1e-13)
    assert masses(GAUGED, level=found.value) == pytest.approx(masses(GAUGED), rel=1e-14)


def test_the_level_of_a_cylinder_is_its_volume_by_its_area() -> None:
    """Dry, at the sample's own temperature and the shell's: h = m/(ρ π D²/4)."""
    plain = Case(
        "plain", Method.LIQUID, shapes.vertical_cylinder(diameter=10.0, height=12.0), STEEL_FREE,
        {"liquid_temperature": 288.15, "density": 800.0}, liquid=ExpansivityLiquid((8e-4,), 288.15, 0.0),
    )  # fmt: skip
    found = levels([plain, plain.reads(liquid_temperature=298.15)], np.array([4e5, 4e5]))
    upright = 4e5 / (800.0 * 25.0 * math.pi)
    assert found.value == pytest.approx([upright, upright * math.exp(8e-3)], rel=1e-13)


def test_masses_at_the_ends_have_the_levels_at_the_ends() -> None:
    case = OIL.reads(water_level=-math.inf)
    top = masses([case], level=np.array([UPRIGHT.top]))
    assert levels([case], top).value == pytest.approx([UPRIGHT.top], rel=1e-15)
    assert levels([case], np.array([0.0])).value == [UPRIGHT.bottom]
    assert levels([case], top * (1 + 1e-13)).value == [UPRIGHT.top]


@pytest.mark.parametrize("share", [1.0 + 1e-9, 1.5, 1e6])
def test_more_than_the_vessel_holds_has_no_level(share: float) -> None:
    top = masses([OIL], level=np.array([UPRIGHT.top]))
    found = levels([OIL], top * share)
    assert np.isnan(found.value).all()
    assert (found.nearest, found.most) == ([UPRIGHT.top], pytest.approx(top, rel=1e-15))


def test_less_than_the_vapour_alone_has_no_level() -> None:
    bottom = masses([SPHERE_CASE], level=np.array([0.0]))
    found = levels([SPHERE_CASE], 0.999 * bottom)
    assert np.isnan(found.value).all()
    assert found.nearest == [0.0] and found.least == pytest.approx(bottom, rel=1e-15)


def test_below_the_free_water_nothing_is_looked_for() -> None:
    assert levels([OIL], np.array([1.0])).value >= OIL.reading["water_level"]
    assert levels([OIL], np.array([0.0])).value == pytest.approx([OIL.reading["water_level"]], rel=1e-12)


def test_of_several_levels_with_one_mass_the_highest_is_taken() -> None:
    """A roof so heavy that its legs come off over a fall of mass: 400 t over 0.3 m of 707 m² at 0.84 t/m³."""
    heavy = replace(FLOATING, vessel=FLOATING.vessel | {"roof_mass": 4e5})
    below, above = masses([heavy, heavy], level=np.array([1.8, 2.1]))
    assert below > above
    wanted = np.array([0.5 * (below + above)])
    found = levels([heavy], wanted).value
    assert found > 2.1 and masses([heavy], level=found) == pytest.approx(wanted, rel=1e-14)


def test_what_has_no_mass_at_any_level_says_so() -> None:
    found = levels([BULLET_CASE.reads(liquid_temperature=math.nan)], np.array([1e4]))
    assert all(np.isnan(getattr(found, name)).all() for name in ("value", "least", "most"))


def test_a_mass_beside_a_vapour_that_is_not_computed_has_its_level_all_the_same() -> None:
    """Near its critical temperature a little vapour is left out; more is taken halfway to its bound."""
    hot = BULLET_CASE.reads(liquid_temperature=362.0, vapour_temperature=math.nan, pressure=math.nan)
    high, low = masses([hot, hot], level=np.array([2.99, 0.5]))
    assert math.isfinite(high) and math.isfinite(low)
    assert levels([hot], np.array([high])).value == pytest.approx([2.99], rel=1e-13)
    assert levels([hot], np.array([low])).value == pytest.approx([0.5], rel=1e-13)


def test_one_state_serves_many_masses_of_one_vessel() -> None:
    levels_read = np.linspace(0.6, 15.0, 500)
    one = state([OIL])
    wanted = inventory(vessels([OIL]), None, replace(one, level=levels_read))["mass"]
    found = level_of_mass(vessels([OIL]), None, one, np.array(wanted))
    assert found.value == pytest.approx(levels_read, rel=1e-12)


# --- gases ---------------------------------------------------------------------------------------


def gas(sought: str, case: Case, wanted: float) -> Expected:
    search = {"pressure": pressure_of_mass, "vapour_temperature": temperature_of_mass}[sought]
    blank: State = replace(state([case]), **{sought: np.array([math.nan])})
    return search(vessels([case]), None, blank, np.array([wanted]))


@pytest.mark.parametrize("sought", ["pressure", "vapour_temperature"])
@pytest.mark.parametrize(("pressure", "kelvin"), [(3.1e6, 297.2), (1.2e5, 500.0), (1e7, 310.0), (10.0, 250.0)])
def test_a_gas_gets_its_pressure_and_its_temperature_back(sought: str, pressure: float, kelvin: float) -> None:
    case = NITROGEN.reads(pressure=pressure, vapour_temperature=kelvin)
    found = gas(sought, case, float(masses([case])[0]))
    assert found.value == pytest.approx([case.reading[sought]], rel=1e-13)


def test_a_thin_gas_is_an_ideal_gas() -> None:
    """1 g of nitrogen, 28.0134 g/mol, in 50 m³ at 300 K; B = −4 cm³/mol is nothing there."""
    case = replace(NITROGEN, vessel=STEEL_FREE).reads(vapour_temperature=300.0)
    ideal = 1e-3 / 28.0134e-3 * GAS_CONSTANT * 300.0 / 50.0
    assert gas("pressure", case, 1e-3).value == pytest.approx([ideal], rel=1e-6)
    assert gas("vapour_temperature", case.reads(pressure=ideal), 1e-3).value == pytest.approx([300.0], rel=1e-6)


def test_an_ambient_temperature_that_is_not_known_is_the_gas_s_own() -> None:
    alone = NITROGEN.reads(ambient_temperature=297.2)
    wanted = float(masses([alone])[0])
    found = gas("vapour_temperature", alone.reads(ambient_temperature=math.nan), wanted)
    assert found.value == pytest.approx([297.2], rel=1e-13)


def test_a_gas_too_dense_for_its_equation_ends_where_that_is_said() -> None:
    for sought in ("pressure", "vapour_temperature"):
        found = gas(sought, NITROGEN, 3e4)
        assert np.isnan(found.value).all()
        marks = inventory(vessels([NITROGEN]), None, replace(state([NITROGEN]), **{sought: found.nearest})).marks
        assert marks & int(Mark.GUARD_REFUSED | Mark.NO_VAPOUR_ROOT | Mark.OUTSIDE_METHOD)


def test_a_gas_hotter_than_its_coefficients_has_no_temperature() -> None:
    found = gas("vapour_temperature", NITROGEN, 1.0)
    assert np.isnan(found.value).all() and found.least > 1.0
    assert masses([NITROGEN], vapour_temperature=found.nearest) == pytest.approx(found.least, rel=1e-15)


# --- a vessel that is full -----------------------------------------------------------------------


def filled_at(case: Case, wanted: float, boils: str = "propane") -> Expected:
    columns = SaturationColumns.from_compositions([{boils: 1.0}])
    row = np.zeros(1, dtype=np.intp)
    return full_temperature(vessels([case]), None, state([case]), np.array([wanted]), columns, row)


def test_the_full_temperature_of_a_liquid_of_constant_expansivity_is_a_logarithm() -> None:
    """Without κ and without steel's expansion: ρ_0 exp(−β (T − T_0)) V = m."""
    plain = replace(SPHERE_CASE, vessel=STEEL_FREE, liquid=ExpansivityLiquid((3e-3,), 288.15, 0.0))
    case = plain.reads(density=507.0, density_temperature=288.15)
    volume = math.pi / 6.0 * 18.0**3
    found = filled_at(case, 0.85 * 507.0 * volume)
    assert found.value == pytest.approx([288.15 - math.log(0.85) / 3e-3], rel=1e-12)
    overfull = filled_at(case, 1.05 * 507.0 * volume)
    assert overfull.value == pytest.approx([288.15 - math.log(1.05) / 3e-3], rel=1e-12)


def test_the_steel_s_growth_and_the_liquid_s_squeeze_make_room() -> None:
    """By one step of Newton from the plain answer: 3 α and κ dp/dT against β; the strain by pressure is left out."""
    base = replace(SPHERE_CASE, vessel=STEEL_FREE, liquid=ExpansivityLiquid((3e-3,), 288.15, 0.0))
    base = base.reads(density=507.0, density_temperature=288.15, density_pressure=7.3e5)
    wanted = 0.95 * 507.0 * math.pi / 6.0 * 18.0**3
    bare = float(filled_at(base, wanted).value[0])
    steel = float(filled_at(replace(base, vessel={}), wanted).value[0])
    grown = 3.0 * math.log1p(1.12e-5 * (steel - 288.15))
    assert 3e-3 * (steel - bare) == pytest.approx(grown, rel=1e-9)
    squeezed = replace(base, liquid=ExpansivityLiquid((3e-3,), 288.15, 4e-9))
    columns = SaturationColumns.from_compositions([{"propane": 1.0}])
    warm = float(filled_at(squeezed, wanted).value[0])
    pressure = float(columns.pressure(warm)[0])
    assert 3e-3 * (warm - bare) == pytest.approx(4e-9 * (pressure - 7.3e5), rel=1e-9)


def test_free_water_leaves_less_room() -> None:
    case = replace(OIL, vessel=STEEL_FREE).reads(sediment_water=0.0, density=840.0, density_temperature=288.15)
    whole = UPRIGHT.capacity
    depth = OIL.reading["water_level"]
    cone = math.pi * 15.0**2 * 0.3 / 3.0
    water = cone + math.pi * 15.0**2 * (depth - 0.3)
    kg = 0.9 * 840.0 * (whole - water)
    found = filled_at(case, kg, boils="n-decane")
    # κ lifts the density by less than 1e-4 at these pressures.
    assert found.value == pytest.approx([288.15 - math.log(0.9) / 8.3e-4], abs=0.1)
    assert filled_at(case.reads(water_level=-math.inf), kg, boils="n-decane").value > found.value + 10.0


def test_a_mass_that_fills_the_vessel_at_no_temperature_of_the_method_has_none() -> None:
    few = filled_at(replace(SPHERE_CASE, liquid=PROPANE), 1e4)
    assert np.isnan(few.value).all() and few.least > 1e4
