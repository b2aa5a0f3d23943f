"""Capacity tables are made of shapes and read from text, and checked before they are put."""

from __future__ import annotations

import math
from collections.abc import Iterator
from itertools import groupby

import numpy as np
from pydantic import ValidationError

from app.errors import FieldError, Unprocessable
from app.schemas.batch import ERRORS_LISTED
from app.schemas.calculation import CalculationVessel
from app.schemas.errors import explain
from app.schemas.shape import TABLE_ROWS, CapacityTable
from app.schemas.tabulate import InterpolationError, TableFinding, TableOptions, TabulatedShape, Tabulation
from app.services.read_table import Table
from app.services.shapes import capacity_curve
from models.arrays import BoolArray, FloatArray
from models.errors import DefinitionError
from models.geometry.curves import Curve, Curves
from models.geometry.tables import INTERPOLATIONS, capacity_table
from models.geometry.tabulate import row_count, row_levels, rows_off_nominal, worst_error

OFF_NOMINAL = 0.05  # of a step in volume: common practice
KEPT = ("of", "diameter_m", "roof_deducted_at_kg_m3", "head_included_at_kg_m3")


def capacity_table_of(asked: Tabulation | Table, options: TableOptions) -> TabulatedShape:
    """A table made of a shape, or one that was read, as a checked shape body."""
    if isinstance(asked, Table):
        return checked(asked, options)
    if options.model_fields_set:
        errors = [
            FieldError(f"/query/{name}", "conflicting", "The query's fields go with text/csv; here the body says it")
            for name in sorted(options.model_fields_set)
        ]
        raise Unprocessable(errors[0].detail, code="conflicting", errors=errors)
    return tabulated(asked)


# --- made of a shape ------------------------------------------------------------------------------


def tabulated(request: Tabulation) -> TabulatedShape:
    """Rows of a shape at a step, and the worst error of reading between them."""
    within = "/shape" if request.vessel is None else "/vessel/shape"
    vessel = request.vessel or CalculationVessel.model_validate({"shape": request.shape})
    curve = _curve(vessel, within)
    if row_count(curve, request.step_m) > TABLE_ROWS:
        detail = (
            f"step_m makes more than {TABLE_ROWS} rows of this vessel, which is {curve.top - curve.bottom:.6g} m "
            f"high; take at least {(curve.top - curve.bottom) / (TABLE_ROWS - 3):.6g} m"
        )
        raise Unprocessable(detail, code="out_of_range", errors=[FieldError("/step_m", "out_of_range", detail)])
    levels = row_levels(curve, request.step_m)
    volumes = np.maximum.accumulate(np.maximum(Curves.from_curves([curve]).volume(levels), 0.0))
    total = max(curve.capacity, float(volumes[-1]))
    kinds = sorted(INTERPOLATIONS, key=lambda kind: kind != request.interpolation)
    rows = tuple(zip(levels.tolist(), volumes.tolist(), strict=True))
    shape = vessel.shape
    said = {name: getattr(shape, name, None) for name in KEPT} | {"of": getattr(shape, "of", shape.kind)}
    return TabulatedShape(
        rows=rows, total_volume_m3=total,
        interpolation_errors=tuple(_worst(curve, levels, volumes, total, kind) for kind in kinds),
        shape=_body(rows, total, said | {"interpolation": request.interpolation}),
    )  # fmt: skip


def _curve(vessel: CalculationVessel, within: str) -> Curve:
    """The capacity curve that is asked for; what cannot be is named where it stands in the request."""
    try:
        curve, _ = capacity_curve(vessel)
    except DefinitionError as refused:
        field = refused.field or ""
        places = {"datum_m": "/vessel/gauging/datum_m"} | ({field: f"/vessel/{field}"} if "deadwood" in field else {})
        place = places.get(field, within)
        error = FieldError(place, refused.code, refused.detail, refused.index)
        raise Unprocessable(refused.detail, code=refused.code, errors=[error]) from None
    if curve is None:
        detail = "A vessel without a level has no capacity table"
        raise Unprocessable(detail, code="no_level", errors=[FieldError(f"{within}/kind", "no_level", detail)])
    return curve


def _worst(curve: Curve, levels: FloatArray, volumes: FloatArray, total: float, kind: str) -> InterpolationError:
    found = worst_error(curve, capacity_table(levels, volumes, total_volume=total, interpolation=kind))
    return InterpolationError.model_validate(
        {"interpolation": kind, "error_m3": found.volume, "error_pct": 100.0 * found.share, "level_m": found.level}
    )


def _body(rows: tuple[tuple[float, float], ...], total: float, said: dict[str, object]) -> CapacityTable:
    """The shape of a vessel's body; what a table may not be is refused with its place among the rows."""
    kept = {name: value for name, value in said.items() if value is not None}
    try:
        return CapacityTable.model_validate({"kind": "capacity_table", "rows": rows, "total_volume_m3": total} | kept)
    except ValidationError as refused:
        errors = [FieldError(*one) for one in explain(refused)[:ERRORS_LISTED]]
        raise Unprocessable(errors[0].detail, errors=errors) from None


# --- read -----------------------------------------------------------------------------------------


def checked(table: Table, options: TableOptions) -> TabulatedShape:
    """A table that was read, with what is odd about its rows; without a shape where it can be none."""
    levels, volumes = np.array(table.levels), np.array(table.volumes)
    found = [
        *_falls(levels, volumes),
        *_off_nominal(levels, volumes, table.resolution, options),
    ]  # fmt: skip
    rows = tuple(zip(table.levels, table.volumes, strict=True))
    total = table.volumes[-1] if options.total_volume_m3 is None else options.total_volume_m3
    forbidden = any(one.code != "slope_off_nominal" for one in found)
    found.sort(key=lambda one: one.index)
    return TabulatedShape(
        rows=rows, total_volume_m3=total, findings=tuple(found[:ERRORS_LISTED]),
        shape=None if forbidden else _body(rows, total, options.model_dump(exclude={"total_volume_m3"})),
    )  # fmt: skip


def _falls(levels: FloatArray, volumes: FloatArray) -> Iterator[TableFinding]:
    for first, count in _runs(np.diff(levels) <= 0.0):
        yield _finding("level_does_not_rise", levels, first, count, "the level does not rise from row to row")
    for first, count in _runs(np.diff(volumes) < 0.0):
        yield _finding("volume_falls", levels, first, count, "the volume falls from row to row")


def _off_nominal(
    levels: FloatArray, volumes: FloatArray, resolution: float, options: TableOptions
) -> Iterator[TableFinding]:  # fmt: skip
    """Steps in volume that an upright cylinder of this diameter does not have."""
    if options.diameter_m is None or options.of not in (None, "vertical_cylinder"):
        return
    area = math.pi * options.diameter_m**2 / 4.0
    off, _ = rows_off_nominal(levels, volumes, area=area, share=OFF_NOMINAL, resolution=resolution)
    for first, count in _runs(off & (np.diff(levels) > 0.0)):
        rise = float(volumes[first + count] - volumes[first])
        nominal = area * float(levels[first + count] - levels[first])
        told = f"the volume rises by {rise:.6g} m³; the nominal area adds {nominal:.6g} m³"
        yield _finding("slope_off_nominal", levels, first, count, told, 100.0 * (rise / nominal - 1.0))


def _runs(wrong: BoolArray) -> Iterator[tuple[int, int]]:
    """Where a run of steps that are wrong begins, and how many there are."""
    for is_wrong, run in groupby(enumerate(wrong.tolist()), key=lambda pair: pair[1]):
        if is_wrong:
            places = [place for place, _ in run]
            yield places[0], len(places)


def _finding(
    code: str, levels: FloatArray, first: int, count: int, told: str, departure: float | None = None
) -> TableFinding:  # fmt: skip
    where = f"Rows {first} to {first + count}, from {levels[first]:.6g} to {levels[first + count]:.6g} m"
    return TableFinding.model_validate(
        {"code": code, "index": first, "count": count, "level_m": float(levels[first]), "departure_pct": departure,
         "detail": f"{where}: {told}"}
    )  # fmt: skip
