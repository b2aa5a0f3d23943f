"""Transfers: substance moved between two vessels, or between a vessel and a boundary."""

from __future__ import annotations

from typing import Annotated, Any

from fastapi import APIRouter, Depends, Query, Request, Response

from app.api.bodies import json_body
from app.api.parameters import AsOf, Cursor, Limit, PathId, QueryInstant, cursor_of, open_cursor
from app.edge.body import batch_body
from app.schemas.batch import ERRORS_LISTED, BatchAnswer
from app.schemas.errors import sentence
from app.schemas.listing import LIMIT, Page, Written
from app.schemas.transfer import StoredTransfer, Transfer, TransferBatch, validate_transfers
from app.services import move, read_back

router = APIRouter(prefix="/v1/sites/{site}/transfers", tags=["transfers"])


@router.put("/{transfer}", responses={201: {"description": "The ticket was not known before"}})
def put_transfer(
    request: Request, response: Response, site: PathId, transfer: PathId,
    body: Annotated[Transfer, Depends(json_body(Transfer))],
) -> Written:  # fmt: skip
    """Keep a ticket, or revise it; `void` strikes it and keeps it readable."""
    outcome, known = move.put(request.app.state.store, site, transfer, body, request.state.request_id)
    response.status_code = 201 if outcome == "created" else 200
    return Written(id=transfer, outcome=outcome, known_at=known)


@router.post("")
def post_transfers(
    request: Request, site: PathId,
    body: Annotated[Any, Depends(batch_body(TransferBatch, validate_transfers, sentence))],
) -> BatchAnswer:  # fmt: skip
    """Keep a batch of tickets: good ones are kept, bad ones named, all counted."""
    rows, refused = body
    counts, errors, known = move.put_many(request.app.state.store, site, rows, refused, request.state.request_id)
    return BatchAnswer(
        stored=counts["created"], revised=counts["revised"], unchanged=counts["unchanged"],
        rejected=len({error.index for error in errors}), errors=tuple(errors[:ERRORS_LISTED]),
        known_at=known,
    )  # fmt: skip


@router.get("/{transfer}", response_model_exclude_unset=True)
def get_transfer(request: Request, site: PathId, transfer: PathId, as_of: AsOf = None) -> StoredTransfer:
    """One ticket as it is known, struck or not."""
    ticket, body = move.current(request.app.state.store, site, transfer, as_of)
    return _stored(ticket, body)


@router.get("", response_model_exclude_unset=True)
def list_transfers(
    request: Request, site: PathId,
    first: Annotated[QueryInstant, Query(alias="from", description="From this instant on")],
    last: Annotated[QueryInstant, Query(alias="to", description="To before this instant")],
    cursor: Cursor = None, limit: Limit = LIMIT, as_of: AsOf = None,
) -> Page[StoredTransfer]:  # fmt: skip
    """The tickets that move something in a period, by their end."""
    place = open_cursor(cursor)
    found, following, known = read_back.tickets(request.app.state.store, site, (first, last), place, limit, as_of)
    after = None if following is None else cursor_of(*following, known)
    return Page(items=tuple(_stored(*one) for one in found), next=after, known_at=known)


def _stored(ticket: Any, body: Transfer) -> StoredTransfer:
    return StoredTransfer(id=ticket.name, revision=ticket.revision, recorded_at=ticket.recorded_at, transfer=body)
