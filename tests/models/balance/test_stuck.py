"""A gauge that stands still while tickets move mass is found by rule, and its last reading put right."""

from __future__ import annotations

from dataclasses import replace

import pytest

from models.balance.judge import judge
from models.balance.window import Stock, Ticket, Window
from models.estimate import Estimate


def window(still: set[int], held: float, moved: float = 2000.0) -> Window:
    """A tank that gains 2000 kg a night; at the closes of ``still`` its gauge shows what it showed before."""
    stocks = []
    for close in range(6):
        mass = held if close in still else 10_000.0 + moved * close
        parts = {f"r:{close}": 100.0, "table": 0.001 * mass}
        stocks.append(Stock("a", close, Estimate(mass, parts), {"level": 1e5}, per_mm=100.0, still=close in still))
    tickets = [Ticket(f"t{k}", k, None, "a", Estimate(moved, {f"t:{k}": 2.0})) for k in range(1, 6)]
    return Window((1.0,) * 5, stocks, tickets)


def test_a_gauge_that_is_stuck_tonight_is_flagged_with_what_it_hides() -> None:
    judged = judge(window({4, 5}, 16_000.0))
    (signal,) = judged.groups[0].signals
    (suspect,) = signal.suspects
    assert (suspect.kind, suspect.subject, suspect.onset) == ("level_stuck", ("a",), 4)
    assert not signal.standing
    assert judged.flagged
    assert judged.vessels[0].flagged
    assert suspect.magnitude == pytest.approx(4000.0, abs=60.0)  # 20 000 kg in truth, 16 000 kg reported
    assert suspect.interval[0] < 4000.0 < suspect.interval[1]
    half = 1.959964 * suspect.magnitude / suspect.statistic**0.5  # 97.5 % of the normal law
    assert suspect.interval[1] - suspect.magnitude == pytest.approx(half, rel=1e-4)
    assert judged.groups[0].stocks[0].mass == pytest.approx(20_000.0, abs=60.0)
    assert judged.vessels[0].detectable is None  # no reading, no loss seen


def test_a_gauge_that_moves_again_stands_and_is_not_flagged() -> None:
    judged = judge(window({2, 3}, 12_000.0))
    (signal,) = judged.groups[0].signals
    assert signal.standing
    assert (signal.suspects[0].kind, signal.suspects[0].onset) == ("level_stuck", 2)
    assert not judged.flagged


@pytest.mark.parametrize("moved", [0.0, 845.0])
def test_a_level_that_rests_while_little_moves_is_not_stuck(moved: float) -> None:
    """Six times the imbalance's uncertainty, 100 √2 kg and 2 kg of the ticket, is 848.6 kg."""
    still = window({5}, 10_000.0 + 5 * moved, moved)
    assert not judge(still).groups[0].signals
    fresh = replace(still, stocks=[replace(stock, still=False) for stock in still.stocks])
    assert not judge(fresh).groups[0].signals


def test_just_above_six_uncertainties_it_is() -> None:
    (signal,) = judge(window({5}, 10_000.0 + 4 * 852.0, 852.0)).groups[0].signals
    assert signal.suspects[0].kind == "level_stuck"
    (other,) = judge(window({5}, 10_000.0 + 4 * 845.0, 845.0)).groups[0].signals
    assert other.suspects[0].kind != "level_stuck"  # seen all the same, by the balances
