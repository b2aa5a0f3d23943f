"""One night's balances: against hand arithmetic, the GUM's worked tank, dense algebra and simulation."""

from __future__ import annotations

import importlib
import itertools
import math

import numpy as np
import pytest

from models.balance.night import Movement, Night, critical_score, limits, night
from models.estimate import Estimate

ALARM = 0.05


def one(opening: Estimate, closing: Estimate, *movements: Movement) -> Night:
    return night({"a": opening}, {"a": closing}, movements, ALARM)


# Z. Šidák, J. Am. Stat. Assoc. 62 (1967) 626: each of k tests at 1 − (1 − α)^(1/k). The first two figures are
# those of R. S. H. Mah and A. C. Tamhane, AIChE J. 28 (1982) 828, for 4 and 6 tests (from memory).
@pytest.mark.parametrize(("rows", "critical"), [(4, 2.4909), (6, 2.6310), (7, 2.6828), (10, 2.7996), (100, 3.4740)])
def test_critical_scores_are_the_quantiles_of_sidak(rows: int, critical: float) -> None:
    assert critical_score(rows, 0.05) == pytest.approx(critical, abs=5e-5)
    low, high = 0.0, 10.0
    for _ in range(80):
        middle = 0.5 * (low + high)
        low, high = (middle, high) if (1.0 - math.erfc(middle / math.sqrt(2.0))) ** rows < 0.95 else (low, middle)
    assert critical_score(rows, 0.05) == pytest.approx(low, abs=1e-12)


def test_where_nothing_is_judged_nothing_is_flagged() -> None:
    assert critical_score(0, 0.05) == math.inf


def test_the_imbalance_is_physical_less_book_and_a_loss_is_negative() -> None:
    # Opens with 1000, receives 300, delivers 200: the book says 1100; 1090 are there.
    result = one(
        Estimate(1000.0, {"o": 3.0}), Estimate(1090.0, {"c": 4.0}),
        Movement("in", None, "a", Estimate(300.0, {"i": 12.0})), Movement("out", "a", None, Estimate(200.0)),
    )  # fmt: skip
    (row,) = result.rows
    assert row.imbalance.value == pytest.approx(-10.0)
    assert row.imbalance.uncertainty == pytest.approx(13.0)  # 3, 4, 12: a Pythagorean quadruple
    assert row.score == pytest.approx(-10.0 / 13.0)
    assert row.p_value == pytest.approx(2.0 * (1.0 - 0.5 * (1.0 + math.erf(10.0 / 13.0 / math.sqrt(2.0)))))
    # One row at 5 %: 1.959964; with 95 % power 1.644854 more (tables of the normal law).
    assert result.critical == pytest.approx(1.959964, abs=1e-6)
    assert row.detectable == pytest.approx((1.959964 + 1.644854) * 13.0, rel=1e-6)
    assert not row.flagged


# The rule is JCGM 100:2008, F.1.2.3; the tank is invented, its arithmetic a partial derivative for each cause.
# 30 m tank, 745 kg/m³ at 15 °C, α 1.2e-3/K, shell 12e-6/K about 20 °C; 12.500 m at 18.0 °C, then 8.200 m at 19.5 °C.
READ = ((12.5, 18.0), (8.2, 19.5))


def worked(side: int, *, independent: bool = False) -> Estimate:
    level, celsius = READ[side]
    shell, liquid = 1.0 + 2.0 * 12e-6 * (celsius - 20.0), 1.0 - 1.2e-3 * (celsius - 15.0)
    mass = math.pi / 4.0 * 30.0**2 * level * shell * 745.0 * liquid
    by_kelvin = mass * (2.0 * 12e-6 / shell - 1.2e-3 / liquid)
    own = {"local": 3e-4 * mass, "dip": 0.001 * mass / level, "stem": 0.15 * by_kelvin}
    shared = {"capacity": 1e-3 * mass, "gauge": 0.002 * mass / level, "thermometer": 0.25 * by_kelvin,
              "sample": 0.5 * mass / 745.0}  # fmt: skip
    parts = {f"{name}{side}": part for name, part in own.items()}
    parts |= {f"{name}{side}" if independent else name: part for name, part in shared.items()}
    return Estimate(mass, parts)


def test_opening_and_closing_share_errors_as_in_the_worked_tank() -> None:
    assert worked(0).uncertainty == pytest.approx(8528.0, abs=1.0)
    assert worked(1).uncertainty == pytest.approx(5655.0, abs=1.0)
    (row,) = one(worked(0), worked(1)).rows
    assert row.imbalance.value == pytest.approx(-2_263_778.0, abs=1.0)
    assert row.imbalance.uncertainty == pytest.approx(3986.0, abs=1.0)
    assert row.imbalance.parts["gauge"] == pytest.approx(-1.9, abs=0.1)
    (alone,) = one(worked(0, independent=True), worked(1, independent=True)).rows
    assert alone.imbalance.uncertainty == pytest.approx(10_233.0, abs=2.0)


def test_a_detectable_imbalance_is_flagged_in_95_of_100_nights() -> None:
    # Four vessels share a density; the loss is put on one of them. 10,000 nights, so one sd is 0.22 %.
    rng = np.random.default_rng(20260314)
    names = [f"v{i}" for i in range(4)]
    opening: dict[str, Estimate | None] = {name: Estimate(1e6, {"density": 300.0, f"o{name}": 400.0}) for name in names}
    closing: dict[str, Estimate | None] = {
        name: Estimate(1e6, {"density": -200.0, f"c{name}": 700.0}) for name in names
    }
    result = night(opening, closing, (), ALARM)
    row = result.rows[0]
    # The closing less the opening: 500 of the density, 400 and 700 of their own.
    u = math.sqrt(500.0**2 + 400.0**2 + 700.0**2)
    assert row.imbalance.uncertainty == pytest.approx(u)
    scores = (row.detectable + u * rng.standard_normal(10_000)) / u
    assert np.mean(np.abs(scores) > result.critical) == pytest.approx(0.95, abs=0.007)
    clean = rng.standard_normal((10_000, 4))
    assert np.mean(np.any(np.abs(clean) > result.critical, axis=1)) == pytest.approx(0.05, abs=0.007)


def test_clean_nights_with_shared_errors_alarm_as_rarely_as_was_asked() -> None:
    # Whole nights drawn from their named errors and judged: neighbours share a transfer, all a density.
    rng = np.random.default_rng(7)
    flagged = 0
    for _ in range(1000):
        draw: dict[str, float] = {}

        def true(value: float, draw: dict[str, float] = draw, **parts: float) -> Estimate:
            for name in parts:
                draw.setdefault(name, rng.standard_normal())
            return Estimate(value + sum(part * draw[name] for name, part in parts.items()), parts)

        opening: dict[str, Estimate | None] = {name: true(500.0, rho=2.0, **{f"o{name}": 1.0}) for name in "abc"}
        closing: dict[str, Estimate | None] = {
            "a": true(400.0, rho=1.6, ca=1.0), "b": true(600.0, rho=2.4, cb=1.0), "c": true(500.0, rho=2.0, cc=1.0)
        }  # fmt: skip
        moved = Movement("m", "a", "b", true(100.0, meter=1.0))
        flagged += any(row.flagged for row in night(opening, closing, [moved], ALARM).rows)
    assert flagged / 1000 == pytest.approx(0.05, abs=0.022)  # 3.2 sd


def test_a_group_is_tested_by_the_inverse_of_its_covariance() -> None:
    opening: dict[str, Estimate | None] = {
        "a": Estimate(100.0, {"x": 2.0, "s": 1.0}), "b": Estimate(200.0, {"y": 3.0, "s": -1.0}),
        "c": Estimate(300.0, {"z": 1.0, "s": 2.0}), "d": Estimate(5.0, {"w": 2.0}),
    }  # fmt: skip
    closing: dict[str, Estimate | None] = {
        "a": Estimate(60.0, {"s": 0.5}), "b": Estimate(240.0), "c": Estimate(291.0), "d": Estimate(1.0)
    }  # fmt: skip
    moves = [Movement("ab", "a", "b", Estimate(41.0, {"m": 1.5})), Movement("bc", "b", "c", Estimate(3.0, {"n": 0.5}))]
    result = night(opening, closing, moves, ALARM)
    groups = {group.members: group for group in result.groups}
    assert set(groups) == {("a", "b", "c"), ("d",)}
    # a: 60 − 100 + 41 = 1; b: 240 − 200 − 41 + 3 = 2; c: 291 − 300 − 3 = −12. Columns: x y z s m n.
    residual = np.array([1.0, 2.0, -12.0])
    parts = np.array([[-2, 0, 0, -0.5, 1.5, 0], [0, -3, 0, 1, -1.5, 0.5], [0, 0, -1, -2, 0, -0.5]])
    expected = float(residual @ np.linalg.inv(parts @ parts.T) @ residual)
    group = groups[("a", "b", "c")]
    assert group.statistic == pytest.approx(expected, rel=1e-10)
    assert group.degrees_of_freedom == 3
    # Survival function of chi-squared with 3 degrees, in closed form.
    tail = math.erfc(math.sqrt(expected / 2.0)) + math.sqrt(2.0 * expected / math.pi) * math.exp(-expected / 2.0)
    assert group.p_value == pytest.approx(tail, rel=1e-9)
    assert groups[("d",)].statistic == pytest.approx(4.0)  # (−4/2)²


def test_a_group_whose_rows_say_the_same_counts_it_once() -> None:
    # All uncertainty is the transfer's: the two rows are one measurement.
    opening: dict[str, Estimate | None] = {"a": Estimate(10.0), "b": Estimate(10.0)}
    closing: dict[str, Estimate | None] = {"a": Estimate(4.0), "b": Estimate(16.0)}
    result = night(opening, closing, [Movement("m", "a", "b", Estimate(5.0, {"t": 0.5}))], ALARM)
    (group,) = result.groups
    assert group.degrees_of_freedom == 1
    assert group.statistic == pytest.approx(4.0)  # (1/0.5)², not twice


def test_balances_without_any_uncertainty_give_no_statistic_and_no_error() -> None:
    result = one(Estimate(10.0), Estimate(10.0))
    assert (result.rows[0].score, result.rows[0].flagged) == (0.0, False)
    assert math.isnan(result.groups[0].statistic)
    off = one(Estimate(10.0), Estimate(9.0))
    assert (off.rows[0].score, off.rows[0].flagged) == (-math.inf, True)


def test_vessels_between_which_nothing_was_measured_are_judged_as_one() -> None:
    opening: dict[str, Estimate | None] = {name: Estimate(100.0, {name: 1.0}) for name in "abc"}
    closing: dict[str, Estimate | None] = {"a": Estimate(70.0), "b": Estimate(129.0), "c": Estimate(100.0)}
    moves = [Movement("u", "a", "b", None), Movement("m", "c", None, Estimate(2.0, {"m": 1.0}))]
    result = night(opening, closing, moves, ALARM)
    rows = {row.members: row for row in result.rows}
    assert rows[("a", "b")].imbalance.value == -1.0  # 199 of 200
    assert rows[("a", "b")].imbalance.uncertainty == pytest.approx(math.sqrt(2.0))
    assert rows[("c",)].imbalance.value == 2.0
    assert result.critical == pytest.approx(critical_score(2, ALARM))
    # What is measured inside of a merged pair cancels out of its balance, and nothing can test it.
    inside = night(opening, closing, [*moves, Movement("i", "b", "a", Estimate(50.0, {"i": 9.0}))], ALARM)
    assert next(row for row in inside.rows if row.members == ("a", "b")).imbalance.value == -1.0
    assert inside.observability["i"] == "nonredundant"


def test_what_was_not_measured_to_the_outside_leaves_no_balance() -> None:
    opening: dict[str, Estimate | None] = {"a": Estimate(1.0), "b": Estimate(1.0), "c": Estimate(1.0, {"c": 1.0})}
    closing: dict[str, Estimate | None] = {"a": Estimate(1.0), "b": None, "c": Estimate(1.0)}
    result = night(opening, closing, [Movement("u", "a", None, None)], ALARM)
    assert result.without == ("a", "b")
    assert [row.members for row in result.rows] == [("c",)]
    assert result.observability["u"] == "observable"
    lost = night(opening, closing, [Movement("u", "a", None, None), Movement("w", None, "a", None)], ALARM)
    assert lost.observability == {"u": "unobservable", "w": "unobservable"}


def test_a_vessel_that_appears_without_an_opening_has_no_balance() -> None:
    result = night({}, {"a": Estimate(1.0)}, (), ALARM)
    assert result.without == ("a",)
    assert result.rows == ()


def test_limits_name_the_largest_errors_with_what_could_be_seen_without_them() -> None:
    (row,) = one(Estimate(0.0, {"level:x": 3.0, "r:x": 4.0, "density:y": 12.0}), Estimate(0.0, {"z": 84.0})).rows
    found = limits(row, 2.0, lambda name: "gauge x" if name.endswith(":x") else name)
    reach = 2.0 + 1.644854
    # 3² + 4² + 12² = 13²; 13² + 84² = 85².
    assert [name for name, _ in found] == ["z", "density:y", "gauge x"]
    assert [value for _, value in found] == pytest.approx(
        [reach * 13.0, reach * math.sqrt(85.0**2 - 144.0), reach * math.sqrt(85.0**2 - 25.0)], rel=1e-6
    )
    assert limits(row, 2.0, str, count=1)[0][0] == "z"


def random_network(
    rng: np.random.Generator,
) -> tuple[dict[str, Estimate | None], dict[str, Estimate | None], list[Movement]]:
    names = [f"n{i}" for i in range(int(rng.integers(2, 7)))]
    ends: list[str | None] = [None, *names]
    moves = []
    for index in range(int(rng.integers(1, 10))):
        source, target = rng.choice(len(ends), size=2, replace=False)
        mass = None if rng.random() < 0.45 else Estimate(1.0, {f"m{index}": 1.0})
        moves.append(Movement(f"t{index}", ends[source], ends[target], mass))
    opening: dict[str, Estimate | None] = {name: Estimate(1.0, {name: 1.0}) for name in names}
    closing: dict[str, Estimate | None] = {
        name: None if rng.random() < 0.2 else Estimate(1.0, {f"c{name}": 1.0}) for name in names
    }
    return opening, closing, moves


def by_algebra(closing: dict[str, Estimate | None], moves: list[Movement]) -> tuple[dict[str, str], int]:
    """Each movement's class from the null space of the unmeasured columns, and the independent balances.

    Crowe, Garcia Campos and Hrymak (1983), AIChE J. 29, 881: multiply the balances by P with P·Au = 0. A
    measured stream is redundant if its projected column is not zero; an unmeasured one is observable if
    its unit vector lies in the row space of Au.
    """
    names = sorted(closing)
    place = {name: row for row, name in enumerate(names)}

    def column(source: str | None, target: str | None) -> np.ndarray:
        made = np.zeros(len(names))
        if source is not None:
            made[place[source]] += 1.0
        if target is not None:
            made[place[target]] -= 1.0
        return made

    unmeasured = [column(m.source, m.target) for m in moves if m.mass is None]
    unknown_stock = [column(None, name) for name in names if closing[name] is None]
    unknown = np.array([*unmeasured, *unknown_stock]).T.reshape(len(names), -1)
    left, sizes, right = np.linalg.svd(unknown, full_matrices=True)
    rank = int(np.sum(sizes > 1e-9))
    project = left[:, rank:].T
    found: dict[str, str] = {}
    position = itertools.count()
    for m in moves:
        if m.mass is not None:
            seen = np.linalg.norm(project @ column(m.source, m.target)) > 1e-9
            found[m.name] = "redundant" if seen else "nonredundant"
        else:
            loose = np.linalg.norm(right[rank:, next(position)]) > 1e-9
            found[m.name] = "unobservable" if loose else "observable"
    return found, len(names) - rank


def test_observability_by_graph_agrees_with_the_null_space_on_random_networks() -> None:
    # Mah, Stanley and Downing (1976), Ind. Eng. Chem. Process Des. Dev. 15, 175.
    rng = np.random.default_rng(31)
    classes: set[str] = set()
    for _ in range(400):
        opening, closing, moves = random_network(rng)
        result = night(opening, closing, moves, ALARM)
        expected, balances = by_algebra(closing, moves)
        assert dict(result.observability) == expected
        assert len(result.rows) == balances
        classes |= set(expected.values())
    assert classes == {"redundant", "nonredundant", "observable", "unobservable"}


@pytest.mark.parametrize("seed", range(3))
def test_many_rows_are_tested_sparsely_as_few_are_with_their_whole_covariance(
    seed: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    rng = np.random.default_rng(seed)
    names = [f"v{number:02}" for number in range(30)]

    def held(number: int, when: str) -> Estimate:
        parts = {f"r:{number}:{when}": 3.0, f"level:{number}": 2.0, f"density:{number % 4}": float(rng.normal(4, 1))}
        return Estimate(1000.0 + float(rng.normal(0, 8)), parts)

    opening: dict[str, Estimate | None] = {name: held(number, "o") for number, name in enumerate(names)}
    closing: dict[str, Estimate | None] = {name: held(number, "c") for number, name in enumerate(names)}
    movements = [
        Movement(f"m{at}", names[at % 30], names[(at + 1 + at % 7) % 30], moved)
        for at in range(60)
        for moved in (Estimate(5.0, {f"t:{at}": 1.0, f"meter:{at % 9}": 2.0}),)
    ]
    result = night(opening, closing, movements, ALARM)
    rows = [one.imbalance for one in result.rows]
    errors = sorted({name for one in rows for name in one.parts})
    parts = np.array([[one.parts.get(name, 0.0) for name in errors] for one in rows])
    residual = np.array([one.value for one in rows])
    expected = float(residual @ np.linalg.solve(parts @ parts.T, residual))
    monkeypatch.setattr(importlib.import_module("models.balance.night"), "DENSE_ROWS", 1)
    sparse = night(opening, closing, movements, ALARM)
    for group in (*result.groups, *sparse.groups):
        assert group.degrees_of_freedom == 30
        assert group.statistic == pytest.approx(expected, rel=1e-6)


def test_a_vessel_whose_one_reading_stands_at_both_ends_does_not_silence_its_group() -> None:
    carried = Estimate(10.0, {"r:1:level": 2.0})
    opening: dict[str, Estimate | None] = {"a": carried, "b": Estimate(10.0, {"r:2": 3.0})}
    closing: dict[str, Estimate | None] = {"a": carried, "b": Estimate(4.0, {"r:3": 4.0})}
    result = night(opening, closing, [Movement("m", "a", "b", Estimate(0.0))], ALARM)
    (group,) = result.groups
    assert (group.members, group.degrees_of_freedom) == (("a", "b"), 1)
    assert group.statistic == pytest.approx((6.0 / 5.0) ** 2)
