"""Pure substances: molar mass and critical constants, and the class that a correlation needs.

The critical constants and acentric factors are those of each substance's reference equation of state,
rounded as the equations' papers print them. The classes say which polar term and which pair rule apply.
The two constants of COSTALD are a fit to measured liquid densities, printed beside the method.
"""

from __future__ import annotations

from dataclasses import dataclass

from models.constants import GAS_CONSTANT, STANDARD_ATMOSPHERE
from models.errors import DefinitionError

SOURCE = "critical constants of the substance's reference equation of state"
GIVEN = "given with the substance"
POLAR_FAMILIES = frozenset(
    ("water", "ammonia", "methanol", "alkanol", "ether", "ketone", "haloalkane", "polar")
)


@dataclass(frozen=True)
class Component:
    """One pure substance.

    Parameters
    ----------
    id, name : str
        The id on the wire, and the name. [1]
    molar_mass : float
        Molar mass. [kg/mol]
    critical_temperature, critical_pressure, critical_volume : float
        The critical point. [K, Pa, m3/mol]
    acentric_factor : float
        Acentric factor. [1]
    family : str
        ``simple``, ``alkane``, ``hydrocarbon``, ``quantum`` or one of the polar families. [1]
    carbons : int
        Carbon atoms of an alkane, 0 for anything else. [1]
    dipole : float
        Dipole moment where the family's polar term needs it, else 0. [D]
    source : str
        Where the constants come from. [1]
    characteristic_volume : float or None
        Characteristic volume V* of COSTALD; None where none was published. [m³/mol]
    srk_acentric_factor : float or None
        Acentric factor of COSTALD; None where none was published. [1]
    """

    id: str
    name: str
    molar_mass: float
    critical_temperature: float
    critical_pressure: float
    critical_volume: float
    acentric_factor: float
    family: str = "simple"
    carbons: int = 0
    dipole: float = 0.0
    source: str = SOURCE
    characteristic_volume: float | None = None
    srk_acentric_factor: float | None = None

    @property
    def costald(self) -> tuple[float, float]:
        """V* and the acentric factor of COSTALD; the critical volume and ω, where none is known. [m³/mol, 1]"""
        volume, acentric = self.characteristic_volume, self.srk_acentric_factor
        return (
            self.critical_volume if volume is None else volume,
            self.acentric_factor if acentric is None else acentric,
        )

    @property
    def costald_estimated(self) -> bool:
        """V* is the critical volume, which is common practice where none was fitted. [1]"""
        return self.characteristic_volume is None

    @property
    def quantum(self) -> bool:
        """A light gas whose corresponding states need effective critical constants. [1]"""
        return self.family == "quantum"

    @property
    def polar(self) -> bool:
        """A substance for which a nonpolar correlation is not good enough. [1]"""
        return self.family in POLAR_FAMILIES

    @property
    def polar_terms(self) -> tuple[float, float]:
        """The two polar parameters a and b of the Tsonopoulos correlation. [1]"""
        return polar_terms(self.family, self.dipole, self.critical_temperature, self.critical_pressure)


def polar_terms(
    family: str, dipole: float, critical_temperature: float, critical_pressure: float
) -> tuple[float, float]:
    """Parameters a and b of the polar term ``a/Tr^6 - b/Tr^8`` of the Tsonopoulos correlation.

    Parameters
    ----------
    family : str
        The family of the substance; one without a polar term gives 0, 0. [1]
    dipole : float
        Dipole moment. [D]
    critical_temperature, critical_pressure : float
        The critical point. [K, Pa]

    Returns
    -------
    tuple of float
        a and b. [1]

    Notes
    -----
    With the reduced dipole ``m = 1e5 mu2 Pc / Tc2`` (mu in debye, Pc in atm, Tc in K)::

        ketones, ethers   a = -2.14e-4 m - 4.308e-21 m^8               (1)
        haloalkanes       a = -2.188e-11 m^4 - 7.831e-21 m^8           (2)
        1-alkanols        a = 0.0878, b = 0.00908 + 6.957e-4 m         (3)

    The exponent of eq. 2 is printed as -4 in circulation, which makes B of R134a five orders too large;
    -11 brings it within 2 % of the reference equation at 300 K. Ammonia's a was fitted to the second
    virial coefficient of its reference equation of state, 250 to 487 K (1.7 % at most).

    References
    ----------
    .. [1] C. Tsonopoulos, AIChE J. 20 (1974) 263-272; 21 (1975) 827-829; 24 (1978) 1112-1115.
    """
    reduced = 1e5 * dipole**2 * critical_pressure / STANDARD_ATMOSPHERE / critical_temperature**2
    if family in ("ketone", "ether"):
        return -2.14e-4 * reduced - 4.308e-21 * reduced**8, 0.0  # eq. 1
    if family == "haloalkane":
        return -2.188e-11 * reduced**4 - 7.831e-21 * reduced**8, 0.0  # eq. 2
    if family == "alkanol":
        return 0.0878, 0.00908 + 6.957e-4 * reduced  # eq. 3
    fixed = {"methanol": (0.0878, 0.0525), "water": (-0.0109, 0.0), "ammonia": (-0.0215, 0.0)}
    return fixed.get(family, (0.0, 0.0))


# id, name, g/mol, Tc/K, Pc/kPa, Vc/(cm3/mol), acentric factor, family, alkane carbons, dipole/D
_TABLE = (
    ("nitrogen", "nitrogen", 28.0134, 126.192, 3395.8, 89.4142, 0.0372, "simple", 0, 0.0),
    ("oxygen", "oxygen", 31.9988, 154.581, 5043, 73.3676, 0.0222, "simple", 0, 0.0),
    ("argon", "argon", 39.948, 150.687, 4863, 74.5855, -0.00219, "simple", 0, 0.0),
    ("carbon-dioxide", "carbon dioxide", 44.0095, 304.1282, 7377.3, 94.1185, 0.2239, "simple", 0, 0.0),
    ("carbon-monoxide", "carbon monoxide", 28.0101, 132.86, 3494, 92.1659, 0.0497, "simple", 0, 0.0),
    ("methane", "methane", 16.04246, 190.564, 4599.2, 98.6278, 0.01142, "alkane", 1, 0.0),
    ("ethane", "ethane", 30.06904, 305.322, 4872.2, 145.839, 0.0995, "alkane", 2, 0.0),
    ("propane", "propane", 44.09562, 369.89, 4251.2, 200, 0.1521, "alkane", 3, 0.0),
    ("n-butane", "n-butane", 58.1222, 425.125, 3796, 254.922, 0.201, "alkane", 4, 0.0),
    ("isobutane", "isobutane", 58.1222, 407.81, 3629, 257.748, 0.184, "alkane", 4, 0.0),
    ("n-pentane", "n-pentane", 72.14878, 469.7, 3367.5, 311.526, 0.251, "alkane", 5, 0.0),
    ("isopentane", "isopentane", 72.14878, 460.35, 3378, 305.717, 0.2274, "alkane", 5, 0.0),
    ("n-hexane", "n-hexane", 86.17536, 507.82, 3044.1, 369.549, 0.3, "alkane", 6, 0.0),
    ("n-heptane", "n-heptane", 100.2019, 540.2, 2735.73, 429.185, 0.349, "alkane", 7, 0.0),
    ("n-octane", "n-octane", 114.2285, 568.74, 2483.59, 492.368, 0.398, "alkane", 8, 0.0),
    ("n-nonane", "n-nonane", 128.2551, 594.55, 2281, 552.486, 0.4433, "alkane", 9, 0.0),
    ("n-decane", "n-decane", 142.2817, 617.7, 2103, 609.756, 0.4884, "alkane", 10, 0.0),
    ("cyclohexane", "cyclohexane", 84.15948, 553.6, 4080.5, 310.174, 0.2096, "hydrocarbon", 0, 0.0),
    ("ethylene", "ethylene", 28.05316, 282.35, 5041.8, 130.945, 0.0866, "hydrocarbon", 0, 0.0),
    ("propylene", "propylene", 42.07974, 364.211, 4555, 183.251, 0.146, "hydrocarbon", 0, 0.0),
    ("1-butene", "1-butene", 56.10632, 419.29, 4005.1, 235.849, 0.192, "hydrocarbon", 0, 0.0),
    ("isobutene", "isobutene", 56.10632, 418.09, 4009.8, 239.808, 0.193, "hydrocarbon", 0, 0.0),
    ("cis-2-butene", "cis-2-butene", 56.10632, 435.75, 4225.5, 235.627, 0.202, "hydrocarbon", 0, 0.0),
    ("trans-2-butene", "trans-2-butene", 56.10632, 428.61, 4027.3, 237.361, 0.21, "hydrocarbon", 0, 0.0),
    ("benzene", "benzene", 78.11184, 562.02, 4907.277, 256.345, 0.211, "hydrocarbon", 0, 0.0),
    ("toluene", "toluene", 92.13842, 591.75, 4126.3, 315.557, 0.2657, "hydrocarbon", 0, 0.0),
    ("ethylbenzene", "ethylbenzene", 106.165, 617.12, 3622.4, 364.828, 0.305, "hydrocarbon", 0, 0.0),
    ("o-xylene", "o-xylene", 106.165, 630.259, 3737.5, 372.509, 0.312, "hydrocarbon", 0, 0.0),
    ("m-xylene", "m-xylene", 106.165, 616.89, 3534.6, 375.235, 0.326, "hydrocarbon", 0, 0.0),
    ("p-xylene", "p-xylene", 106.165, 616.168, 3531.5, 371.206, 0.324, "hydrocarbon", 0, 0.0),
    ("ammonia", "ammonia", 17.03052, 405.56, 11363.4, 73.014, 0.256, "ammonia", 0, 0.0),
    ("hydrogen", "hydrogen", 2.01588, 33.145, 1296.4, 64.4828, -0.219, "quantum", 0, 0.0),
    ("helium", "helium", 4.002602, 5.1953, 228.32, 57.5252, -0.3836, "quantum", 0, 0.0),
    ("neon", "neon", 20.1797, 44.4, 2661.63, 41.4938, -0.0355, "quantum", 0, 0.0),
    ("hydrogen-sulfide", "hydrogen sulfide", 34.08088, 373.1, 9000, 98.1354, 0.1005, "simple", 0, 0.0),
    ("sulfur-dioxide", "sulfur dioxide", 64.0638, 430.64, 7886.6, 123.793, 0.256, "polar", 0, 0.0),
    ("nitrous-oxide", "nitrous oxide", 44.0128, 309.52, 7245, 97.371, 0.162, "simple", 0, 0.0),
    ("carbonyl-sulfide", "carbonyl sulfide", 60.0751, 378.77, 6370, 134.953, 0.0978, "simple", 0, 0.0),
    ("sulfur-hexafluoride", "sulfur hexafluoride", 146.0554, 318.7232, 3754.983, 196.761, 0.218,
     "simple", 0, 0.0),
    ("water", "water", 18.01528, 647.096, 22064, 55.948, 0.3443, "water", 0, 0.0),
    ("dimethyl-ether", "dimethyl ether", 46.06844, 400.378, 5336.8, 168.35, 0.196, "ether", 0, 1.3),
    ("r134a", "1,1,1,2-tetrafluoroethane", 102.0309, 374.21, 4059.28, 199.32, 0.3268, "haloalkane", 0, 2.058),
    ("chlorine", "chlorine", 70.906, 416.8654, 7642.4, 124.069, 0.07, "polar", 0, 0.0),
    ("hydrogen-chloride", "hydrogen chloride", 36.46094, 324.68, 8313.5, 84.246, 0.129, "polar", 0, 0.0),
    ("methanol", "methanol", 32.04186, 513.38, 8215.85, 113.828, 0.5625, "methanol", 0, 0.0),
    ("ethanol", "ethanol", 46.06844, 514.71, 6268, 168.634, 0.646, "alkanol", 0, 1.69),
    ("acetone", "acetone", 58.07914, 508.1, 4692.4, 212.766, 0.3071, "ketone", 0, 2.88),
)  # fmt: skip

# V*/(L/mol) and acentric factor of COSTALD: R. W. Hankinson, G. H. Thomson, AIChE J. 25 (1979) 653-663, as
# R. C. Reid, J. M. Prausnitz, B. E. Poling, "The Properties of Gases and Liquids", 4th ed., McGraw-Hill, 1987,
# reprint it. Ethylene's acentric factor circulates as 0.8282 as well, a slip that makes its liquid 23 % too
# dense; 0.0852 (from memory) is within 0.8 % of its reference equation. Water's V* was fitted together with
# -0.65445 (from memory, within 2.5 %), not with the 0.3852 of its vapour pressure, 32 % off beside it.
# Hydrogen and helium are left out: the equation misses their liquids by 11 and 30 %.
COSTALD: dict[str, tuple[float, float]] = {
    "nitrogen": (0.09012, 0.0358),
    "oxygen": (0.07382, 0.0298),
    "carbon-dioxide": (0.09384, 0.2373),
    "carbon-monoxide": (0.09214, 0.0295),
    "methane": (0.09939, 0.0074),
    "ethane": (0.1458, 0.0983),
    "propane": (0.2001, 0.1532),
    "n-butane": (0.2544, 0.2008),
    "isobutane": (0.2568, 0.1825),
    "n-pentane": (0.3113, 0.2522),
    "isopentane": (0.3096, 0.24),
    "n-hexane": (0.3682, 0.3007),
    "n-heptane": (0.4304, 0.3507),
    "n-octane": (0.4904, 0.3998),
    "n-nonane": (0.5529, 0.4478),
    "n-decane": (0.6192, 0.4916),
    "cyclohexane": (0.309, 0.2128),
    "ethylene": (0.131, 0.0852),
    "propylene": (0.1829, 0.1455),
    "1-butene": (0.2377, 0.1921),
    "isobutene": (0.2369, 0.1959),
    "cis-2-butene": (0.2311, 0.2039),
    "trans-2-butene": (0.2367, 0.2153),
    "benzene": (0.2564, 0.2137),
    "toluene": (0.3137, 0.2651),
    "ethylbenzene": (0.3702, 0.3048),
    "o-xylene": (0.3673, 0.3118),
    "m-xylene": (0.374, 0.3216),
    "p-xylene": (0.374, 0.3216),
    "ammonia": (0.07013, 0.262),
    "hydrogen-sulfide": (0.09941, 0.1039),
    "sulfur-dioxide": (0.1204, 0.2645),
    "nitrous-oxide": (0.09802, 0.1691),
    "carbonyl-sulfide": (0.141, 0.1021),
    "water": (0.04357, -0.65445),
    "chlorine": (0.1223, 0.0822),
    "hydrogen-chloride": (0.08383, 0.1254),
    "methanol": (0.1198, 0.5536),
    "ethanol": (0.1752, 0.6378),
    "acetone": (0.208, 0.3149),
}  # fmt: skip


def _substance(row: tuple[str, str, float, float, float, float, float, str, int, float]) -> Component:
    """One row of the table in SI."""
    name, title, molar, temperature, pressure, volume, acentric, family, carbons, dipole = row
    characteristic, srk = COSTALD.get(name, (None, None))
    return Component(
        name, title, molar * 1e-3, temperature, pressure * 1e3, volume * 1e-6, acentric, family, carbons, dipole,
        characteristic_volume=None if characteristic is None else characteristic * 1e-3,
        srk_acentric_factor=srk,
    )  # fmt: skip


COMPONENTS: dict[str, Component] = {row[0]: _substance(row) for row in _TABLE}


def component(component_id: str) -> Component:
    """The substance of an id.

    Parameters
    ----------
    component_id : str
        One of the ids of ``COMPONENTS``. [1]

    Returns
    -------
    Component
        The substance. [1]
    """
    found = COMPONENTS.get(component_id)
    if found is None:
        raise DefinitionError(
            f"component {component_id!r} is not in the table; give its critical temperature, critical"
            f" pressure, acentric factor and molar mass, or use one of {', '.join(sorted(COMPONENTS))}",
            field="components",
        )
    return found


# What a constant can be at all: a slip of unit falls outside.
_LIMITS = {
    "critical_temperature": (2.0, 2000.0, "K"),
    "critical_pressure": (1e5, 5e7, "Pa"),
    "acentric_factor": (-1.0, 2.0, ""),
    "molar_mass": (1e-3, 2.0, "kg/mol"),
    "critical_volume": (1e-5, 5e-3, "m3/mol"),
    "characteristic_volume": (1e-5, 5e-3, "m3/mol"),
    "srk_acentric_factor": (-1.0, 2.0, ""),
}


def given_component(
    component_id: str,
    *,
    critical_temperature: float,
    critical_pressure: float,
    acentric_factor: float,
    molar_mass: float,
    critical_volume: float | None = None,
    characteristic_volume: float | None = None,
    srk_acentric_factor: float | None = None,
) -> Component:
    """A substance that the table lacks, from the constants that its user gives.

    Parameters
    ----------
    component_id : str
        Its id. [1]
    critical_temperature, critical_pressure : float
        The critical point. [K, Pa]
    acentric_factor : float
        Acentric factor. [1]
    molar_mass : float
        Molar mass. [kg/mol]
    critical_volume : float or None
        Critical volume; left out, it is estimated. [m3/mol]
    characteristic_volume : float or None
        Characteristic volume V* of COSTALD; left out, the critical volume stands in. [m³/mol]
    srk_acentric_factor : float or None
        Acentric factor of COSTALD; left out, the acentric factor stands in. [1]

    Returns
    -------
    Component
        The substance, taken as nonpolar. [1]

    Notes
    -----
    The critical volume, where it is left out::

        Zc = 0.2905 - 0.085 omega,  Vc = Zc R Tc / Pc        (1)

    References
    ----------
    .. [1] B. I. Lee, M. G. Kesler, AIChE J. 21 (1975) 510-527, eq. 22 (from memory).
    """
    _check(
        component_id, critical_temperature=critical_temperature, critical_pressure=critical_pressure,
        acentric_factor=acentric_factor, molar_mass=molar_mass, characteristic_volume=characteristic_volume,
        srk_acentric_factor=srk_acentric_factor,
    )  # fmt: skip
    if critical_volume is None:
        compression = 0.2905 - 0.085 * acentric_factor  # eq. 1
        critical_volume = compression * GAS_CONSTANT * critical_temperature / critical_pressure
    _check(component_id, critical_volume=critical_volume)
    return Component(
        component_id,
        component_id,
        molar_mass,
        critical_temperature,
        critical_pressure,
        critical_volume,
        acentric_factor,
        source=GIVEN,
        characteristic_volume=characteristic_volume,
        srk_acentric_factor=srk_acentric_factor,
    )


def _check(component_id: str, **values: float | None) -> None:
    """Refuse a constant that no substance has."""
    for field, value in values.items():
        low, high, unit = _LIMITS[field]
        if value is not None and not low <= value <= high:
            raise DefinitionError(
                f"{field} of component {component_id!r} is {value} {unit};"
                f" it lies between {low:g} and {high:g}",
                field=field,
            )
