"""Water near room temperature against the published table and IAPWS-95."""

import numpy as np
import pytest
from CoolProp.CoolProp import PropsSI

from models.errors import OutsideRange
from models.liquid.water import water_density


@pytest.mark.parametrize(
    ("celsius", "printed"),
    # Tanaka et al., Metrologia 38 (2001) 301, table 1 (values from memory, four decimals).
    [
        (0, 999.8428),
        (4, 999.9749),
        (10, 999.7027),
        (15, 999.1026),
        (20, 998.2067),
        (25, 997.0470),
        (40, 992.2152),
    ],
)
def test_printed_table(celsius, printed):
    assert float(water_density(273.15 + celsius)) == pytest.approx(printed, abs=6e-5)


def test_iapws_95_within_its_stated_difference():
    t = np.linspace(273.16, 313.15, 41)
    reference = PropsSI("D", "T", t, "P", 101325, "Water")
    assert np.max(np.abs(water_density(t) - reference)) < 0.0013


def test_the_equation_is_never_extrapolated():
    with pytest.raises(OutsideRange, match="index 1 is 60 °C; the equation is defined from 0 to 40"):
        water_density(np.array([290.0, 333.15]))


def test_the_range_is_that_of_the_published_equation():
    # Tanaka et al. (2001): 0 to 40 °C; table 1 ends at 992.2152 kg/m³, and 40.1 °C is 0.04 kg/m³ less and refused.
    assert float(water_density(273.15 + 40.0)) == pytest.approx(992.2152, abs=6e-5)
    for celsius in (-0.1, 40.1):
        with pytest.raises(OutsideRange, match="0 to 40"):
            water_density(273.15 + celsius)
