"""The service's own description: every body with its model, every refusal with the problem's schema.

Bodies are validated from their bytes (see ``body.py``), which FastAPI cannot see; this adds them to
what it describes, so that ``/openapi.json`` says everything that a client needs.
"""

from __future__ import annotations

import json
from collections.abc import Iterable, Iterator
from typing import Any

from fastapi import FastAPI
from fastapi.openapi.utils import get_openapi
from fastapi.routing import APIRoute, iter_route_contexts
from pydantic import BaseModel
from pydantic.json_schema import models_json_schema

from app.edge.body import JSON, JsonBody
from app.edge.problems import MEDIA_TYPE, Problem
from app.edge.rows import RowsBody, TableBody

COMPONENT = "#/components/schemas/{model}"
ALWAYS = {
    "400": "The request cannot be read.",
    "404": "What the path names is not there.",
    "421": "The Host is not one of this service.",
    "422": "Something in the request cannot be; each mistake is named with its place.",
    "500": "A fault of the service.",
    "503": "The store cannot be reached; Retry-After says when to try again.",
}
CHANGING = {
    "403": "Sent by a page of another site.",
    "409": "The state of the books does not allow it.",
    "507": "The disk of the store is full.",
}
WITH_BODY = {"413": "The body is over the limit.", "415": "The body is not of a type that is read here."}
UNUSED = ("HTTPValidationError", "ValidationError")


def operation_id(route: APIRoute) -> str:
    """The handler's own name: it stays when a path is renamed, and clients are made from it."""
    return route.name


def describe(app: FastAPI) -> dict[str, Any]:
    """The OpenAPI document of the application, with bodies and problems."""
    document = get_openapi(
        title=app.title, version=app.version, description=app.description, routes=app.routes
    )
    schemas: dict[str, Any] = document.setdefault("components", {}).setdefault("schemas", {})
    bodies = dict(_bodies(app))
    names = _add_models(schemas, [Problem, *(body.model for body in bodies.values())])
    for name in UNUSED:
        schemas.pop(name, None)
    for path in document["paths"].values():
        for method, operation in path.items():
            body = bodies.get(operation["operationId"])
            if body is not None:
                content = _content(JSON, names[body.model])["content"] | _texts(body)
                operation["requestBody"] = {"content": content, "required": True}
            operation["responses"] |= _problems(method, names[Problem], has_body=body is not None)
    document["components"]["schemas"] = dict(sorted(schemas.items()))
    return document


def _bodies(app: FastAPI) -> Iterator[tuple[str, JsonBody[Any]]]:
    """The id of each operation that takes a JSON body, and what reads it."""
    for context in iter_route_contexts(app.routes):
        if not isinstance(context.original_route, APIRoute):
            continue
        for dependency in context.dependant.dependencies:
            if isinstance(dependency.call, JsonBody):
                yield context.unique_id, dependency.call


def _texts(body: JsonBody[Any]) -> dict[str, Any]:
    """The other media types of a body whose rows may also stand in a text."""
    if not isinstance(body, RowsBody | TableBody):
        return {}
    return {
        media_type: {"schema": {"type": "string", "description": text.description}, "example": text.example}
        for media_type, text in body.texts.items()
    }


def _content(media_type: str, reference: str) -> dict[str, Any]:
    return {"content": {media_type: {"schema": {"$ref": reference}}}}


def _problems(method: str, reference: str, *, has_body: bool) -> dict[str, Any]:
    statuses = ALWAYS | (CHANGING if method in ("put", "post", "delete", "patch") else {})
    statuses |= WITH_BODY if has_body else {}
    content = _content(MEDIA_TYPE, reference)
    return {status: {"description": words} | content for status, words in sorted(statuses.items())}


def _add_models(schemas: dict[str, Any], models: Iterable[type[BaseModel]]) -> dict[Any, str]:
    """Add the models and what they hold to the components; the reference of each model.

    A model that is also answered may look otherwise there (a field with a default is always answered,
    never required); the one for bodies is then called ``…-Input``, as FastAPI calls it itself.
    """
    references, described = models_json_schema(
        [(model, "validation") for model in dict.fromkeys(models)], ref_template=COMPONENT
    )
    definitions: dict[str, Any] = described["$defs"]
    renamed: dict[str, str] = {}
    while fresh := [n for n, s in definitions.items() if n not in renamed and schemas.get(n, s) != s]:
        text = json.dumps(definitions)
        for name in fresh:
            renamed[name] = f"{name}-Input"
            old, new = COMPONENT.format(model=name), COMPONENT.format(model=renamed[name])
            text = text.replace(json.dumps(old), json.dumps(new))
        definitions = json.loads(text)
    for name, schema in definitions.items():
        schemas[renamed.get(name, name)] = schema
    return {
        model: COMPONENT.format(model=renamed.get(name, name))
        for (model, _), reference in references.items()
        for name in [reference["$ref"].rpartition("/")[2]]
    }
