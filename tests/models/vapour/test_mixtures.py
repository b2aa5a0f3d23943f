"""Pair rules against the `chemicals` library, sums over pairs and triples against plain loops."""

import numpy as np
import pytest
from chemicals.virial import (
    BVirial_mixture,
    Meng_Duan_2005_virial_CSP_kijs,
    Tarakad_Danner_virial_CSP_kijs,
)

from models.components import component, given_component
from models.constants import GAS_CONSTANT
from models.vapour.correlations import second_virial, third_virial
from models.vapour.mixtures import (
    constants_at,
    correlated_coefficients,
    pair_constants,
    pair_interaction,
)

CAS = {
    "nitrogen": "7727-37-9", "carbon-dioxide": "124-38-9", "methane": "74-82-8", "ethane": "74-84-0",
    "propane": "74-98-6", "n-butane": "106-97-8", "n-decane": "124-18-5",
}  # fmt: skip
ATOMS = {
    "nitrogen": {"N": 2}, "carbon-dioxide": {"C": 1, "O": 2}, "methane": {"C": 1, "H": 4},
    "ethane": {"C": 2, "H": 6}, "propane": {"C": 3, "H": 8}, "n-butane": {"C": 4, "H": 10},
    "n-decane": {"C": 10, "H": 22},
}  # fmt: skip


def test_pairs_with_alkanes_are_those_of_chemicals() -> None:
    names = list(CAS)
    expected = Meng_Duan_2005_virial_CSP_kijs([CAS[n] for n in names], [ATOMS[n] for n in names])
    for i, one in enumerate(names):
        for j, other in enumerate(names):
            if i != j and {one, other} != {"nitrogen", "carbon-dioxide"}:
                assert pair_interaction(component(one), component(other)) == pytest.approx(
                    (expected[i][j], True), rel=1e-12
                )


def test_other_hydrocarbons_go_by_their_critical_volumes() -> None:
    one, other = component("ethylene"), component("toluene")
    expected = Tarakad_Danner_virial_CSP_kijs([one.critical_volume, other.critical_volume])
    assert pair_interaction(one, other) == pytest.approx((expected[0][1], True), rel=1e-12)


@pytest.mark.parametrize(
    ("one", "other", "known"),
    [("nitrogen", "oxygen", True), ("nitrogen", "hydrogen", False), ("water", "nitrogen", False),
     ("nitrogen", "toluene", False)],
)  # fmt: skip
def test_where_nothing_is_known_the_parameter_is_zero(one: str, other: str, known: bool) -> None:
    assert pair_interaction(component(one), component(other)) == (0.0, known)


def test_a_substance_given_in_full_is_no_known_pair() -> None:
    ours = given_component(
        "x", critical_temperature=400.0, critical_pressure=4e6, acentric_factor=0.1, molar_mass=0.05
    )
    assert pair_interaction(ours, component("nitrogen")) == (0.0, False)


def test_polar_parameters_survive_between_polar_substances_only() -> None:
    t = np.array([300.0])
    water, ammonia, nitrogen = (constants_at(component(n), t) for n in ("water", "ammonia", "nitrogen"))
    assert pair_constants(water, ammonia, 0.0).a == pytest.approx([-0.0162])
    assert pair_constants(water, nitrogen, 0.0).a == pytest.approx([0.0])
    methanol = constants_at(component("methanol"), t)
    assert pair_constants(methanol, water, 0.0).b == pytest.approx([0.02625])


def test_sums_are_those_of_plain_loops() -> None:
    names, y = ("methane", "propane", "nitrogen", "carbon-dioxide"), (0.55, 0.2, 0.15, 0.1)
    t = np.array([240.0, 300.0, 400.0])
    substances = [component(n) for n in names]
    own = [constants_at(s, t) for s in substances]
    pairs = [
        [
            own[i]
            if i == j
            else pair_constants(own[i], own[j], pair_interaction(substances[i], substances[j])[0])
            for j in range(4)
        ]
        for i in range(4)
    ]
    tc, pc, vc, omega = (np.array([[p[k] for p in row] for row in pairs]) for k in range(4))
    b = second_virial("tsonopoulos", t, tc, pc, omega)
    c = third_virial("orbey_vera", t, tc, pc, omega)
    third = np.zeros(3)
    for i in range(4):
        for j in range(4):
            for k in range(4):
                size = (vc[i, j] * vc[i, k] * vc[j, k]) ** (2 / 3)
                mean = (c[i, j] / vc[i, j] ** 2 + c[i, k] / vc[i, k] ** 2 + c[j, k] / vc[j, k] ** 2) / 3
                third += y[i] * y[j] * y[k] * size * mean
    found_b, found_c = correlated_coefficients(substances, y, t)
    for m in range(3):
        assert found_b[m] == pytest.approx(BVirial_mixture(y, b[:, :, m].tolist()), rel=1e-12)
    assert found_c == pytest.approx(third, rel=1e-11)
    # Orentlicher and Prausnitz: the cube root of the product, close where all are of one sign.
    root = np.cbrt(c)
    product = np.einsum("i,j,k,ijm,ikm,jkm->m", y, y, y, root, root, root)
    assert found_c[1:] == pytest.approx(product[1:], rel=0.03)


def test_a_pure_gas_is_its_own_mixture() -> None:
    t = np.linspace(200.0, 500.0, 7)
    s = component("propane")
    b, c = correlated_coefficients((s,), (1.0,), t)
    args = (t, s.critical_temperature, s.critical_pressure, s.acentric_factor)
    assert b == pytest.approx(second_virial("tsonopoulos", *args), rel=1e-13)
    assert c == pytest.approx(third_virial("orbey_vera", *args), rel=1e-12)


def test_nitrogen_and_methane_at_200_kelvin() -> None:
    # B12 = -59.8 cm3/mol, Smith, Van Ness, Abbott, 7th ed., example 11.5 (number from memory).
    t = np.array([200.0])
    pair = [component("nitrogen"), component("methane")]
    half, _ = correlated_coefficients(pair, (0.5, 0.5), t)
    one, _ = correlated_coefficients(pair[:1], (1.0,), t)
    other, _ = correlated_coefficients(pair[1:], (1.0,), t)
    assert (2.0 * half[0] - 0.5 * (one[0] + other[0])) * 1e6 == pytest.approx(-59.8, abs=2.0)


def test_hydrogen_takes_effective_constants_and_no_acentric_factor() -> None:
    constants = constants_at(component("hydrogen"), np.array([300.0]))
    # 43.6/(1 + 21.8/(2.01588 x 300))
    assert constants.critical_temperature == pytest.approx([43.6 / (1.0 + 21.8 / 604.764)], rel=1e-9)
    assert constants.acentric_factor == pytest.approx([0.0])
    assert constants.critical_pressure * constants.critical_volume > 0.0
    assert GAS_CONSTANT > 8.3
