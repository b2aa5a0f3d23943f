"""A body is what it says it is, within the limit, or it is refused by name; never a fault, never an echo."""

from __future__ import annotations

import asyncio
import gzip
import json
import tracemalloc
from collections.abc import Iterator

import pytest
from fastapi import FastAPI, Request
from fastapi.testclient import TestClient
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from starlette.types import Message

from app.edge.body import PATIENCE, ReceivedBytes, decoded
from app.errors import TooLarge
from app.settings import Settings

GOOD = {"rows": [{"vessel": "tk-1", "taken_at": "2026-03-14T06:00:00+01:00", "level_m": 8.2315}]}
JSON = {"Content-Type": "application/json"}
LIMIT = 20_000  # of the probe


def post(client: TestClient, content: bytes, path: str = "/rows", **headers: str) -> tuple[int, list[str], str]:
    """Status, codes (the problem's, then each error's place and code), and the text."""
    answer = client.post(path, content=content, headers=JSON | {k.replace("_", "-"): v for k, v in headers.items()})
    if answer.status_code == 200:
        return 200, [], answer.text
    problem = answer.json()
    return (
        answer.status_code,
        [problem["code"], *(f"{e['pointer']} {e['code']}" for e in problem["errors"])],
        answer.text,
    )


def row(**fields: object) -> bytes:
    return json.dumps({"rows": [GOOD["rows"][0] | fields]}).encode()


def test_a_good_body_reaches_the_handler(client: TestClient) -> None:
    status, _, text = post(client, json.dumps(GOOD).encode())
    assert status == 200
    assert json.loads(text)["rows"][0]["level_m"] == 8.2315


@pytest.mark.parametrize(
    "kind",
    ["", "text/plain", "application/x-www-form-urlencoded", "multipart/form-data", "application/jsonp",
     "text/json", "application/json; charset=latin-1", "application/x-ndjson"],
)  # fmt: skip
def test_a_body_of_another_type_is_not_read(client: TestClient, kind: str) -> None:
    answer = client.post("/rows", content=json.dumps(GOOD), headers={"Content-Type": kind})
    assert (answer.status_code, answer.json()["code"]) == (415, "unsupported_media")
    assert answer.headers["accept"] == "application/json"


@pytest.mark.parametrize(
    "kind", ["application/json", "APPLICATION/JSON ; charset=UTF-8", 'application/json;charset="utf-8"']
)
def test_json_is_read_however_its_type_is_written(client: TestClient, kind: str) -> None:
    assert client.post("/rows", content=json.dumps(GOOD), headers={"Content-Type": kind}).status_code == 200


def test_a_body_over_the_limit_is_refused_whether_its_length_is_announced_or_not(client: TestClient) -> None:
    def blocks(length: int) -> Iterator[bytes]:
        for _ in range(length // 1000):
            yield b" " * 1000

    over, far_over = LIMIT + 1000, 50 * LIMIT
    for content in (b" " * over, blocks(over), b" " * far_over, blocks(far_over)):
        answer = client.post("/rows", content=content, headers=JSON)
        assert (answer.status_code, answer.json()["code"]) == (413, "too_large")
        assert answer.headers["content-type"] == "application/problem+json"


def test_of_a_body_far_over_the_limit_only_a_few_times_the_limit_is_received() -> None:
    blocks = 0

    async def receive() -> Message:
        nonlocal blocks
        blocks += 1
        return {"type": "http.request", "body": b" " * 1000, "more_body": blocks < 1000}

    app = FastAPI()
    app.state.settings = Settings(max_body_mb=LIMIT / 1e6)
    headers = [(b"content-type", b"application/json")]
    request = Request({"type": "http", "method": "POST", "headers": headers, "app": app}, receive)
    with pytest.raises(TooLarge):
        asyncio.run(ReceivedBytes("application/json")(request))
    assert blocks == PATIENCE * LIMIT // 1000 + 1


def test_a_bomb_is_not_inflated_to_find_out_that_it_is_one(probe: FastAPI) -> None:
    bomb = gzip.compress(b" " * 50_000_000)
    headers = [(b"content-encoding", b"gzip")]
    request = Request({"type": "http", "method": "POST", "headers": headers, "app": probe})
    tracemalloc.start()
    try:
        with pytest.raises(TooLarge):
            decoded(request, bomb)
        assert tracemalloc.get_traced_memory()[1] < 1_000_000
    finally:
        tracemalloc.stop()


def test_a_body_of_exactly_the_limit_is_read(client: TestClient) -> None:
    assert post(client, b'{"rows": []}'.ljust(LIMIT))[0] == 200
    assert post(client, b'{"rows": []}'.ljust(LIMIT + 1))[0] == 413


def test_gzip_is_inflated_up_to_the_limit_and_no_further(client: TestClient) -> None:
    good = gzip.compress(json.dumps(GOOD).encode())
    assert post(client, good, Content_Encoding="gzip")[0] == 200
    halves = gzip.compress(b'{"rows"') + gzip.compress(b": []}")
    assert post(client, halves, Content_Encoding="gzip")[0] == 200
    bomb = gzip.compress(b'{"rows": []}'.ljust(LIMIT + 1))
    assert len(bomb) < 200
    assert post(client, bomb, Content_Encoding="gzip")[:2] == (413, ["too_large"])
    for broken in (good[:-9], b"no gzip at all", good + b"rest"):
        assert post(client, broken, Content_Encoding="gzip")[:2] == (400, ["malformed_gzip"])
    for other in ("br", "deflate", "gzip, gzip"):
        assert post(client, good, Content_Encoding=other)[:2] == (415, ["unsupported_media"])


@pytest.mark.parametrize(
    ("content", "status", "codes"),
    [
        (b"", 400, ["malformed_json", " malformed_json"]),
        (b'{"rows": [', 400, ["malformed_json", " malformed_json"]),
        (b"\xff\xfe", 400, ["malformed_json", " malformed_json"]),
        (b'{"rows": "\\ud800"}', 400, ["malformed_json", " malformed_json"]),
        (b'{"rows": ' + b"[" * 5000, 400, ["malformed_json", " malformed_json"]),
        (b'{"rows": ' + b"[" * 5000 + b"]" * 5000 + b"}", 400, ["malformed_json", " malformed_json"]),
        (b"[]", 422, ["invalid", " wrong_type"]),
        (b"null", 422, ["invalid", " wrong_type"]),
        (b"{}", 422, ["invalid", "/rows missing"]),
        (b'{"rows": [], "rows": []}', 422, ["invalid", " duplicate_key"]),
        (row(level_m="1.5"), 422, ["invalid", "/rows/0/level_m wrong_type"]),
        (row(level_m=True), 422, ["invalid", "/rows/0/level_m wrong_type"]),
        (row(level_m=float("nan")), 422, ["invalid", "/rows/0/level_m not_finite"]),
        (row(level_m=float("-inf")), 422, ["invalid", "/rows/0/level_m not_finite"]),
        (row(level_m=12345).replace(b"12345", b"1e400"), 422, ["invalid", "/rows/0/level_m not_finite"]),
        (row(level_m=12345).replace(b"12345", b"9" * 400), 422, ["invalid", "/rows/0/level_m not_finite"]),
        (row(count=12345).replace(b"12345", b"9" * 5000), 400, ["malformed_json", " malformed_json"]),
        (row(count=1.5), 422, ["invalid", "/rows/0/count wrong_type"]),
        (row(level_m=1e6), 422, ["invalid", "/rows/0/level_m out_of_range"]),
        (row(taken_at="2026-03-14T06:00:00"), 422, ["invalid", "/rows/0/taken_at no_offset"]),
        (row(taken_at=1767225600), 422, ["invalid", "/rows/0/taken_at wrong_type"]),
        (row(taken_at="yesterday"), 422, ["invalid", "/rows/0/taken_at not_an_instant"]),
        (row(lvl_m=1.0), 422, ["invalid", "/rows/0/lvl_m unknown_field"]),
        (row(vessel="TK 1"), 422, ["invalid", "/rows/0/vessel wrong_form"]),
        (row(shape={"kind": "cube"}), 422, ["invalid", "/rows/0/shape not_one_of"]),
        (row(shape={"kind": "brick", "rows": [0]}), 422, ["invalid", "/rows/0/shape/rows/0 wrong_type"]),
    ],
)  # fmt: skip
def test_what_cannot_be_is_named_with_its_place(
    client: TestClient, content: bytes, status: int, codes: list[str]
) -> None:
    assert post(client, content)[:2] == (status, codes)


def test_numbers_that_are_none_are_refused_even_where_a_model_takes_anything(client: TestClient) -> None:
    for number in (b"NaN", b"Infinity", b"-Infinity"):
        assert post(client, b'{"value": ' + number + b"}", "/anything")[0] == 422
    assert post(client, b'{"value": "\\u0000"}', "/anything")[0] == 422


def test_each_row_is_named_by_its_index(client: TestClient) -> None:
    rows = [GOOD["rows"][0] | ({"level_m": None} if i % 3 else {"level_m": "high"}) for i in range(9)]
    answer = client.post("/rows", json={"rows": rows})
    assert [error["index"] for error in answer.json()["errors"]] == [0, 3, 6]


SECRET = "never-to-be-repeated"


@pytest.mark.parametrize(
    "content",
    [
        row(vessel=SECRET.upper()),
        row(level_m=SECRET),
        row(taken_at=SECRET),
        row(shape={"kind": SECRET}),
        row(values={f"{SECRET} {SECRET}": "x"}),
        row(**{f"{SECRET}?": 1}),
        json.dumps([SECRET]).encode(),
        f'{{"rows": {SECRET}}}'.encode(),
        f'{{"rows": [], "{SECRET}!": 1, "{SECRET}!": 1}}'.encode(),
    ],
)
def test_a_refusal_never_repeats_what_was_sent(client: TestClient, content: bytes) -> None:
    status, _, text = post(client, content)
    assert status in (400, 422)
    assert SECRET not in text.lower()


scalars = st.none() | st.booleans() | st.integers() | st.floats() | st.text(max_size=20)
names = st.sampled_from(["rows", "vessel", "taken_at", "level_m", "count", "values", "shape", "kind"]) | st.text(
    max_size=8
)
documents = st.recursive(
    scalars,
    lambda inner: st.lists(inner, max_size=4) | st.dictionaries(names, inner, max_size=6),
    max_leaves=20,
)
bodies = (
    st.binary(max_size=200)
    | documents.map(lambda d: json.dumps(d).encode())
    | documents.map(lambda d: json.dumps({"rows": [d]}).encode())
    | st.dictionaries(names, documents, max_size=6).map(lambda d: row(**d))
)


@given(content=bodies, path=st.sampled_from(["/rows", "/anything"]))
@settings(
    max_examples=50,
    derandomize=True,
    deadline=None,
    suppress_health_check=[HealthCheck.function_scoped_fixture],
)
def test_no_body_is_a_fault(client: TestClient, content: bytes, path: str) -> None:
    answer = client.post(path, content=content, headers=JSON)
    assert answer.status_code in (200, 400, 413, 422)
    if answer.status_code != 200:
        assert answer.headers["content-type"] == "application/problem+json"
        assert set(answer.json()) == {"type", "title", "status", "detail", "instance", "code", "errors"}
