"""Every refusal leaves as ``application/problem+json`` (RFC 9457), and none repeats the input.

FastAPI's own answer to a bad body quotes that body, which turns ``NaN`` or a lone surrogate into a
fault of the service when the answer is written; here the sentence and the pointer are all that is said.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from http import HTTPStatus

from fastapi import FastAPI, Request, Response
from fastapi.exceptions import RequestValidationError
from fastapi.routing import iter_route_contexts
from pydantic import BaseModel, ConfigDict, Field
from starlette.exceptions import HTTPException
from starlette.types import Scope

from app.errors import AppError, FieldError, StorageFull, Unavailable, Unprocessable, field_error
from app.store.engine import DiskFull, StoreUnavailable

MEDIA_TYPE = "application/problem+json"


class ProblemField(BaseModel):
    """One thing wrong with the request."""

    pointer: str = Field(
        description="JSON pointer into the body; `/query/…`, `/path/…` for parameters; empty for the whole.",
        examples=["/readings/17/taken_at"],
    )
    code: str = Field(description="Stable word for the kind of mistake.", examples=["no_offset"])
    detail: str = Field(description="A sentence.", examples=["Input should have timezone info"])
    index: int | None = Field(default=None, description="Row of a batch, from 0.", examples=[17])


class Problem(BaseModel):
    """An answer that is not the one asked for (RFC 9457)."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "type": "urn:brimbook:problem:invalid",
                    "title": "The request cannot be taken as it stands",
                    "status": 422,
                    "detail": "The body has 1 error.",
                    "instance": "urn:brimbook:request:4f1c2b9ad1e94c0f9d7f2f6f0c5a1b3e",
                    "code": "invalid",
                    "errors": [
                        {
                            "pointer": "/readings/17/taken_at",
                            "code": "no_offset",
                            "detail": "Input should have timezone info",
                            "index": 17,
                        }
                    ],
                }
            ]
        }
    )

    type: str = Field(description="Stable URI of the kind of problem; ends in `code`.")
    title: str = Field(description="The kind of problem, in words.")
    status: int = Field(description="The HTTP status, again.")
    detail: str = Field(description="What is wrong this time and what to do about it.")
    instance: str = Field(description="The request's id, as in `X-Request-Id` and in the log.")
    code: str = Field(description="Stable word that a client may act on.")
    errors: list[ProblemField] = Field(description="Each mistake with its place; empty if none has a place.")


def problem_response(
    scope: Scope,
    *,
    status: int,
    code: str,
    title: str,
    detail: str,
    errors: Iterable[FieldError] = (),
    headers: Mapping[str, str] | None = None,
) -> Response:
    """A problem answer for the request of this scope."""
    document = Problem(
        type=f"urn:brimbook:problem:{code}",
        title=title,
        status=status,
        detail=detail,
        instance=f"urn:brimbook:request:{scope.get('state', {}).get('request_id', 'unknown')}",
        code=code,
        errors=[ProblemField(pointer=e.pointer, code=e.code, detail=e.detail, index=e.index) for e in errors],
    )
    return Response(
        document.model_dump_json(exclude_none=True), status, dict(headers or {}), media_type=MEDIA_TYPE
    )


def answer(scope: Scope, error: AppError) -> Response:
    """The problem answer of one refusal."""
    return problem_response(
        scope,
        status=error.status,
        code=error.code,
        title=error.title,
        detail=error.detail,
        errors=error.errors,
        headers=error.headers,
    )


def fault(scope: Scope) -> Response:
    """The answer to what nobody foresaw: it says nothing, the log says all."""
    return answer(scope, AppError("The service failed on this request; its log says why."))


def install(app: FastAPI) -> None:
    """Make every refusal of ``app`` a problem answer."""
    app.add_exception_handler(AppError, _app_error)
    app.add_exception_handler(HTTPException, _http_exception)
    app.add_exception_handler(RequestValidationError, _parameters)
    app.add_exception_handler(StoreUnavailable, _unavailable)
    app.add_exception_handler(DiskFull, _full)


def _app_error(request: Request, error: Exception) -> Response:
    assert isinstance(error, AppError)
    return answer(request.scope, error)


def _unavailable(request: Request, _: Exception) -> Response:
    return answer(request.scope, Unavailable("The store cannot be reached now; try the same again."))


def _full(request: Request, _: Exception) -> Response:
    detail = "The disk of the store is full. Free some room, then send the same again."
    return answer(request.scope, StorageFull(detail))


def _http_exception(request: Request, error: Exception) -> Response:
    """What the framework raises itself: an unknown path, a method that a path does not have."""
    assert isinstance(error, HTTPException)
    status = HTTPStatus(error.status_code)
    headers = dict(error.headers or {})
    detail = str(error.detail)
    if status is HTTPStatus.NOT_FOUND and detail == status.phrase:
        detail = "There is nothing at this path; the paths are listed in /openapi.json."
    if status is HTTPStatus.METHOD_NOT_ALLOWED:
        # The framework names the methods of the first route that matches, not those of the path.
        headers["Allow"] = ", ".join(sorted(_methods_of_path(request)))
        detail = f"This path answers to {headers['Allow']}."
    code = status.phrase.lower().replace(" ", "_").replace("-", "_").replace("'", "")
    return problem_response(
        request.scope, status=status.value, code=code, title=status.phrase, detail=detail, headers=headers
    )


def _methods_of_path(request: Request) -> set[str]:
    methods: set[str] = set()
    for context in iter_route_contexts(request.app.routes):
        pattern = getattr(context, "path_regex", None)
        if pattern is not None and pattern.match(request.url.path):
            methods |= context.methods or set()
    return methods


def _parameters(request: Request, error: Exception) -> Response:
    """Path and query parameters; bodies never come here (see ``body.py``)."""
    assert isinstance(error, RequestValidationError)
    errors = [field_error(one, one["loc"]) for one in error.errors()]
    detail = f"The path or query has {len(errors)} error{'' if len(errors) == 1 else 's'}."
    return answer(request.scope, Unprocessable(detail, errors=errors))
