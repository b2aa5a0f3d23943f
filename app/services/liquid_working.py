"""The working of a liquid's density: what its published method did, step by step, to be redone by hand."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np

from app.services.liquids import State, key_of, liquid_columns, state_of
from app.services.parts import celsius_of
from models import units
from models.constants import WATER_DENSITY_60F
from models.liquid import light_hydrocarbon, light_state, petroleum
from models.liquid.costald import CostaldColumns
from models.liquid.definition import (
    EthanolWaterLiquid,
    ExpansivityLiquid,
    LightHydrocarbonLiquid,
    Liquid,
    MixtureLiquid,
    PetroleumLiquid,
    TableLiquid,
    WaterLiquid,
)
from models.liquid.light_temperature import FLUIDS

Step = dict[str, Any]

EXPONENTIAL = "definitions of β and κ, integrated: CRC Handbook of Chemistry and Physics, 87th ed."
TP27 = "GPA TP-27 (2007) / API MPMS 11.2.4"
COSTALD = "R. W. Hankinson, G. H. Thomson, AIChE J. 25 (1979) 653; G. H. Thomson et al., AIChE J. 28 (1982) 671"
KELL = "G. S. Kell, J. Chem. Eng. Data 20 (1975) 97, on ITS-90 and scaled to M. Tanaka et al., Metrologia 38 (2001) 301"
OIML = "OIML R 22 (1973), International alcoholometric tables"


@dataclass(frozen=True)
class Sampled:
    """One content: its liquid, its sample, where it is, the standard state, and the atmosphere. [SI]"""

    liquid: Liquid
    density: float
    sample: State
    here: State
    standard: State
    atmosphere: float


def step(name: str, symbol: str, value: float, unit: str, method: str, reference: str) -> Step:
    """One step; a number that is none is unknown."""
    known = float(value) if math.isfinite(value) else None
    return {"step": name, "symbol": symbol, "value": known, "unit": unit, "method": method, "reference": reference}


def density_steps(one: Sampled) -> Iterator[Step]:
    """From the sample's density to that in the vessel, by the liquid's own method."""
    yield from KINDS[type(one.liquid)](one)
    state = state_of(one.liquid, one.density, one.sample, one.here, one.standard, one.atmosphere)
    standard, here = float(state.density_standard[0]), float(state.density[0])
    reference = REFERENCES[type(one.liquid)]
    if not math.isfinite(standard):
        yield step("standard density of the sample", "ρ_s,std", math.nan, "kg/m³",
                   "none: the method does not reach the standard state", reference)  # fmt: skip
        yield step("density in the vessel", "ρ", here, "kg/m³", "of the same content at T and P", reference)
        return
    at_base = (one.here[0], one.standard[1])
    warm = state_of(one.liquid, one.density, one.sample, at_base, one.standard, one.standard[1])
    factor = float(warm.density[0]) / standard
    yield step("standard density of the sample", "ρ_s,std", standard, "kg/m³",
               "of the sample, with its water, at the standard state", reference)  # fmt: skip
    yield step("temperature factor", "C_T", factor, "1", "ρ(T, P_std)/ρ_s,std, unrounded", reference)
    yield step("temperature factor, as a table prints it", "C_T,5", float(petroleum.table_factor(factor)), "1",
               "C_T to five decimals, for comparison with printed tables; not used", reference)  # fmt: skip
    yield step("pressure factor", "C_P", here / float(warm.density[0]), "1",
               "ρ(T, P)/ρ(T, P_std); the liquid's own head is left out", reference)  # fmt: skip
    yield step("density in the vessel", "ρ", here, "kg/m³", "ρ_s,std C_T C_P", reference)


def _expansivity(one: Sampled) -> Iterator[Step]:
    assert isinstance(one.liquid, ExpansivityLiquid)
    yield step("origin of the powers", "t₀", celsius_of(one.liquid.origin), "°C",
               "temperature of the substance's own density", "definition")  # fmt: skip
    for power, coefficient in enumerate(one.liquid.coefficients):
        per = "1/K" if power == 0 else f"1/K^{power + 1}"
        yield step(f"expansivity, power {power}", f"b_{power}", coefficient, per, "β = Σ b_j (T − t₀)^j", "definition")
    kappa = one.liquid.compressibility * units.PASCAL_PER_KPA
    yield step("compressibility", "κ", kappa, "1/kPa", "ρ = ρ_s exp(−∫β dT from T_s to T + κ (P − P_s))", "definition")


def _key(one: Sampled) -> float:
    """What the sample says of the content, by the liquid's method."""
    return key_of(one.liquid, one.density, one.sample, one.standard[1])


def _petroleum(one: Sampled) -> Iterator[Step]:
    liquid, key = one.liquid, _key(one)
    assert isinstance(liquid, PetroleumLiquid)
    code = petroleum.COMMODITIES[liquid.commodity]
    alpha = math.nan if liquid.alpha60 is None else liquid.alpha60
    gauge = one.here[1] - one.atmosphere
    found = petroleum.factors(key, one.here[0], gauge, code, alpha)
    base = petroleum.factors(key, one.standard[0], 0.0, code, alpha)
    group = petroleum.GROUPS[int(found.group)].name
    edition = petroleum.EDITION
    yield step("density at 60 °F", "ρ60", key, "kg/m³", f"root from ρ_s, T_s and P_s; group: {group}", edition)
    yield step("density for the old scale", "ρ*", float(found.density_star), "kg/m³",
               "ρ60 at 60 °F of IPTS-68", edition)  # fmt: skip
    yield step("expansion at 60 °F", "α60", float(found.alpha60), "1/°F", "(K0/ρ* + K1)/ρ* + K2", edition)
    yield step("temperature on the old scale", "t*", float(found.temperature_star_f), "°F",
               "T in °F less the shift from ITS-90 to IPTS-68", edition)  # fmt: skip
    yield step("factor from 60 °F", "CTL", float(found.ctl), "1",
               "exp{−α60 Δt [1 + 0.8 α60 (Δt + δ60)]}, Δt = t* − 60.0068749", edition)  # fmt: skip
    yield step("factor of the base temperature", "CTL_std", float(base.ctl), "1",
               "the same at T_std; C_T = CTL/CTL_std", edition)  # fmt: skip
    zero = ": below 0 it is set to 0, as the procedure says" if gauge < 0.0 else ""
    yield step("pressure that counts", "p", float(found.pressure_psi), "psi", f"gauge, of the space{zero}", edition)
    yield step("compressibility", "F_p", float(found.fp), "1e-5/psi",
               "exp[−1.9947 + 0.00013427 t* + (793920 + 2326 t*)/ρ*²]; C_P = 1/(1 − 1e-5 F_p p)", edition)  # fmt: skip


def _light(one: Sampled) -> Iterator[Step]:
    key = _key(one)
    excess = float(light_state.excess(key, *one.here))
    found = light_hydrocarbon.factors(key, one.here[0], excess)
    base = light_hydrocarbon.factors(key, one.standard[0], 0.0).saturation
    warm, pressed = found.saturation, found.compression
    pair = f"between {FLUIDS[int(warm.first)]} (1) and {FLUIDS[int(warm.second)]} (2)"
    yield step("relative density at 60 °F", "γ", key, "1",
               f"root of table 23E from ρ_s and T_s, to water of {WATER_DENSITY_60F} kg/m³", TP27)  # fmt: skip
    yield step("interpolation", "δ", float(warm.share), "1", f"(γ − γ1)/(γ2 − γ1), {pair}", TP27)
    yield step("critical temperature", "T_c", float(warm.critical_temperature), "K", "Tc1 + δ (Tc2 − Tc1)", TP27)
    yield step("reduced temperature", "T_r", float(warm.reduced_temperature), "1", "T/T_c", TP27)
    yield step("reduced temperature of 60 °F", "T_r,60", float(warm.reduced_temperature_60f), "1", "60 °F/T_c", TP27)
    yield step("scale of the second fluid", "h2", float(warm.scale), "1", "Zc1 ρc1/(Zc2 ρc2)", TP27)
    for name, symbol, value in (
        ("saturated density of fluid 1", "ρ1", warm.density_first), ("of fluid 2", "ρ2", warm.density_second),
        ("saturated density of fluid 1 at 60 °F", "ρ1,60", warm.density_first_60f),
        ("of fluid 2 at 60 °F", "ρ2,60", warm.density_second_60f),
    ):  # fmt: skip
        yield step(name, symbol, float(value), "kmol/m³", "ρc {1 + [k1 τ^0.35 + k3 τ² + k4 τ³]/[1 + k2 τ^0.65]}", TP27)
    yield step("factor from 60 °F", "CTL", float(warm.factor), "1",
               "X(T_r)/X(T_r,60), X = ρ1/{1 + δ [ρ1/(h2 ρ2) − 1]}", TP27)  # fmt: skip
    yield step("factor of the base temperature", "CTL_std", float(base.factor), "1",
               "the same; C_T = CTL/CTL_std", TP27)  # fmt: skip
    yield step("pressure above equilibrium", "Δp", excess / 1e3, "kPa",
               "P − P_e by GPA TP-15 / API MPMS 11.2.5; 0 below it, and where P_e is not known", TP27)  # fmt: skip
    if excess > 0.0:
        yield step("compressibility", "F", float(pressed.factor_psi), "1e-5/psi",
                   "1/(A + B Δp); C_P = 1/(1 − 1e-5 F Δp)", "API MPMS 11.2.2 (1986)")  # fmt: skip


def _own(one: Sampled) -> Iterator[Step]:
    """A method with a density of its own: what it gives for the sample, and the factor that the sample makes."""
    columns, row = liquid_columns((one.liquid,)), np.zeros(1, dtype=np.intp)
    reference = REFERENCES[type(one.liquid)]
    for name, symbol, at in (("sample", "ρ_m,s", one.sample), ("vessel", "ρ_m", one.here)):
        value = float(columns.own_density(np.array([at[0]]), np.array([at[1]]), row)[0])
        yield step(f"density by the method, {name}", symbol, value, "kg/m³", METHOD_TEXTS[type(one.liquid)], reference)
    yield step("factor of the sample", "x", _key(one), "1", "ρ_s/ρ_m,s; ρ = x ρ_m", reference)


def _mixture(one: Sampled) -> Iterator[Step]:
    assert isinstance(one.liquid, MixtureLiquid)
    for part, fraction in one.liquid.components:
        name = f"mole fraction of {part.id}"
        yield step(name, f"x({part.id})", fraction, "1", "of the liquid", "definition or analysis")
    found = CostaldColumns.from_compositions([one.liquid.components]).working(0, *one.here)
    for name, symbol, key, scale, unit, method in (
        ("molar mass of the liquid", "m_L", "M", 1e3, "g/mol", "Σ x m"),
        ("characteristic volume", "V*", "V*", 1e6, "cm³/mol", "¼ [Σ x V* + 3 (Σ x V*^⅔)(Σ x V*^⅓)]"),
        ("critical temperature", "T_c", "Tc", 1.0, "K", "[Σ x (V* Tc)^½]²/V*"),
        ("acentric factor", "ω", "omega", 1.0, "1", "Σ x ω_SRK"),
        ("reduced temperature", "T_r", "Tr", 1.0, "1", "T/T_c"),
        ("spherical part", "V_R0", "V0", 1.0, "1", "1 + a s + b s² + c s³ + d s⁴, s = (1 − T_r)^⅓"),
        ("deviation", "V_Rδ", "Vdelta", 1.0, "1", "(e + f T_r + g T_r² + h T_r³)/(T_r − 1.00001)"),
        ("saturated volume", "V_s", "Vs", 1e6, "cm³/mol", "V* V_R0 (1 − ω V_Rδ)"),
        ("bubble pressure", "P_s", "Ps", 1e-3, "kPa", "Σ x P_i: Raoult's law; a lower pressure counts as it"),
        ("critical pressure", "P_c", "Pc", 1e-3, "kPa", "(0.291 − 0.080 ω) R T_c/V*; a pure substance's own"),
        ("stiffness", "B", "B", 1e-3, "kPa", "P_c (−1 + a s + b s² + d s³ + e s⁴)"),
        ("stiffness", "C", "C", 1.0, "1", "0.0861488 + 0.0344483 ω"),
        ("volume", "V_m", "V", 1e6, "cm³/mol", "V_s {1 − C ln[(B + P)/(B + P_s)]}"),
    ):
        yield step(name, symbol, found[key] * scale, unit, method, COSTALD)
    yield from _own(one)


def _ethanol(one: Sampled) -> Iterator[Step]:
    yield step("mass fraction of ethanol", "p", _key(one), "1", "root of the general formula from ρ_s and T_s", OIML)


def _plain(one: Sampled) -> Iterator[Step]:
    return _own(one)


KINDS: dict[type, Callable[[Sampled], Iterator[Step]]] = {
    LightHydrocarbonLiquid: _light, MixtureLiquid: _mixture,
    ExpansivityLiquid: _expansivity, PetroleumLiquid: _petroleum,
    WaterLiquid: _plain, TableLiquid: _plain, EthanolWaterLiquid: _ethanol,
}  # fmt: skip
REFERENCES: dict[type, str] = {
    LightHydrocarbonLiquid: TP27, MixtureLiquid: COSTALD,
    ExpansivityLiquid: EXPONENTIAL, PetroleumLiquid: petroleum.EDITION,
    WaterLiquid: KELL, TableLiquid: "the substance's table", EthanolWaterLiquid: OIML,
}  # fmt: skip
METHOD_TEXTS: dict[type, str] = {
    MixtureLiquid: "corresponding states: saturated volume, then compressed by what lies above the bubble pressure",
    WaterLiquid: "ρ₀(T) exp[κ(T) (P − 1 atm)]",
    TableLiquid: "monotone cubic of ln ρ between the table's rows, then exp[κ (P − P_table)]",
}
