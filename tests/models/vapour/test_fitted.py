"""The fitted polynomials against the reference equations and against measurements."""

import CoolProp
import numpy as np
import pytest

from models.vapour.fitted import FITTED, fitted_coefficients

# id, CoolProp's name, worst departure of B [cm3/mol] and of C [cm6/mol2] over the range, and the departures
# (fit - CoolProp 8.0.0) at its two ends: of B, of B, of C, of C.
DEPARTURES = [
    ("nitrogen", "Nitrogen", 0.00108, 0.016, -0.00107, 0.001, 0.00435, 0.000504),
    ("oxygen", "Oxygen", 0.000683, 0.00994, -0.000545, 0.000676, -0.00782, -0.00882),
    ("argon", "Argon", 0.00101, 0.0505, -0.001, 0.000439, -0.033, -0.0343),
    ("carbon-dioxide", "CarbonDioxide", 0.00569, 0.406, 0.00564, -0.00107, 0.402, 0.287),
    ("carbon-monoxide", "CarbonMonoxide", 0.00182, 0.0399, -0.0018, 0.00155, 0.0206, 0.0395),
    ("methane", "Methane", 0.00154, 0.0708, 0.000404, -0.00153, 0.0701, 0.0276),
    ("ethane", "Ethane", 0.00452, 54.3, -0.00374, -0.00146, 53.8, 32.8),
    ("propane", "Propane", 0.0569, 45.1, 0.0563, -0.0223, -44.6, -14),
    ("n-butane", "n-Butane", 0.019, 36.3, -0.0119, 0.0189, 36, 4.16),
    ("isobutane", "IsoButane", 0.017, 62.5, 0.0061, -0.00819, 61.9, 14.3),
    ("n-pentane", "n-Pentane", 0.123, 357.0, 0.0168, -0.122, -354, 31.9),
    ("isopentane", "Isopentane", 0.00667, 0.492, 0.00137, -0.00174, -0.418, -0.24),
    ("ethylene", "Ethylene", 0.00774, 0.275, -0.00683, -0.00366, 0.272, 0.228),
    ("propylene", "Propylene", 0.204, 6.99, -0.202, 0.13, 6.92, -3),
    ("1-butene", "1-Butene", 0.0168, 0.347, 0.0167, -0.00564, 0.344, 0.129),
    ("ammonia", "Ammonia", 0.228, 64.7, -0.225, 0.0749, -64, -59.5),
    ("hydrogen", "Hydrogen", 0.000727, 0.00639, -0.00072, 0.000616, 0.00633, 0.0062),
    ("helium", "Helium", 0.000696, 0.00436, -0.00069, -1.28e-05, -0.00381, -0.00365),
    ("hydrogen-sulfide", "HydrogenSulfide", 0.00832, 0.0116, -0.00063, 0.00824, 0.00527, 0.00219),
    ("sulfur-dioxide", "SulfurDioxide", 0.215, 14.2, -0.213, 0.212, 14.1, 7.81),
    ("water", "Water", 0.404, 1270.0, 0.4, -0.174, 739, -589),
    ("dimethyl-ether", "DimethylEther", 0.427, 4.35, -0.423, 0.271, 1.79, -4.3),
    ("r134a", "R134a", 0.507, 56.1, 0.501, -0.236, 55.6, 34.1),
    ("chlorine", "Chlorine", 0.0905, 61.6, -0.0896, -0.0405, -61, -46.3),
    ("hydrogen-chloride", "HydrogenChloride", 0.0657, 0.297, -0.065, 0.0456, -0.294, -0.268),
]  # fmt: skip


@pytest.mark.parametrize(
    ("name", "fluid", "worst_b", "worst_c", "b_low", "b_high", "c_low", "c_high"), DEPARTURES
)
def test_fit_departs_from_its_reference_equation_by_no_more_than_it_says(
    name: str,
    fluid: str,
    worst_b: float,
    worst_c: float,
    b_low: float,
    b_high: float,
    c_low: float,
    c_high: float,
) -> None:
    fit = FITTED[name]
    temperatures = np.linspace(fit.lowest, fit.highest, 41)
    state, expected = CoolProp.AbstractState("HEOS", fluid), []
    for t in temperatures:
        state.update(CoolProp.DmolarT_INPUTS, 1.0, t)
        expected.append((state.Bvirial() * 1e6, state.Cvirial() * 1e12))
    b, c = fitted_coefficients(name, temperatures)
    off_b = b * 1e6 - np.array(expected)[:, 0]
    off_c = c * 1e12 - np.array(expected)[:, 1]
    assert np.abs(off_b).max() <= worst_b
    assert np.abs(off_c).max() <= worst_c
    # A bound alone would not feel every constant: the ends move first.
    near_b, near_c = 0.01 * worst_b, 0.01 * worst_c
    assert (off_b[0], off_b[-1]) == pytest.approx((b_low, b_high), abs=near_b)
    assert (off_c[0], off_c[-1]) == pytest.approx((c_low, c_high), abs=near_c)


def test_every_fit_is_compared() -> None:
    assert {row[0] for row in DEPARTURES} == set(FITTED)


@pytest.mark.parametrize(
    ("name", "points"),
    [  # T/K, B/(cm3/mol), its uncertainty
        ("nitrogen", ((250.0, -16.3, 0.15), (300.0, -4.5, 0.1), (400.0, 9.2, 0.1))),
        ("oxygen", ((250.0, -28.7, 0.3), (300.0, -15.9, 0.5), (400.0, -0.7, 0.3))),
        ("carbon-dioxide", ((250.0, -184.8, 1.0), (273.15, -150.1, 0.3), (300.0, -121.7, 0.5),
                            (323.15, -102.0, 0.2), (373.15, -71.6, 0.6), (423.15, -51.3, 0.5))),
        ("methane", ((250.0, -65.4, 0.35), (298.15, -42.87, 0.1), (323.15, -34.26, 0.1), (373.16, -21.10, 0.08),
                     (423.18, -11.54, 0.11))),
        ("ethane", ((250.0, -264.9, 2.0), (273.16, -222.2, 2.0), (298.15, -185.8, 1.0), (323.15, -156.3, 0.3),
                    (373.15, -113.5, 0.3), (423.15, -83.9, 0.6), (473.15, -61.8, 0.5))),
        ("ethylene", ((273.15, -167.7, 0.3), (298.15, -139.8, 0.3), (323.15, -117.6, 0.3), (373.16, -84.6, 0.3),
                      (423.17, -61.3, 0.3))),
        ("hydrogen", ((273.15, 13.7, 1.0), (298.15, 14.4, 1.0), (323.15, 14.9, 1.0), (373.15, 15.7, 1.0))),
        ("water", ((373.15, -452.7, 8.0), (473.15, -200.9, 1.0), (523.15, -149.7, 1.5), (573.15, -115.8, 2.1))),
    ],
)  # fmt: skip
def test_fit_agrees_with_measurements(name: str, points: tuple[tuple[float, float, float], ...]) -> None:
    """Dymond and Smith 1980, Dymond et al. 2002; where the reference equation and a point differ by more
    than the point's own uncertainty, the tolerance is that difference, rounded up."""
    for temperature, expected, uncertainty in points:
        b, _ = fitted_coefficients(name, temperature)
        assert float(b) * 1e6 == pytest.approx(expected, abs=uncertainty)
