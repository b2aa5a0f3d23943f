"""Strain of the shell and what it does to the volume below a measured level."""

import math

import numpy as np
import pytest

from models.errors import DefinitionError
from models.geometry.curves import Curves
from models.geometry.heads import Head
from models.geometry.shapes import box, capacity_table, horizontal_cylinder, sphere, vertical_cylinder
from models.geometry.shell import full_factor, pressure_strain, shell_factor, shell_temperature

STEEL = 6.20e-6 * 1.8  # 1/K; carbon steel 6.20e-6 /°F: API MPMS 12.1.1, as quoted in inspectors' handbooks


def fahrenheit(value):
    return (value + 459.67) / 1.8


def factor(curve, level, strain):
    volume, area = Curves.from_curves([curve]).volume_and_area(level)
    return shell_factor(level, area, volume, 3.0 * strain, strain)


# API MPMS 12.1.1, worked examples as quoted in inspectors' handbooks: liquid and ambient in °F, base 60 °F.
@pytest.mark.parametrize(
    ("liquid", "ambient", "shell", "printed"), [(135, 80, 128.125, 1.00084), (135, 88, 129.125, 1.00086)]
)
def test_the_trade_s_factor_for_upright_cylinders(liquid, ambient, shell, printed):
    found = shell_temperature(fahrenheit(liquid), fahrenheit(ambient), False)
    assert found == pytest.approx(fahrenheit(shell), rel=1e-14)
    strain = STEEL * (found - fahrenheit(60))
    tank = vertical_cylinder(diameter=30.0, height=12.0)
    assert factor(tank, 7.0, strain) == pytest.approx(printed, abs=6e-6)
    assert factor(tank, 7.0, strain) == pytest.approx(1.0 + 2.0 * strain + strain**2, rel=1e-14)  # C_TSh


def test_an_insulated_shell_follows_its_liquid():
    found = shell_temperature([350.0, 350.0], [290.0, np.nan], [False, True])
    assert found == pytest.approx([(7 * 350.0 + 290.0) / 8, 350.0])


# From the closed form ε R/(R − h/3), rounded to two decimals.
@pytest.mark.parametrize(
    ("share", "ratio"), [(0.1, 1.07), (0.25, 1.2), (0.5, 1.5), (0.75, 2.0), (0.9, 2.5), (1.0, 3.0)]
)
def test_a_part_filled_sphere(share, ratio):
    strain = 3e-4
    found = (factor(sphere(diameter=18.0), 18.0 * share, strain) - 1.0) / strain
    assert found == pytest.approx(ratio, abs=0.005)
    assert found == pytest.approx(9.0 / (9.0 - 6.0 * share), abs=6.0 * strain)
    small = (factor(sphere(diameter=18.0), 18.0 * share, 1e-9) - 1.0) / 1e-9
    assert small == pytest.approx(9.0 / (9.0 - 6.0 * share), rel=1e-6)


# From 2(φ − sin φ)/(φ − sin φ cos φ) + 1 with cos φ = 1 − h/R, φ the half angle; rounded to two decimals.
@pytest.mark.parametrize(
    ("share", "ratio"), [(0.1, 1.53), (0.25, 1.59), (0.5, 1.73), (0.75, 1.97), (0.9, 2.27), (1.0, 3.0)]
)
def test_a_part_filled_lying_cylinder(share, ratio):
    strain = 1e-9
    found = (factor(horizontal_cylinder(diameter=3.0, length=10.0), 3.0 * share, strain) - 1.0) / strain
    assert found == pytest.approx(ratio, abs=0.005)
    phi = math.acos(1.0 - 2.0 * share)
    chord_by_section = 2.0 * math.sin(phi) / (phi - math.sin(phi) * math.cos(phi)) / 1.5
    assert found == pytest.approx(1.0 + 2.0 - 3.0 * share * chord_by_section, rel=1e-6)


@pytest.mark.parametrize(
    "curve",
    [
        sphere(diameter=18.0),
        vertical_cylinder(diameter=10.0, height=9.0, bottom=Head("cone", depth=0.5)),
        horizontal_cylinder(diameter=3.0, length=10.0, left_head=Head("hemispherical"), tilt=0.02, gauge_at=2.0),
        box(length=4.0, width=5.0, height=3.0),
        capacity_table(np.linspace(0, 5, 51), np.linspace(1, 6, 51) ** 1.5),
    ],
    ids=lambda curve: curve.kind,
)
def test_the_rule_is_the_first_order_of_a_shell_grown_in_every_direction(curve):
    stack = Curves.from_curves([curve])
    level = curve.top * np.array([0.131, 0.283, 0.507, 0.769, 0.951])

    def grown(strain):
        return stack.volume(level / (1.0 + strain)) * (1.0 + strain) ** 3

    step = 1e-5
    slope = (grown(step) - grown(-step)) / (2.0 * step) / stack.volume(level)
    own = (factor(curve, level, step) - factor(curve, level, -step)) / (2.0 * step)
    assert own == pytest.approx(slope, rel=2e-8)
    # What is left out at 20 K of steel is below a part in a million of the volume.
    strain = 20.0 * STEEL
    assert factor(curve, level, strain) == pytest.approx(grown(strain) / stack.volume(level), abs=1e-6)


def test_an_empty_vessel_and_a_full_one():
    assert shell_factor(0.0, 0.0, 0.0, 3e-4, 1e-4) == pytest.approx(1.0001**2, rel=1e-15)  # a flat floor
    assert full_factor([3e-4, 0.0]) == pytest.approx([1.0001**3, 1.0], rel=1e-15)


# Thin-wall elasticity worked by hand: full vessel, E = 207 GPa, ν = 0.3.
def test_pressure_stretches_a_sphere_and_a_bullet():
    total, vertical = pressure_strain("sphere", 18.0, 0.028, 207e9, 0.3)
    assert total * 2e5 == pytest.approx(3.26e-4, abs=5e-7)
    assert total == pytest.approx(3.0 * vertical, rel=1e-15)
    total, vertical = pressure_strain("horizontal_cylinder", 3.0, 0.018, 207e9, 0.3)
    assert total * 8.45e5 == pytest.approx(6.46e-4, abs=1e-6)
    ratio = 3.0 / (0.018 * 207e9)
    assert vertical == pytest.approx(0.5 * ratio * 0.85, rel=1e-14)
    assert total == pytest.approx(ratio * (5.0 - 4.0 * 0.3) / 4.0, rel=1e-14)


def test_an_upright_cylinder_under_pressure_grows_by_twice_its_hoop_strain():
    total, vertical = pressure_strain("vertical_cylinder", 3.0, 0.018, 207e9, 0.3)
    hoop = pressure_strain("horizontal_cylinder", 3.0, 0.018, 207e9, 0.3)[1]
    tank = vertical_cylinder(diameter=3.0, height=9.0)
    volume, area = Curves.from_curves([tank]).volume_and_area(4.0)
    found = shell_factor(4.0, area, volume, total * 1e6, vertical * 1e6)
    assert found == pytest.approx((1.0 + 1e6 * hoop) ** 2, abs=(1e6 * (hoop - vertical)) ** 2)


@pytest.mark.parametrize("kind", ["box", "fixed_volume"])
def test_a_shape_without_a_known_form_has_no_pressure_strain(kind):
    assert pressure_strain(kind, 1.0, 0.01, 207e9, 0.3) == (0.0, 0.0)


@pytest.mark.parametrize(
    ("given", "field"),
    [
        (("spheroid", 3.0, 0.01, 207e9, 0.3), "of"),
        (("sphere", 0.0, 0.01, 207e9, 0.3), "diameter_m"),
        (("sphere", 3.0, 0.0, 207e9, 0.3), "thickness_m"),
        (("sphere", 3.0, 0.01, -1.0, 0.3), "elastic_modulus_gpa"),
        (("sphere", 3.0, 0.01, 0.0, 0.3), "elastic_modulus_gpa"),
        (("sphere", 3.0, 0.01, math.nan, 0.3), "elastic_modulus_gpa"),
        (("sphere", 3.0, 0.01, 207e9, 0.6), "poisson_ratio"),
    ],
)
def test_an_impossible_shell_is_refused(given, field):
    with pytest.raises(DefinitionError) as refused:
        pressure_strain(*given)
    assert refused.value.field == field
