"""Substances: what vessels hold, by a liquid model, a vapour model, or both."""

from __future__ import annotations

from typing import Annotated

from fastapi import APIRouter, Depends, Request, Response

from app.api.bodies import json_body
from app.api.parameters import AsOf, At, Cursor, Limit, PathId, name_cursor, open_name
from app.schemas.listing import LIMIT, Defined, Page, Written
from app.schemas.substance import Substance
from app.services import define

router = APIRouter(prefix="/v1/sites/{site}/substances", tags=["substances"])


@router.put("/{substance}", responses={201: {"description": "The substance was not defined before"}})
def put_substance(
    request: Request, response: Response, site: PathId, substance: PathId,
    body: Annotated[Substance, Depends(json_body(Substance))],
) -> Written:  # fmt: skip
    """Define a substance, or revise it: 201 where it is new, 200 otherwise; the same body twice changes nothing."""
    done = define.put(request.app.state.store, site, "substance", substance, body, request.state.request_id)
    response.status_code = 201 if done.outcome == "created" else 200
    return Written(id=substance, outcome=done.outcome, known_at=done.known_at)


@router.get("/{substance}", response_model_exclude_unset=True)
def get_substance(
    request: Request, site: PathId, substance: PathId, at: At = None, as_of: AsOf = None
) -> Defined[Substance]:
    """The substance as defined at an instant, or as it holds last."""
    return Defined[Substance].model_validate(
        define.newest(request.app.state.store, site, "substance", substance, at, as_of)
    )


@router.get("", response_model_exclude_unset=True)
def list_substances(
    request: Request, site: PathId, at: At = None, as_of: AsOf = None, limit: Limit = LIMIT, cursor: Cursor = None
) -> Page[Defined[Substance]]:
    """Every substance of the site in force at an instant, by id."""
    store = request.app.state.store
    behind, known = open_name(cursor, as_of)
    page, after, known = define.listing(store, site, "substance", at, known, behind, limit)
    return Page[Defined[Substance]].model_validate(
        {"items": page, "next": name_cursor(after, known), "known_at": known}
    )
