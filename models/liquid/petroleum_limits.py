"""Why the petroleum volume correction does not reach a liquid: the limit that is passed, in words."""

from __future__ import annotations

import numpy as np

from models.constants import ZERO_CELSIUS
from models.liquid import petroleum_groups as groups
from models.liquid import petroleum_method as method
from models.liquid.petroleum_groups import COMMODITIES, EDITION

_PASCAL_PER_BAR = 1e5  # exact
_WORDS = {
    "crude": "crude oil", "refined": "a refined product", "lubricating": "a lubricating oil",
    "special": "a special application",
}  # fmt: skip


def why_outside(
    density: float,
    temperature: float,
    pressure_gauge: float,
    commodity: int,
    alpha60: float = np.nan,
    *,
    observed: bool = False,
) -> str:
    """The limit of the procedure that a liquid passes, in one sentence; empty where it passes none.

    Parameters
    ----------
    density : float
        Density at 60 °F and base pressure, or the observed density. [kg/m³]
    temperature : float
        Liquid temperature. [K]
    pressure_gauge : float
        Pressure above base or equilibrium pressure. [Pa]
    commodity : int
        A value of COMMODITIES. [1]
    alpha60 : float
        Expansivity at 60 °F, read where the commodity is special. [1/°F]
    observed : bool
        Whether the density is the one at the temperature and pressure. [1]

    Returns
    -------
    str
        What, its value, the limits, the way out. [1]
    """
    names = {code: name for name, code in COMMODITIES.items()}
    if commodity not in names:
        known = ", ".join(f"{code} ({name})" for code, name in names.items())
        return f"the commodity code is {commodity}; the petroleum correction knows {known}"
    celsius = temperature - ZERO_CELSIUS
    low, high = groups.LOWEST_TEMPERATURE, groups.HIGHEST_TEMPERATURE
    if not groups.holds(temperature, low, high):
        hint = "; above that, liquid.model density_table takes measured densities" if temperature > high else ""
        return (
            f"the liquid temperature is {celsius:.6g} °C; the petroleum correction ({EDITION}) is defined "
            f"from {low - ZERO_CELSIUS:.0f} to {high - ZERO_CELSIUS:.0f} °C{hint}"
        )
    if not groups.pressure_holds(pressure_gauge):
        return (
            f"the gauge pressure is {pressure_gauge / _PASCAL_PER_BAR:.6g} bar; the petroleum correction "
            f"({EDITION}) is defined from 0 to {groups.HIGHEST_PRESSURE / _PASCAL_PER_BAR:.1f} bar (1500 psig), "
            "and below 0 it counts as 0; a table of densities (liquid.model density_table) takes any pressure"
        )
    if not groups.alpha60_holds(commodity, alpha60):
        return (
            f"alpha60_per_f is {alpha60:.6g}; special applications are defined from "
            f"{groups.LOWEST_ALPHA60 * 1e6:.0f}e-6 to {groups.HIGHEST_ALPHA60 * 1e6:.0f}e-6 per °F; "
            "liquid.model density_table takes any expansivity"
        )
    return _why_density(density, temperature, pressure_gauge, commodity, names[commodity], alpha60, observed)


def _why_density(
    density: float, temperature: float, gauge: float, commodity: int, name: str, alpha60: float, observed: bool
) -> str:
    lightest, heaviest = groups.density_limits(commodity)
    low, high = float(lightest), float(heaviest)
    where = "at 60 °F"
    if observed:
        at = method.state(temperature, gauge)
        group = np.array([groups.FIRST[commodity], groups.LAST[commodity]])
        ends = np.array([low, high])
        log_ctpl, _ = method.log_ctpl_and_slope(ends, groups.coefficients(group, alpha60), at)
        low, high = (float(end) for end in ends * np.exp(log_ctpl))
        where = f"at {temperature - ZERO_CELSIUS:.6g} °C"
    if groups.holds(density, low, high):
        return ""
    return (
        f"the density {where} is {density:.6g} kg/m³; the petroleum correction ({EDITION}) of "
        f"{_WORDS[name]} is defined from {low:.1f} to {high:.1f} kg/m³ there; "
        "liquid.model density_table takes any density"
    )
