"""What a capacity table is asked for by."""

from __future__ import annotations

import json
from typing import Any

import pytest
from pydantic import ValidationError

from app.schemas.errors import explain
from app.schemas.tabulate import TableOptions, TabulatedShape, Tabulation

BOX = {"kind": "box", "length_m": 6.0, "width_m": 2.5, "height_m": 2.0}


def refused(**body: Any) -> list[tuple[str, str]]:
    with pytest.raises(ValidationError) as error:
        Tabulation.model_validate_json(json.dumps(body))
    return [(pointer, code) for pointer, code, _ in explain(error.value)]


def test_a_shape_or_a_vessel_and_not_both() -> None:
    assert refused(step_m=0.1) == [("/shape", "missing")]
    assert refused(step_m=0.1, shape=BOX, vessel={"shape": BOX}) == [("/shape", "conflicting")]
    assert Tabulation.model_validate_json(json.dumps({"step_m": 0.1, "vessel": {"shape": BOX}})).vessel is not None


@pytest.mark.parametrize("step", [0.0, -0.1, 9e-5, 201.0])
def test_a_step_has_its_limits(step: float) -> None:
    assert refused(step_m=step, shape=BOX) == [("/step_m", "out_of_range")]


def test_blocks_that_do_not_apply_are_absent() -> None:
    made = TabulatedShape.model_validate({"rows": [(0.0, 0.0), (1.0, 1.0)], "total_volume_m3": 1.0})
    assert set(json.loads(made.model_dump_json())) == {"rows", "total_volume_m3"}


def test_a_query_takes_its_own_fields_only() -> None:
    assert TableOptions.model_validate({"diameter_m": "50"}).diameter_m == 50.0
    with pytest.raises(ValidationError):
        TableOptions.model_validate({"diameter": "50"})
