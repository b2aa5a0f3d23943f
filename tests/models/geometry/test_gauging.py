"""Tapes and reference heights that are warmer than when they were measured."""

import numpy as np
import pytest

from models.geometry.gauging import reference_height_growth, tape_correction

STEEL = 1.116e-5  # 1/K; carbon steel 6.20e-6 /°F: API MPMS 12.1.1, as quoted in inspectors' handbooks


def test_a_top_mounted_gauge_rises_by_four_and_a_half_millimetres():
    """α H ΔT of 20 m of carbon steel that is 20 K warmer: 4.5 mm, worked by hand."""
    found = reference_height_growth(20.0, 308.15, 288.15, STEEL)
    assert found == pytest.approx(0.0045, abs=5e-5)
    assert found == pytest.approx(0.004464, rel=1e-9)


def test_a_warm_tape_reads_short_and_a_cold_one_long():
    assert tape_correction(20.0, [308.15, 293.15, 278.15], 293.15, STEEL) == pytest.approx(
        [0.003348, 0.0, -0.003348], rel=1e-9
    )


def test_a_tape_and_a_shell_of_one_temperature_and_steel_read_the_level_as_it_is():
    """The level is (H + growth) − (U + correction); all of one steel at one temperature it grows as H − U does."""
    height, ullage, warm = 20.0, 7.0, 308.15
    level = height + reference_height_growth(height, warm, 288.15, STEEL)
    level = level - (ullage + tape_correction(ullage, warm, 288.15, STEEL))
    assert level == pytest.approx((height - ullage) * (1.0 + STEEL * 20.0), rel=1e-14)


def test_pitfall_10_an_ullage_needs_the_reference_height_of_this_tank_as_it_stands():
    """The height as measured at 15 °C under a shell of 35 °C: the level would read 4.46 mm low."""
    height, ullage = 20.0, 7.0
    grown = height + reference_height_growth(height, 308.15, 288.15, STEEL)
    assert (grown - ullage) - (height - ullage) == pytest.approx(0.004464, rel=1e-6)


def test_columns_broadcast():
    found = reference_height_growth([[10.0], [20.0]], [288.15, 298.15, np.nan], 288.15, STEEL)
    assert found.shape == (2, 3)
    assert found[:, 1] == pytest.approx([1.116e-3, 2.232e-3])
    assert np.isnan(found[:, 2]).all()
