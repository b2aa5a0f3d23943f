"""The balances of a group over a window of nights, merged by what was not measured, and their covariance factored."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from scipy.linalg import cholesky, solve_triangular
from scipy.sparse import csr_array

from models.arrays import FloatArray, IntArray
from models.balance.window import Check, Merged, Part, Stock
from models.errors import ModelError
from models.estimate import Estimate

FLOOR = 1.0  # kg², exact by convention: a balance of errors that cancel wholly is known to a kilogram
BEYOND = -1  # row of what has none

Term = tuple[int, float, Estimate]  # row, sign, measured value


@dataclass(frozen=True, eq=False)
class Rows:
    """Balances of one group, ordered by the night that completes them, with their law under no fault.

    Parameters
    ----------
    part : Part
        What they were made of. [kg]
    row_of : IntArray, shape (vessels, nights)
        Row of each vessel's night; −1 where it is merged with what is beyond the books. [1]
    check_rows : IntArray, shape (checks,)
        Row of each check. [1]
    night_of : IntArray, shape (rows,)
        The night that completes each row. [1]
    residual : FloatArray, shape (rows,)
        r = A y. [kg]
    errors : csr_array, shape (rows, errors)
        What one sigma of each named error adds to each row. [kg]
    names : dict of str to int
        Column of each error. [1]
    lower : FloatArray, shape (rows, rows)
        L of H = L L'. [kg]
    white : FloatArray, shape (rows,)
        w = L⁻¹ r. [1]
    losses : FloatArray, shape (rows, rows)
        L⁻¹: what one kilogram in each row adds to w. [1/kg]
    """

    part: Part
    row_of: IntArray
    check_rows: IntArray
    night_of: IntArray
    residual: FloatArray
    errors: csr_array
    names: dict[str, int]
    lower: FloatArray
    white: FloatArray
    losses: FloatArray

    @property
    def nights(self) -> int:
        """Number of nights. [1]"""
        return self.part.window.nights

    @property
    def ends(self) -> IntArray:
        """How many rows nights 0 … N have completed. [1]"""
        return np.searchsorted(self.night_of, np.arange(self.nights + 1), side="right")

    def uncertainty(self) -> FloatArray:
        """Standard uncertainty of each row alone, without the window.

        Returns
        -------
        FloatArray, shape (rows,)
            Root of the sum of squares of its named parts. [kg]
        """
        return np.asarray(np.sqrt(self.errors.power(2).sum(axis=1)))

    def shared_with(self, measured: Sequence[Estimate]) -> tuple[FloatArray, FloatArray]:
        """Covariance of measured values with the rows, and each value's own variance.

        Parameters
        ----------
        measured : sequence of Estimate
            Values whose errors bear the names of the rows' errors. [kg]

        Returns
        -------
        tuple of FloatArray, shapes (measured, rows) and (measured,)
            S A' and the diagonal of S. [kg²]
        """
        place, column, value = [], [], []
        for at, estimate in enumerate(measured):
            for name, part in estimate.parts.items():
                if name in self.names:
                    place.append(at)
                    column.append(self.names[name])
                    value.append(part)
        own = csr_array((value, (place, column)), shape=(len(measured), len(self.names)))
        variance = np.array([estimate.uncertainty**2 for estimate in measured])
        return np.asarray((own @ self.errors.T).toarray()), variance


def _merge(part: Part, stocks: dict[tuple[str, int], Stock]) -> Merged:
    """Vessels' nights joined by what was not measured between them, or to what is beyond the books (None)."""
    merged, nights = Merged(), part.window.nights
    for vessel in part.vessels:
        for close in range(nights + 1):
            stock = stocks.get((vessel, close))
            if stock is None or (stock.mass is None and stock.reopened is None):
                before = (vessel, close) if close > 0 else None
                after = (vessel, close + 1) if close < nights else None
                merged.join(before, after)
    for ticket in part.window.tickets:
        if ticket.mass is None:
            source = None if ticket.source is None else (ticket.source, ticket.night)
            target = None if ticket.target is None else (ticket.target, ticket.night)
            merged.join(source, target)
    return merged


def _number(part: Part, stocks: dict[tuple[str, int], Stock]) -> tuple[IntArray, IntArray, IntArray]:
    """Rows in the order of the nights that complete them, balances before checks within a night."""
    merged, nights = _merge(part, stocks), part.window.nights
    beyond = merged.find(None)
    last: dict[object, int] = {}
    roots = {(v, k): merged.find((v, k)) for v in part.vessels for k in range(1, nights + 1)}
    for (_, night), root in roots.items():
        last[root] = max(last.get(root, 0), night)
    last.pop(beyond, None)
    order = {root: at for at, root in enumerate(last)}
    checks = part.window.checks
    keys = [(night, 0, order[root]) for root, night in last.items()]
    keys += [(check.night, 1, at) for at, check in enumerate(checks)]
    places = sorted(range(len(keys)), key=keys.__getitem__)
    rank = np.empty(len(keys), dtype=np.intp)
    rank[places] = np.arange(len(keys))
    number = {root: int(rank[at]) for at, root in enumerate(last)}
    row_of = np.array(
        [[number.get(roots[v, k], BEYOND) for k in range(1, nights + 1)] for v in part.vessels], dtype=np.intp
    ).reshape(len(part.vessels), nights)
    return row_of, rank[len(last) :], np.array([keys[at][0] for at in places], dtype=np.intp)


def closing(stock: Stock) -> Estimate | None:
    """The mass with which a stock's night closes.

    Parameters
    ----------
    stock : Stock
        One vessel at one close. [kg]

    Returns
    -------
    Estimate or None
        Its mass, or where only the new definition knows one, that. [kg]
    """
    return stock.mass if stock.mass is not None else stock.reopened


def _terms(part: Part, row_of: IntArray, check_rows: IntArray) -> Iterator[Term]:
    """Each measured value with the row that it enters and the sign with which it does."""
    place = {vessel: at for at, vessel in enumerate(part.vessels)}
    nights = part.window.nights
    for stock in part.window.stocks:
        own, k = row_of[place[stock.vessel]], stock.close
        close = closing(stock)
        if close is None:
            continue
        reopened = stock.reopened if stock.reopened is not None else close
        before = int(own[k - 1]) if k > 0 else BEYOND
        after = int(own[k]) if k < nights else BEYOND
        if before == after and reopened is close:
            continue  # inside one merged row it cancels, or it is beyond the books on either side
        yield before, 1.0, close
        yield after, -1.0, reopened
    for ticket in part.window.tickets:
        if ticket.mass is not None:
            for end, sign in ((ticket.target, -1.0), (ticket.source, 1.0)):
                if end is not None:
                    yield int(row_of[place[end], ticket.night - 1]), sign, ticket.mass
    for row, check in zip(check_rows, part.window.checks, strict=True):
        yield int(row), 1.0, check.difference


def _gather(terms: Iterable[Term], count: int) -> tuple[FloatArray, csr_array, dict[str, int]]:
    """Rows' values and, by name of the error, their parts added by sign."""
    residual = np.zeros(count)
    names: dict[str, int] = {}
    row, column, value = [], [], []
    for at, sign, estimate in terms:
        if at == BEYOND:
            continue
        residual[at] += sign * estimate.value
        for name, part in estimate.parts.items():
            row.append(at)
            column.append(names.setdefault(name, len(names)))
            value.append(sign * part)
    errors = csr_array((np.array(value, dtype=np.float64), (row, column)), shape=(count, len(names)))
    errors.sum_duplicates()
    return residual, errors, names


def assemble(part: Part) -> Rows:
    """Balances of a group over the window, merged, ordered and whitened.

    Parameters
    ----------
    part : Part
        One group's stocks, movements and checks. [kg]

    Returns
    -------
    Rows
        Balances and their law under no fault. [kg]

    Notes
    -----
    Measured values y = x + B c + e with e of covariance D and c of unit variance, where B holds the errors that
    occur twice or more and D those that occur once, give for the balance of one vessel's night::

        (A y)_vk = m_vk − m_v,k−1 − Σ received + Σ delivered        (1)
        H = A (D + B B') A' + 1 kg² I        (2)

    As D = P P' with a column for each error that occurs once, A D A' and A B B' A' need no telling apart. What
    is not measured is an edge: it makes one row of the balances at its ends, and none of one that it ties to
    what is beyond the books. As rows stand in the order of the nights that complete them, the first rows of L
    and w are those of any shorter window.

    References
    ----------
    .. [1] R. S. H. Mah, G. M. Stanley, D. M. Downing, Ind. Eng. Chem. Process Des. Dev. 15 (1976) 175–183.
    """
    stocks = {(stock.vessel, stock.close): stock for stock in part.window.stocks}
    if len(stocks) != len(part.window.stocks):
        raise ModelError("a vessel has two stocks at one close; give one for each vessel and close")
    row_of, check_rows, night_of = _number(part, stocks)
    residual, errors, names = _gather(_terms(part, row_of, check_rows), len(night_of))  # eq. 1
    covariance = (errors @ errors.T).toarray()
    covariance[np.diag_indices_from(covariance)] += FLOOR  # eq. 2
    if len(night_of):
        lower = cholesky(covariance, lower=True, overwrite_a=True, check_finite=True)
        losses = solve_triangular(lower, np.eye(len(night_of)), lower=True)
        white = solve_triangular(lower, residual, lower=True)
    else:
        lower, losses, white = covariance, covariance, residual
    return Rows(part, row_of, check_rows, night_of, residual, errors, names, lower, white, losses)


def check_of(rows: Rows) -> Iterator[tuple[int, Check]]:
    """Checks with their rows.

    Parameters
    ----------
    rows : Rows
        A group's balances. [kg]

    Yields
    ------
    tuple of (int, Check)
        Row and check. [1, kg]
    """
    yield from ((int(row), check) for row, check in zip(rows.check_rows, rows.part.window.checks, strict=True))
