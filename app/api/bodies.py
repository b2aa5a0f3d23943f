"""JSON bodies of the routes: read by the edge, refused in the sentences of the schemas."""

from __future__ import annotations

from typing import TypeVar

from pydantic import BaseModel

from app.edge import body
from app.schemas.errors import sentence

M = TypeVar("M", bound=BaseModel)


def json_body(model: type[M]) -> body.JsonBody[M]:
    """Dependency that reads a JSON body of this model; a refusal names the field, its limit and its unit."""
    return body.json_body(model, sentence)
