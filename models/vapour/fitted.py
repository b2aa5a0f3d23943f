"""Second and third virial coefficients of pure gases, fitted to reference equations of state.

The polynomials were fitted to the coefficients of the reference equations of state in CoolProp 8.0.0
(HEOS), each in its own range of temperature: from 230 K, or from where the vapour pressure is 0.3 bar,
to 480 K or to the end of the equation's range. They are never extrapolated.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from models.arrays import ArrayLike, FloatArray, as_floats

ORIGIN = 298.15  # K, where x = 0
SOURCE = "fitted to the reference equations of state in CoolProp 8.0.0 (HEOS)"


class Fit(NamedTuple):
    """Coefficients of one gas: range, two sizes of its error (``guard.Trust``), b0..b4, c0..c5.

    ``b`` in cm3/mol and ``c`` in cm6/mol2, both by powers of 298.15 K/T - 1.
    """

    lowest: float
    highest: float
    growth: float  # %, with reduced density squared
    omitted: float  # of the fourth virial coefficient, relative to a common gas's
    b: tuple[float, ...]
    c: tuple[float, ...]


FITTED: dict[str, Fit] = {
    "nitrogen": Fit(
        230, 480, 4, 0.25,
        (-4.9107, -57.888, -10.52, 1.986, -2.7883),
        (1414.4, 680.25, 676.26, 157.27, -291.49, 134.85),
    ),
    "oxygen": Fit(
        230, 480, 4, 0.25,
        (-15.857, -63.175, -11.782, 1.7492, -2.7541),
        (945.97, 923.92, 644.19, -209.46, -83.435, -218),
    ),
    "argon": Fit(
        230, 480, 4, 0.25,
        (-15.555, -60.679, -11.071, 1.0688, -2.1378),
        (1061.5, 834.93, 664.44, 18.444, -301.06, 89.729),
    ),
    "carbon-dioxide": Fit(
        230, 480, 4, 0.25,
        (-123.01, -282.83, -160.6, -75.693, -26.331),
        (4747.1, 5452.2, -3735.2, -14759, -16230, -8087.9),
    ),
    "carbon-monoxide": Fit(
        230, 480, 4, 0.25,
        (-8.8768, -65.765, -10.246, 3.3177, -4.4176),
        (2124.4, 1429.1, -198.14, 98.038, -64.444, 58.228),
    ),
    "methane": Fit(
        230, 480, 4, 0.25,
        (-42.91, -113.59, -23.913, -0.42172, -1.5263),
        (2512.4, 3068.2, 1234.2, -2118.2, -2191.1, -340.79),
    ),
    "ethane": Fit(
        230, 480, 4, 0.6,
        (-184.98, -382.83, -136.95, -20.65, -14.778),
        (10231, 2658.6, -100120, -358360, -690830, -632010),
    ),
    "propane": Fit(
        230, 480, 4, 0.25,
        (-390.57, -837.4, -504.29, -174.17, 61.959),
        (19342, -41326, -226760, -285140, -190600, -109340),
    ),
    "n-butane": Fit(
        245, 480, 10, 0.6,
        (-712.4, -1664.8, -1246.7, -580.22, -109.78),
        (-18283, -461180, -1909100, -3504100, -3332300, -1485300),
    ),
    "isobutane": Fit(
        235, 480, 4, 0.25,
        (-630.12, -1390.5, -927.97, -383.42, -71.547),
        (-6848.6, -437890, -1821000, -3452800, -3517600, -1732500),
    ),
    "n-pentane": Fit(
        278, 480, 4, 0.25,
        (-1164.1, -2781.2, -1931.6, 144.06, 889.66),
        (-49562, -667960, -1469300, -3038400, -9205400, -10614000),
    ),
    "isopentane": Fit(
        270, 480, 4, 0.25,
        (-1065, -2619.5, -2429.6, -1354.6, -254.84),
        (44696, -11324, -24876, 8078.3, -3356.3, 5494.7),
    ),
    "ethylene": Fit(
        230, 450, 4, 0.25,
        (-140.06, -294.6, -104.03, -32.168, -19.423),
        (7465.1, 8821, -16477, -50767, -47992, -20347),
    ),
    "propylene": Fit(
        230, 480, 4, 0.25,
        (-347.82, -738.65, -482.67, -233.6, 93.893),
        (16265, -45979, -211870, -175400, 179250, 276000),
    ),
    "1-butene": Fit(
        240, 480, 4, 0.25,
        (-664.27, -1654.2, -1752, -1421.3, -514.71),
        (36909, 33199, 1642.5, 1421.2, -766.1, 741.37),
    ),
    "ammonia": Fit(
        230, 480, 4, 0.25,
        (-254.98, -762.59, -1086.1, -1233.5, -741.53),
        (-1148.4, -108510, -572870, -1082600, -474310, 535310),
    ),
    "hydrogen": Fit(
        230, 480, 4, 0.25,
        (14.541, -5.9234, -2.4538, 1.75, -1.7072),
        (278.49, 45.944, -66.355, 46.251, -27.095, 22.212),
    ),
    "helium": Fit(
        230, 480, 4, 0.25,
        (11.844, 1.2362, -1.4524, 0.9883, -0.89503),
        (106.83, 48.923, -18.642, 9.1303, -5.763, 5.0149),
    ),
    "hydrogen-sulfide": Fit(
        230, 480, 4, 0.25,
        (-185.72, -400.36, -249.32, -117.79, -27.142),
        (3166, 991.76, -864.23, 307.42, -182.01, 155.49),
    ),
    "sulfur-dioxide": Fit(
        239, 480, 4, 0.25,
        (-406.72, -1132.4, -1272.5, -616.48, 360.58),
        (996.52, -91418, -301020, -206790, 215170, 217200),
    ),
    "water": Fit(
        343, 620, 4, 10,
        (-1207.5, -5873.9, -13501, -16626, -8546.8),
        (-4276900, -41131000, -166450000, -352500000, -387560000, -175370000),
    ),
    "dimethyl-ether": Fit(
        230, 480, 18, 1.2,
        (-441.38, -1126, -1291.6, -848.5, 140.11),
        (10189, -125560, -353060, -279970, 121260, 262390),
    ),
    "r134a": Fit(
        230, 455, 6, 1.2,
        (-493.43, -1311.7, -1239.7, -919.23, -650.45),
        (45153, 96600, -36829, -447290, -938020, -919120),
    ),
    "chlorine": Fit(
        230, 480, 5, 0.25,
        (-306.01, -697.63, -468.97, 6.0907, 170.15),
        (1054.6, -41008, -100130, -102090, -48123, 98902),
    ),
    "hydrogen-chloride": Fit(
        230, 480, 11, 1.2,
        (-145.64, -314.56, -249.54, -177.57, 6.0658),
        (7220.7, 483.75, -27606, -28423, -3272.6, 6890.6),
    ),
}  # fmt: skip


def fitted_coefficients(component_id: str, temperature: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Second and third virial coefficient of a pure gas by its fitted polynomials.

    Parameters
    ----------
    component_id : str
        One of the ids of ``FITTED``. [1]
    temperature : array_like, shape (...)
        Temperature, inside the range of the fit; the caller checks it. [K]

    Returns
    -------
    tuple of FloatArray, shape (...)
        B and C. [m3/mol, m6/mol2]

    Notes
    -----
    ::

        x = 298.15 / T - 1,   B = sum b_i x^i,   C = sum c_i x^i        (1)

    References
    ----------
    .. [1] I. H. Bell et al., Ind. Eng. Chem. Res. 53 (2014) 2498-2508: the library whose equations of
       state were fitted.
    """
    (t,) = as_floats(temperature)
    fit = FITTED[component_id]
    x = ORIGIN / t - 1.0  # eq. 1
    second = np.polynomial.polynomial.polyval(x, np.array(fit.b)) * 1e-6
    third = np.polynomial.polynomial.polyval(x, np.array(fit.c)) * 1e-12
    return np.asarray(second), np.asarray(third)
