"""Reconciled values, uncertainties and statistics equal dense projections with the whole covariance."""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.stats import chi2

import models.balance.reconcile as module
from models.arrays import FloatArray
from models.balance.factor import SparseFactor
from models.balance.network import Network
from models.balance.reconcile import Measurements, Reconciliation, reconcile
from models.errors import DefinitionError
from tests.models.balance.drawn import Dense, Drawn, draw, groups, incidence

SEEDS = range(300)
TIGHT = 1e-9


def near(found: FloatArray, expected: FloatArray, scale: float = 100.0) -> None:
    np.testing.assert_allclose(found, expected, rtol=TIGHT, atol=TIGHT * scale)


def agree(one: Drawn, found: Reconciliation) -> None:
    """Everything of every group, against projections."""
    by_first = {int(group.members[0]): group for group in found.groups}
    for nodes, streams in groups(one.network):
        dense, group = Dense.of(one, nodes, streams), by_first[nodes[0]]
        assert group.members.tolist() == nodes
        assert group.rows == dense.rank
        if group.rows:
            assert group.statistic == pytest.approx(dense.statistic, rel=TIGHT, abs=TIGHT)
            assert group.p_value == pytest.approx(float(chi2.sf(dense.statistic, dense.rank)), rel=1e-7)
        else:
            assert math.isnan(group.statistic) and math.isnan(group.p_value)
        near(found.reconciled[dense.known], dense.reconciled())
        near(found.adjustment[dense.known], dense.value - dense.reconciled())
        near(found.uncertainty[dense.known] ** 2, np.diagonal(dense.spread()))
        scores = [dense.score(column) for column in dense.projected.T]
        near(found.score[dense.known], np.array(scores), scale=10.0)
        near(found.node_score[nodes], np.array([dense.score(column) for column in dense.signatures.T]), scale=10.0)
        values, variances = dense.computed()
        known = [found.structure.observability[stream] == "observable" for stream in dense.unknown]
        near(found.reconciled[dense.unknown], np.where(known, values, np.nan))
        near(found.uncertainty[dense.unknown] ** 2, np.where(known, variances, np.nan))


@pytest.mark.parametrize("shared", [False, True])
def test_drawn_networks_equal_projections(shared: bool) -> None:
    for seed in SEEDS:
        one = draw(seed, shared=shared)
        agree(one, reconcile(one.network, one.measured))


def test_drawn_networks_equal_projections_with_sparse_factors(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(module, "DENSE_ROWS", 1)
    used = 0
    for seed in range(100):
        one = draw(seed, nodes=14, streams=34, unmeasured=0.1)
        found = reconcile(one.network, one.measured)
        agree(one, found)
        used += sum(isinstance(group.factor, SparseFactor) for group in found.groups)
    assert used > 50


@given(st.integers(1000, 10**9), st.floats(-9, 9))
@settings(max_examples=50, derandomize=True, deadline=None)
def test_units_make_no_difference(seed: int, power: float) -> None:
    one, unit = draw(seed), 10.0**power
    measured = one.measured
    other = Measurements(measured.value * unit, measured.random * unit, measured.shared * unit)
    plain, scaled = reconcile(one.network, measured), reconcile(one.network, other)
    near(scaled.reconciled / unit, plain.reconciled)
    near(scaled.uncertainty / unit, plain.uncertainty)
    near(scaled.imbalance / unit, plain.imbalance)
    near(scaled.score, plain.score, scale=10.0)
    for here, there in zip(plain.groups, scaled.groups, strict=True):
        assert there.statistic == pytest.approx(here.statistic, rel=1e-9, abs=1e-9, nan_ok=True)


@given(st.integers(1000, 10**9))
@settings(max_examples=50, derandomize=True, deadline=None)
def test_what_is_reconciled_balances_and_is_surer(seed: int) -> None:
    one = draw(seed)
    found = reconcile(one.network, one.measured)
    filled = np.where(np.isnan(found.reconciled), 0.0, found.reconciled)
    unknown = np.array([own == "unobservable" for own in found.structure.observability])
    shape = incidence(one.network)
    judged = ~(np.abs(shape) @ unknown > 0)
    assert np.abs(shape @ filled)[judged] == pytest.approx(0.0, abs=1e-9 * 100)
    before = np.sqrt(np.diagonal(one.covariance))
    measured = one.network.measured
    assert (found.uncertainty[measured] <= before[measured] * (1 + 1e-9)).all()


@given(st.integers(1000, 10**9))
@settings(max_examples=50, derandomize=True, deadline=None)
def test_the_square_of_a_score_is_what_dropping_the_reading_takes_off(seed: int) -> None:
    # Crowe 1992, AIChE J. 38, 563-572: the statistic falls by the square of the maximum-power score.
    one = draw(seed, unmeasured=0.1)
    found = reconcile(one.network, one.measured)
    checked = np.flatnonzero(~np.isnan(found.score))
    if not len(checked):
        return
    stream = int(checked[0])
    measured = one.network.measured.copy()
    measured[stream] = False
    value = np.where(measured, one.measured.value, np.nan)
    without = Network(one.network.nodes, one.network.streams, one.network.source, one.network.target, measured)
    fewer = reconcile(without, Measurements(value, one.measured.random, one.measured.shared))
    group = found.structure.stream_group[stream]
    left = fewer.groups[group].statistic if fewer.groups[group].rows else 0.0
    assert found.groups[group].statistic - left == pytest.approx(found.score[stream] ** 2, rel=1e-7, abs=1e-7)


def through(value: list[float | None], random: list[float], shared: list[dict[str, float]]) -> Reconciliation:
    """Two streams through one node."""
    network = Network(
        ["a"], ["in", "out"], np.array([-1, 0]), np.array([0, -1]), np.array([v is not None for v in value])
    )
    return reconcile(network, Measurements.of(value, random, shared))


def test_an_error_that_both_sides_share_cancels() -> None:
    # One meter reads what comes in and what goes out: its own error, however large, is not in the difference.
    found = through([100.0, 97.0], [0.3, 0.4], [{"meter": 1e6}, {"meter": 1e6}])
    assert found.imbalance[0] == -3.0
    assert found.imbalance_uncertainty[0] == pytest.approx(0.5, rel=1e-15)  # of 0.3 and 0.4, as a triangle of 3-4-5
    assert found.node_score[0] == pytest.approx(-6.0, rel=1e-15)
    assert found.groups[0].statistic == pytest.approx(36.0, rel=1e-14)
    # Of the 3 that do not fit, each side takes by its own variance, 9:16; the meter's error stays in both.
    assert found.reconciled == pytest.approx([100 - 3 * 9 / 25, 97 + 3 * 16 / 25], rel=1e-12)
    assert found.uncertainty == pytest.approx([1e6, 1e6], rel=1e-9)


def test_an_error_that_two_meters_of_opposite_sign_share_adds() -> None:
    found = through([100.0, 97.0], [0.3, 0.4], [{"meter": 1.2}, {"meter": -1.2}])
    assert found.imbalance_uncertainty[0] == pytest.approx(math.sqrt(0.25 + 2.4**2), rel=1e-14)


def test_an_instrument_named_once_is_a_random_error() -> None:
    lone = through([100.0, 97.0], [0.3, 0.4], [{"meter": 0.4}, {}])
    plain = through([100.0, 97.0], [0.5, 0.4], [{}, {}])
    assert lone.uncertainty == pytest.approx(plain.uncertainty, rel=1e-14)
    assert lone.score == pytest.approx(plain.score, rel=1e-14)
    only = through([100.0, 97.0], [0.0, 0.0], [{"a": 0.5}, {"b": 0.4}])
    assert only.reconciled == pytest.approx(plain.reconciled, rel=1e-14)


def test_errors_of_instruments_alone_are_enough_for_a_large_group(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(module, "DENSE_ROWS", 1)
    count = 9
    network = Network(
        [str(node) for node in range(count)], [str(stream) for stream in range(count + 1)],
        np.arange(-1, count), np.append(np.arange(count), -1), np.ones(count + 1, dtype=bool),
    )  # fmt: skip
    random = [0.0, 0.0, *[1.0] * (count - 1)]
    shared: list[dict[str, float]] = [{"a": 1.0}, {"b": 1.0}, {"a": 0.5, "b": 0.2}, *[{}] * (count - 2)]
    measured = Measurements.of(np.arange(100.0, 100.0 + count + 1).tolist(), random, shared)
    columns = np.zeros((count + 1, 2))
    columns[:3] = [[1.0, 0.0], [0.0, 1.0], [0.5, 0.2]]
    agree(Drawn(network, measured, np.diag(np.square(random)) + columns @ columns.T), reconcile(network, measured))


@pytest.mark.parametrize("rows", [500, 1])
@pytest.mark.parametrize(("spread", "digits"), [(1e2, 1e-12), (1e4, 1e-7), (1e6, 3e-4)])
def test_a_rough_reading_between_sharp_ones(
    monkeypatch: pytest.MonkeyPatch, rows: int, spread: float, digits: float
) -> None:
    # Three readings of one flow in a row: their mean by weight, in fractions; the rough one hardly counts.
    monkeypatch.setattr(module, "DENSE_ROWS", rows)
    network = Network(["a", "b"], ["1", "2", "3"], np.array([-1, 0, 1]), np.array([0, 1, -1]), np.ones(3, dtype=bool))
    found = reconcile(network, Measurements.of([100.0, spread / 4, 103.0], [1.0, spread, 1.0]))
    weight = Fraction(1) / Fraction(spread) ** 2
    mean = (100 + Fraction(spread / 4) * weight + 103) / (2 + weight)
    assert found.reconciled == pytest.approx([float(mean)] * 3, abs=digits)
    assert found.uncertainty == pytest.approx([math.sqrt(1 / (2 + weight))] * 3, rel=digits)
    assert found.score[0] == pytest.approx(float(100 - mean) / math.sqrt(1 - 1 / (2 + weight)), rel=digits)


@pytest.mark.parametrize("rows", [500, 1])
def test_a_reading_too_rough_to_count_is_refused_and_not_answered_wrongly(
    monkeypatch: pytest.MonkeyPatch, rows: int
) -> None:
    monkeypatch.setattr(module, "DENSE_ROWS", rows)
    network = Network(["a", "b"], ["1", "2", "3"], np.array([-1, 0, 1]), np.array([0, 1, -1]), np.ones(3, dtype=bool))
    with pytest.raises(DefinitionError, match="or no value"):
        reconcile(network, Measurements.of([100.0, 0.0, 103.0], [1.0, 1e8, 1.0]))


def test_a_long_line_of_readings_is_their_mean() -> None:
    count = 700  # more than are solved as one whole matrix
    network = Network(
        [str(node) for node in range(count)], [str(stream) for stream in range(count + 1)],
        np.arange(-1, count), np.append(np.arange(count), -1), np.ones(count + 1, dtype=bool),
    )  # fmt: skip
    value = np.random.default_rng(7).normal(50.0, 3.0, count + 1)
    found = reconcile(network, Measurements.of(value.tolist(), [3.0] * (count + 1)))
    assert isinstance(found.groups[0].factor, SparseFactor)
    np.testing.assert_allclose(found.reconciled, value.mean(), rtol=1e-11)
    np.testing.assert_allclose(found.uncertainty, 3.0 / math.sqrt(count + 1), rtol=1e-9)
    # Sum of squares about the mean over the variance: the textbook statistic of equal means.
    assert found.groups[0].statistic == pytest.approx(float(np.sum((value - value.mean()) ** 2)) / 9.0, rel=1e-10)
    assert found.groups[0].rows == count


def test_what_is_certain_and_does_not_balance_is_refused() -> None:
    with pytest.raises(DefinitionError, match="no error of their own"):
        through([100.0, 97.0], [0.0, 0.0], [{"meter": 0.5}, {"meter": 0.5}])


def test_an_unmeasured_way_out_is_computed() -> None:
    found = through([100.0, None], [0.3, 0.0], [{"meter": 0.4}, {"meter": 0.4}])
    assert found.reconciled.tolist() == [100.0, 100.0]
    assert found.uncertainty == pytest.approx([0.5, 0.5], rel=1e-15)
    assert np.isnan(found.imbalance[0]) and np.isnan(found.node_score[0]) and np.isnan(found.score).all()
    assert (found.groups[0].rows, math.isnan(found.groups[0].p_value)) == (0, True)


def test_a_node_without_streams_balances_by_itself() -> None:
    network = Network(
        ["a", "alone"], ["x", "y", "z"], np.array([-1, 0, -1]), np.array([0, -1, -1]), np.ones(3, dtype=bool)
    )
    found = reconcile(network, Measurements.of([10.0, 12.0, 3.0], [1.0, 1.0, 0.2]))
    assert found.imbalance.tolist() == [2.0, 0.0]
    assert found.imbalance_uncertainty.tolist() == [math.sqrt(2.0), 0.0]
    assert found.reconciled == pytest.approx([11.0, 11.0, 3.0])  # halves of 2; the last stands as measured
    assert found.uncertainty == pytest.approx([math.sqrt(0.5), math.sqrt(0.5), 0.2])
    assert found.adjustment[2] == 0.0
    assert [group.rows for group in found.groups] == [1, 0]
