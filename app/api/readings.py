"""Readings: what was measured on a vessel or on the site at an instant."""

from __future__ import annotations

from typing import Annotated, Any

from fastapi import APIRouter, Depends, Query, Request

from app.api.parameters import AsOf, Cursor, Limit, PathId, QueryInstant, cursor_of, open_cursor
from app.edge.body import batch_body
from app.schemas.batch import BatchAnswer
from app.schemas.listing import LIMIT, Page
from app.schemas.reading import ReadingBatch, StoredValue, validate_batch
from app.services import ingest, read_back

router = APIRouter(prefix="/v1/sites/{site}", tags=["readings"])


@router.post("/readings")
def post_readings(
    request: Request, site: PathId, body: Annotated[Any, Depends(batch_body(ReadingBatch, validate_batch))]
) -> BatchAnswer:
    """Keep a batch: good rows are stored, bad ones named, all counted; a repeat is harmless."""
    rows, errors = body
    state = request.app.state
    done = ingest.ingest(state.store, state.clock, site, rows, errors, request=request.state.request_id)
    return BatchAnswer(
        stored=done.stored, revised=done.revised, unchanged=done.unchanged, rejected=done.rejected,
        errors=ingest.listed(errors), known_at=done.known_at,
    )  # fmt: skip


@router.get("/vessels/{vessel}/readings")
def list_readings(
    request: Request, site: PathId, vessel: PathId,
    first: Annotated[QueryInstant, Query(alias="from", description="From this instant on")],
    last: Annotated[QueryInstant, Query(alias="to", description="To before this instant")],
    source: Annotated[str | None, Query(max_length=63, description="Only this source")] = None,
    cursor: Cursor = None, limit: Limit = LIMIT, as_of: AsOf = None,
) -> Page[StoredValue]:  # fmt: skip
    """The values of a vessel as stored, oldest first, with what revised them last."""
    place = open_cursor(cursor)
    store = request.app.state.store
    values, following, known = read_back.values(store, site, vessel, (first, last), source, place, limit, as_of)
    after = None if following is None else cursor_of(*following, known)
    return Page(items=values, next=after, known_at=known)
