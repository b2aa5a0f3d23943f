"""The same arithmetic with nothing stored: one vessel, one substance, readings that stand alone."""

from __future__ import annotations

from typing import Any

import numpy as np

from app.errors import FieldError, Unprocessable
from app.schemas.calculation import CalculationReading, InventoryCalculation
from app.services import define
from app.services.choose import Candidates
from app.services.collect import INPUTS, Collected, conversion, names_of
from app.services.compile import CompiledVessel, compile_bodies
from app.services.compositions import components_of
from app.services.explain import answers
from app.services.ingest import quality_of, text_of
from app.services.measure import measure
from app.services.parts import Origin
from models.components import COMPONENTS


def calculate(
    request: InventoryCalculation, *, working: bool, budget: bool, statement: bool = False
) -> list[dict[str, Any]]:
    """One inventory for each reading, in order; nothing is carried from one to the next."""
    define.check_components(request.substance, "/substance")
    _check_analyses(request)
    vessel = define.check(
        lambda: compile_bodies("vessel", request.site, request.vessel, request.substance), "/vessel", "/substance"
    )
    if not request.readings:
        return []
    measured = measure(collected(vessel, request.readings))
    results = answers(measured, working=working, budget=budget, statement=statement)
    for result, reading in zip(results, request.readings, strict=True):
        result.pop("vessel")
        result.pop("substance")
        if reading.taken_at is None:
            result.pop("at")
            result.get("statement", {}).pop("at", None)
    return results


def _check_analyses(request: InventoryCalculation) -> None:
    """Refuse an analysis that names a component which is neither in the table nor given in full."""
    given = components_of(request.substance).values()
    known = set(COMPONENTS).union(one.id for part in given for one in part)
    detail = "An analysis names components that are in the table or that the substance gives in full"
    unknown = [
        FieldError(f"/readings/{place}/{quantity}", "unknown_component", detail, place)
        for place, reading in enumerate(request.readings)
        for quantity in ("liquid_composition", "vapour_composition")
        if not known.issuperset(getattr(reading, quantity) or ())
    ]
    if unknown:
        raise Unprocessable(detail, code="unknown_component", errors=unknown)


def collected(vessel: CompiledVessel, readings: tuple[CalculationReading, ...]) -> Collected:
    """Readings as candidates, each at its own instant with nothing before or after it."""
    at = np.array([reading.taken_at or 0 for reading in readings], dtype=np.int64)
    result = Collected(at, (vessel,))
    for spec in INPUTS:
        sources = [reading.source for reading in readings]
        sources = sources[:1] if len(set(sources)) == 1 else sources
        columns = [[(quantity, source) for quantity in spec.quantities] for source in sources]
        width = len(spec.quantities)
        result.candidates[spec.name] = Candidates.empty(len(at), width)
        result.texts[spec.name] = np.full((len(at), width), None, dtype=object)
        result.origins[spec.name] = Origin(columns)
        for quantity in spec.companions:
            empty = np.full((len(at), width), None, dtype=object)
            result.companions[(spec.name, quantity)] = (Candidates.empty(len(at), width), empty)
        for quantity in names_of(spec):
            _place(result, vessel, spec.name, quantity, spec.quantities, readings)
    return result


def _place(
    result: Collected, vessel: CompiledVessel, name: str, quantity: str, quantities: tuple[str, ...],
    readings: tuple[CalculationReading, ...],
) -> None:  # fmt: skip
    """One quantity of every reading into its column; the source of a reading chooses its instruments."""
    own = quantity in quantities
    column = quantities.index(quantity) if own else 0
    if own:
        target, texts = result.candidates[name], result.texts[name]
    else:
        target, texts = result.companions[(name, quantity)]
    convert = {source: conversion(vessel, quantity, source) for source in {reading.source for reading in readings}}
    for row, reading in enumerate(readings):
        value = getattr(reading, quantity, None)
        if value is None or quality_of(reading, quantity) > 1:
            continue
        target.before_at[row, column] = target.before_taken[row, column] = result.at[row]
        target.before_quality[row, column] = quality_of(reading, quantity)
        if isinstance(value, int | float) and not isinstance(value, bool):
            target.before[row, column] = convert[reading.source](float(value), int(result.at[row]))
        else:
            texts[row, column] = text_of(value)
