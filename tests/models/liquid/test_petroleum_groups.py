"""Groups of petroleum liquids: which holds, what its constants are, where the procedure ends."""

import numpy as np
import pytest

from models.liquid.petroleum_groups import (
    COMMODITIES,
    EDITION,
    FIRST,
    GROUPS,
    HIGHEST_ALPHA60,
    HIGHEST_PRESSURE,
    HIGHEST_TEMPERATURE,
    LAST,
    LOWEST_ALPHA60,
    LOWEST_TEMPERATURE,
    PASCAL_PER_PSI,
    ROUNDING,
    alpha60_holds,
    coefficients,
    commodity_codes,
    conditions_hold,
    density_limits,
    group_of,
    holds,
    pressure_holds,
)

CRUDE, REFINED, LUBRICATING, SPECIAL = (COMMODITIES[n] for n in ("crude", "refined", "lubricating", "special"))


# Published, API MPMS 11.1-2004, 11.1.6.1: limits in kg/m3, K0, K1, K2.
@pytest.mark.parametrize(
    ("name", "figures"),
    [
        ("crude oils", (610.6, 1163.5, 341.0957, 0.0, 0.0)),
        ("gasolines", (610.6, 770.3520, 192.4571, 0.2438, 0.0)),
        ("transition", (770.3520, 787.5195, 1489.0670, 0.0, -0.00186840)),
        ("jet fuels", (787.5195, 838.3127, 330.3010, 0.0, 0.0)),
        ("fuel oils", (838.3127, 1163.5, 103.8720, 0.2701, 0.0)),
        ("lubricating oils", (800.9, 1163.5, 0.0, 0.34878, 0.0)),
    ],
)
def test_published_constants(name: str, figures: tuple[float, ...]) -> None:
    (group,) = [g for g in GROUPS if g.name == name]
    assert group[1:] == figures


def test_refined_groups_follow_each_other() -> None:
    chain = GROUPS[FIRST[REFINED] : LAST[REFINED] + 1]
    assert [g.name for g in chain] == ["gasolines", "transition", "jet fuels", "fuel oils"]
    assert all(lighter.highest == heavier.lowest for lighter, heavier in zip(chain, chain[1:], strict=False))


# Recomputed from the published constants: relative jump of alpha60 from the lighter to the heavier group.
@pytest.mark.parametrize(
    ("limit", "jump", "half"), [(770.3520, 2.8e-5, 5e-7), (787.5195, -2.6e-5, 5e-7), (838.3127, -2.2e-6, 5e-8)]
)
def test_the_groups_are_continuous(limit: float, jump: float, half: float) -> None:
    heavier = int(group_of(limit, REFINED))
    alpha = []
    for group in (heavier - 1, heavier):
        k0, k1, k2 = (float(k) for k in coefficients(np.asarray(group), np.nan))
        alpha.append((k0 / limit + k1) / limit + k2)
    assert alpha[1] / alpha[0] - 1.0 == pytest.approx(jump, abs=half)


def test_group_by_density() -> None:
    rho = [610.6, 700.0, 770.35199, 770.3520, 787.51949, 787.5195, 838.31269, 838.3127, 1163.5]
    assert [GROUPS[g].name for g in group_of(rho, REFINED)] == (
        ["gasolines"] * 3 + ["transition"] * 2 + ["jet fuels"] * 2 + ["fuel oils"] * 2
    )
    assert [GROUPS[g].name for g in group_of([700.0, 850.0], [CRUDE, CRUDE])] == ["crude oils"] * 2
    assert [GROUPS[int(group_of(850.0, c))].name for c in (LUBRICATING, SPECIAL)] == [
        "lubricating oils", "special applications",
    ]  # fmt: skip


def test_outside_is_no_group() -> None:
    assert (group_of([610.59, 1163.51, np.nan], [CRUDE, REFINED, SPECIAL]) == -1).all()
    assert (group_of([800.89, 1163.51, 850.0, 850.0], [LUBRICATING, LUBRICATING, -1, 4]) == -1).all()
    assert (group_of([800.9, 1163.5, 610.6, 1163.5], [LUBRICATING, LUBRICATING, CRUDE, SPECIAL]) >= 0).all()
    assert np.isnan(coefficients(group_of(500.0, CRUDE), np.nan)[0])


def test_special_takes_the_own_alpha60() -> None:
    k0, k1, k2 = coefficients(group_of([700.0, 700.0], [SPECIAL, CRUDE]), [5e-4, 5e-4])
    assert (k0[0], k1[0], k2[0]) == (0.0, 0.0, 5e-4)
    assert (k0[1], k1[1], k2[1]) == (341.0957, 0.0, 0.0)


def test_codes() -> None:
    assert commodity_codes([0, 3, 4, -2]).tolist() == [0, 3, -1, -1]
    assert np.isnan(density_limits(7)[0]) and np.isnan(density_limits(7)[1])
    assert [float(x) for x in density_limits(LUBRICATING)] == [800.9, 1163.5]
    assert [float(x) for x in density_limits(SPECIAL)] == [610.6, 1163.5]  # from memory
    assert EDITION == "ASTM D1250-04 / API MPMS 11.1-2004"


def test_published_limits() -> None:
    # Published: -58 to 302 °F, 0 to 1500 psig (103.4 bar), alpha60 230e-6 to 930e-6 per °F; 1 psi = 6.894757 kPa.
    low, high = ((kelvin - 273.15) * 1.8 + 32.0 for kelvin in (LOWEST_TEMPERATURE, HIGHEST_TEMPERATURE))
    assert low == pytest.approx(-58.0, abs=1e-9) and high == pytest.approx(302.0, abs=1e-9)
    highest = HIGHEST_PRESSURE
    assert highest / 1e5 == pytest.approx(103.4, abs=0.05)
    assert highest == pytest.approx(1500.0 * 0.45359237 * 9.80665 / 0.0254**2, rel=1e-13)
    assert (LOWEST_ALPHA60, HIGHEST_ALPHA60, PASCAL_PER_PSI) == (230e-6, 930e-6, 6894.757)


def test_mixed_units_leave_a_rounding() -> None:
    # A limit converted there and back may lie a rounding beyond itself and is still the limit.
    assert ROUNDING == 1e-9
    assert holds(300.0 * (1.0 + 0.9e-9), 200.0, 300.0) and not holds(300.0 * (1.0 + 1.1e-9), 200.0, 300.0)
    assert holds(200.0 * (1.0 - 0.9e-9), 200.0, 300.0) and not holds(200.0 * (1.0 - 1.1e-9), 200.0, 300.0)
    assert not holds(np.nan, 200.0, 300.0)
    there_and_back = (302.0 - 32.0) / 1.8 + 273.15
    assert conditions_hold([there_and_back, (-58.0 - 32.0) / 1.8 + 273.15], 0.0, CRUDE, np.nan).all()
    assert pressure_holds([1500.0 * 6894.757, 1500.0 * 6894.757293168 * (1.0 + 5e-10)]).all()
    assert not pressure_holds([1500.0 * 6894.758, np.nan, np.inf, -np.inf]).any()


def test_each_condition_counts() -> None:
    assert conditions_hold(300.0, -5e4, CRUDE, np.nan)
    assert not conditions_hold([223.149, 423.151, np.nan], 0.0, CRUDE, np.nan).any()
    assert not conditions_hold(300.0, 1.04e7, CRUDE, np.nan)
    assert not conditions_hold(300.0, 0.0, 4, np.nan)
    assert not conditions_hold(300.0, 0.0, SPECIAL, [229e-6, 931e-6, np.nan]).any()
    assert alpha60_holds([SPECIAL, SPECIAL, CRUDE], [230e-6, 930e-6, np.nan]).all()
