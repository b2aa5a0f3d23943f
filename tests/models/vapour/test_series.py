"""States of many mixtures at once: shapes, forms, verdicts, derivatives, missing values."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from models.components import given_component
from models.constants import GAS_CONSTANT
from models.vapour.convert import pressure_coefficients
from models.vapour.series import VapourColumns, VapourMixture

OURS = given_component(
    "ours", critical_temperature=370.0, critical_pressure=4.25e6, acentric_factor=0.152, molar_mass=0.044
)
MIXTURES = [
    VapourMixture(("propane",)),
    VapourMixture(("propane",), coefficients="correlation"),
    VapourMixture(("propane",), form="pressure"),
    VapourMixture(("propane",), form="pressure", terms=2),
    VapourMixture(("propane",), terms=2),
    VapourMixture(("nitrogen", OURS), (0.3, 0.7)),
    VapourMixture(("hydrogen", "methane"), (0.2, 0.8)),
    VapourMixture(("hydrogen",), coefficients="correlation", second_virial="abbott"),
    VapourMixture(("propane",), measured_second=((280.0, -4.5e-4), (330.0, -3.1e-4)), measured_third=1.8e-8),
]
COLUMNS = VapourColumns.from_mixtures(MIXTURES)


@pytest.mark.parametrize("row", range(len(MIXTURES)))
def test_density_solves_its_own_equation(row: int) -> None:
    t, p = np.array([290.0, 300.0, 320.0]), np.array([1e5, 4e5, 7e5])
    state = COLUMNS.state(p, t, row)
    b, _, c, _ = COLUMNS.second_and_third(t, row)
    rho = state.density / COLUMNS.molar_mass[row]
    z = p / (rho * GAS_CONSTANT * t)
    if MIXTURES[row].form == "density":
        expected = 1.0 + b * rho + c * rho**2
    else:
        second, third = pressure_coefficients(b, c, t)
        expected = 1.0 + second * p + (third * p**2 if MIXTURES[row].terms == 3 else 0.0)
    assert z == pytest.approx(expected, rel=1e-12)
    assert state.compressibility == pytest.approx(z, rel=1e-12)
    assert (state.verdict < 3).all()


@settings(derandomize=True, max_examples=50, deadline=None)
@given(row=st.integers(0, len(MIXTURES) - 1), t=st.floats(285.0, 325.0), p=st.floats(1e4, 6e5))
def test_sensitivities_are_the_slopes(row: int, t: float, p: float) -> None:
    step = 1e-5
    state = COLUMNS.state(p, t, row)
    by_p = COLUMNS.state([p * (1 - step), p * (1 + step)], t, row).density
    by_t = COLUMNS.state(p, [t * (1 - step), t * (1 + step)], row).density
    assert float(state.pressure_sensitivity) == pytest.approx(
        np.log(by_p[1] / by_p[0]) / (2 * step), rel=1e-7
    )
    assert float(state.temperature_sensitivity) == pytest.approx(
        np.log(by_t[1] / by_t[0]) / (2 * step), rel=1e-7
    )
    assert float(state.psi) == pytest.approx(
        float(state.compressibility / state.pressure_sensitivity), rel=1e-12
    )


@settings(derandomize=True, max_examples=50, deadline=None)
@given(t=st.floats(240.0, 470.0), p=st.floats(1.0, 1e7))
def test_a_vapour_is_never_denser_than_its_critical_half_nor_past_its_spinodal(t: float, p: float) -> None:
    state = COLUMNS.state(p, t, 0)
    if int(state.verdict) < 3:
        assert float(state.reduced_density) <= 0.5
        assert float(state.psi) >= 0.3
        assert not float(state.spinodal_pressure) < p
    else:
        assert np.isnan(state.density)


def test_propane_at_20_and_40_degrees() -> None:
    # By Tsonopoulos and Orbey-Vera: Z, psi and both sensitivities to five digits, computed apart.
    state = COLUMNS.state([8e5, 13e5], [293.15, 313.15], 1)
    assert state.compressibility == pytest.approx([0.84254, 0.78189], abs=6e-6)
    assert state.psi == pytest.approx([0.68763, 0.57271], abs=6e-6)
    assert state.pressure_sensitivity == pytest.approx([1.22527, 1.36524], abs=6e-6)
    assert state.temperature_sensitivity == pytest.approx([-1.76692, -2.25230], abs=2e-5)


def test_verdicts_and_what_is_left_of_a_refused_row() -> None:
    pressure = np.array([5e5, 2.4e6, 3e6, 5e5, np.nan, 5e5, -1.0, np.inf, 0.0])
    temperature = np.array([300.0, 330.0, 300.0, 100.0, 300.0, np.nan, 300.0, 300.0, 300.0])
    state = COLUMNS.state(pressure, temperature, 0)
    assert state.verdict.tolist() == [0, 3, 4, 5, 5, 5, 5, 5, 0]
    assert np.isnan(state.density).tolist() == [False, True, True, True, True, True, True, True, False]
    assert np.isnan(state.compressibility).tolist() == [
        False,
        False,
        True,
        True,
        True,
        True,
        True,
        True,
        False,
    ]
    assert state.density[-1] == 0.0
    assert state.compressibility[-1] == 1.0
    assert state.spinodal_pressure[2] < 3e6
    assert np.isfinite(state.spinodal_pressure[0])


def test_outside_the_fit_the_correlation_serves_unless_the_fit_was_asked_for() -> None:
    columns = VapourColumns.from_mixtures(
        [VapourMixture(("n-pentane",)), VapourMixture(("n-pentane",), coefficients="fitted"),
         VapourMixture(("n-pentane",), coefficients="correlation")]
    )  # fmt: skip
    state = columns.state(2e4, [270.0, 300.0], 0)
    assert state.verdict.tolist() == [2, 0]
    assert state.density[0] == pytest.approx(float(columns.state(2e4, 270.0, 2).density), rel=1e-13)
    assert state.density[1] == pytest.approx(float(columns.state(2e4, 300.0, 1).density), rel=1e-13)
    assert columns.state(2e4, 270.0, 1).verdict == 5
    both = columns.state(2e4, [270.0, 270.0, 270.0], np.array([0, 1, 2]))
    assert both.verdict.tolist() == [2, 5, 2]
    assert "outside that range" in columns.describe(0)[2].quantity


def test_many_mixtures_in_one_call_are_each_alone() -> None:
    random = np.random.default_rng(5)
    rows = random.integers(0, len(MIXTURES), 400)
    p, t = random.uniform(1e4, 9e5, 400), random.uniform(270.0, 340.0, 400)
    together = COLUMNS.state(p, t, rows)
    for i in range(0, 400, 7):
        alone = COLUMNS.state(p[i], t[i], int(rows[i]))
        assert together.verdict[i] == alone.verdict
        for name in ("density", "temperature_sensitivity", "model_uncertainty", "spinodal_pressure"):
            assert getattr(together, name)[i] == pytest.approx(
                float(getattr(alone, name)), rel=1e-11, nan_ok=True
            )


def test_shapes_follow_the_readings() -> None:
    assert COLUMNS.state(1e5, 300.0).density.shape == ()
    assert COLUMNS.state(np.full((3, 1), 1e5), np.full(4, 300.0)).verdict.shape == (3, 4)
    assert COLUMNS.state(np.full(40_000, 1e5), 300.0, 1).density.shape == (40_000,)
    assert COLUMNS.state([], [], 0).density.shape == (0,)
    assert COLUMNS.state(1e5, 300.0, np.array([0, 1, 2])).density.shape == (3,)


def test_the_working_names_method_and_source() -> None:
    fitted, correlated = COLUMNS.describe(0), COLUMNS.describe(1)
    assert "CoolProp 8.0.0" in fitted[0].reference
    assert correlated[0].reference == "C. Tsonopoulos, AIChE J. 20 (1974) 263"
    assert correlated[1].reference.startswith("H. Orbey")
    assert COLUMNS.describe(3)[-1].method == "Z = 1 + B' P"
    assert not [note for note in COLUMNS.describe(4) if note.symbol == "C"]
    assert "pairs" in COLUMNS.describe(5)[2].method
    assert COLUMNS.describe(8)[0].method.startswith("measured, 280 to 330 K")


@pytest.mark.parametrize(
    ("t", "mpa"), [(250.0, 1.0), (273.15, 5.0), (298.15, 10.0), (350.0, 5.0), (298.15, 20.0)]
)
def test_hydrogen_is_as_dense_as_its_published_series_says(t: float, mpa: float) -> None:
    """E. W. Lemmon, M. L. Huber, J. W. Leachman, J. Res. NIST 113 (2008) 341 (constants from memory; they
    give the paper's five check values to every digit)."""
    a = (0.05888460, -0.06136111, -0.002650473, 0.002731125, 0.001802374, -0.001150707, 9.588528e-5,
         -1.109040e-7, 1.264403e-10)  # fmt: skip
    b = (1.325, 1.87, 2.5, 2.8, 2.938, 3.14, 3.37, 3.75, 4.0)
    c = (1.0, 1.0, 2.0, 2.0, 2.42, 2.63, 3.0, 4.0, 5.0)

    def series(temperature: float, pressure: float) -> float:
        terms = zip(a, b, c, strict=True)
        return 1.0 + sum(x * (100.0 / temperature) ** y * pressure**z for x, y, z in terms)

    assert series(300.0, 10.0) == pytest.approx(1.05985282, abs=1e-8)
    assert series(200.0, 1.0) == pytest.approx(1.00675450, abs=1e-8)
    state = VapourColumns.from_mixtures([VapourMixture(("hydrogen",))]).state(mpa * 1e6, t)
    # Up to 100 bar 0.12 %; C is all that a three-term series has at 200 bar.
    assert float(state.compressibility) == pytest.approx(series(t, mpa), rel=1.2e-3 if mpa <= 10.0 else 5e-3)
