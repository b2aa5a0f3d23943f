"""COSTALD against printed answers, the `chemicals` library and the reference equations of CoolProp."""

from dataclasses import replace

import CoolProp
import numpy as np
import pytest
from chemicals.volume import COSTALD_compressed, COSTALD_mixture
from hypothesis import given, settings
from hypothesis import strategies as st

from models.components import COMPONENTS, Component, component, given_component
from models.constants import GAS_CONSTANT
from models.errors import DefinitionError
from models.liquid.costald import DEPARTURES, GIVEN_DEPARTURE, CostaldColumns

Composition = list[tuple[Component, float]]


def pure(name: str) -> Composition:
    return [(component(name), 1.0)]


def mixture(**parts: float) -> Composition:
    return [(component(name.replace("_", "-")), x) for name, x in parts.items()]


def one(composition: Composition) -> CostaldColumns:
    return CostaldColumns.from_compositions([composition])


# 44.097 g/mol, 369.83 K and 4.248 MPa are those of propane in the examples below
PROPANE = replace(component("propane"), molar_mass=0.044097, critical_temperature=369.83, critical_pressure=4.248e6)
LPG = {"ethane": 0.0009, "propane": 0.2510, "propylene": 0.0001, "isobutane": 0.3555, "n-butane": 0.3925}


def test_saturated_propane_of_the_technical_data_book() -> None:
    # published, API Technical Data Book, example of the procedure: 530.301 kg/m3
    printed = replace(PROPANE, critical_temperature=369.83333, characteristic_volume=0.20008161e-3)
    assert float(one([(printed, 1.0)]).saturated(272.03889).density) == pytest.approx(530.301, abs=5e-4)


def test_a_cargo_of_liquefied_petroleum_gas() -> None:
    # published, SIGTTO/SGS example of an LPG quantity at -38 degrees: 0.6207 kg/L, with a molar mass of 54.58;
    # recomputed from the published equation with critical temperatures of its time: 620.728 kg/m3
    critical = {"propane": 369.83, "isobutane": 408.2, "n-butane": 425.2}
    older = [
        (replace(component(n), critical_temperature=critical.get(n, component(n).critical_temperature)), x)
        for n, x in LPG.items()
    ]
    found = float(one(older).saturated(235.15).density)
    assert found / 1e3 == pytest.approx(0.6207, abs=5e-5)
    assert found == pytest.approx(620.728, abs=1e-3)
    ours = one([(component(name), x) for name, x in LPG.items()])
    # isobutane's critical temperature is 0.4 K lower by its reference equation, the liquid 0.1 kg/m3 lighter
    assert float(ours.saturated(235.15).density) == pytest.approx(620.7, abs=0.1)
    assert float(ours.molar_mass[0]) * 1e3 == pytest.approx(54.58, abs=0.006)


def test_a_compressed_organic_liquid_of_dippr() -> None:
    # published, DIPPR procedure 4C: at 303 K, 98 MPa, from Vs = 1.05047e-4 and Ps = 85857.9 Pa, 9.28748e-5 m3/mol
    liquid = given_component(
        "example", critical_temperature=466.7, critical_pressure=3.64e6, acentric_factor=0.281, molar_mass=0.1,
        characteristic_volume=2e-4,
    )  # fmt: skip
    columns = one([(liquid, 1.0)])
    # the V* and, near enough for 6 digits, the vapour pressure that belong to the example's saturated state
    scale = 1.05047e-4 / (0.1 / float(columns.saturated(303.0).density))
    columns = one([(replace(liquid, characteristic_volume=2e-4 * scale), 1.0)])
    shift = np.log(85857.9 / float(columns.vapour.pressure(303.0)[0]))
    vapour = replace(columns.vapour, log_critical_pressure=columns.vapour.log_critical_pressure + shift)
    columns = replace(columns, vapour=vapour)
    assert float(columns.vapour.pressure(303.0)[0]) == pytest.approx(85857.9, rel=1e-9)
    assert 0.1 / float(columns.point(303.0, 98e6).density) == pytest.approx(9.28748e-5, abs=5e-11)


def test_propane_at_a_tanks_temperatures() -> None:
    # recomputed from the published equation: 507.57 kg/m3 at 15 degrees and 467.49 at 40
    found = one([(PROPANE, 1.0)]).saturated([288.15, 313.15]).density
    assert found == pytest.approx([507.57, 467.49], abs=5e-3)


def test_propane_under_pressure() -> None:
    # recomputed from the published equations: 503.53, 511.53 and 522.83 kg/m3 at 20 degrees and 20, 50, 100 bar,
    # with a vapour pressure that was not recorded
    found = one([(PROPANE, 1.0)]).point(293.15, [20e5, 50e5, 100e5]).density
    assert found == pytest.approx([503.53, 511.53, 522.83], abs=8e-3)


NAMES = sorted(name for name, substance in COMPONENTS.items() if not substance.quantum)
MISCIBLE = [name for name in NAMES if name != "water"]


@st.composite
def compositions(draw: st.DrawFn) -> Composition:
    names = draw(st.lists(st.sampled_from(MISCIBLE), min_size=1, max_size=6, unique=True))
    weights = np.array(draw(st.lists(st.floats(0.01, 1.0), min_size=len(names), max_size=len(names))))
    return [(component(name), float(x)) for name, x in zip(names, weights / weights.sum(), strict=True)]


@settings(derandomize=True, max_examples=150, deadline=None)
@given(composition=compositions(), where=st.floats(0.001, 0.999), above=st.floats(0.0, 5e7))
def test_any_composition_is_that_of_chemicals(composition: Composition, where: float, above: float) -> None:
    columns = one(composition)
    t = float(columns.lowest[0] + where * (columns.highest[0] - columns.lowest[0]))
    x = [fraction for _, fraction in composition]
    critical = [substance.critical_temperature for substance, _ in composition]
    volumes, acentrics = zip(*(substance.costald for substance, _ in composition), strict=True)
    saturated = COSTALD_mixture(x, t, critical, list(volumes), list(acentrics))
    mass = sum(substance.molar_mass * fraction for substance, fraction in composition)
    assert float(columns.saturated(t).density) == pytest.approx(mass / saturated, rel=1e-10)
    bubble, acentric = float(columns.vapour.pressure(t)[0]), float(np.dot(x, acentrics))
    volume = 0.25 * (
        np.dot(x, volumes) + 3.0 * np.dot(x, np.power(volumes, 2.0 / 3.0)) * np.dot(x, np.power(volumes, 1.0 / 3.0))
    )
    pseudo = np.dot(x, np.sqrt(np.multiply(volumes, critical))) ** 2 / volume
    pressure = (
        (0.291 - 0.080 * acentric) * GAS_CONSTANT * pseudo / volume
        if len(x) > 1 else composition[0][0].critical_pressure
    )  # fmt: skip
    expected = COSTALD_compressed(t, bubble + above, bubble, pseudo, pressure, acentric, saturated)
    assert float(columns.point(t, bubble + above).density) == pytest.approx(mass / expected, rel=1e-10)
    assert float(columns.molar_mass[0]) == pytest.approx(mass, rel=1e-12)


@settings(derandomize=True, max_examples=100, deadline=None)
@given(composition=compositions(), where=st.floats(0.01, 0.99), above=st.floats(1e5, 2e7))
def test_the_slopes_are_those_of_the_density(composition: Composition, where: float, above: float) -> None:
    columns = one(composition)
    t = float(columns.lowest[0] + where * (columns.highest[0] - columns.lowest[0]))
    p = float(columns.vapour.pressure(t)[0]) + above
    point = columns.point(t, p)
    step, push = 1e-5 * t, 1e-3 * (p + 1e7)
    if columns.lowest[0] < t - step and p - push > columns.vapour.pressure(t + step)[0]:
        logs = np.log(columns.point([t + step, t - step, t, t], [p, p, p + push, p - push]).density)
        assert float(point.expansivity) == pytest.approx(-(logs[0] - logs[1]) / (2.0 * step), rel=2e-6, abs=1e-9)
        assert float(point.compressibility) == pytest.approx((logs[2] - logs[3]) / (2.0 * push), rel=1e-5)
    along = columns.saturated([t, t + step, t - step])
    secant = -np.log(along.density[1] / along.density[2]) / (2.0 * step)
    assert along.expansivity[0] == pytest.approx(secant, rel=2e-6, abs=1e-9)
    assert along.compressibility[0] == 0.0
    assert point.by_key == 1.0
    assert along.by_key[0] == 1.0


def test_a_pressure_below_the_bubble_pressure_counts_as_saturated() -> None:
    columns = one(pure("propane"))
    low, at = (
        columns.point([293.15, 293.15], [1e5, float(columns.vapour.pressure(293.15)[0])]),
        columns.saturated(293.15),
    )
    assert low.density == pytest.approx([float(at.density)] * 2, rel=1e-15)
    assert low.expansivity == pytest.approx([float(at.expansivity)] * 2, rel=1e-15)
    assert low.compressibility.tolist() == [0.0, 0.0]


def test_outside_its_range_there_is_no_density() -> None:
    # 0.25 and 0.95 of 369.89 K; the vapour pressure of propane begins at 167 K
    columns = one(pure("propane"))
    edges = np.array([92.4, 92.5, 351.3, 351.5, np.nan])
    assert np.isnan(columns.saturated(edges).density).tolist() == [True, False, False, True, True]
    edges[:2] = 166.9, 167.1
    for field in (point := columns.point(edges, 5e6)).__dataclass_fields__:
        assert np.isnan(getattr(point, field)).tolist() == [True, False, False, True, True]
    nothing = columns.point(293.15, np.nan)
    assert all(np.isnan(getattr(nothing, field)) for field in nothing.__dataclass_fields__)
    assert (columns.lowest[0], columns.highest[0]) == (167.0, pytest.approx(351.3955))


def test_a_refusal_names_the_value_the_limits_and_the_way_out() -> None:
    columns = CostaldColumns.from_compositions([pure("propane"), pure("n-decane"), mixture(ethane=0.5, propane=0.5)])
    assert columns.why_outside(0, 293.15) == ""
    hot = columns.why_outside(0, 363.15)
    assert hot == (
        "the liquid temperature is 90.00 °C; COSTALD describes this composition from -106.1 to 78.2 °C"
        " (where its vapour pressure begins to 0.95 of its pseudocritical 96.7 °C); a density_table reaches further"
    )
    assert "from -29.1 to" in columns.why_outside(1, 200.0)
    assert "0.25 of that in kelvin" in one(mixture(methane=0.04, neon=0.0, n_decane=0.96)).why_outside(0, 100.0)


def test_components_too_unlike_each_other_have_no_density_under_pressure() -> None:
    strange = given_component(
        "strange", critical_temperature=647.0, critical_pressure=22e6, acentric_factor=0.344, molar_mass=0.018,
        characteristic_volume=4.357e-5, srk_acentric_factor=-0.654,
    )  # fmt: skip
    columns = one([(strange, 0.5), (component("1-butene"), 0.5)])
    hot = float(columns.highest[0])
    assert np.isnan(columns.point(hot, 1e7).density)
    assert "without resistance to pressure" in columns.why_outside(0, hot)
    assert np.isfinite(columns.point(300.0, 1e7).density)
    assert columns.why_outside(0, 300.0) == ""


@pytest.mark.parametrize(
    "composition", [[], [("propane", 0.5)], [("propane", 1.2), ("n-butane", -0.2)], [("propane", float("nan"))]]
)
def test_fractions_that_are_no_whole_are_refused(composition: list[tuple[str, float]]) -> None:
    with pytest.raises(DefinitionError, match="mole fractions sum to"):
        one([(component(name), x) for name, x in composition])


@pytest.mark.parametrize("name", ["hydrogen", "helium", "neon"])
def test_a_quantum_liquid_is_refused(name: str) -> None:
    with pytest.raises(DefinitionError, match=f"liquid {name}.*density_table"):
        one([(component("methane"), 0.9), (component(name), 0.1)])


def test_water_is_a_liquid_alone_or_none() -> None:
    assert float(one(pure("water")).saturated(300.0).density) == pytest.approx(996.5, rel=0.02)
    with pytest.raises(DefinitionError, match="water mixed with.*free water"):
        one(mixture(propane=0.999, water=0.001))


def test_the_working_is_enough_to_redo_the_density() -> None:
    columns = CostaldColumns.from_compositions([pure("propane"), [(component(n), x) for n, x in LPG.items()]])
    for row, pressure in ((0, 5e6), (1, 2e6), (1, 1e5)):
        w = columns.working(row, 293.15, pressure)
        saturated = w["V*"] * w["V0"] * (1.0 - w["omega"] * w["Vdelta"])
        assert saturated == pytest.approx(w["Vs"], rel=1e-13)
        over = np.log((w["B"] + max(pressure, w["Ps"])) / (w["B"] + w["Ps"]))
        assert w["M"] / (saturated * (1.0 - w["C"] * over)) == pytest.approx(w["rho"], rel=1e-13)
        assert w["M"] / w["V"] == pytest.approx(w["rho"], rel=1e-13)
        assert w["Tr"] == pytest.approx(293.15 / w["Tc"], rel=1e-13)
        assert w["rho"] == columns.point(293.15, pressure, row).density
    assert w["Pc"] == pytest.approx((0.291 - 0.080 * w["omega"]) * GAS_CONSTANT * w["Tc"] / w["V*"], rel=1e-13)


def test_a_stack_of_compositions_is_each_of_them() -> None:
    stack = [pure("propane"), mixture(propane=0.3, n_butane=0.7), pure("argon")]
    columns = CostaldColumns.from_compositions(stack)
    assert columns.estimated == ((), (), ("argon",))
    t, p, row = np.array([280.0, 300.0, 100.0, 260.0]), np.full(4, 3e6), np.array([0, 1, 2, 1])
    found = columns.point(t, p, row)
    for i, which in enumerate(row):
        alone = one(stack[which]).point(t[i], p[i])
        assert found.density[i] == alone.density
        assert found.expansivity[i] == alone.expansivity
        assert found.compressibility[i] == alone.compressibility
        assert columns.saturated(t, row).density[i] == one(stack[which]).saturated(t[i]).density


COOLPROP = {
    "n-butane": "n-Butane", "isobutane": "IsoButane", "n-pentane": "n-Pentane", "isopentane": "Isopentane",
    "n-hexane": "n-Hexane", "n-heptane": "n-Heptane", "n-octane": "n-Octane", "n-nonane": "n-Nonane",
    "n-decane": "n-Decane", "cyclohexane": "CycloHexane", "1-butene": "1-Butene", "isobutene": "IsoButene",
    "cis-2-butene": "cis-2-Butene", "trans-2-butene": "trans-2-Butene", "ethylbenzene": "EthylBenzene",
    "o-xylene": "o-Xylene", "m-xylene": "m-Xylene", "p-xylene": "p-Xylene", "carbon-dioxide": "CarbonDioxide",
    "carbon-monoxide": "CarbonMonoxide", "hydrogen-sulfide": "HydrogenSulfide", "sulfur-dioxide": "SulfurDioxide",
    "nitrous-oxide": "NitrousOxide", "carbonyl-sulfide": "CarbonylSulfide",
    "sulfur-hexafluoride": "SulfurHexafluoride", "dimethyl-ether": "DimethylEther",
    "hydrogen-chloride": "HydrogenChloride", "r134a": "R134a",
}  # fmt: skip


def departures(name: str, composition: Composition) -> tuple[float, float, float, float]:
    """Range, and worst departure at saturation and 100 bar above it (up to Tr = 0.9), from CoolProp 8.0.0."""
    columns = one(composition)
    state = CoolProp.AbstractState("HEOS", COOLPROP.get(name, name.capitalize()))
    low, high = max(float(columns.lowest[0]), state.Ttriple()), float(columns.highest[0])
    t = np.linspace(low, high, 40)
    saturated, compressed = np.empty(t.size), np.empty(t.size)
    for i, kelvin in enumerate(t):
        state.update(CoolProp.QT_INPUTS, 0.0, kelvin)
        saturated[i], pressure = state.rhomass(), state.p() + 1e7
        state.specify_phase(CoolProp.iphase_liquid)
        state.update(CoolProp.PT_INPUTS, pressure, kelvin)
        state.unspecify_phase()
        compressed[i] = state.rhomass()
    high_pressure = columns.vapour.pressure(t)[0] + 1e7
    below = t <= 0.9 * columns.critical_temperature[0]
    at = np.abs(saturated / columns.saturated(t).density - 1.0).max()
    above = np.abs(compressed / columns.point(t, high_pressure).density - 1.0)[below].max()
    return low, high, float(at), float(above)


@pytest.mark.parametrize("name", NAMES)
def test_a_pure_liquid_follows_its_reference_equation(name: str) -> None:
    low, high, at, above = departures(name, pure(name))
    print(f"\n{name:20s} {low:6.1f} to {high:6.1f} K  {100 * at:5.2f} %  {100 * above:5.2f} % at 100 bar more", end="")
    assert at == pytest.approx(DEPARTURES[name], rel=2e-3)
    assert one(pure(name)).departure[0] == DEPARTURES[name]
    assert above < (0.075 if name in ("methanol", "ethanol") else 0.031)


def test_hydrocarbons_given_by_four_constants_are_as_good_as_is_said() -> None:
    worst = 0.0
    for name in NAMES:
        known = component(name)
        if known.family in ("alkane", "hydrocarbon"):
            ours = given_component(
                "ours", critical_temperature=known.critical_temperature, critical_pressure=known.critical_pressure,
                acentric_factor=known.acentric_factor, molar_mass=known.molar_mass,
            )  # fmt: skip
            assert one([(ours, 1.0)]).estimated == (("ours",),)
            worst = max(worst, departures(name, [(ours, 1.0)])[2])
    assert worst == pytest.approx(GIVEN_DEPARTURE, rel=2e-3)
    assert one([(ours, 1.0)]).departure[0] == GIVEN_DEPARTURE


@pytest.mark.parametrize(
    ("parts", "low", "high", "bound"),
    [
        ({"propane": 0.5, "n-butane": 0.5}, 230.0, 330.0, 0.002),
        ({"ethane": 0.05, "propane": 0.95}, 230.0, 330.0, 0.001),
        ({"ethane": 0.02, "propane": 0.4, "isobutane": 0.28, "n-butane": 0.3}, 230.0, 330.0, 0.002),
        ({"propylene": 0.7, "propane": 0.3}, 230.0, 330.0, 0.0055),
        ({"n-pentane": 0.5, "n-hexane": 0.5}, 260.0, 400.0, 0.0035),
        ({"methane": 0.9, "ethane": 0.06, "propane": 0.03, "nitrogen": 0.01}, 100.0, 125.0, 0.004),
    ],
)
def test_a_mixture_follows_the_multifluid_equation(
    parts: dict[str, float], low: float, high: float, bound: float
) -> None:
    """Saturated liquid against the mixture model of CoolProp 8.0.0."""
    state = CoolProp.AbstractState("HEOS", "&".join(COOLPROP.get(name, name.capitalize()) for name in parts))
    state.set_mole_fractions(list(parts.values()))
    columns = one([(component(name), x) for name, x in parts.items()])
    t, expected = np.linspace(low, high, 11), np.empty(11)
    for i, kelvin in enumerate(t):
        state.update(CoolProp.QT_INPUTS, 0.0, kelvin)
        expected[i] = state.rhomass()
    worst = np.abs(columns.saturated(t).density / expected - 1.0).max()
    print(f"\n{parts} {low:g} to {high:g} K  {100 * worst:.2f} %", end="")
    assert 0.5 * bound < worst < bound
    assert worst < columns.departure[0]


@settings(derandomize=True, max_examples=200, deadline=None)
@given(composition=compositions())
def test_a_liquid_is_stiff_up_to_its_last_temperature(composition: Composition) -> None:
    """B + Ps is positive, so that the logarithm exists, and the liquid expands and yields."""
    columns = one(composition)
    t = np.linspace(float(columns.lowest[0]), float(columns.highest[0]), 30)
    point = columns.point(t, columns.vapour.pressure(t)[0] + 1e6)
    assert (point.compressibility > 0.0).all()
    assert (point.expansivity > 0.0).all()
    assert (np.diff(columns.saturated(t).density) < 0.0).all()


def test_a_mixture_departs_as_its_parts_do() -> None:
    # 0.25 and 0.75 of the departures that stand beside the two, 0.001916 and 0.001393, and 0.3 % for mixing
    assert one(mixture(propane=0.25, n_butane=0.75)).departure[0] == pytest.approx(0.00452375, rel=1e-4)
