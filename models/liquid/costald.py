"""Density of a liquid of known composition by COSTALD: at saturation, and under pressure."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from models.arrays import ArrayLike, FloatArray, IntArray, as_floats
from models.components import COMPONENTS, Component
from models.constants import GAS_CONSTANT, ZERO_CELSIUS
from models.errors import DefinitionError
from models.liquid.point import LiquidPoint
from models.saturation import SaturationColumns

# Hankinson and Thomson 1979, eqs. 1 to 3 of ``point``
SPHERICAL = (-1.52816, 1.43907, -0.81446, 0.190454)
DEVIATION = (-0.296123, 0.386914, -0.0427258, -0.0480645)
SINGULAR = 1.00001
# Thomson, Brobst and Hankinson 1982, eqs. 4 to 6 of ``point``
TAIT = (-9.070217, 62.45326, -135.1102)
TAIT_LAST = (4.79594, 0.250047, 1.14188)
TAIT_SLOPE = (0.0861488, 0.0344483)
CRITICAL_COMPRESSION = (0.291, -0.080)
# Range of the reduced temperature in which the saturated volume was fitted
LOWEST_REDUCED, HIGHEST_REDUCED = 0.25, 0.95
# Worst relative departure of the saturated density from the substance's reference equation of state in
# CoolProp 8.0.0, at forty temperatures over the substance's own range
DEPARTURES: dict[str, float] = {
    "nitrogen": 0.001561, "oxygen": 0.003751, "argon": 0.009844, "carbon-dioxide": 0.00733,
    "carbon-monoxide": 0.0122, "methane": 0.003215, "ethane": 0.003403, "propane": 0.001916,
    "n-butane": 0.001393, "isobutane": 0.001422, "n-pentane": 0.00371, "isopentane": 0.004332,
    "n-hexane": 0.004715, "n-heptane": 0.01137, "n-octane": 0.002925, "n-nonane": 0.009517,
    "n-decane": 0.006671, "cyclohexane": 0.005373, "ethylene": 0.005379, "propylene": 0.005806,
    "1-butene": 0.00852, "isobutene": 0.003439, "cis-2-butene": 0.007404, "trans-2-butene": 0.001596,
    "benzene": 0.005637, "toluene": 0.006656, "ethylbenzene": 0.007114, "o-xylene": 0.01241,
    "m-xylene": 0.00647, "p-xylene": 0.002959, "ammonia": 0.02, "hydrogen-sulfide": 0.02371,
    "sulfur-dioxide": 0.02272, "nitrous-oxide": 0.01448, "carbonyl-sulfide": 0.0317,
    "sulfur-hexafluoride": 0.0123, "water": 0.03371, "dimethyl-ether": 0.007405, "r134a": 0.008228,
    "chlorine": 0.01362, "hydrogen-chloride": 0.007273, "methanol": 0.03398, "ethanol": 0.05003,
    "acetone": 0.01481,
}  # fmt: skip
# The same for the worst of the table's hydrocarbons, had each been given by Tc, Pc, ω and M alone
GIVEN_DEPARTURE = 0.02531
# What mixing adds: of the mixtures of the tests propane with a fifth of propylene departs by 0.25 % more than its parts
MIXING_DEPARTURE = 0.003


@dataclass(frozen=True)
class CostaldColumns:
    """Liquids whose density follows from their composition, one row a composition.

    Parameters
    ----------
    molar_mass : FloatArray, shape (rows,)
        Molar mass of the liquid. [kg/mol]
    characteristic_volume : FloatArray, shape (rows,)
        V* of the mixture. [m³/mol]
    critical_temperature : FloatArray, shape (rows,)
        Pseudocritical temperature of the mixture. [K]
    critical_pressure : FloatArray, shape (rows,)
        Pseudocritical pressure of the mixture. [Pa]
    acentric_factor : FloatArray, shape (rows,)
        Acentric factor of the mixture. [1]
    lowest, highest : FloatArray, shape (rows,)
        Range in which the density under pressure is defined. [K]
    departure : FloatArray, shape (rows,)
        Worst relative departure of the components' densities, in proportion to their fractions, and what
        mixing adds. [1]
    estimated : tuple of tuple of str
        Components of each liquid whose V* is their critical volume. [1]
    vapour : SaturationColumns
        Bubble pressures, row by row. [Pa]
    """

    molar_mass: FloatArray
    characteristic_volume: FloatArray
    critical_temperature: FloatArray
    critical_pressure: FloatArray
    acentric_factor: FloatArray
    lowest: FloatArray
    highest: FloatArray
    departure: FloatArray
    estimated: tuple[tuple[str, ...], ...]
    vapour: SaturationColumns

    @classmethod
    def from_compositions(cls, compositions: Sequence[Sequence[tuple[Component, float]]]) -> CostaldColumns:
        """Compile liquids to columns.

        Parameters
        ----------
        compositions : sequence of sequences of (Component, fraction) pairs
            Mole fractions of each liquid; they sum to one. [1]

        Returns
        -------
        CostaldColumns
            One row a liquid. [1]

        Raises
        ------
        DefinitionError
            Fractions that are no whole, a component whose liquid is a quantum one, or water in a mixture.

        Notes
        -----
        Mixing, with the sums over all components::

            V* = ¼ [Σ x V* + 3 (Σ x V*^⅔) (Σ x V*^⅓)]                  (1)
            Tc = [Σ x (V* Tc)^½]² / V*                                  (2)
            ω  = Σ x ω                                                   (3)
            Pc = (0.291 − 0.080 ω) R Tc / V*,  or a pure substance's own   (4)

        Where no V* was published, the critical volume and the acentric factor stand in (common practice).

        References
        ----------
        .. [1] R. W. Hankinson, G. H. Thomson, AIChE J. 25 (1979) 653-663.
        .. [2] G. H. Thomson, K. R. Brobst, R. W. Hankinson, AIChE J. 28 (1982) 671-676.
        """
        vapour = SaturationColumns.from_compositions(compositions, extended=True)
        mixed = np.array([_mixed(composition) for composition in compositions]).reshape(-1, 6)
        molar_mass, volume, temperature, pressure, acentric, departure = mixed.T
        lowest = np.maximum(vapour.lowest, LOWEST_REDUCED * temperature)
        highest = np.minimum(vapour.highest, HIGHEST_REDUCED * temperature)
        estimated = tuple(
            tuple(substance.id for substance, x in composition if x > 0.0 and substance.costald_estimated)
            for composition in compositions
        )
        return cls(molar_mass, volume, temperature, pressure, acentric, lowest, highest, departure, estimated, vapour)

    def reduced_temperature(self, temperature: ArrayLike, row: IntArray | int = 0) -> FloatArray:
        """Temperature relative to the pseudocritical one.

        Parameters
        ----------
        temperature : array_like, shape (...)
            Temperature of the liquid. [K]
        row : IntArray or int, shape (...)
            Which liquid. [1]

        Returns
        -------
        FloatArray, shape (...)
            T/Tc of the mixture. [1]
        """
        (t,) = as_floats(temperature)
        return np.asarray(t / self.critical_temperature[row])

    def saturated(self, temperature: ArrayLike, row: IntArray | int = 0) -> LiquidPoint:
        """The liquid at its bubble pressure; NaN outside 0.25 to 0.95 of the pseudocritical temperature.

        Parameters
        ----------
        temperature : array_like, shape (...)
            Temperature of the liquid. [K]
        row : IntArray or int, shape (...)
            Which liquid. [1]

        Returns
        -------
        LiquidPoint, shape (...)
            Density, its slope along the saturation line, and no slope by pressure. [kg/m³, 1/K, 1/Pa]

        Notes
        -----
        With Tr = T/Tc and s = (1 − Tr)^⅓::

            V0 = 1 − 1.52816 s + 1.43907 s² − 0.81446 s³ + 0.190454 s⁴                              (1)
            Vδ = (−0.296123 + 0.386914 Tr − 0.0427258 Tr² − 0.0480645 Tr³)/(Tr − 1.00001)           (2)
            V  = V* V0 (1 − ω Vδ)                                                                   (3)

        References
        ----------
        .. [1] R. W. Hankinson, G. H. Thomson, AIChE J. 25 (1979) 653-663.
        """
        (t,) = as_floats(temperature)
        critical = self.critical_temperature[row]
        inside = (t >= LOWEST_REDUCED * critical) & (t <= HIGHEST_REDUCED * critical)
        volume, slope = self._saturated(np.where(inside, t / critical, np.nan), row)
        return _point(self.molar_mass[row], volume, slope, np.where(inside, 0.0, np.nan))

    def point(self, temperature: ArrayLike, pressure: ArrayLike, row: IntArray | int = 0) -> LiquidPoint:
        """The liquid under pressure; NaN outside ``lowest`` to ``highest``.

        A pressure below the bubble pressure counts as saturated: no liquid is less dense, and a reading that
        is a little low belongs to a liquid at its boiling point.

        Parameters
        ----------
        temperature : array_like, shape (...)
            Temperature of the liquid. [K]
        pressure : array_like, shape (...)
            Pressure on the liquid. [Pa]
        row : IntArray or int, shape (...)
            Which liquid. [1]

        Returns
        -------
        LiquidPoint, shape (...)
            Density, β at constant pressure, κ, and 1 by a factor beside the density. [kg/m³, 1/K, 1/Pa]

        Notes
        -----
        From the saturated volume Vs and the bubble pressure Ps, with s = (1 − Tr)^⅓::

            e = exp(4.79594 + 0.250047 ω + 1.14188 ω²)                                  (4)
            B = Pc (−1 − 9.070217 s + 62.45326 s² − 135.1102 s³ + e s⁴)                 (5)
            C = 0.0861488 + 0.0344483 ω                                                 (6)
            V = Vs {1 − C ln[(B + P)/(B + Ps)]}                                         (7)

        Ps is that of an ideal solution (Raoult's law); COSTALD has a rule of its own for it, and the two
        differ by less than the method.

        References
        ----------
        .. [1] G. H. Thomson, K. R. Brobst, R. W. Hankinson, AIChE J. 28 (1982) 671-676.
        """
        t, p = as_floats(temperature, pressure)
        t, p, which = np.broadcast_arrays(t, p, np.asarray(row))
        rows = which if np.ndim(row) else row
        inside = (t >= self.lowest[rows]) & (t <= self.highest[rows]) & ~np.isnan(p)
        t = np.where(inside, t, np.nan)
        reduced = self.reduced_temperature(t, rows)
        volume, slope = self._saturated(reduced, rows)
        bubble, bubble_slope = self.vapour.pressure(t, rows)
        stiffness, stiffness_slope = self._stiffness(reduced, rows)
        low, low_slope = stiffness + bubble, stiffness_slope + bubble_slope
        low = np.where(low > 0.0, low, np.nan)  # a strange composition near its end: no logarithm
        excess = np.maximum(p - bubble, 0.0)
        high = low + excess
        constant = TAIT_SLOPE[0] + TAIT_SLOPE[1] * self.acentric_factor[rows]  # eq. 6
        share = 1.0 - constant * np.log1p(excess / low)  # eq. 7
        compressed = p > bubble
        by_temperature = np.where(compressed, stiffness_slope / high - low_slope / low, 0.0)
        compressibility = np.where(compressed, constant / (high * share), np.where(inside, 0.0, np.nan))
        return _point(self.molar_mass[rows], volume * share, slope - constant * by_temperature / share, compressibility)

    def _saturated(self, reduced: FloatArray, row: IntArray | int) -> tuple[FloatArray, FloatArray]:
        """Saturated volume and its slope ∂ln V/∂T along the saturation line. [m³/mol, 1/K]"""
        s = np.cbrt(1.0 - reduced)
        acentric = self.acentric_factor[row]
        first, second, third, fourth = SPHERICAL
        spherical = 1.0 + s * (first + s * (second + s * (third + s * fourth)))  # eq. 1
        spherical_slope = -(first / s + 2.0 * second + s * (3.0 * third + s * 4.0 * fourth)) / (3.0 * s)
        a, b, c, d = DEVIATION
        below = reduced - SINGULAR
        deviation = (a + reduced * (b + reduced * (c + reduced * d))) / below  # eq. 2
        deviation_slope = (b + reduced * (2.0 * c + reduced * 3.0 * d) - deviation) / below
        share = 1.0 - acentric * deviation
        volume = self.characteristic_volume[row] * spherical * share  # eq. 3
        slope = spherical_slope / spherical - acentric * deviation_slope / share
        return volume, slope / self.critical_temperature[row]

    def _stiffness(self, reduced: FloatArray, row: IntArray | int) -> tuple[FloatArray, FloatArray]:
        """B of eq. 5 and its slope by temperature. [Pa, Pa/K]"""
        s = np.cbrt(1.0 - reduced)
        acentric, critical = self.acentric_factor[row], self.critical_pressure[row]
        first, second, third = TAIT
        fourth = np.exp(TAIT_LAST[0] + acentric * (TAIT_LAST[1] + acentric * TAIT_LAST[2]))  # eq. 4
        series = -1.0 + s * (first + s * (second + s * (third + s * fourth)))  # eq. 5
        slope = -(first / s + 2.0 * second + s * (3.0 * third + s * 4.0 * fourth)) / (3.0 * s)
        return critical * series, critical * slope / self.critical_temperature[row]

    def why_outside(self, row: int, temperature: float) -> str:
        """Why a temperature has no density; nothing where it has one.

        Parameters
        ----------
        row : int
            Which liquid. [1]
        temperature : float
            Temperature of the liquid. [K]

        Returns
        -------
        str
            One sentence with the value, the limits and the way out, or nothing. [1]
        """
        low, high = float(self.lowest[row]), float(self.highest[row])
        if low <= temperature <= high:
            stiffness, _ = self._stiffness(self.reduced_temperature(temperature, row), row)
            if stiffness + self.vapour.pressure(temperature, row)[0] > 0.0:
                return ""
            return (
                f"the liquid temperature is {temperature - ZERO_CELSIUS:.2f} °C, where COSTALD finds this composition"
                " without resistance to pressure; its components are too unlike each other, declare a density_table"
            )
        critical = float(self.critical_temperature[row])
        upper = f"{HIGHEST_REDUCED:g} of its pseudocritical {critical - ZERO_CELSIUS:.1f} °C"
        lower = (
            f"{LOWEST_REDUCED:g} of that in kelvin"
            if low <= LOWEST_REDUCED * critical
            else "where its vapour pressure begins"
        )
        return (
            f"the liquid temperature is {temperature - ZERO_CELSIUS:.2f} °C; COSTALD describes this composition from"
            f" {low - ZERO_CELSIUS:.1f} to {high - ZERO_CELSIUS:.1f} °C ({lower} to {upper});"
            " a density_table reaches further"
        )

    def working(self, row: int, temperature: float, pressure: float) -> dict[str, float]:
        """Every number between a composition and its density, for an auditor who redoes it by hand.

        Parameters
        ----------
        row : int
            Which liquid. [1]
        temperature : float
            Temperature of the liquid. [K]
        pressure : float
            Pressure on the liquid. [Pa]

        Returns
        -------
        dict of float
            The symbols of ``saturated`` and ``point``: M, V*, Tc, omega, Pc, Tr, V0, Vdelta, Vs, Ps, B, C, V
            and rho. [SI]
        """
        at = self.reduced_temperature(temperature, row)
        volume = float(self._saturated(at, row)[0])
        s, acentric = float(np.cbrt(1.0 - at)), float(self.acentric_factor[row])
        spherical = 1.0 + float(np.polynomial.polynomial.polyval(s, (0.0, *SPHERICAL)))
        deviation = float(np.polynomial.polynomial.polyval(at, DEVIATION) / (at - SINGULAR))
        density = float(self.point(temperature, pressure, row).density)
        return {
            "M": float(self.molar_mass[row]), "V*": float(self.characteristic_volume[row]),
            "Tc": float(self.critical_temperature[row]), "omega": acentric,
            "Pc": float(self.critical_pressure[row]), "Tr": float(at), "V0": spherical, "Vdelta": deviation,
            "Vs": volume, "Ps": float(self.vapour.pressure(temperature, row)[0]),
            "B": float(self._stiffness(at, row)[0]), "C": TAIT_SLOPE[0] + TAIT_SLOPE[1] * acentric,
            "V": float(self.molar_mass[row]) / density, "rho": density,
        }  # fmt: skip


def _point(mass: FloatArray, volume: FloatArray, slope: FloatArray, compressibility: FloatArray) -> LiquidPoint:
    """A point of a molar volume with its logarithmic slopes."""
    return LiquidPoint(
        np.asarray(mass / volume), np.asarray(slope), np.asarray(compressibility), np.asarray(volume / volume)
    )


def _mixed(composition: Sequence[tuple[Component, float]]) -> tuple[float, ...]:
    """Molar mass, V*, Tc, Pc, ω and departure of a mixture. [kg/mol, m³/mol, K, Pa, 1, 1]"""
    present = [(substance, x) for substance, x in composition if x > 0.0]
    for substance, _ in present:
        if substance.quantum:
            raise DefinitionError(
                f"COSTALD does not describe liquid {substance.name}, a quantum liquid; leave its trace out or"
                " declare a density_table",
                field="components",
            )
        if substance.family == "water" and len(present) > 1:
            raise DefinitionError(
                "COSTALD does not describe water mixed with other components; state it as free water or as"
                " sediment_and_water, or declare a density_table",
                field="components",
            )
    total = sum(x for _, x in present)
    x = np.array([fraction / total for _, fraction in present])
    volumes, acentrics = np.array([substance.costald for substance, _ in present]).T
    temperatures = np.array([substance.critical_temperature for substance, _ in present])
    masses = np.array([substance.molar_mass for substance, _ in present])
    root = np.cbrt(volumes)
    volume = 0.25 * (x @ volumes + 3.0 * (x @ root**2) * (x @ root))  # eq. 1
    temperature = (x @ np.sqrt(volumes * temperatures)) ** 2 / volume  # eq. 2
    acentric = x @ acentrics  # eq. 3
    if len(present) == 1:
        pressure = present[0][0].critical_pressure
    else:
        compression = CRITICAL_COMPRESSION[0] + CRITICAL_COMPRESSION[1] * acentric
        pressure = compression * GAS_CONSTANT * temperature / volume  # eq. 4
    departure = x @ np.array([_departure(substance) for substance, _ in present])
    departure += MIXING_DEPARTURE if len(present) > 1 else 0.0
    return float(x @ masses), float(volume), float(temperature), float(pressure), float(acentric), float(departure)


def _departure(substance: Component) -> float:
    """Worst relative departure of a component's density; one given in full is taken as a hydrocarbon. [1]"""
    known = COMPONENTS.get(substance.id) == substance
    return DEPARTURES[substance.id] if known else GIVEN_DEPARTURE
