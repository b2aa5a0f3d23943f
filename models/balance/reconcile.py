"""Measured streams made to balance: values, uncertainties and statistics of every stream, node and group."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from scipy.sparse import csr_array, diags_array
from scipy.special import chdtrc

from models.arrays import FloatArray, IntArray, blocks
from models.balance.factor import DenseFactor, Factor, SparseFactor
from models.balance.network import OBSERVABLE, Network, Structure, classify, crossing
from models.balance.shared_factor import SharedFactor
from models.errors import DefinitionError

DENSE_ROWS = 500  # balances of a group up to which the whole matrix is the quickest
POOR_TOLERANCE = 1e-4  # of a reading's variance that is left: below, the difference would lose its digits
FEW_ERRORS = 32  # shared in a large group: with more, they are unknowns of one sparse matrix
COMPUTED_BLOCK = 128  # sums of streams whose uncertainty is found in one solution


@dataclass(frozen=True)
class Measurements:
    """Readings of the streams, and the errors of the instruments that several of them share.

    Parameters
    ----------
    value : FloatArray, shape (streams,)
        As read; NaN where it was not. [any one unit]
    random : FloatArray, shape (streams,)
        Standard uncertainty of the reading's own. [unit of value]
    shared : csr_array, shape (streams, instruments)
        Change of the reading for one standard deviation of the instrument's error. [unit of value]
    """

    value: FloatArray
    random: FloatArray
    shared: csr_array

    @classmethod
    def of(
        cls, value: Sequence[float | None], random: Sequence[float], shared: Sequence[Mapping[str, float]] = ()
    ) -> Measurements:
        """Measurements from lists.

        Parameters
        ----------
        value : sequence of float or None
            As read; None where it was not. [any one unit]
        random : sequence of float
            Standard uncertainty of each reading's own. [unit of value]
        shared : sequence of mapping of str to float
            By instrument: one standard deviation, signed; none at all if left out. [unit of value]

        Returns
        -------
        Measurements
            The same in columns. [unit of value]
        """
        numbers: dict[str, int] = {}
        entries = [
            (stream, numbers.setdefault(instrument, len(numbers)), size)
            for stream, own in enumerate(shared)
            for instrument, size in own.items()
            if size and value[stream] is not None
        ]
        stream, instrument, size = (np.array(column) for column in zip(*entries, strict=True)) if entries else ([],) * 3
        matrix = csr_array((np.asarray(size, dtype=float), (stream, instrument)), shape=(len(value), len(numbers)))
        return cls(np.array([np.nan if one is None else one for one in value]), np.array(random, dtype=float), matrix)


@dataclass(frozen=True)
class Group:
    """Nodes that hang together, tested as one; rows are its own balances.

    Parameters
    ----------
    members : IntArray
        Nodes. [1]
    first, rows : int
        The first of its balances in the structure's numbers, and how many there are. [1]
    statistic, p_value : float
        r' H⁻¹ r and its chance if nothing is wrong; NaN where there is no balance. [1]
    factor : Factor or None
        H factored. [unit of the values, squared]
    pull : FloatArray, shape (rows,)
        H⁻¹ r. [1 over the unit of the values]
    """

    members: IntArray
    first: int
    rows: int
    statistic: float
    p_value: float
    factor: Factor | SharedFactor | None
    pull: FloatArray


@dataclass(frozen=True)
class Reconciliation:
    """Streams and nodes in their order, and the groups; NaN where there is none.

    Parameters
    ----------
    structure : Structure
        What the shape of the network decides. [1]
    reconciled, uncertainty : FloatArray, shape (streams,)
        Value that agrees best with all readings, and its standard uncertainty. [unit of value]
    adjustment : FloatArray, shape (streams,)
        Measured less reconciled. [unit of value]
    score : FloatArray, shape (streams,)
        Statistic of greatest power against a fault of the stream alone. [1]
    imbalance, imbalance_uncertainty : FloatArray, shape (nodes,)
        What went out less what came in, as measured. [unit of value]
    node_score : FloatArray, shape (nodes,)
        Statistic of greatest power against a loss at the node alone; a loss is negative. [1]
    groups : tuple of Group
        One for each set of nodes that hang together. [1]
    """

    structure: Structure
    reconciled: FloatArray
    uncertainty: FloatArray
    adjustment: FloatArray
    score: FloatArray
    imbalance: FloatArray
    imbalance_uncertainty: FloatArray
    node_score: FloatArray
    groups: tuple[Group, ...]


def reconcile(network: Network, measured: Measurements) -> Reconciliation:
    """Every stream, node and group of a network.

    Parameters
    ----------
    network : Network
        Nodes and streams. [1]
    measured : Measurements
        Readings. [any one unit]

    Returns
    -------
    Reconciliation
        Values, uncertainties and statistics. [unit of the readings]

    Notes
    -----
    Readings are y = x + B c + e with independent e of variance D and latent errors c of unit variance,
    one for each instrument that is named twice or more; A x = 0 is the balance of each merged node. An
    instrument that two groups share is given to each as its own copy. With S = D + B B'::

        r = A y,  H = A D A' + (A B)(A B)'                                    (1)
        x̂ = y − S A' H⁻¹ r,  cov x̂ = S − S A' H⁻¹ A S                         (2)
        d = A' H⁻¹ r,  score_j = d_j / √(A' H⁻¹ A)_jj                         (3)
        statistic = r' H⁻¹ r, of chi-squared law with as many degrees as rows  (4)
        var g'x̂ = (g − A'u)' S (g − A'u),  u = H⁻¹ A S g                      (5)

    The last is the variance of a sum g of streams without a difference of large numbers.

    References
    ----------
    .. [1] D. R. Kuehn, H. Davidson, Chem. Eng. Prog. 57 (1961) 44–47.
    .. [2] R. S. H. Mah, A. C. Tamhane, AIChE J. 28 (1982) 828–830.
    .. [3] R. S. Bucy, P. D. Joseph, "Filtering for Stochastic Processes with Applications to Guidance",
       Interscience, 1968: eq. 5.
    .. [4] R. S. H. Mah, "Chemical Process Structures and Information Flows", Butterworths, 1990, ch. 8–9.
    """
    structure = classify(network)
    streams, nodes = len(network.streams), len(network.nodes)
    known = np.where(network.measured, measured.value, np.nan)
    every = (measured.random**2 + (measured.shared**2).sum(axis=1)) ** 0.5
    found = Reconciliation(
        structure,
        reconciled=known.copy(),
        uncertainty=np.where(network.measured, every, np.nan),
        adjustment=np.where(network.measured, 0.0, np.nan),
        score=np.full(streams, np.nan),
        imbalance=np.full(nodes, np.nan),
        imbalance_uncertainty=np.full(nodes, np.nan),
        node_score=np.full(nodes, np.nan),
        groups=(),
    )
    _raw(network, measured, found)
    by_group = _parted(structure.stream_group, structure.groups)
    members = _parted(structure.group, structure.groups)
    freedom = structure.degrees_of_freedom
    groups = []
    for group in range(structure.groups):
        own = by_group[group]
        part = _Part(network, measured, structure, own[network.measured[own]], int(freedom[group]), members[group])
        groups.append(part.solve(found))
        part.compute(found, own[~network.measured[own]])
    return replace(found, groups=tuple(groups))


def _parted(labels: IntArray, count: int) -> list[IntArray]:
    """Indices under each label, in their order; -1 is no label."""
    order = np.argsort(labels, kind="stable")
    bounds = np.searchsorted(labels[order], np.arange(count + 1))
    return [order[bounds[label] : bounds[label + 1]] for label in range(count)]


def _incidence(tail: IntArray, head: IntArray, rows: int) -> csr_array:
    """+1 where a stream leaves a balance, -1 where it enters one; -1 as an index is none."""
    streams = np.arange(len(tail))
    out, into = tail >= 0, head >= 0
    ones = np.concatenate([np.ones(out.sum()), -np.ones(into.sum())])
    at = np.concatenate([tail[out], head[into]]), np.concatenate([streams[out], streams[into]])
    return csr_array((ones, at), shape=(rows, len(tail)))


def _raw(network: Network, measured: Measurements, found: Reconciliation) -> None:
    """Imbalance of each node whose streams are all measured."""
    incidence = _incidence(network.source, network.target, len(network.nodes))
    touched = abs(incidence) @ (~network.measured).astype(np.float64) > 0.0
    variance = abs(incidence) @ measured.random**2 + ((incidence @ measured.shared) ** 2).sum(axis=1)
    found.imbalance[:] = np.where(touched, np.nan, incidence @ np.nan_to_num(measured.value))
    found.imbalance_uncertainty[:] = np.where(touched, np.nan, np.sqrt(variance))


class _Part:
    """One group's share of the problem."""

    def __init__(
        self, network: Network, measured: Measurements, structure: Structure, streams: IntArray, rows: int,
        members: IntArray,
    ) -> None:  # fmt: skip
        self.network, self.structure = network, structure
        self.streams, self.rows, self.members = streams, rows, members
        own = structure.row[members]
        self.first = int(own[own >= 0].min()) if rows else 0
        self.tail, self.head = (
            np.where(row >= 0, row - self.first, -1)
            for row in (structure.row[network.source[streams]], structure.row[network.target[streams]])
        )
        crossing_rows = self.tail != self.head
        self.incidence = _incidence(
            np.where(crossing_rows, self.tail, -1), np.where(crossing_rows, self.head, -1), rows
        )
        self.value = measured.value[streams]
        self.variance = measured.random[streams] ** 2  # D
        self.shared = _SHARES_NOTHING  # B, of instruments that the group names twice or more
        if measured.shared.nnz:
            shared = measured.shared[streams]
            often = np.bincount(shared.indices, minlength=shared.shape[1])
            self.variance += (shared[:, often == 1] ** 2).sum(axis=1)
            self.shared = shared[:, often > 1]
        self.factor: Factor | SharedFactor | None = None

    @property
    def latent(self) -> csr_array:
        """A B."""
        return self.incidence @ self.shared

    def solve(self, found: Reconciliation) -> Group:
        """Everything of the measured streams and the nodes."""
        if not self.rows:
            return Group(self.members, self.first, 0, np.nan, np.nan, None, np.zeros(0))
        self.factor = factor = self._factored()
        residual = self.incidence @ self.value  # eq. 1
        pull = factor.solve(residual)
        pull = pull + factor.solve(
            self.incidence @ (self.value - self._adjustment(pull))
        )  # digits lost to rough readings
        along = self.incidence.T @ pull  # eq. 3
        weight = self._weight(self.tail, self.head)
        checked = self.tail != self.head
        adjustment = self._adjustment(pull)
        explained = self.variance * (self.variance * weight)
        if self.shared.shape[1]:
            explained = self._explained(weight)
        whole = self.variance + (self.shared**2).sum(axis=1) if self.shared.shape[1] else self.variance
        found.reconciled[self.streams] = self.value - adjustment
        found.adjustment[self.streams] = adjustment
        found.uncertainty[self.streams] = np.sqrt(np.maximum(whole - explained, 0.0))
        poor = np.flatnonzero(whole - explained < POOR_TOLERANCE * whole)
        for block in blocks(len(poor), COMPUTED_BLOCK):
            alone = np.zeros((len(self.streams), len(poor[block])))
            alone[poor[block], range(len(poor[block]))] = 1.0
            found.uncertainty[self.streams[poor[block]]] = self._uncertainty(alone)
        found.score[self.streams[checked]] = along[checked] / np.sqrt(weight[checked])
        self._score_nodes(found, pull)
        statistic = float(residual @ pull)  # eq. 4
        chance = float(chdtrc(self.rows, max(statistic, 0.0)))
        return Group(self.members, self.first, self.rows, statistic, chance, factor, pull)

    def compute(self, found: Reconciliation, free: IntArray) -> None:
        """Unmeasured streams that the others determine."""
        observed = np.array([stream for stream in free if self.structure.observability[stream] == OBSERVABLE], np.intp)
        for block in blocks(len(observed), COMPUTED_BLOCK):
            streams = observed[block]
            sums = crossing(self.network, self.structure, streams, self.streams).T
            found.reconciled[streams] = found.reconciled[self.streams] @ sums
            found.uncertainty[streams] = self._uncertainty(sums)

    def _adjustment(self, pull: FloatArray) -> FloatArray:
        adjustment = self.variance * (self.incidence.T @ pull)
        if self.shared.shape[1]:
            adjustment = adjustment + self.shared @ (self.latent.T @ pull)
        return np.asarray(adjustment)  # eq. 2

    def _uncertainty(self, sums: FloatArray) -> FloatArray:
        """Of sums of reconciled streams, a column each, as a sum of squares: nothing is taken from anything."""
        if self.factor is not None:
            sums = sums - self.incidence.T @ self.factor.solve(self.incidence @ self._spread(sums))  # eq. 5
        variance = self.variance @ sums**2
        if self.shared.shape[1]:
            variance = variance + ((self.shared.T @ sums) ** 2).sum(axis=0)
        return np.asarray(np.sqrt(variance))

    def _spread(self, columns: FloatArray) -> FloatArray:
        """S times columns."""
        spread = self.variance[:, None] * columns
        if self.shared.shape[1]:
            spread = spread + self.shared @ (self.shared.T @ columns)
        return np.asarray(spread)

    def _factored(self) -> Factor | SharedFactor:
        latent = self.latent if self.shared.shape[1] else None
        if self.rows > DENSE_ROWS:
            try:
                if self.shared.shape[1] > FEW_ERRORS:
                    return SharedFactor(self.incidence, self.variance, self.shared)
                wide = np.zeros((self.rows, 0)) if latent is None else latent.toarray()
                return SparseFactor(self.incidence, self.variance, wide)
            except DefinitionError:  # errors of instruments alone may still be enough
                if latent is None:
                    raise
        covariance = (self.incidence @ diags_array(self.variance) @ self.incidence.T).toarray()
        if latent is not None:
            covariance += (latent @ latent.T).toarray()
        return DenseFactor(covariance)  # eq. 1

    def _weight(self, one: IntArray, other: IntArray) -> FloatArray:
        """(A' H⁻¹ A)_jj of streams from one balance to another, -1 being none."""
        assert self.factor is not None
        weight = np.zeros(len(one))
        for end in (one, other):
            own = (end >= 0) & (one != other)
            weight[own] += self.factor.inverse(end[own], end[own])
        both = (one >= 0) & (other >= 0) & (one != other)
        weight[both] -= 2.0 * self.factor.inverse(one[both], other[both])
        return weight

    def _explained(self, weight: FloatArray) -> FloatArray:
        """diag(S A' H⁻¹ A S) where streams share errors."""
        assert self.factor is not None
        if isinstance(self.factor, SharedFactor):
            return self.factor.explained()
        if isinstance(self.factor, SparseFactor):
            latent = self.latent.toarray()
            solved = self.factor.solve(latent)
            mixed = (self.shared * (self.incidence.T @ solved)).sum(axis=1)
            inner = (self.shared * (self.shared @ (latent.T @ solved))).sum(axis=1)
            return np.asarray(self.variance * (self.variance * weight) + 2.0 * self.variance * mixed + inner)
        seen = (self.incidence @ diags_array(self.variance) + self.latent @ self.shared.T).toarray()
        return np.asarray(np.sum(seen * self.factor.solve(seen), axis=0))

    def _score_nodes(self, found: Reconciliation, pull: FloatArray) -> None:
        assert self.factor is not None
        if self.structure.closed[self.structure.group[self.members[0]]]:
            return  # nothing can be lost at one node alone
        judged = self.members[self.structure.row[self.members] >= 0]
        row = self.structure.row[judged] - self.first
        found.node_score[judged] = pull[row] / np.sqrt(self.factor.inverse(row, row))


_SHARES_NOTHING = csr_array((0, 0))
