"""The application: the door outside, the routes inside, the store for as long as it runs."""

from __future__ import annotations

from collections.abc import AsyncIterator
from contextlib import asynccontextmanager
from importlib.metadata import PackageNotFoundError, version
from typing import Any

from fastapi import APIRouter, FastAPI, Request, Response
from fastapi.telemetry import TelemetryConfig

from app.api import (
    calculations,
    health,
    inventory,
    meters,
    readings,
    reconciliations,
    sites,
    substances,
    transfers,
    vessels,
)
from app.clock import Clock
from app.edge import openapi, problems
from app.edge.hosts import Hosts
from app.edge.log import Requests, configure
from app.errors import FieldError, Unprocessable
from app.settings import Settings, from_environment
from app.store.engine import Store
from models.errors import ModelError

# In the order of the flow, which is the order in which /openapi.json lists them.
ROUTERS: list[APIRouter] = [
    module.router
    for module in (
        sites, substances, vessels, meters, readings, transfers, inventory, reconciliations, calculations, health,
    )
]  # fmt: skip
QUIET = TelemetryConfig(tracing=False, metrics=False, logs=False, operation_spans=False, auto_configure=False)
DESCRIPTION = """Readings of tanks and pressure vessels in; mass with its standard uncertainty, and books
closed every night, out. Every number carries its unit in its name; `_kpa` is gauge unless it ends in
`_kpa_abs`. Instants are RFC 3339 with an offset."""


def create_app(settings: Settings | None = None, clock: Clock | None = None) -> FastAPI:
    """The ASGI application.

    Parameters
    ----------
    settings : Settings, optional
        Taken from the environment if left out.
    clock : Clock, optional
        The machine's if left out.
    """
    settings = settings or from_environment()
    app = FastAPI(
        title="Brimbook",
        version=_version(),
        description=DESCRIPTION,
        lifespan=_lifespan,
        telemetry=QUIET,
        docs_url=None,  # FastAPI's page loads its scripts from a public network; plants have none
        redoc_url=None,
        generate_unique_id_function=openapi.operation_id,
    )
    app.state.settings = settings
    app.state.clock = clock or Clock()
    app.add_middleware(Hosts, names=settings.hosts)
    app.add_middleware(Requests)
    problems.install(app)
    app.add_exception_handler(ModelError, _model_error)
    for router in ROUTERS:
        app.include_router(router)
    _describe_once(app)
    return app


def served() -> FastAPI:
    """The application as each process of ``brimbook serve`` makes it: with this process's log set up."""
    settings = from_environment()
    configure(settings.log_level)
    return create_app(settings)


def _version() -> str:
    try:
        return version("brimbook")
    except PackageNotFoundError:  # run from a checkout that was never installed
        return "0"


@asynccontextmanager
async def _lifespan(app: FastAPI) -> AsyncIterator[dict[str, Any]]:
    settings: Settings = app.state.settings
    store = Store.open(settings.database_url, app.state.clock.now)
    try:
        if settings.migrate_at_start:
            store.migrate()
        app.state.store = store
        yield {"receive_deadline_s": settings.receive_deadline_s}
    finally:
        store.close()


def _model_error(request: Request, error: Exception) -> Response:
    """What the models refuse is a value that cannot be."""
    assert isinstance(error, ModelError)
    pointer = "" if error.field is None else f"/{error.field}"
    named = [FieldError(pointer, error.code, error.detail, error.index)]
    return problems.answer(request.scope, Unprocessable(error.detail, code=error.code, errors=named))


def _describe_once(app: FastAPI) -> None:
    def described() -> dict[str, Any]:
        if app.openapi_schema is None:
            app.openapi_schema = openapi.describe(app)
        return app.openapi_schema

    app.openapi = described  # type: ignore[method-assign]
