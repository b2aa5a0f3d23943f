"""What a vapour is made of and how its virial coefficients are to be had; checked when it is built."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise

from models.components import Component, component
from models.errors import DefinitionError
from models.vapour.correlations import SECOND_VIRIAL, THIRD_VIRIAL
from models.vapour.fitted import FITTED
from models.vapour.guard import LIMITS

Measured = float | tuple[tuple[float, float], ...]
COEFFICIENTS = ("fitted", "correlation", "measured")
SUM_TOLERANCE = 1e-6


@dataclass(frozen=True)
class VapourMixture:
    """A gas, or a mixture of gases of known composition.

    Parameters
    ----------
    components : tuple of str or Component
        Ids of the table, or substances given in full. [1]
    mole_fractions : tuple of float
        Mole fractions; they sum to one. [1]
    form : str
        ``density``: Z = 1 + B rho + C rho^2, or ``pressure``: Z = 1 + B' P + C' P^2. [1]
    terms : int
        3, or 2 without C. [1]
    coefficients : str or None
        ``fitted``, ``correlation`` or ``measured``. Left out: measured where values are given, else
        fitted where every component has a fit, and the correlation elsewhere. [1]
    second_virial, third_virial : str
        The correlation. [1]
    measured_second : float, or tuple of (temperature, B)
        Measured second virial coefficient. [m3/mol, or K and m3/mol]
    measured_third : float, or tuple of (temperature, C)
        Measured third virial coefficient; left out, the correlation's. [m6/mol2, or K and m6/mol2]
    """

    components: tuple[str | Component, ...]
    mole_fractions: tuple[float, ...] = (1.0,)
    form: str = "density"
    terms: int = 3
    coefficients: str | None = None
    second_virial: str = "tsonopoulos"
    third_virial: str = "orbey_vera"
    measured_second: Measured | None = None
    measured_third: Measured | None = None

    def __post_init__(self) -> None:
        _check_fractions(self.components, self.mole_fractions)
        if (self.form, self.terms) not in LIMITS:
            raise DefinitionError(
                f"form {self.form!r} with {self.terms} terms is none; a form is density or pressure, with"
                " 3 or 2 terms",
                field="form",
            )
        _check_choice("coefficients", self.coefficients, (None, *COEFFICIENTS))
        _check_choice("second_virial", self.second_virial, tuple(SECOND_VIRIAL))
        _check_choice("third_virial", self.third_virial, tuple(THIRD_VIRIAL))
        if self.coefficients == "measured" and self.measured_second is None:
            raise DefinitionError(
                "coefficients are measured, but no second virial coefficient is given",
                field="second_virial_cm3_mol",
            )
        _check_measured("second_virial_cm3_mol", self.measured_second, 0.02, "m3/mol")
        _check_measured("third_virial_cm6_mol2", self.measured_third, 1e-4, "m6/mol2")
        without = [c.id for c in self.substances if not self._has_fit(c)]
        if self.coefficients == "fitted" and without:
            raise DefinitionError(
                f"coefficients are fitted, but {', '.join(without)} has no fit; use correlation",
                field="coefficients",
            )

    @cached_property
    def substances(self) -> tuple[Component, ...]:
        """The substances that are present. [1]"""
        found = (component(c) if isinstance(c, str) else c for c in self.components)
        return tuple(c for c, y in zip(found, self.mole_fractions, strict=True) if y > 0.0)

    @cached_property
    def fractions(self) -> tuple[float, ...]:
        """Mole fractions of those that are present; their sum is one to the last bits. [1]"""
        total = math.fsum(self.mole_fractions)
        return tuple(y / total for y in self.mole_fractions if y > 0.0)

    @property
    def molar_mass(self) -> float:
        """Molar mass of the mixture. [kg/mol]"""
        return math.fsum(y * c.molar_mass for c, y in zip(self.substances, self.fractions, strict=True))

    @property
    def source(self) -> str:
        """Where the coefficients come from: ``fitted``, ``correlation`` or ``measured``. [1]"""
        if self.coefficients is not None:
            return self.coefficients
        if self.measured_second is not None:
            return "measured"
        return "fitted" if all(self._has_fit(c) for c in self.substances) else "correlation"

    @staticmethod
    def _has_fit(substance: Component) -> bool:
        return substance.id in FITTED and substance == component(substance.id)


def _check_fractions(components: Sequence[str | Component], fractions: Sequence[float]) -> None:
    """Each fraction is one, there is one a component, and together they are a whole."""
    if not components or len(components) != len(fractions):
        raise DefinitionError(
            f"{len(components)} components have {len(fractions)} mole fractions; give one for each",
            field="components",
        )
    ids = [c if isinstance(c, str) else c.id for c in components]
    if len(set(ids)) != len(ids):
        raise DefinitionError(f"a component is named twice in {', '.join(ids)}", field="components")
    for index, fraction in enumerate(fractions):
        if not 0.0 <= fraction <= 1.0:
            raise DefinitionError(
                f"mole fraction of {ids[index]} is {fraction}; it lies between 0 and 1",
                field="mole_fraction",
                index=index,
            )
    total = math.fsum(fractions)
    if abs(total - 1.0) > SUM_TOLERANCE:
        raise DefinitionError(f"mole fractions sum to {total:.9g}, not to one", field="components")


def _check_choice(field: str, value: object, choices: tuple[object, ...]) -> None:
    if value not in choices:
        names = ", ".join(str(choice) for choice in choices if choice is not None)
        raise DefinitionError(f"{field} is {value!r}; it is one of {names}", field=field)


def _check_measured(field: str, measured: Measured | None, largest: float, unit: str) -> None:
    """Measured values are finite, not in another unit by the look of them, and their temperatures rise."""
    if measured is None:
        return
    rows = ((1.0, measured),) if isinstance(measured, (int, float)) else measured  # any temperature does
    if isinstance(measured, tuple) and len(rows) < 2:
        raise DefinitionError(
            f"{field} has {len(rows)} rows; give a number, or two rows or more", field=field
        )
    for index, (temperature, value) in enumerate(rows):
        if not (math.isfinite(temperature) and temperature > 0.0):
            raise DefinitionError(f"{field} has a temperature of {temperature} K", field=field, index=index)
        if not abs(value) <= largest:  # also a NaN
            raise DefinitionError(
                f"{field} is {value} {unit} at row {index}; more than {largest:g} {unit} either way is"
                " another unit, or no gas",
                field=field,
                index=index,
            )
    for index, (one, other) in enumerate(pairwise(row[0] for row in rows)):
        if not other > one:
            raise DefinitionError(
                f"{field} has temperatures {one} K and {other} K in rows {index} and {index + 1}; they rise",
                field=field,
                index=index + 1,
            )
