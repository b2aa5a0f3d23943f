"""β and κ from densities: exact data come back, noisy ones as another route finds them, and what cannot be told."""

import numpy as np
import pytest
from CoolProp.CoolProp import PropsSI
from hypothesis import given, settings
from hypothesis import strategies as st

from models.errors import DefinitionError
from models.liquid.fit import fit_expansivity

T0, P0 = 288.15, 101_325.0
REFERENCE = {"temperature_ref": T0, "pressure_ref": P0}
BETAS = ([8.3e-4], [8.3e-4, 1.1e-6], [8.3e-4, 1.1e-6, -7e-9], [8.3e-4, 1.1e-6, -7e-9, 4e-11])
KAPPA = 7.5e-10


def made(temperature, pressure, betas, kappa=0.0, reference=840.0):
    """Densities by the definition of β and κ, written out by hand."""
    x, above = np.asarray(temperature) - T0, np.asarray(pressure) - P0
    integral = sum(beta * x ** (power + 1) / (power + 1) for power, beta in enumerate(betas))
    return reference * np.exp(-integral + kappa * above)


@pytest.mark.parametrize("betas", BETAS)
@pytest.mark.parametrize("pressed", [False, True])
def test_exact_data_give_back_what_made_them(betas, pressed):
    t = np.tile(np.linspace(273.15, 333.15, 7), 2)
    p = np.repeat([P0, 5e6 if pressed else P0], 7)
    found = fit_expansivity(t, p, made(t, p, betas, KAPPA), degree=len(betas) - 1, **REFERENCE)
    assert found.density == pytest.approx(840.0, rel=1e-12)
    assert found.coefficients == pytest.approx(betas, rel=1e-7)
    assert np.max(np.abs(found.residuals)) < 1e-9 and found.deviation < 1e-9
    assert found.degrees_of_freedom == 14 - len(betas) - 1 - pressed
    assert found.fitted is pressed
    assert found.compressibility == (pytest.approx(KAPPA, rel=1e-9) if pressed else None)
    assert (found.temperature, found.pressure) == (T0, P0)


def test_two_rows_are_solved_by_hand():
    found = fit_expansivity([288.15, 298.15], [P0, P0], [840.0, 833.0], **REFERENCE)
    assert found.density == pytest.approx(840.0, rel=1e-14)
    assert found.coefficients == pytest.approx([np.log(840.0 / 833.0) / 10.0], rel=1e-12)
    assert found.degrees_of_freedom == 0 and np.isnan(found.deviation) and np.isnan(found.covariance).all()


def test_covariance_of_two_rows_by_hand():
    """With u = 0.1 of each: u(ρ0) = 0.1, β = ln(ρ1/ρ2)/10, so u²(β) = (0.1/ρ1)²/100 + (0.1/ρ2)²/100."""
    found = fit_expansivity([288.15, 298.15], [P0, P0], [840.0, 833.0], density_uncertainty=0.1, **REFERENCE)
    variance = (0.1 / 840.0) ** 2 / 100.0 + (0.1 / 833.0) ** 2 / 100.0
    expected = [[0.01, 0.01 / 840.0 / 10.0], [0.01 / 840.0 / 10.0, variance]]
    assert found.covariance == pytest.approx(np.array(expected), rel=1e-9)


@pytest.mark.parametrize("degree", [0, 1, 2, 3])
@pytest.mark.parametrize("uncertainty", [None, 0.05])
def test_another_route_finds_the_same(degree, uncertainty):
    """numpy.polyfit of ln ρ in T − t₀, with weights ρ/u, by its own factors."""
    random = np.random.default_rng(17 + degree)
    t = np.sort(random.uniform(275.0, 340.0, 24))
    rho = made(t, P0, BETAS[2]) + random.normal(0.0, 0.05, 24)
    found = fit_expansivity(t, np.full(24, P0), rho, degree=degree, density_uncertainty=uncertainty, **REFERENCE)
    weight = rho / (uncertainty or 1.0)
    scaled = True if uncertainty is None else "unscaled"
    powers, covariance = np.polyfit(t - T0, np.log(rho), degree + 1, w=weight, cov=scaled)
    factor = np.array([1.0, *(-power for power in range(1, degree + 2))])  # b_j = −(j+1) a_(j+1)
    assert found.density == pytest.approx(float(np.exp(powers[-1])), rel=1e-11)
    assert found.coefficients == pytest.approx((powers[::-1] * factor)[1:], rel=1e-6)
    factor[0] = found.density
    expected = covariance[::-1, ::-1] * factor * factor[:, None]
    # Here the residual variance is that of kg/m³, there that of ρ Δln ρ: the same to the first order.
    assert found.covariance == pytest.approx(expected, rel=1e-3 if uncertainty is None else 1e-6, abs=0.0)
    free = 24 - degree - 2
    assert found.deviation == pytest.approx(float(np.sqrt(np.sum(found.residuals**2) / free)), rel=1e-12)
    assert found.residuals == pytest.approx(rho - np.exp(np.polyval(powers, t - T0)), abs=1e-9)


def test_kappa_by_the_plain_normal_equations():
    random = np.random.default_rng(5)
    t, p = random.uniform(280.0, 330.0, 40), random.uniform(1e5, 8e6, 40)
    rho = made(t, p, BETAS[1], KAPPA) + random.normal(0.0, 0.03, 40)
    found = fit_expansivity(t, p, rho, degree=1, density_uncertainty=0.03, **REFERENCE)
    x = t - T0
    design = np.stack([np.ones(40), -x, -(x**2) / 2, (p - P0) / 1e6], axis=1) * (rho / 0.03)[:, None]
    normal = design.T @ design
    solution = np.linalg.solve(normal, design.T @ (np.log(rho) * rho / 0.03))
    unit = np.array([found.density, 1.0, 1.0, 1e-6])
    assert found.coefficients == pytest.approx(solution[1:3], rel=1e-6)
    assert found.compressibility == pytest.approx(solution[3] * 1e-6, rel=1e-6)
    assert found.covariance == pytest.approx(np.linalg.inv(normal) * unit * unit[:, None], rel=1e-6)
    truth = np.array([840.0, *BETAS[1], KAPPA])
    fitted = np.array([found.density, *found.coefficients, found.compressibility])
    assert np.all(np.abs(fitted - truth) < 4 * np.sqrt(np.diagonal(found.covariance)))


def test_uncertainties_cover_as_often_as_they_say():
    """Of 400 series with noise of 0.1 kg/m³, b0 lies within one standard uncertainty in 68 %."""
    random = np.random.default_rng(11)
    t = np.linspace(280.0, 330.0, 9)
    inside = 0
    for _ in range(400):
        rho = made(t, P0, [8.3e-4]) + random.normal(0.0, 0.1, 9)
        found = fit_expansivity(t, np.full(9, P0), rho, density_uncertainty=0.1, **REFERENCE)
        inside += abs(found.coefficients[0] - 8.3e-4) < np.sqrt(found.covariance[1, 1])
    assert inside / 400 == pytest.approx(0.683, abs=0.07)


@settings(derandomize=True, max_examples=40)
@given(at=st.floats(250.0, 380.0), above=st.floats(0.0, 9e6), degree=st.integers(0, 3))
def test_the_reference_state_changes_the_words_and_not_the_curve(at, above, degree):
    random = np.random.default_rng(degree)
    t, p = np.linspace(275.0, 340.0, 12), np.tile([P0, 3e6], 6)
    rho = made(t, p, BETAS[2], KAPPA) + random.normal(0.0, 0.02, 12)
    one = fit_expansivity(t, p, rho, degree=degree, **REFERENCE)
    other = fit_expansivity(t, p, rho, degree=degree, temperature_ref=at, pressure_ref=above)
    assert other.residuals == pytest.approx(one.residuals, abs=1e-8)
    assert other.compressibility == pytest.approx(one.compressibility, rel=1e-6)
    x = at - T0
    integral = sum(beta * x ** (power + 1) / (power + 1) for power, beta in enumerate(one.coefficients))
    assert other.density == pytest.approx(
        one.density * np.exp(-integral + one.compressibility * (above - P0)), rel=1e-9
    )


def test_a_given_compressibility_is_held_and_takes_the_pressure_away():
    t, p = np.linspace(280.0, 330.0, 6), np.linspace(1e5, 8e6, 6)
    found = fit_expansivity(t, p, made(t, p, BETAS[0], KAPPA), compressibility=KAPPA, **REFERENCE)
    assert found.compressibility == KAPPA and not found.fitted
    assert found.covariance.shape == (2, 2)
    assert found.coefficients == pytest.approx(BETAS[0], rel=1e-9)


def test_the_weather_does_not_fit_a_compressibility():
    """Pressures within 10 kPa are one pressure; from 10 kPa on they differ."""
    t = np.linspace(280.0, 330.0, 8)
    for span, fitted in ((9.95e3, False), (1.0e4, True)):
        p = np.tile([100_000.0, 100_000.0 + span], 4)
        assert fit_expansivity(t, p, made(t, p, BETAS[0], KAPPA), **REFERENCE).fitted is fitted


@pytest.mark.parametrize(
    ("fluid", "density", "beta", "kappa"),
    # Recomputed from reference equations of state by their own derivatives at 20 °C and 1 atm.
    [("n-Hexane", 659.38, 1.369e-3, 16.22e-10), ("Toluene", 866.89, 1.072e-3, 8.885e-10),
     ("Methanol", 791.01, 1.184e-3, 12.22e-10)],
)  # fmt: skip
def test_pitfall_15_handbook_beta(fluid, density, beta, kappa):
    """Densities of a liquid give its β to 0.5 %; a handbook's list gives methanol's 26 % too high."""
    t, p = (grid.reshape(-1) for grid in np.meshgrid(np.linspace(283.15, 303.15, 9), [101_325.0, 3e5, 5e5]))
    rho = PropsSI("D", "T", t, "P", p, fluid)
    found = fit_expansivity(t, p, rho, degree=1, temperature_ref=293.15, pressure_ref=101_325.0)
    assert found.density == pytest.approx(density, rel=1e-5)
    assert found.coefficients[0] == pytest.approx(beta, rel=5e-3)
    assert found.compressibility == pytest.approx(kappa, rel=2e-2)


@pytest.mark.parametrize(
    ("t", "p", "rho", "options", "said"),
    [
        (
            [288.15],
            [P0],
            [840.0],
            {},
            "needs 2 temperatures that differ by more than 0.001 K; the rows have 1: measure at more$",
        ),
        ([], [], [], {}, "the rows have 0"),
        ([288.15, 288.15, 288.1509], [P0] * 3, [840.0] * 3, {}, "the rows have 1"),
        (
            [288.15, 298.15],
            [P0] * 2,
            [840.0, 833.0],
            {"degree": 1},
            "of degree 1 needs 3 .*; the rows have 2: measure at more, or",
        ),
        ([288.15, 298.15], [P0, 3e6], [840.0, 834.0], {}, "2 rows for 3 unknowns: the density, 1 of β and κ"),
        ([288.15, 298.15, 308.15], [1e6, 2e6, 3e6], [840.0, 834.0, 828.0], {}, "change together"),
        ([288.15, 298.15], [P0] * 2, [840.0, 833.0], {"degree": 4}, "it is 0 to 3"),
        ([288.15, 298.15], [P0] * 2, [840.0, 833.0], {"density_uncertainty": 0.0}, "uncertainty of a density is 0"),
        ([288.15, 298.15], [P0] * 2, [840.0, 833.0], {"compressibility": -1e-10}, "compressibility is -1e-10 1/Pa"),
        ([288.15, 298.15], [P0] * 2, [840.0, 0.0], {}, "density at index 1 is 0 kg/m³"),
        ([288.15, 0.0], [P0] * 2, [840.0, 833.0], {}, "temperature at index 1 is 0 K"),
        ([288.15, 298.15], [P0, -1.0], [840.0, 833.0], {}, "pressure at index 1 is -1 Pa"),
        ([288.15, np.nan], [P0] * 2, [840.0, 833.0], {}, "temperature at index 1 is nan"),
    ],
)
def test_what_cannot_be_told_is_refused(t, p, rho, options, said):
    with pytest.raises(DefinitionError, match=said):
        fit_expansivity(t, p, rho, **REFERENCE, **options)


def test_temperatures_a_millikelvin_and_more_apart_differ():
    assert fit_expansivity([288.15, 288.151005], [P0] * 2, [840.0, 839.9993], **REFERENCE).degrees_of_freedom == 0
    close = [288.15, 288.151005, 288.15201, 388.15]
    with pytest.raises(DefinitionError, match="too close together for this degree"):
        fit_expansivity(close, [P0] * 4, [840.0, 839.999, 839.998, 770.0], degree=2, **REFERENCE)
