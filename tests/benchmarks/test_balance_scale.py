"""How the time of a balance grows from 1,000 to 10,000 nodes with three streams a node."""

from __future__ import annotations

import math
from functools import partial

import numpy as np
import pytest

from models.balance.network import Network
from models.balance.reconcile import Measurements, reconcile
from models.balance.suspects import suspects
from tests.benchmarks.conftest import Ratio

FEW, MANY, DOZEN = 1_000, 10_000, 12


def plant(nodes: int, size: int, unmeasured: float) -> tuple[Network, Measurements]:
    """Lines of ``size`` nodes with streams between near ones, three streams a node, five instruments for all."""
    rng = np.random.default_rng(nodes)
    at = np.arange(nodes)
    first, last = at % size == 0, (at % size == size - 1) | (at == nodes - 1)
    line = np.where(first, -1, at - 1), at
    near = np.clip(at + rng.integers(1, 9, nodes), 0, np.minimum((at // size + 1) * size, nodes) - 1)
    again = np.where(near == at, -1, near), at
    out = at, np.where(last | (rng.random(nodes) < 0.1), -1, np.minimum(at + 2, nodes - 1))
    out = out[0], np.where(out[1] // size == at // size, out[1], -1)
    source, target = (np.concatenate(ends) for ends in zip(line, again, out, strict=True))
    source = np.where(source == target, -1, source)
    measured = rng.random(3 * nodes) >= unmeasured
    value = np.where(measured, rng.normal(0.0, 1.0, 3 * nodes), np.nan)
    names = [str(name) for name in range(3 * nodes)]
    network = Network(names[:nodes], names, source, target, measured)
    shared = [{f"prover {number % 5}": 0.5} if number % 4 == 0 else {} for number in range(3 * nodes)]
    readings = [float(one) if known else None for one, known in zip(value, measured, strict=True)]
    return network, Measurements.of(readings, [1.0] * (3 * nodes), shared)


def judged(network: Network, measured: Measurements) -> int:
    found = reconcile(network, measured)
    suspects(network, found, 0.05)
    return sum(group.rows for group in found.groups)


@pytest.mark.parametrize("unmeasured", [0.0, 0.02])
@pytest.mark.parametrize("size", [DOZEN, MANY], ids=["dozens", "one"])
def test_growth_with_the_network(ratio: Ratio, size: int, unmeasured: float) -> None:
    many, few = plant(MANY, size, unmeasured), plant(FEW, size, unmeasured)
    assert judged(*many) > 9 * judged(*few) > 0
    how = "one group" if size == MANY else "groups of a dozen"
    what = f"balance, {how}, {unmeasured:.0%} unmeasured, 10,000 to 1,000 nodes"
    grown = ratio(what, partial(judged, *many), partial(judged, *few), units=MANY, rounds=2)
    print(f"\n{what}: exponent {math.log10(grown):.2f}")
