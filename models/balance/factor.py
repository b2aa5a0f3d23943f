"""The covariance of balances, factored: solutions, and the elements of its inverse that the tests need."""

from __future__ import annotations

import numpy as np
from scipy.linalg import LinAlgError, cho_factor, cho_solve
from scipy.sparse import coo_array, csc_array, csr_array
from scipy.sparse.linalg import splu

from models.arrays import FloatArray, IntArray
from models.errors import DefinitionError

SCALE_TOLERANCE = 1e-100  # [unit of the values]: below, squares would leave the range of a float
PIVOT_TOLERANCE = 1e-12  # of a balance's own variance: below, it is known from the others without an error


def singular() -> DefinitionError:
    """The refusal of a covariance without an inverse.

    Returns
    -------
    DefinitionError
        To be raised. [1]
    """
    return DefinitionError(
        "Some balances have no error of their own: their streams share every error and it cancels, or their "
        "uncertainties differ by more than a million times; give those streams a random error, or no value"
    )


class DenseFactor:
    """Cholesky's factor of the whole matrix."""

    def __init__(self, covariance: FloatArray) -> None:
        scale = np.sqrt(np.diagonal(covariance))
        if not np.all(scale > SCALE_TOLERANCE):
            raise singular()
        self.scale = scale
        try:
            self.factor = cho_factor(covariance / scale / scale[:, None], lower=True, check_finite=False)
        except LinAlgError:
            raise singular() from None
        if np.min(np.diagonal(self.factor[0])) ** 2 < PIVOT_TOLERANCE:
            raise singular()
        self.whole: FloatArray | None = None

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
        return np.asarray(cho_solve(self.factor, right / scale, check_finite=False) / scale)

    def inverse(self, one: IntArray, other: IntArray) -> FloatArray:
        """Elements of H⁻¹.

        Parameters
        ----------
        one, other : IntArray, shape (k,)
            Row and column of each. [1]

        Returns
        -------
        FloatArray, shape (k,)
            The elements. [1 over the unit of H]
        """
        if self.whole is None:
            self.whole = self.solve(np.eye(len(self.scale)))
        return np.asarray(self.whole[one, other])


class SparseFactor:
    """LDL' of the sparse part, and the latent errors that touch many balances beside it.

    Notes
    -----
    With H = H0 + G G', W = H0⁻¹ G and M = I + G' W::

        H⁻¹ = H0⁻¹ − W M⁻¹ W'        (1)

    From the last column of L to the first, S being the rows below j that column j holds::

        Z_Sj = −Z_SS L_Sj,  Z_jj = 1/D_j − L_Sj' Z_Sj        (2)

    References
    ----------
    .. [1] M. A. Woodbury, "Inverting modified matrices", Memorandum Report 42, Statistical Research
       Group, Princeton, 1950.
    .. [2] K. Takahashi, J. Fagan, M.-S. Chen, Proc. 8th PICA Conference (1973) 63–69.
    """

    def __init__(self, incidence: csr_array, variance: FloatArray, latent: FloatArray) -> None:
        sparse = csc_array(incidence @ coo_array((variance, (range(len(variance)),) * 2)).tocsr() @ incidence.T)
        scale = np.sqrt(sparse.diagonal())
        if not np.all(scale > SCALE_TOLERANCE):
            raise singular()
        self.scale = scale
        sparse.sort_indices()
        columns = np.repeat(np.arange(len(scale)), np.diff(sparse.indptr))
        sparse.data = sparse.data / scale[sparse.indices] / scale[columns]
        try:
            self.factor = splu(
                sparse, permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.0, options={"SymmetricMode": True}
            )
        except RuntimeError:
            raise singular() from None
        self.pivots = self.factor.U.diagonal()
        symmetric = np.array_equal(self.factor.perm_r, self.factor.perm_c)
        if not symmetric or np.min(self.pivots) < PIVOT_TOLERANCE:
            raise singular()
        pattern = abs(incidence)
        self.pattern = csc_array(pattern @ pattern.T)
        self.latent = latent / scale[:, None]  # G
        self.beside = self.factor.solve(self.latent) if latent.size else self.latent  # W
        self.small = cho_factor(np.eye(latent.shape[1]) + self.latent.T @ self.beside) if latent.size else None
        self.selected: tuple[FloatArray, IntArray] | None = None

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
        found = self.factor.solve(right / scale)
        if self.small is not None:
            found = found - self.beside @ cho_solve(self.small, self.latent.T @ found)  # eq. 1
        return np.asarray(found / scale)

    def inverse(self, one: IntArray, other: IntArray) -> FloatArray:
        """Elements of H⁻¹ where H0 has its own.

        Parameters
        ----------
        one, other : IntArray, shape (k,)
            Row and column of each. [1]

        Returns
        -------
        FloatArray, shape (k,)
            The elements. [1 over the unit of H]
        """
        if self.selected is None:
            self.selected = self._select()
        values, keys = self.selected
        order = self.factor.perm_c.astype(np.intp)
        first, second = np.minimum(order[one], order[other]), np.maximum(order[one], order[other])
        found = values[np.searchsorted(keys, first * len(order) + second)]
        if self.small is not None:
            inner = cho_solve(self.small, self.beside.T)
            found = found - np.einsum("ik,ki->i", self.beside[one], inner[:, other])  # eq. 1
        return np.asarray(found / self.scale[one] / self.scale[other])

    def _select(self) -> tuple[FloatArray, IntArray]:
        """Inverse of H0 on the pattern of L, column by column, with the key of each element."""
        count = len(self.scale)
        held = self._structure()
        lower = csc_array(self.factor.L)
        lower.sort_indices()
        parts: list[FloatArray] = [np.zeros(0)] * count
        fronts: dict[int, FloatArray] = {}
        waiting = np.bincount([rows[1] for rows in held if len(rows) > 1], minlength=count)
        for column in range(count - 1, -1, -1):
            rows = held[column]
            below = rows[1:]
            front = np.empty((len(rows), len(rows)))
            if len(below):
                parent = int(below[0])
                at = np.searchsorted(held[parent], below)
                inner = fronts[parent][np.ix_(at, at)]
                own = slice(lower.indptr[column] + 1, lower.indptr[column + 1])
                factor = np.zeros(len(below))
                factor[np.searchsorted(below, lower.indices[own])] = lower.data[own]
                front[1:, 1:] = inner
                front[0, 1:] = front[1:, 0] = -inner @ factor
                front[0, 0] = 1.0 / self.pivots[column] - factor @ front[0, 1:]  # eq. 2
                waiting[parent] -= 1
                if not waiting[parent]:
                    del fronts[parent]
            else:
                front[0, 0] = 1.0 / self.pivots[column]
            if waiting[column]:
                fronts[column] = front
            parts[column] = front[0].copy()  # not a view, which would keep the whole front
        keys = np.concatenate([column * count + rows for column, rows in enumerate(held)])
        return np.concatenate(parts), keys

    def _structure(self) -> list[IntArray]:
        """Rows that each column of L holds, itself first: its own and those of the columns that it ends."""
        order = self.factor.perm_c
        pattern = coo_array(self.pattern)
        below = order[pattern.row] >= order[pattern.col]
        own = csc_array((np.ones(below.sum()), (order[pattern.row[below]], order[pattern.col[below]])))
        held: list[IntArray] = []
        children: dict[int, list[IntArray]] = {}
        for column in range(len(order)):
            rows = own.indices[own.indptr[column] : own.indptr[column + 1]]
            rows = np.unique(np.concatenate([rows, *children.pop(column, [])])).astype(np.intp)
            held.append(rows)
            if len(rows) > 1:
                children.setdefault(int(rows[1]), []).append(rows[1:])
        return held


Factor = DenseFactor | SparseFactor
