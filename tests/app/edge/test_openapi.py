"""The service's description names every body, every refusal, and nothing that is not there."""

from __future__ import annotations

from typing import Annotated, Any

import pytest
from fastapi import Depends, FastAPI
from pydantic import BaseModel, computed_field

from app.edge import openapi
from app.edge.body import json_body


class Inner(BaseModel):
    side_m: float

    @computed_field  # type: ignore[prop-decorator]
    @property
    def area_m2(self) -> float:
        return self.side_m**2


class Outer(BaseModel):
    inner: Inner


@pytest.fixture
def document(probe: FastAPI) -> dict[str, Any]:
    return openapi.describe(probe)


def references(node: object) -> set[str]:
    if isinstance(node, dict):
        own = {node["$ref"]} if isinstance(node.get("$ref"), str) else set()
        return own.union(*(references(value) for value in node.values()))
    return set().union(*(references(item) for item in node)) if isinstance(node, list) else set()


def test_a_body_is_described_by_its_model(document: dict[str, Any]) -> None:
    operation = document["paths"]["/rows"]["post"]
    assert operation["operationId"] == "post_rows"
    assert operation["requestBody"]["required"]
    reference = operation["requestBody"]["content"]["application/json"]["schema"]["$ref"]
    model = document["components"]["schemas"][reference.rpartition("/")[2]]
    assert model["required"] == ["rows"]
    assert "requestBody" not in document["paths"]["/things/{thing}"]["get"]


def test_every_reference_leads_somewhere(document: dict[str, Any]) -> None:
    found = references(document)
    assert {r.removeprefix("#/components/schemas/") for r in found} <= set(document["components"]["schemas"])
    assert "HTTPValidationError" not in document["components"]["schemas"]


def test_refusals_are_problems_and_only_those_that_can_happen(document: dict[str, Any]) -> None:
    paths = document["paths"]
    reading, changing = paths["/things/{thing}"]["get"]["responses"], paths["/rows"]["post"]["responses"]
    assert set(changing) - set(reading) == {"403", "409", "413", "415", "507"}
    for status, answer in changing.items():
        if status != "200":
            assert answer["content"] == {
                "application/problem+json": {"schema": {"$ref": "#/components/schemas/Problem"}}
            }


def test_a_model_that_is_answered_in_another_form_than_it_is_sent_has_two_names() -> None:
    app = FastAPI(generate_unique_id_function=openapi.operation_id)

    @app.post("/outer")
    def post_outer(body: Annotated[Outer, Depends(json_body(Outer))]) -> Outer:
        return body

    described = openapi.describe(app)
    schemas = described["components"]["schemas"]
    operation = described["paths"]["/outer"]["post"]
    sent = operation["requestBody"]["content"]["application/json"]["schema"]["$ref"].rpartition("/")[2]
    answered = operation["responses"]["200"]["content"]["application/json"]["schema"]["$ref"].rpartition("/")[
        2
    ]
    assert sent != answered
    inside = {
        name: schemas[name]["properties"]["inner"]["$ref"].rpartition("/")[2] for name in (sent, answered)
    }
    assert list(schemas[inside[sent]]["properties"]) == ["side_m"]
    assert list(schemas[inside[answered]]["properties"]) == ["side_m", "area_m2"]
