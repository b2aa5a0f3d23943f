"""β and κ: the definitions, handbook and textbook figures, invariance of the mass."""

import numpy as np
import pytest
from CoolProp.CoolProp import PropsSI
from hypothesis import given, settings
from hypothesis import strategies as st

from models.liquid.expansivity import density, expansivity, log_volume_ratio

CONSTANT = {"coefficients": [8.3e-4], "origin": 288.15, "compressibility": 7.5e-10}


def test_acetone_textbook_example_of_heating_at_constant_volume():
    # Smith, Van Ness, Abbott, 7th ed., example 3.1: acetone at 20 °C and 1 bar, β = 1.487e-3 /K,
    # κ = 62e-6 /bar: heated at constant volume from 20 to 30 °C the pressure rises to 241 bar (values
    # from memory); along that path the volume is the same.
    ratio = log_volume_ratio(
        303.15, 1e5 + 10 * 1.487e-3 / 62e-11, temperature_ref=293.15, pressure_ref=1e5,
        coefficients=[1.487e-3], origin=293.15, compressibility=62e-11,
    )  # fmt: skip
    assert ratio == pytest.approx(0.0, abs=1e-15)


def test_acetone_textbook_change_of_volume():
    # The same example, part (d): from 20 °C, 1 bar to 0 °C, 10 bar, V2/V1 = exp(−0.0303) = 0.9702 (from memory).
    ratio = log_volume_ratio(
        273.15, 10e5, temperature_ref=293.15, pressure_ref=1e5,
        coefficients=[1.487e-3], origin=293.15, compressibility=62e-11,
    )  # fmt: skip
    assert float(ratio) == pytest.approx(-0.0303, abs=5e-5)
    assert float(np.exp(ratio)) == pytest.approx(0.9702, abs=5e-5)


@pytest.mark.parametrize(
    ("fluid", "density_20", "beta", "kappa"),
    # CRC Handbook of Chemistry and Physics, 87th ed., "Pressure and temperature dependence of liquid
    # density": water 0.206e-3 /K and 4.591e-4 /MPa at 20 °C; n-hexane, benzene from reference equations.
    [("Water", 998.207, 0.2068e-3, 4.589e-10), ("n-Hexane", 659.38, 1.369e-3, 16.22e-10),
     ("Benzene", 878.84, 1.209e-3, 9.30e-10), ("Toluene", 866.89, 1.072e-3, 8.885e-10)],
)  # fmt: skip
def test_handbook_coefficients_predict_five_kelvin_and_ten_bar(fluid, density_20, beta, kappa):
    path = {"coefficients": [beta], "origin": 293.15, "compressibility": kappa}
    warm = density(
        density_20, log_volume_ratio(298.15, 101325, temperature_ref=293.15, pressure_ref=101325, **path)
    )
    assert warm == pytest.approx(PropsSI("D", "T", 298.15, "P", 101325, fluid), rel=2e-4)
    pressed = density(
        density_20, log_volume_ratio(293.15, 10e5, temperature_ref=293.15, pressure_ref=101325, **path)
    )
    assert pressed == pytest.approx(PropsSI("D", "T", 293.15, "P", 10e5, fluid), rel=2e-5)


@pytest.mark.parametrize(
    ("fluid", "beta", "near", "far"),
    [("Water", 0.2068e-3, 1.28e-4, 1.89e-3), ("n-Hexane", 1.369e-3, 4.95e-5, 8.46e-4),
     ("Benzene", 1.209e-3, 2.62e-5, 4.43e-4), ("Toluene", 1.072e-3, 2.26e-5, 3.59e-4)],
)  # fmt: skip
def test_how_far_a_constant_beta_holds(fluid, beta, near, far):
    """Off by so much 5 and 20 K above 20 °C: exp(−β ΔT) worked out beside the reference equation's densities."""
    at_20 = PropsSI("D", "T", 293.15, "P", 101325, fluid)
    seen = []
    for t in (298.15, 313.15):
        path = {"coefficients": [beta], "origin": 293.15, "compressibility": 0.0}
        ratio = log_volume_ratio(t, 101325, temperature_ref=293.15, pressure_ref=101325, **path)
        seen.append(float(density(at_20, ratio)) / PropsSI("D", "T", t, "P", 101325, fluid) - 1.0)
    print(f"{fluid}, constant β: {seen[0]:.1e} over 5 K, {seen[1]:.1e} over 20 K")
    assert seen == pytest.approx([near, far], rel=5e-3)


def test_the_exponential_is_used_and_not_its_tangent():
    # β ΔT = 0.036: exp(−0.036) = 0.964640293, 1 − 0.036 = 0.964 would be 0.064 % low.
    ratio = log_volume_ratio(
        318.15,
        0.0,
        temperature_ref=288.15,
        pressure_ref=0.0,
        coefficients=[1.2e-3],
        origin=288.15,
        compressibility=0.0,
    )
    assert float(density(1000.0, ratio)) == pytest.approx(964.640293, abs=1e-6)


def test_a_polynomial_integrates_its_own_expansivity():
    coefficients = [1.0e-3, 2.0e-6, -3.0e-9]
    points = np.linspace(280.0, 330.0, 100_001)
    beta = expansivity(points, coefficients=coefficients, origin=288.15)
    assert float(expansivity(298.15, coefficients=coefficients, origin=288.15)) == pytest.approx(
        1.0197e-3, rel=1e-12
    )
    ratio = log_volume_ratio(
        330.0,
        0.0,
        temperature_ref=280.0,
        pressure_ref=0.0,
        coefficients=coefficients,
        origin=288.15,
        compressibility=0.0,
    )
    assert float(ratio) == pytest.approx(float(np.trapezoid(beta, points)), rel=1e-9)


@settings(derandomize=True, max_examples=50)
@given(t=st.floats(250, 400), p=st.floats(1e5, 5e6), base=st.floats(280, 300), base_p=st.floats(9e4, 2e6))
def test_mass_is_the_same_whatever_the_base_state(t, p, base, base_p):
    volume = 1234.5
    at_base = log_volume_ratio(t, p, temperature_ref=base, pressure_ref=base_p, **CONSTANT)
    standard_volume = volume * np.exp(-at_base)
    standard_density = density(842.0, -at_base)
    assert standard_volume * standard_density == pytest.approx(volume * 842.0, rel=1e-12)


def test_warm_liquid_shrinks_to_standard_and_pressed_liquid_grows():
    warm = log_volume_ratio(298.15, 101325, temperature_ref=288.15, pressure_ref=101325, **CONSTANT)
    pressed = log_volume_ratio(288.15, 1e6, temperature_ref=288.15, pressure_ref=101325, **CONSTANT)
    assert warm > 0 > pressed


def test_columns_broadcast_and_missing_stays_missing():
    ratio = log_volume_ratio(
        np.array([288.15, np.nan, 298.15]), 101325, temperature_ref=288.15, pressure_ref=101325, **CONSTANT
    )
    assert ratio.shape == (3,)
    assert ratio[0] == 0.0 and np.isnan(ratio[1]) and ratio[2] == pytest.approx(8.3e-3, rel=1e-12)
