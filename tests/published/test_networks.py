"""Networks of the literature on reconciliation, to all digits that are known of them.

The exchanger with a bypass: S. Narasimhan, C. Jordache, "Data Reconciliation and Gross Error Detection",
Gulf, 2000, ch. 1, 3 and 7; readings and reconciled flows from memory. The recycle: C. Iordache, R. S. H. Mah,
A. C. Tamhane, AIChE J. 31 (1985) 1187, and J. Rosenberg, R. S. H. Mah, C. Iordache, Ind. Eng. Chem. Res. 26
(1987) 555; shape and flows from memory, which close exactly. What else is expected here was worked out
for these readings with dense matrices from the textbook formulas, apart from this project's code.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from numpy.typing import ArrayLike

from models.balance.network import OUTSIDE, Network, equivalent_faults
from models.balance.night import critical_score
from models.balance.reconcile import Measurements, Reconciliation, reconcile
from models.balance.suspects import Fault, candidates, suspects

EXCHANGER = ("SPLIT", "HX", "VALVE", "MIX")
EXCHANGER_ENDS = ((-1, 0), (0, 1), (0, 2), (1, 3), (2, 3), (3, -1))
READINGS = [101.91, 64.45, 34.65, 64.20, 36.44, 98.88]
RECYCLE = ("1", "2", "3", "4")
RECYCLE_ENDS = ((-1, 0), (0, 1), (1, 2), (2, 0), (2, 3), (3, 0), (3, -1))
FLOWS = [5.0, 15.0, 15.0, 5.0, 10.0, 5.0, 5.0]
SPREAD = [0.125, 0.375, 0.375, 0.125, 0.25, 0.125, 0.125]  # 2.5 %


def solved(
    nodes: tuple[str, ...], ends: tuple[tuple[int, int], ...], value: list[float | None], random: list[float]
) -> tuple[Network, Reconciliation]:
    network = Network(
        nodes,
        [str(number) for number in range(1, len(ends) + 1)],
        np.array([source for source, _ in ends]),
        np.array([target for _, target in ends]),
        np.array([one is not None for one in value]),
    )
    return network, reconcile(network, Measurements.of(value, random))


def exchanger(value: list[float | None]) -> tuple[Network, Reconciliation]:
    return solved(EXCHANGER, EXCHANGER_ENDS, value, [1.0] * 6)


def near(expected: ArrayLike, digits: float = 5e-10) -> object:
    return pytest.approx(np.asarray(expected, dtype=float), abs=digits, nan_ok=True)


def names(network: Network, found: Reconciliation) -> set[frozenset[str]]:
    """Classes of two or more equivalent faults."""
    return {
        frozenset(
            f"bias:{network.streams[index]}" if kind == "stream_bias" else f"leak:{network.nodes[index]}"
            for kind, index, _ in members
        )
        for members in equivalent_faults(network, found.structure).values()
        if len(members) > 1
    }


def test_outside_is_what_a_missing_end_is() -> None:
    assert OUTSIDE == -1


def test_exchanger_all_measured() -> None:
    network, found = exchanger([*READINGS])
    # Reconciled flows: Narasimhan & Jordache 2000, the table of ch. 1 (from memory).
    assert found.reconciled == near([100.22, 64.50, 35.72, 64.50, 35.72, 100.22], 1e-9)
    # Six readings of variance 1 and four balances leave variances 1/3 each: worked out.
    assert found.uncertainty == near([0.5773502692] * 6)
    assert found.adjustment == near([1.69, -0.05, -1.07, -0.30, 0.72, -1.34], 1e-9)  # readings less the table
    scores = [2.069818833, -0.06123724357, -1.310477012, -0.3674234614, 0.8818163074, -1.641158128]
    assert found.score == near(scores, 5e-10)
    assert found.structure.observability == ("redundant",) * 6
    (group,) = found.groups
    assert (group.rows, group.statistic, group.p_value) == (4, near(6.4075, 1e-9), near(0.1707127404, 5e-11))
    assert found.imbalance == near([-2.81, -0.25, 1.79, -1.76], 1e-9)  # sums of the readings
    # Nodal statistics; a loss is negative, so these have the sign opposite to in less out.
    assert found.imbalance / found.imbalance_uncertainty == near(
        [-1.622354256, -0.1767766953, 1.265721138, -1.016136474]
    )
    assert -found.node_score == near([2.069818833, 1.64, 0.62, 1.641158128])
    assert names(network, found) == {frozenset({"bias:1", "leak:SPLIT"}), frozenset({"bias:6", "leak:MIX"})}
    assert suspects(network, found, 0.05) == ((),)  # nothing passes; the readings have no gross error


def test_exchanger_single_faults() -> None:
    network, found = exchanger([*READINGS])
    (own,) = candidates(network, found)
    assert own is not None
    statistic, size, variance = own.given([])
    measured = {
        (fault.kind, fault.subject): (float(statistic[index]), fault.magnitude, math.sqrt(variance[index]))
        for index in range(len(own))
        for fault in own.faults(index, float(size[index]))
    }
    # GLR statistics, sizes and their uncertainties: worked out.
    tested = {
        ("stream_bias", "1"): (4.28415, 2.535, 1.224744871),
        ("stream_bias", "2"): (0.00375, -0.075, 1.224744871),
        ("stream_bias", "3"): (1.71735, -1.605, 1.224744871),
        ("stream_bias", "4"): (0.135, -0.45, 1.224744871),
        ("stream_bias", "5"): (0.7776, 1.08, 1.224744871),
        ("stream_bias", "6"): (2.6934, -2.01, 1.224744871),
        ("node_loss", "SPLIT"): (4.28415, 2.535, 1.224744871),
        ("node_loss", "HX"): (2.6896, 1.64, 1.0),
        ("node_loss", "VALVE"): (0.3844, 0.62, 1.0),
        ("node_loss", "MIX"): (2.6934, 2.01, 1.224744871),
    }
    assert measured.keys() == tested.keys()
    for key, expected in tested.items():
        assert measured[key] == pytest.approx(expected, abs=5e-10), key


def test_exchanger_with_two_streams_unmeasured() -> None:
    network, found = exchanger([101.91, 64.45, None, None, 36.44, 98.88])
    assert found.structure.observability == (
        "redundant",
        "redundant",
        "observable",
        "observable",
        "redundant",
        "redundant",
    )
    assert found.reconciled == near([100.494, 64.252, 36.242, 64.252, 36.242, 100.494], 1e-9)
    spread = [0.632455532, 0.7745966692, 0.7745966692, 0.7745966692, 0.7745966692, 0.632455532]
    assert found.uncertainty == near(spread)
    assert found.score == near([1.828048139, 0.3130654884, np.nan, np.nan, 0.3130654884, -2.08366504])
    (group,) = found.groups
    assert (group.rows, group.statistic, group.p_value) == (2, near(4.68846, 1e-9), near(0.0959210329, 5e-11))
    assert np.isnan(found.imbalance).all() and np.isnan(found.imbalance_uncertainty).all()
    assert -found.node_score == near([1.828048139, 2.08366504, 1.828048139, 2.08366504])
    assert names(network, found) == {
        frozenset({"bias:1", "leak:SPLIT", "leak:VALVE"}),
        frozenset({"bias:2", "bias:5"}),
        frozenset({"bias:6", "leak:HX", "leak:MIX"}),
    }
    (own,) = candidates(network, found)
    assert own is not None
    statistic, size, variance = own.given([])
    tested = {"1": (3.34176, 2.36, 1.290994449), "2": (0.09801, 0.495, 1.58113883), "6": (4.34166, -2.69, 1.290994449)}
    for index in range(len(own)):
        (fault,) = (one for one in own.faults(index, float(size[index])) if one.subject in tested)
        expected = tested[fault.subject]
        assert (statistic[index], fault.magnitude, math.sqrt(variance[index])) == pytest.approx(expected, abs=5e-10)


def test_exchanger_with_four_too_much_on_one_stream() -> None:
    # The same readings with +4 on stream 2: a leak of the exchanger explains more than the bias that is there.
    network, found = exchanger([101.91, 68.45, 34.65, 64.20, 36.44, 98.88])
    (listed,) = suspects(network, found, 0.05)
    assert [one.number for one in listed] == [1, 1]
    assert [one.fault.kind for one in listed] == ["node_loss", "stream_bias"]
    assert [one.fault.subject for one in listed] == ["HX", "2"]
    assert [one.statistic for one in listed] == pytest.approx([13.25, 10.27], abs=0.005)
    # Ratio of the shares, exp of half the gap: 4.5 to 1.
    assert listed[0].share / listed[1].share == pytest.approx(4.5, abs=0.1)


def test_recycle_closes_exactly() -> None:
    network, found = solved(RECYCLE, RECYCLE_ENDS, [*FLOWS], SPREAD)
    assert found.reconciled == near(FLOWS, 1e-12)
    spread = [0.0823941327, 0.1493520488, 0.1493520488, 0.1151273658, 0.1192649904, 0.1073786404, 0.0823941327]
    assert found.uncertainty == near(spread, 5e-11)
    (group,) = found.groups
    assert (group.rows, group.statistic, group.p_value) == (4, near(0.0, 1e-12), 1.0)
    assert found.structure.observability == ("redundant",) * 7
    assert names(network, found) == {frozenset({"bias:1", "leak:1"}), frozenset({"bias:7", "leak:4"})}
    (own,) = candidates(network, found)
    assert own is not None
    _, size, variance = own.given([])
    tested = {
        ("stream_bias", "1"): 0.1662214582, ("stream_bias", "2"): 0.4088230308, ("stream_bias", "3"): 0.4088230308,
        ("stream_bias", "4"): 0.3209095738, ("stream_bias", "5"): 0.2844559343, ("stream_bias", "6"): 0.2441755732,
        ("stream_bias", "7"): 0.1662214582, ("node_loss", "1"): 0.1662214582, ("node_loss", "2"): 0.160861517,
        ("node_loss", "3"): 0.1604547869, ("node_loss", "4"): 0.1662214582,
    }  # fmt: skip
    for index in range(len(own)):
        for fault in own.faults(index, float(size[index])):
            assert math.sqrt(variance[index]) == pytest.approx(tested[fault.kind, fault.subject], abs=5e-11)


@pytest.mark.parametrize(
    ("stream", "sigmas", "found_share"),
    # Chance that the biased stream is flagged at 5 % shared by seven tests; from 20,000 simulated draws each.
    [(1, 3, 0.34), (1, 5, 0.86), (1, 7, 0.996), (2, 3, 0.53), (2, 5, 0.97), (2, 7, 1.00),
     (4, 3, 0.06), (4, 5, 0.23), (4, 7, 0.51), (6, 3, 0.12), (6, 5, 0.45), (6, 7, 0.81)],
)  # fmt: skip
def test_power_of_the_recycle_by_the_closed_form(stream: int, sigmas: float, found_share: float) -> None:
    network, found = solved(RECYCLE, RECYCLE_ENDS, [*FLOWS], SPREAD)
    (own,) = candidates(network, found)
    assert own is not None
    (index,) = (
        at for at, members in enumerate(own.members) if ("stream_bias", str(stream)) in [one[:2] for one in members]
    )
    shift = sigmas * SPREAD[stream - 1] * math.sqrt(own.weight[index])
    power = 0.5 * math.erfc(-(shift - critical_score(7, 0.05)) / math.sqrt(2.0))
    # Printed to two or three digits; a simulated share of 20,000 has an uncertainty up to 0.0035.
    assert power == pytest.approx(found_share, abs=0.012)


def test_equal_faults_share_their_size() -> None:
    network, found = exchanger([*READINGS[:5], 198.88])
    (listed,) = suspects(network, found, 0.05)
    first = listed[0]
    assert (first.fault.kind, first.fault.subject) == ("stream_bias", "6")
    assert first.equivalent_to == (Fault("node_loss", "MIX", -first.fault.magnitude),)
    assert first.low < first.fault.magnitude < first.high
    # Half the interval is 1.959964 of the uncertainty of the size, sqrt(3/2), worked out as above.
    assert first.high - first.fault.magnitude == pytest.approx(1.959963985 * 1.224744871, abs=1e-8)
    assert first.fault.magnitude == pytest.approx(100.0 - 2.01, abs=1e-9)
