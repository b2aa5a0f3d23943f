"""Light hydrocarbons at saturation against the published example, the equation by hand, and equations of state."""

import numpy as np
import pytest
from CoolProp.CoolProp import PropsSI

from models.liquid.light_temperature import (
    CRITICAL_TEMPERATURE,
    FLUIDS,
    RELATIVE_DENSITY,
    between,
    correct,
    least_relative_density,
    reaches,
)


def kelvin(fahrenheit):
    return (np.asarray(fahrenheit, dtype=float) + 459.67) / 1.8


def of_standard(gamma, fahrenheit):
    return correct(gamma, kelvin(fahrenheit), between(gamma))


def test_published_example_with_its_pair_of_fluids():
    # GPA TP-27 / API MPMS 11.2.4, published: γ 0.503 at 83.7 °F between propane and i-butane, thus extrapolated.
    found = correct(0.503, kelvin(83.7), np.array(FLUIDS.index("i-butane")), np.array(FLUIDS.index("propane")))
    assert float(found.factor) == pytest.approx(0.9587323707, abs=5e-11)
    assert float(found.share) == pytest.approx(-0.07213, abs=5e-6)
    assert float(found.critical_temperature) == pytest.approx(367.034, abs=5e-4)
    assert float(found.reduced_temperature) == pytest.approx(0.822464, abs=5e-7)
    assert float(found.reduced_temperature_60f) == pytest.approx(0.786591, abs=5e-7)
    assert float(found.scale) == pytest.approx(1.263326, abs=5e-7)


def test_the_standard_takes_the_pair_that_brackets():
    # Recomputed from the published equation: EP(35/65) and propane give 0.9590031, not the 0.9587324 of the pair above.
    found = of_standard(0.503, 83.7)
    assert (FLUIDS[int(found.first)], FLUIDS[int(found.second)]) == ("EP(35/65)", "propane")
    assert float(found.factor) == pytest.approx(0.9590031, abs=5e-8)


@pytest.mark.parametrize(
    ("gamma", "fahrenheit", "factor"),
    # Recomputed from the published equation and constants of GPA TP-27, six decimals.
    [
        (0.5073, 40.0, 1.031347),
        (0.5073, 83.7, 0.959985),
        (0.5073, 100.0, 0.930150),
        (0.5073, 130.0, 0.868237),
        (0.5841, 40.0, 1.020993),
        (0.5841, 100.0, 0.955619),
        (0.5841, 130.0, 0.919608),
        (0.5000, 100.0, 0.927037),
        (0.6312, 100.0, 0.964946),
    ],
)
def test_factors_recomputed(gamma, fahrenheit, factor):
    assert float(of_standard(gamma, fahrenheit).factor) == pytest.approx(factor, abs=5.1e-7)


@pytest.mark.parametrize(
    ("gamma", "fahrenheit", "pair", "critical", "factor", "h2", "rho1", "rho2", "mixed_60f"),
    # Recomputed from the published equation in decimal arithmetic of 40 digits, every pair of fluids cold and hot.
    [
        (0.353, -40, 0, 304.632057342, 1.34629531306, 0.902595741301, 16.2749066659, 15.8056421830, 10.7245260961),
        (0.353, 60.5, 0, 304.632057342, 0.997186260685, 0.902595741301, 11.9408087046, 11.7175455924, 10.7245260961),
        (0.40, -20, 1, 322.347999263, 1.20508972850, 1.23048498669, 15.9277404255, 14.0480635983, 13.8715454410),
        (0.40, 110, 1, 322.347999263, 0.757154464457, 1.23048498669, 10.1550503102, 8.73463416929, 13.8715454410),
        (0.45, 0, 2, 343.143169764, 1.12009981878, 1.10394030926, 14.2413828562, 13.0342047305, 12.7804832873),
        (0.45, 110, 2, 343.143169764, 0.863813139663, 1.10394030926, 10.9753833715, 10.0586916107, 12.7804832873),
        (0.49, -20, 3, 361.733034603, 1.12580285082, 1.03324621733, 13.8681427654, 12.6718252555, 11.9400445838),
        (0.49, 140, 3, 361.733034603, 0.823093976469, 1.03324621733, 10.0906780756, 9.30126422938, 11.9400445838),
        (0.54, -40, 4, 392.276653346, 1.12085921108, 1.26332606416, 13.4677538746, 10.5699761857, 11.9550247176),
        (0.54, 150, 4, 392.276653346, 0.860504089112, 1.26332606416, 10.3407352986, 8.11406651205, 11.9550247176),
        (0.575, -40, 5, 417.742705634, 1.10368400966, 1.01294446454, 10.8349953070, 10.9684698014, 9.95821469537),
        (0.575, 180, 5, 417.742705634, 0.842821438973, 1.01294446454, 8.26828099013, 8.38052040599, 9.95821469537),
        (0.60, -40, 6, 439.104903631, 1.09323875469, 1.23005026516, 11.1644442584, 9.23645476910, 10.2826895032),
        (0.60, 190, 6, 439.104903631, 0.852911990588, 1.23005026516, 8.70823504543, 7.20848964556, 10.2826895032),
        (0.6275, -40, 7, 464.814375831, 1.08369574711, 1.00690083991, 9.41103164638, 9.42214245968, 8.71742655928),
        (0.6275, 190, 7, 464.814375831, 0.874094208952, 1.00690083991, 7.59067284787, 7.59992436566, 8.71742655928),
        (0.645, -40, 8, 484.817403209, 1.07753321357, 1.19669472127, 9.54256247275, 8.12161205579, 8.94267920753),
        (0.645, 190, 8, 484.817403209, 0.886149703630, 1.19669472127, 7.84946189627, 6.67776630708, 8.94267920753),
        (0.66, -40, 9, 501.870052197, 1.07368249617, 1.00639559912, 8.20430411125, 8.23037300992, 7.67121751058),
        (0.66, 190, 9, 501.870052197, 0.894749852852, 1.00639559912, 6.83750840200, 6.85806053814, 7.67121751058),
        (0.675, -40, 10, 522.311451512, 1.06970165873, 1.18801082475, 8.32136406630, 7.25322811814, 7.90278461845),
        (0.675, 190, 10, 522.311451512, 0.902271960955, 1.18801082475, 7.02707258155, 6.10918515756, 7.90278461845),
    ],
)
def test_every_fluid_and_every_step(gamma, fahrenheit, pair, critical, factor, h2, rho1, rho2, mixed_60f):
    found = of_standard(gamma, fahrenheit)
    assert (int(found.first), int(found.second)) == (pair, pair + 1)
    assert float(found.critical_temperature) == pytest.approx(critical, rel=1e-11)
    assert float(found.factor) == pytest.approx(factor, rel=1e-11)
    assert float(found.scale) == pytest.approx(h2, rel=1e-11)
    assert float(found.density_first) == pytest.approx(rho1, rel=1e-11)
    assert float(found.density_second) == pytest.approx(rho2, rel=1e-11)
    assert float(found.mixed_60f) == pytest.approx(mixed_60f, rel=1e-11)
    assert float(found.mixed) == pytest.approx(factor * mixed_60f, rel=2e-11)


def test_the_factor_is_1_at_60_fahrenheit():
    gamma = np.linspace(0.35, 0.688, 50)
    assert of_standard(gamma, 60.0).factor == pytest.approx(np.ones(50), abs=1e-14)
    same = of_standard(gamma, 60.0)
    assert same.density_first == pytest.approx(same.density_first_60f, rel=1e-14)
    assert same.density_second == pytest.approx(same.density_second_60f, rel=1e-14)


def test_a_liquid_of_a_reference_density_is_that_fluid_from_both_sides():
    for k in range(1, len(FLUIDS) - 1):
        gamma = RELATIVE_DENSITY[k]
        here = float(of_standard(gamma, 20.0).factor)
        above = float(correct(gamma, kelvin(20.0), np.array(k + 1)).factor)
        assert int(between(gamma)) == k  # γ1 < γ ≤ γ2
        assert here == pytest.approx(above, rel=1e-13)


@pytest.mark.parametrize("gamma", [0.353, 0.4, 0.45, 0.49, 0.503, 0.54, 0.575, 0.6, 0.6275, 0.645, 0.66, 0.675])
def test_slopes_agree_with_differences(gamma):
    t = np.linspace(228.0, min(366.0, 0.97 * float(of_standard(gamma, 60.0).critical_temperature)), 9)
    second = between(gamma)
    found = correct(gamma, t, second)
    step = 2e-3
    by_t = np.log(correct(gamma, t + step, second).factor / correct(gamma, t - step, second).factor) / (2 * step)
    assert found.by_temperature == pytest.approx(by_t, rel=1e-6)
    up, down = gamma * np.exp(1e-5), gamma * np.exp(-1e-5)
    by_gamma = np.log(correct(up, t, second).factor / correct(down, t, second).factor) / 2e-5
    assert found.by_relative_density == pytest.approx(by_gamma, rel=1e-6, abs=1e-9)


def test_no_liquid_at_or_above_the_critical_temperature():
    found = correct(np.array([0.507025, 0.507025]), np.array([369.77, 369.78]), np.array(4))
    assert np.isfinite(found.factor[0])
    assert np.isnan(found.factor[1]) and np.isnan(found.by_temperature[1]) and np.isnan(found.by_relative_density[1])
    # The liquid whose critical temperature is 369.78 K is propane's (table of GPA TP-27), and halfway is halfway.
    assert float(least_relative_density(369.78)) == pytest.approx(0.507025, abs=1e-12)
    assert float(least_relative_density((369.78 + 407.85) / 2)) == pytest.approx((0.507025 + 0.562827) / 2, abs=1e-12)


def test_the_standards_range():
    # GPA TP-27, published: 0.3500 to 0.6880, −50.8 to 199.4 °F, the limits themselves included.
    assert reaches([0.35, 0.688], kelvin(60.0)).all()
    assert not reaches([0.3499, 0.6881], kelvin(60.0)).any()
    assert reaches(0.5, kelvin([-50.8, 199.4])).all()
    assert not reaches(0.5, kelvin([-50.9, 199.5])).any()
    assert reaches(0.5, np.array([-46.0, 93.0]) + 273.15).all()
    assert not reaches([np.nan, 0.5], [300.0, np.nan]).any()


@pytest.mark.parametrize(
    ("name", "fluid", "highest_f", "bound"),
    # Against the reference equations of state; the bounds are the worst deviations seen, rounded up.
    [
        ("Propane", "propane", 130.0, 6.3e-4),
        ("Propane", "propane", 199.4, 1.2e-3),
        ("IsoButane", "i-butane", 199.4, 2.1e-4),
        ("n-Butane", "n-butane", 199.4, 6.1e-4),
        ("n-Pentane", "n-pentane", 199.4, 1.1e-3),
        ("n-Hexane", "n-hexane", 199.4, 1.9e-3),
        ("Ethane", "ethane", 60.0, 6.8e-4),
    ],
)
def test_equations_of_state(name, fluid, highest_f, bound):
    k = FLUIDS.index(fluid)
    t = kelvin(np.linspace(-50.8, highest_f, 60))
    t = t[t < 0.98 * CRITICAL_TEMPERATURE[k]]
    reference = np.array([PropsSI("D", "T", x, "Q", 0, name) for x in t])
    reference = reference / PropsSI("D", "T", float(kelvin(60.0)), "Q", 0, name)
    worst = float(np.max(np.abs(of_standard(RELATIVE_DENSITY[k], t * 1.8 - 459.67).factor / reference - 1.0)))
    print(f"{name}: CTL within {worst:.2e} of the equation of state, -50.8 to {t[-1] * 1.8 - 459.67:.1f} °F")
    assert worst < bound


def test_propane_between_40_and_130_fahrenheit():
    # Equation of state of propane (Lemmon, McLinden, Wagner 2009): 1.031248, 0.930258, 0.868223; within 3.4e-4.
    found = of_standard(0.507025, np.array([40.0, 100.0, 130.0])).factor
    assert found == pytest.approx([1.031401, 0.930007, 0.867931], abs=5.1e-7)
    assert np.max(np.abs(found / [1.031248, 0.930258, 0.868223] - 1.0)) < 3.4e-4
