"""A floating roof lands, is carried by both, and floats."""

import numpy as np
import pytest

from models.geometry.roof import afloat_fraction, landing_zone


def test_the_share_afloat_is_linear_in_the_landing_zone():
    levels = [0.0, 1.8, 1.95, 2.1, 12.0]
    assert afloat_fraction(levels, 1.8, 2.1) == pytest.approx([0.0, 0.0, 0.5, 1.0, 1.0])
    assert landing_zone(levels, 1.8, 2.1).tolist() == [False, False, True, False, False]


def test_columns_of_vessels_each_have_their_own_legs():
    assert afloat_fraction(2.0, [1.0, 1.9, 2.5], [1.5, 2.1, 3.0]) == pytest.approx([1.0, 0.5, 0.0])


def test_legs_without_a_zone_are_a_step():
    assert afloat_fraction([1.9, 2.0, 2.1], 2.0, 2.0) == pytest.approx([0.0, 1.0, 1.0])


def test_missing_stays_missing():
    assert np.isnan(afloat_fraction(np.nan, 1.8, 2.1))
    assert np.isnan(afloat_fraction([np.nan, 3.0], 2.0, 2.0))[0]
    assert not landing_zone(np.nan, 1.8, 2.1)
