"""Vapour pressures against the saturation lines of CoolProp, mixtures against Raoult's law."""

import math

import CoolProp
import numpy as np
import pytest
from chemicals.vapor_pressure import Ambrose_Walton
from hypothesis import given, settings
from hypothesis import strategies as st

from models.components import COMPONENTS, component, given_component
from models.errors import DefinitionError
from models.saturation import (
    WAGNER,
    SaturationColumns,
    saturation_temperature,
    vapour_pressure,
    wagner_constants,
)

OTHER_NAMES = {
    "carbon-dioxide": "CarbonDioxide", "carbon-monoxide": "CarbonMonoxide", "hydrogen-sulfide": "HydrogenSulfide",
    "sulfur-dioxide": "SulfurDioxide", "nitrous-oxide": "NitrousOxide", "carbonyl-sulfide": "CarbonylSulfide",
    "sulfur-hexafluoride": "SulfurHexafluoride", "dimethyl-ether": "DimethylEther",
    "hydrogen-chloride": "HydrogenChloride", "isobutene": "IsoButene", "1-butene": "1-Butene",
    "n-butane": "n-Butane", "n-pentane": "n-Pentane", "n-hexane": "n-Hexane", "n-heptane": "n-Heptane",
    "n-octane": "n-Octane", "n-nonane": "n-Nonane", "n-decane": "n-Decane", "isobutane": "IsoButane",
    "isopentane": "Isopentane",
    "cis-2-butene": "cis-2-Butene", "trans-2-butene": "trans-2-Butene", "ethylbenzene": "EthylBenzene",
    "cyclohexane": "CycloHexane", "o-xylene": "o-Xylene", "m-xylene": "m-Xylene", "p-xylene": "p-Xylene",
    "r134a": "R134a",
}  # fmt: skip
# Where along its range each line is compared; the worst departure there is the one that the table states.
AT = np.linspace(0.0, 0.985, 60)


def saturation_line(name: str, temperatures: np.ndarray) -> np.ndarray:
    state = CoolProp.AbstractState("HEOS", OTHER_NAMES.get(name, name.capitalize()))
    pressures = []
    for t in temperatures:
        state.update(CoolProp.QT_INPUTS, 1, t)
        pressures.append(state.p())
    return np.array(pressures)


@pytest.mark.parametrize("name", sorted(WAGNER))
def test_every_substance_follows_its_reference_line(name: str) -> None:
    lowest, highest, *_, departure = WAGNER[name]
    temperatures = lowest + AT * (highest - lowest)
    found = vapour_pressure(temperatures, name) / saturation_line(name, temperatures) - 1.0
    assert np.abs(found).max() == pytest.approx(departure, rel=1e-3)
    if name != "n-heptane":  # its fit ends below the critical point, where two published points differ
        assert highest == component(name).critical_temperature


@pytest.mark.parametrize("name", sorted(WAGNER))
def test_a_line_begins_at_the_triple_point_or_where_it_is_cold_enough(name: str) -> None:
    """In whole kelvin, at the triple point or at the lower of 0.45 Tc and -30 degrees."""
    state = CoolProp.AbstractState("HEOS", OTHER_NAMES.get(name, name.capitalize()))
    starts = max(state.Ttriple(), min(0.45 * component(name).critical_temperature, 243.15))
    exact = {"hydrogen": 15.0, "helium": 2.4, "neon": 24.6, "water": 273.16}
    assert WAGNER[name][0] == exact.get(name, np.ceil(starts))


def test_every_substance_of_the_table_has_a_line() -> None:
    assert set(WAGNER) == set(COMPONENTS)


@pytest.mark.parametrize(
    ("name", "bar"),
    [  # at -20, 0, 20 and 40 degrees Celsius, and slopes in bar/K, by CoolProp 8.0.0
        ("propane", ((2.445, 0.088), (4.745, 0.145), (8.365, 0.220), (13.694, 0.316))),
        ("n-butane", ((0.452, 0.020), (1.032, 0.039), (2.076, 0.067), (3.785, 0.106))),
        ("isobutane", ((0.725, 0.031), (1.570, 0.056), (3.022, 0.092), (5.312, 0.140))),
        ("propylene", ((3.056, 0.108), (5.841, 0.174), (10.170, 0.262), (16.484, 0.373))),
        ("ammonia", ((1.900, 0.084), (4.292, 0.161), (8.570, 0.274), (15.545, 0.431))),
        ("dimethyl-ether", ((1.242, 0.052), (2.667, 0.093), (5.096, 0.153), (8.897, 0.231))),
    ],
)
def test_pressure_and_slope_at_four_temperatures(name: str, bar: tuple[tuple[float, float], ...]) -> None:
    columns = SaturationColumns.from_compositions([{name: 1.0}])
    pressure, slope = columns.pressure([253.15, 273.15, 293.15, 313.15])
    assert pressure / 1e5 == pytest.approx([p for p, _ in bar], rel=4e-4, abs=1e-3)
    assert slope / 1e5 == pytest.approx([s for _, s in bar], abs=6e-4)


@pytest.mark.parametrize("acentric", [0.0, 0.1, 0.35, 0.6])
def test_a_substance_given_in_full_takes_corresponding_states(acentric: float) -> None:
    given = given_component(
        "ours", critical_temperature=500.0, critical_pressure=3e6, acentric_factor=acentric, molar_mass=0.1
    )
    columns = SaturationColumns.from_compositions([[(given, 1.0)]])
    t = np.array([260.0, 300.0, 350.0, 400.0, 450.0, 490.0])
    expected = [Ambrose_Walton(x, 500.0, 3e6, acentric) for x in t]
    assert columns.pressure(t)[0] == pytest.approx(expected, rel=1e-12)
    assert np.isnan(columns.pressure([249.9, 500.1])[0]).all()
    assert np.isfinite(columns.pressure([250.1, 499.9])[0]).all()
    assert columns.departure[0] == 0.01


def test_the_tables_own_substance_under_other_constants_is_not_the_tables() -> None:
    own = given_component(
        "propane",
        critical_temperature=370.0,
        critical_pressure=4.25e6,
        acentric_factor=0.15,
        molar_mass=0.0441,
    )
    assert wagner_constants(own) != wagner_constants(component("propane"))


def test_outside_the_line_is_nan_and_says_so() -> None:
    columns = SaturationColumns.from_compositions([{"propane": 1.0}, {"water": 1.0}])
    t = np.array([166.0, 167.0, 369.89, 370.0, np.nan])
    assert columns.inside(t).tolist() == [False, True, True, False, False]
    pressure, slope = columns.pressure(t)
    assert np.isnan(pressure).tolist() == [True, False, False, True, True]
    assert np.isnan(slope).tolist() == [True, False, False, True, True]
    assert np.isnan(columns.temperature([1.0, 5e6, np.nan])).all()
    assert columns.inside([280.0, 280.0], np.array([0, 1])).all()


def test_a_liquid_mixture_boils_by_raoults_law() -> None:
    # 50/50 propane and n-butane at 20 degrees: y(propane) = 0.80, from the pure pressures 8.365 and 2.076 bar.
    columns = SaturationColumns.from_compositions([{"propane": 0.5, "n-butane": 0.5}, {"propane": 1.0}])
    pressure, _ = columns.pressure(293.15)
    assert float(pressure) / 1e5 == pytest.approx(0.5 * (8.365 + 2.076), abs=2e-3)
    assert columns.vapour_fractions(293.15) == pytest.approx([0.801, 0.199], abs=1e-3)
    assert np.isnan(columns.vapour_fractions(20.0)).all()
    both, _ = columns.pressure([293.15, 293.15], np.array([0, 1]))
    assert both / 1e5 == pytest.approx([5.2205, 8.365], abs=2e-3)


def test_a_vapour_mixture_condenses_by_raoults_law() -> None:
    # 50/50 at 20 degrees: 2/(1/8.365 + 1/2.076) bar, from the pure pressures by CoolProp 8.0.0.
    half = {"propane": 0.5, "n-butane": 0.5}
    columns = SaturationColumns.from_compositions([half, half, {"propane": 1.0}], [False, True, True])
    bubble, dew, pure = columns.pressure([293.15, 293.15, 293.15], np.array([0, 1, 2]))[0] / 1e5
    assert dew == pytest.approx(3.3265, abs=2e-3)
    assert bubble == pytest.approx(5.2205, abs=2e-3)
    assert pure == pytest.approx(8.365, abs=2e-3)
    assert columns.vapour_fractions(293.15, 1).tolist() == [0.5, 0.5]
    assert np.isnan(columns.vapour_fractions(20.0, 1)).all()
    with pytest.raises(DefinitionError, match="1 compositions have 2 phases"):
        SaturationColumns.from_compositions([half], [True, False])


def test_an_extended_mixture_lasts_as_long_as_its_last_component() -> None:
    gassy = {"ethane": 0.05, "propane": 0.95}
    strict = SaturationColumns.from_compositions([gassy])
    extended = SaturationColumns.from_compositions([gassy], extended=True)
    assert (strict.lowest[0], strict.highest[0]) == (167.0, 305.322)
    assert (extended.lowest[0], extended.highest[0]) == (138.0, 369.89)
    assert extended.pressure(250.0) == strict.pressure(250.0)
    # ln P of ethane straight in 1/T from its critical point, where d ln P/d ln T is 6.48123
    ethane = 48.722e5 * np.exp(6.48123 * (1.0 - 305.322 / 340.0))
    pressure, slope = extended.pressure(340.0)
    propane = float(vapour_pressure(340.0, "propane"))
    assert float(pressure) == pytest.approx(0.05 * ethane + 0.95 * propane, rel=1e-9)
    secant = (extended.pressure(340.001)[0] - extended.pressure(339.999)[0]) / 0.002
    assert float(slope) == pytest.approx(float(secant), rel=1e-6)


UNLIKE: tuple[dict[str, float], ...] = (
    {"propane": 0.95, "ethane": 0.05}, {"propane": 0.95, "ethylene": 0.05}, {"propane": 0.98, "ethane": 0.02},
    {"propane": 0.9, "ethane": 0.1}, {"propane": 0.97, "isobutane": 0.03},
    {"propane": 0.9, "isobutane": 0.07, "ethane": 0.03}, {"propane": 0.99, "methane": 0.01},
    {"propane": 0.95, "methane": 0.05}, {"n-butane": 0.95, "ethane": 0.05}, {"n-butane": 0.97, "ethylene": 0.03},
    {"propane": 0.7, "n-butane": 0.3}, {"propane": 0.5, "n-butane": 0.5}, {"propane": 0.3, "n-butane": 0.7},
    {"propane": 0.99, "nitrogen": 0.01}, {"propane": 0.99, "carbon-dioxide": 0.01},
    {"propane": 0.95, "carbon-dioxide": 0.05}, {"n-pentane": 0.9, "propane": 0.1},
    {"propane": 0.8, "propylene": 0.2}, {"n-butane": 0.6, "isobutane": 0.4}, {"n-pentane": 0.5, "n-butane": 0.5},
)  # fmt: skip


@pytest.mark.parametrize("quality", [0.0, 1.0], ids=["bubble", "dew"])
@pytest.mark.parametrize("parts", UNLIKE, ids=lambda parts: " ".join(f"{x:g} {name}" for name, x in parts.items()))
def test_twice_the_departure_of_a_mixture_covers_what_raoults_law_is_off_by(
    parts: dict[str, float], quality: float
) -> None:
    """10 to 45 °C against the mixture model of CoolProp 8.0.0, also beyond a component's critical temperature."""
    state = CoolProp.AbstractState("HEOS", "&".join(OTHER_NAMES.get(name, name.capitalize()) for name in parts))
    state.set_mole_fractions(list(parts.values()))
    columns = SaturationColumns.from_compositions([parts], [quality == 1.0], extended=True)
    t, expected = 273.15 + np.array([10.0, 20.0, 30.0, 35.0, 40.0, 45.0]), []
    for kelvin in t:
        state.update(CoolProp.QT_INPUTS, quality, kelvin)
        expected.append(state.p())
    off = columns.pressure(t)[0] / expected - 1.0
    worst, departure = float(np.abs(off).max()), float(columns.departure[0])
    print(f"{parts}, quality {quality:g}: {off[0]:+.3%} to {off[-1]:+.3%}; departure {departure:.3%}")
    assert worst <= 2.0 * departure
    if quality == 0.0 and len(parts) == 2 and "n-pentane" not in parts and "isobutane" not in parts:
        assert departure < 1.5 * worst  # nor is it so wide that it says nothing


def test_the_departure_of_a_mixture_recomputed() -> None:
    """50/50 propane and n-butane at 318.006 K, 0.8 of the mean critical temperature; pressures by CoolProp 8.0.0."""
    half = {"propane": 0.5, "n-butane": 0.5}
    columns = SaturationColumns.from_compositions([half, half, {"propane": 1.0}], [False, True, False])
    pure = saturation_line("propane", np.array([318.006]))[0], saturation_line("n-butane", np.array([318.006]))[0]
    for row, total in enumerate((0.5 * sum(pure), 2.0 / (1.0 / pure[0] + 1.0 / pure[1]))):
        above = [0.5 * p / total for p in pure] if row == 0 else [0.5, 0.5]
        s = sum(z * abs(math.log(p / total)) for z, p in zip(above, pure, strict=True))
        ideal = 0.07 * s + 0.035 * s**2 + 0.01 * 0.5
        assert columns.departure[row] == pytest.approx(WAGNER["n-butane"][6] + ideal, rel=3e-4)
    assert columns.departure[2] == WAGNER["propane"][6]


@settings(derandomize=True, max_examples=50, deadline=None)
@given(t=st.floats(200.0, 365.0), x=st.floats(0.01, 0.99))
def test_the_vapour_above_a_liquid_has_its_dew_pressure(t: float, x: float) -> None:
    liquid = SaturationColumns.from_compositions([{"propane": x, "n-butane": 1.0 - x}])
    y = float(liquid.vapour_fractions(t)[0])
    both = SaturationColumns.from_compositions(
        [{"propane": 1.0}, {"propane": y, "n-butane": 1.0 - y}], [False, True]
    )
    pressure, slope = both.pressure(t, 1)
    assert float(pressure) == pytest.approx(float(liquid.pressure(t)[0]), rel=1e-12)
    assert float(both.temperature(pressure, 1)) == pytest.approx(t, rel=1e-11)
    step = 1e-3
    secant = (both.pressure(t + step, 1)[0] - both.pressure(t - step, 1)[0]) / (2.0 * step)
    assert float(slope) == pytest.approx(float(secant), rel=1e-6)


@pytest.mark.parametrize("composition", [{"propane": 0.5}, {"propane": 1.2, "n-butane": -0.2}])
def test_fractions_of_a_liquid_are_a_whole(composition: dict[str, float]) -> None:
    with pytest.raises(DefinitionError, match="sum"):
        SaturationColumns.from_compositions([composition])


@settings(derandomize=True, max_examples=50, deadline=None)
@given(t=st.floats(200.0, 365.0), x=st.floats(0.0, 1.0))
def test_the_temperature_undoes_the_pressure(t: float, x: float) -> None:
    columns = SaturationColumns.from_compositions([{"propane": x, "n-butane": 1.0 - x}])
    pressure, slope = columns.pressure(t)
    assert float(columns.temperature(pressure)) == pytest.approx(t, rel=1e-11)
    step = 1e-3
    secant = (columns.pressure(t + step)[0] - columns.pressure(t - step)[0]) / (2.0 * step)
    assert float(slope) == pytest.approx(float(secant), rel=1e-6)


def test_a_column_is_inverted_at_once() -> None:
    t = np.linspace(250.0, 360.0, 501)
    assert saturation_temperature(vapour_pressure(t, "propane"), "propane") == pytest.approx(t, rel=1e-12)
