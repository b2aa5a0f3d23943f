"""The vapour root: the right one of three, none where there is none."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from models.constants import GAS_CONSTANT
from models.errors import NoVapourRoot
from models.vapour.correlations import second_virial, third_virial
from models.vapour.root import spinodal_density, vapour_density, vapour_root


def test_isopropanol_has_three_roots_and_the_thinnest_is_the_vapour() -> None:
    # Smith, Van Ness, Abbott, 7th ed., example 3.7 (B and C); V = 3487.97, 504.19 and -58.16 cm3/mol.
    density = vapour_density(10e5, 473.15, -388e-6, -26000e-12)
    assert 1e6 / float(density) == pytest.approx(3487.965, abs=1e-2)


def test_propane_at_8_bar_is_a_vapour() -> None:
    # A cubic solver that takes the first root gives Z = 0.018.
    args = (300.0, 369.89, 4.2512e6, 0.1521)
    b, c = second_virial("tsonopoulos", *args), third_virial("orbey_vera", *args)
    density = vapour_density(8e5, 300.0, b, c)
    assert 8e5 / (float(density) * GAS_CONSTANT * 300.0) == pytest.approx(0.857, abs=5e-4)


def test_a_pressure_above_the_spinodal_names_the_limit() -> None:
    b, c, t = -4e-4, 2e-8, 293.15
    density = float(spinodal_density(b, c))
    limit = density * GAS_CONSTANT * t * (1.0 + b * density + c * density**2)
    assert float(vapour_density(0.9999 * limit, t, b, c)) < density
    with pytest.raises(NoVapourRoot, match=f"at most {limit / 1e3:.6g} kPa") as caught:
        vapour_density(1.0001 * limit, t, b, c)
    assert caught.value.index == 0
    with pytest.raises(NoVapourRoot, match="at index 2;") as caught:
        vapour_density([1e5, 2e5, 5e6], t, b, c)
    assert caught.value.index == 2
    assert caught.value.field == "pressure"


@pytest.mark.parametrize(
    ("b", "c", "expected"),
    [  # 1 + 2 B rho + 3 C rho^2 = 0
        (-0.5, 0.0, 1.0), (-1.0, 1.0 / 3.0, 1.0), (-1.0, -1.0, 1.0 / 3.0), (0.0, -1.0 / 3.0, 1.0),
        (1.0, -1.0, 1.0), (1.0, 0.1, np.inf), (-1.0, 0.5, np.inf), (0.0, 0.0, np.inf), (1.0, 0.0, np.inf),
    ],
)  # fmt: skip
def test_spinodal_of_every_combination_of_signs(b: float, c: float, expected: float) -> None:
    assert float(spinodal_density(b, c)) == pytest.approx(expected, rel=1e-12)


def test_a_column_of_random_gases_agrees_with_the_roots_of_a_polynomial() -> None:
    random = np.random.default_rng(20260314)
    b, c = random.uniform(-2.0, 0.5, 3000), random.uniform(-1.0, 1.0, 3000)
    p = random.uniform(0.0, 0.6, 3000)
    density, missing, limit = vapour_root(b, c, p)
    for i in range(3000):
        roots = np.roots([c[i], b[i], 1.0, -p[i]])
        real = np.sort(roots[np.abs(roots.imag) < 1e-9].real)
        positive = real[real > 0.0]
        turning = float(spinodal_density(b[i], c[i]))
        vapour = positive[positive <= turning * (1.0 + 1e-9)]
        if missing[i]:
            assert limit[i] < p[i]
            assert not len(vapour[vapour < turning * (1.0 - 1e-6)])
        else:
            assert density[i] == pytest.approx(vapour[0], rel=1e-7)
            residual = density[i] * (1.0 + density[i] * (b[i] + c[i] * density[i])) - p[i]
            assert abs(residual) < 1e-12


@settings(derandomize=True, max_examples=50, deadline=None)
@given(b=st.floats(-2.0, 1.0), c=st.floats(-1.0, 1.0), share=st.floats(0.0, 0.999999))
def test_the_density_gives_its_pressure_back_up_to_the_spinodal(b: float, c: float, share: float) -> None:
    turning = min(float(spinodal_density(b, c)), 5.0)
    density = np.array([share * turning])
    p = density * (1.0 + density * (b + c * density))
    found, missing, _ = vapour_root(np.array([b]), np.array([c]), p)
    assert not missing[0]
    slope = 1.0 + 2.0 * b * density + 3.0 * c * density**2
    # Where the isotherm is flat the density is known only to what the pressure's last bits allow.
    assert abs(found[0] - density[0]) <= 1e-13 * turning / max(slope[0], 1e-13) ** 0.5 + 1e-7 * (
        slope[0] < 1e-6
    ) + (1e-12 * turning / max(slope[0], 1e-9))


def test_nothing_is_a_density_of_no_pressure() -> None:
    density, missing, _ = vapour_root(np.array([-4e-4]), np.array([2e-8]), np.array([0.0]))
    assert density[0] == 0.0
    assert not missing[0]
