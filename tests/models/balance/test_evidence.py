"""Evidence against least squares in which every inventory, movement, shared error and fault is an unknown."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import norm

from models.arrays import FloatArray
from models.balance.evidence import Evidence, Search, correlations, fresh, subsets, weigh
from models.balance.faults import candidates
from models.balance.rows import Rows, assemble
from models.balance.thresholds import family_p_value
from models.balance.window import Part, Window
from tests.models.balance.drawn_window import draw, masses_of

VESSELS = ("tk-0", "tk-1", "tk-2")
NIGHTS = 5


def rows_of(seed: int) -> Rows:
    return assemble(Part(VESSELS, draw(np.random.default_rng(seed), 3, NIGHTS, 4)))


def explicit(rows: Rows, window: Window, faults: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Sizes of faults with their covariance, and true values with their deviations.

    Unknowns are what was measured, each error that occurs twice or more, and the faults. Equations: each measured
    value with its own errors' variance, each shared error with variance one, each balance to one kilogram.
    """
    values = masses_of(window)
    names = [name for value in values for name in value.parts]
    shared = sorted({name for name in names if names.count(name) > 1})
    own = np.array([sum(p**2 for n, p in v.parts.items() if n not in shared) for v in values])
    parts = np.array([[v.parts.get(name, 0.0) for name in shared] for v in values])
    balance = np.zeros((len(rows.white), len(values)))
    for j, stock in enumerate(window.stocks):
        at = rows.row_of[VESSELS.index(stock.vessel)]
        if stock.close > 0:
            balance[at[stock.close - 1], j] = 1.0
        if stock.close < NIGHTS:
            balance[at[stock.close], j] = -1.0
    for j, ticket in enumerate(window.tickets, len(window.stocks)):
        for end, sign in ((ticket.target, -1.0), (ticket.source, 1.0)):
            if end is not None:
                balance[rows.row_of[VESSELS.index(end), ticket.night - 1], j] = sign
    n, s, p = len(values), len(shared), faults.shape[1]
    weight = 1.0 / np.sqrt(own)
    start = np.array([value.value for value in values])
    system = np.block([
        [np.diag(weight), weight[:, None] * parts, np.zeros((n, p))],
        [np.zeros((s, n)), np.eye(s), np.zeros((s, p))],
        [balance, np.zeros((len(balance), s)), -faults],
    ])  # fmt: skip
    right = np.concatenate([np.zeros(n + s), -balance @ start])  # of departures from what was measured
    found = np.linalg.lstsq(system, right, rcond=None)[0]
    covariance = np.linalg.inv(system.T @ system)
    deviation = np.sqrt(np.diag(covariance))
    return found[n + s :], covariance[n + s :, n + s :], start + found[:n], deviation[:n]


@pytest.mark.parametrize("seed", range(4))
def test_a_size_alone_is_that_of_least_squares_with_every_error_as_an_unknown(seed: int) -> None:
    window = draw(np.random.default_rng(seed), 3, NIGHTS, 4)
    rows = assemble(Part(VESSELS, window))
    found = candidates(rows)
    weighed = weigh(rows, found.columns, [NIGHTS])
    whole = Evidence(weighed.num[0], weighed.q[0])
    for at in np.random.default_rng(seed).choice(np.flatnonzero(~found.fixed), 8, replace=False):
        size, variance, _, _ = explicit(rows, window, found.columns[:, [at]].toarray())
        assert whole.size[at] == pytest.approx(size[0], rel=1e-5, abs=1e-5 * whole.sd[at])
        assert whole.sd[at] == pytest.approx(variance[0, 0] ** 0.5, rel=1e-5)
        assert whole.z[at] == pytest.approx(size[0] / variance[0, 0] ** 0.5, rel=1e-5, abs=1e-5)


@pytest.mark.parametrize("seed", range(4))
def test_sizes_beside_others_are_those_of_the_joint_fit(seed: int) -> None:
    window = draw(np.random.default_rng(seed), 3, NIGHTS, 4)
    rows = assemble(Part(VESSELS, window))
    found = candidates(rows)
    weighed = weigh(rows, found.columns, [NIGHTS])
    search = Search(rows, found.columns, Evidence(weighed.num[0], weighed.q[0]))
    free = np.flatnonzero(~found.fixed)
    chosen = np.random.default_rng(seed + 90).choice(free, 3, replace=False)
    for one in chosen[:2]:
        assert search.take(int(one))
    sizes, variance, _, _ = explicit(rows, window, found.columns[:, chosen].toarray())
    evidence = search.evidence
    assert evidence.size[chosen[2]] == pytest.approx(sizes[2], rel=1e-4, abs=1e-4 * evidence.sd[chosen[2]])
    assert evidence.sd[chosen[2]] == pytest.approx(variance[2, 2] ** 0.5, rel=1e-4)
    two, _, _, _ = explicit(rows, window, found.columns[:, chosen[:2]].toarray())
    other = search.without(int(chosen[1])).evidence
    assert other.size[chosen[1]] == pytest.approx(two[1], rel=1e-4, abs=1e-4 * other.sd[chosen[1]])
    h = rows.lower @ rows.lower.T
    f = found.columns[:, chosen[:2]].toarray()
    a = np.linalg.solve(f.T @ np.linalg.solve(h, f), f.T @ np.linalg.solve(h, rows.residual))
    left = rows.residual - f @ a
    assert search.residual == pytest.approx(left @ np.linalg.solve(h, left), rel=1e-8)
    assert search.evidence.num[chosen[0]] == 0.0  # nothing is left of what is named
    assert not search.take(int(chosen[0]))
    assert search.strongest(chosen[2:]) == (abs(float(evidence.z[chosen[2]])), int(chosen[2]))
    assert search.strongest(np.zeros(0, dtype=np.intp)) == (0.0, -1)


def test_a_night_in_the_middle_is_judged_as_if_the_window_ended_there() -> None:
    window = draw(np.random.default_rng(2), 3, NIGHTS, 4)
    rows = assemble(Part(VESSELS, window))
    found = candidates(rows)
    weighed = weigh(rows, found.columns, range(NIGHTS + 1))
    assert not weighed.num[0].any()
    for night in (2, 4):
        count = rows.ends[night]
        covariance = (rows.lower @ rows.lower.T)[:count, :count]
        f = found.columns.toarray()[:count]
        assert weighed.num[night] == pytest.approx(f.T @ np.linalg.solve(covariance, rows.residual[:count]), rel=1e-9)
        squares = np.einsum("ij,ij->j", f, np.linalg.solve(covariance, f))
        assert weighed.q[night] == pytest.approx(squares, rel=1e-9)


def test_a_score_is_of_unit_variance_and_nothing_is_said_where_nothing_is_seen() -> None:
    drawn = []
    for seed in range(150):
        rows = rows_of(seed)
        found = candidates(rows)
        weighed = weigh(rows, found.columns, [NIGHTS])
        drawn.append(Evidence(weighed.num[0], weighed.q[0]).z[:15])
    assert np.std(drawn) == pytest.approx(1.0, abs=0.05)
    empty = Evidence(np.array([0.0, 6.0]), np.array([0.0, 4.0]))
    assert empty.z.tolist() == [0.0, 3.0]
    assert empty.statistic.tolist() == [0.0, 9.0]
    assert empty.size.tolist() == [0.0, 1.5]
    assert empty.sd.tolist() == [np.inf, 0.5]
    assert empty.gain.tolist() == [0.0, 4.0]


def test_fresh_is_what_the_last_nights_gave_a_tenth_of() -> None:
    before, now = np.array([9.0, 9.05, 0.0, 1.0]), np.array([10.0, 10.0, 0.0, 1.1])
    assert fresh(before, now).tolist() == [True, False, False, False]
    fixed = np.array([False, False, False, True])
    new, old = subsets(fixed, fresh(before, now), now > 0.0)
    assert (new.tolist(), old.tolist()) == ([0], [1])


def test_the_correlations_are_those_of_the_scores(monkeypatch: pytest.MonkeyPatch) -> None:
    rows = rows_of(4)
    found = candidates(rows)
    columns = found.columns[:, ::7]
    f = columns.toarray()
    inner = f.T @ np.linalg.solve(rows.lower @ rows.lower.T, f)
    rho = inner / np.sqrt(np.outer(np.diag(inner), np.diag(inner)))
    tree = correlations(rows, columns)
    assert family_p_value(3.0, tree) == pytest.approx(family_p_value(3.0, rho), rel=1e-7)
    assert family_p_value(3.0, tree) > 2.0 * norm.sf(3.0)
    monkeypatch.setattr("models.balance.evidence.WHOLE_MATRIX", 12)  # in parts: still a bound, and hardly a wider one
    parts = family_p_value(3.0, correlations(rows, columns))
    assert family_p_value(3.0, rho) < parts < 1.6 * family_p_value(3.0, rho)
    assert correlations(rows, columns[:, :0]).size == 0


def test_blocks_of_columns_change_nothing(monkeypatch: pytest.MonkeyPatch) -> None:
    rows = rows_of(4)
    found = candidates(rows)
    whole = weigh(rows, found.columns, [NIGHTS])
    monkeypatch.setattr("models.balance.evidence.BLOCK_FLOATS", 100)
    cut = weigh(rows, found.columns, [NIGHTS])
    assert cut.num == pytest.approx(whole.num, rel=1e-12)
    assert cut.q == pytest.approx(whole.q, rel=1e-12)
