"""The classes of a network by its shape equal those by projection, and small networks are as plain sense has them."""

from __future__ import annotations

import numpy as np
import pytest

from models.balance.network import OUTSIDE, Network, classify, crossing, equivalent_faults
from tests.models.balance.drawn import Dense, Drawn, draw, groups

SEEDS = range(300)


def network(nodes: str, *streams: tuple[str, bool]) -> Network:
    """Streams as two letters, their ends; ``.`` is outside."""
    ends = [[nodes.find(letter) for letter in ends] for ends, _ in streams]  # str.find answers -1 for none
    return Network(
        list(nodes), [f"{ends}{at}" for at, (ends, _) in enumerate(streams)],
        np.array([source for source, _ in ends]), np.array([target for _, target in ends]),
        np.array([measured for _, measured in streams]),
    )  # fmt: skip


@pytest.fixture(scope="module")
def drawn() -> list[Drawn]:
    return [draw(seed, shared=False) for seed in SEEDS]


def test_classes_equal_those_by_projection(drawn: list[Drawn]) -> None:
    seen: set[str] = set()
    for one in drawn:
        structure = classify(one.network)
        for nodes, streams in groups(one.network):
            dense = Dense.of(one, nodes, streams)
            for stream, redundant in zip(dense.known, dense.redundant(), strict=True):
                assert structure.observability[stream] == ("redundant" if redundant else "nonredundant")
            for stream, observable in zip(dense.unknown, dense.observable(), strict=True):
                assert structure.observability[stream] == ("observable" if observable else "unobservable")
        seen |= set(structure.observability)
    assert seen == {"redundant", "nonredundant", "observable", "unobservable"}


def test_degrees_of_freedom_are_the_rank(drawn: list[Drawn]) -> None:
    for one in drawn:
        structure = classify(one.network)
        expected = {nodes[0]: Dense.of(one, nodes, streams).rank for nodes, streams in groups(one.network)}
        found = {int(np.flatnonzero(structure.group == at)[0]): int(structure.degrees_of_freedom[at])
                 for at in range(structure.groups)}  # fmt: skip
        assert found == expected
        assert structure.rows == sum(expected.values())


def test_groups_hang_together_without_the_outside(drawn: list[Drawn]) -> None:
    for one in drawn:
        structure = classify(one.network)
        expected = {tuple(nodes) for nodes, _ in groups(one.network)}
        assert {tuple(np.flatnonzero(structure.group == at).tolist()) for at in range(structure.groups)} == expected
        for nodes, streams in groups(one.network):
            assert set(structure.stream_group[streams].tolist()) <= {int(structure.group[nodes[0]])}


def test_equivalent_faults_are_those_with_parallel_signatures(drawn: list[Drawn]) -> None:
    largest = 0
    for one in drawn:
        structure = classify(one.network)
        classes = equivalent_faults(one.network, structure)
        found = {frozenset(member[:2] for member in members) for members in classes.values()}
        assert len(found) == len(classes)
        assert found == {own for nodes, streams in groups(one.network) for own in _parallel(one, nodes, streams)}
        largest = max(largest, *(len(own) for own in found), 0)
    assert largest >= 4


def _parallel(one: Drawn, nodes: list[int], streams: list[int]) -> set[frozenset[tuple[str, int]]]:
    dense = Dense.of(one, nodes, streams)
    faults = [("stream_bias", stream) for stream in dense.known] + [("node_loss", node) for node in nodes]
    columns = [*dense.projected.T, *dense.signatures.T]
    seen = [
        (fault, column / np.linalg.norm(column))
        for fault, column in zip(faults, columns, strict=True)
        if not np.isnan(dense.score(column))
    ]
    return {frozenset(other for other, there in seen if abs(abs(here @ there) - 1) < 1e-9) for _, here in seen}


def test_signs_of_faults_say_what_they_add_to_the_balance() -> None:
    # What went out less what came in: a stream that reads high adds where it leaves; a loss takes away.
    one = network("ab", (".a", True), ("ab", True), ("b.", True))
    faults = equivalent_faults(one, classify(one))
    row = classify(one).row
    assert faults[int(row[0]), -1] == [("stream_bias", 0, -1), ("node_loss", 0, -1)]
    assert faults[int(row[1]), -1] == [("stream_bias", 2, 1), ("node_loss", 1, -1)]
    ((first, _),) = (key for key in faults if key[1] >= 0)
    assert faults[int(row[0]), int(row[1])] if first == row[0] else faults[int(row[1]), int(row[0])]
    assert [members[0][2] for key, members in faults.items() if key[1] >= 0] == [1 if first == row[0] else -1]


@pytest.mark.parametrize(
    ("nodes", "streams", "expected", "freedom"),
    [
        # One node, both streams measured: each checks the other.
        ("a", [(".a", True), ("a.", True)], ["redundant", "redundant"], [1]),
        # One of them not measured: it is known from the other, and nothing is checked.
        ("a", [(".a", True), ("a.", False)], ["nonredundant", "observable"], [0]),
        # Two unknown ways out: only their sum is known.
        ("a", [(".a", True), ("a.", False), ("a.", False)], ["nonredundant", "unobservable", "unobservable"], [0]),
        # Two unknown streams in parallel inside merge their nodes and are not known one by one.
        ("ab", [(".a", True), ("ab", False), ("ab", False), ("b.", True)],
         ["redundant", "unobservable", "unobservable", "redundant"], [1]),
        # A stream beside an unmeasured one between the same nodes checks nothing, but splits it.
        ("ab", [(".a", True), ("ab", True), ("ab", False), ("b.", True)],
         ["redundant", "nonredundant", "observable", "redundant"], [1]),
        # A ring without an outside: two nodes, one balance, for the other is implied.
        ("ab", [("ab", True), ("ba", True)], ["redundant", "redundant"], [1]),
        # From outside to outside.
        ("a", [("..", True), ("..", False)], ["nonredundant", "unobservable"], [0]),
    ],
)  # fmt: skip
def test_small_networks(nodes: str, streams: list[tuple[str, bool]], expected: list[str], freedom: list[int]) -> None:
    structure = classify(network(nodes, *streams))
    assert list(structure.observability) == expected
    assert structure.degrees_of_freedom.tolist() == freedom


def test_nothing_can_be_lost_at_one_node_of_a_closed_ring() -> None:
    ring = network("ab", ("ab", True), ("ba", True))
    (members,) = equivalent_faults(ring, classify(ring)).values()
    assert [kind for kind, _, _ in members] == ["stream_bias", "stream_bias"]
    assert classify(ring).closed.tolist() == [True]


def test_boundaries_are_one_place_outside() -> None:
    # Unmeasured at both ends: a cycle through the outside, so neither end is known.
    through = network("ab", (".a", False), ("ab", True), ("b.", False))
    assert classify(through).observability == ("observable", "nonredundant", "observable")
    closed = network("a", (".a", False), ("a.", False))
    assert classify(closed).observability == ("unobservable", "unobservable")
    assert OUTSIDE == -1


def test_a_computed_stream_is_a_sum_around_the_nodes_behind_it() -> None:
    #  in 0 -> a -(1)-> b -(2)-> out, and 3 leaves b: 1 and 2 are unmeasured; 1 = 0, 2 = 0 - 3.
    one = network("ab", (".a", True), ("ab", False), ("b.", False), ("b.", True))
    weights = crossing(one, classify(one), np.array([1, 2]), np.array([0, 3]))
    assert weights.tolist() == [[1.0, 0.0], [1.0, -1.0]]


def test_a_path_of_many_nodes_is_walked_without_recursion() -> None:
    count = 5_000
    along = Network(
        [str(node) for node in range(count)], [str(stream) for stream in range(count + 1)],
        np.arange(-1, count), np.append(np.arange(count), -1), np.arange(count + 1) == 0,
    )  # fmt: skip
    structure = classify(along)
    assert structure.observability == ("nonredundant", *["observable"] * count)
    assert (crossing(along, structure, np.arange(1, 50), np.array([0])) == 1.0).all()
