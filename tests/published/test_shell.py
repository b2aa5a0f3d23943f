"""Printed examples of shell, roof and tank table, and the mistakes that each of them guards against.

C_TSh: API MPMS ch. 12.1.1, worked examples as quoted in inspectors' handbooks, which round the shell's
temperature to whole °F. Roof: excerpt of a tank table as quoted there, 4 088.2662 bbl deducted for
1 215 000 lb at 35.0 °API and 24.59 bbl for each °API. What is not printed is worked out by hand, and says so.
"""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from models.columns import Inventory, Mark, Method
from models.geometry import shapes
from models.geometry.curves import Curve, Curves
from models.geometry.lying import horizontal_cylinder
from models.geometry.pieces import with_datum
from models.geometry.shell import full_factor, shell_factor, shell_temperature
from models.geometry.tables import capacity_table, with_deadwood
from models.mass import inventory
from tests.models.mass_cases import Case, state, vessels

CARBON_STEEL = 6.20e-6  # 1/°F: API MPMS ch. 12.1.1 as quoted in inspectors' handbooks
POUND, INCH = 0.45359237, 0.0254  # kg, m; exact
GALLON = 231.0 * INCH**3  # m³; exact
BARREL = 42.0 * GALLON
BASE = 288.15  # K
UPRIGHT = shapes.vertical_cylinder(diameter=20.0, height=12.0)


def fahrenheit(value: float) -> float:
    return (value + 459.67) / 1.8


def factor(curve: Curve, level: float, strain: float) -> float:
    """K of a strain that is the same in every direction, at a level."""
    volume, area = Curves.from_curves([curve]).volume_and_area(level)
    return float(shell_factor(level, area, volume, 3.0 * strain, strain))


def read(curve: Curve, *, load: float = 0.0, vessel: dict[str, float] | None = None, **reading: float) -> Inventory:
    """One reading at the base temperature, whose shell does not expand unless the vessel says so."""
    said = {"expansion": 0.0} | (vessel or {})
    given = {"liquid_temperature": BASE, "density": 850.0, "density_temperature": BASE, "water_level": -math.inf}
    method = Method.LIQUID | Method.ROOF if "roof_mass" in said else Method.LIQUID
    case = Case("a tank", method, curve, said, given | reading)
    return inventory(vessels([case]), None, replace(state([case]), roof_load=np.array([load])))


# --- C_TSh ----------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("liquid", "ambient", "rounded", "printed", "half_a_digit"),
    [(135, 80, 128, 1.00084, 5e-6), (135, 88, 129, 1.00086, 5e-6), (135, 88, 129, 1.0008558, 5e-8)],
)
def test_shell_factors_of_a_crude_tank(
    liquid: float, ambient: float, rounded: int, printed: float, half_a_digit: float
) -> None:
    """Published: 135 °F inside; 80 °F outside make 1.00084 and 88 °F 1.00086. The longer one is recomputed."""
    found = float(shell_temperature(fahrenheit(liquid), fahrenheit(ambient), False)) * 1.8 - 459.67
    assert round(found) == rounded
    assert factor(UPRIGHT, 7.0, CARBON_STEEL * (rounded - 60)) == pytest.approx(printed, abs=half_a_digit)


# ΔT = 25 °C, worked out with the strains of mild steel 1.116e-5, 304 1.73e-5, 316 1.59e-5, duplex 1.30e-5
# and aluminium 2.3e-5 1/K.
@pytest.mark.parametrize(
    ("expansion", "expected", "half_a_digit"),
    [(1.116e-5, 1.000558, 5e-7), (1.73e-5, 1.000865, 5e-7), (1.59e-5, 1.000795, 5e-7), (1.30e-5, 1.000650, 5e-7),
     (2.3e-5, 1.00115, 5e-6)],
)  # fmt: skip
def test_shell_factors_of_metals(expansion: float, expected: float, half_a_digit: float) -> None:
    assert factor(UPRIGHT, 7.0, expansion * 25.0) == pytest.approx(expected, abs=half_a_digit)


def test_pitfall_2_shell_factor_of_a_table_already_at_operating_temperature() -> None:
    """Hot, insulated, 300 °F: a table made at 300 °F needs nothing; from 60 °F again, 0.298 % is counted twice."""
    hot, expansion = fahrenheit(300), CARBON_STEEL * 1.8

    def volume(made: float) -> float:
        vessel = {"liquid_weight": 1.0, "expansion": expansion, "expansion_temperature": fahrenheit(made)}
        found = read(UPRIGHT, vessel=vessel, level=8.0, liquid_temperature=hot, density_temperature=hot)
        return float(found["gross_observed_volume"][0])

    assert volume(300) == pytest.approx(math.pi * 100.0 * 8.0, rel=1e-14)
    assert volume(60) / volume(300) - 1.0 == pytest.approx(0.00298, abs=5e-6)


@pytest.mark.parametrize("share", [0.25, 0.5, 0.75])
def test_pitfall_2_shell_factor_of_an_upright_cylinder_on_spheres_and_bullets(share: float) -> None:
    """At one level (1 + ε)² is right of an upright cylinder alone: a half-full sphere takes 1.5 ε, a bullet 1.73 ε."""
    strain = 3e-4
    sphere, bullet = shapes.sphere(diameter=18.0), horizontal_cylinder(diameter=3.0, length=14.0)
    trade = (1.0 + strain) ** 2
    assert factor(UPRIGHT, 12.0 * share, strain) == pytest.approx(trade, rel=1e-14)
    away = [(factor(curve, curve.top * share, strain) - trade) / strain for curve in (sphere, bullet)]
    assert away == pytest.approx(
        {0.25: [1.2 - 2.0, 1.59 - 2.0], 0.5: [-0.5, 1.73 - 2.0], 0.75: [0.0, 1.97 - 2.0]}[share], abs=0.006
    )


@pytest.mark.parametrize(
    ("share", "sphere", "bullet"),
    [(0.1, 1.07, 1.53), (0.25, 1.2, 1.59), (0.5, 1.5, 1.73), (0.75, 2.0, 1.97), (0.9, 2.5, 2.27), (1.0, 3.0, 3.0)],
)
def test_pitfall_13_the_full_vessel_s_three_strains_on_a_part_fill(share: float, sphere: float, bullet: float) -> None:
    """Worked out, two decimals: only the full vessel takes 3ε; at half, 3ε would double the correction."""
    strain = 1e-6
    for curve, expected in (
        (shapes.sphere(diameter=18.0), sphere), (horizontal_cylinder(diameter=3.0, length=14.0), bullet),
    ):  # fmt: skip
        found = (factor(curve, curve.top * share, strain) - 1.0) / strain
        assert found == pytest.approx(expected, abs=0.0051)
    assert (float(full_factor(3.0 * strain)) - 1.0) / strain == pytest.approx(3.0, abs=1e-5)


# --- floating roof --------------------------------------------------------------------------------

ROOF_POUNDS = 1_215_000.0
WATER_60F = 999.016  # kg/m³: API MPMS 11.1-2004


def in_vacuum(api: float) -> float:
    return 141.5 / (131.5 + api) * WATER_60F


def in_air(api: float) -> float:
    """Apparent density: API MPMS 11.5.3."""
    return 1.000149926 * in_vacuum(api) - 1.199407795


def displaced(density: float, table: float | None = None, level: float = 8.0, weight: float = ROOF_POUNDS) -> float:
    """Barrels that the roof adds to the volume of the table, above 1.5 m afloat."""
    roof = {"roof_mass": weight * POUND, "roof_lands": 1.2192, "roof_floats": 1.524}
    roof |= {"roof_volume_per_mass": 0.0 if table is None else 1.0 / table}
    return float(read(UPRIGHT, vessel=roof, level=level, density=density)["roof_volume"][0]) / BARREL


def test_a_roof_displaces_what_the_tank_table_deducts() -> None:
    """Published: 4 088.2662 bbl at 7.076 lb/gal, the printed weight in air at 35.0 °API."""
    assert in_air(35.0) * GALLON / POUND == pytest.approx(7.076, abs=5e-4)
    assert displaced(7.076 * POUND / GALLON) == pytest.approx(-4088.2662, abs=5e-5)


def test_the_table_s_correction_for_each_degree() -> None:
    """Published: ±24.59 bbl for each °API, so 181.97 bbl are subtracted at 42.4 °API (7.4 of them)."""
    slope = (displaced(in_air(35.5), in_air(35.0)) - displaced(in_air(34.5), in_air(35.0))) / 1.0
    assert slope == pytest.approx(-24.59, abs=5e-3)
    assert 7.4 * slope == pytest.approx(-181.97, abs=0.04)
    # The chord itself is a little shorter than 7.4 slopes at 35.0.
    assert displaced(in_air(42.4), in_air(35.0)) == pytest.approx(-181.97, abs=0.3)


def test_pitfall_4_sign_of_the_roof_correction() -> None:
    """Lighter than the table's oil: subtract; heavier: add; the same: nothing. Without deduction, always subtract."""
    table = in_vacuum(35.0)
    assert displaced(in_vacuum(42.4), table) < 0.0 < displaced(in_vacuum(30.0), table)
    assert displaced(table, table) == 0.0
    assert displaced(in_vacuum(42.4)) < displaced(in_vacuum(30.0)) < 0.0


def test_pitfall_4_roof_and_density_on_two_bases() -> None:
    """A weight in air over a density in vacuum: 4 082.86 bbl, 0.13 % of the displacement (recomputed)."""
    assert displaced(in_vacuum(35.0)) == pytest.approx(-4082.86, abs=5e-3)
    assert displaced(in_air(35.0)) / displaced(in_vacuum(35.0)) - 1.0 == pytest.approx(0.00126, abs=1e-5)


def test_pitfall_3_roof_already_in_the_table() -> None:
    """A table that deducts the roof at 850 kg/m³ and one that does not hold the same oil, counted either way."""
    roof = {"roof_mass": 412_000.0, "roof_lands": 1.8, "roof_floats": 2.1}
    levels = np.array([0.0, 1.8, 2.1, 12.0])
    gross = 1963.0 * levels
    deducted = gross - np.array([0.0, 0.0, 1.0, 1.0]) * 412_000.0 / 850.0
    for level in (1.0, 1.95, 9.0):
        free = read(capacity_table(levels, gross), vessel=roof, level=level, density=820.0)
        net = read(
            capacity_table(levels, deducted), vessel=roof | {"roof_volume_per_mass": 1.0 / 850.0}, level=level,
            density=820.0,
        )  # fmt: skip
        assert net["mass"][0] == pytest.approx(free["mass"][0], rel=1e-13)
    twice = read(capacity_table(levels, deducted), vessel=roof, level=9.0, density=820.0)["mass"][0]
    assert twice - free["mass"][0] == pytest.approx(-412_000.0 * 820.0 / 850.0, rel=1e-9)
    # Over its landing zone such a table rises by less than its area: 1963 m² less 412 t over 0.3 m.
    assert np.diff(deducted)[1] / 0.3 == pytest.approx(1963.0 - 412_000.0 / 850.0 / 0.3)


def test_pitfall_17_a_reading_in_the_critical_zone_is_computed_and_flagged() -> None:
    roof = {"roof_mass": 412_000.0, "roof_lands": 1.8, "roof_floats": 2.1}
    below, inside, above = (read(UPRIGHT, vessel=roof, level=level) for level in (1.7, 1.95, 2.2))
    assert [bool(found.marks[0] & Mark.ROOF_LANDING_ZONE) for found in (below, inside, above)] == [False, True, False]
    area = math.pi * 100.0
    assert inside["mass"][0] == pytest.approx(850.0 * area * 1.95 - 206_000.0, rel=1e-12)  # half of it, a convention
    assert inside.sensitivities["roof"][0] == pytest.approx(412_000.0, rel=1e-12)


def test_rain_on_a_roof_is_a_roof_that_is_heavier() -> None:
    """50 t of water on it in an oil of 850 kg/m³: 58.8 m³ (worked out)."""
    roof = {"roof_mass": 412_000.0, "roof_lands": 1.8, "roof_floats": 2.1}
    dry, wet = (
        read(UPRIGHT, vessel=roof, load=load, level=8.0)["gross_observed_volume"][0] for load in (0.0, 50_000.0)
    )
    assert dry - wet == pytest.approx(58.8, abs=0.05)


# --- table, datum and free water ------------------------------------------------------------------


def test_pitfall_3_sign_of_deadwood() -> None:
    """Deadwood takes room above its beginning; a negative one adds it (a manhole, a sump)."""
    coils, sump = (with_deadwood(UPRIGHT, [1.0], [2.0], [room]) for room in (3.0, -3.0))
    change = [
        [float(Curves.from_curves([curve]).volume(level) - Curves.from_curves([UPRIGHT]).volume(level))
         for level in (0.5, 1.5, 5.0)]
        for curve in (coils, sump)
    ]  # fmt: skip
    assert change[0] == pytest.approx([0.0, -1.5, -3.0], abs=1e-10)
    assert change[1] == pytest.approx([0.0, 1.5, 3.0], abs=1e-10)
    assert (coils.capacity, sump.capacity) == pytest.approx((UPRIGHT.capacity - 3.0, UPRIGHT.capacity + 3.0))


def test_pitfall_11_free_water_below_the_datum_is_none_and_above_it_has_the_bottom_in_it() -> None:
    """The datum stands 0.1 m above the bottom: 31.4 m³ lie below it."""
    raised, area = with_datum(UPRIGHT, 0.1), math.pi * 100.0
    none = read(raised, level=5.0)
    for below in (-0.05, 0.0):
        found = read(raised, level=5.0, water_level=below)
        assert found["free_water_volume"][0] == 0.0  # not the table at 0
        assert found["mass"][0] == none["mass"][0]
    found = read(raised, level=5.0, water_level=0.02)
    assert found["free_water_volume"][0] == pytest.approx(0.12 * area, rel=1e-12)
    assert found["gross_observed_volume"][0] == pytest.approx((5.1 - 0.12) * area, rel=1e-12)
