"""The space above a liquid: the order in which its vapour is found, beside a blanket, and where it is saturated."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from CoolProp.CoolProp import PropsSI

from models.columns import Mark
from models.geometry import shapes
from models.mass import inventory
from models.saturation import SaturationColumns
from models.space import saturation_interval
from models.vapour.series import VapourColumns, VapourMixture
from tests.models.mass_cases import ATMOSPHERE, BLANKETED, BULLET_CASE, Case, state, vessels

# n-Pentane by its reference equation of state (M. Thol et al., Fluid Phase Equilib., 2019, by CoolProp 8.0.0):
# saturated at 20 °C at 56.568 kPa with 1.72447 kg/m³; at 38 °C at 108.21 kPa; at 38 °C and 102.325 kPa a gas of
# 2.98350 kg/m³.
BOX = shapes.box(length=10.0, width=10.0, height=10.0)


def tank(celsius: float, gauge: float, **read: float) -> Case:
    """A stiff box of 1,000 m³ with 200 m³ of liquid under its blanket: 800 m³ of gas."""
    return Case(
        "pentane", BLANKETED.method, BOX, {"expansion": 0.0},
        {"level": 2.0, "liquid_temperature": celsius + 273.15, "density": 626.0, "pressure": ATMOSPHERE + gauge} | read,
        "n-pentane", "n-pentane",
    )  # fmt: skip


def test_beside_its_blanket_the_vapour_is_that_of_its_own_saturation() -> None:
    """800 m³ × 1.72447 kg/m³ = 1,379.6 kg, whatever the pressure of the blanket is."""
    cases = [tank(20.0, gauge) for gauge in (0.0, 5e3, 50e3)]
    own = inventory(vessels(cases), np.arange(3), state(cases))
    assert own["vapour_mass"] == pytest.approx([1_379.6] * 3, rel=0.002)
    assert own["vapour_pressure"] == pytest.approx([56_568.0] * 3, rel=0.001)
    assert own["mass"] == pytest.approx(200.0 * 626.0 + own["vapour_mass"], rel=1e-12)
    assert not own.marks.any()


def test_what_the_two_gases_do_to_each_other_is_two_percent_for_each_bar_of_blanket() -> None:
    cases = [tank(20.0, gauge) for gauge in (5e3, 105e3)]
    own = inventory(vessels(cases), np.arange(2), state(cases))
    share = own.sensitivities["vapour_model"] / own["vapour_mass"]
    blankets = np.array([ATMOSPHERE + 5e3, ATMOSPHERE + 105e3]) - 56_568.0
    assert np.sqrt(share[1] ** 2 - share[0] ** 2) == pytest.approx(
        0.02e-5 * math.sqrt(blankets[1] ** 2 - blankets[0] ** 2), rel=0.001
    )
    assert share[0] >= 0.02e-5 * blankets[0]


def test_a_vapour_thermometer_counts_and_without_one_the_liquids_does() -> None:
    """The liquid at 20 °C under a gas of 25 °C: 68.355 kPa, saturated with 2.05784 kg/m³ by the same equation."""
    cases = [tank(20.0, 5e3, vapour_temperature=298.15), tank(25.0, 5e3), tank(25.0, 5e3, vapour_temperature=298.15)]
    own = inventory(vessels(cases), np.arange(3), state(cases))
    assert own["vapour_mass"] == pytest.approx([800.0 * 2.05784] * 3, rel=0.002)


def test_where_the_vapour_pressure_reaches_that_of_the_space_all_is_product() -> None:
    """38 °C under 1 kPa: 800 m³ of pure vapour at 102.325 kPa, 2.98350 kg/m³; 5.9 kPa too low for a blanket is said."""
    cases = [tank(38.0, 1e3), tank(38.0, 6.5e3), tank(38.0, 8e3)]
    own = inventory(vessels(cases), np.arange(3), state(cases))
    assert own["vapour_mass"][0] == pytest.approx(800.0 * 2.98350, rel=0.002)
    assert [Mark(int(mark)) for mark in own.marks] == [Mark.SATURATION_LOW, Mark.NONE, Mark.NONE]
    # Across the limit nothing jumps: 0.4 kPa below saturation and 1.1 kPa above it.
    assert own["vapour_mass"][1] == pytest.approx(own["vapour_mass"][2], rel=0.006)


def test_a_blanket_whose_pressure_is_not_known_makes_no_mass() -> None:
    own = inventory(vessels([tank(20.0, math.nan)]), None, state([tank(20.0, math.nan)]))
    assert math.isnan(own["mass"][0]) and own.marks[0] & Mark.MISSING


@pytest.mark.parametrize(
    ("celsius", "level", "left_out"), [(-64.0, 0.5, True), (200.0, 0.5, False), (200.0, 9.9, True)]
)
def test_beside_a_blanket_an_unknown_vapour_pressure_is_bounded_by_what_is_known(
    celsius: float, level: float, left_out: bool
) -> None:
    """n-Pentane has none that we know under 212 K, 570.3 Pa there, nor above its critical point at 196.6 °C.

    In the cold it has less than at 212 K: 2 × 570.3 Pa × 0.07215 kg/mol / (R 209.15 K) = 0.0473 kg/m³, 0.14 % of
    the liquid's mass with 19 times its room. In the heat all of 106.3 kPa may be pentane: four times 1.95 kg/m³.
    """
    case = tank(celsius, 5e3, level=level)
    own = inventory(vessels([case]), None, state([case]))
    assert bool(own.marks[0] & Mark.VAPOUR_LEFT_OUT) == left_out
    assert bool(own.marks[0] & Mark.VAPOUR_BETWEEN) != left_out
    density = 0.0473 if celsius < 0.0 else 7.80
    bound = 100.0 * (10.0 - level) * density
    if left_out:
        assert own.sensitivities["vapour_left_out"][0] == pytest.approx(bound, rel=0.01)
    else:  # from none to all of it
        assert own["vapour_mass"][0] == pytest.approx(0.5 * bound, rel=0.01)
        assert own.sensitivities["vapour_left_out"][0] == pytest.approx(0.5 * bound, rel=0.01)


@pytest.mark.parametrize("celsius", [74.0, 80.0, 84.0, 88.0, 92.0])
def test_a_vapour_that_is_too_much_to_be_left_out_lies_between_the_ideal_gas_and_its_bound(celsius: float) -> None:
    """Saturated propane by its reference equation (CoolProp 8.0.0), where the virial equation refuses it."""
    case = BULLET_CASE.reads(
        level=1.0, liquid_temperature=celsius + 273.15, vapour_temperature=math.nan, pressure=math.nan
    )
    own = inventory(vessels([case]), None, state([case]))
    assert own.marks[0] & Mark.VAPOUR_BETWEEN and not own.marks[0] & Mark.GUARD_REFUSED
    true = PropsSI("D", "T", celsius + 273.15, "Q", 1, "Propane") * own["vapour_volume"][0]
    half = own.sensitivities["vapour_left_out"][0]
    assert abs(own["vapour_mass"][0] - true) < half
    assert own["mass"][0] == pytest.approx(own["liquid_mass"][0] + own["vapour_mass"][0], rel=1e-12)
    assert half < own["vapour_mass"][0]


# Propane by its reference equation of state (E. W. Lemmon et al., J. Chem. Eng. Data 54 (2009) 3141; CoolProp 8.0.0).
PROPANE_KPA = {18.1: 795.358, 20.0: 836.461, 23.0: 904.509, 25.0: 952.075}
PROPANE_VAPOUR = {20.0: 18.08234, 25.0: 20.61786}  # saturated, kg/m³
AT_700_KPA_23_C, SATURATED_AT_760_KPA = 14.36049, 16.42615  # kg/m³
GAS_CONSTANT = 8.31446261815324  # J/(mol K), exact since 2019: CODATA 2018
UNREAD = math.nan


def lpg(liquid: float, gas: float = UNREAD, kpa: float = UNREAD) -> Case:
    """A stiff box of 1,000 m³ with 200 m³ of propane in it, at temperatures in °C."""
    return Case(
        "propane", BULLET_CASE.method, BOX, {"expansion": 0.0},
        {"level": 2.0, "liquid_temperature": liquid + 273.15, "density": 500.0, "density_pressure": 836e3,
         "vapour_temperature": gas + 273.15, "pressure": kpa * 1e3},
        "propane", "propane",
    )  # fmt: skip


def one(case: Case) -> tuple[float, Mark]:
    """Vapour mass and marks of a single reading."""
    own = inventory(vessels([case]), None, state([case]))
    return float(own["vapour_mass"][0]), Mark(int(own.marks[0]))


@pytest.mark.parametrize(
    ("gas", "kpa", "density", "mark"),
    [
        (23.0, 700.0, AT_700_KPA_23_C, Mark.NONE),
        (UNREAD, 760.0, SATURATED_AT_760_KPA, Mark.VAPOUR_AT_PRESSURE),
        (UNREAD, UNREAD, PROPANE_VAPOUR[20.0], Mark.VAPOUR_AT_LIQUID_TEMPERATURE),
        (23.0, UNREAD, PROPANE_VAPOUR[20.0], Mark.VAPOUR_AT_LIQUID_TEMPERATURE),
    ],
    ids=["as measured", "pressure only", "neither", "a thermometer alone"],
)
def test_a_vapour_is_as_measured_or_saturated_at_its_pressure_or_at_its_liquid(
    gas: float, kpa: float, density: float, mark: Mark
) -> None:
    found, marks = one(lpg(20.0, gas, kpa))
    assert found == pytest.approx(800.0 * density, rel=0.002)
    assert marks & ~(Mark.SATURATION_LOW | Mark.SATURATION_HIGH) == mark


def test_a_vapour_above_saturation_is_taken_as_saturated_at_its_pressure() -> None:
    """At 10 °C it would not be a vapour at 760 kPa: the pressure is believed, as without a thermometer."""
    found, marks = one(lpg(16.0, 10.0, 760.0))
    assert marks & Mark.VAPOUR_SATURATED
    assert found == pytest.approx(800.0 * SATURATED_AT_760_KPA, rel=0.002)


@pytest.mark.parametrize("kpa", [3600.0, 4000.0, 9000.0], ids=["too dense", "no root", "beyond the critical point"])
@pytest.mark.parametrize("gas", [UNREAD, 21.0])
def test_a_pressure_at_which_no_vapour_stands_leaves_the_vapour_of_the_liquids_temperature(
    kpa: float, gas: float
) -> None:
    found, marks = one(lpg(20.0, gas, kpa))
    assert found == pytest.approx(800.0 * PROPANE_VAPOUR[20.0], rel=0.002)
    assert marks & Mark.SATURATION_HIGH and marks & Mark.VAPOUR_AT_LIQUID_TEMPERATURE


def test_such_a_vapour_follows_its_liquid_and_not_the_pressure() -> None:
    case = replace(lpg(20.0, 21.0, 4000.0), vessel={"compressibility": 4e-9, "expansivity": (3e-3,), "expansion": 0.0})
    for name, step in (("liquid_temperature", 0.01), ("pressure", 100.0)):
        sides = [case.reads(**{name: case.reading[name] + sign * step}) for sign in (1.0, -1.0)]
        mass = inventory(vessels(sides), np.arange(2), state(sides))["mass"]
        own = inventory(vessels([case]), None, state([case])).sensitivities[name][0]
        assert own == pytest.approx((mass[0] - mass[1]) / (2.0 * step), rel=1e-4)


def test_a_pressure_below_every_vapour_pressure_is_that_of_a_gas_as_warm_as_its_liquid() -> None:
    """1 Pa, far under the lowest vapour pressure that we know: an ideal gas of 1.8e-5 kg/m³."""
    found, marks = one(lpg(20.0, UNREAD, 1e-3))
    assert found == pytest.approx(800.0 * 0.0440956 / (GAS_CONSTANT * 293.15), rel=1e-4)
    assert marks & Mark.SATURATION_LOW


def test_the_interval_runs_between_the_vapour_pressures_of_the_two_temperatures() -> None:
    """836.46 kPa at 20 °C and 952.08 kPa at 25 °C; u of 2 kPa and of 0.3 K, at 23.9 kPa/K: 2u = 14.9 kPa."""
    columns = SaturationColumns.from_compositions([{"propane": 1.0}])

    def interval(liquid: float, gas: float) -> tuple[float, float, float]:
        kelvin = np.array([liquid + 273.15]), np.array([gas + 273.15])
        own = saturation_interval(columns, 0, *kelvin, np.array([2e3]), np.array([0.3]))
        return float(own.lowest[0]), float(own.highest[0]), float(own.tolerance[0])

    ends = [PROPANE_KPA[20.0] * 1e3, PROPANE_KPA[25.0] * 1e3]
    tolerance = 2e3 * math.hypot(2.0, 0.3 * 23.9)  # (952.08 − 904.51)/2 kPa/K, a little less than at 25 °C itself
    assert interval(20.0, 25.0) == pytest.approx((*ends, tolerance), rel=0.02)
    assert interval(25.0, 20.0)[:2] == pytest.approx(ends, rel=2e-4)
    assert interval(20.0, UNREAD)[:2] == pytest.approx((ends[0], ends[0]), rel=2e-4)
    unsure = saturation_interval(replace(columns, departure=np.array([0.05])), 0, *(np.array([293.15]),) * 2,
                                 np.zeros(1), np.zeros(1))  # fmt: skip
    assert unsure.tolerance[0] == pytest.approx(2.0 * 0.05 * ends[0], rel=2e-4)


@pytest.mark.parametrize(
    ("gas", "off", "mark"),
    [
        (25.0, -15.0, Mark.NONE), (25.0, -19.0, Mark.SATURATION_LOW), (25.0, 129.0, Mark.NONE),
        (25.0, 134.0, Mark.SATURATION_HIGH), (UNREAD, -15.0, Mark.NONE), (UNREAD, -18.0, Mark.SATURATION_LOW),
        (UNREAD, 15.0, Mark.NONE), (UNREAD, 18.0, Mark.SATURATION_HIGH),
    ],
)  # fmt: skip
def test_a_pressure_within_twice_its_uncertainty_of_the_interval_agrees(gas: float, off: float, mark: Mark) -> None:
    """From 20 °C: the interval ends there, or 115.6 kPa higher at 25 °C; 2u is 2 √(5² + (0.3 × 22)²) to 17.5 kPa."""
    case = lpg(20.0, gas, PROPANE_KPA[20.0] + off).reads(pressure_uncertainty=5e3, temperature_uncertainty=0.3)
    assert one(case)[1] & (Mark.SATURATION_LOW | Mark.SATURATION_HIGH) == mark


@pytest.mark.parametrize(("celsius", "times"), [(80.0, 2.0), (81.5, 2.0), (82.4, 4.0), (95.0, 4.0)])
def test_a_vapour_left_out_is_bounded_by_multiples_of_the_ideal_gas(celsius: float, times: float) -> None:
    """Saturated propane at 95 °C has Z = 0.37 (reference equation): twice the ideal gas would be no bound.

    The change is at 0.96 × 369.89 K = 81.94 °C.
    """
    case = lpg(celsius).reads(level=9.99)
    own = inventory(vessels([case]), None, state([case]))
    ideal = 0.0440956 * own["vapour_pressure"][0] * 1.0 / (GAS_CONSTANT * (celsius + 273.15))
    assert own.marks[0] & Mark.VAPOUR_LEFT_OUT
    assert own.sensitivities["vapour_left_out"][0] == pytest.approx(times * ideal, rel=1e-6)


def test_a_vapour_is_left_out_up_to_one_percent_of_its_liquid() -> None:
    """At 80 °C twice the ideal gas is 94.0 kg/m³ (31.3 bar): 1 % of 500 kg/m³ with 0.505 of 10 m of room."""
    shares = []
    for room in (0.499, 0.509):
        case = lpg(80.0).reads(level=10.0 - room)
        shares.append(94.0 * room / (500.0 * (10.0 - room)))
        left_out = bool(one(case)[1] & Mark.VAPOUR_LEFT_OUT)
        assert left_out == (shares[-1] < 0.01)
    assert shares == pytest.approx([0.0099, 0.0101], abs=1e-4)


def test_pitfall_12_an_ideal_gas_over_lpg_is_a_sixth_too_light() -> None:
    """At 20 °C p M/(R T) gives 15.133 kg/m³ of 18.082: 16.3 % too little (reference equation, as above)."""
    ideal = 800.0 * PROPANE_KPA[20.0] * 1e3 * 0.0440956 / (GAS_CONSTANT * 293.15)
    assert ideal / one(lpg(20.0, 20.0, PROPANE_KPA[20.0] - 0.5))[0] == pytest.approx(1.0 - 0.163, abs=0.002)


def test_pitfall_12_the_vapour_has_not_the_liquids_composition() -> None:
    """Half propane, half n-butane at 20 °C: 0.5 × 836.46/(0.5 × (836.46 + 207.6)) = 0.801 of the vapour is propane.

    Its molar mass is 0.801 × 44.10 + 0.199 × 58.12 = 46.88 against 51.11 g/mol: 8 % of the vapour's mass. Vapour
    pressure of n-butane: D. Bücker, W. Wagner, J. Phys. Chem. Ref. Data 35 (2006) 929, by CoolProp 8.0.0.
    """
    liquid = SaturationColumns.from_compositions([{"propane": 0.5, "n-butane": 0.5}])
    fractions = [float(part) for part in liquid.vapour_fractions(293.15)]
    assert fractions == pytest.approx([0.801, 0.199], abs=0.001)
    names = ("propane", "n-butane")
    gases = VapourColumns.from_mixtures([VapourMixture(names, tuple(fractions)), VapourMixture(names, (0.5, 0.5))])
    assert gases.molar_mass[:2] == pytest.approx([0.04688, 0.05111], abs=2e-5)
    own = gases.state(np.full(2, 300e3), np.full(2, 293.15), np.arange(2)).density
    assert own[1] / own[0] == pytest.approx(0.05111 / 0.04688, rel=0.02)  # and a little more, by its lower Z
    assert own[1] / own[0] > 0.05111 / 0.04688
