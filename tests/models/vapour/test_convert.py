"""Conversions between the two series: exact inverses, and the right series."""

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from models.constants import GAS_CONSTANT
from models.vapour.convert import density_coefficients, pressure_coefficients


@settings(derandomize=True, max_examples=50, deadline=None)
@given(b=st.floats(-3e-3, 5e-5), c=st.floats(-5e-6, 5e-8), t=st.floats(200.0, 700.0))
def test_there_and_back(b: float, c: float, t: float) -> None:
    second, third = density_coefficients(*pressure_coefficients(b, c, t), t)
    assert float(second) == pytest.approx(b, rel=1e-13, abs=1e-20)
    assert float(third) == pytest.approx(c, rel=1e-12, abs=1e-14 * max(b * b, 1e-12))


def test_both_series_agree_where_the_gas_is_thin() -> None:
    b, c, t, density = -4e-4, 2e-8, 300.0, 2.0
    z = 1.0 + b * density + c * density**2
    pressure = z * density * GAS_CONSTANT * t
    second, third = pressure_coefficients(b, c, t)
    # What is left is the fourth term, (-3BC + 2B^3) density^3.
    assert 1.0 + second * pressure + third * pressure**2 == pytest.approx(z, abs=2e-9)
    assert 1.0 + second * pressure != pytest.approx(z, abs=1e-7)
