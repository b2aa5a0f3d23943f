"""Compressibility and vapour pressure of light hydrocarbons, by hand and against equations of state."""

import numpy as np
import pytest
from CoolProp.CoolProp import PropsSI

from models.liquid.light_pressure import (
    PASCAL_PER_PSI,
    compress,
    critical_guard,
    least_compressed_relative_density,
    reaches_compressed,
    vapour_pressure,
)

PURE = [("Propane", 0.507025), ("IsoButane", 0.562827), ("n-Butane", 0.584127)]  # γ of GPA TP-27's reference fluids


def kelvin(fahrenheit):
    return (np.asarray(fahrenheit, dtype=float) + 459.67) / 1.8


def test_a_pound_per_square_inch():
    # Published: 1 psi = 6.894757 kPa (API MPMS 11.1-2004).
    assert pytest.approx(6894.757, abs=5e-4) == PASCAL_PER_PSI


@pytest.mark.parametrize(
    ("gamma", "fahrenheit", "psi", "factor_psi", "factor"),
    # Recomputed term by term from the equation of API MPMS 11.2.2-1986 in decimal arithmetic of 40 digits.
    [
        (0.36, -40, 400, 3.220749193, 1.01305113449),
        (0.42, 20, 600, 4.348108144, 1.02678749851),
        (0.507, 60, 500, 3.323946841, 1.01690061799),
        (0.507, 100, 1000, 4.617084597, 1.04840578187),
        (0.507, -50, 200, 1.367311649, 1.00274212197),
        (0.563, 100, 750, 2.864759591, 1.02195746844),
        (0.584, 40, 1500, 1.428896391, 1.02190290050),
        (0.584, 140, 300, 3.733550716, 1.01132752785),
        (0.631, 0, 1000, 0.8784229004, 1.00886207550),
        (0.631, 130, 50, 2.016925550, 1.00100948080),
        (0.637, 140, 2000, 1.656840122, 1.03427248293),
        (0.637, -50, 2000, 0.6832081439, 1.01385345879),
    ],
)
def test_the_equation_by_hand(gamma, fahrenheit, psi, factor_psi, factor):
    found = compress(gamma, kelvin(fahrenheit), psi * 6894.757293168361)
    assert float(found.factor_psi) == pytest.approx(factor_psi, rel=1e-9)
    assert float(found.factor) == pytest.approx(factor, rel=1e-11)


def of_equation_of_state(name, fahrenheit, psi):
    """F of API MPMS 11.2.2 from the densities of an equation of state: (1 − ρ_sat/ρ)/(1e-5 D)."""
    t = float(kelvin(fahrenheit))
    saturated, pressure = (PropsSI(what, "T", t, "Q", 0, name) for what in ("D", "P"))
    return (1.0 - saturated / PropsSI("D", "T", t, "P", pressure + psi * PASCAL_PER_PSI, name)) / (1e-5 * psi)


@pytest.mark.parametrize(("name", "gamma"), PURE)
def test_within_6_2_percent_of_equations_of_state(name, gamma):
    # 40 to 130 °F and 100 to 1000 psi above saturation; the standard's own uncertainty is ±6.5 % (from memory).
    worst = max(
        abs(float(compress(gamma, kelvin(f), psi * PASCAL_PER_PSI).factor_psi) / of_equation_of_state(name, f, psi) - 1)
        for f in (40, 70, 100, 130)
        for psi in (100, 250, 500, 750, 1000)
    )
    print(f"{name}: F within {worst:.1%} of the equation of state")
    assert worst < 0.062


@pytest.mark.parametrize(("name", "gamma"), PURE)
@pytest.mark.parametrize("psi", [500, 1000])
def test_the_third_term_of_b_bears_the_relative_density(name, gamma, psi):
    # A copy without that G gives an F that is 22 to 75 % low; ours is not that one.
    for f in (40.0, 130.0):
        rankine = f + 459.67
        a = 1.0 / float(compress(gamma, kelvin(f), 0.0).factor_psi)
        b = -6.0357667e-10 * rankine**2 + 2.2112678e-6 * rankine * gamma**2 + 0.00088384 - 0.00204016 * gamma**2
        low = 1.0 - 1.0 / (a + b * psi) / of_equation_of_state(name, f, psi)
        assert 0.21 < low < 0.76
        ours = float(compress(gamma, kelvin(f), psi * PASCAL_PER_PSI).factor_psi)
        assert abs(ours / of_equation_of_state(name, f, psi) - 1.0) < 0.062


def test_nothing_is_compressed_at_saturation():
    found = compress([0.4, 0.5, 0.6], 290.0, 0.0)
    assert np.array_equal(found.factor, [1.0, 1.0, 1.0])
    assert np.array_equal(found.by_temperature, [0.0, 0.0, 0.0])
    assert np.array_equal(found.by_relative_density, [0.0, 0.0, 0.0])
    assert found.by_pressure == pytest.approx(found.factor_psi * 1e-5 / 6894.757293168361, rel=1e-12)


@pytest.mark.parametrize("gamma", [0.36, 0.42, 0.507, 0.563, 0.584, 0.637])
def test_slopes_agree_with_differences(gamma):
    t, p = np.meshgrid(np.linspace(229.0, min(333.0, float(critical_guard(gamma))), 6), [1e4, 5e5, 3e6, 1.2e7])
    found = compress(gamma, t, p)

    def log(gamma, t, p):
        return np.log(compress(gamma, t, p).factor)

    by_p = (log(gamma, t, p * 1.0005) - log(gamma, t, p * 0.9995)) / (1e-3 * p)
    by_t = (log(gamma, t + 0.01, p) - log(gamma, t - 0.01, p)) / 0.02
    by_gamma = (log(gamma * np.exp(1e-4), t, p) - log(gamma * np.exp(-1e-4), t, p)) / 2e-4
    assert found.by_pressure == pytest.approx(by_p, rel=2e-6)
    assert found.by_temperature == pytest.approx(by_t, rel=2e-6, abs=1e-12)
    assert found.by_relative_density == pytest.approx(by_gamma, rel=2e-6)


@pytest.mark.parametrize(
    ("gamma", "fahrenheit"),
    # 0.96 of 621.418 − 822.686 G + 1737.86 G² °R, recomputed in decimal arithmetic.
    [(0.36, 68.7885882), (0.42, 99.4804486), (0.46, 126.615071), (0.5, 159.088400)],
)
def test_the_guard_before_the_critical_temperature(gamma, fahrenheit):
    assert float(critical_guard(gamma)) == pytest.approx(float(kelvin(fahrenheit)), abs=3e-7)
    assert float(least_compressed_relative_density(kelvin(fahrenheit))) == pytest.approx(gamma, abs=1e-8)
    if fahrenheit < 140.0:
        assert reaches_compressed(gamma, kelvin(fahrenheit - 0.01))
        assert not reaches_compressed(gamma, kelvin(fahrenheit + 0.01))


def test_far_below_every_critical_temperature_the_range_begins_at_its_limit():
    assert np.array_equal(least_compressed_relative_density([100.0, 230.0]), [0.35, 0.35])


def test_the_methods_range():
    # API MPMS 11.2.2-1986, published in its title: 0.350-0.637 relative density, −50 °F to 140 °F.
    assert reaches_compressed([0.35, 0.637], kelvin(0.0)).all()
    assert not reaches_compressed([0.3499, 0.6371], kelvin(0.0)).any()
    assert reaches_compressed(0.6, kelvin([-50.0, 140.0])).all()
    assert not reaches_compressed(0.6, kelvin([-50.1, 140.1])).any()
    assert not reaches_compressed([np.nan, 0.6], [300.0, np.nan]).any()


@pytest.mark.parametrize(
    ("gamma", "fahrenheit", "psia"),
    # Recomputed from the rows of GPA TP-15 / API MPMS 11.2.5 in decimal arithmetic; both sides of each row's limit.
    [
        (0.49, 60, np.exp(-6.4747 + 37.083 * 0.49 + (12038 - 31296.5 * 0.49) / 503)),
        (0.495, 60, 150.663372),
        (0.507, 100, 195.237385),
        (0.507, 20, 57.7255322),
        (0.51, 100, 183.520009),
        (0.53, 0, 23.2664717),
        (0.5599, 130, 118.217341),
        (0.56, 130, 118.053557),
        (0.58, 32, 16.0113845),
        (0.5841, 100, 52.2321886),
    ],
)
def test_vapour_pressure_by_hand(gamma, fahrenheit, psia):
    assert float(vapour_pressure(gamma, kelvin(fahrenheit))[0]) == pytest.approx(psia * 6894.757293168361, rel=3e-9)


def test_commercial_propane_and_butane():
    # Recomputed: 195.2 psia at γ 0.507 and 100 °F, 52.2 psia for n-butane, half a unit of the last digit.
    found = vapour_pressure([0.507, 0.5841], kelvin(100.0))[0] / 6894.757293168361
    assert found == pytest.approx([195.2, 52.2], abs=0.05)
    # Pure propane has 188.6 psia and n-butane 51.6 by their equations of state: the commercial mixture is above.
    pure = [PropsSI("P", "T", float(kelvin(100.0)), "Q", 0, name) for name in ("Propane", "n-Butane")]
    assert np.array(pure) / 6894.757293168361 == pytest.approx([188.6, 51.6], abs=0.1)


@pytest.mark.parametrize(("name", "gamma", "bound"), [(*PURE[0], 0.045), (*PURE[1], 0.025), (*PURE[2], 0.030)])
def test_vapour_pressure_within_percents_of_the_pure_fluid(name, gamma, bound):
    t = kelvin(np.linspace(-40.0, 130.0, 18))
    pure = np.array([PropsSI("P", "T", x, "Q", 0, name) for x in t])
    worst = float(np.max(np.abs(vapour_pressure(gamma, t)[0] / pure - 1.0)))
    print(f"{name}: vapour pressure within {worst:.1%} of the pure fluid, -40 to 130 °F")
    assert worst < bound


def test_the_slope_of_the_vapour_pressure_agrees_with_differences():
    gamma, t = np.meshgrid([0.49, 0.5, 0.52, 0.559, 0.57, 0.58], np.linspace(230.0, 360.0, 7))
    slope = vapour_pressure(gamma, t)[1]
    found = (vapour_pressure(gamma, t + 0.005)[0] - vapour_pressure(gamma, t - 0.005)[0]) / 0.01
    assert slope == pytest.approx(found, rel=1e-7)


def test_no_vapour_pressure_outside_the_rows_at_hand():
    for which in (0, 1):
        values = vapour_pressure([0.4899, 0.49, 0.5849, 0.585, np.nan, 0.5], [300.0] * 5 + [np.nan])[which]
        assert np.isnan(values).tolist() == [True, False, False, True, True, True]


def test_no_compressibility_where_the_formula_has_none():
    # A of the equation is −0.0059 for γ 0.36 at 310 K (recomputed), beyond the guard: F would be negative.
    found = compress(0.36, 310.0, [0.0, 1e5])
    assert np.isnan(found.factor).all() and np.isnan(found.by_pressure).all()
