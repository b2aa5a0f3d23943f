"""A vessel takes the contract's example, and refuses what contradicts itself."""

from __future__ import annotations

import json
from typing import Any

import pytest

from app.schemas.types import canonical
from app.schemas.vessel import Vessel

# As the contract prints it.
EXAMPLE: dict[str, Any] = json.loads("""
{"name": "gasoline 12", "substance": "gasoline-95", "effective_from": "2026-03-14T06:00:00+01:00", "service": "in",
 "shape": {"kind": "capacity_table", "of": "vertical_cylinder", "diameter_m": 50.0, "rows": [[0.0, 12.4], [0.01, 32.1]],
           "total_volume_m3": 35300.0, "roof_deducted_at_kg_m3": 740.0, "head_included_at_kg_m3": 850.0},
 "shell": {"expansion_per_k": 1.12e-5, "at_temperature_c": 15.0, "insulated": false,
           "thickness_m": 0.012, "elastic_modulus_gpa": 207, "poisson_ratio": 0.3},
 "floating_roof": {"mass_kg": 412000, "lands_at_m": 1.80, "floats_at_m": 2.10, "gauge_sees": "liquid"},
 "vapour_space": {"kind": "none"},
 "gauging": {"reference_height_m": 19.432},
 "sources": [{"source": "radar"},
             {"source": "hand", "instruments": {"level_m": {"random": 0.0015, "systematic": 0.001, "instrument": "tape 7"}}}],
 "instruments": {"level_m": {"random": 0.001, "systematic": 0.002, "offset": -0.011, "calibrated_at": "2026-03-14T14:00:00+01:00"},
                 "observed_density_kg_m3": {"random": 0.35, "systematic": 0.25, "instrument": "lab densitometer"},
                 "capacity_pct": {"systematic": 0.05, "local": 0.02}},
 "max_age_s": {"level_m": 900, "observed_density_kg_m3": null},
 "assumed": {"pressure_kpa": {"value": 0.0, "standard_uncertainty": 0.2}},
 "hand_gauging": true}
""")  # noqa: E501
BOX = {"kind": "box", "length_m": 6, "width_m": 2.5, "height_m": 2}
SMALL = {"name": "a", "substance": "b", "shape": BOX}


def test_example_of_the_contract_is_taken() -> None:
    vessel = Vessel.model_validate_json(json.dumps(EXAMPLE))
    assert vessel.effective_from == 1_773_464_400_000_000
    assert vessel.shape.kind == "capacity_table" and vessel.shape.rows[1] == (0.01, 32.1)
    assert vessel.sources[1].instruments["level_m"].instrument == "tape 7"
    assert vessel.max_age_s == {"level_m": 900.0, "observed_density_kg_m3": None}


def test_defaults_are_those_of_the_contract() -> None:
    vessel = Vessel.model_validate_json(json.dumps(SMALL))
    assert vessel.service == "in" and vessel.vapour_space is None and vessel.max_age_s is None
    assert vessel.sources == () and vessel.instruments == {} and vessel.assumed == {} and vessel.deadwood == ()
    assert vessel.shell.at_pressure_kpa == 0.0 and vessel.gauging.datum_m == 0.0
    assert canonical(vessel) == (
        '{"name":"a","shape":{"height_m":2.0,"kind":"box","length_m":6.0,"width_m":2.5},"substance":"b"}'
    )


def test_repeat_in_another_order_and_zone_is_unchanged() -> None:
    said = dict(reversed(EXAMPLE.items()))
    said["effective_from"] = "2026-03-14T05:00:00Z"
    first = canonical(Vessel.model_validate_json(json.dumps(EXAMPLE)))
    assert canonical(Vessel.model_validate_json(json.dumps(said, indent=3))) == first
    said["hand_gauging"] = False
    assert canonical(Vessel.model_validate_json(json.dumps(said))) != first


def test_body_does_not_change_later() -> None:
    vessel = Vessel.model_validate_json(json.dumps(SMALL))
    with pytest.raises(ValueError, match="frozen"):
        vessel.name = "b"


def test_junction_holds_nothing(refusals: Any) -> None:
    assert refusals(Vessel, {"name": "manifold", "shape": {"kind": "junction"}}) == {}
    assert refusals(Vessel, {"name": "a", "shape": BOX}) == {"/substance": "missing"}


ROOF = {"mass_kg": 412000, "lands_at_m": 1.8, "floats_at_m": 2.1}
TABLE = {"kind": "capacity_table", "rows": [[0, 0], [1, 5]]}


@pytest.mark.parametrize(
    ("change", "place", "code"),
    [
        ({"name": ""}, "/name", "wrong_length"),
        ({"substance": "Gasoline"}, "/substance", "wrong_form"),
        ({"service": "off"}, "/service", "not_one_of"),
        ({"service": True}, "/service", "not_one_of"),
        ({"colour": "red"}, "/colour", "unknown_field"),
        ({"shape": None}, "/shape", "wrong_type"),
        ({"shell": {"poisson_ratio": 0.5}}, "/shell/poisson_ratio", "out_of_range"),
        ({"shell": {"thickness_m": 0}}, "/shell/thickness_m", "out_of_range"),
        ({"shell": {"courses": [[2.0]]}}, "/shell/courses/0/1", "missing"),
        ({"shell": {"courses": [[2.0, 0.0]]}}, "/shell/courses/0/1", "out_of_range"),
        ({"floating_roof": ROOF}, "/floating_roof", "conflicting"),
        ({"shape": TABLE, "floating_roof": {**ROOF, "floats_at_m": 1.7}}, "/floating_roof/floats_at_m", "impossible"),
        ({"shape": TABLE, "floating_roof": {**ROOF, "gauge_sees": "fog"}}, "/floating_roof/gauge_sees", "not_one_of"),
        ({"shape": {**TABLE, "roof_deducted_at_kg_m3": 740}}, "/floating_roof", "missing"),
        ({"shape": {**TABLE, "of": "sphere"}, "floating_roof": ROOF}, "/floating_roof", "conflicting"),
        ({"vapour_space": {"kind": "blanketed"}}, "/vapour_space/blanket", "missing"),
        ({"vapour_space": {"kind": "open", "blanket": "nitrogen"}}, "/vapour_space/blanket", "conflicting"),
        ({"vapour_space": {"kind": "blanketed", "blanket": "N2"}}, "/vapour_space/blanket", "wrong_form"),
        ({"gauging": {"reference_height_m": -1}}, "/gauging/reference_height_m", "out_of_range"),
        ({"sources": [{"source": "a"}, {"source": "b"}, {"source": "a"}]}, "/sources/2/source", "twice"),
        ({"sources": [{"name": "a"}]}, "/sources/0/name", "unknown_field"),
        ({"deadwood": [[1.0, 1.0, 0.2]]}, "/deadwood/0", "impossible"),
        ({"shape": TABLE, "deadwood": [[0.0, 1.0, 0.2]]}, "/deadwood", "conflicting"),
        ({"expected_loss_kg_per_day": -1}, "/expected_loss_kg_per_day", "out_of_range"),
        ({"hand_gauging": "yes"}, "/hand_gauging", "wrong_type"),
        ({"effective_from": "2026-03-14"}, "/effective_from", "not_an_instant"),
    ],
)
def test_vessel_is_refused(refusals: Any, change: dict[str, Any], place: str, code: str) -> None:
    assert refusals(Vessel, {**SMALL, **change}).get(place) == code
