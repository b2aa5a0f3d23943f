"""Every refusal is problem+json with what RFC 9457 asks for, and says nothing that it should not."""

from __future__ import annotations

import re

import pytest
from fastapi.testclient import TestClient


@pytest.mark.parametrize(
    ("method", "path", "status", "code"),
    [
        ("GET", "/nothing-here", 404, "not_found"),
        ("DELETE", "/things/a", 405, "method_not_allowed"),
        ("PUT", "/things/a", 409, "period_open"),
        ("GET", "/things/a?limit=11", 422, "invalid"),
        ("GET", "/raise/gate", 401, "unauthorized"),
        ("GET", "/raise/fault", 500, "fault"),
        ("GET", "/raise/unreachable", 503, "store_unavailable"),
        ("GET", "/raise/full", 507, "disk_full"),
    ],
)
def test_a_refusal_is_a_problem_document(
    client: TestClient, method: str, path: str, status: int, code: str
) -> None:
    answer = client.request(method, path)
    problem = answer.json()
    assert answer.status_code == status
    assert answer.headers["content-type"] == "application/problem+json"
    assert (problem["status"], problem["code"]) == (status, code)
    assert problem["type"] == f"urn:brimbook:problem:{code}"
    assert problem["title"] and problem["detail"]
    assert problem["instance"] == f"urn:brimbook:request:{answer.headers['x-request-id']}"


def test_a_fault_tells_its_reason_to_the_log_only(
    client: TestClient, caplog: pytest.LogCaptureFixture
) -> None:
    answer = client.get("/raise/fault")
    assert not re.search("SELECT|Traceback|RuntimeError", answer.text)
    assert "SELECT secret FROM table" in caplog.text


def test_a_store_out_of_reach_says_when_to_try_again_and_not_where_it_is(client: TestClient) -> None:
    answer = client.get("/raise/unreachable")
    assert int(answer.headers["retry-after"]) > 0
    assert "10.0.0.1" not in answer.text
    assert "/var/lib" not in client.get("/raise/full").text


def test_headers_of_a_refusal_are_passed_on(client: TestClient) -> None:
    assert client.get("/raise/gate").headers["www-authenticate"] == "Bearer"
    assert client.put("/things/a").headers["x-extra"] == "kept"


def test_a_method_that_a_path_lacks_is_answered_with_all_that_it_has(client: TestClient) -> None:
    assert client.delete("/things/a").headers["allow"] == "GET, PUT"


def test_parameters_are_named_and_not_repeated(client: TestClient) -> None:
    answer = client.get("/things/a", params={"limit": "quoted-text"})
    (error,) = answer.json()["errors"]
    assert (error["pointer"], error["code"]) == ("/query/limit", "wrong_type")
    assert "quoted-text" not in answer.text
