"""The demo's own physics, against published answers and reference equations of state."""

from __future__ import annotations

import math

import numpy as np
import pytest
from CoolProp.CoolProp import PropsSI

from demo_data.physics import (
    FLUIDS,
    Conditions,
    Liquid,
    hull,
    lying_volume,
    mass_kg,
    sphere_volume,
    table_volume,
    upright_volume,
    vapour_density,
    vapour_pressure_kpa_abs,
)

INCH, GALLON = 0.0254, 231.0 * 0.0254**3  # exact
NAMES = {"propane": "Propane", "n-butane": "n-Butane", "nitrogen": "Nitrogen", "hydrogen": "Hydrogen"}


def test_lying_cylinder_agrees_with_a_published_example() -> None:
    """Jones, "Calculating Tank Volume": D 108 in, L 156 in, ellipsoidal heads of 42 in, filled to 36 in."""
    volume = lying_volume(108 * INCH, 156 * INCH, 42 * INCH, 0.0, 78 * INCH)
    assert float(volume(36 * INCH)) / GALLON == pytest.approx(2380.96, abs=0.005)


def test_upright_cone_agrees_with_a_published_example() -> None:
    """The same paper: D 132 in, a conical bottom of 33 in, filled to 24 in from its apex."""
    assert float(upright_volume(132 * INCH, 33 * INCH)(24 * INCH)) / GALLON == pytest.approx(250.67, abs=0.005)


def test_tilted_cylinder_is_full_where_it_is_under_and_empty_where_it_is_above() -> None:
    """Flat ends, and the surface crosses neither end: the mean of the segment's area along the axis."""
    diameter, length, tilt, gauge_at = 2.5, 8.0, math.degrees(math.atan(0.03)), 2.0
    volume = lying_volume(diameter, length, 0.0, tilt, gauge_at)
    x = np.linspace(0.0, length, 200_001)
    depth = 1.2 / math.cos(math.radians(tilt)) - (x - gauge_at) * 0.03
    phi = np.arccos(1.0 - depth / 1.25)
    area = 1.25**2 * (phi - np.sin(phi) * np.cos(phi))
    assert float(volume(1.2)) == pytest.approx(float(np.trapezoid(area, x)), rel=1e-8)


def test_sphere_by_its_segment() -> None:
    assert float(sphere_volume(18.0)(18.0)) == pytest.approx(math.pi * 18.0**3 / 6.0, rel=1e-14)
    assert float(sphere_volume(18.0)(9.0)) == pytest.approx(math.pi * 18.0**3 / 12.0, rel=1e-14)


def test_full_vessels_hold_their_capacity() -> None:
    head = {"kind": "ellipsoidal", "depth_m": 0.8}
    shape = {"kind": "horizontal_cylinder", "diameter_m": 3.2, "length_m": 18.0, "left_head": head, "right_head": head}
    full = hull({"shape": shape, "shell": {}})
    assert full.capacity_m3 == pytest.approx(math.pi * 2.56 * 18.0 + math.pi * 3.2**3 / 12.0, rel=1e-12)
    assert float(full.volume(3.2)) == pytest.approx(full.capacity_m3, rel=1e-7)


def test_table_is_read_linearly() -> None:
    assert float(table_volume([[0.0, 1.0], [2.0, 5.0]])(0.5)) == 2.0


def test_shell_stretches_by_its_full_strain_when_full_and_less_below() -> None:
    """A full sphere by three strains P D (1 − ν)/(4 t E); half full by one and a half (plain elasticity)."""
    shell = {"thickness_m": 0.028, "elastic_modulus_gpa": 207.0, "poisson_ratio": 0.3}
    sphere = hull({"shape": {"kind": "sphere", "diameter_m": 18.0}, "shell": shell})
    strain = 200.0e3 * 18.0 * 0.7 / (4.0 * 0.028 * 207.0e9)
    half, whole = sphere.stretched(9.0, 15.0, 15.0, 200.0)
    assert float(half) / float(sphere.volume(9.0)) - 1.0 == pytest.approx(1.5 * strain, rel=1e-3)
    assert float(whole) / sphere.capacity_m3 - 1.0 == pytest.approx(3.0 * strain, rel=1e-3)


def test_bare_steel_takes_an_eighth_of_the_air() -> None:
    """API MPMS 12.1.1: T_shell = (7 T_liquid + T_air)/8; an upright tank by (1 + α ΔT)²."""
    shape = {"kind": "vertical_cylinder", "diameter_m": 10.0, "height_m": 8.0, "bottom": {"kind": "flat"}}
    tank = hull({"shape": shape, "shell": {"expansion_per_k": 1.12e-5}})
    warm, _ = tank.stretched(4.0, 31.0, 15.0, 0.0)
    assert float(warm) / float(tank.volume(4.0)) == pytest.approx((1.0 + 1.12e-5 * 14.0) ** 2, rel=1e-12)


@pytest.mark.parametrize("name", ["propane", "n-butane"])
def test_liquefied_gases_follow_their_reference_equations(name: str) -> None:
    for temperature in (4.0, 11.0, 19.0, 27.0):
        kelvin = temperature + 273.15
        pressure = PropsSI("P", "T", kelvin, "Q", 0, NAMES[name]) / 1000.0
        assert vapour_pressure_kpa_abs(name, temperature) == pytest.approx(pressure, rel=2e-5)
        at_15 = PropsSI("D", "T", 288.15, "Q", 0, NAMES[name])
        found = Liquid(fluid=name).density(at_15, temperature, pressure)
        assert found == pytest.approx(PropsSI("D", "T", kelvin, "Q", 0, NAMES[name]), rel=3e-6)


@pytest.mark.parametrize(
    ("name", "pressures"),
    [
        ("propane", (420.0, 560.0)),
        ("n-butane", (95.0, 150.0)),
        ("nitrogen", (600.0, 3900.0)),
        ("hydrogen", (600.0, 5900.0)),
    ],
)
def test_vapours_follow_their_reference_equations(name: str, pressures: tuple[float, ...]) -> None:
    for pressure in pressures:
        for temperature in (9.0, 16.0, 28.0):
            state = ("T", temperature + 273.15, "P|gas", pressure * 1000.0, NAMES[name])
            assert vapour_density(name, pressure, temperature) == pytest.approx(PropsSI("D", *state), rel=2e-4)
    assert FLUIDS[name].molar_mass_kg_mol == pytest.approx(PropsSI("M", NAMES[name]), rel=1e-9)


def test_liquid_of_given_expansivity_uses_the_exponential_form() -> None:
    liquid = Liquid(8.5e-4, 7.7e-7)
    expected = 840.0 * math.exp(-8.5e-4 * 10.0 + 7.7e-7 * 1000.0)
    assert liquid.density(840.0, 25.0, 1101.325) == pytest.approx(expected, rel=1e-14)


def test_no_water_takes_no_room_on_an_uneven_bottom() -> None:
    """A table that begins at 9.6 m³ holds them as liquid where no water was found."""
    shape = {
        "kind": "capacity_table",
        "of": "vertical_cylinder",
        "rows": [[0.0, 9.6], [2.0, 29.6]],
        "total_volume_m3": 29.6,
    }
    full = hull({"shape": shape, "shell": {}})
    dry, wet = (mass_kg(full, Liquid(), "", 0.0, Conditions(1.0, water, density_15=800.0)) for water in (0.0, 0.1))
    assert float(dry) == pytest.approx(800.0 * 19.6, rel=1e-12)
    assert float(wet) == pytest.approx(800.0 * 9.0, rel=1e-12)
