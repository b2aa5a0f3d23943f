"""Named parts: shared errors cancel or add, others add in quadrature."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from models.estimate import ZERO, Estimate, combine

NAMES = st.sampled_from(["level:a", "density:lab", "capacity:a:1", "r:1:level", "meter:m"])
ESTIMATES = st.builds(Estimate, st.floats(-1e6, 1e6), st.dictionaries(NAMES, st.floats(-1e3, 1e3), max_size=5))


def test_a_mass_less_itself_is_exactly_nothing():
    mass = Estimate(1234.5, {"level:a": 3.1, "density:lab": -0.7})
    nothing = mass - mass
    assert (nothing.value, nothing.uncertainty, nothing.parts) == (0.0, 0.0, {})


def test_shared_parts_add_before_they_are_squared():
    one, two = Estimate(10.0, {"density:lab": 3.0, "a": 1.0}), Estimate(20.0, {"density:lab": 1.0, "b": 2.0})
    assert (one + two).uncertainty == pytest.approx(math.sqrt(16.0 + 1.0 + 4.0), rel=1e-15)
    assert (two - one).uncertainty == pytest.approx(math.sqrt(4.0 + 1.0 + 4.0), rel=1e-15)
    assert (two - one).value == 10.0
    assert (-one).parts == {"density:lab": -3.0, "a": -1.0}
    assert Estimate(1.0, {"a": 3.0, "b": 4.0}).uncertainty == 5.0


# JCGM 100:2008 (GUM), 5.2.2, example: ten resistors of 1000 Ω, each calibrated against one standard with
# u = 100 mΩ; in series the standard's error is common to all ten, and u = 1 Ω, not 0.32 Ω.
def test_ten_resistors_against_one_standard():
    resistor = Estimate(1000.0, {"standard": 0.1})
    series = combine((1.0, resistor) for _ in range(10))
    assert series.value == 10_000.0
    assert series.uncertainty == pytest.approx(1.0, rel=1e-14)


def test_nothing_is_a_neutral_summand():
    mass = Estimate(5.0, {"a": 2.0})
    assert (mass + ZERO) == mass
    assert combine(()) == ZERO


def test_sums_do_not_lose_small_masses():
    assert combine(((1.0, Estimate(1e16)), (1.0, Estimate(1.0)), (-1.0, Estimate(1e16)))).value == 1.0


@settings(derandomize=True, max_examples=50)
@given(st.lists(st.tuples(st.floats(-3.0, 3.0), ESTIMATES), min_size=1, max_size=6))
def test_the_variance_is_that_of_the_covariance_matrix(terms):
    names = sorted({name for _, estimate in terms for name in estimate.parts})
    table = np.array([[estimate.parts.get(name, 0.0) for name in names] for _, estimate in terms])
    factors = np.array([factor for factor, _ in terms])
    covariance = table @ table.T
    found = combine(terms)
    scale = float(np.sum(np.abs(factors) * np.sqrt(np.diag(covariance)))) ** 2
    assert found.uncertainty**2 == pytest.approx(
        float(factors @ covariance @ factors), rel=1e-9, abs=1e-12 * scale + 1e-300
    )
