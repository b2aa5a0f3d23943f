"""Meters: what measures transfers, with errors of its own."""

from __future__ import annotations

from typing import Annotated

from fastapi import APIRouter, Depends, Request, Response

from app.api.bodies import json_body
from app.api.parameters import AsOf, At, Cursor, Limit, PathId, name_cursor, open_name
from app.schemas.listing import LIMIT, Defined, Page, Written
from app.schemas.meter import Meter
from app.services import define

router = APIRouter(prefix="/v1/sites/{site}/meters", tags=["meters"])


@router.put("/{meter}", responses={201: {"description": "The meter was not defined before"}})
def put_meter(
    request: Request, response: Response, site: PathId, meter: PathId,
    body: Annotated[Meter, Depends(json_body(Meter))],
) -> Written:  # fmt: skip
    """Define a meter, or revise it: 201 where it is new, 200 otherwise; the same body twice changes nothing."""
    done = define.put(request.app.state.store, site, "meter", meter, body, request.state.request_id)
    response.status_code = 201 if done.outcome == "created" else 200
    return Written(id=meter, outcome=done.outcome, known_at=done.known_at)


@router.get("/{meter}", response_model_exclude_unset=True)
def get_meter(request: Request, site: PathId, meter: PathId, at: At = None, as_of: AsOf = None) -> Defined[Meter]:
    """The meter as defined at an instant, or as it holds last."""
    return Defined[Meter].model_validate(define.newest(request.app.state.store, site, "meter", meter, at, as_of))


@router.get("", response_model_exclude_unset=True)
def list_meters(
    request: Request, site: PathId, at: At = None, as_of: AsOf = None, limit: Limit = LIMIT, cursor: Cursor = None
) -> Page[Defined[Meter]]:
    """Every meter of the site in force at an instant, by id."""
    store = request.app.state.store
    behind, known = open_name(cursor, as_of)
    page, after, known = define.listing(store, site, "meter", at, known, behind, limit)
    return Page[Defined[Meter]].model_validate({"items": page, "next": name_cursor(after, known), "known_at": known})
