"""What happens in the invented vessels: shapes, shells, liquids, vapours, written down a second time.

Nothing here comes from models/ or app/: the demo is only worth something if the truth that it is
simulated with was not computed by the program that is judged against it. Exact integrals where they
exist, quadrature where they do not, and short fits to reference equations of state, each with its source.

Units are those of the readings: m, m³, °C, kPa, kg.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline

Floats = NDArray[np.float64]
Curve = Callable[[Any], Floats]

ATMOSPHERE_KPA = 101.325
GAS_CONSTANT = 8.314462618  # J/(mol K), CODATA 2018


@dataclass(frozen=True)
class Fluid:
    """A liquefied gas or a gas, by fits to its reference equation of state.

    Liquid: ln ρ on the saturation line as a polynomial in (t − 15 °C), and κ. Vapour pressure: ln P as
    a polynomial in 1/T − 1/288.15 K. Vapour: Z − 1 = Σ c_ij (P/MPa)^i ((t − 15)/100)^j.
    """

    molar_mass_kg_mol: float
    compressibility: tuple[tuple[float, ...], ...]
    ln_saturated_density: tuple[float, ...] = ()
    ln_vapour_pressure: tuple[float, ...] = ()
    kappa_per_kpa: float = 0.0


# Fitted with CoolProp 8 to the reference equations: propane, Lemmon, McLinden & Wagner (2009), largest
# departure 1e-6 (liquid, 0 to 32 °C) and 1.6e-4 (vapour); n-butane, Bücker & Wagner (2006), 1e-7 and
# 6e-5; nitrogen, Span et al. (2000), to 4 MPa, 5e-5; hydrogen, Leachman et al. (2009), to 6 MPa, 5e-6.
FLUIDS: dict[str, Fluid] = {
    "propane": Fluid(
        0.04409562,
        (
            (-0.1766266, 0.1829946, -0.1079271),
            (-0.02093361, 0.1059565, -0.2626045),
            (-0.0206859, 0.0184124, 0.1449748),
        ),
        (6.229503, -0.0028890668, -1.29078964e-05, -9.7127942e-08, -8.51203801e-10),
        (6.59511122, -2266.15525, -22216.4368, -37559397.3),
        5.13e-6,
    ),
    "n-butane": Fluid(
        0.0581222,
        (
            (-0.3214342, 0.374737, -0.3183626),
            (-0.1212681, 0.3806058, -0.2064477),
            (-0.03884005, -0.3515752, 1.079053),
        ),
        (6.37033315, -0.00192246692, -4.86755748e-06, -2.32233899e-08, -1.1413446e-10),
        (5.17131343, -2785.31069, -94888.0612, -19427457.5),
        2.66e-6,
    ),
    "nitrogen": Fluid(
        0.02801348, ((-0.00290757, 0.009949004, -0.007155396), (0.0002540757, -0.0002092439, 7.714314e-05))
    ),
    "hydrogen": Fluid(
        0.00201588, ((0.005976185, -0.001150826, -4.936674e-05), (1.715523e-05, -2.851385e-05, 2.328837e-05))
    ),
}


def polynomial(coefficients: tuple[float, ...], x: Any) -> Any:
    """Σ c_i x^i."""
    total: Any = 0.0
    for coefficient in reversed(coefficients):
        total = total * x + coefficient
    return total


def vapour_pressure_kpa_abs(fluid: str, temperature_c: Any) -> Any:
    """Vapour pressure of a liquefied gas."""
    return np.exp(polynomial(FLUIDS[fluid].ln_vapour_pressure, 1.0 / (temperature_c + 273.15) - 1.0 / 288.15))


def vapour_density(fluid: str, pressure_kpa_abs: Any, temperature_c: Any) -> Any:
    """Density of the real gas."""
    gas = FLUIDS[fluid]
    tau, z = (temperature_c - 15.0) / 100.0, 1.0
    for power, row in enumerate(gas.compressibility, start=1):
        z = z + (pressure_kpa_abs / 1000.0) ** power * polynomial(row, tau)
    ideal = pressure_kpa_abs * 1000.0 * gas.molar_mass_kg_mol / (GAS_CONSTANT * (temperature_c + 273.15))
    return ideal / z


@dataclass(frozen=True)
class Liquid:
    """A liquid: of given β and κ, or a liquefied gas by its reference equation (``fluid``)."""

    beta_per_k: float = 0.0
    kappa_per_kpa: float = 0.0
    fluid: str = ""

    def density(self, density_15: Any, temperature_c: Any, pressure_kpa_abs: Any) -> Any:
        """Density in the vessel of a liquid whose density at 15 °C (and its standard pressure) is known."""
        x = temperature_c - 15.0
        if not self.fluid:
            pressed = self.kappa_per_kpa * (pressure_kpa_abs - ATMOSPHERE_KPA)
            return density_15 * np.exp(-self.beta_per_k * x + pressed)
        gas = FLUIDS[self.fluid]
        along = polynomial(gas.ln_saturated_density, x) - gas.ln_saturated_density[0]
        above = pressure_kpa_abs - vapour_pressure_kpa_abs(self.fluid, temperature_c)
        return density_15 * np.exp(along + gas.kappa_per_kpa * above)


def segment_area(depth: Any, radius: Any) -> Any:
    """Wetted part of a circle of this radius, filled to this depth from its lowest point."""
    d = np.clip(depth, 0.0, 2.0 * radius)
    phi = np.arccos(np.clip(1.0 - d / radius, -1.0, 1.0))
    return radius**2 * (phi - np.sin(phi) * np.cos(phi))


def upright_volume(diameter: float, cone: float) -> Curve:
    """Upright cylinder on a flat bottom, or on a cone of this depth that points down."""
    area, radius = math.pi * diameter**2 / 4.0, diameter / 2.0

    def volume(level: Any) -> Floats:
        h = np.asarray(level, dtype=float)
        if cone == 0.0:
            return area * h
        return np.where(h < cone, math.pi / 3.0 * (radius / cone) ** 2 * h**3, area * (h - 2.0 * cone / 3.0))

    return volume


def sphere_volume(diameter: float) -> Curve:
    """Segment of a sphere."""

    def volume(level: Any) -> Floats:
        h = np.asarray(level, dtype=float)
        return np.asarray(math.pi * h**2 * (1.5 * diameter - h) / 3.0)

    return volume


def lying_volume(diameter: float, length: float, head: float, tilt_deg: float, gauge_at: float) -> Curve:
    """Lying cylinder, heads half ellipsoids of this depth (0: flat), by slices across its axis.

    The surface stands at y = h/cos θ − (x − x_gauge) tan θ above the bottom line, everywhere; a slice of
    a head has a smaller radius about the same axis. Quadrature by Gauss and Legendre, 1e-7 of the capacity.
    """
    theta, radius = math.radians(tilt_deg), diameter / 2.0
    levels = diameter * 0.5 * (1.0 - np.cos(np.linspace(0.0, math.pi, 1601)))
    nodes, weights = np.polynomial.legendre.leggauss(96)

    def slices(x: Floats, r: Floats, w: Floats) -> Floats:
        y = levels[:, None] / math.cos(theta) - (x - gauge_at)[None, :] * math.tan(theta)
        return np.asarray((segment_area(y - (radius - r), r) * w).sum(axis=1))

    body = slices((nodes + 1.0) * length / 2.0, np.full(96, radius), weights * length / 2.0)
    if head > 0.0:
        phi = (nodes + 1.0) * math.pi / 4.0  # z = a sin φ takes the steep end of the head away
        z, w = head * np.sin(phi), weights * math.pi / 4.0 * head * np.cos(phi)
        body = body + slices(-z, radius * np.cos(phi), w) + slices(length + z, radius * np.cos(phi), w)
    spline = CubicSpline(levels, body)
    return lambda level: np.asarray(spline(level))


def table_volume(rows: list[list[float]]) -> Curve:
    """A capacity table, read linearly between its rows."""
    levels, volumes = np.asarray(rows, dtype=float).T
    return lambda level: np.asarray(np.interp(level, levels, volumes))


@dataclass(frozen=True)
class Hull:
    """A shell: its volume to a level, its capacity, and how it stretches."""

    volume: Curve
    capacity_m3: float
    top_m: float
    expansion_per_k: float
    insulated: bool
    across_per_kpa: float
    along_per_kpa: float

    def stretched(self, level: Any, liquid_c: Any, ambient_c: Any, gauge_kpa: Any) -> tuple[Any, Any]:
        """Volume to the level and capacity of the warm, pressed shell.

        A shell that is wider by a and longer by l holds a² l V(h/a) at the level h. The steel has 7/8
        of the liquid's temperature and 1/8 of the air's where it is bare (API MPMS 12.1.1).
        """
        steel = liquid_c if self.insulated else (7.0 * liquid_c + ambient_c) / 8.0
        warm = 1.0 + self.expansion_per_k * (steel - 15.0)
        across, along = (
            warm * (1.0 + self.across_per_kpa * gauge_kpa),
            warm * (1.0 + self.along_per_kpa * gauge_kpa),
        )
        return across**2 * along * self.volume(level / across), across**2 * along * self.capacity_m3


def stretch_per_kpa(shape: Mapping[str, Any], shell: Mapping[str, Any]) -> tuple[float, float]:
    """Strain of a thin, closed shell for a kPa of gauge pressure: across its axis, and along it."""
    if "thickness_m" not in shell:
        return 0.0, 0.0
    p_d_by_t_e = shape["diameter_m"] / (shell["thickness_m"] * shell["elastic_modulus_gpa"] * 1e6)
    nu = shell["poisson_ratio"]
    if shape["kind"] == "sphere":
        return (p_d_by_t_e * (1.0 - nu) / 4.0,) * 2
    return p_d_by_t_e / 2.0 * (1.0 - nu / 2.0), p_d_by_t_e / 4.0 * (1.0 - 2.0 * nu)


def hull(body: Mapping[str, Any], *, as_tabulated: bool = False) -> Hull:
    """The shell of a vessel as its definition describes it; of a table, the shape it was made from."""
    shape, shell = body["shape"], body["shell"]
    kind = shape["kind"]
    across, along = stretch_per_kpa(shape, shell)
    if kind == "capacity_table":
        volume, top = table_volume(shape["rows"]), shape["rows"][-1][0]
        capacity = shape["total_volume_m3"]
        if not as_tabulated and shape["of"] == "horizontal_cylinder":
            length = capacity / (math.pi * shape["diameter_m"] ** 2 / 4.0)
            volume = lying_volume(shape["diameter_m"], length, 0.0, 0.0, length / 2.0)
    elif kind == "vertical_cylinder":
        cone = shape["bottom"].get("depth_m", 0.0)
        volume, top = upright_volume(shape["diameter_m"], cone), shape["height_m"] + cone
        capacity = float(volume(top))
    elif kind == "sphere":
        volume, top = sphere_volume(shape["diameter_m"]), shape["diameter_m"]
        capacity = math.pi * top**3 / 6.0
    elif kind == "horizontal_cylinder":
        d, length = shape["diameter_m"], shape["length_m"]
        head = shape["left_head"].get("depth_m", d / 2.0)
        volume = lying_volume(d, length, head, shape.get("tilt_deg", 0.0), shape.get("gauge_at_m", length / 2.0))
        top, capacity = d, math.pi * d**2 / 4.0 * (length + 4.0 * head / 3.0)
    elif kind == "box":
        floor = shape["length_m"] * shape["width_m"]
        volume, top, capacity = (
            (lambda level: floor * np.asarray(level, dtype=float)),
            shape["height_m"],
            floor * shape["height_m"],
        )
    else:
        volume, top, capacity = (lambda level: 0.0 * np.asarray(level, dtype=float)), 0.0, shape["volume_m3"]
    return Hull(volume, capacity, top, shell.get("expansion_per_k", 0.0), shell.get("insulated", False), across, along)


@dataclass(frozen=True)
class Conditions:
    """What is so at some instants (or what instruments say of it); columns or single numbers."""

    level_m: Any = 0.0
    water_m: Any = 0.0
    liquid_c: Any = 15.0
    ambient_c: Any = 15.0
    gauge_kpa: Any = 0.0
    vapour_c: Any = 15.0
    barometer_kpa: Any = ATMOSPHERE_KPA
    density_15: Any = 0.0


def mass_kg(shell: Hull, liquid: Liquid | None, gas: str, roof_kg: float, at: Conditions, stretch: Any = 1.0) -> Any:
    """Liquid less its water and the floating roof, plus the vapour above; ``stretch`` scales the table."""
    absolute = at.gauge_kpa + at.barometer_kpa
    steel_c = at.liquid_c if liquid else at.vapour_c
    wet, whole = shell.stretched(at.level_m, steel_c, at.ambient_c, at.gauge_kpa)
    water, _ = shell.stretched(at.water_m, steel_c, at.ambient_c, at.gauge_kpa)
    water = np.where(np.asarray(at.water_m) > 0.0, water, 0.0)  # no water is no volume, also on an uneven bottom
    wet, water, whole = wet * stretch, water * stretch, whole * stretch
    total = 0.0
    if liquid:
        total = liquid.density(at.density_15, at.liquid_c, absolute) * (wet - water) - roof_kg
    if gas:
        total = total + vapour_density(gas, absolute, at.vapour_c) * (whole - (wet if liquid else 0.0))
    return total
