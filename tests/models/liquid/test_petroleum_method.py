"""The equations of the petroleum correction, each constant felt, each slope held against differences."""

import numpy as np
import pytest

from models.arrays import FloatArray
from models.liquid.petroleum_groups import PASCAL_PER_PSI
from models.liquid.petroleum_method import (
    Coefficients,
    State,
    compressibility_slopes,
    log_ctl,
    log_ctl_slopes,
    log_ctpl_and_slope,
    pressed,
    scaled_compressibility,
    star,
    star_by_temperature,
    state,
)
from tests.models.liquid.petroleum_decimal import D, K, figures, slope, star_temperature

DENSITY = {"crude": 870.0, "gasoline": 690.0, "transition": 780.0, "jet": 810.0, "fuel oil": 950.0,
           "lubricating": 880.0}  # fmt: skip
CASES = [(group, t_f, psi) for group in K for t_f in (-58.0, 60.0, 131.0, 302.0) for psi in (0.0, 250.0, 1500.0)]


def at_f(t_f: float, psi: float = 0.0) -> State:
    return state((t_f - 32.0) / 1.8 + 273.15, psi * PASCAL_PER_PSI)


def coefficients(group: str) -> Coefficients:
    k0, k1, k2 = (np.float64(k) for k in K[group])
    return np.asarray(k0), np.asarray(k1), np.asarray(k2)


def array(value: float) -> FloatArray:
    return np.asarray(value, dtype=np.float64)


# API MPMS 11.1-2004, 11.1.5.3, recomputed from the published polynomial.
@pytest.mark.parametrize(("t_f", "t_star"), [(60.0, 60.0068748977), (212.0, 212.0461640), (-58.0, -58.0173596)])
def test_temperature_on_ipts_68(t_f: float, t_star: float) -> None:
    digits = 1e-10 if t_f == 60.0 else 5e-8
    assert float(at_f(t_f).star) == pytest.approx(t_star, abs=digits, rel=0)


# ITS-90 minus IPTS-68: H. Preston-Thomas, Metrologia 27 (1990), table 6 (from memory), printed to 0.001 °C.
@pytest.mark.parametrize(("celsius", "shift"), [(-50.0, 0.010), (0.0, 0.0), (50.0, -0.013), (100.0, -0.026)])
def test_shift_is_that_of_the_temperature_scale(celsius: float, shift: float) -> None:
    assert float(state(celsius + 273.15, 0.0).shift) == pytest.approx(shift, abs=6e-4)


@pytest.mark.parametrize("t_f", [-58.0, 32.0, 100.0, 250.0, 302.0])
def test_temperature_on_ipts_68_in_decimals(t_f: float) -> None:
    here = at_f(t_f)
    assert float(here.star) - t_f == pytest.approx(float(star_temperature(D(t_f)) - D(t_f)), abs=2e-13)
    assert float(here.shift) * -1.8 == pytest.approx(float(star_temperature(D(t_f)) - D(t_f)), rel=1e-12, abs=1e-15)
    by_celsius = 1.8 * slope(star_temperature, D(t_f)).__float__()
    assert float(star_by_temperature(here.celsius)) == pytest.approx(by_celsius, rel=1e-14)


def test_pressure_below_zero_counts_as_zero() -> None:
    assert float(state(300.0, -5e4).psi) == 0.0
    assert float(state(300.0, 6894.757 * 300.0).psi) == pytest.approx(300.0, rel=1e-15)


def test_star_at_35_degrees_api() -> None:
    # API 35 crude, recomputed from the published equations: rho* 849.016360, alpha60 4.731993366e-4 per °F.
    s = star(array(141.5 / 166.5 * 999.016), coefficients("crude"))
    assert float(s.density) == pytest.approx(849.016360, abs=5e-7)
    assert float(s.alpha) == pytest.approx(4.731993366e-4, abs=5e-14)


@pytest.mark.parametrize(("group", "t_f", "psi"), CASES)
def test_every_figure_is_that_of_the_decimals(group: str, t_f: float, psi: float) -> None:
    rho, here = array(DENSITY[group]), at_f(t_f, psi)
    want = figures(D(DENSITY[group]), D(t_f), D(psi), group)
    s = star(rho, coefficients(group))
    fp = scaled_compressibility(s.density, here.star)
    assert float(s.density) - float(rho) == pytest.approx(float(want["star"]) - float(rho), abs=3e-13)
    assert float(s.alpha) == pytest.approx(float(want["alpha"]), rel=1e-14)
    assert float(log_ctl(s.alpha, here.star)) == pytest.approx(float(want["ctl"].ln()), rel=1e-13, abs=1e-16)
    assert float(fp) == pytest.approx(float(want["fp"]), rel=1e-14)
    assert 1.0 / (1.0 - float(pressed(fp, here.psi))) == pytest.approx(float(want["cpl"]), rel=1e-14)
    log_ctpl, _ = log_ctpl_and_slope(rho, coefficients(group), here)
    assert float(log_ctpl) == pytest.approx(float((want["ctl"] * want["cpl"]).ln()), rel=1e-13, abs=1e-15)


def test_a_known_alpha60_is_the_constant_term() -> None:
    k = (array(0.0), array(0.0), array(650e-6))
    for t_f, psi in ((-58.0, 0.0), (30.0, 400.0), (302.0, 1500.0)):
        want = figures(D(720), D(t_f), D(psi), "special", D("0.000650"))
        log_ctpl, _ = log_ctpl_and_slope(array(720.0), k, at_f(t_f, psi))
        assert 720.0 * np.exp(float(log_ctpl)) == pytest.approx(float(want["density"]), rel=1e-14)
    assert float(star(array(720.0), k).density) == pytest.approx(float(want["star"]), rel=1e-15)


@pytest.mark.parametrize(("group", "t_f", "psi"), CASES)
def test_slopes_are_those_of_the_decimals(group: str, t_f: float, psi: float) -> None:
    rho, here, k = DENSITY[group], at_f(t_f, psi), coefficients(group)

    def logarithm(name: str, density: D, temperature: D) -> D:
        return figures(density, temperature, D(psi), group)[name].ln()

    s = star(array(rho), k)
    def by_base(name: str) -> D:
        return slope(lambda r: logarithm(name, r, D(t_f)), D(rho)) * D(rho)

    by_density = {name: by_base(name) for name in ("star", "fp", "density")}
    alpha_by_density = slope(lambda r: figures(r, D(t_f), D(psi), group)["alpha"], D(rho)) * D(rho)
    star_by_f = slope(star_temperature, D(t_f))
    ctl_by_star = slope(lambda t: logarithm("ctl", D(rho), t), D(t_f)) / star_by_f
    fp_by_star = slope(lambda t: logarithm("fp", D(rho), t), D(t_f)) / star_by_f
    fp_slope, fp_star_slope = compressibility_slopes(s.density, here.star)
    by_alpha, by_star = log_ctl_slopes(s.alpha, here.star)
    assert float(s.slope) == pytest.approx(float(by_density["star"]), rel=1e-14)
    assert float(s.alpha_slope * s.slope) == pytest.approx(float(alpha_by_density), rel=1e-13)
    assert float(fp_slope * s.slope) == pytest.approx(float(by_density["fp"]), rel=1e-13)
    assert float(fp_star_slope) == pytest.approx(float(fp_by_star), rel=1e-13)
    assert float(by_star) == pytest.approx(float(ctl_by_star), rel=1e-13)
    _, whole = log_ctpl_and_slope(array(rho), k, here)
    assert float(whole) == pytest.approx(float(by_density["density"]), rel=1e-13)
    ctl_by_density = slope(lambda r: logarithm("ctl", r, D(t_f)), D(rho)) * D(rho)
    assert float(by_alpha * s.alpha_slope * s.slope) == pytest.approx(float(ctl_by_density), rel=1e-11, abs=1e-15)


def test_a_transition_without_expansion_has_its_slopes() -> None:
    # alpha60 is 0 where rho^2 = 1489.0670/0.00186840; the published B divides by it, its product with A does not.
    nothing = np.sqrt(1489.0670 / 0.00186840)
    s = star(array(float(nothing)), coefficients("transition"))
    assert np.isfinite([float(s.density), float(s.slope), float(s.alpha_slope)]).all()
    assert abs(float(s.alpha)) < 1e-7
