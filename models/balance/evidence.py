"""How strongly a group's balances speak for each explanation, after any of its nights, beside what is already named."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from scipy.sparse import csc_array

from models.arrays import BoolArray, FloatArray, IntArray, blocks
from models.balance.rows import Rows
from models.balance.thresholds import NO_SCORES, SpanningTree, spanning_tree

BLOCK_FLOATS = 2_000_000  # of whitened columns that are held at once: 16 MB
WHOLE_MATRIX = 2_000  # scores up to which all their correlations are held
FRESH_NIGHTS = 3  # nights, in which a fault that is tested tonight must have shown
FRESH_SHARE = 0.1  # of all that the window can say of it
COLLINEAR_TOLERANCE = 1e-9  # of its evidence: less than this is left of an explanation that those named span


@dataclass(frozen=True, eq=False)
class Evidence:
    """The two numbers of every explanation, of which all others are made.

    Parameters
    ----------
    num : FloatArray, shape (..., k)
        f' H⁻¹ r. [1/unit]
    q : FloatArray, shape (..., k)
        f' H⁻¹ f. [1/unit²]
    """

    num: FloatArray
    q: FloatArray

    @property
    def z(self) -> FloatArray:
        """Score of each, nought where the balances say nothing. [1]"""
        return np.where(self.q > 0.0, self.num / np.sqrt(np.where(self.q > 0.0, self.q, 1.0)), 0.0)

    @property
    def statistic(self) -> FloatArray:
        """T, the square of the score. [1]"""
        return np.square(self.z)

    @property
    def size(self) -> FloatArray:
        """Size by least squares, nought where the balances say nothing. [unit]"""
        return np.where(self.q > 0.0, self.num / np.where(self.q > 0.0, self.q, 1.0), 0.0)

    @property
    def sd(self) -> FloatArray:
        """Standard deviation of the size, infinite where the balances say nothing. [unit]"""
        with np.errstate(divide="ignore"):
            return np.asarray(1.0 / np.sqrt(self.q))

    @property
    def gain(self) -> FloatArray:
        """Log-likelihood won by a fault of size one. [1]"""
        return np.asarray(self.num - 0.5 * self.q)


def whitened(rows: Rows, columns: csc_array) -> FloatArray:
    """L⁻¹ F: columns as what they add to independent noise of unit variance.

    Parameters
    ----------
    rows : Rows
        A group's balances. [kg]
    columns : csc_array, shape (rows, k)
        Signatures. [kg per unit]

    Returns
    -------
    FloatArray, shape (k, rows)
        One row for each signature. [1/unit]
    """
    return np.asarray(columns.T.tocsr() @ rows.losses.T)


def weigh(rows: Rows, columns: csc_array, nights: Sequence[int]) -> Evidence:
    """Evidence for each signature at the ends of chosen nights, each as if the window ended there.

    Parameters
    ----------
    rows : Rows
        A group's balances. [kg]
    columns : csc_array, shape (rows, k)
        Signatures. [kg per unit]
    nights : sequence of int
        Last nights, 0 … N. [1]

    Returns
    -------
    Evidence, shape (nights, k)
        Running sums up to each of them. [1/unit, 1/unit²]

    Notes
    -----
    As rows stand in the order of nights, with f_w = L⁻¹ f and w = L⁻¹ r::

        f' H⁻¹ r = Σ f_w w,  f' H⁻¹ f = Σ f_w²,  over the rows up to night K        (1)

    References
    ----------
    .. [1] S. Narasimhan, R. S. H. Mah, AIChE J. 33 (1987) 1514–1521.
    """
    count = columns.shape[1]
    num, q = np.zeros((len(nights), count)), np.zeros((len(nights), count))
    ends = rows.ends[np.asarray(nights)]
    for block in blocks(count, max(1, BLOCK_FLOATS // max(1, len(rows.white)))):
        white = whitened(rows, columns[:, block])
        for at, end in enumerate(ends):
            num[at, block] = white[:, :end] @ rows.white[:end]  # eq. 1
            q[at, block] = np.einsum("ij,ij->i", white[:, :end], white[:, :end])  # eq. 1
    return Evidence(num, q)


def fresh(before: FloatArray, now: FloatArray) -> BoolArray:
    """Which explanations the last nights have something to say of.

    Parameters
    ----------
    before, now : FloatArray, shape (k,)
        f' H⁻¹ f three nights ago and tonight. [1/unit²]

    Returns
    -------
    BoolArray, shape (k,)
        True where the nights between gave at least a tenth. [1]
    """
    return np.asarray((now > 0.0) & (now - before >= FRESH_SHARE * now))


def correlations(rows: Rows, columns: csc_array) -> SpanningTree:
    """The strongest dependences among the scores of signatures.

    Parameters
    ----------
    rows : Rows
        A group's balances. [kg]
    columns : csc_array, shape (rows, k)
        Signatures, each of which the balances can see. [kg per unit]

    Returns
    -------
    SpanningTree
        Maximum spanning tree of the magnitudes of their correlations; of very many, trees of parts that are tied
        by edges of nought, which only raises the bound on a chance. [1]
    """
    count = columns.shape[1]
    place = np.argsort(_last_row(columns), kind="stable")  # what is alike stands together
    strength: list[FloatArray] = []
    for block in blocks(count, WHOLE_MATRIX):
        white = whitened(rows, columns[:, place[block]])
        white /= np.sqrt(np.einsum("ij,ij->i", white, white))[:, None]
        strength.append(spanning_tree(white @ white.T).strength)
    if not strength:
        return NO_SCORES
    return SpanningTree(count, np.concatenate([*strength, np.zeros(len(strength) - 1)]))


def _last_row(columns: csc_array) -> IntArray:
    """The last row that each column enters."""
    last = np.maximum(columns.indptr[1:] - 1, 0)
    return np.asarray(columns.indices[last] if columns.nnz else last, dtype=np.intp)


class Search:
    """Explanations beside those already named: their sizes are estimated together with them.

    Parameters
    ----------
    rows : Rows
        A group's balances. [kg]
    columns : csc_array, shape (rows, k)
        All signatures. [kg per unit]
    whole : Evidence, shape (k,)
        Of each alone. [1/unit, 1/unit²]

    Notes
    -----
    With U an orthonormal basis of what was named, whitened, the evidence of any other beside it is::

        num' = num − (U' f_w)' (U' w),  q' = q − |U' f_w|²        (1)

    which is the joint least-squares fit of all sizes.

    References
    ----------
    .. [1] Y. C. Pati, R. Rezaiifar, P. S. Krishnaprasad, Proc. 27th Asilomar Conf. (1993) 40–44.
    """

    def __init__(self, rows: Rows, columns: csc_array, whole: Evidence) -> None:
        self.rows, self.columns, self.whole = rows, columns, whole
        self.named: list[int] = []
        self.basis = np.zeros((len(rows.white), 0))
        self.evidence = whole

    def take(self, index: int) -> bool:
        """Name one more.

        Parameters
        ----------
        index : int
            Its column. [1]

        Returns
        -------
        bool
            False where those already named span it. [1]
        """
        own = whitened(self.rows, self.columns[:, [index]])[0]
        left = own - self.basis @ (self.basis.T @ own)
        left -= self.basis @ (self.basis.T @ left)
        if not left @ left > COLLINEAR_TOLERANCE * (own @ own):
            return False
        self.basis = np.column_stack([self.basis, left / np.sqrt(left @ left)])
        self.named.append(index)
        along = np.asarray(self.columns.T @ (self.rows.losses.T @ self.basis))
        num = self.whole.num - along @ (self.basis.T @ self.rows.white)  # eq. 1
        q = self.whole.q - np.einsum("ij,ij->i", along, along)  # eq. 1
        seen = q > COLLINEAR_TOLERANCE * self.whole.q
        self.evidence = Evidence(np.where(seen, num, 0.0), np.where(seen, q, 0.0))
        return True

    def without(self, index: int) -> Search:
        """The same search with one of those named taken back.

        Parameters
        ----------
        index : int
            Its column. [1]

        Returns
        -------
        Search
            All others named. [1]
        """
        other = Search(self.rows, self.columns, self.whole)
        for named in self.named:
            if named != index:
                other.take(named)
        return other

    def strongest(self, among: IntArray) -> tuple[float, int]:
        """The largest score of some.

        Parameters
        ----------
        among : IntArray, shape (m,)
            Their columns. [1]

        Returns
        -------
        tuple of (float, int)
            Its magnitude and column; nought and −1 where there are none. [1]
        """
        if not len(among):
            return 0.0, -1
        scores = np.abs(self.evidence.z[among])
        best = int(np.argmax(scores))
        return float(scores[best]), int(among[best])

    def whites(self, index: IntArray) -> FloatArray:
        """Whitened signatures, less what those named span.

        Parameters
        ----------
        index : IntArray, shape (m,)
            Their columns. [1]

        Returns
        -------
        FloatArray, shape (m, rows)
            One row for each. [1/unit]
        """
        white = whitened(self.rows, self.columns[:, index])
        return np.asarray(white - (white @ self.basis) @ self.basis.T)

    @property
    def residual(self) -> float:
        """Sum of squares that those named leave. [1]"""
        inside = self.basis.T @ self.rows.white
        return float(self.rows.white @ self.rows.white - inside @ inside)


def subsets(fixed: BoolArray, new: BoolArray, known: BoolArray) -> Iterator[IntArray]:
    """Explanations of free size that are tested tonight, and those that could only stand since before.

    Parameters
    ----------
    fixed, new, known : BoolArray, shape (k,)
        Whether the size is fixed, the last nights speak of it, the window speaks of it. [1]

    Yields
    ------
    IntArray
        Columns of the fresh, then of the older. [1]
    """
    yield np.flatnonzero(~fixed & new)
    yield np.flatnonzero(~fixed & known & ~new)
