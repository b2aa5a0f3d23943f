"""Calculations: the same arithmetic with nothing stored."""

from __future__ import annotations

from typing import Annotated, Any

from fastapi import APIRouter, Depends, Query

from app.api.bodies import json_body
from app.edge.rows import RowsText, table_body
from app.schemas.calculation import Balance, BalanceCalculation, InventoryCalculation, InventoryResults
from app.schemas.errors import sentence
from app.schemas.expected import ExpectedReading, ExpectedReadingCalculation
from app.schemas.fit import ExpansivityCalculation, FittedExpansivity
from app.schemas.tabulate import TableOptions, TabulatedShape, Tabulation
from app.services import balance, calculate, expected, fit, read_table, tabulate

router = APIRouter(prefix="/v1/calculations", tags=["calculations"])

TABLE = table_body(
    Tabulation,
    RowsText(
        read_table.read,
        "A capacity table to be checked: RFC 4180 with commas, in UTF-8; the first line names its two columns, "
        "level_m and volume_m3, or with the unit that they stand in: level [ft-in-16] (23-04-11), level [mm], "
        "volume [bbl] (42 US gallons), volume [L]. What else there is to say of it stands in the query.",
        "level [ft-in-16],volume [bbl]\n00-00-00,12.4\n00-01-00,137.6\n",
    ),
    sentence,
)
"""A shape to be tabulated as JSON, or a table to be checked as CSV."""


@router.post("/inventory")
def calculate_inventory(
    body: Annotated[InventoryCalculation, Depends(json_body(InventoryCalculation))],
    working: Annotated[bool, Query(description="With the steps")] = False,
    budget: Annotated[bool, Query(description="With the budget of the uncertainty")] = False,
    statement: Annotated[bool, Query(description="With the tank statement at 15 °C, 20 °C and 60 °F")] = False,
) -> InventoryResults:
    """One inventory for each reading; each reading stands alone."""
    results = calculate.calculate(body, working=working, budget=budget, statement=statement)
    return InventoryResults.model_validate({"results": results})


@router.post("/balance")
def calculate_balance(body: Annotated[BalanceCalculation, Depends(json_body(BalanceCalculation))]) -> Balance:
    """A network of nodes and streams, reconciled and tested."""
    return Balance.model_validate(balance.solve_network(body))


@router.post("/expected-reading")
def calculate_expected_reading(
    body: Annotated[ExpectedReadingCalculation, Depends(json_body(ExpectedReadingCalculation))],
) -> ExpectedReading:
    """What the instruments should show for a mass: the inverse of an inventory, by the same chain."""
    return ExpectedReading.model_validate(expected.expect(body))


@router.post("/capacity-table")
def calculate_capacity_table(
    body: Annotated[Any, Depends(TABLE)], options: Annotated[TableOptions, Query()]
) -> TabulatedShape:  # fmt: skip
    """A shape as a capacity table with its worst interpolation error; or a table from CSV, checked."""
    return tabulate.capacity_table_of(body, options)


@router.post("/expansivity", response_model_exclude_unset=True)
def calculate_expansivity(
    body: Annotated[ExpansivityCalculation, Depends(json_body(ExpansivityCalculation))],
) -> FittedExpansivity:
    """β and κ from measured densities, their covariance, the residuals, and the substance that they make."""
    return FittedExpansivity.model_validate(fit.fit(body))
