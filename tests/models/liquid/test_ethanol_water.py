"""Ethanol and water against the alcoholometric tables, their annex in decimal arithmetic, and round trips."""

import numpy as np
import pytest
from CoolProp.CoolProp import PropsSI

from models.liquid.ethanol_water import density_of_strength, mass_fraction, point, why_no_mixture, why_outside
from models.liquid.water import water_density

ATMOSPHERE = 101_325.0


def at(fraction, celsius, pressure=ATMOSPHERE, **other):
    return point(fraction, 273.15 + np.asarray(celsius, dtype=float), pressure, **other)


@pytest.mark.parametrize(
    ("fraction", "celsius", "density"),
    # Recomputed from the coefficients of Directive 76/766/EEC, annex, in decimal arithmetic of 40 digits.
    [(0.0, -20, 993.567116737), (0.0, 20, 998.201230000), (1.0, 20, 789.239123300), (1.0, -20, 823.120167393),
     (1.0, 40, 771.932311251), (0.5, 15, 917.710679341), (0.5, 20, 913.770595026), (0.5, 30, 905.712242447),
     (0.3, -10, 970.324717206), (0.8, 40, 825.682914189), (0.1, 5, 984.514693548), (0.6, -20, 922.557107130)],
)  # fmt: skip
def test_the_general_formula(fraction, celsius, density):
    assert float(at(fraction, celsius).density) == pytest.approx(density, abs=2e-9)


def test_pure_ethanol_as_printed():
    # Published, OIML R 22 (1973), erratum on the cover: pure ethanol at 20 °C has 789.24 kg/m³.
    assert float(at(1.0, 20.0).density) == pytest.approx(789.24, abs=5e-3)


@pytest.mark.parametrize(("celsius", "printed"), [(15, 917.76), (20, 913.84), (30, 905.80)])
def test_half_and_half_of_an_older_measurement(celsius, printed):
    # Published, Bulletin of the Bureau of Standards 9 (1913), 50 % by mass: another series, 0.09 kg/m³ apart.
    assert float(at(0.5, celsius).density) == pytest.approx(printed, abs=0.095)


@pytest.mark.parametrize(
    ("percent_by_volume", "density"),
    # Recomputed from OIML R 22 with q = p ρ(p, 20 °C)/789.24: volume of pure alcohol at 20 °C in that of the mixture.
    [(10, 984.71), (20, 973.56), (40, 948.05), (50, 930.14), (70, 885.56), (96, 807.42)],
)
def test_strength_by_volume(percent_by_volume, density):
    fraction = float(mass_fraction(density, 293.15))
    assert 100 * fraction * density / 789.24 == pytest.approx(percent_by_volume, abs=4e-3)


def test_without_ethanol_it_is_water_and_pure_it_is_ethanol():
    t = np.linspace(0.0, 40.0, 41)
    water = np.max(np.abs(at(0.0, t).density - water_density(273.15 + t)))
    ethanol = np.max(np.abs(at(1.0, t).density / PropsSI("D", "T", 273.15 + t, "P", ATMOSPHERE, "Ethanol") - 1))
    print(f"R 22: {water:.4f} kg/m³ from Tanaka at p = 0, {ethanol:.1e} from the reference equation at p = 1")
    assert water < 0.0095
    assert ethanol < 6e-4


def test_slopes_are_the_derivatives_of_the_density():
    key, t = np.meshgrid(np.linspace(0.02, 0.98, 25), np.linspace(-19.0, 39.0, 30))
    h, found = 1e-2, at(key, t, 3e5, compressibility=8e-10)

    def log_density(dk=0.0, dt=0.0, dp=0.0):
        return np.log(at(key * np.exp(dk), t + dt, 3e5 + dp, compressibility=8e-10).density)

    def slope(of, h):
        return (8 * (of(h) - of(-h)) - (of(2 * h) - of(-2 * h))) / (12 * h)

    assert found.expansivity == pytest.approx(-slope(lambda x: log_density(dt=x), h), rel=1e-6, abs=1e-11)
    assert found.by_key == pytest.approx(slope(lambda x: log_density(dk=x), 5e-4), rel=1e-6)
    assert found.compressibility == pytest.approx(slope(lambda x: log_density(dp=x), 1e4), rel=1e-6)


def test_expansivity_of_ethanol():
    # Recomputed from OIML R 22: (ρ15 − ρ25)/(10 ρ20) = 1.084e-3 /K, a difference over 10 K.
    assert float(at(1.0, 20.0).expansivity) == pytest.approx(1.084e-3, abs=1e-6)


def test_mass_fractions_come_back():
    key, t = np.meshgrid(np.linspace(0.0, 1.0, 101), np.linspace(-20.0, 40.0, 25))
    again = mass_fraction(at(key, t).density, 273.15 + t)
    assert np.max(np.abs(again - key)) < 2e-9  # cold and weak, density hardly changes with strength
    assert np.max(np.abs(again - key)[t > 0]) < 1e-11


def test_every_temperature_has_one_strength_for_a_density():
    key = np.linspace(0.0, 1.0, 5001)
    assert np.all(np.diff(at(key, np.linspace(-20, 40, 25)[:, None]).density, axis=1) < 0)


def test_compressibility_is_none_unless_given():
    plain, given = at(0.9, 20, 2e5), at(0.9, 20, 2e5, compressibility=1e-9)
    assert float(plain.compressibility) == 0.0
    assert float(given.density / plain.density) == pytest.approx(np.exp(1e-9 * (2e5 - 101_325)), rel=1e-14)


def test_pitfall_16_litres_of_pure_alcohol_are_those_at_20_celsius():
    """Half and half by mass: 913.771 kg/m³ at 20 °C, 917.711 at 15 °C; pure ethanol 789.24 at 20 °C, published.

    1,000 L at 20 °C hold 1,000 × 0.5 × 913.771/789.24 = 578.893 L of alcohol. Whoever takes the same 1,000 L as read
    at 15 °C for a volume at 20 °C misses the 0.43 % by which it would be larger there, 2.5 L.
    """
    strength = 0.5 * 913.771 / 789.24
    assert density_of_strength(strength) == pytest.approx(913.771, abs=0.002)
    cold = float(at(0.5, 15.0).density)
    assert cold == pytest.approx(917.711, abs=5e-4)
    grown = cold / float(at(0.5, 20.0).density)
    assert 1000.0 * strength * (grown - 1.0) == pytest.approx(2.5, abs=0.05)


def test_pitfall_16_r22_only_to_40_celsius():
    states = [(0.5, 20, 1e5, True), (0.5, -20, 0, True), (0.5, 40, 1e6, True), (0.5, 40.1, 1e5, False),
              (0.5, -20.1, 1e5, False), (-0.01, 20, 1e5, False), (1.005, 20, 1e5, False), (0.5, 20, -1, False),
              (0.5, 20, 1.005e6, False), (np.nan, 20, 1e5, False), (0.5, np.nan, 1e5, False)]  # fmt: skip
    key, t, p, inside = (np.array(column, dtype=float) for column in zip(*states, strict=True))
    found = at(key, t, p)
    for column in (found.density, found.expansivity, found.compressibility, found.by_key):
        assert np.array_equal(np.isfinite(column), inside == 1)
    for fraction, celsius, pressure, ok in states:
        assert (why_outside(fraction, 273.15 + celsius, pressure) == "") is ok
    assert "is 55 °C; the alcoholometric tables are defined from -20 to 40 °C" in why_outside(0.5, 328.15, 1e5)
    assert "1200 kPa absolute; the alcoholometric tables are taken from 0 to 1000 kPa" in why_outside(0.5, 300, 12e5)
    assert "1.2; it lies from 0 to 1" in why_outside(1.2, 300, 1e5)


def test_a_density_that_no_mixture_has_is_said_with_those_that_it_could_have():
    """789.239 and 998.201 kg/m³ at 20 °C, published."""
    said = why_no_mixture(700.0, 293.15)
    assert "is 700 kg/m³ at 20 °C" in said and "789.24 kg/m³ (pure ethanol) to 998.20 kg/m³ (water)" in said
    assert why_no_mixture(900.0, 293.15) == "" == why_no_mixture(700.0, 323.15)  # the temperature is told elsewhere


def test_a_density_that_no_mixture_has_has_no_strength():
    found = mass_fraction([1001.0, 780.0, 950.0, np.nan, 950.0], 273.15 + np.array([20.0, 20.0, 50.0, 20.0, 20.0]))
    assert np.isnan(found).tolist() == [True, True, True, True, False]
