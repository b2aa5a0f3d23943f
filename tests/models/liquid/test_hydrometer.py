"""The glass of a hydrometer, in both published forms."""

import numpy as np
import pytest

from models.liquid.hydrometer import hydrometer_factor

F60 = 273.15 + 28.0 / 1.8


# API MPMS 11.1-1980 tables 5, 23 and 53; recomputed by hand: 25 °C away is 1 - 5.75e-4 - 1.25e-5.
@pytest.mark.parametrize(
    ("celsius", "calibration", "factor"),
    [(40.0, 15.0, 0.9994125), (45.0, 20.0, 0.9994125), (15.0, 15.0, 1.0), (-5.0, 15.0, 1.000452)],
)
def test_celsius_form(celsius: float, calibration: float, factor: float) -> None:
    assert float(hydrometer_factor(celsius + 273.15, calibration + 273.15)) == pytest.approx(factor, abs=1e-12)


# By hand: 100 °F away is 1 - 1.278e-3 - 6.2e-5; -60 °F away is 1 + 7.668e-4 - 2.232e-5.
@pytest.mark.parametrize(("fahrenheit", "factor"), [(160.0, 0.99866), (60.0, 1.0), (0.0, 1.00074448)])
def test_fahrenheit_form(fahrenheit: float, factor: float) -> None:
    assert float(hydrometer_factor((fahrenheit - 32.0) / 1.8 + 273.15, F60)) == pytest.approx(factor, abs=1e-12)


def test_both_forms_are_one_glass() -> None:
    t = np.linspace(230.0, 400.0, 50)
    assert np.abs(hydrometer_factor(t, F60) / hydrometer_factor(t - F60 + 288.15, 288.15) - 1.0).max() < 2e-6


def test_no_other_calibration_is_guessed() -> None:
    assert np.isnan(hydrometer_factor([300.0, 300.0], [273.15 + 25.0, np.nan])).all()
    scales = np.array([288.15, F60, 293.15])  # known to a thousandth of a kelvin
    assert np.isfinite(hydrometer_factor(300.0, [scales + 0.995e-3, scales - 0.995e-3])).all()
    assert np.isnan(hydrometer_factor(300.0, [scales + 1.005e-3, scales - 1.005e-3])).all()
