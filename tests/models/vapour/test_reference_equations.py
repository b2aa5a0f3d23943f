"""Densities against the reference equations of state in CoolProp, over the states of storage.

Each fluid is compared along isotherms from thin gas to its saturation line or 100 bar; what the guard
lets through must be within its expanded uncertainty for 95 % of the states, and within twice it for all.
Run with ``-s`` to see a line a fluid.
"""

import CoolProp
import numpy as np
import pytest

from models.components import component
from models.vapour.fitted import FITTED
from models.vapour.series import VapourColumns, VapourMixture

NAMES = {
    "nitrogen": "Nitrogen", "oxygen": "Oxygen", "argon": "Argon", "carbon-dioxide": "CarbonDioxide",
    "carbon-monoxide": "CarbonMonoxide", "methane": "Methane", "ethane": "Ethane", "propane": "Propane",
    "n-butane": "n-Butane", "isobutane": "IsoButane", "n-pentane": "n-Pentane", "isopentane": "Isopentane",
    "ethylene": "Ethylene", "propylene": "Propylene", "1-butene": "1-Butene", "ammonia": "Ammonia",
    "hydrogen": "Hydrogen", "helium": "Helium", "hydrogen-sulfide": "HydrogenSulfide",
    "sulfur-dioxide": "SulfurDioxide", "water": "Water", "dimethyl-ether": "DimethylEther", "r134a": "R134a",
    "chlorine": "Chlorine", "hydrogen-chloride": "HydrogenChloride",
}  # fmt: skip
MIXTURES = {
    "propane and isobutane": (("propane", "isobutane"), (0.5, 0.5)),
    "propane and butane": (("propane", "n-butane"), (0.6, 0.4)),
    "air": (("nitrogen", "oxygen", "argon"), (0.7812, 0.2096, 0.0092)),
    "nitrogen and carbon dioxide": (("nitrogen", "carbon-dioxide"), (0.5, 0.5)),
    "hydrogen and methane": (("hydrogen", "methane"), (0.2, 0.8)),
    "natural gas": (
        ("methane", "ethane", "propane", "n-butane", "nitrogen", "carbon-dioxide"),
        (0.85, 0.07, 0.03, 0.01, 0.03, 0.01),
    ),
}
SHARES = (0.05, 0.25, 0.5, 0.7, 0.85, 0.95, 0.999)
HIGHEST = 100e5  # Pa

States = tuple[np.ndarray, np.ndarray, np.ndarray]


def states(
    fluid: str, critical: float, lowest: float, highest: float, y: tuple[float, ...] = (1.0,)
) -> States:
    """Pressures, temperatures and molar densities of the gas below its dew line."""
    state = CoolProp.AbstractState("HEOS", fluid)
    if len(y) > 1:
        state.set_mole_fractions(list(y))
    rows = []
    for t in np.linspace(lowest, highest, 9):
        state.unspecify_phase()
        top = HIGHEST
        if t < critical:
            state.update(CoolProp.QT_INPUTS, 1, t)
            top = min(top, state.p())
        state.specify_phase(CoolProp.iphase_gas if t < critical else CoolProp.iphase_supercritical_gas)
        for share in SHARES:
            state.update(CoolProp.PT_INPUTS, share * top, t)
            rows.append((share * top, t, state.rhomolar()))
    p, t, rho = np.array(rows).T
    return p, t, rho


def compare(label: str, mixture: VapourMixture, found: States, capsys: pytest.CaptureFixture[str]) -> None:
    p, t, rho = found
    columns = VapourColumns.from_mixtures([mixture])
    state = columns.state(p, t)
    kept = state.verdict <= 2
    off = 100.0 * np.abs(state.density / (rho * columns.molar_mass[0]) - 1.0)[kept]
    ratio = off / (200.0 * state.model_uncertainty[kept])
    with capsys.disabled():
        print(
            f"\n{label:28s} {mixture.source:11s} {kept.sum():4d} states, {(~kept).sum():3d} refused; off"
            f" P95 {np.percentile(off, 95):.3f} % max {off.max():.3f} %; of its U95 P95"
            f" {np.percentile(ratio, 95):.2f} max {ratio.max():.2f}",
            end="",
        )
    assert kept.sum() >= 20
    assert np.percentile(ratio, 95) <= 1.05
    assert ratio.max() <= 2.0
    # A refusal is for cause: it is dense, near its spinodal, or beyond it.
    refused = state.verdict >= 3
    assert (state.verdict[refused] <= 4).all()


@pytest.mark.parametrize("name", sorted(NAMES))
def test_pure_gas(name: str, capsys: pytest.CaptureFixture[str]) -> None:
    fit, substance = FITTED[name], component(name)
    found = states(NAMES[name], substance.critical_temperature, fit.lowest, fit.highest)
    for source in ("fitted", "correlation"):
        compare(name, VapourMixture((name,), coefficients=source), found, capsys)


@pytest.mark.parametrize("label", MIXTURES)
def test_mixture(label: str, capsys: pytest.CaptureFixture[str]) -> None:
    names, y = MIXTURES[label]
    critical = sum(share * component(n).critical_temperature for n, share in zip(names, y, strict=True))
    lowest = max(250.0, 1.1 * critical) if critical < 260.0 else 260.0
    found = states("&".join(NAMES[n] for n in names), critical * 0.97 if critical > 260.0 else 0.0, lowest,
                   min(420.0, lowest + 150.0) if critical < 260.0 else 0.95 * critical, y)  # fmt: skip
    for source in ("fitted", "correlation"):
        compare(label, VapourMixture(names, y, coefficients=source), found, capsys)


def test_saturated_propane_ammonia_and_carbon_dioxide(capsys: pytest.CaptureFixture[str]) -> None:
    """The vapour above a liquid, where it matters most: the fits are within 0.16 %."""
    for name, temperatures, limit in (
        ("propane", (273.15, 293.15), 0.05), ("ammonia", (273.15, 293.15), 0.02),
        ("n-butane", (273.15, 293.15), 0.01), ("carbon-dioxide", (253.15,), 0.16),
    ):  # fmt: skip
        columns = VapourColumns.from_mixtures([VapourMixture((name,))])
        reference = CoolProp.AbstractState("HEOS", NAMES[name])
        for t in temperatures:
            reference.update(CoolProp.QT_INPUTS, 1, t)
            density = float(columns.state(reference.p(), t).density) / float(columns.molar_mass[0])
            assert 100.0 * abs(density / reference.rhomolar() - 1.0) <= limit
