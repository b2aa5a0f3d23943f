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
from models.liquid import petroleum
from models.liquid.definition import (
    EthanolWaterLiquid,
    ExpansivityLiquid,
    Liquid,
    PetroleumLiquid,
    TableLiquid,
    WaterLiquid,
)

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


def _own(one: Sampled) -> Iterator[Step]:
    """A method with a density of its own: what it gives for the sample, and the factor that the sample makes."""
    columns, row = liquid_columns((one.liquid,)), np.zeros(1, dtype=np.intp)
    reference = REFERENCES[type(one.liquid)]
    for name, symbol, at in (("sample", "ρ_m,s", one.sample), ("vessel", "ρ_m", one.here)):
        value = float(columns.own_density(np.array([at[0]]), np.array([at[1]]), row)[0])
        yield step(f"density by the method, {name}", symbol, value, "kg/m³", METHOD_TEXTS[type(one.liquid)], reference)
    yield step("factor of the sample", "x", _key(one), "1", "ρ_s/ρ_m,s; ρ = x ρ_m", reference)


def _ethanol(one: Sampled) -> Iterator[Step]:
    yield step("mass fraction of ethanol", "p", _key(one), "1", "root of the general formula from ρ_s and T_s", OIML)


def _plain(one: Sampled) -> Iterator[Step]:
    return _own(one)


KINDS: dict[type, Callable[[Sampled], Iterator[Step]]] = {
    ExpansivityLiquid: _expansivity, PetroleumLiquid: _petroleum,
    WaterLiquid: _plain, TableLiquid: _plain, EthanolWaterLiquid: _ethanol,
}  # fmt: skip
REFERENCES: dict[type, str] = {
    ExpansivityLiquid: EXPONENTIAL, PetroleumLiquid: petroleum.EDITION,
    WaterLiquid: KELL, TableLiquid: "the substance's table", EthanolWaterLiquid: OIML,
}  # fmt: skip
METHOD_TEXTS: dict[type, str] = {
    # MixtureLiquid: "corresponding states: saturated volume, then compressed by what lies above the bubble pressure",
    WaterLiquid: "ρ₀(T) exp[κ(T) (P − 1 atm)]",
    TableLiquid: "monotone cubic of ln ρ between the table's rows, then exp[κ (P − P_table)]",
}
