"""Reconciliations: periods closed, every vessel's imbalance judged."""

from __future__ import annotations

from typing import Annotated

from fastapi import APIRouter, Depends, Path, Query, Request, Response

from app.api.bodies import json_body
from app.api.parameters import AsOf, Cursor, Limit, PathId, QueryInstant, cursor_of, open_numbers
from app.schemas.listing import LIMIT, Page
from app.schemas.reconciliation import BookChanges, Imbalance, Reconciliation, ReconciliationRequest
from app.schemas.types import RECONCILIATION_PATTERN, worded
from app.services import close
from app.services.changes import changes

router = APIRouter(prefix="/v1/sites/{site}", tags=["reconciliations"])
First = Annotated[QueryInstant, Query(alias="from", description="Periods that close after this instant")]
Last = Annotated[QueryInstant, Query(alias="to", description="Periods that close not after this instant")]
Detail = Annotated[bool, Query(description="With the statistics")]
Name = Annotated[
    str, *worded(RECONCILIATION_PATTERN), Path(description="2026-03-14, or with its revision 2026-03-14.2")
]


@router.post("/reconciliations", responses={201: {"description": "A new revision"}})
def post_reconciliation(
    request: Request, response: Response, site: PathId,
    body: Annotated[ReconciliationRequest, Depends(json_body(ReconciliationRequest))], detail: Detail = False,
) -> Reconciliation:  # fmt: skip
    """Close a day or a period: 201 with a new revision, 200 with the one that stands."""
    state = request.app.state
    bounds = None if body.opening is None or body.closing is None else (body.opening, body.closing)
    closed, new = close.close(state.store, state.clock, site, body.day, bounds, request.state.request_id, detail=detail)
    response.status_code = 201 if new else 200
    return Reconciliation.model_validate(closed)


@router.get("/reconciliations/{reconciliation}")
def get_reconciliation(
    request: Request, site: PathId, reconciliation: Name, detail: Detail = False, as_of: AsOf = None
) -> Reconciliation:
    """One closed period, at the revision named or the newest."""
    found = close.find(request.app.state.store, site, reconciliation, as_of, detail=detail)
    return Reconciliation.model_validate(found)


@router.get("/reconciliations/{reconciliation}/changes")
def get_changes(request: Request, site: PathId, reconciliation: Name) -> BookChanges:
    """What a revision changed against the one before, and because of what, also in words."""
    return BookChanges.model_validate(changes(request.app.state.store, site, reconciliation))


@router.get("/reconciliations")
def list_reconciliations(
    request: Request, site: PathId, first: First, last: Last, cursor: Cursor = None, limit: Limit = LIMIT,
    as_of: AsOf = None,
) -> Page[Reconciliation]:  # fmt: skip
    """Closed periods by their close, each at its newest revision."""
    place = open_numbers(cursor)
    found, following, known = close.listing(request.app.state.store, site, (first, last), place, limit, as_of)
    after = None if following is None else cursor_of(*following, known)
    return Page[Reconciliation].model_validate({"items": found, "next": after, "known_at": known})


@router.get("/imbalances")
def list_imbalances(
    request: Request, site: PathId, first: First, last: Last, cursor: Cursor = None, limit: Limit = LIMIT,
    as_of: AsOf = None,
    flagged: Annotated[bool | None, Query(description="Only those that are flagged, or are not")] = None,
) -> Page[Imbalance]:  # fmt: skip
    """The vessels of many closed periods as one flat list; a page holds the vessels of `limit` periods."""
    place = open_numbers(cursor)
    found, following, known = close.listing(request.app.state.store, site, (first, last), place, limit, as_of)
    after = None if following is None else cursor_of(*following, known)
    items = close.imbalances(found, flagged=flagged)
    return Page[Imbalance].model_validate({"items": items, "next": after, "known_at": known})
