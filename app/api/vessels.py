"""Vessels: tanks and pressure vessels, with shape, shell, instruments and what they hold."""

from __future__ import annotations

from typing import Annotated

from fastapi import APIRouter, Depends, Request, Response

from app.api.bodies import json_body
from app.api.parameters import AsOf, At, Cursor, Limit, PathId, name_cursor, open_name
from app.schemas.listing import LIMIT, Defined, Page, Written
from app.schemas.vessel import Vessel
from app.services import define

router = APIRouter(prefix="/v1/sites/{site}/vessels", tags=["vessels"])


@router.put("/{vessel}", responses={201: {"description": "The vessel was not defined before"}})
def put_vessel(
    request: Request, response: Response, site: PathId, vessel: PathId,
    body: Annotated[Vessel, Depends(json_body(Vessel))],
) -> Written:  # fmt: skip
    """Define a vessel, or revise it: 201 where it is new, 200 otherwise; the same body twice changes nothing."""
    done = define.put(request.app.state.store, site, "vessel", vessel, body, request.state.request_id)
    response.status_code = 201 if done.outcome == "created" else 200
    return Written(id=vessel, outcome=done.outcome, known_at=done.known_at)


@router.get("/{vessel}", response_model_exclude_unset=True)
def get_vessel(request: Request, site: PathId, vessel: PathId, at: At = None, as_of: AsOf = None) -> Defined[Vessel]:
    """The vessel as defined at an instant, or as it holds last."""
    return Defined[Vessel].model_validate(define.newest(request.app.state.store, site, "vessel", vessel, at, as_of))


@router.get("", response_model_exclude_unset=True)
def list_vessels(
    request: Request, site: PathId, at: At = None, as_of: AsOf = None, limit: Limit = LIMIT, cursor: Cursor = None
) -> Page[Defined[Vessel]]:
    """Every vessel of the site in force at an instant, by id."""
    store = request.app.state.store
    behind, known = open_name(cursor, as_of)
    page, after, known = define.listing(store, site, "vessel", at, known, behind, limit)
    return Page[Defined[Vessel]].model_validate({"items": page, "next": name_cursor(after, known), "known_at": known})


@router.get("/{vessel}/revisions", response_model_exclude_unset=True)
def list_vessel_revisions(request: Request, site: PathId, vessel: PathId, as_of: AsOf = None) -> Page[Defined[Vessel]]:
    """Everything that was ever said of a vessel, in the order in which it was recorded."""
    said, known = define.revisions(request.app.state.store, site, "vessel", vessel, as_of)
    return Page[Defined[Vessel]].model_validate({"items": said, "next": None, "known_at": known})
