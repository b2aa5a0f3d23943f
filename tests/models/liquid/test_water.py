"""Water near room temperature and up to 150 °C, against published tables and IAPWS-95."""

import numpy as np
import pytest
from CoolProp.CoolProp import PropsSI

from models.errors import OutsideRange
from models.liquid.water import point, water_density, why_outside


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


# --- 0 to 150 °C, under pressure -------------------------------------------------------------------


def at(celsius, pressure=101_325.0):
    return point(273.15 + np.asarray(celsius, dtype=float), pressure)


def unscaled(celsius68):
    """Our density on Kell's own scales: IPTS-68, and 999.9720 kg/m³ for the greatest density."""
    return at(np.asarray(celsius68) / 1.00024).density * 999.9720 / 999.974950


def iapws(celsius, pressure, what="D"):
    return PropsSI(what, "T", 273.15 + np.asarray(celsius), "P", pressure, "Water")


@pytest.mark.parametrize(
    ("celsius68", "kell", "kappa"),
    # Recomputed from Kell, J. Chem. Eng. Data 20 (1975) 97, in decimal arithmetic of 40 digits.
    [(0, 999.83952000, 50.88496000), (20, 998.20413220, 45.89184636), (50, 988.03629161, 44.17324142),
     (90, 965.32014731, 47.42883162), (100, 958.36365705, 49.01876120), (120, 943.08250707, 53.15828795),
     (150, 916.82911128, 62.14091250)],
)  # fmt: skip
def test_both_equations_of_kell(celsius68, kell, kappa):
    assert float(unscaled(celsius68)) == pytest.approx(kell, rel=1e-11)
    assert float(at(celsius68 / 1.00024).compressibility) == pytest.approx(kappa * 1e-11, rel=1e-9)


@pytest.mark.parametrize(
    ("celsius68", "density"),
    # Recomputed from Kell (1975), four decimals; t in IPTS-68.
    [(0, 999.8395), (4, 999.9720), (5, 999.9638), (10, 999.6996), (15, 999.0996), (20, 998.2041), (25, 997.0449),
     (30, 995.6473), (40, 992.2158), (45, 990.2132), (50, 988.0363), (60, 983.1989), (70, 977.7696),
     (80, 971.7978), (90, 965.3201), (99.9, 958.4355)],
)  # fmt: skip
def test_table_on_the_scale_of_kell(celsius68, density):
    assert float(unscaled(celsius68)) == pytest.approx(density, abs=5.1e-5)


@pytest.mark.parametrize(
    ("low", "high", "bars", "worst"),
    [(0.01, 100, 1.01325, 0.0018), (100, 150, 1.01325, 0.006), (0.01, 100, 10, 0.0014), (100, 150, 10, 0.0071),
     (0.01, 150, 20, 0.0105), (0.01, 100, 50, 0.0194), (100, 150, 50, 0.037), (0.01, 100, 100, 0.0780),
     (100, 150, 100, 0.135)],
)  # fmt: skip
def test_iapws_95_from_0_to_150_celsius(low, high, bars, worst):
    t = np.linspace(low, high, 151)
    pressure = np.maximum(bars * 1e5, 1.0001 * PropsSI("P", "T", 273.15 + t, "Q", 0, "Water"))
    difference = at(t, pressure).density - iapws(t, pressure)
    seen = float(np.max(np.abs(difference)))
    print(f"water {low:g} to {high:g} °C, {bars:g} bar or the vapour pressure: {seen:.4f} kg/m³ from IAPWS-95")
    assert 0.9 * worst < seen < worst


def test_slopes_of_iapws_95():
    t = np.linspace(0.01, 150, 151)
    pressure = np.maximum(101_325.0, 1.0001 * PropsSI("P", "T", 273.15 + t, "Q", 0, "Water"))
    found = at(t, pressure)
    beta = iapws(t, pressure, "ISOBARIC_EXPANSION_COEFFICIENT")
    kappa = iapws(t, pressure, "ISOTHERMAL_COMPRESSIBILITY")
    assert np.max(np.abs(found.expansivity - beta)) < 1.8e-6
    assert np.max(np.abs(found.expansivity - beta)[t <= 100]) < 3.1e-7
    assert np.max(np.abs(found.compressibility / kappa - 1)[t <= 100]) < 1e-4
    assert np.max(np.abs(found.compressibility / kappa - 1)) < 1.8e-3


def test_printed_compressibility():
    # CRC Handbook of Chemistry and Physics, 87th ed., "Pressure and temperature dependence of liquid density":
    # water 4.591, 4.524 and 4.475e-4 /MPa at 20, 25, 30 °C, from another measurement; 5e-4 apart.
    assert at([20, 25, 30]).compressibility == pytest.approx([4.591e-10, 4.524e-10, 4.475e-10], rel=6e-4)


def test_slopes_are_the_derivatives_of_the_density():
    t, p = np.meshgrid(np.linspace(5.0, 145.0, 29), [101_325.0, 5e5, 9e6])
    h, found = 1e-2, at(t, p)

    def log_density(dt=0.0, dp=0.0):
        return np.log(at(t + dt, p + dp).density)

    by_t = (8 * (log_density(h) - log_density(-h)) - (log_density(2 * h) - log_density(-2 * h))) / (12 * h)
    by_p = (log_density(dp=1e4) - log_density(dp=-1e4)) / 2e4
    assert found.expansivity == pytest.approx(-by_t, rel=1e-6, abs=1e-11)
    assert found.compressibility == pytest.approx(by_p, rel=1e-6)
    assert np.all(found.by_key == 1.0)


def test_densest_at_four_degrees():
    # Tanaka et al. (2001): greatest density 999.974950 kg/m³ at 3.983035 °C.
    assert float(at(3.983035).density) == pytest.approx(999.974950, abs=1e-5)
    assert float(at(3.983035).expansivity) == pytest.approx(0.0, abs=2e-8)


def test_pitfall_15_kell_typo():
    """A reprint has 16.897850e-3 in the denominator: 0.27 kg/m³ low at 20 °C."""
    numerator = 998.20413220 * (1 + 16.879850e-3 * 20)
    misprinted = numerator / (1 + 16.897850e-3 * 20)
    assert misprinted == pytest.approx(997.9355, abs=5e-5)  # recomputed from the reprint
    assert float(unscaled(20.0)) - misprinted == pytest.approx(0.2686, abs=1e-4)
    assert float(at(20.0).density) == pytest.approx(float(iapws(20.0, 101_325.0)), abs=1.8e-3)


@pytest.mark.parametrize(("celsius", "short"), [(60, -0.017), (90, -0.15)])
def test_pitfall_15_extrapolated_tanaka(celsius, short):
    """Carried beyond 40 °C the reference equation runs away from water; the point does not."""
    t = float(celsius)
    tanaka = 999.974950 * (1 - (t - 3.983035) ** 2 * (t + 301.797) / (522528.9 * (t + 69.34881)))
    reference = float(iapws(t, 101_325.0))
    assert tanaka - reference == pytest.approx(short, rel=0.05)  # recomputed from the published equation
    assert float(at(t).density) == pytest.approx(reference, abs=1.8e-3)
    with pytest.raises(OutsideRange):
        water_density(273.15 + t)


def test_meets_the_reference_equation_without_a_step():
    t = np.linspace(0.0, 40.0, 81)
    assert np.max(np.abs(at(t).density - water_density(273.15 + t))) < 1.5e-3
    near = at([39.999, 40.001]).density
    assert near[1] - near[0] == pytest.approx(-2e-3 * float(at(40.0).expansivity) * 992.2, rel=1e-3)


def test_outside_is_missing_and_says_why():
    states = [(0.0, 0.0, True), (150.0, 10e6, True), (-0.1, 1e5, False), (150.5, 1e6, False), (20.0, -1.0, False),
              (20.0, 10.05e6, False), (np.nan, 1e5, False), (20.0, np.nan, False)]  # fmt: skip
    t, p, inside = (np.array(column) for column in zip(*states, strict=True))
    found = at(t, p)
    for column in (found.density, found.expansivity, found.compressibility, found.by_key):
        assert np.array_equal(np.isfinite(column), inside.astype(bool))
    for celsius, pressure, ok in states:
        assert (why_outside(273.15 + celsius, pressure) == "") is ok
    assert why_outside(463.15, 1e5) == (
        "the water's temperature is 190 °C; its density is defined from 0 to 150 °C: "
        "for a state outside give a density_table"
    )
    assert "12000 kPa absolute; its density is defined from 0 to 10000 kPa" in why_outside(293.15, 12e6)


def test_scalars_and_columns_broadcast():
    assert at(20.0).density.shape == ()
    assert point(np.full((3, 1), 293.15), np.full(4, 1e5)).density.shape == (3, 4)
