"""Shared errors as unknowns of one sparse matrix give what the whole covariance gives."""

from __future__ import annotations

import importlib

import numpy as np
import pytest
from scipy.sparse import csr_array, random_array

from models.arrays import FloatArray, IntArray
from models.balance.network import Network
from models.balance.reconcile import Measurements, reconcile
from models.balance.shared_factor import SharedFactor
from models.errors import DefinitionError

ROWS = 40


def mesh(seed: int, errors: int) -> tuple[csr_array, FloatArray, csr_array, IntArray, IntArray]:
    """Balances in a line with streams to near ones and to the outside; errors shared by far ones."""
    rng = np.random.default_rng(seed)
    one = np.concatenate([np.arange(ROWS - 1), rng.integers(0, ROWS - 8, ROWS)])
    other = np.concatenate([np.arange(1, ROWS), one[ROWS - 1 :] + rng.integers(1, 8, ROWS)])
    streams = len(one)
    outside = rng.integers(0, ROWS, 10)
    at = np.concatenate([np.arange(streams), np.arange(streams), streams + np.arange(10)])
    signs = np.concatenate([np.ones(streams), -np.ones(streams), np.ones(10)])
    incidence = csr_array((signs, (np.concatenate([one, other, outside]), at)), shape=(ROWS, streams + 10))
    shared = csr_array(random_array((streams + 10, errors), density=0.06, rng=rng, data_sampler=rng.standard_normal))
    return incidence, np.exp(rng.normal(0.0, 2.0, streams + 10)), shared, one, other


def whole(incidence: csr_array, variance: FloatArray, shared: csr_array) -> tuple[FloatArray, FloatArray]:
    """H⁻¹ and diag(S A' H⁻¹ A S), dense."""
    covariance = np.diag(variance) + shared.toarray() @ shared.toarray().T
    balances = incidence.toarray()
    inverse = np.linalg.inv(balances @ covariance @ balances.T)
    seen = balances @ covariance
    return inverse, np.einsum("ij,ik,kj->j", seen, inverse, seen)


@pytest.mark.parametrize("errors", [0, 1, 60])
@pytest.mark.parametrize("seed", range(4))
def test_it_equals_the_whole_inverse(seed: int, errors: int) -> None:
    incidence, variance, shared, one, other = mesh(seed, errors)
    inverse, explained = whole(incidence, variance, shared)
    factor = SharedFactor(incidence, variance, shared)
    right = np.random.default_rng(seed).normal(size=(ROWS, 3))
    every = np.arange(ROWS)
    np.testing.assert_allclose(factor.solve(right), inverse @ right, rtol=1e-9, atol=1e-10 * inverse.max())
    np.testing.assert_allclose(factor.solve(right[:, 0]), factor.solve(right)[:, 0], rtol=1e-12)
    np.testing.assert_allclose(factor.inverse(every, every), np.diagonal(inverse), rtol=1e-9)
    size = np.sqrt(inverse[one, one] * inverse[other, other])
    np.testing.assert_allclose(factor.inverse(one, other) / size, inverse[one, other] / size, atol=1e-10)
    np.testing.assert_allclose(factor.inverse(other, one), factor.inverse(one, other), rtol=1e-12)
    np.testing.assert_allclose(factor.explained(), explained, rtol=1e-9)


@pytest.mark.parametrize("seed", range(20))
def test_streams_without_an_error_of_their_own_are_refused_or_right(seed: int) -> None:
    incidence, variance, _, _, _ = mesh(seed, 1)
    rng = np.random.default_rng(100 + seed)
    variance[rng.random(len(variance)) < 0.7] = 0.0
    shared = csr_array(rng.normal(size=(len(variance), 3 * ROWS)) * (rng.random((len(variance), 3 * ROWS)) < 0.1))
    inverse, explained = whole(incidence, variance, shared)
    every = np.arange(ROWS)
    try:
        factor = SharedFactor(incidence, variance, shared)
    except DefinitionError:
        return
    np.testing.assert_allclose(factor.inverse(every, every), np.diagonal(inverse), rtol=1e-7)
    np.testing.assert_allclose(factor.explained(), explained, rtol=1e-7)


def test_a_balance_whose_errors_cancel_is_refused() -> None:
    through = csr_array(np.array([[1.0, -1.0]]))
    one_meter = csr_array(np.array([[0.5], [0.5]]))
    with pytest.raises(DefinitionError, match="random error"):
        SharedFactor(through, np.zeros(2), one_meter)  # what came in and went out by one meter alone
    two = csr_array(np.array([[1.0, -1.0, 0.0], [0.0, 1.0, -1.0]]))
    three = csr_array(np.array([[1.0], [2.0], [3.0]]))  # both balances move by the same: one says nothing new
    with pytest.raises(DefinitionError, match="random error"):
        SharedFactor(two, np.zeros(3), three)


@pytest.mark.parametrize("random", [1.0, 0.0])
def test_a_large_group_with_a_meter_for_every_few_streams_is_as_the_whole_covariance_has_it(
    random: float, monkeypatch: pytest.MonkeyPatch
) -> None:
    module = importlib.import_module("models.balance.reconcile")
    rng = np.random.default_rng(5)
    nodes, streams = 60, 180
    source = np.arange(streams) % nodes
    target = np.where(rng.random(streams) < 0.1, -1, (source + rng.integers(1, 9, streams)) % nodes)
    network = Network(
        [str(one) for one in range(nodes)], [str(one) for one in range(streams)], source, target,
        rng.random(streams) > 0.03,
    )  # fmt: skip
    value = [
        float(one) if known else None for one, known in zip(rng.normal(100, 5, streams), network.measured, strict=True)
    ]
    shared = [{f"meter {at % 77}": 0.5, f"laboratory {at % 3}": 0.3, f"prover {at % 41}": 0.4} for at in range(streams)]
    measured = Measurements.of(value, [random] * streams, shared)
    dense = reconcile(network, measured)
    monkeypatch.setattr(module, "DENSE_ROWS", 1)
    sparse = reconcile(network, measured)
    if random:  # without it, the whole covariance may have to do
        assert any(isinstance(group.factor, SharedFactor) for group in sparse.groups)
    for name in ("reconciled", "uncertainty", "adjustment", "score", "node_score"):
        np.testing.assert_allclose(getattr(sparse, name), getattr(dense, name), rtol=1e-7, atol=1e-7, err_msg=name)
    assert [one.statistic for one in sparse.groups] == pytest.approx([one.statistic for one in dense.groups], rel=1e-10)
