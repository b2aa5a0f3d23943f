"""Shares, sizes and equivalents of explanations, each held against integrals, draws and arithmetic."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.sparse import csc_array
from scipy.stats import norm

from models.arrays import FloatArray
from models.balance.evidence import Evidence, Search, weigh
from models.balance.faults import candidates
from models.balance.naming import _alike, _leaders, detectable, mixture_quantiles, name, shares, widths
from models.balance.rows import Rows, assemble
from models.balance.signatures import DUPLICATED, KINDS, LEVEL, LOSS, UNRECORDED, Candidates
from models.balance.window import Part, Stock, Window
from models.estimate import Estimate


def made(kind: list[int], fixed: list[bool], scale: list[float], prior: list[float] | None = None) -> Candidates:
    count = len(kind)
    whole = np.arange(count, dtype=np.intp)
    subjects = [(f"s{at}",) for at in range(count)]
    return Candidates(
        csc_array(np.eye(count)), np.array(kind, dtype=np.intp), whole, np.ones(count, dtype=np.intp), np.array(fixed),
        np.array(scale), np.ones(count), np.ones(count), np.ones(count) if prior is None else np.array(prior), subjects,
    )  # fmt: skip


def test_a_free_sizes_likelihood_is_the_integral_over_its_prior() -> None:
    num, q, scale = np.array([3.0]), np.array([0.5]), np.array([2.0])
    log, taken = widths(num, q, scale)

    def ratio(a: float) -> float:  # of the chance of what was seen with a size a, to that without a fault
        return float(np.exp(num[0] * a - 0.5 * q[0] * a * a))

    for at, times in enumerate((0.5, 2.0, 8.0, 32.0)):
        sd = times * scale[0]
        whole = quad(lambda a, sd=sd: ratio(a) * norm.pdf(a, 0.0, sd), -80.0, 80.0, points=[6.0], limit=400)[0]
        assert log[0, at] == pytest.approx(np.log(whole), abs=1e-7)
        mean = quad(lambda a, sd=sd: a * ratio(a) * norm.pdf(a, 0.0, sd), -80.0, 80.0, points=[6.0], limit=400)[0]
        assert num[0] / q[0] * taken[0, at] == pytest.approx(mean / whole, rel=1e-6)


def test_shares_weigh_evidence_by_the_number_of_a_kind_and_its_prior() -> None:
    kinds, fixed = [LOSS, LEVEL, LEVEL, DUPLICATED], [False, False, False, True]
    found = made(kinds, fixed, [2.0] * 4)
    num, q = np.array([3.0, 3.0, 0.0, 2.5]), np.array([0.5, 0.5, 0.5, 1.0])
    free = float(np.mean(np.exp(widths(num[:1], q[:1], np.array([2.0]))[0])))
    idle = float(np.mean(np.exp(widths(np.zeros(1), q[:1], np.array([2.0]))[0])))
    weight = np.array([free, free / 2.0, idle / 2.0, 0.3 * np.exp(2.5 - 0.5)])
    assert shares(found, num, q) == pytest.approx(weight / weight.sum(), rel=1e-9)
    twin = made(kinds, fixed, [2.0] * 4, [1.0, 1.0, 1.0, 50.0])
    weight[3] *= 50.0
    assert shares(twin, num, q) == pytest.approx(weight / weight.sum(), rel=1e-9)


def test_quantiles_of_a_mixture_are_those_of_draws_from_it() -> None:
    weight, mean, sd = np.array([2.0, 1.0, 1.0]), np.array([0.0, 4.0, 5.0]), np.array([1.0, 0.5, 0.0])
    rng = np.random.default_rng(3)
    which = rng.choice(3, 400_000, p=weight / weight.sum())
    drawn = rng.normal(mean[which], sd[which])
    chances = (0.025, 0.3, 0.6, 0.9)
    found = mixture_quantiles(weight, mean, sd, chances)
    assert found == pytest.approx(np.quantile(drawn, chances), abs=0.02)
    low, middle, high = mixture_quantiles(np.ones(1), np.array([10.0]), np.array([2.0]))
    assert (low, middle, high) == pytest.approx((10 - 1.959964 * 2, 10.0, 10 + 1.959964 * 2), abs=1e-5)
    assert mixture_quantiles(np.ones(2), np.array([7.0, 7.0]), np.zeros(2)) == (7.0, 7.0, 7.0)


def signal(kind_of: dict[str, FloatArray], nights: int = 6) -> tuple[Rows, Candidates, Search]:
    """Two tanks whose readings are known to 50 kg, one of them changed at some closes."""
    stocks = []
    for vessel in ("a", "b"):
        for close in range(nights + 1):
            mass = 1e5 + kind_of.get(vessel, np.zeros(nights + 1))[close]
            parts = {f"r:{vessel}:{close}": 50.0}
            slopes = {"level": 1e5, "density": 100.0}
            stocks.append(Stock(vessel, close, Estimate(mass, parts), slopes, (f"sample:{vessel}",), per_mm=100.0))
    rows = assemble(Part(("a", "b"), Window((1.0,) * nights, stocks, [])))
    found = candidates(rows)
    weighed = weigh(rows, found.columns, [nights])
    return rows, found, Search(rows, found.columns, Evidence(weighed.num[0], weighed.q[0]))


def test_a_step_is_a_loss_or_a_gauge_or_a_movement_alike_and_its_size_and_onset_are_found() -> None:
    _, found, search = signal({"a": np.array([0, 0, 0, 0, -1000.0, -1000.0, -1000.0])})
    suspects = name(found, search)
    by_label = {(one.kind, one.subject): one for one in suspects}
    assert {"vessel_loss", "level_bias", "unrecorded_transfer"} <= {one.kind for one in suspects}
    loss, gauge = by_label["vessel_loss", ("a",)], by_label["level_bias", ("a",)]
    assert loss.onset == gauge.onset == 4
    assert loss.magnitude == pytest.approx(1000.0, rel=0.03)
    assert loss.interval[0] < 1000.0 < loss.interval[1]
    assert loss.mass == pytest.approx(loss.magnitude)
    assert (loss.unit, gauge.unit) == ("kg", "mm")
    assert gauge.magnitude == pytest.approx(-10.0, rel=0.03)  # mm: 1000 kg of 100 kg a millimetre
    assert gauge.mass == pytest.approx(-1000.0, rel=0.03)
    assert ("level_bias", ("a",)) in loss.equivalent_to
    assert ("vessel_loss", ("a",)) in gauge.equivalent_to
    assert ("vessel_loss", ("a",)) not in loss.equivalent_to
    left = by_label["unrecorded_transfer", ("a", "")]
    assert left.magnitude == pytest.approx(1000.0, rel=0.03)
    shares_found = [one.share for one in suspects]
    assert shares_found == sorted(shares_found, reverse=True)
    assert 0.95 <= sum(shares_found) <= 1.0 + 1e-12
    assert sum(shares_found[:-1]) < 0.95
    assert all(one.kind in KINDS for one in suspects)


def test_an_unrecorded_transfer_is_named_from_where_it_left() -> None:
    step = np.array([0, 0, 0, 0, 1000.0, 1000.0, 1000.0])
    _, found, search = signal({"a": step, "b": -step})
    first = name(found, search)[0]
    assert (first.kind, first.subject) == ("unrecorded_transfer", ("b", "a"))
    assert first.magnitude == pytest.approx(1000.0, rel=0.03)
    assert first.interval[0] < 1000.0 < first.interval[1]
    assert first.equivalent_to == ()
    assert found.kind[first.column] == UNRECORDED


def test_what_the_window_tells_apart_is_not_called_alike() -> None:
    _, found, search = signal({"a": np.array([0, 0, 0, 0, -1000.0, 0, 0])})
    first = name(found, search)[0]
    assert (first.kind, first.subject, first.onset) == ("bad_stock_take", ("a",), 4)
    assert first.magnitude == pytest.approx(-1000.0, rel=0.03)
    assert first.share > 0.95


def test_an_interval_covers_sizes_drawn_as_the_prior_says() -> None:
    rng, inside, drawn = np.random.default_rng(7), 0, 200
    for _ in range(drawn):
        size = float(rng.normal(0.0, 2000.0))
        noise = rng.normal(0.0, 50.0, 7)
        steps = noise - size * (np.arange(7) >= 4)
        _, found, search = signal({"a": steps})
        losses = [one for one in name(found, search) if (one.kind, one.subject) == ("vessel_loss", ("a",))]
        inside += 1 if not losses else losses[0].interval[0] <= size <= losses[0].interval[1]
    assert 0.91 <= inside / drawn <= 0.99


def test_what_is_detectable() -> None:
    assert detectable(3.0, np.array([4.0])) == pytest.approx([(3.0 + 1.644854) / 2.0], rel=1e-6)


@pytest.mark.parametrize(("first", "count"), [(0.946, 2), (0.954, 1)])
def test_explanations_are_named_until_they_have_95_per_cent(first: float, count: int) -> None:
    found = made([LOSS, LEVEL, LEVEL], [False] * 3, [1.0] * 3)
    total, columns = _leaders(found, np.array([first, 0.9 * (1.0 - first), 0.1 * (1.0 - first)]))
    assert [own.tolist() for own in columns] == [[0], [1]][:count]
    assert total[0] == first


def test_a_gap_below_chi_square_at_95_per_cent_tells_nothing_apart() -> None:
    """3.841 is the 95 % point of chi-square with one degree of freedom."""
    angle = np.arcsin(np.sqrt(0.1))
    white = np.array([[1.0, 0.0], [np.cos(angle), np.sin(angle)]])
    assert _alike(np.array([38.2, 38.6]), white).tolist() == [[False, True], [False, False]]
