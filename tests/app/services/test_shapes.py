"""The shapes of the wire as curves: each volume by a closed form written here."""

from __future__ import annotations

import math

import pytest

from app.schemas.vessel import Vessel
from app.services.shapes import capacity_curve, courses_of, head_included, strain_of
from models.errors import DefinitionError
from models.geometry.curves import Curves
from models.geometry.head_stress import HeadStress
from tests.app.services.worked import BULLET, RECEIVER, SPHERE, TANK, Body


def vessel(shape: Body, **more: object) -> Vessel:
    return Vessel.model_validate({"name": "v", "substance": "s", "shape": shape} | more)


def volume(body: Vessel, level: float) -> float:
    curve, _ = capacity_curve(body)
    assert curve is not None
    return float(Curves.from_curves([curve]).volume(level))


HEAD = math.pi * 1.5**2 * 0.75 * 2.0 / 3.0  # half an ellipsoid of 1.5, 1.5 and 0.75 m


@pytest.mark.parametrize(
    ("shape", "capacity"),
    [
        (TANK, math.pi * 225.0 * 15.0),
        (TANK | {"bottom": {"kind": "cone", "depth_m": 0.3}}, math.pi * 225.0 * 15.1),
        (TANK | {"top": {"kind": "hemispherical"}}, math.pi * 225.0 * 25.0),
        (SPHERE, math.pi * 18.0**3 / 6.0),
        (BULLET, math.pi * 1.5**2 * 14.0 + 2.0 * HEAD),
        ({"kind": "box", "length_m": 6.0, "width_m": 2.5, "height_m": 2.0}, 30.0),
        ({"kind": "capacity_table", "rows": [[0.0, 1.0], [2.0, 9.0]], "total_volume_m3": 11.0}, 11.0),
        (RECEIVER, 95.0),
        ({"kind": "junction"}, 0.0),
    ],
)
def test_a_whole_vessel_holds_its_closed_form(shape: Body, capacity: float) -> None:
    curve, found = capacity_curve(vessel(shape))
    assert found == pytest.approx(capacity, rel=1e-9)
    assert (curve is None) == (shape["kind"] in ("fixed_volume", "junction"))


def test_a_tilt_is_in_degrees_and_its_gauge_where_it_stands() -> None:
    """At mid-length the depth is the level over cos θ: half full there is half of the cylinder."""
    flat = {"kind": "horizontal_cylinder", "diameter_m": 3.0, "length_m": 14.0, "tilt_deg": 2.0, "gauge_at_m": 7.0}
    assert volume(vessel(flat), 1.5 * math.cos(math.radians(2.0))) == pytest.approx(math.pi * 2.25 * 7.0, rel=1e-6)


def test_a_datum_and_deadwood_move_the_curve() -> None:
    box = {"kind": "box", "length_m": 6.0, "width_m": 2.5, "height_m": 2.0}
    raised = vessel(box, gauging={"datum_m": 0.2})
    assert volume(raised, 1.0) == pytest.approx(15.0 * 1.2, rel=1e-12)
    crowded = vessel(box, deadwood=[[0.5, 1.5, 3.0]])
    assert volume(crowded, 1.0) == pytest.approx(15.0 - 1.5, rel=1e-12)
    assert capacity_curve(crowded)[1] == pytest.approx(27.0, rel=1e-12)


def test_pressure_strains_a_shell_of_known_thickness_only() -> None:
    """Thin sphere of 18 m and 28 mm at 2 bar: 3 P D (1 − ν)/(4 t E) = 3.26e-4 (elasticity, E = 207 GPa)."""
    thick = {"thickness_m": 0.028}
    total, vertical = strain_of(vessel(SPHERE, shell=thick))
    assert total * 2e5 == pytest.approx(3.0 * 2e5 * 18.0 * 0.7 / (4.0 * 0.028 * 207e9), rel=1e-12)
    assert vertical == pytest.approx(total / 3.0)
    assert strain_of(vessel(SPHERE)) == (0.0, 0.0)
    assert strain_of(vessel(RECEIVER, shell=thick)) == (0.0, 0.0)
    table = {"kind": "capacity_table", "of": "sphere", "rows": [[0.0, 0.0], [18.0, 3000.0]]}
    assert strain_of(vessel(table | {"diameter_m": 18.0}, shell=thick)) == (total, vertical)
    with pytest.raises(DefinitionError, match="diameter_m"):
        strain_of(vessel(table, shell=thick))


# --- courses --------------------------------------------------------------------------------------

COURSES: Body = {"courses": [[5.0, 0.02], [5.0, 0.015], [5.0, 0.01]]}
TABLE: Body = {
    "kind": "capacity_table", "of": "vertical_cylinder", "diameter_m": 30.0, "rows": [[0.0, 1.0], [15.0, 10600.0]],
    "head_included_at_kg_m3": 850.0,
}  # fmt: skip


def widened(body: Vessel, level: float) -> float:
    stress = HeadStress.from_shells([courses_of(body)])
    return 0.0 if stress is None else float(stress.volume_per_density(level)[0])


def by_hand(level: float) -> float:
    """π g D³/(8 E) Σ [(h − z_k)² − (h − z_(k+1))²]/t_k of a 30 m tank."""
    edges, total = (0.0, 5.0, 10.0, 15.0), 0.0
    for low, high, thickness in zip(edges, edges[1:], (0.02, 0.015, 0.01), strict=False):
        total += (max(level - low, 0.0) ** 2 - max(level - high, 0.0) ** 2) / thickness
    return math.pi * 9.80665 * 30.0**3 / (8.0 * 207e9) * total


@pytest.mark.parametrize("shape", [TANK, TABLE], ids=lambda shape: str(shape["kind"]))
def test_courses_widen_an_upright_shell_under_its_liquid(shape: Body) -> None:
    assert widened(vessel(shape, shell=COURSES), 11.0) == pytest.approx(by_hand(11.0), rel=1e-12)
    assert head_included(vessel(TABLE)) == 850.0 and head_included(vessel(TANK)) == 0.0


def test_without_courses_a_thickness_alone_is_for_pressure() -> None:
    assert courses_of(vessel(TANK, shell={"thickness_m": 0.01})) is None


def test_courses_begin_where_the_shell_does() -> None:
    cone = TANK | {"bottom": {"kind": "cone", "depth_m": 0.5}}
    assert widened(vessel(cone, shell=COURSES), 11.5) == pytest.approx(by_hand(11.0), rel=1e-12)
    inverted = TANK | {"bottom": {"kind": "cone", "depth_m": 0.5, "inverted": True}}
    assert widened(vessel(inverted, shell=COURSES), 11.0) == pytest.approx(by_hand(11.0), rel=1e-12)
    raised = vessel(TANK, shell=COURSES, gauging={"datum_m": 0.2})
    assert widened(raised, 10.8) == pytest.approx(by_hand(11.0), rel=1e-12)


@pytest.mark.parametrize(
    ("shape", "told"),
    [
        (SPHERE, "upright cylinder"),
        (BULLET, "upright cylinder"),
        ({"kind": "box", "length_m": 6.0, "width_m": 2.5, "height_m": 2.0}, "upright cylinder"),
        ({"kind": "capacity_table", "rows": [[0.0, 1.0], [2.0, 9.0]]}, "diameter_m"),
        (TANK | {"height_m": 15.01}, "must reach 15.01 m"),
        (TABLE | {"rows": [[0.0, 1.0], [15.01, 10600.0]]}, "must reach 15.01 m"),
    ],
)
def test_courses_of_another_shape_or_too_short_are_refused(shape: Body, told: str) -> None:
    with pytest.raises(DefinitionError, match=told) as refused:
        courses_of(vessel(shape, shell=COURSES))
    assert refused.value.field == "courses"
