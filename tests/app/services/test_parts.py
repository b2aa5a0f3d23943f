"""Every error has one name: shared where it is one error, apart where it is two."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from app.services.calculate import collected
from app.services.choose import Candidates
from app.services.collect import Collected
from app.services.compile import CompiledVessel
from app.services.explain import mass_estimate
from app.services.measure import Measured, measure
from app.services.parts import Origin, at_row, estimate, sigmas, stamp
from models.estimate import Estimate
from models.mass import standard_uncertainty
from tests.app.services.worked import (
    BULLET,
    GAS_READ,
    HYDROGEN,
    LPG_READ,
    OIL_READ,
    PROPANE,
    RECEIVER,
    SPHERE,
    TANK,
    Body,
    compiled,
    masses,
    readings,
)

ROOF = {"mass_kg": 1.2e5, "lands_at_m": 1.8, "floats_at_m": 2.1}
HOUR = 3_600_000_000
BEFORE = [field for field in Candidates.__dataclass_fields__ if field.startswith("before")]


def parts_of(measured: Measured, row: int = 0) -> Estimate:
    found = mass_estimate(measured, row)
    assert found is not None
    return found


def aged(vessel: CompiledVessel, row: Body, hours: float) -> Measured:
    """A reading carried for some hours, by a vessel that lets it."""
    frame = collected(vessel, readings([row]))
    for candidates in frame.candidates.values():
        candidates.max_age[:] = 100 * HOUR
    frame.at = frame.at + int(hours * HOUR)
    return measure(frame)


EVERY = [
    (compiled(TANK), OIL_READ),
    (compiled(TANK, floating_roof=ROOF), OIL_READ | {"level_m": 1.95}),
    (compiled(BULLET, PROPANE, shell={"thickness_m": 0.018}), LPG_READ),
    (compiled(SPHERE, PROPANE, shell={"thickness_m": 0.028}), {"level_m": 9.2, "liquid_temperature_c": 18.0}),
    (compiled(SPHERE, PROPANE), {"level_m": 9.2, "liquid_temperature_c": 18.0, "pressure_kpa": 690.0}),
    (compiled(RECEIVER, HYDROGEN), GAS_READ | {"vapour_composition": {"hydrogen": 0.99, "nitrogen": 0.01}}),
]


@pytest.mark.parametrize("hours", [0.0, 30.0], ids=["fresh", "stale"])
@pytest.mark.parametrize(("vessel", "row"), EVERY, ids=["tank", "roof", "bullet", "sphere", "saturated", "gas"])
def test_within_one_mass_no_error_stands_twice(vessel: CompiledVessel, row: Body, hours: float) -> None:
    measured = aged(vessel, row, hours)
    acting = [
        part.name(0)
        for part in measured.parts
        if at_row(part.sigma, 0) * float(measured.result.sensitivities[part.sensitivity][0]) != 0.0
    ]
    assert len(acting) == len(set(acting)) >= 4
    assert any(name.startswith("stale:") for name in acting) == (hours > 0.0)
    quadrature = float(standard_uncertainty(measured.result, sigmas(measured.parts))[0])
    assert parts_of(measured).uncertainty == pytest.approx(quadrature, rel=1e-12)


def test_the_same_mass_twice_differs_by_nothing_at_all() -> None:
    measured = masses(compiled(TANK), OIL_READ)
    one = estimate(measured.result, measured.parts, 0)
    assert (one - one).uncertainty == 0.0


def test_of_two_readings_only_the_fresh_errors_stay_in_the_difference() -> None:
    """Two instants, one gauge, equal levels: its offset, the table and the density leave the difference."""
    vessel = compiled(TANK)
    rows = [OIL_READ | {"taken_at": f"2026-03-14T0{hour}:00:00Z", "sample": "S17"} for hour in (6, 7)]
    measured = masses(vessel, *rows)
    difference = parts_of(measured, 1) - parts_of(measured, 0)
    assert difference.parts
    assert all(name.startswith("r:") for name in difference.parts)
    area, density = math.pi * 15.0**2, measured.result["liquid_density"][0] * (1.0 - 0.004 * 999.1 / 843.1)
    level = [part for name, part in difference.parts.items() if ":level_m:" in name]
    assert np.abs(level) == pytest.approx(0.001 * density * area, rel=5e-4)  # 1 mm each; K is 1 within 5e-4


def test_the_local_error_of_a_table_cancels_at_equal_levels_and_not_two_spans_apart() -> None:
    vessel = compiled(TANK, instruments={"capacity_pct": {"systematic": 0.0, "local": 0.05, "local_span_m": 2.0}})
    measured = masses(vessel, *[OIL_READ | {"level_m": level} for level in (6.5, 6.5, 11.5)])

    def local(row: int) -> Estimate:
        every = parts_of(measured, row).parts
        return Estimate(0.0, {name: part for name, part in every.items() if name.startswith("capacity:")})

    assert (local(0) - local(1)).uncertainty == 0.0
    assert len(local(0).parts) == 2
    assert local(0).uncertainty == pytest.approx(0.0005 * measured.result.sensitivities["capacity_local"][0], rel=1e-12)
    apart = (local(2) - local(0)).uncertainty
    assert apart == pytest.approx(math.hypot(local(0).uncertainty, local(2).uncertainty), rel=1e-12)


def both(first: CompiledVessel, second: CompiledVessel, row: Body) -> Measured:
    """Two vessels read alike at one instant, as a stock-take sees them."""
    frames = [collected(vessel, readings([row])) for vessel in (first, second)]
    joined = Collected(np.concatenate([frame.at for frame in frames]), (first, second))
    for name in frames[0].candidates:
        joined.candidates[name] = Candidates(
            *(np.concatenate([getattr(f.candidates[name], k) for f in frames]) for k in Candidates.__dataclass_fields__)
        )
        joined.texts[name] = np.concatenate([frame.texts[name] for frame in frames])
        joined.origins[name] = Origin([*frames[0].origins[name].columns, *frames[1].origins[name].columns])
    for key in frames[0].companions:
        pairs = [frame.companions[key] for frame in frames]
        joined.companions[key] = (
            Candidates(*(np.concatenate([getattr(p[0], k) for p in pairs]) for k in Candidates.__dataclass_fields__)),
            np.concatenate([p[1] for p in pairs]),
        )
    return measure(joined)


def test_vessels_that_name_one_instrument_share_its_offset_and_not_its_scatter() -> None:
    tape = {"level_m": {"random": 0.0015, "systematic": 0.001, "instrument": "tape 7"}}
    first, second = (compiled(TANK, name=name, instruments=tape) for name in ("tk-1", "tk-2"))
    measured = both(first, second, OIL_READ)
    shared = parts_of(measured, 0).parts.keys() & parts_of(measured, 1).parts.keys()
    assert "level:tape 7" in shared
    assert not [name for name in shared if name.startswith(("r:", "capacity:", "temperature:"))]
    assert "expansion:gas-oil" in shared
    assert "ambient:tk-1" not in shared


def test_vessels_that_name_no_instrument_share_no_gauge() -> None:
    measured = both(compiled(TANK, name="tk-1"), compiled(TANK, name="tk-2"), OIL_READ)
    shared = parts_of(measured, 0).parts.keys() & parts_of(measured, 1).parts.keys()
    assert not [name for name in shared if name.startswith(("level:", "temperature:", "density:", "sample:"))]


def test_values_that_cite_one_sample_share_its_error() -> None:
    lab = {"observed_density_kg_m3": {"random": 0.4, "systematic": 0.2, "instrument": "lab 1"}}
    first, second = (compiled(TANK, name=name, instruments=lab) for name in ("tk-1", "tk-2"))
    measured = both(first, second, OIL_READ | {"sample": "S17"})
    shared = parts_of(measured, 0).parts.keys() & parts_of(measured, 1).parts.keys()
    assert {"sample:S17", "density:lab 1"} <= shared


def test_a_new_calibration_is_a_new_offset() -> None:
    def gauge(day: str) -> CompiledVessel:
        own = {"level_m": {"systematic": 0.002, "calibrated_at": f"2026-03-{day}T00:00:00Z", "instrument": "radar"}}
        return compiled(TANK, instruments=own)

    before, after = (parts_of(masses(gauge(day), OIL_READ)).parts.keys() for day in ("01", "14"))
    assert {name for name in before ^ after if name.startswith("level:")} == {
        name for name in before | after if name.startswith("level:")
    }


def course(vessel: CompiledVessel, sources: list[tuple[str, float]]) -> Measured:
    """A course of one vessel whose density came from another source each time, as the store hands it over."""
    rows = [OIL_READ | {"observed_density_kg_m3": density} for _, density in sources]
    frame = collected(vessel, readings(rows))
    names = sorted({source for source, _ in sources})
    origin = Origin([[("observed_density_kg_m3", name) for name in names]])
    one, wide = frame.candidates["density"], Candidates.empty(len(rows), len(names))
    for row, (source, _) in enumerate(sources):
        column = names.index(source)
        for field in BEFORE:
            getattr(wide, field)[row, column] = getattr(one, field)[row, 0]
    frame.candidates["density"], frame.origins["density"] = wide, origin
    for key, (companion, _) in frame.companions.items():
        if key[0] == "density":
            spread = Candidates.empty(len(rows), len(names))
            for field in BEFORE:
                getattr(spread, field)[:] = getattr(companion, field)
            frame.companions[key] = (spread, np.full((len(rows), len(names)), None, dtype=object))
    return measure(frame)


def test_a_courses_density_has_the_errors_of_the_source_that_it_came_from() -> None:
    vessel = compiled(
        TANK,
        sources=[
            {"source": "lab", "instruments": {"observed_density_kg_m3": {"random": 0.1, "systematic": 0.2}}},
            {"source": "hydrometer", "instruments": {"observed_density_kg_m3": {"random": 0.5, "systematic": 0.9}}},
        ],
    )
    measured = course(vessel, [("lab", 843.0), ("hydrometer", 844.0), ("lab", 843.2)])
    by_density = measured.result.sensitivities["density"]
    for row, (name, systematic, random) in enumerate(
        [("tk-1/lab", 0.2, 0.1), ("tk-1/hydrometer", 0.9, 0.5), ("tk-1/lab", 0.2, 0.1)]
    ):
        parts = parts_of(measured, row).parts
        assert parts[f"density:{name}"] == pytest.approx(by_density[row] * systematic, rel=1e-12)
        sample = [part for key, part in parts.items() if key.startswith("sample:")]
        assert sample == pytest.approx([by_density[row] * random], rel=1e-12)


def test_a_carried_value_gains_an_error_with_its_age() -> None:
    measured = aged(compiled(TANK), OIL_READ, 10.0)
    stale = [p for p in measured.parts if p.name(0).startswith("stale:") and p.quantity == "liquid_temperature_c"]
    assert [at_row(part.sigma, 0) for part in stale] == pytest.approx([0.5])  # 0.05 K an hour, common practice


def test_an_instant_in_a_name_is_basic_utc() -> None:
    assert stamp(1_773_468_000_000_000) == "20260314T060000.000000Z"


def test_a_part_of_nothing_is_left_out() -> None:
    measured = masses(compiled(TANK, shell={"insulated": True}), OIL_READ)
    assert not any(name.startswith("ambient") for name in parts_of(measured).parts)
    lost = replace(measured, result=masses(compiled(TANK), OIL_READ | {"level_m": 99.0}).result)
    assert mass_estimate(lost, 0) is None
