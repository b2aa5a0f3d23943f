"""Sites: places with vessels, one time zone, one hour at which the day starts."""

from __future__ import annotations

from typing import Annotated

from fastapi import APIRouter, Depends, Request, Response

from app.api.bodies import json_body
from app.api.parameters import AsOf, At, Cursor, Limit, PathId
from app.schemas.listing import LIMIT, Defined, Page, Written
from app.schemas.site import Site
from app.services import define

router = APIRouter(prefix="/v1/sites", tags=["sites"])


@router.put("/{site}", responses={201: {"description": "The site was not defined before"}})
def put_site(
    request: Request, response: Response, site: PathId, body: Annotated[Site, Depends(json_body(Site))]
) -> Written:
    """Define a site, or revise it: 201 where it is new, 200 otherwise; the same body twice changes nothing."""
    done = define.put_site(request.app.state.store, site, body, request.state.request_id)
    response.status_code = 201 if done.outcome == "created" else 200
    return Written(id=site, outcome=done.outcome, known_at=done.known_at)


@router.get("/{site}", response_model_exclude_unset=True)
def get_site(request: Request, site: PathId, at: At = None, as_of: AsOf = None) -> Defined[Site]:
    """The site as defined at an instant, or as it holds last."""
    return Defined[Site].model_validate(define.newest(request.app.state.store, site, "site", site, at, as_of))


@router.get("", response_model_exclude_unset=True)
def list_sites(request: Request, limit: Limit = LIMIT, cursor: Cursor = None) -> Page[Defined[Site]]:
    """Every site, by id."""
    page, after = define.site_listing(request.app.state.store, cursor, limit)
    return Page[Defined[Site]].model_validate({"items": page, "next": after})
