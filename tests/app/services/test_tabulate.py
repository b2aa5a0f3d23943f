"""Capacity tables made of shapes and read from text: each volume by a closed form written here."""

from __future__ import annotations

import json
import math
from typing import Any

import pytest

from app.errors import Unprocessable
from app.schemas.shape import TABLE_ROWS
from app.schemas.tabulate import TableOptions, TabulatedShape, Tabulation
from app.schemas.vessel import Vessel
from app.services.read_table import Table
from app.services.shapes import capacity_curve
from app.services.tabulate import capacity_table_of
from models.geometry.curves import Curves
from tests.app.services.worked import BULLET, SPHERE, TANK, Body

NOTHING = TableOptions()


def made(**body: Any) -> TabulatedShape:
    return capacity_table_of(Tabulation.model_validate_json(json.dumps({"step_m": 0.5} | body)), NOTHING)


def read(rows: list[tuple[float, float]], resolution: float = 0.0, **query: Any) -> TabulatedShape:
    levels, volumes = zip(*rows, strict=True)
    return capacity_table_of(Table(levels, volumes, resolution), TableOptions(**query))


def findings(found: TabulatedShape) -> list[tuple[str, int, int]]:
    assert found.findings is not None
    return [(one.code, one.index, one.count) for one in found.findings]


# --- made of a shape ------------------------------------------------------------------------------


def test_the_rows_of_a_sphere_are_its_volumes() -> None:
    found = made(shape=SPHERE, step_m=1.0)
    assert [level for level, _ in found.rows] == [float(level) for level in range(19)]
    for level, volume in found.rows:
        assert volume == pytest.approx(math.pi * level**2 * (27.0 - level) / 3.0, rel=1e-12)
    assert found.total_volume_m3 == pytest.approx(math.pi * 18.0**3 / 6.0, rel=1e-12)


def test_the_shape_can_be_put_and_reads_the_same_volumes() -> None:
    found = made(shape=BULLET, step_m=0.01, interpolation="monotone_cubic")
    assert found.shape is not None
    body = {"name": "v", "substance": "s", "shape": json.loads(found.shape.model_dump_json())}
    put = Vessel.model_validate_json(json.dumps(body))
    assert (put.shape.kind, getattr(put.shape, "of", None)) == ("capacity_table", "horizontal_cylinder")
    table, capacity = capacity_curve(put)
    true, _ = capacity_curve(Vessel.model_validate(body | {"shape": BULLET}))
    assert table is not None and true is not None
    assert capacity == pytest.approx(true.capacity, rel=1e-12)
    ours, theirs = (float(Curves.from_curves([curve]).volume(1.2345)) for curve in (table, true))
    assert ours == pytest.approx(theirs, rel=1e-6)


def test_the_worst_errors_are_told_of_both_ways_to_read_and_the_one_asked_for_first() -> None:
    straight, smooth = made(shape=BULLET).interpolation_errors or ()
    assert (straight.interpolation, smooth.interpolation) == ("linear", "monotone_cubic")
    assert straight.error_m3 > smooth.error_m3 > 0.0
    again = made(shape=BULLET, interpolation="monotone_cubic").interpolation_errors or ()
    assert again == (smooth, straight)
    # Halfway up the first 0.5 m of a sphere, V'' = 2π(R − h): the chord is off by nearly s² V''/8.
    (worst, _) = made(shape=SPHERE).interpolation_errors or ()
    assert abs(worst.error_m3) == pytest.approx(0.25 * 2.0 * math.pi * 9.0 / 8.0, rel=0.03)
    flat = made(shape=TANK).interpolation_errors or ()
    assert [one.error_m3 for one in flat] == pytest.approx([0.0, 0.0], abs=1e-9)


def test_a_vessel_is_tabulated_less_its_deadwood_and_on_its_datum() -> None:
    vessel = {"shape": TANK, "deadwood": [[0.0, 2.0, 30.0]], "gauging": {"datum_m": 0.5}}
    found = made(vessel=vessel, step_m=1.0)
    area = math.pi * 225.0
    assert found.rows[0] == pytest.approx((0.0, 0.5 * area - 7.5))
    assert found.rows[1] == pytest.approx((1.0, 1.5 * area - 22.5))
    assert found.rows[-1] == pytest.approx((14.5, 15.0 * area - 30.0))
    assert found.total_volume_m3 == pytest.approx(15.0 * area - 30.0)


def test_a_table_tabulated_again_keeps_what_it_was_made_for() -> None:
    table: Body = {
        "kind": "capacity_table", "of": "vertical_cylinder", "diameter_m": 30.0, "rows": [[0.0, 1.0], [1.0, 700.0]],
        "total_volume_m3": 10000.0, "head_included_at_kg_m3": 850.0,
    }  # fmt: skip
    shape = made(shape=table).shape
    assert shape is not None
    assert (shape.of, shape.head_included_at_kg_m3, shape.total_volume_m3) == ("vertical_cylinder", 850.0, 10000.0)
    assert shape.rows == ((0.0, 1.0), (0.5, 350.5), (1.0, 700.0))


@pytest.mark.parametrize(
    ("body", "pointer", "code"),
    [
        ({"shape": {"kind": "fixed_volume", "volume_m3": 5.0}}, "/shape/kind", "no_level"),
        ({"vessel": {"shape": {"kind": "junction"}}}, "/vessel/shape/kind", "no_level"),
        ({"shape": TANK, "step_m": 1e-4}, "/step_m", "out_of_range"),
        ({"vessel": {"shape": TANK, "gauging": {"datum_m": 15.0}}}, "/vessel/gauging/datum_m", "impossible_definition"),
        ({"vessel": {"shape": TANK, "deadwood": [[0, 16, 1.0]]}}, "/vessel/deadwood/0", "impossible_definition"),
        ({"vessel": {"shape": TANK, "deadwood": [[0, 0.1, 99.0]]}}, "/vessel/deadwood", "impossible_definition"),
        ({"shape": TANK | {"top": {"kind": "torispherical", "crown_radius_m": 15.0, "knuckle_radius_m": 15.0}}},
         "/shape", "impossible_definition"),
    ],
)  # fmt: skip
def test_what_has_no_table_is_refused_with_its_place(body: Body, pointer: str, code: str) -> None:
    with pytest.raises(Unprocessable) as refused:
        made(**body)
    assert [(one.pointer, one.code) for one in refused.value.errors] == [(pointer, code)]


def test_the_least_step_that_a_refusal_names_is_taken() -> None:
    with pytest.raises(Unprocessable, match="take at least 0.00015") as refused:
        made(shape=TANK, step_m=1e-4)
    least = float(refused.value.detail.split("take at least ")[1].removesuffix(" m"))
    assert len(made(shape=TANK, step_m=least * 1.0001).rows) <= TABLE_ROWS


def test_the_query_is_for_tables_that_are_read() -> None:
    asked = Tabulation.model_validate_json(json.dumps({"shape": TANK, "step_m": 1.0}))
    with pytest.raises(Unprocessable) as refused:
        capacity_table_of(asked, TableOptions(of="box", diameter_m=1.0))
    assert [one.pointer for one in refused.value.errors] == ["/query/diameter_m", "/query/of"]


# --- read -----------------------------------------------------------------------------------------

AREA = math.pi * 225.0  # of a diameter of 30 m


def test_a_sound_table_is_a_shape_without_findings() -> None:
    rows = [(0.1 * k, 12.0 + 0.1 * k * AREA) for k in range(5)]
    found = read(rows, diameter_m=30.0, of="vertical_cylinder", head_included_at_kg_m3=850.0, total_volume_m3=9000.0)
    assert findings(found) == []
    assert found.shape is not None and found.shape.rows == found.rows == tuple(rows)
    assert (found.shape.diameter_m, found.shape.head_included_at_kg_m3) == (30.0, 850.0)
    assert (found.shape.total_volume_m3, found.total_volume_m3) == (9000.0, 9000.0)
    assert found.interpolation_errors is None
    assert read(rows).total_volume_m3 == rows[-1][1]


def test_rows_that_forbid_a_table_are_all_found_and_there_is_no_shape() -> None:
    found = read([(0.0, 0.0), (0.1, 70.0), (0.1, 71.0), (0.3, 60.0), (0.2, 50.0), (0.5, 90.0)])
    assert findings(found) == [
        ("level_does_not_rise", 1, 1), ("volume_falls", 2, 2), ("level_does_not_rise", 3, 1),
    ]  # fmt: skip
    assert found.shape is None and len(found.rows) == 6


def test_a_slope_away_from_the_nominal_area_is_found_and_does_not_forbid() -> None:
    steps = [1.0, 1.04, 0.96, 1.06, 1.10, 0.94, 1.0]
    rows, volume = [(0.0, 5.0)], 5.0
    for k, factor in enumerate(steps, start=1):
        volume += 0.1 * AREA * factor
        rows.append((0.1 * k, volume))
    found = read(rows, diameter_m=30.0)
    assert findings(found) == [("slope_off_nominal", 3, 3)]
    assert found.findings and found.findings[0].departure_pct == pytest.approx(100.0 * (3.10 / 3.0 - 1.0))
    assert "nominal area adds" in found.findings[0].detail
    assert found.shape is not None
    assert findings(read(rows)) == []  # without a diameter there is nothing to hold it against
    assert findings(read(rows, diameter_m=30.0, of="sphere")) == []


def test_volumes_written_to_a_tenth_may_be_off_by_it() -> None:
    """Rows of a millimetre of 707 m²: 0.707 m³ is written as 0.7, 0.7, 0.7, 0.8 …, up to 13 % away."""
    rows = [(0.001 * k, round(0.001 * k * AREA, 1)) for k in range(200)]
    assert findings(read(rows, 0.1, diameter_m=30.0)) == []
    assert findings(read(rows, 0.0, diameter_m=30.0)) != []


@pytest.mark.parametrize(
    ("rows", "query", "pointer"),
    [
        ([(0.0, -1.0), (1.0, 2.0)], {}, "/rows/0/1"),
        ([(0.0, 1.0), (201.0, 2.0)], {}, "/rows/1/0"),
        ([(0.0, 1.0), (1.0, 2.0)], {"total_volume_m3": 1.5}, "/total_volume_m3"),
    ],
)
def test_a_table_beyond_its_limits_is_refused(rows: list[tuple[float, float]], query: Body, pointer: str) -> None:
    with pytest.raises(Unprocessable) as refused:
        read(rows, **query)
    assert [one.pointer for one in refused.value.errors] == [pointer]
