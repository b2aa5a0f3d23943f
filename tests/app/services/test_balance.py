"""A network posted to the service is answered with all its numbers, and with words where there is none."""

from __future__ import annotations

import json
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from fastapi.testclient import TestClient
from hypothesis import given, settings
from hypothesis import strategies as st
from pydantic import ValidationError

from app.main import create_app
from app.schemas.calculation import NODES, STREAMS, Balance, BalanceCalculation
from app.services.balance import network_of, solve_network
from app.settings import Settings
from models.errors import DefinitionError

PATH = "/v1/calculations/balance"
# The exchanger with a bypass of S. Narasimhan, C. Jordache, "Data Reconciliation and Gross Error Detection",
# Gulf, 2000: readings and reconciled flows from memory.
READINGS = (101.91, 64.45, 34.65, 64.20, 36.44, 98.88)
RECONCILED = (100.22, 64.50, 35.72, 64.50, 35.72, 100.22)
ENDS = (("boundary:feed", "SPLIT"), ("SPLIT", "HX"), ("SPLIT", "VALVE"), ("HX", "MIX"), ("VALVE", "MIX"),
        ("MIX", "boundary:product"))  # fmt: skip


@pytest.fixture(scope="module")
def client(tmp_path_factory: pytest.TempPathFactory) -> Iterator[TestClient]:
    folder: Path = tmp_path_factory.mktemp("store")
    with TestClient(
        create_app(Settings(database_url=f"sqlite:///{folder}/b.db")), base_url="http://localhost"
    ) as found:
        yield found


def exchanger(*readings: float | None) -> dict[str, Any]:
    streams = [
        {"id": str(at), "from": source, "to": target, "value": value, "random": 1.0}
        for at, ((source, target), value) in enumerate(zip(ENDS, readings, strict=True), start=1)
    ]
    return {"nodes": ["SPLIT", "HX", "VALVE", "MIX"], "streams": streams}


def test_the_exchanger_over_the_wire(client: TestClient) -> None:
    answer = client.post(PATH, json=exchanger(*READINGS))
    assert answer.status_code == 200
    found = answer.json()
    assert [one["id"] for one in found["streams"]] == ["1", "2", "3", "4", "5", "6"]
    assert [one["value"] for one in found["streams"]] == list(READINGS)
    assert [one["reconciled"] for one in found["streams"]] == pytest.approx(RECONCILED, abs=1e-9)
    assert [one["adjustment"] for one in found["streams"]] == pytest.approx(
        [value - best for value, best in zip(READINGS, RECONCILED, strict=True)], abs=1e-9
    )
    assert {one["observability"] for one in found["streams"]} == {"redundant"}
    assert [one["id"] for one in found["nodes"]] == ["SPLIT", "HX", "VALVE", "MIX"]
    # Out less in, from the readings: 64.45 + 34.65 - 101.91 and so on.
    assert [one["imbalance"] for one in found["nodes"]] == pytest.approx([-2.81, -0.25, 1.79, -1.76], abs=1e-9)
    assert [one["uncertainty"] ** 2 for one in found["nodes"]] == pytest.approx([3, 2, 2, 3])
    (group,) = found["groups"]
    assert group["members"] == ["SPLIT", "HX", "VALVE", "MIX"]
    assert group["statistic"] == pytest.approx(6.4075, abs=1e-9)  # worked out with dense matrices
    assert (group["degrees_of_freedom"], group["suspects"]) == (4, [])


def test_suspects_come_with_size_interval_and_what_they_equal(client: TestClient) -> None:
    found = client.post(PATH, json=exchanger(121.91, *READINGS[1:])).json()
    first = found["groups"][0]["suspects"][0]
    assert (first["kind"], first["subject"], first["fault"]) == ("stream_bias", "1", 1)
    # The bias that fits the readings is 2.535 (worked out), so with 20 more it is 22.535; sd is sqrt(3/2).
    assert first["magnitude"] == pytest.approx(22.535, abs=1e-9)
    assert first["interval"] == pytest.approx([22.535 - 1.959964 * 1.5**0.5, 22.535 + 1.959964 * 1.5**0.5], abs=1e-5)
    assert first["statistic"] == pytest.approx(22.535**2 / 1.5, rel=1e-9)
    assert first["share"] > 0.99
    assert first["equivalent_to"] == [
        {"kind": "node_loss", "subject": "SPLIT", "magnitude": first["magnitude"]},
    ]


def test_the_false_alarm_rate_moves_the_threshold(client: TestClient) -> None:
    # The largest statistic of the readings is 4.284 (worked out): chance 0.038 alone, less than rare among eight.
    document = exchanger(*READINGS)
    assert client.post(PATH, json={**document, "false_alarm_rate": 0.2}).json()["groups"][0]["suspects"] == []
    assert client.post(PATH, json={**document, "false_alarm_rate": 0.3}).json()["groups"][0]["suspects"]


def test_unmeasured_streams_are_null_or_computed(client: TestClient) -> None:
    found = client.post(PATH, json=exchanger(101.91, 64.45, None, None, 36.44, 98.88)).json()
    third = found["streams"][2]
    assert (third["value"], third["adjustment"], third["score"], third["observability"]) == (
        None,
        None,
        None,
        "observable",
    )
    assert third["reconciled"] == pytest.approx(36.242, abs=1e-9)  # worked out with dense matrices
    assert all(one["imbalance"] is None and one["uncertainty"] is None for one in found["nodes"])
    alone = client.post(PATH, json=exchanger(101.91, *[None] * 5)).json()
    assert [one["observability"] for one in alone["streams"]] == ["nonredundant", *["unobservable"] * 4, "observable"]
    assert [one["reconciled"] for one in alone["streams"]] == [101.91, None, None, None, None, 101.91]
    assert [one["uncertainty"] for one in alone["streams"]] == [1.0, None, None, None, None, 1.0]
    (group,) = alone["groups"]
    assert (group["statistic"], group["p_value"], group["degrees_of_freedom"], group["suspects"]) == (None, None, 0, [])


def test_a_meter_on_both_sides_cancels(client: TestClient) -> None:
    shared = [{"instrument": "meter M1", "value": 50.0}]
    streams = [
        {"id": "in", "from": "boundary:a", "to": "A", "value": 100.0, "random": 3.0, "systematic": shared},
        {"id": "out", "from": "A", "to": "boundary:b", "value": 96.0, "random": 4.0, "systematic": shared},
    ]
    node = client.post(PATH, json={"nodes": ["A"], "streams": streams}).json()["nodes"][0]
    assert node["imbalance"] == -4.0
    assert node["uncertainty"] == pytest.approx(5.0, rel=1e-14)  # 3-4-5: the meter's 50 is in neither
    assert node["score"] == pytest.approx(-0.8, rel=1e-14)


def test_what_is_certain_and_does_not_balance_is_refused(client: TestClient) -> None:
    shared = [{"instrument": "meter M1", "value": 50.0}]
    streams = [
        {"id": "in", "from": "boundary:a", "to": "A", "value": 100.0, "systematic": shared},
        {"id": "out", "from": "A", "to": "boundary:b", "value": 96.0, "systematic": shared},
    ]
    answer = client.post(PATH, json={"nodes": ["A"], "streams": streams})
    assert answer.status_code == 422
    problem = answer.json()
    assert "random error" in problem["detail"]
    assert problem["errors"][0]["code"] == "impossible_definition"


EXTREMES = [5e-324, 1e-300, 1e-160, 1e-101, 1e-99, 1e-20, 1e6, 1e15]
SIZES = st.sampled_from([0.0, 1e-3, 1.0, 100.0]) | st.sampled_from(EXTREMES)
ENDS_OF_ANY = st.sampled_from(["a", "b", "c", "boundary:x", "boundary:y"])


@given(
    st.lists(
        st.tuples(ENDS_OF_ANY, ENDS_OF_ANY, st.none() | st.tuples(st.sampled_from([-1, 1]), SIZES), SIZES, SIZES),
        min_size=1,
        max_size=9,
    )
)
@settings(max_examples=400, derandomize=True, deadline=None)
def test_any_body_that_is_taken_is_answered_in_numbers_or_refused(streams: list[Any]) -> None:
    document = {
        "nodes": ["a", "b", "c"],
        "streams": [
            {"id": str(at), "from": source, "to": target, "value": value and value[0] * value[1], "random": random,
             "systematic": [{"instrument": f"m{at % 2}", "value": shared}]}
            for at, (source, target, value, random, shared) in enumerate(streams) if source != target
        ],
    }  # fmt: skip
    try:
        body = BalanceCalculation.model_validate_json(json.dumps(document))
    except ValidationError:
        return
    try:
        found = solve_network(body)
    except DefinitionError:
        return
    answer = Balance.model_validate(found)  # refuses what is infinite
    for stream, one in zip(body.streams, answer.streams, strict=True):
        assert (one.reconciled is None) == (one.observability == "unobservable")
        assert (one.score is not None) == (one.observability == "redundant")
        assert (one.adjustment is None) == (stream.value is None)


def test_all_boundaries_are_one_outside() -> None:
    network = network_of(BalanceCalculation.model_validate_json(json.dumps(exchanger(*READINGS))))
    assert network.source.tolist() == [-1, 0, 0, 1, 2, 3]
    assert network.target.tolist() == [0, 1, 2, 3, 3, -1]
    assert network.nodes[0] == "SPLIT" and network.streams[5] == "6"


def test_the_largest_network_that_is_taken_is_answered() -> None:
    rng = np.random.default_rng(8)
    names = [f"n{at}" for at in range(NODES)]
    flow = np.full(NODES + 1, 100.0)
    ends = [(at - 1, at) for at in range(NODES)] + [(NODES - 1, -1)]
    for one in rng.integers(0, NODES - 12, (STREAMS - NODES - 1) // 2).tolist():
        other = one + int(rng.integers(1, 12))
        ends += [(one, other), (other, one)]  # there and back: every balance stays true
    true = np.concatenate([flow, np.full(len(ends) - len(flow), 10.0)])
    value = true + rng.normal(size=len(true))
    value[700] += 40.0
    instruments = [{"instrument": f"prover {at % 5}", "value": 0.5} for at in range(len(ends))]
    streams = [
        {"id": f"s{at}", "from": names[source] if source >= 0 else "boundary:x",
         "to": names[target] if target >= 0 else "boundary:x", "value": reading, "random": 1.0, "systematic": [shared]}
        for at, ((source, target), reading, shared) in enumerate(zip(ends, value.tolist(), instruments, strict=True))
    ]  # fmt: skip
    body = BalanceCalculation.model_validate_json(json.dumps({"nodes": names, "streams": streams}))
    found = Balance.model_validate(solve_network(body))
    (group,) = found.groups
    assert group.degrees_of_freedom == NODES
    (suspect,) = (one for one in group.suspects if one.fault == 1)
    assert (suspect.kind, suspect.subject) == ("stream_bias", "s700")
    assert suspect.interval[0] < 40.0 < suspect.interval[1]
