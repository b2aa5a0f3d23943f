"""Units of the wire become the unit of the field, here and nowhere else: feeds and tables both ask for it.

A unit is read once, for a column or a tag, into a factor and an offset, which are the exact rational
numbers rounded once. What a value becomes is then pinned to the last bit: value × factor + offset.
Feet, inches and fractions, and degrees API, have rules of their own.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass
from fractions import Fraction
from functools import cache, lru_cache
from typing import NoReturn

import pint

from app.schemas.errors import unit_of
from app.schemas.types import MEASURED
from models.constants import WATER_DENSITY_60F
from models.units import density_of_api_gravity

# Unit that a field's name ends in, as the registry spells it. Gauge or absolute is the field's own matter.
TARGETS = {
    "m": "meter",
    "m³": "meter ** 3",
    "kg": "kilogram",
    "kPa": "kilopascal",
    "kPa absolute": "kilopascal",
    "°C": "degree_Celsius",
    "kg/m³": "kilogram / meter ** 3",
}
# Parts of a whole; the registry would also take an angle for one.
PARTS = {"%": Fraction(1), "percent": Fraction(1), "1": Fraction(100), "ppm": Fraction(1, 10_000)}
# Of these the registry knows another one: a barrel of this trade has 42 US gallons, 9,702 cubic inches.
OWN = dict.fromkeys(("bbl", "bbls", "barrel", "barrels"), "oil_barrel") | {"°C": "degC", "°F": "degF", "%": "percent"}
# Names that mean one thing on one side of an ocean and another on the other; short_ton and t say which.
AMBIGUOUS = {"ton", "tons", "cwt", "hundredweight", "hundredweights"}
# A prefix goes with these only: an M before barrels, gallons or pounds means a thousand to some.
PREFIXED = {"meter", "gram", "liter", "pascal", "bar", "newton", "metric_ton", "meter_Hg", "meter_H2O", "kelvin"}

# What may reach the registry's own parser, which would work out 9**9**9: a few names, each to the third at most.
_NAME = r"°?[A-Za-zµ%]+(?:[0-9_]+[A-Za-z]+)*"
_FACTOR = re.compile(rf"(?P<name>{_NAME})(?:(?:\^|\*\*)?(?P<power>[123²³]))?")
_UNIT = re.compile(rf"{_FACTOR.pattern}(?:[*/·]{_NAME}(?:(?:\^|\*\*)?[123²³])?){{0,3}}")
UNIT_LENGTH = 40
_NUMBER = re.compile(r"[+-]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]{1,3})?")
NUMBER_LENGTH = 400


class UnitError(ValueError):
    """A unit that is not known, or not one of the quantity; the sentence repeats nothing of it."""

    def __init__(self, code: str, detail: str) -> None:
        super().__init__(detail)
        self.code = code
        self.detail = detail


@dataclass(frozen=True)
class Conversion:
    """From a declared unit to that of a field; ``rule`` names what no factor and offset can do."""

    field: str
    factor: float = 1.0
    offset: float = 0.0
    rule: str | None = None

    def number(self, value: float) -> float:
        """A number in the declared unit as the field's; never −0.0, because the offset is never −0.0."""
        if self.rule is not None:
            return RULES[self.rule](repr(value))
        return value * self.factor + self.offset

    def text(self, text: str) -> float:
        """What stands in a cell as the field's number; ``ValueError`` where it is none."""
        return RULES[self.rule](text) if self.rule is not None else self.number(number_of(text))

    @property
    def form(self) -> str:
        """What is expected, in words."""
        return FORMS.get(self.rule or "", f"{self.field} is a number, in the unit that is declared.")


def number_of(text: str) -> float:
    """A plain decimal number: no grouping, no decimal comma, no word such as nan."""
    if len(text) > NUMBER_LENGTH or _NUMBER.fullmatch(text) is None:
        raise ValueError("not a number")
    return float(text)


# --- rules of their own ---------------------------------------------------------------------------

_FEET = re.compile(r"([+-]?)([0-9]{1,4})-([0-9]{1,2})-([0-9]{1,2})")


def _feet_and_inches(text: str, parts: int) -> float:
    """Metres of feet-inches-fractions: a whole number of fractions of an inch of 0.0254 m, rounded once."""
    found = _FEET.fullmatch(text)
    if found is None:
        raise ValueError("not of the form")
    sign, feet, inches, fractions = found[1], int(found[2]), int(found[3]), int(found[4])
    if inches >= 12 or fractions >= parts:
        raise ValueError("an inch or a fraction that would carry")
    count = (feet * 12 + inches) * parts + fractions
    return (-count if sign == "-" else count) * 254 / (10_000 * parts)


def sixteenths(text: str) -> float:
    """Metres of ``23-04-11``: 23 ft 4 11/16 in."""
    return _feet_and_inches(text, 16)


def eighths(text: str) -> float:
    """Metres of ``23-04-5``: 23 ft 4 5/8 in."""
    return _feet_and_inches(text, 8)


def api_gravity(text: str) -> float:
    """Density of degrees API, at the temperature at which they were observed."""
    degrees = number_of(text)
    if degrees <= -131.5:
        raise ValueError("no density")
    return float(density_of_api_gravity(degrees))


RULES: dict[str, Callable[[str], float]] = {"ft-in-16": sixteenths, "ft-in-8": eighths, "degAPI": api_gravity}
FORMS = {
    "ft-in-16": "Feet, inches and sixteenths are written as 23-04-11, with inches below 12 and sixteenths below 16.",
    "ft-in-8": "Feet, inches and eighths are written as 23-04-5, with inches below 12 and eighths below 8.",
    "degAPI": "Degrees API are a number above -131.5.",
}
OWN_UNITS = {"ft-in-16": "m", "ft-in-8": "m", "degAPI": "kg/m³", "°API": "kg/m³", "RD60/60": "kg/m³"}
"""Units that no registry holds, with the unit of the fields that they are for."""


# --- from a unit to a conversion ------------------------------------------------------------------


@lru_cache(maxsize=1_000)
def conversion(field: str, unit: str) -> Conversion:
    """How values in this unit become those of a field.

    Parameters
    ----------
    field : str
        A quantity of a reading that is one number, such as ``level_m``.
    unit : str
        A unit as it was declared, such as ``ft-in-16``, ``degF`` or ``lb/ft3``.

    Raises
    ------
    UnitError
        ``unknown_unit`` or ``other_dimension``.
    """
    wanted = unit_of(field)
    if unit in OWN_UNITS:
        if OWN_UNITS[unit] != wanted:
            _other_dimension(field, wanted)
        if unit == "RD60/60":
            return Conversion(field, factor=WATER_DENSITY_60F)
        return Conversion(field, rule=unit.replace("°", "deg"))
    if wanted == "%":
        if unit not in PARTS:
            _parsed(unit)
            _other_dimension(field, wanted)
        return Conversion(field, factor=float(PARTS[unit]))
    parsed, target = _parsed(unit), _registry().parse_units(TARGETS[wanted])
    if wanted == "°C" and _FACTOR.fullmatch(unit) is None:
        _other_dimension(field, wanted)  # in a product a degree is a difference of temperatures
    try:
        if parsed.dimensionality != target.dimensionality:
            _other_dimension(field, wanted)
        zero, one = (_registry().Quantity(Fraction(value), parsed).to(target).magnitude for value in (0, 1))
    except pint.PintError:
        _other_dimension(field, wanted)
    return Conversion(field, factor=float(one - zero), offset=float(zero))


def by_quantity(name: str, unit: str) -> Conversion:
    """The conversion of a quantity that is named without its unit: of ``liquid_volume`` the unit chooses which.

    ``UnitError`` as of ``conversion``, and ``unknown_quantity`` where no field has that name.
    """
    fields = FIELDS.get(name, ())
    refused = UnitError("unknown_quantity", "No quantity of a reading has this name.")
    for field in fields:
        try:
            return conversion(field, unit)
        except UnitError as error:
            refused = error
    raise refused


def _without_unit(field: str) -> str:
    """``pressure_abs`` of ``pressure_kpa_abs``: a field's name without its unit, but with what it is measured from."""
    for end in ("_kg_m3", "_kpa", "_m3", "_pct", "_kg", "_m", "_c"):
        for tail in ("", "_abs"):
            if field.endswith(end + tail):
                return field.removesuffix(end + tail) + tail
    return field


FIELDS: dict[str, tuple[str, ...]] = {
    name: tuple(field for field in MEASURED if _without_unit(field) == name) for name in map(_without_unit, MEASURED)
}
"""Fields of each quantity: one, but for a volume in cubic metres or in parts."""


@cache
def _registry() -> pint.UnitRegistry[Fraction]:
    """Definitions as rational numbers; read at the first unit, because it takes a third of a second."""
    return pint.UnitRegistry(non_int_type=Fraction, cache_folder=None)


def _parsed(unit: str) -> pint.Unit:
    if len(unit) > UNIT_LENGTH or _UNIT.fullmatch(unit) is None:
        _unknown()
    spelled = _FACTOR.sub(_factor, unit.replace("·", "*"))
    try:
        return _registry().parse_units(spelled)
    except pint.PintError:
        _unknown()


def _factor(found: re.Match[str]) -> str:
    """One factor of a unit as the registry spells it."""
    name = OWN.get(found["name"], found["name"])
    known = _registry().parse_unit_name(name)
    if not known or name in AMBIGUOUS or name.startswith("delta_"):
        _unknown()
    prefix, stem, _ = known[0]
    if stem == "barrel" or (prefix and stem not in PREFIXED):
        _unknown()
    power = (found["power"] or "1").translate(_RAISED)
    return name if power == "1" else f"{name}**{power}"


_RAISED = str.maketrans("²³", "23")


def _unknown() -> NoReturn:
    detail = (
        "The unit is not known, or means more than one thing; write it as ft-in-16, degF, psi, bbl, lb/ft3, "
        "short_ton or t, and leave gauge or absolute to the name of the quantity."
    )
    raise UnitError("unknown_unit", detail)


def _other_dimension(field: str, wanted: str) -> NoReturn:
    raise UnitError("other_dimension", f"{field} takes a unit that converts to {wanted.removesuffix(' absolute')}.")
