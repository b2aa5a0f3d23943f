"""The covariance of very many balances that share very many errors, factored without being formed."""

from __future__ import annotations

import numpy as np
from scipy.sparse import block_array, coo_array, csc_array, csr_array, diags_array, eye_array
from scipy.sparse.linalg import splu

from models.arrays import FloatArray, IntArray
from models.balance.factor import SCALE_TOLERANCE, singular

TRUSTED = 1e-8  # largest departure from one of the diagonal of the scaled matrix times its inverse


class SharedFactor:
    """H = A D A' + C C' by the larger, sparse matrix in which the shared errors C are unknowns.

    Parameters
    ----------
    incidence : csr_array, shape (rows, streams)
        A: +1 and −1. [1]
    variance : FloatArray, shape (streams,)
        D: of each stream's own errors. [unit of the streams, squared]
    shared : csr_array, shape (streams, errors)
        B: of errors that streams share, of unit variance; C = A B. [unit of the streams]

    Notes
    -----
    With D of variance and K = [[A D A', C], [C', −I]], the inverse of K holds H⁻¹ in its first block, H⁻¹ C
    beside it, and C' H⁻¹ C − I in the last. Of L D L' = K, from the last column of L to the first, S being
    the rows below j that column j holds::

        Z_Sj = −Z_SS L_Sj,  Z_jj = 1/D_j − L_Sj' Z_Sj        (1)

    With w = (d a, b) of one stream, what the balances take off its variance is::

        (S A' H⁻¹ A S)_jj = b' b + w' K⁻¹ w        (2)

    Where streams have next to no errors of their own, the elimination may lose its digits: the product of
    K and its inverse shows it, and such a matrix is refused.

    References
    ----------
    .. [1] K. Takahashi, J. Fagan, M.-S. Chen, Proc. 8th PICA Conference (1973) 63–69.
    .. [2] R. J. Vanderbei, SIAM J. Optim. 5 (1995) 100–113: quasi-definite matrices.
    """

    def __init__(self, incidence: csr_array, variance: FloatArray, shared: csr_array) -> None:
        self.incidence, self.variance, self.shared = incidence, variance, shared
        self.rows, errors = incidence.shape[0], shared.shape[1]
        beside = csc_array(incidence @ shared)  # C
        whole = abs(incidence) @ variance + beside.power(2).sum(axis=1)
        if not np.all(whole > SCALE_TOLERANCE**2):
            raise singular()
        self.scale = np.sqrt(whole)
        unscale = diags_array(1.0 / self.scale)
        matrix = unscale @ incidence @ diags_array(variance) @ incidence.T @ unscale
        if errors:
            matrix = block_array([[matrix, unscale @ beside], [beside.T @ unscale, -eye_array(errors)]])
        self.matrix = csc_array(matrix)
        touched = abs(csr_array(block_array([[incidence.T, shared]]))) if errors else abs(csr_array(incidence.T))
        places = coo_array(touched.T @ touched)  # what one stream touches is asked for, be the matrix zero there
        full = coo_array(self.matrix)
        i, j = (np.concatenate([a, b]) for a, b in zip(full.coords, places.coords, strict=True))
        self.stored = csc_array((np.concatenate([full.data, np.zeros(len(places.data))]), (i, j)), shape=full.shape)
        try:
            self.lu = splu(
                self.stored, permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.0, options={"SymmetricMode": True}
            )
        except RuntimeError:  # exactly singular
            raise singular() from None
        self.place = self.lu.perm_c.astype(np.intp)  # of each index in the order of elimination
        pivots = np.asarray(self.lu.U.diagonal())
        rows = pivots[self.place[: self.rows]]
        if not np.array_equal(self.lu.perm_r, self.lu.perm_c) or not np.all(rows > 0.0):
            raise singular()
        self.keys, self.values = self._select(pivots)
        i, j = full.coords
        product = np.bincount(i, weights=full.data * self._entries(i, j), minlength=len(pivots))
        if not np.abs(product - 1.0).max() < TRUSTED:  # also where it is not a number
            raise singular()

    def solve(self, right: FloatArray) -> FloatArray:
        """H⁻¹ times columns.

        Parameters
        ----------
        right : FloatArray, shape (n,) or (n, k)
            Columns. [any]

        Returns
        -------
        FloatArray, shape (n,) or (n, k)
            Solutions. [unit of the columns over that of H]
        """
        scale = self.scale if right.ndim == 1 else self.scale[:, None]
        whole = np.zeros((self.matrix.shape[0], *right.shape[1:]))
        whole[: self.rows] = right / scale
        found = self.lu.solve(whole)
        found += self.lu.solve(whole - self.matrix @ found)
        return np.asarray(found[: self.rows] / scale)

    def inverse(self, one: IntArray, other: IntArray) -> FloatArray:
        """Elements of H⁻¹, each of a balance with itself or with one that a stream ties to it.

        Parameters
        ----------
        one, other : IntArray, shape (k,)
            Row and column of each. [1]

        Returns
        -------
        FloatArray, shape (k,)
            The elements. [1 over the unit of H]
        """
        return np.asarray(self._entries(one, other) / self.scale[one] / self.scale[other])

    def explained(self) -> FloatArray:
        """What the balances take off the variance of each stream.

        Returns
        -------
        FloatArray, shape (streams,)
            Diagonal of S A' H⁻¹ A S. [unit of the streams, squared]
        """
        first = diags_array(self.variance) @ self.incidence.T @ diags_array(1.0 / self.scale)
        ways = csr_array(block_array([[first, self.shared]])) if self.shared.shape[1] else csr_array(first)
        length = np.diff(ways.indptr)
        found = self.shared.power(2).sum(axis=1) if self.shared.shape[1] else np.zeros(len(self.variance))
        for one in range(int(length.max(initial=0))):  # as many as one stream touches, not as there are streams
            at = np.flatnonzero(length > one)
            for other in range(one + 1):
                p, q = ways.indptr[at] + one, ways.indptr[at] + other
                part = ways.data[p] * ways.data[q] * self._entries(ways.indices[p], ways.indices[q])
                found[at] += part if one == other else 2.0 * part  # eq. 2
        return np.asarray(found)

    def _entries(self, one: IntArray, other: IntArray) -> FloatArray:
        a, b = self.place[one], self.place[other]
        at = np.searchsorted(self.keys, np.minimum(a, b) * len(self.place) + np.maximum(a, b))
        return np.asarray(self.values[at])

    def _select(self, pivots: FloatArray) -> tuple[IntArray, FloatArray]:
        """Inverse of K on the pattern of L, column by column, with the key of each element."""
        size = len(pivots)
        lower = coo_array(self.lu.L)
        asked = coo_array(self.stored)
        ends = self.place[asked.coords[0]], self.place[asked.coords[1]]
        i = np.concatenate([lower.coords[0].astype(np.intp), ends[0]])
        j = np.concatenate([lower.coords[1].astype(np.intp), ends[1]])
        strictly = i > j
        keys = np.unique(j[strictly] * size + i[strictly])
        below = np.split(keys % size, np.searchsorted(keys, np.arange(1, size) * size))
        for own in below:  # a zero by chance must not hide a place that a child needs of its parent
            if len(own) > 1 and not np.isin(own[1:], below[own[0]], assume_unique=True).all():
                below[own[0]] = np.union1d(below[own[0]], own[1:])
        count = np.array([len(own) for own in below], dtype=np.intp)
        keys = np.repeat(np.arange(size), count) * size + np.concatenate(below)
        held = lower.coords[0] > lower.coords[1]
        factors = np.zeros(len(keys))
        factors[np.searchsorted(keys, lower.coords[1][held].astype(np.intp) * size + lower.coords[0][held])] = (
            lower.data[held]
        )
        columns = _columns(below, np.split(factors, np.cumsum(count)[:-1]), pivots)
        own = np.concatenate([np.append(column, rows) for column, rows in enumerate(below)])
        return np.repeat(np.arange(size), count + 1) * size + own, np.concatenate(columns)


def _columns(below: list[IntArray], factors: list[FloatArray], pivots: FloatArray) -> list[FloatArray]:
    """Eq. 1 for each column: its own place, then those below it; Z_SS is cut from the parent's block."""
    size = len(below)
    parent = [int(own[0]) if len(own) else size for own in below]
    youngest = dict(zip(reversed(parent), range(size - 1, -1, -1), strict=True))  # the last to need a block
    blocks: dict[int, FloatArray] = {}
    columns: list[FloatArray] = [np.zeros(0)] * size
    for j in range(size - 1, -1, -1):
        inner = np.zeros((0, 0))
        if len(below[j]):
            held = blocks[parent[j]]
            at = np.concatenate([[0], np.searchsorted(below[parent[j]], below[j][1:]) + 1])
            inner = held[at[:, None], at]
            if youngest[parent[j]] == j:
                del blocks[parent[j]]
        beside = -(inner @ factors[j])  # eq. 1
        columns[j] = np.concatenate([[1.0 / pivots[j] - factors[j] @ beside], beside])  # eq. 1
        if j in youngest:
            block = np.empty((len(beside) + 1, len(beside) + 1))
            block[1:, 1:], block[0], block[:, 0] = inner, columns[j], columns[j]
            blocks[j] = block
    return columns
