"""The space above a liquid: the product's vapour beside a blanket, and where the blanket is gone."""

from __future__ import annotations

import math

import numpy as np
import pytest

from models.columns import Mark
from models.geometry import shapes
from models.mass import inventory
from tests.models.mass_cases import ATMOSPHERE, BLANKETED, Case, state, vessels

# n-Pentane by its reference equation of state (M. Thol et al., Fluid Phase Equilib., 2019, by CoolProp 8.0.0):
# saturated at 20 °C at 56.568 kPa with 1.72447 kg/m³; at 38 °C at 108.21 kPa; at 38 °C and 102.325 kPa a gas of
# 2.98350 kg/m³.
BOX = shapes.box(length=10.0, width=10.0, height=10.0)


def tank(celsius: float, gauge: float, **read: float) -> Case:
    """A stiff box of 1,000 m³ with 200 m³ of liquid under its blanket: 800 m³ of gas."""
    return Case(
        "pentane", BLANKETED.method, BOX, {"expansion": 0.0},
        {"level": 2.0, "liquid_temperature": celsius + 273.15, "density": 626.0, "pressure": ATMOSPHERE + gauge} | read,
        "n-pentane", "n-pentane",
    )  # fmt: skip


def test_beside_its_blanket_the_vapour_is_that_of_its_own_saturation() -> None:
    """800 m³ × 1.72447 kg/m³ = 1,379.6 kg, whatever the pressure of the blanket is."""
    cases = [tank(20.0, gauge) for gauge in (0.0, 5e3, 50e3)]
    own = inventory(vessels(cases), np.arange(3), state(cases))
    assert own["vapour_mass"] == pytest.approx([1_379.6] * 3, rel=0.002)
    assert own["vapour_pressure"] == pytest.approx([56_568.0] * 3, rel=0.001)
    assert own["mass"] == pytest.approx(200.0 * 626.0 + own["vapour_mass"], rel=1e-12)
    assert not own.marks.any()


def test_what_the_two_gases_do_to_each_other_is_two_percent_for_each_bar_of_blanket() -> None:
    cases = [tank(20.0, gauge) for gauge in (5e3, 105e3)]
    own = inventory(vessels(cases), np.arange(2), state(cases))
    share = own.sensitivities["vapour_model"] / own["vapour_mass"]
    blankets = np.array([ATMOSPHERE + 5e3, ATMOSPHERE + 105e3]) - 56_568.0
    assert np.sqrt(share[1] ** 2 - share[0] ** 2) == pytest.approx(
        0.02e-5 * math.sqrt(blankets[1] ** 2 - blankets[0] ** 2), rel=0.001
    )
    assert share[0] >= 0.02e-5 * blankets[0]


def test_a_vapour_thermometer_counts_and_without_one_the_liquids_does() -> None:
    """The liquid at 20 °C under a gas of 25 °C: 68.355 kPa, saturated with 2.05784 kg/m³ by the same equation."""
    cases = [tank(20.0, 5e3, vapour_temperature=298.15), tank(25.0, 5e3), tank(25.0, 5e3, vapour_temperature=298.15)]
    own = inventory(vessels(cases), np.arange(3), state(cases))
    assert own["vapour_mass"] == pytest.approx([800.0 * 2.05784] * 3, rel=0.002)


def test_where_the_vapour_pressure_reaches_that_of_the_space_all_is_product() -> None:
    """38 °C under 1 kPa: 800 m³ of pure vapour at 102.325 kPa, 2.98350 kg/m³; 5.9 kPa too low for a blanket is said."""
    cases = [tank(38.0, 1e3), tank(38.0, 6.5e3), tank(38.0, 8e3)]
    own = inventory(vessels(cases), np.arange(3), state(cases))
    assert own["vapour_mass"][0] == pytest.approx(800.0 * 2.98350, rel=0.002)
    assert [Mark(int(mark)) for mark in own.marks] == [Mark.SATURATION_LOW, Mark.NONE, Mark.NONE]
    # Across the limit nothing jumps: 0.4 kPa below saturation and 1.1 kPa above it.
    assert own["vapour_mass"][1] == pytest.approx(own["vapour_mass"][2], rel=0.006)


def test_a_blanket_whose_pressure_is_not_known_makes_no_mass() -> None:
    own = inventory(vessels([tank(20.0, math.nan)]), None, state([tank(20.0, math.nan)]))
    assert math.isnan(own["mass"][0]) and own.marks[0] & Mark.MISSING
