"""A light hydrocarbon at an absolute pressure: above equilibrium it is compressed, at and below it is not."""

from __future__ import annotations

import numpy as np
import pytest

from models.liquid import light_hydrocarbon
from models.liquid.light_state import excess, key_at, point_at

PSI = 6894.757293168361  # Pa, exact
BY_HAND = 195.2 * PSI  # Pa, γ 0.507 at 100 °F: recomputed from GPA TP-15
T100 = 273.15 + (100.0 - 32.0) / 1.8


def test_the_excess_is_what_lies_above_the_pressure_of_equilibrium() -> None:
    found = excess(0.507, T100, BY_HAND + 50_000.0)
    assert float(found) == pytest.approx(50_000.0, abs=0.05 * PSI)
    assert excess(0.507, T100, [BY_HAND - 50_000.0, 0.0]).tolist() == [0.0, 0.0]
    assert float(excess(0.45, T100, 3e6)) == 0.0  # its pressure of equilibrium is not known: as stored
    assert float(excess(0.62, T100, 3e6)) == pytest.approx(float(excess(0.585 - 1e-12, T100, 3e6)), rel=1e-9)
    assert np.isnan(excess(0.507, T100, np.nan))


@pytest.mark.parametrize("gamma", [0.40, 0.507, 0.55, 0.58, 0.65])
def test_at_and_below_equilibrium_the_density_is_the_saturated_one(gamma: float) -> None:
    saturated = light_hydrocarbon.point(gamma, 293.15, 0.0)
    found = point_at(gamma, 293.15, 1e5)
    assert float(found.density) == float(saturated.density)
    assert float(found.compressibility) == 0.0
    assert float(found.expansivity) == float(saturated.expansivity)


@pytest.mark.parametrize(("gamma", "pressure"), [(0.507, 2e6), (0.55, 1.5e6), (0.58, 3e6), (0.507, 9.5e5), (0.6, 2e6)])
def test_every_slope_is_at_a_fixed_pressure(gamma: float, pressure: float) -> None:
    def log(g: float, t: float, p: float) -> float:
        return float(np.log(point_at(g, t, p).density))

    found, t, step = point_at(gamma, 293.15, pressure), 293.15, 1e-4
    assert float(found.compressibility) > 0.0
    beta = -(log(gamma, t + step, pressure) - log(gamma, t - step, pressure)) / (2.0 * step)
    assert float(found.expansivity) == pytest.approx(beta, rel=1e-6)
    kappa = (log(gamma, t, pressure + 100.0) - log(gamma, t, pressure - 100.0)) / 200.0
    assert float(found.compressibility) == pytest.approx(kappa, rel=1e-5)
    by_key = gamma * (log(gamma + 1e-7, t, pressure) - log(gamma - 1e-7, t, pressure)) / 2e-7
    assert float(found.by_key) == pytest.approx(by_key, rel=1e-6)


@pytest.mark.parametrize("pressure", [1e5, 9e5, 2e6, 5e6])
def test_a_density_and_its_relative_density_are_each_others_inverse(pressure: float) -> None:
    gamma = np.linspace(0.495, 0.584, 200)
    for celsius in (-20.0, 10.0, 40.0):
        t = 273.15 + celsius
        back = key_at(point_at(gamma, t, pressure).density, t, pressure)
        off = np.abs(point_at(back, t, pressure).density / point_at(gamma, t, pressure).density - 1.0)
        assert np.nanmax(off) < 1e-12
        smooth = (np.abs(gamma - 0.51) > 2e-3) & (np.abs(gamma - 0.56) > 2e-3)  # between two rows of the table
        np.testing.assert_allclose(back[smooth], gamma[smooth], rtol=1e-11)


def test_propane_under_pressure_is_near_its_reference_equation() -> None:
    """Propane at 20 °C: 503.27, 510.73 kg/m³ at 20 and 50 bar, 500.06 at saturation (Lemmon et al. 2009, CoolProp)."""
    gamma = key_at(500.06, 293.15, 8.365e5)
    found = point_at(gamma, 293.15, [2e6, 5e6]).density
    assert found == pytest.approx([503.27, 510.73], rel=1e-3)


def test_a_density_in_the_step_where_the_vapour_pressure_ceases_to_be_known_is_that_of_the_limit() -> None:
    above, below = (float(point_at(gamma, 293.15, 3e6).density) for gamma in (0.49, np.nextafter(0.49, 0.0)))
    assert above > below * 1.005
    assert float(key_at(0.5 * (above + below), 293.15, 3e6)) == 0.49
