"""A window's balances: their law, their merging, and that a shorter window is the beginning of a longer one."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import chi2, kstest

from models.balance.rows import BEYOND, assemble
from models.balance.window import Check, Part, Stock, Ticket, Window
from models.errors import ModelError
from models.estimate import Estimate
from tests.models.balance.drawn_window import draw


def whole(window: Window) -> Part:
    return Part(tuple(sorted({stock.vessel for stock in window.stocks})), window)


def until(window: Window, night: int) -> Window:
    return Window(
        window.days[:night],
        [stock for stock in window.stocks if stock.close <= night],
        [ticket for ticket in window.tickets if ticket.night <= night],
        [check for check in window.checks if check.night <= night],
    )


def test_under_no_fault_what_is_whitened_is_standard_normal_noise() -> None:
    rng = np.random.default_rng(20260314)
    drawn = np.array([assemble(whole(draw(rng))).white for _ in range(2000)])
    assert drawn.shape == (2000, 18)
    assert kstest(drawn.ravel(), "norm").pvalue > 0.01
    assert kstest(np.sum(drawn**2, axis=1), chi2(18).cdf).pvalue > 0.01
    spread = np.corrcoef(drawn.T)
    assert np.max(np.abs(spread - np.eye(18))) < 5.0 / np.sqrt(2000)


def test_residuals_and_their_covariance_are_those_of_the_incidence_matrix_and_the_errors_as_unknowns() -> None:
    """Independent route: A, D and B written out, with the latent errors as explicit columns."""
    window = draw(np.random.default_rng(5), vessels=3, nights=4)
    rows = assemble(whole(window))
    values = [stock.mass for stock in window.stocks] + [ticket.mass for ticket in window.tickets]
    names = sorted({name for value in values if value for name in value.parts})
    incidence = np.zeros((12, len(values)))
    for j, stock in enumerate(window.stocks):
        v = int(stock.vessel[3:])
        if stock.close > 0:
            incidence[rows.row_of[v, stock.close - 1], j] = 1.0
        if stock.close < 4:
            incidence[rows.row_of[v, stock.close], j] = -1.0
    for j, ticket in enumerate(window.tickets, len(window.stocks)):
        for end, sign in ((ticket.target, -1.0), (ticket.source, 1.0)):
            if end is not None:
                incidence[rows.row_of[int(end[3:]), ticket.night - 1], j] = sign
    parts = np.array([[value.parts.get(name, 0.0) for name in names] for value in values if value])
    assert rows.residual == pytest.approx(incidence @ [value.value for value in values if value], abs=1e-6)
    covariance = incidence @ parts @ parts.T @ incidence.T + np.eye(12)
    assert np.max(np.abs(rows.lower @ rows.lower.T / covariance.max() - covariance / covariance.max())) < 1e-12
    assert rows.night_of.tolist() == [1, 1, 1, 2, 2, 2, 3, 3, 3, 4, 4, 4]


@pytest.mark.parametrize("night", [1, 3, 5])
def test_a_shorter_window_is_the_beginning_of_a_longer_one(night: int) -> None:
    window = holed(draw(np.random.default_rng(8)))
    longer, shorter = assemble(whole(window)), assemble(whole(until(window, night)))
    count = longer.ends[night]
    assert len(shorter.white) == count
    assert shorter.white == pytest.approx(longer.white[:count], abs=1e-9)


def holed(window: Window) -> Window:
    """Two inventories missing, one movement unmetered."""
    stocks = [
        replace(stock, mass=None) if (stock.vessel, stock.close) in {("tk-0", 2), ("tk-1", 4)} else stock
        for stock in window.stocks
    ]
    tickets = [
        replace(ticket, mass=None) if ticket.name in {"t-2-0", "t-5-1"} else ticket for ticket in window.tickets
    ]
    return replace(window, stocks=stocks, tickets=tickets)


@pytest.mark.parametrize("seed", range(6))
def test_merging_is_the_limit_of_unknown_values_with_a_wide_prior(seed: int) -> None:
    """Independent route: an unknown value is eliminated by projecting the rows on what its column leaves."""
    rng = np.random.default_rng(seed)
    window = draw(rng, vessels=3, nights=4)
    stocks = [replace(s, mass=None) if rng.random() < 0.15 else s for s in window.stocks]
    tickets = [replace(t, mass=None) if rng.random() < 0.15 else t for t in window.tickets]
    merged = assemble(whole(replace(window, stocks=stocks, tickets=tickets)))
    known = assemble(whole(window))
    unknown = []
    for stock, left in zip(window.stocks, stocks, strict=True):
        if left.mass is None:
            column = np.zeros(12)
            if stock.close > 0:
                column[known.row_of[int(stock.vessel[3:]), stock.close - 1]] += 1.0
            if stock.close < 4:
                column[known.row_of[int(stock.vessel[3:]), stock.close]] -= 1.0
            unknown.append(column)
    for ticket, other in zip(window.tickets, tickets, strict=True):
        if other.mass is None:
            column = np.zeros(12)
            for end, sign in ((ticket.target, -1.0), (ticket.source, 1.0)):
                if end is not None:
                    column[known.row_of[int(end[3:]), ticket.night - 1]] += sign
            unknown.append(column)
    basis = np.linalg.svd(np.array(unknown).T)[0][:, np.linalg.matrix_rank(np.array(unknown)) :]
    covariance = known.lower @ known.lower.T
    projected = basis.T @ known.residual
    statistic = projected @ np.linalg.solve(basis.T @ covariance @ basis, projected)
    assert len(merged.white) == basis.shape[1]
    assert merged.white @ merged.white == pytest.approx(statistic, rel=1e-3)  # the 1 kg² of each row is not the same


def one(vessel: str, close: int, mass: float | None, u: float = 100.0) -> Stock:
    estimate = None if mass is None else Estimate(mass, {f"{vessel}:{close}": u})
    return Stock(vessel, close, estimate, {})


def test_what_is_not_measured_merges_rows_or_drops_them() -> None:
    stocks = [one("a", 0, None), one("a", 1, 10.0), one("a", 2, None), one("a", 3, 12.0), one("a", 4, None)]
    rows = assemble(Part(("a",), Window((1.0,) * 4, stocks, [Ticket("t", 2, None, "a", Estimate(1.5))])))
    assert rows.row_of.tolist() == [[BEYOND, 0, 0, BEYOND]]
    assert rows.residual.tolist() == [0.5]
    assert rows.night_of.tolist() == [3]
    assert rows.uncertainty() == pytest.approx([100.0 * 2.0**0.5])


def test_a_close_that_a_definition_changed_closes_one_night_and_opens_the_next_by_its_two_masses() -> None:
    both = replace(one("a", 1, 100.0), reopened=Estimate(130.0, {"a:1": 100.0, "capacity:new": 5.0}))
    rows = assemble(Part(("a",), Window((1.0, 1.0), [one("a", 0, 100.0), both, one("a", 2, 131.0)], [])))
    assert rows.residual.tolist() == [0.0, 1.0]
    assert rows.uncertainty()[1] == pytest.approx((2 * 100.0**2 + 25.0) ** 0.5)
    only = replace(both, mass=None)  # the old definition knows none
    assert assemble(Part(("a",), Window((1.0,), [one("a", 0, 100.0), only], []))).residual.tolist() == [30.0]


def test_a_split_movement_shares_its_latent_error_with_both_nights() -> None:
    first = Ticket("t", 1, None, "a", Estimate(40.0, {"split:t": 9.0}))
    second = Ticket("t", 2, None, "a", Estimate(60.0, {"split:t": -9.0}))
    stocks = [one("a", 0, 0.0, 1.0), one("a", 1, 40.0, 1.0), one("a", 2, 100.0, 1.0)]
    rows = assemble(Part(("a",), Window((1.0, 1.0), stocks, [first, second])))
    covariance = rows.lower @ rows.lower.T
    assert covariance == pytest.approx(np.array([[84.0, -82.0], [-82.0, 84.0]]))  # by hand: 1 + 1 + 81 + floor


def test_a_check_is_a_row_that_knows_the_error_it_shares_with_the_stock() -> None:
    stock = Stock("a", 0, Estimate(100.0, {"level:a": 3.0}), {"level": 1000.0})
    later = Stock("a", 1, Estimate(100.0, {"level:a": 5.0, "r": 1.0}), {"level": 1000.0})
    check = Check("a", 1, Estimate(7.0, {"level:a": 3.0, "dip": 2.0}), "level", 1000.0)
    rows = assemble(Part(("a",), Window((1.0,), [stock, later], [], [check])))
    assert rows.residual.tolist() == [0.0, 7.0]
    assert rows.check_rows.tolist() == [1]
    assert rows.lower @ rows.lower.T == pytest.approx(np.array([[4 + 1 + 1, 6.0], [6.0, 9 + 4 + 1]]))


def test_two_stocks_of_a_vessel_at_one_close_are_refused() -> None:
    with pytest.raises(ModelError, match="two stocks at one close"):
        assemble(Part(("a",), Window((1.0,), [one("a", 0, 1.0), one("a", 0, 2.0)], [])))


def test_a_group_without_rows_has_none() -> None:
    assert assemble(Part(("a",), Window((1.0,), [one("a", 0, 1.0)], []))).white.shape == (0,)
