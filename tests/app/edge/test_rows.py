"""One path takes rows in three media types; each is read as what it says it is, within the one limit."""

from __future__ import annotations

import gzip
import json
from collections.abc import Iterator
from typing import Annotated, Any

import pytest
from fastapi import Depends, FastAPI
from fastapi.testclient import TestClient
from pydantic import BaseModel

from app.edge import openapi, problems
from app.edge.rows import RowsText, rows_body, table_body
from app.errors import Unprocessable
from app.settings import Settings


class Names(BaseModel):
    """A batch of names."""

    names: list[str]


def lines(text: bytes) -> list[str]:
    if b"!" in text:
        raise Unprocessable("No shouting.", code="shouting")
    return ["line", *text.decode().split()]


NAMES = rows_body(
    Names,
    lambda text: Names.model_validate_json(text).names,
    ndjson=RowsText(lines, "A name a line.", "anna\n"),
    csv=RowsText(lambda text: ["cell", *text.decode().split(",")], "Names.", "anna,berta"),
)

TABLE = table_body(Names, RowsText(lambda text: ["cell", *text.decode().split(",")], "Names.", "anna,berta"))


@pytest.fixture(scope="module")
def app() -> FastAPI:
    """An application of two paths; bodies up to 1 kB."""
    app = FastAPI(telemetry={"tracing": False, "metrics": False, "logs": False, "operation_spans": False},
                  generate_unique_id_function=openapi.operation_id)  # fmt: skip
    app.state.settings = Settings(max_body_mb=0.001)

    @app.post("/names")
    def post_names(body: Annotated[Any, Depends(NAMES)]) -> list[str]:
        found: list[str] = body
        return found

    @app.post("/table")
    def post_table(body: Annotated[Any, Depends(TABLE)]) -> list[str]:
        return body.names if isinstance(body, Names) else list(body)

    problems.install(app)
    return app


@pytest.fixture(scope="module")
def client(app: FastAPI) -> Iterator[TestClient]:
    with TestClient(app) as found:
        yield found


@pytest.mark.parametrize(
    ("kind", "text", "names"),
    [
        ("application/json", b'{"names": ["anna"]}', ["anna"]),
        ("application/x-ndjson", b"anna\nberta", ["line", "anna", "berta"]),
        ("text/csv", b"anna,berta", ["cell", "anna", "berta"]),
        ("Text/CSV; charset=UTF-8; header=present", b"anna", ["cell", "anna"]),
    ],
)
def test_the_content_type_says_how_rows_are_read(
    client: TestClient, kind: str, text: bytes, names: list[str]
) -> None:
    plain = client.post("/names", content=text, headers={"Content-Type": kind})
    assert (plain.status_code, plain.json()) == (200, names)
    packed = client.post(
        "/names", content=gzip.compress(text), headers={"Content-Type": kind, "Content-Encoding": "gzip"}
    )
    assert packed.json() == names


@pytest.mark.parametrize("kind", ["", "text/plain", "application/csv", "text/csv; charset=latin-1", "text/csvx"])
def test_other_types_are_refused_with_those_that_are_read(client: TestClient, kind: str) -> None:
    answer = client.post("/names", content=b"anna", headers={"Content-Type": kind})
    assert answer.status_code == 415
    assert answer.headers["accept"] == "application/json, application/x-ndjson, text/csv"


@pytest.mark.parametrize("kind", ["application/json", "application/x-ndjson", "text/csv"])
def test_the_limit_holds_plain_and_inflated(client: TestClient, kind: str) -> None:
    text = json.dumps({"names": ["a" * 2_000]}).encode()
    plain = client.post("/names", content=text, headers={"Content-Type": kind})
    packed = client.post(
        "/names", content=gzip.compress(text), headers={"Content-Type": kind, "Content-Encoding": "gzip"}
    )
    assert (plain.status_code, packed.status_code) == (413, 413)


def test_what_a_reader_refuses_is_a_problem(client: TestClient) -> None:
    answer = client.post("/names", content=b"anna!", headers={"Content-Type": "application/x-ndjson"})
    assert (answer.status_code, answer.json()["code"]) == (422, "shouting")


def test_the_description_shows_every_type(app: FastAPI) -> None:
    operation = openapi.describe(app)["paths"]["/names"]["post"]
    content = operation["requestBody"]["content"]
    assert set(content) == {"application/json", "application/x-ndjson", "text/csv"}
    assert content["application/json"]["schema"]["$ref"].endswith("/Names")
    assert content["text/csv"] == {"schema": {"type": "string", "description": "Names."}, "example": "anna,berta"}
    assert {"413", "415"} <= set(operation["responses"])


@pytest.mark.parametrize(
    ("kind", "text", "names"),
    [("application/json", b'{"names": ["anna"]}', ["anna"]), ("Text/CSV; charset=UTF-8", b"anna", ["cell", "anna"])],
)
def test_a_table_may_stand_in_place_of_a_body(client: TestClient, kind: str, text: bytes, names: list[str]) -> None:
    plain = client.post("/table", content=text, headers={"Content-Type": kind})
    assert (plain.status_code, plain.json()) == (200, names)
    packed = {"Content-Type": kind, "Content-Encoding": "gzip"}
    assert client.post("/table", content=gzip.compress(text), headers=packed).json() == names


def test_a_body_or_a_table_is_of_two_types_only(app: FastAPI, client: TestClient) -> None:
    answer = client.post("/table", content=b"anna", headers={"Content-Type": "application/x-ndjson"})
    assert (answer.status_code, answer.headers["accept"]) == (415, "application/json, text/csv")
    assert client.post("/table", json={"names": 1}).json()["errors"][0]["pointer"] == "/names"
    content = openapi.describe(app)["paths"]["/table"]["post"]["requestBody"]["content"]
    assert set(content) == {"application/json", "text/csv"}
    assert content["text/csv"] == {"schema": {"type": "string", "description": "Names."}, "example": "anna,berta"}
