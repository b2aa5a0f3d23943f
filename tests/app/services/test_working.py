"""The steps of the working multiply back to the mass, by formulas written here."""

from __future__ import annotations

import math
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from app.services.compile import CompiledVessel
from app.services.working import budget_lines, working_steps
from tests.app.services.worked import (
    BULLET,
    GAS_OIL,
    GAS_READ,
    HYDROGEN,
    LPG_READ,
    OIL_READ,
    PROPANE,
    RECEIVER,
    SPHERE,
    TANK,
    answer,
    compiled,
    masses,
)

GAS_CONSTANT = 8.31446261815324  # J/(mol K), exact since 2019: CODATA 2018
ZERO = 273.15
EXACT = 1e-12
ROOF = {"mass_kg": 1.2e5, "lands_at_m": 1.8, "floats_at_m": 2.1}

Steps = dict[str, float]


def steps_of(vessel: CompiledVessel, row: dict[str, Any]) -> Steps:
    return {step["symbol"]: step["value"] for step in working_steps(masses(vessel, row), 0)}


def thinning(
    coefficients: list[float], kappa: float, origin: float, state: tuple[float, float], to: tuple[float, float]
) -> float:
    """Density at one state (°C, kPa) over that at another: exp(−∫β dT + κ ΔP), by hand."""
    total = math.fsum(
        b * ((to[0] - origin) ** (j + 1) - (state[0] - origin) ** (j + 1)) / (j + 1) for j, b in enumerate(coefficients)
    )
    return math.exp(-total + kappa * (to[1] - state[1]))


def redo_geometry(s: Steps, vessel: CompiledVessel, gauge_kpa: float) -> tuple[float, float]:
    """K and K_T from the shell's expansion and the two strains of the definition, and what K leaves of GOV."""
    p = vessel.parameters
    thermal = p["expansion"] * (s["T_shell"] + ZERO - p["expansion_temperature"])
    total = 3.0 * thermal + p["strain_sum"] * gauge_kpa * 1e3
    vertical = thermal + p["strain_vertical"] * gauge_kpa * 1e3
    assert vessel.curve is not None
    reach = (s["h"] - vessel.curve.bottom) * s["A(h)"] / s["V(h)"]
    spread = (1.0 + total / 3.0) ** 3
    return spread / (1.0 + vertical * reach), spread


def redo_liquid(s: Steps, substance: dict[str, Any], vessel: CompiledVessel) -> float:
    liquid = substance["liquid"]
    beta = liquid["expansivity_per_k"]
    coefficients = beta if isinstance(beta, list) else [beta]
    kappa, origin = liquid["compressibility_per_kpa"], liquid.get("at_temperature_c", 15.0)
    sample, here, standard = (s["T_s"], s["P_s"]), (s["T"], s["P"]), (s["T_std"], s["P_std"])
    density = s["ρ_s"] * thinning(coefficients, kappa, origin, sample, here)
    assert s["ρ"] == pytest.approx(density, rel=EXACT)
    dry = (s["ρ_s"] - s["f"] * s["ρ_w"]) / (1.0 - s["f"])
    assert s["ρ_std"] == pytest.approx(dry * thinning(coefficients, kappa, origin, sample, standard), rel=EXACT)
    gross = s["K"] * s["V(h)"] - s["K V(h_w)"] + s.get("ΔV_roof", 0.0)
    assert s["GOV"] == pytest.approx(gross, rel=EXACT)
    assert s["GSV"] == pytest.approx(gross * thinning(coefficients, kappa, origin, standard, here), rel=EXACT)
    net = s["GSV"] * (1.0 - s["f"])
    assert s["NSV"] == pytest.approx(net, rel=EXACT)
    assert s["M_liquid"] == pytest.approx(net * s["ρ_std"], rel=EXACT)
    return net * s["ρ_std"]


def redo_vapour(s: Steps, space: float) -> float:
    assert s["V_v"] == pytest.approx(space, rel=1e-9 if space < 1.0 else EXACT)
    if "Z" not in s:
        assert s["M_vapour"] == 0.0
        return 0.0
    density = s["P"] * 1e3 * s["m"] * 1e-3 / (s["Z"] * GAS_CONSTANT * (s["T_v"] + ZERO))
    molar = density / (s["m"] * 1e-3)
    assert s["Z"] == pytest.approx(1.0 + s["B"] * 1e-6 * molar + s["C"] * 1e-12 * molar**2, rel=EXACT)
    assert s["ρ_v"] == pytest.approx(density, rel=EXACT)
    assert s["M_vapour"] == pytest.approx(density * s["V_v"], rel=EXACT)
    return density * s["V_v"]


fraction = st.floats(0.15, 0.92)
shells = st.fixed_dictionaries(
    {"expansion_per_k": st.floats(0.0, 2e-5), "insulated": st.booleans(), "at_temperature_c": st.floats(0.0, 25.0)}
)


@settings(max_examples=30, deadline=None, derandomize=True)
@given(
    fill=fraction, water=st.floats(0.0, 0.1), celsius=st.floats(0.0, 45.0), sampled=st.floats(5.0, 35.0),
    wet=st.floats(0.0, 2.0), base=st.floats(0.0, 30.0), roof=st.booleans(), shell=shells,
)  # fmt: skip
def test_the_steps_of_a_tank_multiply_back_to_its_mass(
    fill: float,
    water: float,
    celsius: float,
    sampled: float,
    wet: float,
    base: float,
    roof: bool,
    shell: dict[str, Any],
) -> None:
    extra: dict[str, Any] = {"floating_roof": ROOF} if roof else {}
    vessel = compiled(TANK, site={"base_temperature_c": base, "elevation_m": 0.0}, shell=shell, **extra)
    row = OIL_READ | {
        "level_m": fill * 15.0, "free_water_level_m": water * fill * 15.0, "liquid_temperature_c": celsius,
        "observed_density_temperature_c": sampled, "sediment_water_pct": wet,
    }  # fmt: skip
    s = steps_of(vessel, row)
    factor, _ = redo_geometry(s, vessel, 0.0)
    assert s["K"] == pytest.approx(factor, rel=EXACT)
    assert s["M"] == pytest.approx(redo_liquid(s, GAS_OIL, vessel), rel=EXACT)


@settings(max_examples=30, deadline=None, derandomize=True)
@given(
    fill=fraction, celsius=st.floats(-10.0, 35.0), warmer=st.floats(0.5, 8.0), below=st.floats(0.90, 0.999),
    read=st.sampled_from(["both", "pressure", "neither"]), lying=st.booleans(), shell=shells,
)  # fmt: skip
def test_the_steps_of_a_pressure_vessel_multiply_back_to_its_mass(
    fill: float, celsius: float, warmer: float, below: float, read: str, lying: bool, shell: dict[str, Any]
) -> None:
    vessel = compiled(BULLET if lying else SPHERE, PROPANE, shell=shell | {"thickness_m": 0.02})
    # a pressure near propane's own: 4.74 bar at 0 °C, rising 2.7 % a kelvin (reference equation, from memory)
    pressure = below * 474.0 * math.exp(0.0297 * celsius - 7e-5 * celsius**2)
    row = {"level_m": fill * (3.0 if lying else 18.0), "liquid_temperature_c": celsius, "ambient_temperature_c": 5.0}
    row |= {"pressure_kpa_abs": pressure} if read != "neither" else {}
    row |= {"vapour_temperature_c": celsius + warmer} if read == "both" else {}
    s = steps_of(vessel, row)
    gauge = s["P"] - 101.325 * (1.0 - 2.25577e-5 * 12.0) ** 5.2559  # ISO 2533 at 12 m
    factor, full = redo_geometry(s, vessel, gauge)
    assert s["K"] == pytest.approx(factor, rel=1e-11)  # the barometric formula's constants above have six digits
    assert s["K_T"] == pytest.approx(full, rel=1e-11)
    liquid = redo_liquid(s, PROPANE, vessel)
    vapour = redo_vapour(s, s["K_T"] * s["V_total"] - s["K"] * s["V(h)"])
    assert s["M"] == pytest.approx(liquid + vapour, rel=EXACT)


@settings(max_examples=30, deadline=None, derandomize=True)
@given(celsius=st.floats(-20.0, 60.0), gauge=st.floats(100.0, 9000.0), nitrogen=st.floats(0.0, 0.05))
def test_the_steps_of_a_gas_receiver_multiply_back_to_its_mass(celsius: float, gauge: float, nitrogen: float) -> None:
    vessel = compiled(RECEIVER, HYDROGEN)
    row = GAS_READ | {"vapour_temperature_c": celsius, "pressure_kpa": gauge}
    if nitrogen > 0.01:
        row |= {"vapour_composition": {"hydrogen": 1.0 - nitrogen, "nitrogen": nitrogen}}
    s = steps_of(vessel, row)
    assert s["V_total"] == 95.0
    assert s["M"] == pytest.approx(redo_vapour(s, 95.0 * s["K_T"]), rel=EXACT)


@pytest.mark.parametrize(
    ("vessel", "row"),
    [
        (compiled(TANK), OIL_READ),
        (compiled(TANK, floating_roof=ROOF), OIL_READ | {"level_m": 1.95}),
        (compiled(BULLET, PROPANE, shell={"thickness_m": 0.018}), LPG_READ),
        (compiled(RECEIVER, HYDROGEN), GAS_READ),
    ],
    ids=["tank", "roof", "bullet", "receiver"],
)
def test_a_budgets_contributions_squared_and_summed_are_the_uncertainty_squared(
    vessel: CompiledVessel, row: dict[str, Any]
) -> None:
    found = answer(vessel, row, budget=True)
    lines = found["budget"]
    total = math.fsum(line["contribution_kg"] ** 2 for line in lines)
    assert math.sqrt(total) == pytest.approx(found["mass_uncertainty_kg"], rel=1e-12)
    for line in lines:
        product = line["sensitivity"] * line["standard_uncertainty"]
        assert product == pytest.approx(line["contribution_kg"], rel=1e-12)
    sizes = [abs(line["contribution_kg"]) for line in lines]
    assert sizes == sorted(sizes, reverse=True)


def test_a_declared_error_is_told_from_a_default() -> None:
    vessel = compiled(TANK, instruments={"level_m": {"random": 0.001, "systematic": 0.002, "instrument": "radar 7"}})
    lines = budget_lines(masses(vessel, OIL_READ), 0)
    level = [line for line in lines if line["input"] == "level_m"]
    assert [line["declared"] for line in level] == [True, True]
    assert {line["standard_uncertainty"] for line in level} == {0.001, 0.002}
    assert {line["instrument"] for line in level} == {"radar 7"}
    temperature = [line for line in lines if line["input"] == "liquid_temperature_c"]
    assert not any(line["declared"] for line in temperature)


HEXANE: dict[str, Any] = {
    "name": "hexane",
    "liquid": {"model": "expansivity", "density_kg_m3": 655.0, "at_temperature_c": 25.0, "expansivity_per_k": 1.39e-3,
               "compressibility_per_kpa": 1.7e-6},
    "vapour": {"model": "virial", "components": [{"id": "n-hexane", "mole_fraction": 1.0}]},
}  # fmt: skip
BLANKETED: dict[str, Any] = {"vapour_space": {"kind": "blanketed", "blanket": "nitrogen"}}


def words_of(vessel: CompiledVessel, row: dict[str, Any]) -> dict[str, str]:
    return {step["symbol"]: step["method"] for step in working_steps(masses(vessel, row), 0)}


def test_a_blanketed_space_shows_the_product_by_its_vapour_pressure_and_the_blanket_by_the_rest() -> None:
    """n-Hexane at 25 °C under nitrogen at 103 kPa, 500 m³ of room, by hand.

    Antoine (constants from memory): log10 p/mmHg = 6.87601 − 1171.17/(224.41 + 25), so p = 151.3 mmHg = 20.17 kPa.
    With Z = 1 + B p/(R T), B = −1,900 cm³/mol at 25 °C (compilations of measured values, from memory): Z = 0.9845.
    500 m³ × 20,170 Pa × 0.08618 kg/mol / (0.9845 R 298.15 K) = 356.1 kg. Nitrogen has 103 − 20.17 = 82.83 kPa.
    """
    vessel = compiled({"kind": "box", "length_m": 10.0, "width_m": 10.0, "height_m": 10.0}, HEXANE,
                      shell={"expansion_per_k": 0.0}, **BLANKETED)  # fmt: skip
    row = {"level_m": 5.0, "liquid_temperature_c": 25.0, "vapour_temperature_c": 25.0, "pressure_kpa_abs": 103.0}
    s, words = steps_of(vessel, row), words_of(vessel, row)
    assert s["P"] == pytest.approx(20.17, rel=0.005)
    assert s["P_b"] == pytest.approx(82.83, rel=0.002)
    assert s["M_vapour"] == pytest.approx(356.1, rel=0.005)
    assert s["M"] == s["M_liquid"] + s["M_vapour"]  # no nitrogen in it
    assert words["P_b"].startswith("nitrogen: ") and "counts in no mass" in words["P_b"]
    gone = row | {"pressure_kpa_abs": 15.0}
    assert steps_of(vessel, gone)["P_b"] == 0.0
    assert steps_of(vessel, gone)["P"] == 15.0


def test_without_a_vapour_model_nothing_is_counted_under_a_blanket() -> None:
    plain = {name: part for name, part in HEXANE.items() if name != "vapour"}
    vessel = compiled(TANK, plain, **BLANKETED)
    found = answer(vessel, {"level_m": 5.0, "liquid_temperature_c": 25.0, "pressure_kpa_abs": 103.0})
    assert found["mass_kg"] == found["liquid_mass_kg"]
    assert found["vapour_mass_kg"] is None


@pytest.mark.parametrize(
    ("read", "said"),
    [
        ({"vapour_temperature_c": 23.0, "pressure_kpa_abs": 790.0}, "as read"),
        ({"pressure_kpa_abs": 790.0}, "saturated at the measured pressure"),
        ({}, "no pressure is read: saturated at the liquid's temperature"),
        ({"vapour_temperature_c": 12.0, "pressure_kpa_abs": 790.0}, "taken as saturated at its pressure"),
        ({"vapour_temperature_c": 23.0, "pressure_kpa_abs": 4500.0}, "no vapour of the substance stands"),
        ({"pressure_kpa_abs": 4500.0}, "no vapour of the substance stands"),
        ({"pressure_kpa_abs": 1e-6}, "that of the liquid: at the pressure as read its own boiling point is not known"),
    ],
)
def test_the_working_says_how_a_vapours_temperature_was_found(read: dict[str, float], said: str) -> None:
    row = {"level_m": 1.4, "liquid_temperature_c": 18.1, "ambient_temperature_c": 9.0} | read
    vessel = compiled(BULLET, PROPANE)
    assert said in words_of(vessel, row)["T_v"]
    lines = [line for line in answer(vessel, row, budget=True)["budget"] if line["input"] == "vapour_temperature_c"]
    if "vapour_temperature_c" not in read:  # 3 K of doubt, where no thermometer says more
        assert [line["standard_uncertainty"] for line in lines] == [3.0]
        assert not lines[0]["declared"]
    else:
        assert 3.0 not in [line["standard_uncertainty"] for line in lines]


def test_a_glass_hydrometers_reading_and_its_factor_stand_before_the_density() -> None:
    """1 − 2.3e-5 (t − 15) − 2e-8 (t − 15)² at 25 °C: 0.999768 (API MPMS 11.1-1980, table 53)."""
    row = OIL_READ | {"observed_density_temperature_c": 25.0}
    plain = steps_of(compiled(TANK), row)
    glass = steps_of(compiled(TANK), row | {"observed_density_by": "hydrometer"})
    assert "ρ_h" not in plain and "HYC" not in plain
    assert glass["HYC"] == pytest.approx(0.999768, abs=5e-9)
    assert glass["ρ_h"] == pytest.approx(843.1, rel=EXACT)
    assert glass["ρ_s"] == pytest.approx(843.1 * 0.999768, rel=EXACT)
