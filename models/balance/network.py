"""What a network's shape alone decides: which streams are checked, computed or unknown, and which faults look alike."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from models.arrays import BoolArray, FloatArray, IntArray

OUTSIDE = -1  # as an end of a stream: what lies beyond the network, one node without a balance
REDUNDANT, NONREDUNDANT, OBSERVABLE, UNOBSERVABLE = "redundant", "nonredundant", "observable", "unobservable"


@dataclass(frozen=True)
class Network:
    """Nodes and the streams between them.

    Parameters
    ----------
    nodes, streams : sequence of str
        Names, each once. [1]
    source, target : IntArray, shape (streams,)
        Index of the node at each end, or ``OUTSIDE``. [1]
    measured : BoolArray, shape (streams,)
        Whether the stream has a reading. [1]
    """

    nodes: Sequence[str]
    streams: Sequence[str]
    source: IntArray
    target: IntArray
    measured: BoolArray


@dataclass(frozen=True)
class Structure:
    """The classes of a network. The last element of ``row`` and ``place`` is what lies outside.

    Parameters
    ----------
    row : IntArray, shape (nodes + 1,)
        Balance of each node, -1 for none; nodes joined by unmeasured streams have one together;
        those of a group are numbered in one run. [1]
    rows : int
        Independent balances. [1]
    group : IntArray, shape (nodes,)
        Which nodes hang together, with the outside taken away. [1]
    closed : BoolArray, shape (groups,)
        Groups without a stream to the outside: no mass can leave one node alone. [1]
    stream_group : IntArray, shape (streams,)
        The group of each stream; -1 from outside to outside. [1]
    observability : tuple of str
        Of each stream: redundant, nonredundant, observable or unobservable. [1]
    place : IntArray, shape (nodes + 1,)
        Position in the walk along unmeasured streams, -1 for nodes without any. [1]
    low, high : IntArray, shape (streams,)
        An observable stream is the only one unmeasured that leaves the nodes with low ≤ place < high. [1]
    """

    row: IntArray
    rows: int
    group: IntArray
    closed: BoolArray
    stream_group: IntArray
    observability: tuple[str, ...]
    place: IntArray
    low: IntArray
    high: IntArray

    @property
    def groups(self) -> int:
        """How many groups there are. [1]"""
        return len(self.closed)

    @cached_property
    def degrees_of_freedom(self) -> IntArray:
        """Independent balances of each group. [1]"""
        kept = self.row[:-1] >= 0
        pairs = np.unique(np.stack([self.row[:-1][kept], self.group[kept]]), axis=1)
        return np.bincount(pairs[1], minlength=self.groups)


def classify(network: Network) -> Structure:
    """Classes of the streams, groups and balances, by joining and walking alone.

    Parameters
    ----------
    network : Network
        Nodes and streams. [1]

    Returns
    -------
    Structure
        What the shape decides. [1]

    Notes
    -----
    With what lies outside as one more node, nodes are merged along every unmeasured stream. A measured
    stream is redundant if its ends are in different merged nodes; an unmeasured one is observable if it
    is on no cycle of unmeasured streams. For each group, with one merged node for the outside::

        degrees of freedom = merged nodes − connected components        (1)

    References
    ----------
    .. [1] R. S. H. Mah, G. M. Stanley, D. M. Downing, Ind. Eng. Chem. Process Des. Dev. 15 (1976) 175–183.
    .. [2] A. Kretsovalis, R. S. H. Mah, Comput. Chem. Eng. 12 (1988) 671–687.
    """
    count = len(network.nodes)
    source = np.where(network.source < 0, count, network.source)
    target = np.where(network.target < 0, count, network.target)
    free = ~network.measured
    merged = _components(count + 1, source[free], target[free])
    inner = (source < count) & (target < count)
    group = _components(count, source[inner], target[inner])
    groups = int(group.max(initial=-1)) + 1
    end = np.where(source < count, source, target)
    stream_group = np.where(end < count, np.append(group, -1)[end], -1)
    closed = np.ones(groups, dtype=np.bool_)
    closed[stream_group[~inner & (stream_group >= 0)]] = False

    kept = np.ones(int(merged.max()) + 1, dtype=np.bool_)
    kept[merged[count]] = False
    _, firsts = np.unique(group, return_index=True)
    kept[merged[firsts[closed]]] = False  # eq. 1: the balances of a closed component sum to nothing
    owner = np.zeros(len(kept), dtype=np.intp)
    owner[merged[:count]] = group
    order = np.argsort(np.where(kept, owner, groups), kind="stable")[: int(kept.sum())]
    numbers = np.full(len(kept), -1, dtype=np.intp)
    numbers[order] = np.arange(len(order))

    place, low, high = _walk(count, source, target, free)
    classes = np.where(
        free,
        np.where(high > low, OBSERVABLE, UNOBSERVABLE),
        np.where(merged[source] != merged[target], REDUNDANT, NONREDUNDANT),
    )
    return Structure(
        numbers[merged], len(order), group, closed, stream_group, tuple(classes.tolist()), place, low, high
    )


def equivalent_faults(network: Network, structure: Structure) -> dict[tuple[int, int], list[tuple[str, int, int]]]:
    """Single faults that no residual can tell apart.

    Parameters
    ----------
    network : Network
        Nodes and streams. [1]
    structure : Structure
        Its classes. [1]

    Returns
    -------
    dict from (int, int) to list of (str, int, int)
        By the two balances that a fault touches (the second -1 for one alone): kind, index of the
        stream or node, and sign with which a unit of it adds to the first. [1]

    Notes
    -----
    Streams between the same two merged nodes, and the losses of nodes that are merged, leave the same
    residuals; a bias of a stream to the outside is a loss at its node. A balance being what went out
    less what came in, a unit of each adds::

        bias of a stream: +1 at its source, −1 at its target;  loss: −1        (1)

    References
    ----------
    .. [1] S. Narasimhan, R. S. H. Mah, AIChE J. 33 (1987) 1514–1521.
    .. [2] M. J. Bagajewicz, Q. Jiang, Comput. Chem. Eng. 22 (1998) 1789–1809.
    """
    found: dict[tuple[int, int], list[tuple[str, int, int]]] = {}
    tails, heads = structure.row[network.source], structure.row[network.target]  # OUTSIDE is the last element
    for stream, (tail, head) in enumerate(zip(tails.tolist(), heads.tolist(), strict=True)):
        if structure.observability[stream] != REDUNDANT:
            continue
        first, second = sorted((tail, head), key=lambda row: (row < 0, row))
        found.setdefault((first, second), []).append(("stream_bias", stream, 1 if first == tail else -1))  # eq. 1
    for node in range(len(network.nodes)):
        if structure.row[node] >= 0 and not structure.closed[structure.group[node]]:
            found.setdefault((int(structure.row[node]), -1), []).append(("node_loss", node, -1))  # eq. 1
    return found


def _components(count: int, one: IntArray, other: IntArray) -> IntArray:
    """Label of each node's connected component."""
    if count == 0:
        return np.zeros(0, dtype=np.intp)
    joined = coo_array((np.ones(len(one)), (one, other)), shape=(count, count))
    return np.asarray(connected_components(joined, directed=False)[1], dtype=np.intp)


def _walk(
    count: int, source: IntArray, target: IntArray, free: BoolArray
) -> tuple[IntArray, IntArray, IntArray]:  # fmt: skip
    """Depth first along unmeasured streams, from outside first; which of them are bridges, and to where.

    A stream of the tree is a bridge if nothing below it reaches above it by another stream (Tarjan 1974).
    """
    ways: dict[int, list[tuple[int, int]]] = {}
    for stream in np.flatnonzero(free).tolist():
        one, other = int(source[stream]), int(target[stream])
        ways.setdefault(one, []).append((other, stream))
        ways.setdefault(other, []).append((one, stream))
    place = np.full(count + 1, -1, dtype=np.intp)
    low = np.zeros(len(source), dtype=np.intp)
    high = np.zeros(len(source), dtype=np.intp)
    placed = 0
    reach = [0] * (count + 1)
    for root in sorted(ways, key=lambda node: (node != count, node)):
        if place[root] >= 0:
            continue
        place[root] = reach[root] = placed
        placed += 1
        path = [(root, -1, iter(ways[root]))]
        while path:
            node, came, further = path[-1]
            for other, stream in further:
                if stream == came:
                    continue
                if place[other] >= 0:
                    reach[node] = min(reach[node], int(place[other]))
                    continue
                place[other] = reach[other] = placed
                placed += 1
                path.append((other, stream, iter(ways[other])))
                break
            else:
                path.pop()
                if path:
                    above = path[-1][0]
                    reach[above] = min(reach[above], reach[node])
                    if reach[node] == place[node]:
                        low[came], high[came] = place[node], placed
    return place, low, high


def crossing(network: Network, structure: Structure, computed: IntArray, known: IntArray) -> FloatArray:
    """Weights with which observable streams are sums of measured ones.

    Parameters
    ----------
    network : Network
        Nodes and streams. [1]
    structure : Structure
        Its classes. [1]
    computed : IntArray, shape (c,)
        Observable streams. [1]
    known : IntArray, shape (k,)
        Measured streams of their groups. [1]

    Returns
    -------
    FloatArray, shape (c, k)
        -1, 0 or +1. [1]

    Notes
    -----
    Around the nodes U behind the stream, where nothing else unmeasured crosses::

        Σ_out x − Σ_in x = 0        (1)

    References
    ----------
    .. [1] G. M. Stanley, R. S. H. Mah, Chem. Eng. Sci. 36 (1981) 259–272.
    """
    low, high = structure.low[computed][:, None], structure.high[computed][:, None]

    def leaves(streams: IntArray) -> FloatArray:
        source, target = structure.place[network.source[streams]], structure.place[network.target[streams]]
        within_source, within_target = (low <= source) & (source < high), (low <= target) & (target < high)
        return within_source.astype(np.float64) - within_target

    own = np.diagonal(leaves(computed))[:, None]
    return np.asarray(-own * leaves(known))  # eq. 1
