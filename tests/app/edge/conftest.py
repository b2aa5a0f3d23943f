"""A tiny application behind the real door, so that the door is tested without what it guards."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Annotated, Any, Literal

import pytest
from fastapi import APIRouter, Depends, FastAPI, HTTPException, Query
from fastapi.testclient import TestClient
from pydantic import AwareDatetime, BaseModel, ConfigDict, Field

from app.edge import openapi, problems
from app.edge.body import json_body
from app.edge.hosts import Hosts
from app.edge.log import Requests
from app.errors import Conflict
from app.settings import Settings
from app.store.engine import DiskFull, StoreUnavailable


class Ball(BaseModel):
    """A ball."""

    model_config = ConfigDict(strict=True)

    kind: Literal["ball"]
    diameter_m: float


class Brick(BaseModel):
    """A brick."""

    model_config = ConfigDict(strict=True)

    kind: Literal["brick"]
    rows: list[list[float]]


class Row(BaseModel):
    """One row."""

    model_config = ConfigDict(strict=True, extra="forbid", allow_inf_nan=False)

    vessel: str = Field(pattern=r"^[a-z0-9-]{1,20}$", examples=["tk-12"])
    taken_at: AwareDatetime
    level_m: float | None = Field(None, ge=-10, le=100)
    count: int = 0
    values: dict[str, float] = Field(default_factory=dict)
    shape: Annotated[Ball | Brick, Field(discriminator="kind")] | None = None


class Rows(BaseModel):
    """A batch."""

    model_config = ConfigDict(strict=True, extra="forbid")

    rows: list[Row]


class Anything(BaseModel):
    """A body that takes whatever JSON takes."""

    value: Any


router = APIRouter()


@router.post("/rows")
def post_rows(body: Annotated[Rows, Depends(json_body(Rows))]) -> Rows:
    """Answers what it was sent."""
    return body


@router.post("/anything")
def post_anything(body: Annotated[Anything, Depends(json_body(Anything))]) -> dict[str, int]:
    """Answers the length of what it was sent."""
    return {"length": len(str(body.value))}


@router.get("/things/{thing}")
def get_thing(thing: str, limit: Annotated[int, Query(ge=1, le=10)] = 1) -> dict[str, int]:
    """Answers its limit."""
    return {"limit": limit}


@router.put("/things/{thing}")
def put_thing(thing: str) -> None:
    """Says no."""
    raise Conflict("The day is not over.", code="period_open", headers={"X-Extra": "kept"})


@router.get("/raise/{kind}")
def get_raise(kind: str) -> None:
    """Fails in the way asked for."""
    raise {
        "fault": RuntimeError("SELECT secret FROM table"),
        "unreachable": StoreUnavailable("host 10.0.0.1"),
        "full": DiskFull("/var/lib"),
        "gate": HTTPException(401, "A key is needed.", headers={"WWW-Authenticate": "Bearer"}),
    }[kind]


@pytest.fixture
def probe() -> FastAPI:
    """The tiny application; bodies up to 20 kB."""
    app = FastAPI(
        telemetry={"tracing": False, "metrics": False, "logs": False, "operation_spans": False},
        generate_unique_id_function=openapi.operation_id,
    )
    app.state.settings = Settings(max_body_mb=0.02, database_url="sqlite:///unused.db")
    app.add_middleware(Hosts, names=app.state.settings.hosts)
    app.add_middleware(Requests)
    problems.install(app)
    app.include_router(router)
    return app


@pytest.fixture
def client(probe: FastAPI) -> Iterator[TestClient]:
    """A client that calls it by a loopback name."""
    with TestClient(probe, base_url="http://localhost") as found:
        yield found
