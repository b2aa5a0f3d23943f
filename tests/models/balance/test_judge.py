"""The last night judged: quiet sites stay quiet, what is planted is found, and groups do not disturb each other."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import chi2

from models.balance.judge import judge, leading
from models.balance.judged import GroupJudged, Judgement, Settings
from models.balance.rows import assemble
from models.balance.window import Stock, Ticket, Window, split
from models.estimate import Estimate
from tests.models.balance.drawn_window import draw

NIGHTS = 8


def drawn(seed: int, nights: int = NIGHTS) -> Window:
    return draw(np.random.default_rng(seed), 3, nights, 4)


def shifted(window: Window, change: Callable[[Stock], float]) -> Window:
    def moved(stock: Stock) -> Stock:
        assert stock.mass is not None
        return replace(stock, mass=Estimate(stock.mass.value + change(stock), stock.mass.parts))

    return replace(window, stocks=[moved(stock) for stock in window.stocks])


def lost(window: Window, mass: float, night: int, vessel: str = "tk-1") -> Window:
    return shifted(window, lambda s: -mass if s.vessel == vessel and s.close >= night else 0.0)


def renamed(window: Window, prefix: str) -> Window:
    stocks = [replace(stock, vessel=prefix + stock.vessel) for stock in window.stocks]
    tickets = [
        replace(
            one, name=prefix + one.name, source=one.source and prefix + one.source,
            target=one.target and prefix + one.target,
        )
        for one in window.tickets
    ]  # fmt: skip
    return replace(window, stocks=stocks, tickets=tickets)


def test_a_quiet_site_is_flagged_as_seldom_as_was_asked() -> None:
    """100 nights at 3 a month: 7.9 expected of signatures and 2 of sums, if the thresholds were exact."""
    flagged = sum(judge(drawn(seed), Settings(false_alarms_per_month=3.0)).flagged for seed in range(100))
    assert 1 <= flagged <= 19


def test_a_loss_is_flagged_named_and_sized_and_its_vessel_with_it() -> None:
    judged = judge(lost(drawn(4), 9000.0, NIGHTS))
    (group,) = judged.groups
    signal = group.signals[0]
    assert not signal.standing
    assert judged.flagged
    loss = next(one for one in signal.suspects if (one.kind, one.subject) == ("vessel_loss", ("tk-1",)))
    assert loss.interval[0] < 9000.0 < loss.interval[1]
    assert loss.onset == NIGHTS
    vessel = judged.vessels[1]
    assert vessel.vessel == "tk-1"
    assert vessel.flagged
    assert vessel.score is not None
    assert vessel.imbalance is not None
    assert vessel.uncertainty is not None
    assert vessel.score == pytest.approx(vessel.imbalance / vessel.uncertainty)
    assert vessel.detectable is not None
    assert 1000.0 < vessel.detectable < 9000.0
    assert group.residual_p_value > 1e-3 > group.p_value
    assert {one.kind for one in leading(signal)} >= {"vessel_loss", "level_bias"}
    assert leading(signal)[0] == signal.suspects[0]


def test_a_fault_of_old_stands_and_is_not_flagged_again() -> None:
    judged = judge(lost(drawn(4, 14), 9000.0, 4))
    signals = judged.groups[0].signals
    assert [signal.standing for signal in signals] == [True]
    assert not judged.flagged
    assert not any(vessel.flagged for vessel in judged.vessels)
    suspect = next(one for one in signals[0].suspects if one.kind == "vessel_loss")
    assert suspect.onset == 4


def test_two_faults_are_sized_beside_each_other() -> None:
    window = lost(lost(drawn(6), 12000.0, NIGHTS), 15000.0, NIGHTS - 1, "tk-0")
    signals = judge(window).groups[0].signals
    assert len(signals) == 2
    found = {one.subject: one for signal in signals for one in signal.suspects if one.kind == "vessel_loss"}
    for vessel, size in (("tk-1", 12000.0), ("tk-0", 15000.0)):
        assert found[vessel,].interval[0] < size < found[vessel,].interval[1]


def test_what_is_detectable_is_flagged_that_night() -> None:
    rng = np.random.default_rng(1)
    hits = 0
    for seed in range(60):
        window = drawn(seed)
        vessel = f"tk-{rng.integers(3)}"
        size = next(one.detectable for one in judge(window).vessels if one.vessel == vessel)
        assert size is not None
        hits += judge(lost(window, size, NIGHTS, vessel)).flagged
    assert hits >= 53  # of 60 at 95 %: fewer has a chance of one in a thousand


def essence(group: GroupJudged) -> list[float]:
    numbers = [group.statistic, group.p_value, group.residual_p_value]
    for signal in group.signals:
        for one in signal.suspects:
            numbers += [one.magnitude, *one.interval, one.mass, one.statistic, one.share]
    return numbers + [x for one in (*group.stocks, *group.movements) for x in (one.mass, one.uncertainty)]


def test_a_groups_answer_does_not_change_when_another_group_is_added() -> None:
    window, other = lost(drawn(4), 9000.0, NIGHTS), renamed(drawn(5), "x-")
    both = Window(window.days, [*window.stocks, *other.stocks], [*window.tickets, *other.tickets])
    alone, beside = judge(window), judge(both)
    assert [group.members for group in beside.groups] == [("tk-0", "tk-1", "tk-2"), ("x-tk-0", "x-tk-1", "x-tk-2")]
    assert essence(beside.groups[0]) == pytest.approx(essence(alone.groups[0]), rel=1e-9)
    assert beside.groups[0].critical > alone.groups[0].critical  # more groups share one rate of false alarms


def test_a_closed_night_is_the_same_anywhere_in_the_sequence() -> None:
    window = lost(drawn(7), 9000.0, 5)
    shuffled = replace(window, stocks=window.stocks[::-1], tickets=window.tickets[::-1])
    assert essence(judge(shuffled).groups[0]) == pytest.approx(essence(judge(window).groups[0]), rel=1e-9)


def test_shared_errors_change_the_answer_and_the_right_one_is_the_explicit_one() -> None:
    def alone(estimate: Estimate | None, at: object) -> Estimate | None:
        return estimate and Estimate(estimate.value, {f"{name} {at}": part for name, part in estimate.parts.items()})

    found = []
    for seed in range(12):
        size = judge(drawn(seed)).vessels[1].detectable
        assert size is not None
        window = lost(drawn(seed), 1.2 * size, NIGHTS)
        stocks = [replace(one, mass=alone(one.mass, (one.vessel, one.close))) for one in window.stocks]
        apart = judge(replace(window, stocks=stocks))
        found.append((judge(window).flagged, apart.flagged))
    assert sum(shared for shared, _ in found) >= 11
    assert sum(unshared for _, unshared in found) <= 6
    statistics = []
    for seed in range(60):
        (part,) = split(drawn(seed))
        statistics.append(float(np.sum(assemble(part).white ** 2)))
    assert chi2(24 * 60).cdf(sum(statistics)) == pytest.approx(0.5, abs=0.495)


def test_where_nothing_was_measured_nothing_is_said() -> None:
    window = drawn(3)
    stocks = [replace(one, mass=None) if one.vessel == "tk-2" else one for one in window.stocks]
    judged = judge(replace(window, stocks=stocks))
    last = judged.vessels[2]
    assert (last.imbalance, last.score, last.p_value, last.detectable, last.since) == (None,) * 5
    assert last.health.verdict == "too_few"
    assert judged.vessels[0].since == NIGHTS - 1
    unmetered = [replace(t, mass=None) if t.name == "t-8-0" else t for t in window.tickets]
    ends = {unmetered[-4].source, unmetered[-4].target} - {None}
    merged = judge(replace(window, tickets=unmetered))
    if len(ends) == 2:
        pair = [one for one in merged.vessels if one.vessel in ends]
        assert [one.judged_with for one in pair] == [(pair[1].vessel,), (pair[0].vessel,)]
    assert judge(Window((1.0,), [], [])) == Judgement((), ())


def test_a_steady_loss_has_a_rate_and_adds_up() -> None:
    window = shifted(drawn(9, 30), lambda s: -400.0 * s.close if s.vessel == "tk-0" else 0.0)
    vessel = judge(window).vessels[0]
    assert [rate.nights for rate in vessel.rates] == [1, 7, 30]
    first, last = (
        next(s.mass.value for s in window.stocks if (s.vessel, s.close) == ("tk-0", k) and s.mass) for k in (0, 30)
    )
    moved = sum(
        t.mass.value * ((t.target == "tk-0") - (t.source == "tk-0")) for t in window.tickets if t.mass is not None
    )
    assert vessel.cumulative == pytest.approx(last - first - moved, abs=1e-3)
    assert vessel.health.nights == 30 - (4 if vessel.drifting or vessel.flagged else 0) or vessel.health.nights <= 30


def test_a_repeated_ticket_with_a_twin_is_flagged_by_evidence_alone() -> None:
    full = [Stock("a", k, Estimate(1000.0 * k, {f"r{k}": 320.0}), {}, per_mm=100.0) for k in range(5)]
    tickets = [Ticket(f"t{k}", k, None, "a", Estimate(1000.0)) for k in range(1, 5)]
    again = [*tickets, Ticket("t4-again", 4, None, "a", Estimate(1000.0))]
    plain = judge(Window((1.0,) * 4, full, tickets))
    assert not plain.groups[0].signals
    first = judge(Window((1.0,) * 4, full, again)).groups[0].signals[0].suspects[0]
    assert first.kind == "duplicated_transfer"
    assert first.magnitude == 1000.0
    assert first.interval == (1000.0, 1000.0)
    assert not judge(Window((1.0,) * 4, full, again), Settings(twin_gain=np.inf)).groups[0].signals


def test_a_flagged_night_says_nothing_of_a_budget() -> None:
    window = drawn(3, 20)
    whole = judge(window).vessels[0].health
    part = judge(window, flagged_before={"tk-0": [5, 30]}).vessels[0].health
    assert part.nights == whole.nights - 4
