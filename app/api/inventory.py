"""Inventories: the mass in every vessel at an instant, its course, and the working behind it."""

from __future__ import annotations

from typing import Annotated

from fastapi import APIRouter, Query, Request

from app.api.parameters import AsOf, At, PathId, QueryInstant
from app.schemas.inventory import Change, Inventory, SiteInventory
from app.schemas.listing import Page
from app.services import change, take_stock

router = APIRouter(prefix="/v1/sites/{site}", tags=["inventory"])
Every = Annotated[float, Query(ge=1, le=31 * 86400, description="Seconds from one point to the next [s]")]


@router.get("/inventory")
def get_site_inventory(request: Request, site: PathId, at: At = None, as_of: AsOf = None) -> SiteInventory:
    """Every vessel's inventory at an instant, with totals by substance."""
    state = request.app.state
    instant = state.clock.now() if at is None else at
    return SiteInventory.model_validate(take_stock.site_inventory(state.store, site, instant, as_of))


@router.get("/vessels/{vessel}/inventory")
def get_course(
    request: Request, site: PathId, vessel: PathId,
    first: Annotated[QueryInstant, Query(alias="from", description="From this instant on")],
    last: Annotated[QueryInstant, Query(alias="to", description="To before this instant")],
    every: Every = 3600.0, as_of: AsOf = None,
) -> Page[Inventory]:  # fmt: skip
    """A vessel's inventory over time, at most 10,000 points."""
    found = take_stock.course(request.app.state.store, site, vessel, first, last, int(every * 1e6), as_of)
    return Page[Inventory].model_validate(found)


@router.get("/vessels/{vessel}/change")
def get_change(
    request: Request, site: PathId, vessel: PathId,
    first: Annotated[QueryInstant, Query(alias="from", description="The first instant")],
    last: Annotated[QueryInstant, Query(alias="to", description="The second instant")], as_of: AsOf = None,
) -> Change:  # fmt: skip
    """Why the mass differs between two instants: by input, and what tickets moved."""
    return Change.model_validate(change.change(request.app.state.store, site, vessel, first, last, as_of))


@router.get("/vessels/{vessel}/working")
def get_working(
    request: Request, site: PathId, vessel: PathId, at: At = None, as_of: AsOf = None,
    working: Annotated[bool, Query(description="With the steps")] = True,
    budget: Annotated[bool, Query(description="With the budget of the uncertainty")] = True,
    statement: Annotated[bool, Query(description="With the tank statement at 15 °C, 20 °C and 60 °F")] = True,
) -> Inventory:  # fmt: skip
    """One inventory with the steps that led to it, the budget of its uncertainty, and the tank statement."""
    state = request.app.state
    instant = state.clock.now() if at is None else at
    wanted = {"working": working, "budget": budget, "statement": statement}
    return Inventory.model_validate(take_stock.vessel_inventory(state.store, site, vessel, instant, as_of, **wanted))
