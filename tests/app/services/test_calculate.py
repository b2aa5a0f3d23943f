"""Calculations with nothing stored: each reading stands alone, and a bad one disturbs no other."""

from __future__ import annotations

import pytest

from app.schemas.calculation import InventoryCalculation
from app.services.calculate import calculate, collected
from tests.app.services.worked import (
    GAS_OIL,
    HYDROGEN,
    LPG_READ,
    OIL_READ,
    PROPANE,
    SITE,
    SPHERE,
    TANK,
    Body,
    compiled,
    masses,
    readings,
)


def results(
    rows: list[Body], *, shape: Body = TANK, substance: Body = GAS_OIL, site: Body = SITE, **vessel: object
) -> list[Body]:
    body = {
        "site": site, "vessel": {"shape": shape} | vessel, "substance": substance, "readings": rows,
    }  # fmt: skip
    return calculate(InventoryCalculation.model_validate(body), working=False, budget=False)


BOX: Body = {"kind": "box", "length_m": 10.0, "width_m": 10.0, "height_m": 10.0}
STILL: Body = {"name": "oil", "liquid": {"model": "expansivity", "density_kg_m3": 800.0, "expansivity_per_k": 0.0}}
STIFF: Body = {"expansion_per_k": 0.0, "insulated": True}


def test_a_box_of_oil_weighs_its_volume_times_its_density() -> None:
    row = {"level_m": 4.2, "liquid_temperature_c": 30.0, "free_water_level_m": 0.2}
    (found,) = results([row], shape=BOX, substance=STILL, shell=STIFF)
    assert found["mass_kg"] == pytest.approx(800.0 * 400.0, rel=1e-12)
    assert found["free_water_volume_m3"] == pytest.approx(20.0, rel=1e-12)
    assert found["fill_pct"] == pytest.approx(42.0)
    assert found["status"] == "measured"
    # OIML D 28: air of 1.2 and weights of 8 000 kg/m³
    assert found["weight_in_air_kg"] == pytest.approx(320_000.0 * (1.0 - 1.2 / 800.0) / (1.0 - 1.2 / 8000.0))


def test_a_bad_reading_leaves_its_neighbours_alone() -> None:
    good: Body = {"level_m": 8.0, "liquid_temperature_c": 17.4}
    rows: list[Body] = [
        good,
        good | {"level_m": 16.0},
        {"level_m": 8.0},
        good | {"quality": "bad"},
        good | {"level_m": 8.0},
    ]
    found = results(rows)
    assert [one["status"] for one in found] == ["measured", "unmeasured", "unmeasured", "unmeasured", "measured"]
    alone = results([good])[0]
    assert found[0] == found[4] == alone
    assert [one["reason"]["code"] for one in found[1:4]] == ["outside_vessel", "input_missing", "input_missing"]
    assert found[1]["mass_kg"] is None


def test_nothing_is_carried_from_one_reading_to_the_next() -> None:
    rows: list[Body] = [
        OIL_READ | {"taken_at": "2026-03-14T06:00:00Z"},
        {"level_m": 8.0, "taken_at": "2026-03-14T06:10:00Z"},
    ]
    first, second = results(rows)
    assert first["status"] == "measured"
    assert second["reason"]["code"] == "input_missing"
    assert "liquid_temperature_c" in second["reason"]["detail"]
    assert first["at"] == 1_773_468_000_000_000


def test_no_readings_have_no_results() -> None:
    assert results([]) == []


@pytest.mark.parametrize("base", [0.0, 15.6, 20.0, 60.0])
def test_a_mass_does_not_depend_on_the_base_temperature(base: float) -> None:
    for rows, shape, substance in (([OIL_READ], TANK, GAS_OIL), ([LPG_READ | {"level_m": 9.0}], SPHERE, PROPANE)):
        here = results(rows, shape=shape, substance=substance)[0]
        there = results(rows, shape=shape, substance=substance, site=SITE | {"base_temperature_c": base})[0]
        assert there["mass_kg"] == pytest.approx(here["mass_kg"], rel=1e-12)


def test_an_ullage_is_taken_from_the_reference_height_and_corrected_before() -> None:
    vessel: Body = {"gauging": {"reference_height_m": 15.5}, "instruments": {"ullage_m": {"offset": 0.010}}}
    by_ullage = results([{"ullage_m": 7.49, "liquid_temperature_c": 17.0}], **vessel)[0]
    by_level = results([{"level_m": 8.0, "liquid_temperature_c": 17.0}], **vessel)[0]
    assert by_ullage["mass_kg"] == pytest.approx(by_level["mass_kg"], rel=1e-12)


def test_an_ullage_without_a_reference_height_is_no_level() -> None:
    (found,) = results([{"ullage_m": 7.5, "liquid_temperature_c": 17.0}])
    assert found["status"] == "unmeasured"


def test_a_readings_source_chooses_its_offset_and_its_errors() -> None:
    hand = {"source": "hand", "instruments": {"level_m": {"systematic": 0.001, "offset": 0.02, "instrument": "tape 7"}}}
    rows = [{"source": source, "level_m": 8.0, "liquid_temperature_c": 17.0} for source in ("radar", "hand", "radar")]
    radar, dip, again = results(rows, sources=[hand])
    assert radar == again
    (corrected,) = results([rows[0] | {"level_m": 8.02}], sources=[hand])
    assert dip["mass_kg"] == pytest.approx(corrected["mass_kg"], rel=1e-12)
    measured = masses(compiled(TANK, sources=[hand]), *rows)
    names = {part.name(1) for part in measured.parts if part.sensitivity == "level"}
    assert "level:tape 7" in names


def test_analyses_give_each_row_its_own_gas() -> None:
    """Hydrogen with 1 % nitrogen weighs 12.9 % more a mole: 0.99 · 2.01588 + 0.01 · 28.0134 = 2.27586 g/mol."""
    row: Body = {"vapour_temperature_c": 25.0, "pressure_kpa_abs": 101.325}
    rows: list[Body] = [
        row, row | {"vapour_composition": {"hydrogen": 0.99, "nitrogen": 0.01}},
        row | {"vapour_composition": {"hydrogen": 1.0}}, row,
    ]  # fmt: skip
    shape: Body = {"kind": "fixed_volume", "volume_m3": 95.0}
    pure, mixed, analysed, again = results(rows, shape=shape, substance=HYDROGEN)
    assert pure["mass_kg"] == again["mass_kg"] == pytest.approx(analysed["mass_kg"], rel=1e-9)
    assert mixed["mass_kg"] / pure["mass_kg"] == pytest.approx(2.27586 / 2.01588, rel=2e-4)  # Z differs by 1e-5
    # as many moles, so as many standard cubic metres
    assert mixed["gas_standard_volume_m3"] / pure["gas_standard_volume_m3"] == pytest.approx(1.0, rel=2e-4)
    inputs = {entry["quantity"]: entry for entry in mixed["inputs"]}
    assert inputs["vapour_composition"]["composition"] == {"hydrogen": 0.99, "nitrogen": 0.01}
    own = masses(compiled(shape, HYDROGEN), *rows)
    by_composition = [part for part in own.parts if part.quantity == "vapour_composition"]
    assert [float(part.sigma[1]) for part in by_composition] == [0.005]  # 0.5 % of the molar mass, common practice
    assert [float(part.sigma[0]) for part in by_composition] == [0.0]


def test_candidates_of_a_calculation_are_as_many_as_its_readings() -> None:
    frame = collected(compiled(TANK), readings([OIL_READ, OIL_READ]))
    assert frame.rows == 2
    assert {len(candidates.before) for candidates in frame.candidates.values()} == {2}
