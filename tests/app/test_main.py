"""The application as it is served: the door stands before every route, and every route is described."""

from __future__ import annotations

import json
import re
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest
from fastapi import APIRouter, FastAPI
from fastapi.testclient import TestClient
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from app.clock import Clock
from app.main import create_app
from app.settings import Settings
from models.errors import OutsideTable

CHANGING = ("put", "post", "delete", "patch")


class Stopped(Clock):
    """A clock that stands."""

    def now(self) -> int:
        """Noon of an invented day."""
        return 1_773_489_600_000_000


@pytest.fixture(scope="module")
def app(tmp_path_factory: pytest.TempPathFactory) -> FastAPI:
    folder: Path = tmp_path_factory.mktemp("store")
    return create_app(Settings(database_url=f"sqlite:///{folder}/b.db", max_body_mb=0.05), Stopped())


@pytest.fixture(scope="module")
def client(app: FastAPI) -> Iterator[TestClient]:
    with TestClient(app, base_url="http://localhost") as found:
        yield found


@pytest.fixture(scope="module")
def operations(app: FastAPI) -> list[tuple[str, str, dict[str, Any]]]:
    """Method, path with its parameters filled in, and description of every operation."""
    return [
        (method, re.sub(r"\{\w+\}", "x1", path), operation)
        for path, methods in app.openapi()["paths"].items()
        for method, operation in methods.items()
    ]


def bodies(operations: list[tuple[str, str, dict[str, Any]]]) -> list[tuple[str, str]]:
    return [(method, path) for method, path, operation in operations if "requestBody" in operation]


def test_health_and_readiness_are_always_there(client: TestClient) -> None:
    assert client.get("/health").status_code == client.get("/ready").status_code == 200


def test_the_clock_is_the_one_that_was_given(client: TestClient, app: FastAPI) -> None:
    assert app.state.clock.now() == 1_773_489_600_000_000


def test_no_page_of_the_service_loads_anything_from_elsewhere(client: TestClient) -> None:
    assert [client.get(path).status_code for path in ("/docs", "/redoc")] == [404, 404]


def test_every_operation_has_an_id_of_its_own_and_a_sentence(
    operations: list[tuple[str, str, dict[str, Any]]],
) -> None:
    ids = [operation["operationId"] for _, _, operation in operations]
    assert len(set(ids)) == len(ids) and all(re.fullmatch(r"[a-z_]+", name) for name in ids)
    assert all(operation.get("description") for _, _, operation in operations)


def test_every_path_answers_foreign_hosts_and_origins_before_anything_else(
    client: TestClient, operations: list[tuple[str, str, dict[str, Any]]]
) -> None:
    for method, path, _ in operations:
        assert client.request(method, path, headers={"Host": "evil.example"}).status_code == 421
        if method in CHANGING:
            assert client.request(method, path, headers={"Origin": "https://evil.example"}).status_code == 403


def test_every_body_is_read_strictly(
    client: TestClient, operations: list[tuple[str, str, dict[str, Any]]]
) -> None:
    for method, path in bodies(operations):
        form = client.request(method, path, data={"a": "b"})
        assert form.status_code == 415, path
        large = client.request(
            method, path, content=b" " * 60_000, headers={"Content-Type": "application/json"}
        )
        assert large.status_code == 413, path
        twice = client.request(method, path, json={"no_such_field_anywhere": 1})
        assert twice.status_code == 422, path
        assert "unknown_field" in [error["code"] for error in twice.json()["errors"]], path


TEXTS = st.text(max_size=12) | st.sampled_from(["NaN", "1e400", "x1", "../..", "%00", "2026-03-14", "٣"])
HOSTILE = st.recursive(
    st.none() | st.booleans() | st.integers() | st.floats() | st.text(max_size=12),
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.text(max_size=8), inner, max_size=4),
    max_leaves=12,
)


@given(data=st.data())
@settings(
    max_examples=50,
    derandomize=True,
    deadline=None,
    suppress_health_check=[HealthCheck.function_scoped_fixture],
)
def test_no_request_is_a_fault(
    client: TestClient, operations: list[tuple[str, str, dict[str, Any]]], data: st.DataObject
) -> None:
    method, path, operation = data.draw(st.sampled_from(operations))
    names = [p["name"] for p in operation.get("parameters", []) if p["in"] == "query"]
    params = {name: data.draw(TEXTS) for name in names if data.draw(st.booleans())}
    content = json.dumps(data.draw(HOSTILE)) if "requestBody" in operation else None
    answer = client.request(
        method, path, params=params, content=content, headers={"Content-Type": "application/json"}
    )
    assert answer.status_code < 500, (method, path, params, content)
    if answer.status_code >= 400:
        assert answer.headers["content-type"] == "application/problem+json"


def test_what_the_models_refuse_is_unprocessable_and_names_its_field(tmp_path: Path) -> None:
    router = APIRouter()

    @router.get("/refused")
    def refused() -> None:
        raise OutsideTable("level_m is 9.0 at index 3; the table ends at 8.0 m", field="level_m", index=3)

    app = create_app(Settings(database_url=f"sqlite:///{tmp_path}/b.db", migrate_at_start=False))
    app.include_router(router)
    with TestClient(app, base_url="http://localhost") as client:
        answer = client.get("/refused")
    assert (answer.status_code, answer.json()["code"]) == (422, "outside_table")
    assert [(e["pointer"], e["index"]) for e in answer.json()["errors"]] == [("/level_m", 3)]
