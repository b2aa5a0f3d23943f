"""Calculations: the same arithmetic with nothing stored."""

from __future__ import annotations

from typing import Annotated

from fastapi import APIRouter, Depends, Query

from app.api.bodies import json_body
from app.schemas.calculation import Balance, BalanceCalculation, InventoryCalculation, InventoryResults
from app.schemas.fit import ExpansivityCalculation, FittedExpansivity
from app.services import balance, calculate, fit

router = APIRouter(prefix="/v1/calculations", tags=["calculations"])


@router.post("/inventory")
def calculate_inventory(
    body: Annotated[InventoryCalculation, Depends(json_body(InventoryCalculation))],
    working: Annotated[bool, Query(description="With the steps")] = False,
    budget: Annotated[bool, Query(description="With the budget of the uncertainty")] = False,
) -> InventoryResults:
    """One inventory for each reading; each reading stands alone."""
    results = calculate.calculate(body, working=working, budget=budget)
    return InventoryResults.model_validate({"results": results})


@router.post("/balance")
def calculate_balance(body: Annotated[BalanceCalculation, Depends(json_body(BalanceCalculation))]) -> Balance:
    """A network of nodes and streams, reconciled and tested."""
    return Balance.model_validate(balance.solve_network(body))


@router.post("/expansivity", response_model_exclude_unset=True)
def calculate_expansivity(
    body: Annotated[ExpansivityCalculation, Depends(json_body(ExpansivityCalculation))],
) -> FittedExpansivity:
    """β and κ from measured densities, their covariance, the residuals, and the substance that they make."""
    return FittedExpansivity.model_validate(fit.fit(body))
