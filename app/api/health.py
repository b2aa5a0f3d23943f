"""For whoever runs the service: is it alive, and can it work."""

from __future__ import annotations

from fastapi import APIRouter, Request
from pydantic import BaseModel, Field

from app.services.ready import require_ready

router = APIRouter(tags=["health"])


class Health(BaseModel):
    """What there is to say when all is well."""

    status: str = Field(description="`ok`; anything else is a problem answer.", examples=["ok"])


@router.get("/health")
def health() -> Health:
    """The process is alive. Asks nothing of the store: restarting this would not bring the store back."""
    return Health(status="ok")


@router.get("/ready")
def ready(request: Request) -> Health:
    """The store is reached and its tables are up to date; 503 with Retry-After otherwise."""
    require_ready(request.app.state.store)
    return Health(status="ok")
