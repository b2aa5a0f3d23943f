"""The guard's verdicts at their limits, and the uncertainty's terms one by one."""

import numpy as np
import pytest

from models.components import component, given_component
from models.vapour.fitted import FITTED
from models.vapour.guard import (
    MEASURED,
    Trust,
    Verdict,
    correlated_trust,
    expanded_uncertainty,
    fitted_trust,
    judge,
)

PLAIN = Trust(0.0, 0.0, 0.0, 0.0, omitted=0.0)
ONE = np.ones(1)


def verdicts(trust: Trust, densities: list[float], psi: float = 0.9, tr: float = 1.0) -> list[int]:
    rho = np.array(densities)
    return judge(trust, rho, np.full(rho.shape, tr), np.full(rho.shape, psi)).tolist()


@pytest.mark.parametrize(
    ("form", "terms", "good", "wide"),
    [("density", 3, 0.2, 0.3), ("density", 2, 0.02, 0.049), ("pressure", 3, 0.049, 0.104),
     ("pressure", 2, 0.02, 0.049)],
)  # fmt: skip
def test_limits_of_each_form(form: str, terms: int, good: float, wide: float) -> None:
    trust = PLAIN.of_form(form, terms)
    edges = [good * 0.999, good * 1.001, wide * 0.999, wide * 1.001, 0.4999, 0.5001]
    assert verdicts(trust, edges) == [0, 1, 1, 2, 2, 3]


def test_limits_of_psi() -> None:
    assert [verdicts(PLAIN, [0.1], psi)[0] for psi in (0.501, 0.499, 0.301, 0.299)] == [0, 2, 2, 3]
    assert verdicts(PLAIN, [0.1], np.nan) == [Verdict.OK]  # the root's own verdict stands above this one


def test_a_correlation_below_its_lowest_temperature_is_uncertain_and_a_fit_is_not() -> None:
    propane = (component("propane"),)
    assert verdicts(correlated_trust(propane, (1.0,)), [0.1], tr=0.699) == [2]
    assert verdicts(correlated_trust(propane, (1.0,)), [0.1], tr=0.701) == [0]
    assert verdicts(fitted_trust(propane, (1.0,)), [0.1], tr=0.699) == [0]


def test_more_than_five_per_cent_of_a_polar_or_quantum_gas_is_uncertain_by_correlation() -> None:
    for name in ("ammonia", "hydrogen"):
        pair = (component(name), component("nitrogen"))
        assert correlated_trust(pair, (0.0499, 0.9501)).doubtful == 0.0
        assert correlated_trust(pair, (0.0501, 0.9499)).doubtful == 1.0
        assert fitted_trust(pair, (0.5, 0.5)).doubtful == 0.0


@pytest.mark.parametrize(
    ("names", "y", "expected"),
    [
        (("propane",), (1.0,), (0.001, 0.02, 0.0, 0.0, 1.0)),
        (("propane", "n-butane"), (0.6, 0.4), (0.0015, 0.02, 0.0, 0.0, 1.0)),
        (("nitrogen", "toluene"), (0.97, 0.03), (0.0025, 0.06, 0.0, 0.0, 1.0)),
        (("ammonia",), (1.0,), (0.004, 0.06, 0.0, 0.03, 1.0)),
        (("hydrogen",), (1.0,), (0.001, 0.11, 0.0, 0.0, 1.0)),
    ],
)
def test_classes_of_correlated_gases(
    names: tuple[str, ...], y: tuple[float, ...], expected: tuple[float, ...]
) -> None:
    assert correlated_trust([component(n) for n in names], y)[:5] == pytest.approx(expected)


@pytest.mark.parametrize("name", sorted(FITTED))
def test_classes_of_fitted_gases(name: str) -> None:
    own = {
        "n-butane": (0.10, 0.6), "ethane": (0.04, 0.6), "r134a": (0.06, 1.2), "chlorine": (0.05, 0.25),
        "hydrogen-chloride": (0.11, 1.2), "dimethyl-ether": (0.18, 1.2), "water": (0.04, 10.0),
    }  # fmt: skip
    quadratic, omitted = own.get(name, (0.04, 0.25))
    trust = fitted_trust((component(name),), (1.0,))
    assert trust[:5] == pytest.approx((0.0003, 0.0, quadratic, 0.0, omitted))


def test_limits_without_a_form_are_those_of_the_default_form() -> None:
    assert verdicts(PLAIN, [0.1999, 0.2001, 0.2999, 0.3001]) == [0, 1, 1, 2]


def test_measured_coefficients_are_trusted_to_two_per_cent_of_b() -> None:
    assert MEASURED[:5] == pytest.approx((0.0003, 0.0, 0.04, 0.02, 1.0))


@pytest.mark.parametrize(
    ("trust", "rho", "tr", "b_rho", "psi", "expected"),
    [
        (PLAIN._replace(constant=0.001), 0.1, 1.0, -0.2, 0.5, 0.001),
        (PLAIN._replace(linear=0.02), 0.1, 1.0, -0.2, 0.5, 0.02 * 0.1 / 0.5),
        (PLAIN._replace(linear=0.02), 0.1, 0.68, -0.2, 0.5, 0.02 * 0.1 / 0.5 * 1.25**6),
        (PLAIN._replace(quadratic=0.04), 0.1, 1.0, -0.2, 0.5, 0.0004),
        (PLAIN._replace(second=0.03), 0.1, 1.0, -0.2, 0.5, 0.012),
        (PLAIN._replace(omitted=1.0), 0.1, 1.0, -0.2, 0.5, 0.6 * 0.001 / 0.5),
        (PLAIN._replace(omitted=1.0), 0.1, 0.5, -0.2, 0.5, (0.5 + 0.1 * 2.0**18) * 0.001 / 0.5),
        (PLAIN._replace(omitted=1.0), 0.1, 100.0, -0.2, 0.1, 0.5 * 0.001 / 0.3),
        (PLAIN.of_form("density", 2), 0.02, 1.0, -0.1, 0.9, 0.0025),
        (PLAIN.of_form("density", 2), 0.2, 1.0, -0.1, 0.9, 0.0025 * 10.0**1.59),
        (PLAIN.of_form("pressure", 2), 0.2, 1.0, -0.1, 0.9, 0.0025 * 10.0**1.59),
        (PLAIN.of_form("pressure", 3), 0.49, 1.0, -0.1, 0.9, 0.0025 * 10.0**1.84),
        (PLAIN.of_form("density", 3), 0.2, 1.0, -0.1, 0.9, 0.0),
    ],
)
def test_terms_of_the_uncertainty(
    trust: Trust, rho: float, tr: float, b_rho: float, psi: float, expected: float
) -> None:
    found = expanded_uncertainty(trust, rho * ONE, tr * ONE, b_rho * ONE, psi * ONE)
    assert found[0] == pytest.approx(expected, rel=1e-9, abs=1e-15)


def test_a_given_substance_is_of_the_widest_nonpolar_class() -> None:
    ours = given_component(
        "x", critical_temperature=400.0, critical_pressure=4e6, acentric_factor=0.1, molar_mass=0.05
    )
    assert correlated_trust((ours, component("nitrogen")), (0.5, 0.5))[:2] == (0.0025, 0.06)
