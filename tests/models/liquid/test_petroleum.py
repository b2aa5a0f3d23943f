"""The petroleum correction of 2004: vectors, the way back, its slopes, and the pitfalls of its use.

Vectors are recomputed from the published equations of API MPMS 11.1-2004, unless a check says otherwise.
"""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from models.arrays import FloatArray
from models.liquid.hydrometer import hydrometer_factor
from models.liquid.petroleum import (
    COMMODITIES,
    GROUPS,
    base_factors,
    density_60f,
    factors,
    model_error,
    point,
    table_factor,
)
from models.units import density_of_api_gravity
from tests.models.liquid.petroleum_decimal import D, figures, slope

CRUDE, REFINED, LUBRICATING, SPECIAL = (COMMODITIES[n] for n in ("crude", "refined", "lubricating", "special"))
PSI, ZERO = 6894.757, 273.15
REFINED_LIMITS = (770.3520, 787.5195, 838.3127)  # published
NAMES = {"crude oils": "crude", "gasolines": "gasoline", "transition": "transition", "jet fuels": "jet",
         "fuel oils": "fuel oil", "lubricating oils": "lubricating"}  # fmt: skip


def from_f(t_f: float) -> float:
    return (t_f - 32.0) / 1.8 + ZERO


def of_api(degrees: float) -> float:
    return 141.5 / (degrees + 131.5) * 999.016


def from_base(
    density: float, base_c: float, t_c: float, commodity: int, gauge: float = 0.0
) -> tuple[float, float, float]:
    """Density at 60 °F, C_T and C_P of a liquid whose density at the base temperature is known."""
    rho60 = float(density_60f(density, base_c + ZERO, 0.0, commodity))
    c_t, c_p = base_factors(rho60, t_c + ZERO, gauge, base_c + ZERO, commodity)
    return rho60, float(c_t), float(c_p)


@pytest.mark.parametrize(
    ("api", "t_f", "psi", "commodity", "group", "ctl", "fp", "cpl", "ctpl"),
    [
        (28.0, 97.0, 0.0, CRUDE, "crude oils", 0.98385371, 0.5047711, 1.0, 0.98385371),
        (35.0, 100.0, 300.0, CRUDE, "crude oils", 0.98096373, 0.5728498, 1.00172151, 0.98265247),
        (40.0, 84.0, 0.0, CRUDE, "crude oils", 0.98790523, 0.5902232, 1.0, 0.98790523),
        (10.0, 180.0, 1000.0, CRUDE, "crude oils", 0.95851583, 0.4697980, 1.00472016, 0.96304017),
        (63.0, 75.0, 0.0, REFINED, "gasolines", 0.98946804, 0.8595518, 1.0, 0.98946804),
        (50.0, 100.0, 0.0, REFINED, "transition", 0.97638300, 0.7490316, 1.0, 0.97638300),
        (37.2, 100.0, 0.0, REFINED, "jet fuels", 0.98107640, 0.5949677, 1.0, 0.98107640),
        (34.0, 120.0, 0.0, REFINED, "fuel oils", 0.97226269, 0.6018665, 1.0, 0.97226269),
        (15.0, 180.0, 0.0, REFINED, "fuel oils", 0.95241289, 0.5126996, 1.0, 0.95241289),
        (28.0, 150.0, 0.0, LUBRICATING, "lubricating oils", 0.96422398, 0.5947914, 1.0, 0.96422398),
    ],
)
def test_vectors_by_degrees_api(
    api: float, t_f: float, psi: float, commodity: int, group: str, ctl: float, fp: float, cpl: float, ctpl: float
) -> None:
    at = (of_api(api), from_f(t_f), psi * PSI, commodity)
    f = factors(*at)
    assert GROUPS[int(f.group)].name == group
    assert float(f.ctl) == pytest.approx(ctl, abs=5e-9)
    assert float(f.fp) == pytest.approx(fp, abs=5e-8)
    assert float(f.cpl) == pytest.approx(cpl, abs=5e-9)
    assert float(f.ctl * f.cpl) == pytest.approx(ctpl, abs=5e-9)
    assert float(point(*at).density) == pytest.approx(of_api(api) * ctpl, abs=1e-5)
    assert float(f.temperature_f) == pytest.approx(t_f, abs=1e-9)
    assert float(f.pressure_psi) == pytest.approx(psi, abs=1e-9)


def test_every_figure_of_one_vector() -> None:
    f = factors(of_api(35.0), from_f(100.0), 300.0 * PSI, CRUDE)
    assert float(f.density_star) == pytest.approx(849.016360, abs=5e-7)
    assert float(f.alpha60) == pytest.approx(4.731993366e-4, abs=5e-14)
    # t* = 1.8 (t90 - shift) + 32, both as the working shows them.
    assert 100.0 - 1.8 * float(f.shift) == pytest.approx(float(f.temperature_star_f), abs=1e-11)


@pytest.mark.parametrize(
    ("density", "base_c", "t_c", "gauge", "commodity", "group", "c_t", "c_p"),
    [
        (850.0, 15.0, 40.0, 0.0, CRUDE, "crude oils", 0.97861576, 1.0),
        (850.0, 20.0, 40.0, 0.0, CRUDE, "crude oils", 0.98294529, 1.0),
        (745.0, 15.0, 30.0, 0.0, REFINED, "gasolines", 0.98170215, 1.0),
        (745.0, 20.0, 30.0, 0.0, REFINED, "gasolines", 0.98781894, 1.0),
        (780.0, 15.0, 30.0, 0.0, REFINED, "transition", 0.98422612, 1.0),
        (820.0, 15.0, 30.0, 0.0, REFINED, "jet fuels", 0.98667929, 1.0),
        (845.0, 15.0, 60.0, 1e6, REFINED, "fuel oils", 0.96192667, 1.00096695),
        (960.0, 15.0, 60.0, 0.0, REFINED, "fuel oils", 0.96779026, 1.0),
        (880.0, 15.0, 60.0, 0.0, LUBRICATING, "lubricating oils", 0.96760618, 1.0),
    ],
)
def test_vectors_from_a_metric_base(
    density: float, base_c: float, t_c: float, gauge: float, commodity: int, group: str, c_t: float, c_p: float
) -> None:
    rho60, got_t, got_p = from_base(density, base_c, t_c, commodity, gauge)
    assert got_t == pytest.approx(c_t, abs=5e-9)
    assert got_p == pytest.approx(c_p, abs=5e-9)
    f = factors(rho60, t_c + ZERO, gauge, commodity)
    assert GROUPS[int(f.group)].name == group
    there = float(point(rho60, t_c + ZERO, gauge, commodity).density)
    assert there == pytest.approx(density * c_t * c_p, rel=1e-8)


def test_both_factors_of_a_pressurised_fuel_oil() -> None:
    _, c_t, c_p = from_base(845.0, 15.0, 60.0, REFINED, 1e6)
    assert c_t * c_p == pytest.approx(0.96285680, abs=5e-9)


@pytest.mark.parametrize(("base_c", "rho60"), [(15.0, 849.59848), (20.0, 853.20265)])
def test_density_at_60_f_of_a_metric_crude(base_c: float, rho60: float) -> None:
    assert from_base(850.0, base_c, 40.0, CRUDE)[0] == pytest.approx(rho60, abs=5e-6)


@pytest.mark.parametrize(
    ("observed", "t_f", "psi", "commodity", "rho60"),
    [
        (820.0, 95.0, 0.0, CRUDE, 834.38270),
        (905.5, 140.0, 250.0, CRUDE, 933.85148),
        (730.0, 88.0, 0.0, REFINED, 744.14827),
        (765.0, 110.0, 0.0, REFINED, 786.38163),
        (812.3, 32.0, 0.0, REFINED, 800.79970),
        (870.2, 150.0, 500.0, REFINED, 902.78556),
        (860.0, 120.0, 0.0, LUBRICATING, 881.07407),
    ],
)
def test_vectors_of_the_way_back(observed: float, t_f: float, psi: float, commodity: int, rho60: float) -> None:
    assert float(density_60f(observed, from_f(t_f), psi * PSI, commodity)) == pytest.approx(rho60, abs=5e-6)


# beta in 1e-3/K and kappa in 1e-10/Pa at 20 °C of liquids by their density at 15 °C: the equations differenced.
@pytest.mark.parametrize(
    ("rho15", "commodity", "beta", "kappa"),
    [
        (745.0, REFINED, 1.225, 11.10),
        (800.0, REFINED, 0.936, 8.83),
        (840.0, REFINED, 0.850, 7.69),
        (900.0, REFINED, 0.776, 6.46),
        (960.0, REFINED, 0.713, 5.60),
        (800.0, CRUDE, 0.967, 8.83),
        (850.0, CRUDE, 0.856, 7.45),
        (870.0, CRUDE, 0.817, 7.01),
        (930.0, CRUDE, 0.714, 5.99),
        (880.0, LUBRICATING, 0.718, 6.82),
    ],
)
def test_expansivity_and_compressibility(rho15: float, commodity: int, beta: float, kappa: float) -> None:
    rho60 = density_60f(rho15, 15.0 + ZERO, 0.0, commodity)
    here = point(rho60, 20.0 + ZERO, 0.0, commodity)
    assert float(here.expansivity) * 1e3 == pytest.approx(beta, abs=5.1e-4)
    assert float(here.compressibility) * 1e10 == pytest.approx(kappa, abs=5.1e-3)


@pytest.mark.parametrize("t_f", [-40.0, 60.0, 131.0, 290.0])
@pytest.mark.parametrize("psi", [0.0, 700.0, 1400.0])
@pytest.mark.parametrize(
    ("rho60", "commodity", "alpha"),
    [(870.0, CRUDE, None), (690.0, REFINED, None), (780.0, REFINED, None), (810.0, REFINED, None),
     (950.0, REFINED, None), (880.0, LUBRICATING, None), (720.0, SPECIAL, "0.00065")],
)  # fmt: skip
def test_slopes_are_those_of_the_decimals(
    rho60: float, commodity: int, alpha: str | None, psi: float, t_f: float
) -> None:
    own = None if alpha is None else D(alpha)
    args = (rho60, from_f(t_f), psi * PSI, commodity, np.nan if alpha is None else float(alpha))
    name = NAMES.get(GROUPS[int(factors(*args).group)].name, "")

    def log_density(rho: D, t: D, p: D) -> D:
        return figures(rho, t, p, name, own)["density"].ln()

    rho_d, t_d, p_d = D(rho60), D(t_f), D(psi)
    here = point(*args)
    assert float(here.density) == pytest.approx(float(log_density(rho_d, t_d, p_d).exp()), rel=1e-14)
    beta = -1.8 * float(slope(lambda t: log_density(rho_d, t, p_d), t_d))
    assert float(here.expansivity) == pytest.approx(beta, rel=1e-12)
    cpl = figures(rho_d, t_d, p_d, name, own)
    kappa = float(cpl["cpl"] * cpl["fp"]) * 1e-5 / PSI if psi == 0.0 else float(
        slope(lambda p: log_density(rho_d, t_d, p), p_d)
    ) / PSI  # fmt: skip
    assert float(here.compressibility) == pytest.approx(kappa, rel=1e-12)
    by_key = float(slope(lambda r: log_density(r, t_d, p_d), rho_d) * rho_d)
    assert float(here.by_key) == pytest.approx(by_key, rel=1e-12)


# Recomputed: relative change of C_T per 0.25 °C, and per 1 kg/m3 of the density at 15 °C.
@pytest.mark.parametrize(
    ("rho15", "t_c", "commodity", "by_temperature", "by_density"),
    [(850.0, 40.0, CRUDE, -2.20e-4, 52e-6), (745.0, 30.0, REFINED, -3.12e-4, 38e-6)],
)
def test_sensitivity(rho15: float, t_c: float, commodity: int, by_temperature: float, by_density: float) -> None:
    c_t = from_base(rho15, 15.0, t_c, commodity)[1]
    assert from_base(rho15, 15.0, t_c + 0.25, commodity)[1] / c_t - 1.0 == pytest.approx(by_temperature, abs=5.1e-7)
    assert from_base(rho15 + 1.0, 15.0, t_c, commodity)[1] / c_t - 1.0 == pytest.approx(by_density, abs=5.1e-7)


# --- the way back over the whole range ----------------------------------------------------------

COMMODITY = st.sampled_from([CRUDE, REFINED, LUBRICATING, SPECIAL])
UNIT = st.floats(0.0, 1.0)


@settings(max_examples=50, derandomize=True, deadline=None)
@given(COMMODITY, UNIT, st.floats(223.15, 423.15), st.floats(-1e5, 1500.0 * PSI), st.floats(230e-6, 930e-6))
def test_there_and_back(commodity: int, part: float, t: float, gauge: float, alpha: float) -> None:
    low = 800.9 if commodity == LUBRICATING else 640.0 if commodity == SPECIAL else 610.6
    rho60 = low + part * (1163.5 - low)
    back = float(density_60f(float(point(rho60, t, gauge, commodity, alpha).density), t, gauge, commodity, alpha))
    near = commodity == REFINED and min(abs(rho60 - limit) for limit in REFINED_LIMITS) < 1e-4
    assert back == pytest.approx(rho60, rel=1e-6 if near else 2e-14)


@settings(max_examples=50, derandomize=True, deadline=None)
@given(st.sampled_from(REFINED_LIMITS), st.floats(-3e-7, 3e-7), st.floats(223.15, 423.15), st.floats(0.0, 1e7))
def test_near_a_group_limit_the_answer_is_settled(limit: float, off: float, t: float, gauge: float) -> None:
    observed = float(point(limit, t, gauge, REFINED).density) * (1.0 + off)
    rho60 = float(density_60f(observed, t, gauge, REFINED))
    again = float(point(rho60, t, gauge, REFINED).density)
    # In the gap between two groups, which is 1e-7 wide at most, the answer is the limit.
    assert again == pytest.approx(observed, rel=1.2e-7 if rho60 == limit else 1e-14)
    assert rho60 == pytest.approx(limit, rel=1e-6)


def test_gap_and_overlap_of_groups() -> None:
    # At 787.5195 the heavier group's density at 150 °C lies above the lighter one's, at 770.3520 below.
    for limit, gap in ((787.5195, True), (770.3520, False)):
        lighter = float(point(np.nextafter(limit, 0.0), 423.15, 0.0, REFINED).density)
        heavier = float(point(limit, 423.15, 0.0, REFINED).density)
        assert (heavier > lighter) == gap and abs(heavier / lighter - 1.0) < 1e-7
        answer = float(density_60f((lighter + heavier) / 2.0, 423.15, 0.0, REFINED))
        assert (answer == limit) if gap else (limit < answer < limit + 1e-5)
        assert float(density_60f(heavier, 423.15, 0.0, REFINED)) == pytest.approx(limit, abs=1e-12)


def test_the_way_back_rises_through_every_limit() -> None:
    for t in (223.15, 300.0, 423.15):
        for limit in REFINED_LIMITS:
            observed = float(point(limit, t, 0.0, REFINED).density) * (1.0 + np.linspace(-1e-4, 1e-4, 4001))
            assert (np.diff(density_60f(observed, t, 0.0, REFINED)) >= 0.0).all()


def test_ends_of_the_range() -> None:
    for commodity, low in ((CRUDE, 610.6), (REFINED, 610.6), (LUBRICATING, 800.9)):
        for t in (223.15, 288.15, 423.15):
            for gauge in (0.0, 1500.0 * PSI):
                ends = point([low, 1163.5], t, gauge, commodity).density
                assert density_60f(ends, t, gauge, commodity) == pytest.approx([low, 1163.5], rel=1e-14)
                assert np.isnan(density_60f(ends * [1.0 - 1e-7, 1.0 + 1e-7], t, gauge, commodity)).all()


def test_a_special_liquid_with_two_answers_gets_the_denser() -> None:
    # At the corner of the range the density falls with that at 60 °F: CPL outruns it.
    corner = (423.15, 1500.0 * PSI, SPECIAL, 930e-6)
    assert float(point(610.6, *corner).by_key) < 0.0
    rho60 = float(density_60f(float(point(612.0, *corner).density), *corner))
    assert float(point(rho60, *corner).by_key) > 0.0
    assert float(point(rho60, *corner).density) == pytest.approx(float(point(612.0, *corner).density), rel=1e-13)
    assert np.isnan(density_60f(float(point(612.0, *corner).density) * 0.999, *corner))


def test_outside_is_nan_in_columns_and_never_a_fault() -> None:
    wild = np.array([np.nan, np.inf, -np.inf, 0.0, -850.0, 1e308, 5e-324, 850.0])
    for answer in (density_60f(wild, 300.0, 0.0, CRUDE), point(wild, 300.0, 0.0, CRUDE).density):
        assert np.isnan(answer[:-1]).all() and np.isfinite(answer[-1])
    for t, p in ((np.nan, 0.0), (1e308, 0.0), (-1.0, 0.0), (300.0, np.nan), (300.0, np.inf), (300.0, 2e7)):
        for commodity in (CRUDE, REFINED):
            assert np.isnan(density_60f(850.0, t, p, commodity))
            here = point(850.0, t, p, commodity)
            parts = (here.density, here.expansivity, here.compressibility, here.by_key)
            assert np.isnan(np.asarray(parts)).all()
            assert int(factors(850.0, t, p, commodity).group) == -1
    assert np.isnan(density_60f([850.0] * 2, 300.0, 0.0, [-1, 4])).all()
    assert density_60f(np.zeros(0), 300.0, 0.0, CRUDE).shape == (0,)


def test_a_base_temperature_has_the_same_limits() -> None:
    assert np.isnan(base_factors(850.0, 300.0, 0.0, [222.0, 424.0], CRUDE)[0]).all()
    assert np.isnan(base_factors(850.0, 424.0, 0.0, 288.15, CRUDE)).all()


def test_a_column_of_all_commodities_is_its_rows() -> None:
    rows = [(850.0, 310.0, 2e5, CRUDE, np.nan), (765.0, 316.0, 0.0, REFINED, np.nan),
            (880.0, 320.0, -4e4, LUBRICATING, np.nan), (700.0, 260.0, 1e6, SPECIAL, 6e-4),
            (400.0, 300.0, 0.0, CRUDE, np.nan)]  # fmt: skip
    columns: list[FloatArray] = [np.array(column) for column in zip(*rows, strict=True)]
    singly = [float(density_60f(*row)) for row in rows]
    assert density_60f(*columns) == pytest.approx(singly, rel=1e-14, nan_ok=True)
    assert point(*columns).density == pytest.approx([float(point(*r).density) for r in rows], rel=1e-15, nan_ok=True)


# --- pitfalls -----------------------------------------------------------------------------------


def test_pitfall_1_gauge_not_absolute() -> None:
    at = (850.0, 300.0)
    assert float(factors(*at, 0.0, CRUDE).cpl) == 1.0
    slip = float(point(*at, 101_325.0, CRUDE).density / point(*at, 0.0, CRUDE).density) - 1.0
    assert slip == pytest.approx(7.45e-10 * 101_325.0, rel=0.06)  # kappa of an 850 crude at 20 °C, at 27 °C more


def test_pitfall_1_a_gauge_pressure_below_zero_counts_as_zero() -> None:
    under, at_zero = point(850.0, 300.0, -5e4, CRUDE), point(850.0, 300.0, 0.0, CRUDE)
    assert float(under.density) == float(at_zero.density)
    assert float(under.expansivity) == float(at_zero.expansivity)
    assert float(under.compressibility) == 0.0 < float(at_zero.compressibility)
    assert float(factors(850.0, 300.0, -5e4, CRUDE).pressure_psi) == 0.0


def test_pitfall_5_a_density_has_a_base_temperature() -> None:
    # The same figure at 15 °C, 20 °C and 60 °F is three liquids: 849.60, 853.20 and 850 kg/m3 at 60 °F.
    at_15, at_20 = (from_base(850.0, base, 40.0, CRUDE)[0] for base in (15.0, 20.0))
    assert at_15 == pytest.approx(849.59848, abs=5e-6) and at_20 == pytest.approx(853.20265, abs=5e-6)
    assert from_base(850.0, (60.0 - 32.0) / 1.8, 40.0, CRUDE)[0] == pytest.approx(850.0, abs=1e-8)


def test_pitfall_6_a_wrong_commodity_costs_2_in_10_000() -> None:
    as_crude, as_refined = (from_base(836.9, 15.0, 22.45, c)[1] for c in (CRUDE, REFINED))
    assert as_refined - as_crude == pytest.approx(2.1e-4, abs=5e-6)


def test_pitfall_6_the_group_follows_the_density_crude_is_declared() -> None:
    rho = np.array([700.0, 780.0, 810.0, 900.0])
    assert [GROUPS[g].name for g in factors(rho, 310.0, 0.0, REFINED).group] == [
        "gasolines", "transition", "jet fuels", "fuel oils",
    ]  # fmt: skip
    assert {GROUPS[g].name for g in factors(rho, 310.0, 0.0, CRUDE).group} == {"crude oils"}
    # The group is that of the solution, not of the observed density: 765.0 at 110 °F is no gasoline.
    solved = density_60f(765.0, from_f(110.0), 0.0, REFINED)
    assert GROUPS[int(factors(solved, from_f(110.0), 0.0, REFINED).group)].name == "transition"


def test_pitfall_7_water_of_2004() -> None:
    # 999.016 kg/m3 of 2004, not 999.012 of 1980: 35 °API is 849.0136 kg/m3; with the other it is 849.0102.
    assert float(density_of_api_gravity(35.0)) == pytest.approx(849.0136, abs=5e-5)


def test_pitfall_7_the_glass_is_outside_the_procedure() -> None:
    # 779.0 read at 25 °C on a hydrometer right at 15 °C, recomputed: 786.65 with the glass, 786.83 without.
    t, base = 25.0 + ZERO, 15.0 + ZERO
    for reading, at_15 in ((779.0, 786.83), (779.0 * float(hydrometer_factor(t, base)), 786.65)):
        rho60 = density_60f(reading, t, 0.0, CRUDE)
        assert float(point(rho60, base, 0.0, CRUDE).density) == pytest.approx(at_15, abs=5e-3)


def test_pitfall_8_rounded_and_unrounded() -> None:
    unrounded = float(factors(of_api(35.0), from_f(100.0), 0.0, CRUDE).ctl)
    assert unrounded == pytest.approx(0.98096373, abs=5e-9)
    assert float(table_factor(unrounded)) == 0.98096
    assert table_factor([0.983855, 0.9838549, 1.000005, 0.974999, np.nan, -0.983855]) == pytest.approx(
        [0.98386, 0.98385, 1.00001, 0.97500, np.nan, -0.98386], abs=1e-15, nan_ok=True
    )


def test_pitfall_9_at_60_f_nothing_is_corrected() -> None:
    # Without 60.0068749 °F in place of 60 °F, CTL at 60 °F would be 3e-6 off.
    for rho, commodity in ((850.0, CRUDE), (700.0, REFINED), (780.0, REFINED), (900.0, LUBRICATING)):
        assert float(factors(rho, from_f(60.0), 0.0, commodity).ctl) == pytest.approx(1.0, abs=2e-12)


def test_pitfall_9_alpha60_is_that_of_rho_star() -> None:
    f = factors(of_api(35.0), from_f(100.0), 0.0, CRUDE)
    assert float(f.alpha60) == pytest.approx(4.731993366e-4, abs=5e-14)
    assert 341.0957 / of_api(35.0) ** 2 - float(f.alpha60) == pytest.approx(3.08e-9, abs=5e-12)  # of rho60 itself


# --- the method's own error ---------------------------------------------------------------------


# API MPMS 11.1-1980, volume X (from memory): 95 % figures, of which one sigma is half.
@pytest.mark.parametrize(
    ("t_f", "percent"),
    [(60.0, 0.0), (80.0, 0.025), (100.0, 0.05), (125.0, 0.10), (150.0, 0.15), (200.0, 0.25), (250.0, 0.35),
     (300.0, 0.45), (20.0, -0.05), (-40.0, -0.17)],
)  # fmt: skip
def test_model_error(t_f: float, percent: float) -> None:
    assert float(model_error(from_f(t_f))) == pytest.approx(percent / 100.0 / 2.0, abs=1e-12)


def test_model_error_is_odd() -> None:
    away = np.linspace(0.0, 100.0, 41)
    assert model_error(from_f(60.0) + away) == pytest.approx(-model_error(from_f(60.0) - away), abs=1e-15)
