"""Both factors give the same solutions and elements of the inverse as the whole matrix does."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.sparse import csr_array

from models.arrays import FloatArray, IntArray
from models.balance.factor import DenseFactor, SparseFactor, singular
from models.errors import DefinitionError

ROWS = 60


def mesh(seed: int, latent: int) -> tuple[csr_array, FloatArray, FloatArray, IntArray, IntArray]:
    """Balances in a line with streams to near ones, some to the outside, of very different variances."""
    rng = np.random.default_rng(seed)
    one = np.concatenate([np.arange(ROWS - 1), rng.integers(0, ROWS - 8, 2 * ROWS)])
    other = np.concatenate([np.arange(1, ROWS), one[ROWS - 1 :] + rng.integers(1, 8, 2 * ROWS)])
    columns = np.arange(len(one))
    outside = rng.integers(0, ROWS, 10)
    at = np.concatenate([columns, columns, len(one) + np.arange(10)])
    ones = np.concatenate([np.ones(len(one)), -np.ones(len(one)), np.ones(10)])
    incidence = csr_array((ones, (np.concatenate([one, other, outside]), at)), shape=(ROWS, len(one) + 10))
    variance = np.exp(rng.normal(0, 3, len(one) + 10))
    return incidence, variance, rng.normal(0, 2, (ROWS, latent)), one, other


@pytest.mark.parametrize("latent", [0, 1, 5])
@pytest.mark.parametrize("seed", range(5))
def test_factors_equal_the_whole_inverse(seed: int, latent: int) -> None:
    incidence, variance, shared, one, other = mesh(seed, latent)
    whole = (incidence.toarray() * variance) @ incidence.toarray().T + shared @ shared.T
    scale = 1.0 / np.sqrt(np.diagonal(whole))
    inverse = np.linalg.inv(whole * scale * scale[:, None]) * scale * scale[:, None]
    right = np.random.default_rng(seed).normal(size=(ROWS, 3))
    every = np.arange(ROWS)
    for factor in (DenseFactor(whole), SparseFactor(incidence, variance, shared)):
        np.testing.assert_allclose(factor.solve(right), inverse @ right, rtol=1e-8, atol=1e-10 * inverse.max())
        np.testing.assert_allclose(factor.solve(right[:, 0]), factor.solve(right)[:, 0], rtol=1e-12)
        np.testing.assert_allclose(factor.inverse(every, every), np.diagonal(inverse), rtol=1e-9)
        size = np.sqrt(inverse[one, one] * inverse[other, other])
        np.testing.assert_allclose(factor.inverse(one, other) / size, inverse[one, other] / size, atol=1e-10)
        np.testing.assert_allclose(factor.inverse(other, one), factor.inverse(one, other), rtol=1e-10)


def test_a_balance_without_an_error_is_refused() -> None:
    with pytest.raises(DefinitionError, match="no error of their own"):
        DenseFactor(np.zeros((1, 1)))
    with pytest.raises(DefinitionError, match="random error"):
        DenseFactor(np.ones((2, 2)))
    with pytest.raises(DefinitionError):
        DenseFactor(np.array([[1.0, 1.0 - 1e-15], [1.0 - 1e-15, 1.0]]))
    ring = csr_array(np.array([[1.0, -1.0], [-1.0, 1.0]]))
    for variance in (np.array([1.0, 2.0]), np.array([0.0, 0.0])):
        with pytest.raises(DefinitionError):
            SparseFactor(ring, variance, np.zeros((2, 0)))
    assert singular().code == "impossible_definition"
