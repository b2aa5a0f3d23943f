"""Refusals of a body, as a client would be told of them."""

from __future__ import annotations

import json
from collections.abc import Callable
from typing import Any

import pytest
from pydantic import BaseModel, ValidationError

from app.schemas.errors import explain

Refusals = Callable[[type[BaseModel], Any], dict[str, str]]


@pytest.fixture(scope="session")
def refusals() -> Refusals:
    """Codes by pointer of what a model refuses in a document; none where it takes it."""

    def of(model: type[BaseModel], document: Any) -> dict[str, str]:
        try:
            model.model_validate_json(document if isinstance(document, bytes) else json.dumps(document))
        except ValidationError as refused:
            return {pointer: code for pointer, code, _ in explain(refused)}
        return {}

    return of
