"""Drawn networks, and the same answers from dense projections: no graph, no latent variables, no sparse matrices."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.linalg import null_space

from models.arrays import FloatArray
from models.balance.network import Network
from models.balance.reconcile import Measurements

RANK = 1e-9


@dataclass(frozen=True)
class Drawn:
    """A network with readings."""

    network: Network
    measured: Measurements
    covariance: FloatArray  # of all readings; zero for what is not measured


def draw(seed: int, *, nodes: int = 0, streams: int = 0, unmeasured: float = 0.35, shared: bool = True) -> Drawn:
    """A network of up to eight nodes unless told otherwise, with loops, parallels and islands as they fall."""
    rng = np.random.default_rng(seed)
    nodes = nodes or int(rng.integers(1, 9))
    streams = streams or int(rng.integers(1, 3 * nodes + 2))
    source = rng.integers(-1, nodes, streams)
    target = rng.integers(-1, nodes, streams)
    source = np.where((source == target) & (source >= 0), -1, source)
    measured = rng.random(streams) >= unmeasured
    value = [float(one) if known else None for one, known in zip(rng.normal(50, 20, streams), measured, strict=True)]
    random = np.exp(rng.normal(0, 1, streams))
    instruments = [f"meter {number}" for number in range(int(rng.integers(1, 4)))] if shared else []
    sizes = [{name: float(rng.normal()) for name in instruments if rng.random() < 0.4} for _ in range(streams)]
    network = Network(
        [f"n{number}" for number in range(nodes)], [f"s{number}" for number in range(streams)], source, target, measured
    )
    columns = np.array([[own.get(name, 0.0) for name in instruments] for own in sizes]).reshape(
        streams, len(instruments)
    )
    covariance = np.diag(random**2) + columns @ columns.T
    covariance[~measured] = covariance[:, ~measured] = 0.0
    return Drawn(network, Measurements.of(value, random.tolist(), sizes), covariance)


def incidence(network: Network) -> FloatArray:
    """+1 where a stream leaves a node, -1 where it enters; what lies outside has no row."""
    matrix = np.zeros((len(network.nodes), len(network.streams)))
    for stream, (source, target) in enumerate(zip(network.source, network.target, strict=True)):
        if source >= 0:
            matrix[source, stream] += 1
        if target >= 0:
            matrix[target, stream] -= 1
    return matrix


def groups(network: Network) -> list[tuple[list[int], list[int]]]:
    """Nodes and streams that hang together, in the order of their first node."""
    label = list(range(len(network.nodes)))
    ends = list(zip(network.source.tolist(), network.target.tolist(), strict=True))
    for _ in label:
        for source, target in ends:
            if source >= 0 and target >= 0:
                label[source] = label[target] = min(label[source], label[target])
    return [
        (
            [node for node, own in enumerate(label) if own == one],
            [at for at, own in enumerate(ends) if any(end >= 0 and label[end] == one for end in own)],
        )
        for one in sorted(set(label))
    ]


@dataclass(frozen=True)
class Dense:
    """One group by projections: P' A_u = 0, C = P' A_m, everything else from C and the whole covariance."""

    nodes: list[int]
    known: list[int]
    unknown: list[int]
    projected: FloatArray  # C
    signatures: FloatArray  # P' of a unit at each node
    inner: FloatArray  # generalised inverse of C S C'
    covariance: FloatArray
    matrix_known: FloatArray
    matrix_unknown: FloatArray
    value: FloatArray

    @classmethod
    def of(cls, drawn: Drawn, nodes: list[int], streams: list[int]) -> Dense:
        known = [one for one in streams if drawn.network.measured[one]]
        unknown = [one for one in streams if not drawn.network.measured[one]]
        whole = incidence(drawn.network)[nodes]
        free = null_space(whole[:, unknown].T, rcond=RANK) if unknown else np.eye(len(nodes))
        projected = free.T @ whole[:, known]
        covariance = drawn.covariance[np.ix_(known, known)]
        inner = np.linalg.pinv(projected @ covariance @ projected.T, rcond=RANK, hermitian=True)
        return cls(
            nodes, known, unknown, projected, free.T, inner, covariance, whole[:, known], whole[:, unknown],
            drawn.measured.value[known],
        )  # fmt: skip

    @property
    def residual(self) -> FloatArray:
        return self.projected @ self.value

    @property
    def rank(self) -> int:
        return int(np.linalg.matrix_rank(self.projected, tol=RANK)) if self.projected.size else 0

    @property
    def statistic(self) -> float:
        return float(self.residual @ self.inner @ self.residual)

    def reconciled(self) -> FloatArray:
        return self.value - self.covariance @ self.projected.T @ self.inner @ self.residual

    def spread(self) -> FloatArray:
        """Covariance of the reconciled values."""
        seen = self.projected @ self.covariance
        return self.covariance - seen.T @ self.inner @ seen

    def redundant(self) -> list[bool]:
        return [bool(np.abs(column).max(initial=0.0) > RANK) for column in self.projected.T]

    def observable(self) -> list[bool]:
        free = null_space(self.matrix_unknown, rcond=RANK)
        return [bool(np.abs(row).max(initial=0.0) < RANK) for row in free]

    def computed(self) -> tuple[FloatArray, FloatArray]:
        """Values and variances of unmeasured streams; right where they are observable."""
        weights = -np.linalg.pinv(self.matrix_unknown, rcond=RANK) @ self.matrix_known
        return weights @ self.reconciled(), np.einsum("ij,jk,ik->i", weights, self.spread(), weights)

    def score(self, signature: FloatArray) -> float:
        """Maximum-power statistic of a fault; NaN if it leaves nothing, or more than the streams could show."""
        reach = self.projected @ np.linalg.pinv(self.projected, rcond=RANK) if self.projected.size else 0.0 * self.inner
        if np.abs(signature).max(initial=0.0) < RANK or np.abs(reach @ signature - signature).max() > RANK:
            return float("nan")
        weighted = self.inner @ signature
        return float(weighted @ self.residual / np.sqrt(weighted @ signature))

    def drop(self, signatures: FloatArray) -> tuple[float, FloatArray, FloatArray]:
        """How far faults of free sizes lower the statistic, their sizes and the covariance of these."""
        values, vectors = np.linalg.eigh(self.inner)
        root = vectors * np.sqrt(np.maximum(values, 0.0)) @ vectors.T
        sizes, *_ = np.linalg.lstsq(root @ signatures, root @ self.residual, rcond=None)
        left = root @ (self.residual - signatures @ sizes)
        spread = np.linalg.inv(signatures.T @ self.inner @ signatures)
        return self.statistic - float(left @ left), np.asarray(sizes), np.asarray(spread)
