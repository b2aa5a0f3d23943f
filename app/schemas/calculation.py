"""The same arithmetic with nothing stored: inventories of one vessel, and the balance of a network."""

from __future__ import annotations

from typing import Annotated, Literal, Self

from pydantic import ConfigDict, Field, Strict, model_validator

from app.schemas.inventory import Inventory
from app.schemas.reading import Values
from app.schemas.reconciliation import Observability
from app.schemas.site import Conditions
from app.schemas.substance import Substance
from app.schemas.types import Answer, Body, Instant, Items, Known, Text, refusal
from app.schemas.vessel import Vessel

# --- inventory ----------------------------------------------------------------------------------

CALCULATED = 10_000
"""Readings of one calculation, at most."""


class CalculationReading(Values):
    """A reading of the one vessel of a calculation; the barometer may stand in it, too."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [{"level_m": 8.231, "liquid_temperature_c": 17.4, "barometric_pressure_kpa_abs": 100.9}]
        }
    )

    taken_at: Instant | None = Field(default=None, description="When it was measured; may be left out")


class CalculationVessel(Vessel):
    """A vessel body; its substance stands beside it and need not be named."""

    name: Text = Field(default="vessel", description="Name for people; may be left out")

    @model_validator(mode="after")
    def _holds_something(self) -> Self:
        return self


class InventoryCalculation(Body):
    """One vessel, one substance, and readings; each reading stands alone."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "site": {"base_temperature_c": 15.0},
                    "vessel": {
                        "name": "box",
                        "shape": {"kind": "box", "length_m": 6.0, "width_m": 2.5, "height_m": 2.0},
                    },
                    "substance": {
                        "name": "gas oil, house grade",
                        "liquid": {
                            "model": "expansivity", "density_kg_m3": 840.0, "at_temperature_c": 15,
                            "expansivity_per_k": 8.3e-4,
                        },
                    },
                    "readings": [{"level_m": 1.2, "liquid_temperature_c": 21.0}],
                }
            ]
        }
    )  # fmt: skip

    site: Conditions = Field(default=Conditions(), description="The states that standard volumes refer to, and the air")
    vessel: CalculationVessel = Field(description="The vessel")
    substance: Substance = Field(description="What it holds")
    readings: Items[CalculationReading] = Field(max_length=CALCULATED, description="The readings")


class InventoryResults(Answer):
    """One inventory for each reading, in their order."""

    model_config = ConfigDict(
        json_schema_extra={"examples": [{"results": [{"status": "measured", "mass_kg": 15044.9}]}]}
    )

    results: Items[Inventory] = Field(description="One for each reading, in order")


# --- balance ------------------------------------------------------------------------------------

BOUNDARY = "boundary:"
NODES, STREAMS = 2_000, 5_000
"""Nodes and streams of one balance, at most."""


class SharedError(Body):
    """One instrument's unknown error; the same wherever the instrument is named."""

    model_config = ConfigDict(json_schema_extra={"examples": [{"instrument": "meter M1", "value": 0.5}]})

    instrument: Text = Field(description="The instrument")
    value: float = Field(
        ge=-1e15,
        le=1e15,
        description="One standard uncertainty, with the sign it acts in [unit of the streams]",
    )


class Stream(Body):
    """What flows from one node to another, measured or not."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "id": "1", "from": "boundary:feed", "to": "A", "value": 101.9, "random": 1.0,
                    "systematic": [{"instrument": "meter M1", "value": 0.5}],
                }
            ]
        }
    )  # fmt: skip

    id: Text = Field(description="Its id")
    from_: Text = Field(alias="from", description="A node, or boundary: and a name")
    to: Text = Field(description="A node, or boundary: and a name")
    value: float | None = Field(
        default=None, ge=-1e15, le=1e15, description="As measured; null: not measured [any one unit]"
    )
    random: float = Field(default=0.0, ge=0, le=1e15, description="Standard uncertainty of its own [unit of the value]")
    systematic: Items[SharedError] = Field(default=(), max_length=100, description="Errors that it shares with others")

    @model_validator(mode="after")
    def _measured_with_uncertainty(self) -> Self:
        if self.from_ == self.to:
            raise refusal("impossible", "from and to are two different ends", "to")
        if self.value is not None and self.random == 0 and not any(one.value for one in self.systematic):
            raise refusal("missing", "A measured stream has an uncertainty: random, systematic, or both", "random")
        names = [one.instrument for one in self.systematic]
        if len(set(names)) < len(names):
            raise refusal("twice", "An instrument stands once in systematic", "systematic")
        return self


class BalanceCalculation(Body):
    """A network of nodes and streams."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "nodes": ["A"],
                    "streams": [
                        {"id": "1", "from": "boundary:feed", "to": "A", "value": 101.9, "random": 1.0},
                        {"id": "2", "from": "A", "to": "boundary:product", "value": 99.2, "random": 1.0},
                    ],
                    "false_alarm_rate": 0.05,
                }
            ]
        }
    )

    nodes: Items[Text] = Field(min_length=1, max_length=NODES, description="The nodes, each once")
    streams: Items[Stream] = Field(min_length=1, max_length=STREAMS, description="The streams")
    false_alarm_rate: float = Field(
        default=0.05, gt=0, lt=1, description="Chance of any flag when nothing is wrong [1]"
    )

    @model_validator(mode="after")
    def _network(self) -> Self:
        known = set(self.nodes)
        for at, node in enumerate(self.nodes):
            if node.startswith(BOUNDARY):
                raise refusal("impossible", "A boundary is no node: it has no balance", "nodes", at)
        if len(known) < len(self.nodes):
            raise refusal("twice", "A node stands once in nodes", "nodes")
        if len({one.id for one in self.streams}) < len(self.streams):
            raise refusal("twice", "Each stream has an id of its own", "streams")
        for at, one in enumerate(self.streams):
            for name, end in (("from", one.from_), ("to", one.to)):
                if end not in known and not end.startswith(BOUNDARY):
                    raise refusal("unknown_node", "A stream's end is one of nodes, or a boundary", "streams", at, name)
        return self


class StreamBalance(Answer):
    """One stream, as measured and as reconciled."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "id": "1", "value": 101.9, "reconciled": 100.55, "uncertainty": 0.71, "adjustment": 1.35,
                    "score": 1.91, "observability": "redundant",
                }
            ]
        }
    )  # fmt: skip

    id: str = Field(description="Its id")
    value: Known = Field(description="As measured [unit of the value]")
    reconciled: Known = Field(description="As reconciled; null where nothing determines it [unit of the value]")
    uncertainty: Known = Field(description="Standard uncertainty of reconciled [unit of the value]")
    adjustment: Known = Field(description="Measured less reconciled [unit of the value]")
    score: Known = Field(description="Maximum-power statistic of a fault of this stream alone [1]")
    observability: Observability = Field(description="Whether the other streams determine it, and check it")


class NodeBalance(Answer):
    """One node: what went out less what came in, a loss is negative."""

    model_config = ConfigDict(
        json_schema_extra={"examples": [{"id": "A", "imbalance": -2.7, "uncertainty": 1.41, "score": -1.91}]}
    )

    id: str = Field(description="Its name")
    imbalance: Known = Field(description="Out less in, as measured; null where a stream is not [unit of the values]")
    uncertainty: Known = Field(description="Standard uncertainty of the imbalance [unit of the values]")
    score: Known = Field(description="Maximum-power statistic of a loss at this node alone [1]")


class NetworkFault(Answer):
    """One fault of one stream or node."""

    model_config = ConfigDict(json_schema_extra={"examples": [{"kind": "node_loss", "subject": "A", "magnitude": 2.7}]})

    kind: Literal["stream_bias", "node_loss"] = Field(description="A stream reads wrong, or a node loses")
    subject: str = Field(description="The stream or the node")
    magnitude: float = Field(
        description="Positive for a stream that reads high and for what a node lost [unit of the values]"
    )


class NetworkSuspect(NetworkFault):
    """A fault that explains what chance does not, beside the other faults of its group."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "kind": "stream_bias", "subject": "1", "magnitude": 5.4, "interval": [2.63, 8.17],
                    "statistic": 14.6, "share": 1.0, "fault": 1,
                    "equivalent_to": [{"kind": "node_loss", "subject": "A", "magnitude": 5.4}],
                }
            ]
        }
    )  # fmt: skip

    interval: Annotated[tuple[float, float], Strict(False)] = Field(
        description="Interval of 95 % for the magnitude [unit of the values]"
    )
    statistic: float = Field(description="What it takes off the statistic of the group, given its other faults [1]")
    share: float = Field(description="Its part of the evidence among all that could stand in its place [1]")
    fault: int = Field(ge=1, description="Faults of a group, counted; suspects of one number are alternatives")
    equivalent_to: Items[NetworkFault] = Field(description="Faults that no balance of these streams can tell from it")


class NodeGroup(Answer):
    """Nodes that streams tie together, tested as one."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {"members": ["A"], "statistic": 3.65, "degrees_of_freedom": 1, "p_value": 0.056, "suspects": []}
            ]
        }
    )

    members: Items[str] = Field(description="The nodes")
    statistic: Known = Field(description="Weighted sum of squares of the balances; null without any [1]")
    degrees_of_freedom: int = Field(ge=0, description="Independent balances")
    p_value: Known = Field(description="Chance of such a statistic or a larger if nothing is wrong [1]")
    suspects: Items[NetworkSuspect] = Field(description="What explains it if chance does not, strongest first")


class Balance(Answer):
    """A network, reconciled and tested."""

    model_config = ConfigDict(json_schema_extra={"examples": [{"streams": [], "nodes": [], "groups": []}]})

    streams: Items[StreamBalance] = Field(description="One for each stream, in order")
    nodes: Items[NodeBalance] = Field(description="One for each node, in order")
    groups: Items[NodeGroup] = Field(description="Nodes tied together, tested as one")
