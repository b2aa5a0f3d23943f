"""Vapour pressure of pure substances, the bubble pressure of liquid mixtures and the dew pressure of vapours.

The constants were fitted for this project to the saturation lines of the reference equations of state in
CoolProp 8.0.0 (HEOS); the range and the worst departure from those lines stand beside each.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from models.arrays import ArrayLike, BoolArray, FloatArray, IntArray, as_floats
from models.components import Component, component
from models.errors import DefinitionError

AMBROSE_WALTON = (
    (-5.97616, 1.29874, -0.60394, -1.06841),
    (-5.03365, 1.11505, -5.41217, -7.46628),
    (-0.64771, 2.41539, -4.26979, 3.25259),
)
AMBROSE_WALTON_LOWEST = 0.5  # reduced temperature
AMBROSE_WALTON_DEPARTURE = 0.01  # of nonpolar hydrocarbons, 250 to 350 K, against CoolProp 8.0.0
# Raoult's law of a mixture, one standard uncertainty: shares of the spread of its components' pressures, of the
# spread squared, and of the chance that two molecules are unlike. Twice this covers the worst of twenty mixtures of
# light hydrocarbons, carbon dioxide and nitrogen from 10 to 45 °C, bubble and dew, against CoolProp 8.0.0.
IDEAL_BY_SPREAD, IDEAL_BY_SPREAD_SQUARED, IDEAL_BY_UNLIKE = 0.07, 0.035, 0.01
IDEAL_REDUCED_TEMPERATURE = 0.8  # of the components' mean critical temperature, where the spread is taken
TEMPERATURE_STEPS = 40  # at most; five to seven are usual
TEMPERATURE_TOLERANCE = 1e-13  # relative

# lowest T/K, highest T/K, four constants, worst relative departure from the reference equation
WAGNER: dict[str, tuple[float, float, float, float, float, float, float]] = {
    "nitrogen": (64, 126.192, -6.12437, 1.26303, -0.7648, -1.78389, 3.306e-05),
    "oxygen": (70, 154.581, -6.05413, 1.24209, -0.639384, -1.60223, 4.413e-05),
    "argon": (84, 150.687, -5.92557, 1.21124, -0.524271, -1.55741, 1.67e-05),
    "carbon-dioxide": (217, 304.1282, -7.02713, 1.52892, -2.24611, -2.70103, 5.504e-05),
    "carbon-monoxide": (69, 132.86, -6.07161, 0.931612, -0.340623, -3.02048, 0.001212),
    "methane": (91, 190.564, -6.02577, 1.27458, -0.580222, -1.35647, 4.887e-05),
    "ethane": (138, 305.322, -6.48123, 1.4196, -1.14409, -1.91622, 0.0001201),
    "propane": (167, 369.89, -6.75952, 1.53341, -1.53386, -2.24951, 0.0001533),
    "n-butane": (192, 425.125, -7.07931, 1.772, -1.96787, -2.35683, 0.0001797),
    "isobutane": (184, 407.81, -6.89398, 1.53441, -1.73176, -2.54328, 0.0003423),
    "n-pentane": (212, 469.7, -7.30054, 1.77426, -2.25631, -2.65172, 0.000283),
    "isopentane": (208, 460.35, -7.19802, 1.78482, -2.15039, -2.54896, 0.0001485),
    "n-hexane": (229, 507.82, -7.59964, 1.98003, -2.71732, -2.97671, 0.000387),
    "n-heptane": (244, 523.383, -7.73891, 1.77477, -2.75193, -3.62656, 0.0009392),
    "n-octane": (244, 568.74, -8.08853, 2.15757, -3.49095, -3.43289, 0.0007096),
    "n-nonane": (244, 594.55, -8.44431, 2.58486, -4.24318, -3.42959, 0.0006177),
    "n-decane": (244, 617.7, -8.6785, 2.70242, -4.67638, -3.51511, 0.0008913),
    "cyclohexane": (280, 553.6, -7.05351, 1.70289, -2.14728, -3.05429, 0.0002371),
    "ethylene": (128, 282.35, -6.38878, 1.37421, -1.12014, -2.15399, 0.0001255),
    "propylene": (164, 364.211, -6.71639, 1.50032, -1.48054, -2.41404, 0.000132),
    "1-butene": (189, 419.29, -7.09925, 1.95398, -2.15892, -2.39906, 0.0001478),
    "isobutene": (189, 418.09, -6.89611, 1.37278, -1.47024, -3.08492, 0.001458),
    "cis-2-butene": (197, 435.75, -6.87274, 1.163, -1.21819, -3.68619, 0.002534),
    "trans-2-butene": (193, 428.61, -7.40091, 2.54362, -2.90879, -1.35433, 0.002062),
    "benzene": (279, 562.02, -7.13011, 1.84097, -2.16766, -3.40279, 0.0001801),
    "toluene": (244, 591.75, -7.47104, 1.99928, -2.43548, -3.04207, 0.0006498),
    "ethylbenzene": (244, 617.12, -7.81132, 2.47438, -3.2414, -2.71343, 0.000511),
    "o-xylene": (248, 630.259, -7.63738, 1.87357, -2.52558, -3.09537, 0.001816),
    "m-xylene": (244, 616.89, -7.66892, 1.79629, -2.52679, -3.11633, 0.0007772),
    "p-xylene": (287, 616.168, -7.81118, 2.0971, -2.59567, -3.36223, 0.00116),
    "ammonia": (196, 405.56, -7.28068, 1.58016, -1.90589, -2.23437, 0.0003505),
    "hydrogen": (15, 33.145, -4.89593, 1.04189, 0.774512, 0, 0.0001766),
    "helium": (2.4, 5.1953, -4.10751, 1.13465, 1.04329, 0.271867, 0.000198),
    "neon": (24.6, 44.4, -5.79167, 1.16408, -0.111014, -1.20923, 9.088e-05),
    "hydrogen-sulfide": (188, 373.1, -6.52008, 1.57018, -1.4395, -1.876, 0.0003345),
    "sulfur-dioxide": (198, 430.64, -7.26556, 1.66816, -2.27715, -2.77332, 0.0002162),
    "nitrous-oxide": (183, 309.52, -6.81393, 1.66115, -1.97002, -1.9992, 0.0003018),
    "carbonyl-sulfide": (171, 378.77, -6.55433, 1.68173, -1.51134, -1.85534, 0.0006633),
    "sulfur-hexafluoride": (224, 318.7232, -7.08793, 1.61994, -2.00115, -2.07076, 4.737e-05),
    "water": (273.16, 647.096, -7.88334, 1.94766, -2.36633, -2.00368, 0.0004899),
    "dimethyl-ether": (181, 400.378, -7.08034, 1.86536, -2.12172, -2.39569, 0.0001857),
    "r134a": (170, 374.21, -7.65207, 1.80566, -2.66861, -3.3138, 0.0002564),
    "chlorine": (188, 416.8654, -6.05002, 0.897554, -1.05697, -1.89, 0.0006049),
    "hydrogen-chloride": (160, 324.68, -6.75323, 1.61453, -1.112, -2.09124, 0.0004904),
    "methanol": (232, 513.38, -8.80829, 1.73682, -3.24604, 0, 0.002112),
    "ethanol": (232, 514.71, -8.63291, 0.904614, -4.30647, 0.846163, 0.00266),
    "acetone": (229, 508.1, -7.67173, 1.97523, -2.475, -2.81331, 0.0004737),
}  # fmt: skip


@dataclass(frozen=True)
class SaturationColumns:
    """Liquids and vapours whose saturation pressure can be computed, one row a composition.

    Parameters
    ----------
    fractions : FloatArray, shape (rows, k)
        Mole fractions in the phase that the row is, padded with zeros. [1]
    vapour : BoolArray, shape (rows,)
        True where the composition is that of the vapour, which has a dew pressure. [1]
    critical_temperature, log_critical_pressure : FloatArray, shape (rows, k)
        Critical point of each component. [K, ln Pa]
    constants : FloatArray, shape (rows, k, 4)
        Constants of the vapour-pressure equation. [1]
    lowest, highest : FloatArray, shape (rows,)
        Range in which every component has a vapour pressure. [K]
    departure : FloatArray, shape (rows,)
        Relative departure: the worst of the constants from their source, and of a mixture Raoult's law. [1]
    """

    fractions: FloatArray
    vapour: BoolArray
    critical_temperature: FloatArray
    log_critical_pressure: FloatArray
    constants: FloatArray
    lowest: FloatArray
    highest: FloatArray
    departure: FloatArray

    @classmethod
    def from_compositions(
        cls,
        compositions: Sequence[Mapping[str, float] | Sequence[tuple[Component, float]]],
        vapours: Sequence[bool] | None = None,
        *,
        extended: bool = False,
    ) -> SaturationColumns:
        """Compile liquids and vapours to columns.

        Parameters
        ----------
        compositions : sequence of mappings from component id, or of (Component, fraction) pairs
            Mole fractions of each liquid or vapour; they sum to one. [1]
        vapours : sequence of bool or None
            Which compositions are those of a vapour; left out, all are liquids. [1]
        extended : bool
            Whether each curve continues to the range of the mixture's other components: rough, for where
            the pressure is only a small part of the answer. [1]

        Returns
        -------
        SaturationColumns
            One row a composition. [1]
        """
        mixtures = [_pairs(composition) for composition in compositions]
        width = max((len(mixture) for mixture in mixtures), default=1)
        rows = len(mixtures)
        fractions, log_pressure = np.zeros((rows, width)), np.zeros((rows, width))
        critical, constants = np.ones((rows, width)), np.zeros((rows, width, 4))
        lowest, highest, departure = np.zeros(rows), np.zeros(rows), np.zeros(rows)
        for i, mixture in enumerate(mixtures):
            for j, (substance, fraction) in enumerate(mixture):
                _, _, *four, worst = wagner_constants(substance)
                fractions[i, j], constants[i, j] = fraction, four
                critical[i, j] = substance.critical_temperature
                log_pressure[i, j] = np.log(substance.critical_pressure)
                departure[i] = max(departure[i], worst)
            ranges = [wagner_constants(substance)[:2] for substance, _ in mixture]
            outer, inner = (min, max) if extended else (max, min)
            lowest[i] = outer(low for low, _ in ranges)
            highest[i] = inner(high for _, high in ranges)
        vapour = np.zeros(rows, dtype=np.bool_) if vapours is None else np.array(vapours, dtype=np.bool_)
        if vapour.shape != (rows,):
            raise DefinitionError(f"{rows} compositions have {vapour.size} phases; each has one", field="components")
        columns = cls(fractions, vapour, critical, log_pressure, constants, lowest, highest, departure)
        return replace(columns, departure=departure + columns._ideal_departure())

    def _ideal_departure(self) -> FloatArray:
        """Standard uncertainty of Raoult's law, from how unlike the components' pressures P_i are. [1]

        With the fractions z of the vapour and x of the row, s = Σ z_i |ln P_i/P|: 0.07 s + 0.035 s² + 0.01 (1 − Σ x²).
        A pure substance has none.
        """
        x = self.fractions
        critical = np.sum(x * self.critical_temperature, axis=1)
        t = np.clip(IDEAL_REDUCED_TEMPERATURE * critical, self.lowest, self.highest)
        rows = np.arange(len(t))
        pressures = np.stack([self._component(t, rows, k)[0] for k in range(x.shape[1])], axis=1)
        bubble, dew = np.sum(x * pressures, axis=1), 1.0 / np.sum(x / pressures, axis=1)
        total = np.where(self.vapour, dew, bubble)[:, None]
        above = np.where(self.vapour[:, None], x, x * pressures / total)
        spread = np.sum(above * np.abs(np.log(pressures / total)), axis=1)
        unlike = 1.0 - np.sum(x * x, axis=1)
        return np.asarray((IDEAL_BY_SPREAD + IDEAL_BY_SPREAD_SQUARED * spread) * spread + IDEAL_BY_UNLIKE * unlike)

    def pressure(self, temperature: ArrayLike, row: IntArray | int = 0) -> tuple[FloatArray, FloatArray]:
        """Bubble pressure of a liquid or dew pressure of a vapour, and its slope; NaN outside the constants' range.

        Parameters
        ----------
        temperature : array_like, shape (...)
            Temperature. [K]
        row : IntArray or int, shape (...)
            Which composition. [1]

        Returns
        -------
        tuple of FloatArray, shape (...)
            Pressure and its derivative by temperature. [Pa, Pa/K]

        Notes
        -----
        With tau = 1 - T/Tc of each component, and both phases taken as ideal (Raoult's law)::

            ln(P_i/Pc) = (a tau + b tau^1.5 + c tau^2.5 + d tau^5) Tc/T        (1)
            P = sum x_i P_i             of a liquid                            (2)
            1/P = sum y_i/P_i           of a vapour                            (3)

        Of an extended mixture, a component above its critical temperature keeps the first term of eq. 1,
        which is straight in ln P against 1/T and as steep as the curve where it ends.

        References
        ----------
        .. [1] W. Wagner, Cryogenics 13 (1973) 470-482; the exponents of D. Ambrose, J. Chem. Thermodyn.
           18 (1986) 45-51 (from memory).
        .. [2] J. M. Smith, H. C. Van Ness, M. M. Abbott, "Introduction to Chemical Engineering
           Thermodynamics", 7th ed., McGraw-Hill, 2005, eqs. 10.2 and 10.3 (from memory).
        """
        (t,) = as_floats(temperature)
        t, which = np.broadcast_arrays(t, np.asarray(row))
        inside = self.inside(t, which if np.ndim(row) else row)
        safe = np.where(inside, t, self.lowest[which])
        if np.ndim(row) == 0:
            which = np.asarray(row)
        total, slope = np.zeros(t.shape), np.zeros(t.shape)
        dew = self.vapour[which] if self.vapour.any() else None
        for k in range(self.fractions.shape[1]):
            part, part_slope = self._component(safe, which, k)
            if dew is not None:  # eq. 3 is eq. 2 of the inverses
                part, part_slope = _inverse_where(dew, part, part_slope)
            total += self.fractions[which, k] * part  # eq. 2
            slope += self.fractions[which, k] * part_slope
        if dew is not None:
            total, slope = _inverse_where(dew, total, slope)
        return np.where(inside, total, np.nan), np.where(inside, slope, np.nan)

    def _component(self, t: FloatArray, row: IntArray, k: int) -> tuple[FloatArray, FloatArray]:
        """Vapour pressure and slope of the k-th component of each row, by eq. 1 of ``pressure``."""
        a, b, c, d = (self.constants[row, k, i] for i in range(4))
        critical = self.critical_temperature[row, k]
        reduced = t / critical
        tau = 1.0 - reduced
        below = np.maximum(tau, 0.0)  # nothing but the first term above the critical temperature
        root = np.sqrt(below)
        tau2 = below * below
        series = tau * (a + root * b + below * root * c + tau2 * tau2 * d)
        series_slope = a + 1.5 * root * b + 2.5 * below * root * c + 5.0 * tau2 * tau2 * d  # by tau
        pressure = np.exp(self.log_critical_pressure[row, k] + series / reduced)  # eq. 1
        return pressure, -pressure * (series_slope + series / reduced) / t

    def vapour_fractions(self, temperature: ArrayLike, row: int = 0) -> FloatArray:
        """Composition of the vapour in equilibrium with a liquid, by Raoult's law; a vapour's is its own.

        Parameters
        ----------
        temperature : array_like, shape (...)
            Temperature. [K]
        row : int
            Which composition. [1]

        Returns
        -------
        FloatArray, shape (..., k)
            Mole fractions in the vapour, in the composition's order of components. [1]

        Notes
        -----
        ``y_i = x_i P_i / P``        (1)

        References
        ----------
        .. [1] J. M. Smith, H. C. Van Ness, M. M. Abbott, "Introduction to Chemical Engineering
           Thermodynamics", 7th ed., McGraw-Hill, 2005, ch. 10 (from memory).
        """
        (t,) = as_floats(temperature)
        safe = np.where(self.inside(t, row), t, np.nan)
        which = np.asarray(row)
        if self.vapour[row]:
            return np.asarray(np.where(np.isnan(safe)[..., None], np.nan, self.fractions[row]))
        parts = [self.fractions[row, k] * self._component(safe, which, k)[0] for k in range(self.fractions.shape[1])]
        stacked = np.stack(parts, axis=-1)
        return np.asarray(stacked / stacked.sum(axis=-1, keepdims=True))  # eq. 1

    def inside(self, temperature: ArrayLike, row: IntArray | int = 0) -> BoolArray:
        """Where the vapour pressure is defined; a NaN is outside.

        Parameters
        ----------
        temperature : array_like, shape (...)
            Temperature. [K]
        row : IntArray or int, shape (...)
            Which composition. [1]

        Returns
        -------
        BoolArray, shape (...)
            True inside the range of the constants. [1]
        """
        (t,) = as_floats(temperature)
        return np.asarray((t >= self.lowest[row]) & (t <= self.highest[row]))

    def temperature(self, pressure: ArrayLike, row: IntArray | int = 0) -> FloatArray:
        """Bubble or dew temperature; NaN for a pressure beyond the range of the constants.

        Parameters
        ----------
        pressure : array_like, shape (...)
            Pressure. [Pa]
        row : IntArray or int, shape (...)
            Which composition. [1]

        Returns
        -------
        FloatArray, shape (...)
            Temperature at which the liquid boils, or the vapour condenses, at this pressure. [K]

        Notes
        -----
        Newton's method in ln P against 1/T, where the curve is nearly straight, inside a bracket that
        each evaluation narrows.
        """
        (p,) = as_floats(pressure)
        p, which = np.broadcast_arrays(p, np.asarray(row))
        if np.ndim(row) == 0:
            which = np.asarray(row)
        low, high = self.lowest[which] + np.zeros(p.shape), self.highest[which] + np.zeros(p.shape)
        inside = (p >= self.pressure(low, row)[0]) & (p <= self.pressure(high, row)[0])
        goal = np.log(np.where(inside, p, self.pressure(low, row)[0]))
        t = 2.0 * low * high / (low + high)
        for _ in range(TEMPERATURE_STEPS):
            value, slope = self.pressure(t, row)
            gap = np.log(value) - goal
            low, high = np.where(gap < 0.0, t, low), np.where(gap < 0.0, high, t)
            inverse = 1.0 / t + gap * value / (slope * t * t)  # d ln P / d(1/T) = -T^2 slope / P
            newton = 1.0 / np.where(inverse > 0.0, inverse, 1.0)
            following = np.where((newton >= low) & (newton <= high), newton, 0.5 * (low + high))
            moved = np.abs(following - t)
            t = following
            if not np.any(moved > TEMPERATURE_TOLERANCE * t):
                break
        return np.where(inside, t, np.nan)


def _inverse_where(mask: BoolArray, value: FloatArray, slope: FloatArray) -> tuple[FloatArray, FloatArray]:
    """A value and its slope, or those of its inverse where the mask is true."""
    inverse = 1.0 / value
    return np.where(mask, inverse, value), np.where(mask, -slope * inverse * inverse, slope)


def _pairs(
    composition: Mapping[str, float] | Sequence[tuple[Component, float]],
) -> list[tuple[Component, float]]:
    """A composition as pairs of substance and mole fraction, without those that are absent."""
    if isinstance(composition, Mapping):
        pairs = [(component(name), fraction) for name, fraction in composition.items()]
    else:
        pairs = list(composition)
    total = sum(fraction for _, fraction in pairs)
    if not abs(total - 1.0) <= 1e-6 or any(not 0.0 <= fraction <= 1.0 for _, fraction in pairs):
        raise DefinitionError(f"mole fractions sum to {total}; they are 0 to 1 and sum to one", field="components")
    return [(substance, fraction / total) for substance, fraction in pairs if fraction > 0.0]


def wagner_constants(substance: Component) -> tuple[float, ...]:
    """Range, four constants and worst departure of the vapour-pressure equation of a substance.

    Parameters
    ----------
    substance : Component
        A substance of the table, or one given in full. [1]

    Returns
    -------
    tuple of float
        Lowest and highest temperature, a, b, c, d, relative departure. [K, K, 1, 1, 1, 1, 1]

    Notes
    -----
    A substance that is not in the table takes the constants of corresponding states, good for nonpolar
    ones only (27 to 38 % off for alcohols and water)::

        ln(P/Pc) = f0 + omega f1 + omega^2 f2        (1)

    References
    ----------
    .. [1] D. Ambrose, J. Walton, Pure Appl. Chem. 61 (1989) 1395-1403 (from memory).
    """
    known = WAGNER.get(substance.id) if substance == _in_table(substance.id) else None
    if known is not None:
        return known
    omega = substance.acentric_factor
    f0, f1, f2 = (np.array(f) for f in AMBROSE_WALTON)
    constants = f0 + omega * f1 + omega**2 * f2  # eq. 1
    critical = substance.critical_temperature
    return (
        AMBROSE_WALTON_LOWEST * critical, critical, *(float(c) for c in constants), AMBROSE_WALTON_DEPARTURE,
    )  # fmt: skip


def _in_table(component_id: str) -> Component | None:
    """The table's own substance of this id."""
    return component(component_id) if component_id in WAGNER else None


def vapour_pressure(temperature: ArrayLike, component_id: str) -> FloatArray:
    """Vapour pressure of a pure substance; NaN outside the range of its constants.

    Parameters
    ----------
    temperature : array_like, shape (...)
        Temperature. [K]
    component_id : str
        One of the ids of ``COMPONENTS``. [1]

    Returns
    -------
    FloatArray, shape (...)
        Vapour pressure. [Pa]

    References
    ----------
    .. [1] ``SaturationColumns.pressure``; constants fitted to CoolProp 8.0.0 (HEOS).
    """
    return SaturationColumns.from_compositions([{component_id: 1.0}]).pressure(temperature)[0]


def saturation_temperature(pressure: ArrayLike, component_id: str) -> FloatArray:
    """Temperature at which a pure substance boils; NaN outside the range of its constants.

    Parameters
    ----------
    pressure : array_like, shape (...)
        Pressure. [Pa]
    component_id : str
        One of the ids of ``COMPONENTS``. [1]

    Returns
    -------
    FloatArray, shape (...)
        Saturation temperature. [K]

    References
    ----------
    .. [1] ``SaturationColumns.temperature``; constants fitted to CoolProp 8.0.0 (HEOS).
    """
    return SaturationColumns.from_compositions([{component_id: 1.0}]).temperature(pressure)
