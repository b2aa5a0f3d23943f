"""An inventory: the mass in a vessel at an instant, with its standard uncertainty and its grounds."""

from __future__ import annotations

from typing import Literal

from pydantic import ConfigDict, Field

from app.schemas.statement import TankStatement
from app.schemas.types import Answer, AnsweredInstant, Items, Known, Quantity, Warned, is_none

Status = Literal["measured", "uncertain", "unmeasured", "out_of_service"]


class Said(Answer):
    """A warning, or why a vessel is unmeasured."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [{"code": "input_assumed", "detail": "pressure_kpa is never read; 0 is assumed."}]
        }
    )

    code: str = Field(description="Stable word for what is said")
    detail: str = Field(description="One sentence with the value, its unit and the limit")


class WarningSaid(Said):
    """Something doubtful about a result that stands."""

    code: Warned = Field(description="Stable word for the kind of doubt")


class InputUsed(Answer):
    """A value that a result was computed from."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [{"quantity": "level_m", "value": 8.231, "age_s": 120.0, "source": "radar", "quality": "good"}]
        }
    )

    quantity: Quantity = Field(description="The quantity; its name ends in its unit")
    value: Known = Field(default=None, description="The value; null for a composition [unit of the quantity]")
    composition: dict[str, float] | None = Field(
        default=None, exclude_if=is_none, description="Mole fractions by component, of a composition [1]"
    )
    age_s: Known = Field(default=None, description="Time since it was measured; negative after the instant [s]")
    source: str | None = Field(default=None, description="Where it comes from; null where it is assumed")
    quality: Literal["good", "uncertain", "assumed"] = Field(description="Its quality, or assumed: never read")


class Check(Answer):
    """A second, independent measurement of something that counts."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "quantity": "level_m", "source": "hand", "at": "2026-03-14T04:30:00Z",
                    "value": 8.22, "difference": -0.011, "standard_uncertainty": 0.0027,
                }
            ]
        }
    )  # fmt: skip

    quantity: Quantity = Field(description="The quantity; its name ends in its unit")
    source: str = Field(description="The source of the second value")
    at: AnsweredInstant = Field(description="When it was measured")
    value: Known = Field(description="The second value [unit of the quantity]")
    difference: Known = Field(
        description="Second value less the one that counts, at its instant [unit of the quantity]"
    )
    standard_uncertainty: Known = Field(description="Standard uncertainty of the difference [unit of the quantity]")


class DefinitionUsed(Answer):
    """The revision of a definition that a result was computed by."""

    model_config = ConfigDict(
        json_schema_extra={"examples": [{"kind": "vessel", "id": "tk-12", "effective_from": None, "revision": 1}]}
    )

    kind: Literal["site", "substance", "vessel", "meter"] = Field(description="What is defined")
    id: str = Field(description="Its id")
    effective_from: AnsweredInstant | None = Field(description="From when it holds; null: for all time before, too")
    revision: int = Field(ge=1, description="Its revision")


class Step(Answer):
    """One step of a working."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "step": "volume correction of the liquid", "symbol": "V15/V",
                    "value": 0.99705, "unit": "1",
                    "method": "β and κ constant, exponential form",
                    "reference": "Smith, Van Ness, Abbott, Introduction to Chemical Engineering "
                    "Thermodynamics, 7th ed., ch. 3",
                }
            ]
        }
    )  # fmt: skip

    step: str = Field(description="What is computed")
    symbol: str = Field(description="Its symbol")
    value: Known = Field(description="Its value [as unit says]")
    unit: str = Field(description="Unit of the value; 1 for a ratio")
    method: str = Field(description="How it is computed")
    reference: str = Field(description="Where the method is published, or common practice")


class Contribution(Answer):
    """One line of a budget: what one unknown error contributes to the uncertainty of the mass."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "input": "level_m", "instrument": "tk-12 level", "standard_uncertainty": 0.002,
                    "sensitivity": 1465000.0, "contribution_kg": 2930.0,
                    "kind": "systematic", "declared": True,
                }
            ]
        }
    )  # fmt: skip

    input: str = Field(description="The input that the error is of")
    instrument: str | None = Field(default=None, description="The instrument whose error it is, where there is one")
    standard_uncertainty: Known = Field(description="Standard uncertainty of the input [unit of the input]")
    sensitivity: Known = Field(description="Change of mass per unit of the input [kg per unit of the input]")
    contribution_kg: Known = Field(description="Their product, with its sign [kg]")
    kind: Literal["random", "systematic", "model"] = Field(description="Fresh each time, standing, or of the method")
    declared: bool = Field(description="False where the uncertainty is a default")


class Inventory(Answer):
    """The mass in one vessel at one instant; what is unknown is null."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "vessel": "tk-12", "substance": "gasoline-95", "at": "2026-03-14T05:00:00Z",
                    "status": "measured", "fill_pct": 45.2, "gross_observed_volume_m3": 15957.4,
                    "free_water_volume_m3": 0.0,
                    "gross_standard_volume_m3": 15910.3, "net_standard_volume_m3": 15907.1,
                    "liquid_density_kg_m3": 742.9, "standard_density_kg_m3": 745.1,
                    "liquid_mass_kg": 11852380.0, "mass_kg": 11852380.0, "mass_uncertainty_kg": 9480.0,
                    "inputs": [
                        {
                            "quantity": "level_m", "value": 8.231, "age_s": 0.0, "source": "radar",
                            "quality": "good",
                        },
                    ],
                    "checks": [], "warnings": [],
                    "definitions": [{"kind": "vessel", "id": "tk-12", "effective_from": None, "revision": 1}],
                }
            ]
        }
    )  # fmt: skip

    vessel: str | None = Field(default=None, exclude_if=is_none, description="The vessel; absent in a calculation")
    substance: str | None = Field(default=None, exclude_if=is_none, description="What it held")
    at: AnsweredInstant | None = Field(default=None, exclude_if=is_none, description="The instant")
    status: Status = Field(description="Whether the mass is measured, uncertain, unmeasured, or out of service")
    reason: Said | None = Field(default=None, exclude_if=is_none, description="Why it is unmeasured")
    fill_pct: Known = Field(default=None, description="Liquid and water in parts of the capacity [%]")
    gross_observed_volume_m3: Known = Field(
        default=None, description="Liquid without free water, shell-corrected, roof deducted [m³]"
    )
    free_water_volume_m3: Known = Field(default=None, description="Free water below the liquid [m³]")
    gross_standard_volume_m3: Known = Field(default=None, description="Liquid in its standard state [m³]")
    net_standard_volume_m3: Known = Field(default=None, description="The same without sediment and water [m³]")
    liquid_density_kg_m3: Known = Field(default=None, description="Density of the liquid in the vessel [kg/m³]")
    standard_density_kg_m3: Known = Field(default=None, description="Density in its standard state [kg/m³]")
    liquid_mass_kg: Known = Field(default=None, description="Mass of the liquid, without sediment and water [kg]")
    vapour_volume_m3: Known = Field(default=None, description="Volume above the liquid, or of the gas [m³]")
    compressibility_factor: Known = Field(default=None, description="Compressibility factor of the vapour or gas [1]")
    vapour_mass_kg: Known = Field(default=None, description="Mass of the substance's vapour or gas [kg]")
    gas_standard_volume_m3: Known = Field(default=None, description="The gas at the gas base conditions [m³]")
    mass_kg: Known = Field(default=None, description="Liquid plus vapour of the substance [kg]")
    moved_kg: Known = Field(
        default=None, exclude_if=is_none,
        description="Of it what transfers moved between the reading and the instant [kg]",
    )  # fmt: skip
    mass_uncertainty_kg: Known = Field(default=None, description="Standard uncertainty of mass_kg [kg]")
    available_mass_kg: Known = Field(default=None, description="Mass of the liquid above the dead stock [kg]")
    weight_in_air_kg: Known = Field(default=None, description="Weight in air of the liquid [kg]")
    inputs: Items[InputUsed] = Field(default=(), description="What it was computed from")
    checks: Items[Check] = Field(default=(), description="Second measurements, against those that count")
    warnings: Items[WarningSaid] = Field(default=(), description="What is doubtful")
    definitions: Items[DefinitionUsed] = Field(default=(), description="The definitions it was computed by")
    working: Items[Step] | None = Field(
        default=None, exclude_if=is_none, description="The steps, where working=true asks for them"
    )
    budget: Items[Contribution] | None = Field(
        default=None,
        exclude_if=is_none,
        description="The uncertainty's parts, where budget=true asks for them",
    )
    statement: TankStatement | None = Field(
        default=None, exclude_if=is_none,
        description="What a tank statement shows of a measured liquid, where statement=true asks for it",
    )  # fmt: skip


class SubstanceTotal(Answer):
    """The mass of one substance in all vessels; errors that vessels share add up as shared."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "substance": "gasoline-95", "mass_kg": 23704740.0, "mass_uncertainty_kg": 14210.0,
                    "vessels": ["tk-12", "tk-14"], "missing": [], "complete": True,
                }
            ]
        }
    )  # fmt: skip

    substance: str = Field(description="The substance")
    mass_kg: Known = Field(description="Mass in the vessels that are measured [kg]")
    mass_uncertainty_kg: Known = Field(description="Its standard uncertainty [kg]")
    vessels: Items[str] = Field(description="The vessels that the total holds")
    missing: Items[str] = Field(description="The vessels that are unmeasured")
    complete: bool = Field(description="Whether none is missing")


class SiteInventory(Answer):
    """Every vessel of a site at one instant."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "at": "2026-03-14T05:00:00Z",
                    "known_at": "2026-03-14T05:00:02.417311Z",
                    "vessels": [],
                    "totals": [],
                }
            ]
        }
    )

    at: AnsweredInstant = Field(description="The instant")
    known_at: AnsweredInstant | None = Field(description="The latest record that the answer includes")
    vessels: Items[Inventory] = Field(description="One for each vessel")
    totals: Items[SubstanceTotal] = Field(description="One for each substance")


class ChangeStep(Answer):
    """What one input changed, the others as far as they were replaced before it."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {"input": "level_m", "unit": "m", "before": 8.231, "after": 8.226, "contribution_kg": -2963.0}
            ]
        }
    )

    input: str = Field(description="The input; its name ends in its unit")
    unit: str = Field(description="Unit of before and after")
    before: Known = Field(default=None, description="Its value at the first instant [unit]")
    after: Known = Field(default=None, description="Its value at the second instant [unit]")
    contribution_kg: Known = Field(
        description="What it changed of the mass; null where it is told together with the next [kg]"
    )


class ChangeTransfer(Answer):
    """What one ticket moved into the vessel; negative out of it."""

    model_config = ConfigDict(json_schema_extra={"examples": [{"transfer": "road-77", "mass_kg": -21840.0}]})

    transfer: str = Field(description="The transfer")
    mass_kg: Known = Field(description="Its part between the instants; null where nobody measured it [kg]")


class Change(Answer):
    """Why the mass in a vessel differs between two instants."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "vessel": "tk-12", "from": "2026-03-14T23:00:00Z", "to": "2026-03-15T05:00:00Z",
                    "mass_before_kg": 4778927.1, "mass_after_kg": 4775964.1, "difference_kg": -2963.0,
                    "steps": [], "transfers": [], "unexplained_kg": -2963.0,
                }
            ]
        }
    )  # fmt: skip

    vessel: str = Field(description="The vessel")
    from_: AnsweredInstant = Field(alias="from", description="The first instant")
    to: AnsweredInstant = Field(description="The second instant")
    known_at: AnsweredInstant | None = Field(default=None, description="The latest record that it includes")
    mass_before_kg: Known = Field(description="Mass at the first instant [kg]")
    mass_after_kg: Known = Field(description="Mass at the second instant [kg]")
    difference_kg: Known = Field(description="After less before; the steps add up to it [kg]")
    steps: Items[ChangeStep] = Field(description="By input, in the order of the chain")
    transfers: Items[ChangeTransfer] = Field(description="What tickets moved in between")
    unexplained_kg: Known = Field(description="The difference less what tickets moved [kg]")
