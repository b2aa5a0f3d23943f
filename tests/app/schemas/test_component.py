"""Components: constants all or none, each once, fractions that sum to one; temperatures that rise."""

from __future__ import annotations

import pytest
from pydantic import ValidationError
from pydantic_core import PydanticCustomError

from app.schemas.component import Component, temperatures_rise, whole

CONSTANTS = {
    "critical_temperature_k": 400.0, "critical_pressure_kpa_abs": 4000.0, "acentric_factor": 0.2,
    "molar_mass_g_mol": 60.0,
}  # fmt: skip


def parts(*fractions: float) -> list[Component]:
    return [Component(id=f"c{place}", mole_fraction=one) for place, one in enumerate(fractions)]


def test_a_component_in_full_gives_all_of_its_constants() -> None:
    assert Component(id="house-gas", mole_fraction=1.0, **CONSTANTS).molar_mass_g_mol == 60.0
    for name in CONSTANTS:
        given = {key: value for key, value in CONSTANTS.items() if key != name}
        with pytest.raises(ValidationError, match=name):
            Component(id="house-gas", mole_fraction=1.0, **given)


def test_fractions_sum_to_one_within_a_hundredth_and_no_component_stands_twice() -> None:
    whole(parts(0.6, 0.395))
    with pytest.raises(ValidationError, match="sum to 1"):
        whole(parts(0.6, 0.38))
    with pytest.raises(ValidationError, match="once"):
        whole([*parts(0.5), *parts(0.5)])


def test_rows_of_a_table_rise_in_temperature() -> None:
    assert temperatures_rise(((0.0, 1.0), (1.0, 0.5))) == ((0.0, 1.0), (1.0, 0.5))
    for rows in (((1.0, 1.0), (0.0, 0.5)), ((1.0, 1.0), (1.0, 0.5))):
        with pytest.raises(PydanticCustomError, match="rise in temperature"):
            temperatures_rise(rows)
