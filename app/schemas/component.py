"""Components of a mixture, and temperatures that rise: what liquids and vapours say alike."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise
from typing import Annotated, Self, TypeVar

from pydantic import ConfigDict, Discriminator, Field, model_validator
from pydantic_core import PydanticCustomError

from app.schemas.types import Body, ComponentId, refusal

NUMBER_OR_LIST = Discriminator(lambda value: "list" if isinstance(value, list | tuple) else "number")
"""Which of two forms a value has: one number, or a list of them."""
Temperature = Annotated[float, Field(ge=-273.15, le=1000)]
Rows = TypeVar("Rows", bound=Sequence[tuple[float, float]])


def temperatures_rise(rows: Rows) -> Rows:
    """Refuse a table of temperatures that do not rise."""
    if any(after[0] <= before[0] for before, after in pairwise(rows)):
        raise PydanticCustomError("table_falls", "Rows of [t_c, value] rise in temperature, none twice [°C]")
    return rows


class Component(Body):
    """One component of a mixture; an id that is not listed comes with its critical constants."""

    model_config = ConfigDict(json_schema_extra={"examples": [{"id": "propane", "mole_fraction": 1.0}]})

    id: ComponentId = Field(description="Name of the component, such as propane or carbon-dioxide")
    mole_fraction: float = Field(ge=1e-12, le=1, description="Mole fraction [1]")
    critical_temperature_k: float | None = Field(default=None, ge=1, le=5000, description="Critical temperature [K]")
    critical_pressure_kpa_abs: float | None = Field(
        default=None, ge=1, le=1e6, description="Critical pressure [kPa absolute]"
    )
    acentric_factor: float | None = Field(default=None, ge=-1, le=3, description="Acentric factor [1]")
    characteristic_volume_cm3_mol: float | None = Field(
        default=None, ge=10, le=5000,
        description="V* of the liquid's density by corresponding states (COSTALD); beside the four constants, "
        "estimated if left out [cm³/mol]",
    )  # fmt: skip
    srk_acentric_factor: float | None = Field(
        default=None, ge=-1, le=2, description="Acentric factor that goes with V*; beside the four constants [1]"
    )
    molar_mass_g_mol: float | None = Field(default=None, ge=1, le=2000, description="Molar mass [g/mol]")

    @model_validator(mode="after")
    def _all_constants_or_none(self) -> Self:
        constants = {
            "critical_temperature_k",
            "critical_pressure_kpa_abs",
            "acentric_factor",
            "molar_mass_g_mol",
        }
        given = {name for name in constants if getattr(self, name) is not None}
        if given and given != constants:
            lacking = sorted(constants - given)
            raise refusal("missing", f"A component in full also gives {', '.join(lacking)}", lacking[0])
        for name in ("characteristic_volume_cm3_mol", "srk_acentric_factor"):
            if not given and getattr(self, name) is not None:
                raise refusal("conflicting", f"{name} goes with the four constants of a component in full", name)
        return self


def whole(components: Sequence[Component]) -> None:
    """Refuse a mixture whose fractions do not sum to 1, or that names a component twice."""
    if not 0.99 <= sum(one.mole_fraction for one in components) <= 1.01:
        raise refusal("fractions_sum", "Mole fractions sum to 1 within 0.01; these do not", "components")
    if len({one.id for one in components}) < len(components):
        raise refusal("twice", "A component stands once in components", "components")
