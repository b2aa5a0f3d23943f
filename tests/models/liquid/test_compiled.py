"""A stack of liquids: each kind in columns of its own, every row in its place."""

from __future__ import annotations

import numpy as np
import pytest

from models.constants import STANDARD_ATMOSPHERE
from models.liquid.compiled import LiquidColumns
from models.liquid.definition import ExpansivityLiquid, PetroleumLiquid, WaterLiquid
from models.liquid.state import Conditions

OIL, HEAVY = ExpansivityLiquid((8.3e-4,), 288.15, 0.0), ExpansivityLiquid((6.2e-4, 1e-7), 293.15, 0.0)
STACK = LiquidColumns.from_liquids([OIL, PetroleumLiquid("crude"), WaterLiquid(), HEAVY, PetroleumLiquid("refined")])


def at(celsius: object) -> Conditions:
    kelvin = 273.15 + np.atleast_1d(np.asarray(celsius, dtype=float))
    return Conditions(kelvin, np.array([STANDARD_ATMOSPHERE]), np.array([STANDARD_ATMOSPHERE]))


def test_liquids_of_one_kind_stand_together_in_their_order() -> None:
    assert STACK.kind.tolist() == [0, 1, 2, 0, 1]
    assert STACK.own_row.tolist() == [0, 0, 0, 1, 1]
    assert len(STACK.methods) == 3


def test_rows_of_one_kind_are_computed_in_one_call() -> None:
    rows = np.array([0, 3, 0, 3])
    found = STACK.state(np.full(4, 840.0), at(15.0), at([25.0, 25.0, 35.0, 35.0]), at(15.0), rows)
    for place, row in enumerate(rows):
        own = STACK.state(
            np.array([840.0]), at(15.0), at([25.0, 25.0, 35.0, 35.0][place]), at(15.0), np.array([row])
        )
        assert found.density[place] == pytest.approx(own.density[0], rel=1e-15)
    assert found.density[0] == pytest.approx(840.0 * np.exp(-8.3e-3), rel=1e-14)


def test_the_key_of_a_petroleum_is_its_density_at_60_fahrenheit() -> None:
    """850 kg/m³ at 15 °C, crude: 849.59848 (recomputed from ASTM D1250-04)."""
    key = STACK.key(np.array([850.0]), at(15.0), np.array([1]))
    assert key[0] == pytest.approx(849.59848, abs=5e-6)
    factor = STACK.key(np.array([998.2067]), at(20.0), np.array([2]))
    assert factor[0] == pytest.approx(1.0, abs=2e-6)
    assert STACK.key(np.array([840.0]), at(20.0), np.array([0])).tolist() == [840.0]
