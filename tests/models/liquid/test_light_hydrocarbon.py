"""Light hydrocarbons by relative density: density, its inverse, slopes, and what is refused."""

import numpy as np
import pytest
from CoolProp.CoolProp import PropsSI

from models.liquid.light_hydrocarbon import factors, point, relative_density_60f, why_outside

WATER_60F = 999.016  # kg/m³, published: API MPMS 11.1-2004
PSI = 6894.757293168361  # Pa


def kelvin(fahrenheit):
    return (np.asarray(fahrenheit, dtype=float) + 459.67) / 1.8


def to_base(density_base, celsius_base, celsius):
    """Factor from a base temperature, as the metric tables 54E and 60E are made."""
    gamma = relative_density_60f(density_base, 273.15 + celsius_base, 0.0)
    return float(point(gamma, 273.15 + celsius, 0.0).density) / density_base


@pytest.mark.parametrize(
    ("base", "density", "celsius", "factor"),
    # Recomputed from the published equation of GPA TP-27, tables 54E (15 °C) and 60E (20 °C).
    [
        (15, 507.0, 0.0, 1.041834),
        (15, 507.0, 30.0, 0.954186),
        (15, 507.0, 45.0, 0.902753),
        (15, 560.0, -38.0, 1.106099),
        (15, 560.0, 30.0, 0.966381),
        (15, 580.0, 30.0, 0.969879),
        (20, 500.0, 30.0, 0.968578),
    ],
)
def test_metric_bases(base, density, celsius, factor):
    assert to_base(density, base, celsius) == pytest.approx(factor, abs=5.1e-7)


def test_the_table_of_1952():
    # Published in a worked example of a refrigerated cargo: ρ15 0.560 at −38 °C, Table 54 of 1952, 1.10600.
    # The equation of 2007 is a later fit of the same property: a unit of the fourth decimal apart.
    assert to_base(560.0, 15, -38.0) == pytest.approx(1.10600, abs=1.05e-4)


@pytest.mark.parametrize(
    ("observed", "fahrenheit", "gamma"),
    # Recomputed from the published equation of GPA TP-27, table 23E, seven decimals.
    [
        (0.67432, -23.33, 0.6310585),
        (0.24573, 189.98, 0.4888290),
        (0.50004, 190.04, 0.5917589),
        (0.39548, 59.78, 0.3951838),
        (0.60133, 177.17, 0.6627312),
    ],
)
def test_relative_density_at_60_fahrenheit(observed, fahrenheit, gamma):
    found = relative_density_60f(observed * WATER_60F, kelvin(fahrenheit), 0.0)
    assert float(found) == pytest.approx(gamma, abs=5.1e-8)


def test_density_is_the_product_of_its_factors():
    # CTL 0.930150 for γ 0.5073 at 100 °F (recomputed from GPA TP-27); CPL by API MPMS 11.2.2-1986 at 1000 psi in
    # decimal arithmetic for γ 0.507: 1.04840578187, CTL there from the same route.
    saturated = float(point(0.5073, kelvin(100.0), 0.0).density)
    assert saturated == pytest.approx(0.5073 * WATER_60F * 0.930150, rel=6e-7)
    steps = factors(0.507, kelvin(100.0), 1000.0 * PSI)
    assert float(steps.density) == pytest.approx(
        0.507 * WATER_60F * float(steps.saturation.factor) * 1.04840578187, rel=1e-11
    )
    assert float(steps.density) == float(point(0.507, kelvin(100.0), 1000.0 * PSI).density)


def grid(*, pressed):
    gamma, t = np.meshgrid(np.linspace(0.35, 0.688, 131), np.linspace(227.15, 366.15, 71))
    excess = np.full(gamma.shape, 2.0e6 if pressed else 0.0)
    return gamma, t, excess


@pytest.mark.parametrize("pressed", [False, True])
def test_round_trip_over_the_whole_range(pressed):
    gamma, t, excess = grid(pressed=pressed)
    there = point(gamma, t, excess)
    back = relative_density_60f(there.density, t, excess)
    known = np.isfinite(there.density)
    assert (0.5 if pressed else 0.89) < known.mean() < (0.6 if pressed else 0.9)
    assert np.array_equal(np.isfinite(back), known)
    assert np.max(np.abs(back[known] / gamma[known] - 1.0)) < 1e-12
    assert np.max(np.abs(point(back, t, excess).density[known] / there.density[known] - 1.0)) < 1e-12


@pytest.mark.parametrize("pressed", [False, True])
def test_density_rises_with_the_relative_density(pressed):
    # So that an observed density has one root. Below 0.333 the equation falls at −40 °F, which is outside.
    by_key = point(*grid(pressed=pressed)).by_key
    assert np.nanmin(by_key) > 0.1


@pytest.mark.parametrize("excess", [0.0, 3e5, 5e6])
def test_slopes_agree_with_differences(excess):
    gamma, t = np.meshgrid([0.42, 0.45, 0.49, 0.52, 0.575, 0.6, 0.6275], np.linspace(229.0, 300.0, 6))
    found = point(gamma, t, excess)

    def log(gamma, t, excess):
        return np.log(point(gamma, t, excess).density)

    by_t = (log(gamma, t + 0.005, excess) - log(gamma, t - 0.005, excess)) / 0.01
    assert found.expansivity == pytest.approx(-by_t, rel=1e-6)
    by_key = (log(gamma * np.exp(1e-5), t, excess) - log(gamma * np.exp(-1e-5), t, excess)) / 2e-5
    assert found.by_key == pytest.approx(by_key, rel=1e-6)
    by_p = (log(gamma, t, excess + 4000.0) - log(gamma, t, excess + 2000.0)) / 2000.0
    assert point(gamma, t, excess + 3000.0).compressibility == pytest.approx(by_p, rel=1e-6)


def test_below_saturation_counts_as_saturation():
    here, below = point(0.51, 300.0, 0.0), point(0.51, 300.0, -2e5)
    assert float(here.density) == float(below.density)
    assert float(below.compressibility) == 0.0 < float(here.compressibility)
    assert float(here.expansivity) == float(below.expansivity)
    assert float(relative_density_60f(here.density, 300.0, -2e5)) == pytest.approx(0.51, rel=1e-12)


def test_where_the_compressibility_is_not_needed_its_range_does_not_matter():
    # 150 °F is above the 140 °F of API MPMS 11.2.2, 0.65 above its 0.637; at saturation the density stands.
    for gamma, t in [(0.58, kelvin(150.0)), (0.65, 300.0), (0.36, kelvin(80.0))]:
        assert np.isfinite(point(gamma, t, 0.0).density) and np.isfinite(point(gamma, t, 0.0).expansivity)
        assert np.isnan(point(gamma, t, 0.0).compressibility)
        assert float(point(gamma, t, -1.0).compressibility) == 0.0
        pressed = point(gamma, t, 1.0)
        assert np.isnan([pressed.density, pressed.expansivity, pressed.compressibility, pressed.by_key]).all()
        density = point(gamma, t, 0.0).density
        assert np.isnan(relative_density_60f(density, t, 1e4))


@pytest.mark.parametrize(
    ("gamma", "t"),
    [(0.3499, 250.0), (0.6881, 300.0), (0.5, 227.0), (0.6, 366.3), (0.36, 310.0), (np.nan, 300.0), (0.5, np.nan)],
)
def test_outside_is_not_a_number(gamma, t):
    found = point(gamma, t, 0.0)
    assert np.isnan([found.density, found.expansivity, found.compressibility, found.by_key]).all()
    assert np.isnan(point(gamma, t, -1.0).compressibility)


def test_no_relative_density_outside():
    assert np.isnan(relative_density_60f([100.0, 900.0, 0.0, -5.0, np.nan], 290.0, 0.0)).all()
    assert np.isnan(relative_density_60f(500.0, [227.0, 366.3, np.nan], 0.0)).all()
    assert np.isnan(relative_density_60f(500.0, 290.0, np.nan))
    assert np.isnan(point(0.5, 290.0, np.nan).density)
    # Just outside either end of the range at 60 °F, where the factor is 1.
    t = kelvin(60.0)
    assert np.isfinite(relative_density_60f([0.35 * WATER_60F, 0.688 * WATER_60F], t, 0.0)).all()
    assert np.isnan(relative_density_60f([0.3499 * WATER_60F, 0.6881 * WATER_60F], t, 0.0)).all()


def test_shapes_broadcast():
    gamma, t, excess = np.array([[0.5], [0.6]]), np.array([250.0, 290.0, 310.0]), np.array(1e5)
    found = point(gamma, t, excess)
    assert found.density.shape == found.expansivity.shape == found.by_key.shape == found.compressibility.shape == (2, 3)
    assert relative_density_60f(found.density, t, excess) == pytest.approx(np.broadcast_to(gamma, (2, 3)), rel=1e-12)
    assert point(0.5, 290.0, 0.0).density.shape == relative_density_60f(500.0, 290.0, 0.0).shape == ()
    assert relative_density_60f(np.array([]), 290.0, 0.0).shape == (0,)


@pytest.mark.parametrize(("name", "gamma"), [("Propane", 0.507025), ("IsoButane", 0.562827), ("n-Butane", 0.584127)])
def test_compressed_density_against_equations_of_state(name, gamma):
    # 40 to 130 °F, to 1000 psi above saturation: what is left of F's 6 % in the density.
    worst = 0.0
    for f in (40.0, 70.0, 100.0, 130.0):
        t = float(kelvin(f))
        pressure, base = PropsSI("P", "T", t, "Q", 0, name), PropsSI("D", "T", float(kelvin(60.0)), "Q", 0, name)
        for psi in (0.0, 250.0, 500.0, 1000.0):
            reference = PropsSI("D", "T", t, "P", pressure + max(psi, 0.01) * PSI, name) / base
            ours = float(point(gamma, t, psi * PSI).density) / (gamma * WATER_60F)
            worst = max(worst, abs(ours / reference - 1.0))
    print(f"{name}: density over that at 60 °F within {worst:.1e} of the equation of state")
    assert worst < 2e-3


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ((0.5, np.nan, 200.0), ["the temperature", "-73.15 °C", "from -46 to 93 °C", "density_table"]),
        ((None, 500.0, 400.0), ["the temperature", "126.85 °C", "from -46 to 93 °C"]),
        ((0.34, np.nan, 290.0), ["relative density at 60 °F is 0.34", "from 0.35 to 0.688"]),
        ((0.7, np.nan, 290.0), ["relative density at 60 °F is 0.7", "from 0.35 to 0.688"]),
        # Ethane's critical temperature, table of GPA TP-27: 305.33 K = 32.18 °C.
        ((0.355994, np.nan, 310.0), ["is 0.355994", "36.85 °C", "critical temperature, 32.18 °C"]),
        ((None, 900.0, 290.0), ["density is 900 kg/m³ at 16.85 °C", "from 0.35 to 0.688"]),
        ((None, 200.0, 290.0), ["density is 200 kg/m³ at 16.85 °C", "from 0.35 to 0.688"]),
        ((None, 680.0, 290.0, 1e5), ["density is 680 kg/m³", "to 0.637"]),
        ((0.58, np.nan, 340.0, 1e5), ["66.85 °C at 100 kPa above", "compressibility", "from -45.56 to 60 °C"]),
        ((None, 500.0, 227.3, 1e5), ["-45.85 °C at 100 kPa above", "from -45.56 to 60 °C"]),
        ((0.65, np.nan, 300.0, 1e5), ["is 0.65", "compressibility is defined from 0.35 to 0.637"]),
        # 0.96 of the critical temperature of API MPMS 11.2.2 for 0.36: 68.7885882 °F = 20.44 °C.
        ((0.36, np.nan, 300.0, 1e5), ["is 0.36", "26.85 °C", "defined up to 20.44 °C"]),
    ],
)
def test_why_outside(arguments, words):
    said = why_outside(*arguments)
    for word in words:
        assert word in said
    # and the columns refuse exactly what is explained
    gamma, density, t, excess = (*arguments, 0.0)[:4]
    refused = relative_density_60f(density, t, excess) if gamma is None else point(gamma, t, excess).density
    assert np.isnan(refused)


@pytest.mark.parametrize("arguments", [(0.51, np.nan, 300.0), (None, 500.0, 300.0), (0.51, np.nan, 300.0, 1e5)])
def test_nothing_to_explain(arguments):
    assert why_outside(*arguments) == ""


def test_rows_above_and_at_saturation_stand_in_one_column():
    gamma = np.array([0.37, 0.45, 0.5, 0.55, 0.6, 0.65])
    t = np.array([308.0, 290.0, 330.0, 300.0, 350.0, 366.15])
    excess = np.array([0.0, 1e6, 2e5, -1e5, 0.0, 0.0])
    density = point(gamma, t, excess).density
    assert relative_density_60f(density, t, excess) == pytest.approx(gamma, rel=1e-12)
    alone = [float(relative_density_60f(*row)) for row in zip(density, t, excess, strict=True)]
    assert relative_density_60f(density, t, excess).tolist() == alone


def test_close_to_the_critical_temperature_the_root_is_found():
    # Propane, 369.78 K, is outside the tables; between EP(35/65), 352.46 K, and it 366.15 K is critical at γ 0.499345:
    # 0.470381 + (366.15 − 352.46)/(369.78 − 352.46) · (0.507025 − 0.470381), table of GPA TP-27.
    gamma = 0.499345 + np.array([1e-6, 1e-5, 1e-4, 1e-3])
    density = point(gamma, 366.15, 0.0).density
    assert np.isfinite(density).all()
    assert relative_density_60f(density, 366.15, 0.0) == pytest.approx(gamma, rel=1e-12)
    assert np.isnan(point(0.499344, 366.15, 0.0).density)
