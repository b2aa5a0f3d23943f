"""The chain from readings to mass: its derivatives, its worked examples, and what it must not do."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest

from models.arrays import BLOCK_ROWS
from models.columns import Mark, Method, Vessels
from models.constants import GAS_CONSTANT
from models.geometry import shapes
from models.liquid.definition import ExpansivityLiquid
from models.mass import inventory, standard_uncertainty
from tests.models.mass_cases import (
    BULLET_CASE,
    CASES,
    NITROGEN,
    NO_WATER,
    OIL,
    READING,
    ROOF,
    SPHERE_CASE,
    TWO_PHASE,
    Case,
    state,
    vessels,
)

# --- derivatives ----------------------------------------------------------------------------------

STEPS = {
    "level": 1e-4, "water_level": 1e-4, "liquid_temperature": 1e-2, "ambient_temperature": 1e-1,
    "vapour_temperature": 1e-2, "pressure": 3e2, "density": 1e-2, "density_temperature": 1e-2,
    "sediment_water": 1e-5,
}  # fmt: skip
"""Steps of the central differences: third derivatives and rounding (1e-16 of the mass over the step) are
both below 1e-7 of the slope at each."""

CLOSE = 2e-6
"""Of a derivative: three decades above the differences' own error, a decade above ε², which K leaves out."""

BY_LEVEL = 2e-3
"""Of the slope by level: dK/dh is left out of it, at most a strain of 5e-4 times a number near 1 to 3."""


def difference(case: Case, name: str) -> float:
    """Slope of the whole chain by one reading."""
    step = STEPS[name]
    value = (READING | case.reading)[name]
    pair = [case.reads(**{name: value + step}), case.reads(**{name: value - step})]
    above, below = inventory(vessels(pair), np.arange(2), state(pair))["mass"]
    return float(above - below) / (2.0 * step)


def scaled(given: Vessels, factor: float) -> Vessels:
    """Vessels whose every volume is larger by one factor."""
    curves = given.curves
    if curves is not None:
        curves = replace(
            curves, coefficients=curves.coefficients * factor, capacity=curves.capacity * factor,
            volume_at_top=curves.volume_at_top * factor,
        )  # fmt: skip
    return replace(given, curves=curves, capacity=given.capacity * factor)


def expanding(case: Case, factor: float) -> Vessels:
    """A vessel whose liquid expands more by one factor."""
    liquid = case.liquid
    assert isinstance(liquid, ExpansivityLiquid)
    return vessels([replace(case, liquid=replace(liquid, coefficients=tuple(b * factor for b in liquid.coefficients)))])


def heavier(given: Vessels, factor: float) -> Vessels:
    """Vessels whose vapour has a larger molar mass."""
    assert given.vapour is not None
    return replace(given, vapour=replace(given.vapour, molar_mass=given.vapour.molar_mass * factor))


def by_vessel(case: Case, change: Callable[[Vessels, float], Vessels]) -> float:
    """Slope of the whole chain by the logarithm of something that the vessel's definition says."""
    own, read, step = vessels([case]), state([case]), 1e-5
    above = inventory(change(own, 1.0 + step), None, read)["mass"][0]
    below = inventory(change(own, 1.0 - step), None, read)["mass"][0]
    return float(above - below) / (2.0 * step)


@pytest.mark.parametrize("case", CASES, ids=lambda case: case.name)
@pytest.mark.parametrize("name", STEPS)
def test_each_sensitivity_to_a_reading_is_the_slope_of_the_whole_chain(case: Case, name: str) -> None:
    own = inventory(vessels([case]), None, state([case]))
    assert np.isfinite(own["mass"][0])
    if name == "vapour_temperature" and math.isnan(case.reading.get(name, math.nan)):
        return  # what no thermometer reads has a slope of its own: the test after this one
    if name == "pressure" and math.isnan(case.reading.get("pressure", 0.0)):
        assert own.sensitivities["pressure"][0] == 0.0
        return
    found, slope = own.sensitivities[name][0], difference(case, name)
    # A slope of nothing is found as the rounding of two masses over the step.
    nothing = 1e-15 * own["mass"][0] / STEPS[name]
    assert found == pytest.approx(slope, rel=BY_LEVEL if name == "level" else CLOSE, abs=nothing)


@pytest.mark.parametrize("without", ["pressure", "vapour_temperature"])
def test_a_saturated_vapour_keeps_its_slope_by_a_departure_from_saturation(without: str) -> None:
    case = BULLET_CASE.reads(**({"vapour_temperature": math.nan} | {without: math.nan}))
    own = inventory(vessels([case]), None, state([case]))
    temperature, pressure = own["vapour_temperature"][0], own["vapour_pressure"][0]
    measured = case.reads(vapour_temperature=temperature + 0.02, pressure=pressure)  # just dry: nothing is replaced
    expected = difference(measured, "vapour_temperature")
    assert own.sensitivities["vapour_temperature"][0] == pytest.approx(expected, rel=1e-3)


@pytest.mark.parametrize("case", CASES, ids=lambda case: case.name)
def test_each_sensitivity_to_a_definition_is_the_slope_of_the_whole_chain(case: Case) -> None:
    own = inventory(vessels([case]), None, state([case])).sensitivities
    assert own["capacity"][0] == pytest.approx(by_vessel(case, scaled), rel=CLOSE)
    if case.method & Method.LIQUID:
        above, below = (inventory(expanding(case, 1.0 + step), None, state([case])) for step in (1e-5, -1e-5))
        slope = float(above["mass"][0] - below["mass"][0]) / 2e-5
        assert own["expansion"][0] == pytest.approx(slope, rel=CLOSE)
    if case.method & Method.VAPOUR:
        assert own["molar_mass"][0] == pytest.approx(by_vessel(case, heavier), rel=CLOSE)


def test_the_local_error_of_a_table_lifts_the_liquid_and_takes_the_vapour() -> None:
    own = inventory(vessels([SPHERE_CASE]), None, state([SPHERE_CASE]))
    expected = (own["liquid_density"] - own["vapour_density"]) * own["shell_factor"] * own["tank_volume"]
    np.testing.assert_allclose(own.sensitivities["capacity_local"], expected, rtol=1e-12)


def test_the_vapours_model_error_is_its_relative_error_of_the_vapour() -> None:
    own = inventory(vessels([NITROGEN]), None, state([NITROGEN]))
    share = own.sensitivities["vapour_model"][0] / own["vapour_mass"][0]
    assert 5e-5 < share < 5e-3  # 0.01 to 1 % at 95 % is what a fitted series is good for


def test_a_roof_in_its_landing_zone_is_uncertain_by_its_mass() -> None:
    afloat = replace(OIL, method=Method.LIQUID | Method.ROOF, vessel=ROOF)
    cases = [afloat.reads(level=1.93, sediment_water=0.0), afloat.reads(level=2.2), afloat.reads(level=1.7)]
    own = inventory(vessels(cases), np.arange(3), state(cases))
    np.testing.assert_allclose(own.sensitivities["roof"], [1.2e5, 0.0, 0.0], rtol=1e-12)
    assert [bool(mark & Mark.ROOF_LANDING_ZONE) for mark in own.marks] == [True, False, False]


# --- worked examples ------------------------------------------------------------------------------


def half_full(**vessel: float) -> Case:
    """Half an 18 m sphere of liquid propane at 20 °C, 500 kg/m³, in steel of API's 1.116e-5 1/K."""
    return Case(
        "half-full sphere", Method.LIQUID, shapes.sphere(diameter=18.0), {"liquid_weight": 1.0} | vessel,
        {"level": 9.0, "liquid_temperature": 293.15, "density": 500.0, "density_temperature": 293.15},
    )  # fmt: skip


def test_a_half_full_sphere_holds_256_kg_more_when_its_shell_is_20_k_warmer() -> None:
    # 1 + 3 ε R/(3R − h) is 1.5 ε at half: 1.5 · 1.116e-5 · 20 · (2/3) π 9³ · 500 = 255.6, by hand
    cases = [half_full(expansion=1.116e-5, expansion_temperature=273.15), half_full(expansion=0.0)]
    warm, still = inventory(vessels(cases), np.arange(2), state(cases))["mass"]
    assert warm - still == pytest.approx(256.0, abs=0.5)
    assert still == pytest.approx(2.0 / 3.0 * math.pi * 729.0 * 500.0, rel=1e-12)


def test_a_roofs_displacement_is_the_published_excerpts() -> None:
    """1 215 000 lb of roof, deducted at 35.0 °API; at 42.4 °API 181.97 bbl are subtracted.

    API MPMS ch. 12.1.1, excerpt of a tank table as quoted in inspectors' handbooks: ±24.59 bbl for each
    °API is the slope at 35.0, the chord to 42.4 is 0.2 % less; 141.5/(131.5 + °API) is the relative density.
    """
    pound, barrel, water = 0.45359237, 0.158987294928, 999.016
    deducted, observed = (141.5 / (131.5 + api) * water for api in (35.0, 42.4))
    case = replace(OIL, method=Method.LIQUID | Method.ROOF).reads(
        level=6.0, water_level=-math.inf, density=observed, density_temperature=288.15, liquid_temperature=288.15,
        sediment_water=0.0,
    )  # fmt: skip
    given = {"roof_mass": 1_215_000 * pound, "roof_lands": 1.22, "roof_floats": 1.52, "expansion": 0.0}
    case = replace(case, vessel=given | {"roof_volume_per_mass": 1.0 / deducted})
    without = replace(case, vessel=given | {"roof_mass": 0.0})
    own = inventory(vessels([case, without]), np.arange(2), state([case, without]))
    assert own["roof_volume"][0] / barrel == pytest.approx(-181.97, abs=0.6)
    change = own["gross_observed_volume"][0] - own["gross_observed_volume"][1]
    assert change == pytest.approx(own["roof_volume"][0], rel=1e-9)
    # where no table deducts it, the whole displacement is the roof's mass over the density
    bare = replace(case, vessel=given)
    alone = inventory(vessels([bare, without]), np.arange(2), state([bare, without]))
    assert alone["mass"][0] - alone["mass"][1] == pytest.approx(-1_215_000 * pound, rel=1e-9)


# Saturated liquid densities [kg/m³] of the reference equations, computed with CoolProp 8.0.0 (HEOS):
# propane, Lemmon et al. 2009; n-butane, Bücker and Wagner 2006; ammonia, Gao et al. 2020; carbon dioxide,
# Span and Wagner 1996. The masses [t] are their products with the same equations' saturated vapour, rounded.
TWO_PHASE_ROWS = [
    ("propane", 100.0, 20.0, 500.06, 0.85, 42.5, 0.27),
    ("propane", 100.0, 20.0, 500.06, 0.50, 25.0, 0.90),
    ("propane", 100.0, 20.0, 500.06, 0.20, 10.0, 1.45),
    ("propane", 100.0, 20.0, 500.06, 0.05, 2.5, 1.72),
    ("propane", 100.0, 40.0, 467.46, 0.85, 39.7, 0.45),
    ("propane", 100.0, 40.0, 467.46, 0.30, 14.0, 2.11),
    ("n-butane", 2000.0, 20.0, 578.59, 0.85, 984.0, 1.6),
    ("n-butane", 2000.0, 20.0, 578.59, 0.30, 347.0, 7.4),
    ("ammonia", 300.0, 20.0, 610.39, 0.85, 155.6, 0.30),
    ("ammonia", 300.0, 20.0, 610.39, 0.30, 54.9, 1.41),
    ("carbon-dioxide", 50.0, -20.0, 1031.66, 0.90, 46.4, 0.26),
    ("carbon-dioxide", 50.0, -20.0, 1031.66, 0.30, 15.5, 1.81),
]


@pytest.mark.parametrize("row", TWO_PHASE_ROWS, ids=lambda row: f"{row[0]} {row[2]:g} °C {row[4]:.0%}")
def test_a_two_phase_vessel_holds_what_the_reference_equations_say(
    row: tuple[str, float, float, float, float, float, float],
) -> None:
    fluid, capacity, celsius, density, fill, liquid, vapour = row
    case = Case(
        fluid, TWO_PHASE, shapes.box(length=capacity, width=1.0, height=1.0), {"expansion": 0.0},
        {
            "level": fill, "liquid_temperature": celsius + 273.15, "pressure": math.nan, "density": density,
            "density_temperature": celsius + 273.15, "density_pressure": 1e6,
        },
        fluid, fluid,
    )  # fmt: skip
    own = inventory(vessels([case]), None, state([case]))
    assert own["liquid_mass"][0] / 1e3 == pytest.approx(liquid, abs=digit(liquid))
    assert own["vapour_mass"][0] / 1e3 == pytest.approx(vapour, abs=digit(vapour))
    assert own.marks[0] == Mark.VAPOUR_AT_LIQUID_TEMPERATURE


def digit(printed: float) -> float:
    """A little more than half a unit of the last digit that a number shows."""
    shown = repr(printed)
    return 0.51 * 10.0 ** -len(shown.split(".")[1].rstrip("0"))


@pytest.mark.parametrize(
    ("fluid", "capacity", "celsius", "bar", "tonnes"),
    [  # by the reference equations, as above; nitrogen: Span et al. 2000, methane: Setzmann and Wagner 1991
        ("nitrogen", 50.0, 25.0, 30.0, 1.70),
        ("methane", 100.0, 15.0, 60.0, 4.52),
    ],
)
def test_a_gas_receiver_holds_what_the_reference_equations_say(
    fluid: str, capacity: float, celsius: float, bar: float, tonnes: float
) -> None:
    case = Case(
        fluid, Method.VAPOUR, None, {"expansion": 0.0},
        {"vapour_temperature": celsius + 273.15, "pressure": bar * 1e5}, fluid, capacity=capacity,
    )  # fmt: skip
    own = inventory(vessels([case]), None, state([case]))
    assert own["mass"][0] / 1e3 == pytest.approx(tonnes, abs=0.0051)


# --- identities -----------------------------------------------------------------------------------


def test_wet_volume_and_wet_density_weigh_alike_in_the_vessel_and_at_the_standard_state() -> None:
    case = OIL.reads(sediment_water=0.0)
    own = inventory(vessels([case]), None, state([case]))
    np.testing.assert_allclose(
        own["gross_observed_volume"] * own["liquid_density"],
        own["gross_standard_volume"] * own["standard_density"],
        rtol=1e-13,
    )


@pytest.mark.parametrize("case", [c for c in CASES if c.method & Method.LIQUID], ids=lambda case: case.name)
def test_liquid_mass_is_net_standard_volume_times_standard_density(case: Case) -> None:
    own = inventory(vessels([case]), None, state([case]))
    dry = 1.0 - case.reading.get("sediment_water", 0.0)
    mass = own["gross_standard_volume"] * own["standard_density"] * dry
    np.testing.assert_allclose(own["liquid_mass"], mass, rtol=1e-13)
    np.testing.assert_allclose(own["net_standard_volume"], own["gross_standard_volume"] * dry, rtol=1e-13)


def test_pitfall_18_water_leaves_a_wet_sample_by_its_own_weight_and_a_dry_one_by_its_volume() -> None:
    """Half a percent of water in oil of 846 kg/m³: net volume times wet density overstates by 0.09 %."""
    still = OIL.reads(water_level=-math.inf, liquid_temperature=288.15, density_temperature=288.15)
    cases = [still.reads(sediment_water=w, density_is_dry=d) for w, d in ((0.0, 0.0), (0.005, 0.0), (0.005, 1.0))]
    none, wet, dry = inventory(vessels(cases), np.arange(3), state(cases))["mass"]
    assert dry / none == pytest.approx(0.995, rel=1e-12)
    assert wet / none == pytest.approx(1.0 - 0.005 * 999.1 / 846.0, rel=1e-12)
    assert dry / wet - 1.0 == pytest.approx(0.0009, abs=0.00005)


@pytest.mark.parametrize("case", CASES, ids=lambda case: case.name)
def test_a_mass_does_not_depend_on_the_standard_state(case: Case) -> None:
    elsewhere = replace(case, vessel=case.vessel | {"standard_temperature": 293.15, "standard_pressure": 9e5})
    here = inventory(vessels([case]), None, state([case]))
    there = inventory(vessels([elsewhere]), None, state([elsewhere]))
    np.testing.assert_allclose(there["mass"], here["mass"], rtol=1e-12)
    if case.method & Method.LIQUID:
        assert there["gross_standard_volume"][0] != here["gross_standard_volume"][0]


def test_the_vapour_is_what_the_liquid_leaves_of_the_strained_vessel() -> None:
    own = inventory(vessels([SPHERE_CASE]), None, state([SPHERE_CASE]))
    whole = own["full_factor"] * math.pi * 18.0**3 / 6.0
    np.testing.assert_allclose(own["vapour_volume"] + own["shell_factor"] * own["tank_volume"], whole, rtol=1e-12)
    density = (
        own["vapour_pressure"] * 0.04409562 / (own["compressibility_factor"] * GAS_CONSTANT * own["vapour_temperature"])
    )
    np.testing.assert_allclose(own["vapour_mass"], own["vapour_volume"] * density, rtol=1e-5)


# --- saturation -----------------------------------------------------------------------------------


def test_what_is_not_read_of_the_vapour_is_taken_from_saturation_in_order() -> None:
    cases = [
        BULLET_CASE,
        BULLET_CASE.reads(vapour_temperature=math.nan),
        BULLET_CASE.reads(vapour_temperature=math.nan, pressure=math.nan),
        BULLET_CASE.reads(pressure=math.nan),
        BULLET_CASE.reads(vapour_temperature=288.0),  # propane boils at 7.285 bar there
    ]
    own = inventory(vessels(cases), np.arange(5), state(cases))
    assert [Mark(int(mark)) & ~(Mark.SATURATION_LOW | Mark.SATURATION_HIGH) for mark in own.marks] == [
        Mark.NONE, Mark.VAPOUR_AT_PRESSURE, Mark.VAPOUR_AT_LIQUID_TEMPERATURE, Mark.VAPOUR_AT_LIQUID_TEMPERATURE,
        Mark.VAPOUR_SATURATED,
    ]  # fmt: skip
    assert own["vapour_temperature"][0] == 296.2
    assert own["vapour_temperature"][2] == own["vapour_temperature"][3] == 291.3
    assert own["vapour_pressure"][1] == own["vapour_pressure"][4] == 7.6e5
    # the line of Lemmon et al. 2009 by CoolProp 8.0.0: 7.6 bar at 289.557 K, within the fit's 0.02 %
    np.testing.assert_allclose(own["vapour_temperature"][[1, 4]], 289.557, atol=0.01)


@pytest.mark.parametrize(
    ("change", "mark"), [(-1.1e5, Mark.SATURATION_LOW), (1.1e5, Mark.SATURATION_HIGH), (0.0, Mark.NONE)]
)
def test_a_pressure_off_the_vapour_pressure_is_marked(change: float, mark: Mark) -> None:
    # propane boils at 8.365 bar at 20 °C: Lemmon et al. 2009 by CoolProp 8.0.0; gauge taken for absolute is −1 bar
    case = BULLET_CASE.reads(liquid_temperature=293.15, vapour_temperature=293.15, pressure=8.365e5 + change)
    own = inventory(vessels([case]), None, state([case]))
    assert Mark(int(own.marks[0])) & (Mark.SATURATION_LOW | Mark.SATURATION_HIGH) == mark


# --- what is missing, outside, refused --------------------------------------------------------------


@pytest.mark.parametrize("name", ["level", "liquid_temperature", "density"])
def test_missing_stays_missing(name: str) -> None:
    case = OIL.reads(**{name: math.nan})
    own = inventory(vessels([case]), None, state([case]))
    assert math.isnan(own["mass"][0])
    assert own.marks[0] & Mark.MISSING
    assert not own.measured[0]


@pytest.mark.parametrize("table", [False, True])
@pytest.mark.parametrize("level", [-0.01, 15.4, 99.0])
def test_a_level_outside_the_vessel_is_marked_and_never_clamped(level: float, table: bool) -> None:
    case = replace(OIL, vessel={"is_table": float(table)}).reads(level=level)
    own = inventory(vessels([case]), None, state([case]))
    assert math.isnan(own["mass"][0])
    assert math.isnan(own["tank_volume"][0])
    assert own.marks[0] & (Mark.OUTSIDE_TABLE if table else Mark.OUTSIDE_VESSEL)


def test_water_above_the_liquid_has_no_mass() -> None:
    case = OIL.reads(water_level=8.3)
    own = inventory(vessels([case]), None, state([case]))
    assert own.marks[0] & Mark.OUTSIDE_VESSEL
    assert math.isnan(own["mass"][0])


def test_water_that_is_not_known_is_not_none() -> None:
    case = OIL.reads(water_level=math.nan)
    own = inventory(vessels([case]), None, state([case]))
    assert own.marks[0] & Mark.MISSING
    assert math.isnan(own["mass"][0])


@pytest.mark.parametrize(
    ("reading", "mark"),
    [
        ({"pressure": 1.2e8}, Mark.GUARD_REFUSED),
        ({"vapour_temperature": 900.0}, Mark.OUTSIDE_METHOD),
        ({"vapour_temperature": 100.0}, Mark.NO_VAPOUR_ROOT),
        ({"vapour_temperature": math.nan}, Mark.MISSING),
    ],
)
def test_a_gas_that_the_virial_equation_refuses_has_no_mass(reading: dict[str, float], mark: Mark) -> None:
    case = NITROGEN.reads(**reading)
    own = inventory(vessels([case]), None, state([case]))
    assert math.isnan(own["mass"][0])
    assert own.marks[0] & mark


def test_a_small_vapour_that_cannot_be_computed_is_left_out_within_its_bound() -> None:
    """Propane at 80 °C and 31 bar is refused; a tenth of a percent of room beside the liquid hardly matters."""
    case = BULLET_CASE.reads(level=2.9, liquid_temperature=353.0, vapour_temperature=math.nan, pressure=math.nan)
    own = inventory(vessels([case]), None, state([case]))
    assert own.marks[0] & Mark.VAPOUR_LEFT_OUT
    assert own["vapour_mass"][0] == 0.0
    ideal = own["vapour_pressure"][0] * 0.0440956 * own["vapour_volume"][0] / (GAS_CONSTANT * 353.0)
    assert own.sensitivities["vapour_left_out"][0] == pytest.approx(2.0 * ideal, rel=1e-5)
    fuller = case.reads(level=1.0)
    more = inventory(vessels([fuller]), None, state([fuller]))
    assert more.marks[0] & Mark.VAPOUR_BETWEEN  # between once and twice the ideal gas
    ideal = more["vapour_pressure"][0] * 0.0440956 * more["vapour_volume"][0] / (GAS_CONSTANT * 353.0)
    assert more["vapour_mass"][0] == pytest.approx(1.5 * ideal, rel=1e-5)
    assert more.sensitivities["vapour_left_out"][0] == pytest.approx(0.5 * ideal, rel=1e-5)


NOT_EXPANDING = ExpansivityLiquid((0.0,), 288.15, 0.0)


def test_a_vapour_is_left_out_up_to_one_percent_of_its_liquid() -> None:
    box = shapes.box(length=1.0, width=1.0, height=1.0)
    case = replace(BULLET_CASE, curve=box, vessel={"expansion": 0.0}, liquid=NOT_EXPANDING).reads(
        level=0.95, liquid_temperature=353.15, vapour_temperature=math.nan, pressure=math.nan, density=500.0
    )
    pressure = inventory(vessels([case]), None, state([case]))["vapour_pressure"][0]
    assert pressure == pytest.approx(31.3e5, rel=0.005)  # Lemmon et al. 2009, by CoolProp 8.0.0
    ideal = 0.0440956 * pressure / (GAS_CONSTANT * 353.15)
    cases = [case.reads(level=1.0 / (1.0 + share * 500.0 / (2.0 * ideal))) for share in (0.00995, 0.01005)]
    marks = inventory(vessels(cases), np.arange(2), state(cases)).marks
    assert [bool(mark & Mark.VAPOUR_LEFT_OUT) for mark in marks] == [True, False]
    assert [bool(mark & Mark.VAPOUR_BETWEEN) for mark in marks] == [False, True]


@pytest.mark.parametrize(("off", "low"), [(-1.985e5, False), (-2.015e5, True)])
def test_a_pressure_is_doubted_beyond_twice_its_uncertainty(off: float, low: bool) -> None:
    case = BULLET_CASE.reads(
        liquid_temperature=293.15, vapour_temperature=293.15, pressure=8.3646e5 + off, pressure_uncertainty=1e5,
        temperature_uncertainty=0.0,
    )  # fmt: skip
    assert bool(inventory(vessels([case]), None, state([case])).marks[0] & Mark.SATURATION_LOW) is low


# --- uncertainty ----------------------------------------------------------------------------------


def test_independent_errors_add_in_quadrature() -> None:
    own = inventory(vessels([OIL]), None, state([OIL]))
    level, density = np.array([0.003]), np.array([0.5])
    found = standard_uncertainty(own, {"level": (level, np.array([0.004])), "density": (density,)})
    area = own.sensitivities["level"][0]
    assert found[0] == pytest.approx(math.hypot(area * 0.005, own.sensitivities["density"][0] * 0.5), rel=1e-12)


def test_a_row_without_a_mass_has_no_uncertainty() -> None:
    own = inventory(vessels([OIL]), None, state([OIL.reads(level=math.nan)]))
    assert np.isnan(standard_uncertainty(own, {"level": (np.array([0.003]),)})[0])


def test_the_uncertainty_is_the_scatter_of_masses_with_drawn_errors() -> None:
    draw, n = np.random.default_rng(7), 20_000
    sigma = {"level": 0.004, "liquid_temperature": 0.4, "pressure": 3e3, "vapour_temperature": 0.8, "density": 0.6}
    read = state([SPHERE_CASE] * n)
    drawn = {name: getattr(read, name) + spread * draw.standard_normal(n) for name, spread in sigma.items()}
    own = vessels([SPHERE_CASE])
    masses = inventory(own, None, replace(read, **drawn))["mass"]
    one = inventory(own, None, state([SPHERE_CASE]))
    claimed = standard_uncertainty(one, {name: (np.array([spread]),) for name, spread in sigma.items()})[0]
    # a standard deviation of 20 000 draws is known to 0.5 %: five of those
    assert masses.std() == pytest.approx(claimed, rel=0.025)


@pytest.mark.parametrize("wet", [0, BLOCK_ROWS, 2 * BLOCK_ROWS])
def test_what_one_block_needs_and_another_does_not_is_of_its_own_rows(wet: int) -> None:
    """Free water in one block of readings alone: the others have none, and nothing of it."""
    rows = 2 * BLOCK_ROWS + 1  # the last block is of one reading
    water = np.full(rows, NO_WATER)
    water[wet] = 0.5
    own, read = vessels([OIL]), replace(state([OIL]), water_level=water)
    found = inventory(own, None, read)
    for row in (0, BLOCK_ROWS, rows - 1):
        alone = inventory(own, None, read.take(np.array([row])))
        assert {name: found[name][row] for name in found.columns if np.isfinite(found[name][row])} == {
            name: alone[name][0] for name in alone.columns if np.isfinite(alone[name][0])
        }
        for name, column in found.sensitivities.items():
            assert column[row] == alone.sensitivities[name][0]
    assert np.count_nonzero(found["free_water_volume"]) == 1
