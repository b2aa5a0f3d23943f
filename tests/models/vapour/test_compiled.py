"""Compiled polynomials are their source: fits, correlations and measured rows."""

import numpy as np
import pytest

from models.components import component
from models.errors import DefinitionError
from models.vapour.compiled import compile_mixture, inverse_scale
from models.vapour.definition import VapourMixture
from models.vapour.fitted import fitted_coefficients
from models.vapour.mixtures import correlated_coefficients
from models.vapour.series import VapourColumns


def coefficients(mixture: VapourMixture, temperatures: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    b, _, c, _ = VapourColumns.from_mixtures([mixture]).second_and_third(temperatures)
    return b, c


@pytest.mark.parametrize("method", ["tsonopoulos", "abbott"])
@pytest.mark.parametrize(
    ("names", "y"),
    [
        (("propane",), (1.0,)), (("hydrogen",), (1.0,)), (("helium",), (1.0,)), (("n-hexane", "nitrogen"), (0.1, 0.9)),
        (("water", "nitrogen"), (0.03, 0.97)), (("methane", "ethane", "propane", "n-butane"), (0.8, 0.1, 0.06, 0.04)),
    ],
)  # fmt: skip
def test_a_polynomial_is_its_correlation(names: tuple[str, ...], y: tuple[float, ...], method: str) -> None:
    mixture = VapourMixture(names, y, coefficients="correlation", second_virial=method)
    (compiled,) = compile_mixture(mixture)
    t = np.linspace(compiled.lowest, compiled.highest, 1001)
    b, c = coefficients(mixture, t)
    exact_b, exact_c = correlated_coefficients([component(n) for n in names], y, t, method)
    assert np.abs(b - exact_b).max() < 1e-10 * np.abs(exact_b).max()
    assert np.abs(c - exact_c).max() < 1e-10 * np.abs(exact_c).max()


@pytest.mark.parametrize("name", ["nitrogen", "n-butane", "water", "ammonia"])
def test_a_polynomial_is_its_fit(name: str) -> None:
    mixture = VapourMixture((name,), coefficients="fitted")
    (compiled,) = compile_mixture(mixture)
    t = np.linspace(compiled.lowest, compiled.highest, 101)
    assert coefficients(mixture, t)[0] == pytest.approx(fitted_coefficients(name, t)[0], rel=1e-10, abs=1e-16)
    assert coefficients(mixture, t)[1] == pytest.approx(fitted_coefficients(name, t)[1], rel=1e-9, abs=1e-18)


def test_a_fitted_mixture_carries_the_departures_of_its_pure_gases() -> None:
    names, y, t = ("propane", "isobutane"), (0.3, 0.7), np.array([290.0, 350.0])
    b, c = coefficients(VapourMixture(names, y), t)
    substances = [component(n) for n in names]
    base_b, base_c = correlated_coefficients(substances, y, t)
    for s, share in zip(substances, y, strict=True):
        fit, own = fitted_coefficients(s.id, t), correlated_coefficients([s], [1.0], t)
        base_b, base_c = base_b + share * (fit[0] - own[0]), base_c + share**3 * (fit[1] - own[1])
    assert b == pytest.approx(base_b, rel=1e-11)
    assert c == pytest.approx(base_c, rel=1e-10)


def test_measured_rows_are_met_and_hold_between_their_ends() -> None:
    rows = ((280.0, -4.5e-4), (300.0, -3.86e-4), (320.0, -3.33e-4))
    mixture = VapourMixture(("propane",), measured_second=rows, measured_third=2e-8)
    (compiled,) = compile_mixture(mixture)
    assert (compiled.lowest, compiled.highest) == (280.0, 320.0)
    b, c = coefficients(mixture, np.array([280.0, 300.0, 320.0]))
    assert b == pytest.approx([-4.5e-4, -3.86e-4, -3.33e-4], rel=1e-12)
    assert c == pytest.approx([2e-8] * 3, rel=1e-12)
    many = tuple((280.0 + 5.0 * i, -1e-3 * (300.0 / (280.0 + 5.0 * i)) ** 2) for i in range(9))
    b, _ = coefficients(VapourMixture(("propane",), measured_second=many), np.array([302.0]))
    assert b == pytest.approx([-1e-3 * (300.0 / 302.0) ** 2], rel=1e-6)


def test_c_is_the_correlations_where_only_b_was_measured() -> None:
    t = np.array([300.0])
    _, c = coefficients(VapourMixture(("propane",), measured_second=-3.9e-4), t)
    assert c == pytest.approx(correlated_coefficients([component("propane")], [1.0], t)[1], rel=1e-10)


def test_a_b_that_was_measured_may_stand_alone_with_two_terms() -> None:
    mixture = VapourMixture(("propane",), terms=2, measured_second=-3.9e-4)
    b, c = coefficients(mixture, np.array([300.0]))
    assert (b[0], c[0]) == pytest.approx((-3.9e-4, 0.0), rel=1e-12)
    assert [note.symbol for note in compile_mixture(mixture)[0].notes] == ["B"]


def test_two_terms_have_no_c() -> None:
    _, c = coefficients(VapourMixture(("propane",), terms=2), np.array([250.0, 300.0]))
    assert c.tolist() == [0.0, 0.0]


def test_ranges() -> None:
    fitted, spare = compile_mixture(VapourMixture(("nitrogen", "n-butane"), (0.5, 0.5)))
    assert (fitted.lowest, fitted.highest) == (245.0, 480.0)
    assert spare.lowest == pytest.approx(0.4 * 425.125)
    assert spare.highest == 700.0
    assert compile_mixture(VapourMixture(("hydrogen",), coefficients="correlation"))[0].lowest == 60.0
    toluene = compile_mixture(VapourMixture(("toluene",)))[0]
    assert toluene.highest == pytest.approx(1.2 * 591.75)
    # Ethylene's fit ends at 450 K, water's begins at 343 K.
    both = compile_mixture(VapourMixture(("ethylene", "water"), (0.9, 0.1), coefficients="fitted"))[0]
    assert (both.lowest, both.highest) == (343.0, 450.0)
    with pytest.raises(DefinitionError, match="no temperature in common"):
        rows = ((100.0, -4e-4), (110.0, -3e-4))
        compile_mixture(VapourMixture(("propane",), measured_second=rows))


def test_scale_runs_from_minus_one_to_one() -> None:
    middle, half = inverse_scale(200.0, 500.0)
    assert (1.0 / 500.0 - middle) / half == pytest.approx(-1.0)
    assert (1.0 / 200.0 - middle) / half == pytest.approx(1.0)
