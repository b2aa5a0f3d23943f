"""A shape can exist: heads fit their shell, tables rise, a tilted vessel says where its gauge is."""

from __future__ import annotations

from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from pydantic import TypeAdapter

from app.schemas.shape import CapacityTable, Shape
from app.schemas.types import Body

UPRIGHT = {"kind": "vertical_cylinder", "diameter_m": 10.0, "height_m": 8.0}
LYING = {"kind": "horizontal_cylinder", "diameter_m": 2.4, "length_m": 12.0}
TABLE = {"kind": "capacity_table", "rows": [[0.0, 12.4], [0.01, 32.1]]}


class Holder(Body):
    """Something with a shape."""

    shape: Shape


@pytest.mark.parametrize(
    "shape",
    [
        UPRIGHT,
        {**UPRIGHT, "bottom": {"kind": "cone", "depth_m": 0.5, "inverted": True}, "top": {"kind": "hemispherical"}},
        {**UPRIGHT, "bottom": {"kind": "torispherical", "crown_radius_m": 10, "knuckle_radius_m": 1}},
        LYING,
        {**LYING, "left_head": {"kind": "ellipsoidal", "depth_m": 0.6}, "tilt_deg": -1, "gauge_at_m": 0},
        {"kind": "sphere", "diameter_m": 15.8},
        {"kind": "box", "length_m": 6, "width_m": 2.5, "height_m": 2},
        TABLE,
        {**TABLE, "rows": [[-0.1, 0], [0, 0], [1, 5]], "interpolation": "monotone_cubic", "of": "sphere"},
        {"kind": "fixed_volume", "volume_m3": 5},
        {"kind": "junction"},
    ],
)
def test_shape_is_taken(refusals: Any, shape: dict[str, Any]) -> None:
    assert refusals(Holder, {"shape": shape}) == {}


@pytest.mark.parametrize(
    ("shape", "place", "code"),
    [
        ({}, "/kind", "missing"),
        ({"kind": "torus"}, "/kind", "not_one_of"),
        ("sphere", "", "wrong_type"),
        ({"kind": "sphere"}, "/diameter_m", "missing"),
        ({"kind": "sphere", "diameter_m": 0}, "/diameter_m", "out_of_range"),
        ({"kind": "sphere", "diameter_m": 3, "height_m": 3}, "/height_m", "unknown_field"),
        ({**UPRIGHT, "top": {"kind": "dome"}}, "/top/kind", "not_one_of"),
        ({**UPRIGHT, "top": {"kind": "cone"}}, "/top/depth_m", "missing"),
        ({**UPRIGHT, "top": {"kind": "cone", "depth_m": 1, "inverted": True}}, "/top/inverted", "unknown_field"),
        ({**UPRIGHT, "bottom": {"kind": "cone", "depth_m": 8, "inverted": True}}, "/bottom/depth_m", "impossible"),
        (
            {**UPRIGHT, "bottom": {"kind": "torispherical", "crown_radius_m": 4.9, "knuckle_radius_m": 1}},
            "/bottom/crown_radius_m",
            "impossible",
        ),
        (
            {**LYING, "right_head": {"kind": "torispherical", "crown_radius_m": 2.4, "knuckle_radius_m": 1.3}},
            "/right_head/knuckle_radius_m",
            "impossible",
        ),
        (
            {**LYING, "right_head": {"kind": "torispherical", "crown_radius_m": 2.4, "knuckle_radius_m": 1e-300}},
            "/right_head/knuckle_radius_m",
            "impossible",
        ),
        ({**LYING, "tilt_deg": 0.5}, "/gauge_at_m", "missing"),
        ({**LYING, "tilt_deg": 90, "gauge_at_m": 1}, "/tilt_deg", "out_of_range"),
        ({**LYING, "gauge_at_m": 12.1}, "/gauge_at_m", "out_of_range"),
        ({**TABLE, "rows": [[0, 1], [1, 3], [2, 2]]}, "/rows/2", "table_falls"),
        ({**TABLE, "rows": [[0, 1], [1, 2], [1, 3]]}, "/rows/2", "table_falls"),
        ({**TABLE, "rows": [[0, 1]]}, "/rows", "wrong_length"),
        ({**TABLE, "rows": [[0, 1], [1, -2]]}, "/rows/1/1", "out_of_range"),
        ({**TABLE, "rows": [[0, 1], [1, 2, 3]]}, "/rows/1", "wrong_length"),
        ({**TABLE, "total_volume_m3": 32.0}, "/total_volume_m3", "impossible"),
        ({"kind": "fixed_volume"}, "/volume_m3", "missing"),
        ({"kind": "junction", "volume_m3": 1}, "/volume_m3", "unknown_field"),
    ],
)
def test_shape_is_refused(refusals: Any, shape: Any, place: str, code: str) -> None:
    assert refusals(Holder, {"shape": shape}) == {f"/shape{place}": code}


ROWS = st.lists(st.tuples(st.floats(0.001, 1.0), st.floats(0, 10.0)), min_size=2, max_size=30)


@settings(max_examples=50, derandomize=True, deadline=None)
@given(ROWS, st.data())
def test_table_is_taken_unless_it_falls(refusals: Any, steps: list[tuple[float, float]], data: st.DataObject) -> None:
    rows, level, volume = [], 0.0, 0.0
    for up, more in steps:
        level, volume = level + up, volume + more + 0.001
        rows.append([level, volume])
    assert refusals(Holder, {"shape": {**TABLE, "rows": rows}}) == {}
    at = data.draw(st.integers(1, len(rows) - 1))
    column = data.draw(st.sampled_from([0, 1]))
    rows[at][column] = rows[at - 1][column] - 0.0005
    assert refusals(Holder, {"shape": {**TABLE, "rows": rows}})[f"/shape/rows/{at}"] == "table_falls"


def test_table_of_10_000_rows_is_taken() -> None:
    rows = [[0.002 * at, 3.0 * at] for at in range(10_000)]
    table = TypeAdapter(CapacityTable).validate_python({**TABLE, "rows": rows})
    assert table.rows[-1] == (19.998, 29_997.0)
