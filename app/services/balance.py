"""The balance of a network that stands in the request: nothing is read, nothing is stored."""

from __future__ import annotations

from typing import Any

import numpy as np

from app.schemas.calculation import BOUNDARY, BalanceCalculation
from models.balance.network import OUTSIDE, Network
from models.balance.reconcile import Measurements, Reconciliation, reconcile
from models.balance.suspects import Fault, Suspect, suspects


def solve_network(body: BalanceCalculation) -> dict[str, Any]:
    """Streams, nodes and groups, reconciled and tested, as ``Balance`` takes them."""
    network = network_of(body)
    measured = Measurements.of(
        [one.value for one in body.streams],
        [one.random for one in body.streams],
        [{shared.instrument: shared.value for shared in one.systematic} for one in body.streams],
    )
    solved = reconcile(network, measured)
    found = suspects(network, solved, body.false_alarm_rate)
    return {
        "streams": _streams(body, solved),
        "nodes": _nodes(body, solved),
        "groups": [
            {
                "members": tuple(body.nodes[node] for node in group.members),
                "statistic": group.statistic,
                "degrees_of_freedom": group.rows,
                "p_value": group.p_value,
                "suspects": tuple(_suspect(one) for one in own),
            }
            for group, own in zip(solved.groups, found, strict=True)
        ],
    }


def network_of(body: BalanceCalculation) -> Network:
    """The shape of the network; all boundaries are the one outside."""
    number = {name: at for at, name in enumerate(body.nodes)}

    def ends(names: list[str]) -> Any:
        return np.array([OUTSIDE if name.startswith(BOUNDARY) else number[name] for name in names], dtype=np.intp)

    return Network(
        body.nodes,
        [one.id for one in body.streams],
        ends([one.from_ for one in body.streams]),
        ends([one.to for one in body.streams]),
        np.array([one.value is not None for one in body.streams]),
    )


def _streams(body: BalanceCalculation, solved: Reconciliation) -> list[dict[str, Any]]:
    columns = (solved.reconciled, solved.uncertainty, solved.adjustment, solved.score)
    return [
        {
            "id": one.id,
            "value": one.value,
            "reconciled": reconciled,
            "uncertainty": uncertainty,
            "adjustment": adjustment,
            "score": score,
            "observability": observability,
        }
        for one, reconciled, uncertainty, adjustment, score, observability in zip(
            body.streams, *(column.tolist() for column in columns), solved.structure.observability, strict=True
        )
    ]


def _nodes(body: BalanceCalculation, solved: Reconciliation) -> list[dict[str, Any]]:
    columns = (solved.imbalance, solved.imbalance_uncertainty, solved.node_score)
    return [
        {"id": name, "imbalance": imbalance, "uncertainty": uncertainty, "score": score}
        for name, imbalance, uncertainty, score in zip(
            body.nodes, *(column.tolist() for column in columns), strict=True
        )
    ]


def _suspect(one: Suspect) -> dict[str, Any]:
    return {
        **_fault(one.fault),
        "interval": (one.low, one.high),
        "statistic": one.statistic,
        "share": one.share,
        "fault": one.number,
        "equivalent_to": tuple(_fault(other) for other in one.equivalent_to),
    }


def _fault(one: Fault) -> dict[str, Any]:
    return {"kind": one.kind, "subject": one.subject, "magnitude": one.magnitude}
