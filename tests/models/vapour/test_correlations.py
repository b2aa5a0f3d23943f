"""Correlations against the `chemicals` library at many states, the quantum gases by arithmetic."""

import numpy as np
import pytest
from chemicals.virial import (
    BVirial_Abbott,
    BVirial_Tsonopoulos,
    BVirial_Tsonopoulos_extended,
    CVirial_Orbey_Vera,
)

from models.vapour.correlations import (
    SECOND_VIRIAL,
    THIRD_VIRIAL,
    abbott,
    orbey_vera,
    quantum_constants,
    second_virial,
    third_virial,
    tsonopoulos,
)

TC, PC = 400.0, 4e6
REDUCED = (0.5, 0.65, 0.8, 1.0, 1.3, 2.0, 4.0)
ACENTRIC = (-0.2, 0.0, 0.1, 0.3, 0.6)


@pytest.mark.parametrize("tr", REDUCED)
@pytest.mark.parametrize("omega", ACENTRIC)
def test_second_and_third_virial_are_those_of_chemicals(tr: float, omega: float) -> None:
    t = tr * TC
    args = (TC, PC, omega)
    assert second_virial("abbott", t, *args) == pytest.approx(BVirial_Abbott(t, *args), rel=1e-12)
    assert second_virial("tsonopoulos", t, *args) == pytest.approx(BVirial_Tsonopoulos(t, *args), rel=1e-12)
    assert third_virial("orbey_vera", t, *args) == pytest.approx(
        CVirial_Orbey_Vera(t, *args)[0], rel=1e-11, abs=1e-22
    )


@pytest.mark.parametrize(("a", "b"), [(0.0878, 0.0525), (-0.0109, 0.0), (0.0, 0.01)])
@pytest.mark.parametrize("tr", REDUCED)
def test_polar_terms_are_those_of_chemicals(tr: float, a: float, b: float) -> None:
    expected = BVirial_Tsonopoulos_extended(tr * TC, TC, PC, 0.3, a=a, b=b)
    assert second_virial("tsonopoulos", tr * TC, TC, PC, 0.3, a, b) == pytest.approx(expected, rel=1e-12)


def test_at_the_critical_temperature_the_sums_are_plain() -> None:
    assert abbott(1.0, 0.0) == pytest.approx(-0.339, abs=1e-12)
    assert abbott(1.0, 1.0) - abbott(1.0, 0.0) == pytest.approx(-0.033, abs=1e-12)
    assert tsonopoulos(1.0, 0.0) == pytest.approx(-0.336707, abs=1e-12)
    assert tsonopoulos(1.0, 1.0) - tsonopoulos(1.0, 0.0) == pytest.approx(-0.0363, abs=1e-12)
    assert orbey_vera(1.0, 0.0) == pytest.approx(0.03526, abs=1e-12)
    assert orbey_vera(1.0, 1.0) - orbey_vera(1.0, 0.0) == pytest.approx(0.02566, abs=1e-12)


def test_hot_limits_are_the_constant_terms() -> None:
    assert abbott(1e12, 0.0) == pytest.approx(0.083, abs=1e-9)
    assert tsonopoulos(1e12, 0.0) == pytest.approx(0.1445, abs=1e-9)
    assert orbey_vera(1e12, 1.0) == pytest.approx(0.01407 - 0.02676, abs=1e-9)


def test_abbott_has_no_polar_term() -> None:
    assert SECOND_VIRIAL["abbott"](1.1, 0.2, 0.5, 0.5) == abbott(1.1, 0.2)
    assert set(THIRD_VIRIAL) == {"orbey_vera"}


@pytest.mark.parametrize(
    ("name", "tc", "pc", "vc"),
    [
        ("hydrogen", 43.6, 20.5e5, 51.5e-6),
        ("helium", 10.47, 6.76e5, 37.5e-6),
        ("neon", 45.5, 27.3e5, 40.3e-6),
    ],
)
def test_quantum_constants_at_temperatures_where_they_are_halves(
    name: str, tc: float, pc: float, vc: float
) -> None:
    # With M = 1 g/mol the denominators are 2 at 21.8 K and 44.2 K, and 1/2 at 19.82 K.
    found = quantum_constants(name, 1e-3, np.array([21.8, 44.2, 19.82, 1e9]))
    assert found is not None
    assert found[0][0] == pytest.approx(tc / 2, rel=1e-12)
    assert found[1][1] == pytest.approx(pc / 2, rel=1e-12)
    assert found[2][2] == pytest.approx(vc * 2, rel=1e-12)
    assert [c[3] for c in found] == pytest.approx([tc, pc, vc], rel=1e-6)
    assert quantum_constants("nitrogen", 0.028, 300.0) is None


def test_hydrogen_by_effective_constants_is_near_its_second_virial_coefficient() -> None:
    # Reference equation 14.5 cm3/mol at 298 K; the two correlations straddle it: 11.8 and 17.4.
    constants = quantum_constants("hydrogen", 2.01588e-3, 298.15)
    assert constants is not None
    tc, pc, _ = constants
    assert float(second_virial("abbott", 298.15, tc, pc, 0.0)) * 1e6 == pytest.approx(11.8, abs=0.1)
    assert float(second_virial("tsonopoulos", 298.15, tc, pc, 0.0)) * 1e6 == pytest.approx(17.4, abs=0.1)
