"""Density tables: the rows themselves, the slope that is β, a cubic by hand, and never beyond the rows."""

import numpy as np
import pytest
from CoolProp.CoolProp import PropsSI
from hypothesis import given, settings
from hypothesis import strategies as st

from models.errors import DefinitionError
from models.liquid.density_table import DensityTableColumns

ATMOSPHERE = 101_325.0
TWO = [(288.15, 840.0), (308.15, 826.0)]
THREE = [(280.0, 900.0), (300.0, 880.0), (320.0, 850.0)]
COLD_WATER = [(273.15, 999.8428), (277.15, 999.9749), (283.15, 999.7027), (293.15, 998.2067)]  # Tanaka et al. (2001)


def one(rows, compressibility=0.0, pressure=ATMOSPHERE):
    return DensityTableColumns.from_tables([(rows, compressibility, pressure)])


@pytest.mark.parametrize("rows", [TWO, THREE, COLD_WATER])
def test_rows_come_back(rows):
    t, density = np.array(rows).T
    assert one(rows).point(t, ATMOSPHERE).density == pytest.approx(density, rel=1e-14)


def test_two_rows_are_a_straight_line_of_the_logarithm():
    found = one(TWO).point([293.15, 298.15, 303.15], ATMOSPHERE)
    beta = np.log(840.0 / 826.0) / 20.0  # β = −Δln ρ/ΔT
    assert found.expansivity == pytest.approx(beta, rel=1e-12)
    assert float(found.density[1]) == pytest.approx((840.0 * 826.0) ** 0.5, rel=1e-14)


def test_three_rows_are_the_cubic_of_fritsch_and_carlson():
    """By hand: slopes of equal steps are the harmonic mean inside and (3 d₁ − d₂)/2 at an end."""
    low, middle, high = np.log([900.0, 880.0, 850.0])
    first, second = (middle - low) / 20.0, (high - middle) / 20.0
    inner, left, right = 2.0 / (1.0 / first + 1.0 / second), 1.5 * first - 0.5 * second, 1.5 * second - 0.5 * first
    found = one(THREE).point([280.0, 300.0, 320.0, 290.0, 310.0], ATMOSPHERE)
    assert found.expansivity[:3] == pytest.approx([-left, -inner, -right], rel=1e-12)
    # A Hermite cubic in the middle of a step h: mean of both values + h/8 (slope before − slope after).
    expected = np.exp([(low + middle) / 2 + 2.5 * (left - inner), (middle + high) / 2 + 2.5 * (inner - right)])
    assert found.density[3:] == pytest.approx(expected, rel=1e-14)


def test_pressure_acts_by_a_constant_compressibility():
    found = one(TWO, 7.5e-10, 2e5).point(293.15, np.array([2e5, 12e5]))
    assert found.density[1] / found.density[0] == pytest.approx(np.exp(7.5e-4), rel=1e-14)
    assert found.compressibility == pytest.approx(7.5e-10) and np.all(found.by_key == 1.0)


def test_slopes_are_the_derivatives_of_the_density():
    table = one(COLD_WATER, 5e-10)
    t, h = np.linspace(273.5, 292.9, 97), 1e-3
    found = table.point(t, 3e5)
    by_t = -np.diff([np.log(table.point(t + s * h, 3e5).density) for s in (-1, 1)], axis=0)[0] / (2 * h)
    by_p = np.diff([np.log(table.point(t, 3e5 + s * 1e5).density) for s in (-1, 1)], axis=0)[0] / 2e5
    assert found.expansivity == pytest.approx(by_t, rel=1e-6, abs=2e-10)
    assert found.compressibility == pytest.approx(by_p, rel=1e-6)


def test_water_is_densest_between_its_rows_and_nowhere_denser_than_them():
    """A density that rises with temperature is water below 4 °C, and allowed."""
    t = np.linspace(273.15, 293.15, 2001)
    found = one(COLD_WATER).point(t, ATMOSPHERE)
    assert found.expansivity[1] < 0.0 < found.expansivity[-1]
    assert found.density.max() == pytest.approx(999.9749, abs=1e-10)


@pytest.mark.parametrize(
    ("fluid", "low", "high", "step", "worst"),
    [("n-Hexane", 273.15, 333.15, 10.0, 3.5e-6), ("Toluene", 273.15, 373.15, 10.0, 2.1e-6),
     ("Methanol", 273.15, 323.15, 10.0, 5.0e-6), ("n-Propane", 253.15, 323.15, 10.0, 1.8e-4)],
)  # fmt: skip
def test_tables_of_reference_equations(fluid, low, high, step, worst):
    """Rows every 10 K of a reference equation of state, read 1 K apart: the worst relative difference is told."""
    pressure = 2e6
    rows = [(t, PropsSI("D", "T", t, "P", pressure, fluid)) for t in np.arange(low, high + 1.0, step)]
    t = np.arange(low, high + 0.5, 1.0)
    found = one(rows, 0.0, pressure).point(t, pressure).density
    difference = np.max(np.abs(found / PropsSI("D", "T", t, "P", pressure, fluid) - 1.0))
    print(f"{fluid}, rows every {step:g} K: {difference:.1e}")
    assert difference < worst


def test_a_stack_answers_as_each_table_alone():
    tables = [(TWO, 0.0, ATMOSPHERE), (THREE, 1e-9, 2e5), (COLD_WATER, 5e-10, 0.0), (TWO, 2e-9, 1e6)]
    stack = DensityTableColumns.from_tables(tables)
    row = np.random.default_rng(3).integers(0, 4, 400)
    t = np.random.default_rng(4).uniform(270.0, 325.0, 400)
    t[:9], row[:9] = [288.15, 308.15, 280.0, 300.0, 320.0, 273.15, 277.15, 283.15, 293.15], [0, 0, 1, 1, 1, 2, 2, 2, 2]
    found = stack.point(t, 4e5, row)
    assert np.isnan(found.density).any() and np.isfinite(found.density[:9]).all()
    for index, table in enumerate(tables):
        alone = DensityTableColumns.from_tables([table]).point(t[row == index], 4e5)
        by_number = stack.point(t[row == index], 4e5, index)
        for name in ("density", "expansivity", "compressibility", "by_key"):
            assert np.array_equal(getattr(found, name)[row == index], getattr(alone, name), equal_nan=True)
            assert np.array_equal(getattr(by_number, name), getattr(alone, name), equal_nan=True)


@settings(derandomize=True, max_examples=60)
@given(st.lists(st.floats(500.0, 1500.0), min_size=2, max_size=9), st.floats(0.0, 1.0))
def test_a_density_lies_between_its_neighbours(densities, share):
    rows = [(280.0 + 7.0 * at, density) for at, density in enumerate(densities)]
    t = 280.0 + 7.0 * share * (len(rows) - 1)
    before = min(int((t - 280.0) / 7.0), len(rows) - 2)
    near = sorted(densities[before : before + 2])
    found = float(one(rows).point(t, ATMOSPHERE).density)
    assert near[0] * (1 - 1e-12) <= found <= near[1] * (1 + 1e-12)


def test_beyond_the_rows_is_missing_and_says_why():
    table = one(TWO)
    found = table.point([288.15, 288.1, 308.2, np.nan, 300.0, 300.0], [1e5, 1e5, 1e5, 1e5, -1.0, np.nan])
    for column in (found.density, found.expansivity, found.compressibility, found.by_key):
        assert np.isnan(column).tolist()[:4] == [False, True, True, True]
        assert np.isnan(column).all(where=[False] * 4 + [True] * 2)
    assert table.why_outside(288.15, 1e5) == "" == table.why_outside(308.15, 0.0)
    assert table.why_outside(273.15, 1e5) == (
        "the liquid's temperature is 0 °C; the density table runs from 15 to 35 °C and is not extrapolated: "
        "extend it by a measurement"
    )
    assert "cannot be below 0 kPa" in table.why_outside(300.0, -1e3)


@pytest.mark.parametrize(
    ("rows", "said"),
    [
        ([], "at least two rows"),
        ([(288.15, 840.0)], "at least two rows"),
        ([(288.15, 840.0, 1.0), (298.15, 830.0, 1.0)], "at least two rows"),
        ([(298.15, 830.0), (288.15, 840.0)], "is 15 °C at index 1 after 25 °C; rows rise in temperature"),
        ([(288.15, 840.0), (288.15, 839.0)], "none twice"),
        ([(288.15, 840.0), (298.15, 0.0)], "is 0 kg/m³ at index 1"),
        ([(288.15, -840.0), (298.15, 830.0)], "is -840 kg/m³ at index 0"),
        ([(288.15, np.nan), (298.15, 830.0)], "density of the table is nan"),
        ([(np.inf, 840.0), (298.15, 830.0)], "temperature of the density table is inf"),
        ([(0.0, 840.0), (298.15, 830.0)], "above 0 K"),
    ],
)
def test_a_table_that_cannot_be_is_refused(rows, said):
    with pytest.raises(DefinitionError, match=said):
        one(rows)


@pytest.mark.parametrize(("kappa", "pressure"), [(-1e-12, 1e5), (np.nan, 1e5), (1e-9, -1.0), (1e-9, np.inf)])
def test_a_state_that_cannot_be_is_refused(kappa, pressure):
    with pytest.raises(DefinitionError, match="or above"):
        one(TWO, kappa, pressure)


def test_no_table_is_no_stack():
    with pytest.raises(DefinitionError, match="at least one"):
        DensityTableColumns.from_tables([])
