"""Light hydrocarbons at their saturation pressure: the volume's factor between a temperature and 60 °F."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from models.arrays import ArrayLike, BoolArray, FloatArray, IntArray, as_floats

__all__ = [
    "CRITICAL_TEMPERATURE",
    "FLUIDS",
    "HIGHEST_RELATIVE_DENSITY",
    "HIGHEST_TEMPERATURE",
    "LOWEST_RELATIVE_DENSITY",
    "LOWEST_TEMPERATURE",
    "RELATIVE_DENSITY",
    "ROUNDING",
    "TEMPERATURE_60F",
    "Saturated",
    "between",
    "correct",
    "least_relative_density",
    "reaches",
]

# The reference fluids of GPA TP-27 (2007) = API MPMS 11.2.4, whose table of constants five public copies
# give alike: relative density at 60 °F, critical temperature [K], critical compressibility, critical density
# [kmol/m3], and k1 to k4 of eq. 4.
_REFERENCE = (
    ("EE(68/32)", 0.325022, 298.11, 0.27998, 6.25, 2.54616855327, -0.058244177754, 0.803398090807, -0.745720314137),
    ("ethane", 0.355994, 305.33, 0.2822, 6.87, 1.8911304261, -0.370305782347, -0.54486728872, 0.337876634952),
    ("EP(65/35)", 0.429277, 333.67, 0.2806, 5.615, 2.20970078464, -0.294253708172, -0.405754420098, 0.319443433421),
    ("EP(35/65)", 0.470381, 352.46, 0.2793, 5.11, 2.2534198132, -0.266542138024, -0.372756711655, 0.384734185665),
    ("propane", 0.507025, 369.78, 0.27626, 5.0, 1.96568366933, -0.327662435541, -0.417979702538, 0.303271602831),
    ("i-butane", 0.562827, 407.85, 0.28326, 3.86, 2.0474803441, -0.289734363425, -0.330345036434, 0.291757103132),
    ("n-butane", 0.584127, 425.16, 0.27536, 3.92, 2.03734743118, -0.299059145695, -0.418883095671, 0.380367738748),
    ("i-pentane", 0.624285, 460.44, 0.27026, 3.247, 2.06541640707, -0.23836620884, -0.161440492247, 0.258681568613),
    ("n-pentane", 0.631054, 469.65, 0.27235, 3.2, 2.11263474494, -0.26126941356, -0.291923445075, 0.308344290017),
    ("i-hexane", 0.657167, 498.05, 0.26706, 2.727, 2.02382197871, -0.423550090067, -1.15281098257, 0.950139001678),
    ("n-hexane", 0.664064, 507.35, 0.26762, 2.704, 2.17134547773, -0.232997313405, -0.267019794036, 0.378629524102),
    ("n-heptane", 0.688039, 540.15, 0.26312, 2.315, 2.19773533433, -0.275056764147, -0.447144095029, 0.493770995799),
)
_POWER, _POWER_BELOW = 0.35, 0.65  # of 1 − Tr in eq. 4, same source
TEMPERATURE_60F = 519.67 / 1.8  # K, exact

# The standard's limits: 0.3500 to 0.6880, −50.8 to 199.4 °F.
LOWEST_RELATIVE_DENSITY, HIGHEST_RELATIVE_DENSITY = 0.35, 0.688
LOWEST_TEMPERATURE, HIGHEST_TEMPERATURE = 227.15, 366.15  # K
ROUNDING = 1e-9  # a limit given in other units may fall this far outside, relative

FLUIDS = tuple(row[0] for row in _REFERENCE)
_COLUMNS = np.array([row[1:] for row in _REFERENCE], dtype=np.float64).T
RELATIVE_DENSITY, CRITICAL_TEMPERATURE, _CRITICAL_COMPRESSIBILITY, _CRITICAL_DENSITY = _COLUMNS[:4]
_SERIES = _COLUMNS[4:]


@dataclass(frozen=True)
class Saturated:
    """The correction to 60 °F with the quantities it is made of; 1 and 2 are the fluids below and above.

    Parameters
    ----------
    first, second : IntArray, shape (...)
        Positions of the two reference fluids in :data:`FLUIDS`. [1]
    share : FloatArray, shape (...)
        δ, place between fluid 1 and fluid 2. [1]
    critical_temperature : FloatArray, shape (...)
        Tc of the liquid. [K]
    reduced_temperature, reduced_temperature_60f : FloatArray, shape (...)
        Tr at the temperature and at 60 °F. [1]
    scale : FloatArray, shape (...)
        h2, which scales the density of fluid 2. [1]
    density_first, density_second : FloatArray, shape (...)
        Saturation densities of the reference fluids at Tr. [kmol/m³]
    density_first_60f, density_second_60f : FloatArray, shape (...)
        The same at Tr of 60 °F. [kmol/m³]
    mixed, mixed_60f : FloatArray, shape (...)
        X, the density between the two, at Tr and at Tr of 60 °F. [kmol/m³]
    factor : FloatArray, shape (...)
        CTL, volume at 60 °F over volume at the temperature. [1]
    by_temperature : FloatArray, shape (...)
        ∂ln CTL/∂T. [1/K]
    by_relative_density : FloatArray, shape (...)
        ∂ln CTL/∂ln γ. [1]
    """

    first: IntArray
    second: IntArray
    share: FloatArray
    critical_temperature: FloatArray
    reduced_temperature: FloatArray
    reduced_temperature_60f: FloatArray
    scale: FloatArray
    density_first: FloatArray
    density_second: FloatArray
    density_first_60f: FloatArray
    density_second_60f: FloatArray
    mixed: FloatArray
    mixed_60f: FloatArray
    factor: FloatArray
    by_temperature: FloatArray
    by_relative_density: FloatArray


def reaches(relative_density: ArrayLike, temperature: ArrayLike) -> BoolArray:
    """Where the standard's tables reach, liquid or not.

    Parameters
    ----------
    relative_density : array_like, shape (...)
        Relative density at 60 °F. [1]
    temperature : array_like, shape (...)
        Temperature. [K]

    Returns
    -------
    BoolArray, shape (...)
        True within both ranges. [1]
    """
    gamma, t = as_floats(relative_density, temperature)
    more, less = 1.0 + ROUNDING, 1.0 - ROUNDING
    dense = (gamma >= LOWEST_RELATIVE_DENSITY * less) & (gamma <= HIGHEST_RELATIVE_DENSITY * more)
    return np.asarray(dense & (t >= LOWEST_TEMPERATURE * less) & (t <= HIGHEST_TEMPERATURE * more))


def least_relative_density(temperature: ArrayLike) -> FloatArray:
    """Relative density of the liquid whose critical temperature this is: below it there is none.

    Parameters
    ----------
    temperature : array_like, shape (...)
        Temperature. [K]

    Returns
    -------
    FloatArray, shape (...)
        Relative density at 60 °F, that of the lightest fluid where every fluid is below its critical point. [1]

    Notes
    -----
    The inverse of eq. 2 of :func:`correct`, a line between each two fluids.

    References
    ----------
    .. [1] GPA TP-27 / API MPMS 11.2.4, 2007.
    """
    (t,) = as_floats(temperature)
    return np.asarray(np.interp(t, CRITICAL_TEMPERATURE, RELATIVE_DENSITY))


def between(relative_density: ArrayLike) -> IntArray:
    """The fluid above a relative density: γ1 < γ ≤ γ2; the fluid before it is the one below.

    Parameters
    ----------
    relative_density : array_like, shape (...)
        Relative density at 60 °F. [1]

    Returns
    -------
    IntArray, shape (...)
        Position of fluid 2 in :data:`FLUIDS`; an end pair outside of all. [1]
    """
    (gamma,) = as_floats(relative_density)
    return np.asarray(np.clip(np.searchsorted(RELATIVE_DENSITY, gamma, side="left"), 1, len(FLUIDS) - 1))


def correct(
    relative_density: ArrayLike, temperature: ArrayLike, second: IntArray, first: IntArray | None = None
) -> Saturated:
    """Correction between a temperature and 60 °F for a liquid between two reference fluids.

    Parameters
    ----------
    relative_density : array_like, shape (...)
        γ, relative density at 60 °F. [1]
    temperature : array_like, shape (...)
        Temperature. [K]
    second : IntArray, shape (...)
        Position of fluid 2. [1]
    first : IntArray, shape (...), or None
        Position of fluid 1, by default the one before fluid 2. [1]

    Returns
    -------
    Saturated
        The factor, its slopes and its parts; NaN at or above the critical temperature. [as there]

    Notes
    -----
    With τ = 1 − Tr and Zc, ρc of the fluids::

        δ = (γ − γ1)/(γ2 − γ1)        (1)
        Tc = Tc1 + δ (Tc2 − Tc1)        (2)
        h2 = Zc1 ρc1/(Zc2 ρc2)        (3)
        ρ_i(τ) = ρc_i [1 + (k1 τ^0.35 + k3 τ² + k4 τ³)/(1 + k2 τ^0.65)]        (4)
        X(Tr) = ρ_1/{1 + δ [ρ_1/(h2 ρ_2) − 1]}        (5)
        CTL = X(T/Tc)/X(519.67/(1.8 Tc))        (6)

    References
    ----------
    .. [1] GPA TP-27, "Temperature Correction for the Volume of NGL and LPG, Tables 23E, 24E, 53E, 54E, 59E,
       and 60E", 2007 = API MPMS 11.2.4.
    """
    gamma, t = as_floats(relative_density, temperature)
    fluids = np.asarray(second) - 1 if first is None else np.asarray(first), np.asarray(second)
    one, two = (_if_same(fluid) for fluid in fluids)
    width = RELATIVE_DENSITY[two] - RELATIVE_DENSITY[one]
    delta = (gamma - RELATIVE_DENSITY[one]) / width  # eq. 1
    rise = CRITICAL_TEMPERATURE[two] - CRITICAL_TEMPERATURE[one]
    critical = CRITICAL_TEMPERATURE[one] + delta * rise  # eq. 2
    products = _CRITICAL_COMPRESSIBILITY * _CRITICAL_DENSITY
    h2 = products[one] / products[two]  # eq. 3
    reduced, reduced_60f = t / critical, TEMPERATURE_60F / critical
    here = _mix(one, two, delta, h2, reduced)
    base = _mix(one, two, delta, h2, reduced_60f)
    by_delta = here.by_share - base.by_share
    by_critical = (base.by_reduced * reduced_60f - here.by_reduced * reduced) / critical
    return Saturated(
        first=fluids[0],
        second=fluids[1],
        share=delta,
        critical_temperature=critical,
        reduced_temperature=reduced,
        reduced_temperature_60f=reduced_60f,
        scale=np.broadcast_to(h2, delta.shape),
        density_first=here.first,
        density_second=here.second,
        density_first_60f=base.first,
        density_second_60f=base.second,
        mixed=here.density,
        mixed_60f=base.density,
        factor=np.asarray(here.density / base.density),  # eq. 6
        by_temperature=np.asarray(here.by_reduced / critical),
        by_relative_density=np.asarray((by_delta + by_critical * rise) / width * gamma),
    )


def _if_same(fluid: IntArray) -> IntArray:
    """One position where all are the same, which they are of one content: then no constants are gathered."""
    return np.asarray(fluid.flat[0]) if fluid.size and np.all(fluid == fluid.flat[0]) else fluid


@dataclass(frozen=True)
class _Mixed:
    """X of eq. 5 at one reduced temperature, and the slopes of its logarithm."""

    first: FloatArray
    second: FloatArray
    density: FloatArray
    by_share: FloatArray
    by_reduced: FloatArray


def _mix(one: IntArray, two: IntArray, delta: FloatArray, h2: FloatArray, reduced: FloatArray) -> _Mixed:
    tau = np.where(reduced < 1.0, 1.0 - reduced, np.nan)
    powers = (tau, tau**_POWER, tau**_POWER_BELOW)
    first, first_slope = _density(one, *powers)
    second, second_slope = _density(two, *powers)
    scaled = h2 * second
    mixed = first / (1.0 + delta * (first / scaled - 1.0))  # eq. 5
    # 1/X = (1 − δ)/ρ1 + δ/(h2 ρ2)
    by_share = mixed / first - mixed / scaled
    by_tau = mixed * ((1.0 - delta) * first_slope / first**2 + delta * second_slope / (scaled * second))
    return _Mixed(first, second, np.asarray(mixed), np.asarray(by_share), np.asarray(-by_tau))


def _density(
    fluid: IntArray, tau: FloatArray, power: FloatArray, power_below: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Saturation density of reference fluids and its slope by τ, eq. 4."""
    k1, k2, k3, k4 = (k[fluid] for k in _SERIES)
    top = k1 * power + (k3 + k4 * tau) * tau**2
    below = 1.0 + k2 * power_below
    ratio = top / below
    top_slope = _POWER * k1 * power / tau + (2.0 * k3 + 3.0 * k4 * tau) * tau
    below_slope = _POWER_BELOW * k2 * power_below / tau
    critical = _CRITICAL_DENSITY[fluid]
    return critical * (1.0 + ratio), critical * (top_slope - ratio * below_slope) / below  # eq. 4
