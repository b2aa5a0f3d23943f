"""The last night of a window judged: what is flagged, what it is called, and what would have been seen."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

import numpy as np
from scipy.special import chdtrc, erfc

from models.arrays import FloatArray, IntArray
from models.balance.evidence import FRESH_NIGHTS, Evidence, Search, correlations, fresh, subsets, weigh
from models.balance.faults import candidates
from models.balance.health import budget_health
from models.balance.judged import GroupJudged, Judgement, Settings, Signal, VesselJudged
from models.balance.naming import Suspect, detectable, name
from models.balance.page import page_limits
from models.balance.reconciled import last_close
from models.balance.rows import BEYOND, Rows, assemble
from models.balance.signatures import DUPLICATED, LOSS, SLOW, Candidates
from models.balance.stuck import Stuck, describe_stuck, find_stuck
from models.balance.thresholds import (
    SIGNATURE_SHARE,
    SpanningTree,
    alarm_rate,
    benjamini_hochberg,
    family_critical,
    family_p_value,
)
from models.balance.trends import LossRate, innovations, loss_rate, watch
from models.balance.window import Part, Window, split

RATES = (1, 7, 30)  # nights, over which a rate of loss is given


_Judged = tuple[GroupJudged, list[VesselJudged]]


class _Group:
    """One group on its way to being judged."""

    def __init__(self, part: Part, settings: Settings) -> None:
        self.settings = settings
        self.rows: Rows = assemble(part)
        self.found: Candidates = candidates(self.rows)
        nights = (max(0, self.rows.nights - FRESH_NIGHTS), self.rows.nights)
        weighed = weigh(self.rows, self.found.columns, nights)
        self.evidence = Evidence(weighed.num[1], weighed.q[1])
        new = fresh(weighed.q[0], weighed.q[1])
        self.new, self.old = subsets(self.found.fixed, new, weighed.q[1] > 0.0)
        twins = (self.found.kind == DUPLICATED) & (self.found.prior > 1.0) & new
        self.twins: IntArray = np.flatnonzero(twins)
        self.search = Search(self.rows, self.found.columns, self.evidence)
        self.stuck: tuple[Stuck, ...] = find_stuck(self.rows, self.found)
        for run in self.stuck:
            for column in run.columns:
                self.search.take(column)
        self.start: Evidence = self.search.evidence
        self.tree: SpanningTree = correlations(self.rows, self.found.columns[:, self.new])
        self.picks: list[tuple[int, float, bool]] = []  # named column, score, standing
        self.limit_old = math.inf
        if len(self.old):
            older = correlations(self.rows, self.found.columns[:, self.old])
            self.limit_old = family_critical(settings.standing, older)

    def settle(self) -> float:
        """Name what stands since before and outshines what is new; the chance of the largest that then is new."""
        while self._standing(self.search.strongest(self.new)[0]):
            pass
        return family_p_value(self.search.strongest(self.new)[0], self.tree)

    def _standing(self, above: float) -> bool:
        score, best = self.search.strongest(self.old)
        return score > self.limit_old and score >= above and self._name(score, standing=True)

    def select(self, limit: float) -> None:
        """Name what passes its limit, the largest first, until nothing does."""
        while True:
            score, _ = self.search.strongest(self.new)
            older = self._standing(score if score > limit else 0.0)
            if not older and not (score > limit and self._name(score, standing=False)):
                break
        while len(self.twins):
            gain = self.search.evidence.gain[self.twins]
            best = int(np.argmax(gain))
            score = float(self.search.evidence.z[self.twins[best]])
            if not (gain[best] > self.settings.twin_gain and self._name(abs(score), standing=False)):
                break

    def _name(self, score: float, *, standing: bool) -> bool:
        if len(self.picks) >= self.settings.picks:
            return False
        leader = name(self.found, self.search)[0].column
        if not self.search.take(leader):
            return False
        self.picks.append((leader, score, standing))
        return True

    def signals(self) -> tuple[Signal, ...]:
        """Every signal named anew beside all the others."""
        found = []
        for run in self.stuck:
            suspect = describe_stuck(run, self.search.without(run.columns[-1]))
            found.append(Signal((suspect,), math.sqrt(suspect.statistic), run.last < self.rows.nights))
        for column, score, standing in self.picks:
            found.append(Signal(name(self.found, self.search.without(column)), score, standing))
        return tuple(found)

    def without_standing(self) -> FloatArray:
        """Whitened balances, less what is named and flagged no more."""
        search = Search(self.rows, self.found.columns, self.evidence)
        for run in self.stuck:
            for column in run.columns:
                search.take(column)
        for column, _, standing in self.picks:
            if standing:
                search.take(column)
        return np.asarray(self.rows.white - search.basis @ (search.basis.T @ self.rows.white))

    def vessels_of(self, suspect: Suspect) -> set[str]:
        """Vessels whose balances a suspect would touch."""
        rows = self.found.columns[:, [suspect.column]].indices
        own = [bool(np.isin(nights, rows).any()) for nights in self.rows.row_of]
        return {vessel for vessel, touched in zip(self.rows.part.vessels, own, strict=True) if touched}


def leading(signal: Signal) -> tuple[Suspect, ...]:
    """The first suspect of a signal and those that the window cannot tell from it.

    Parameters
    ----------
    signal : Signal
        A signal. [1]

    Returns
    -------
    tuple of Suspect
        The first first. [unit]
    """
    first = signal.suspects[0]
    alike = set(first.equivalent_to)
    return (first, *(one for one in signal.suspects[1:] if (one.kind, one.subject) in alike))


def judge(
    window: Window, settings: Settings | None = None, flagged_before: Mapping[str, Sequence[int]] | None = None
) -> Judgement:  # fmt: skip
    """The last night of a window, judged by all its nights.

    Parameters
    ----------
    window : Window
        What was measured, moved and checked. [kg]
    settings : Settings or None
        What was asked for. [1]
    flagged_before : mapping of str to sequence of int or None
        By vessel, earlier nights of the window that were flagged: they say nothing of its budget. [1]

    Returns
    -------
    Judgement
        Groups, signals, reconciled masses and vessels. [kg]

    Notes
    -----
    With α the chance of any flag in a night, 0.8 α goes to the largest scores of the G groups, by Benjamini and
    Hochberg's rule over their chances, and the rest to the sums that watch for slow losses. Faults of which only
    older nights speak are named first where they stand out more, so that they pass for nothing new.

    References
    ----------
    .. [1] Y. Benjamini, Y. Hochberg, J. R. Stat. Soc. B 57 (1995) 289–300.
    """
    settings = Settings() if settings is None else settings
    alpha = alarm_rate(settings.false_alarms_per_month)
    parts = split(window)
    level = SIGNATURE_SHARE * alpha
    shared = level / max(1, len(parts))
    vessels = sum(len(part.vessels) for part in parts)
    limits = page_limits(vessels, alpha) if vessels else ()
    before = flagged_before or {}
    judged: dict[int, _Judged] = {}
    waiting: dict[int, _Group] = {}
    chances = np.ones(len(parts))
    for at, part in enumerate(parts):
        group = _Group(part, settings)
        chances[at] = group.settle()
        if chances[at] <= level:  # until it is known how many others count
            waiting[at] = group
        else:
            judged[at] = _finish(group, float(chances[at]), shared, math.inf, limits, before)
    counted = np.atleast_1d(benjamini_hochberg(chances, level)).tolist()
    for at, group in waiting.items():
        raised = family_critical(shared * sum(counted), group.tree) if counted[at] else math.inf
        judged[at] = _finish(group, float(chances[at]), shared, raised, limits, before)
    order = [judged[at] for at in range(len(parts))]
    return Judgement(tuple(group for group, _ in order), tuple(one for _, members in order for one in members))


def _finish(
    group: _Group, chance: float, shared: float, limit: float, limits: tuple[tuple[float, float], ...],
    flagged_before: Mapping[str, Sequence[int]],
) -> _Judged:  # fmt: skip
    critical = family_critical(shared, group.tree)
    group.select(limit)
    signals = group.signals()
    judged = _group(group, signals, chance, critical)
    return judged, _vessels(group, signals, critical, limits, flagged_before)


def _group(group: _Group, signals: tuple[Signal, ...], chance: float, critical: float) -> GroupJudged:
    rows, search = group.rows, group.search
    statistic, count = float(rows.white @ rows.white), len(rows.white)
    left = count - search.basis.shape[1]
    named = [[column] for run in group.stuck for column in run.columns]
    named += [[one.column for one in signal.suspects] for signal in signals[len(group.stuck) :]]
    stocks, movements = last_close(rows, group.found, named)
    return GroupJudged(
        rows.part.vessels, statistic, count, float(chdtrc(count, statistic)) if count else 1.0,
        float(chdtrc(left, max(0.0, search.residual))) if left > 0 else 1.0, chance, critical, signals, stocks,
        movements,
    )  # fmt: skip


def _vessels(
    group: _Group, signals: tuple[Signal, ...], critical: float, limits: tuple[tuple[float, float], ...],
    flagged_before: Mapping[str, Sequence[int]],
) -> list[VesselJudged]:  # fmt: skip
    rows = group.rows
    score = innovations(rows.lower, rows.white, rows.night_of).scores(rows.row_of)
    quiet = innovations(rows.lower, group.without_standing(), rows.night_of).scores(rows.row_of)
    watched = watch(quiet, limits)  # what stands since before is no news
    guilty: set[str] = set()
    for signal in signals:
        if not signal.standing:
            guilty |= set().union(*(group.vessels_of(suspect) for suspect in leading(signal)))
    flagged = watched.flagged.copy()
    for at, vessel in enumerate(rows.part.vessels):
        flagged[[night - 1 for night in flagged_before.get(vessel, ()) if 1 <= night <= rows.nights], at] = True
        flagged[-1, at] |= vessel in guilty
    health = budget_health(score, flagged)
    rates = _rates(group, critical)
    losses = _of_tonight(group, critical)
    spread = rows.uncertainty()
    judged = []
    for at, vessel in enumerate(rows.part.vessels):
        row = int(rows.row_of[at, -1])
        has = row != BEYOND
        value, u = (float(rows.residual[row]), float(spread[row])) if has else (0.0, 0.0)
        ratio = value / u if u > 0.0 else 0.0
        inside = np.argwhere(rows.row_of == row) if has else np.zeros((0, 2), dtype=np.intp)
        others = sorted({rows.part.vessels[int(one)] for one, _ in inside} - {vessel})
        total, total_u = _cumulative(rows, at)
        new = float(score[-1, at])
        judged.append(VesselJudged(
            vessel, tuple(others), int(inside[inside[:, 0] == at][:, 1].min()) if has else None,
            value if has else None, u if has else None, ratio if has else None,
            float(erfc(abs(ratio) / math.sqrt(2.0))) if has else None,
            losses.get(vessel), vessel in guilty, None if math.isnan(new) else new,
            float(watched.statistic[-1, at]), float(watched.limit[-1, at]), bool(watched.flagged[-1, at]),
            rates.get(vessel, ()), total, total_u, health[at],
        ))  # fmt: skip
    return judged


def _cumulative(rows: Rows, at: int) -> tuple[float, float]:
    """Sum of a vessel's balances over the window, errors added by sign before they are squared."""
    own = np.unique(rows.row_of[at][rows.row_of[at] != BEYOND])
    errors: FloatArray = np.asarray(rows.errors[own].sum(axis=0))
    return float(rows.residual[own].sum()), float(np.sqrt(np.sum(np.square(errors))))


def _of_tonight(group: _Group, critical: float) -> dict[str, float]:
    """Loss of the last night that each vessel would be flagged for; absent where none would."""
    found, q = group.found, group.start.q
    own = np.flatnonzero((found.kind == LOSS) & (found.onset == group.rows.nights) & (q > 0.0))
    sizes = detectable(critical, q[own])
    return {found.subjects[found.subject[at]][0]: float(size) for at, size in zip(own, sizes, strict=True)}


def _rates(group: _Group, critical: float) -> dict[str, tuple[LossRate, ...]]:
    """Rates of loss over the last 1, 7 and 30 nights, whatever is named."""
    found, evidence, nights = group.found, group.start, group.rows.nights
    rates: dict[str, list[LossRate]] = {}
    onsets = {nights - length + 1: length for length in RATES if length <= nights}
    for at in np.flatnonzero((found.kind == SLOW) & np.isin(found.onset, list(onsets))):
        own = found.subjects[found.subject[at]][0]
        rate = loss_rate(onsets[int(found.onset[at])], float(evidence.num[at]), float(evidence.q[at]), critical)
        if rate is not None:
            rates.setdefault(own, []).append(rate)
    return {vessel: tuple(sorted(own, key=lambda rate: rate.nights)) for vessel, own in rates.items()}
