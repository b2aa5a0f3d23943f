"""Promises that every body and every answer keeps: described, with units, with an example that holds."""

from __future__ import annotations

import importlib
import json
import pkgutil
import re
import types
from typing import Any, Union, get_args, get_origin

import pytest
from pydantic import BaseModel, ValidationError
from pydantic.json_schema import JsonSchemaMode

import app.schemas
from app.schemas.errors import UNITS, unit_of
from app.schemas.types import Answer, Body, Known, canonical

for _module in pkgutil.iter_modules(app.schemas.__path__):
    importlib.import_module(f"app.schemas.{_module.name}")


def _below(model: type[BaseModel]) -> set[type[BaseModel]]:
    own = {one for one in model.__subclasses__() if one.__module__.startswith("app.schemas.")}
    return own | {below for one in own for below in _below(one)}


def _by_name(models: set[type[BaseModel]]) -> list[type[BaseModel]]:
    return sorted((one for one in models if not one.__name__.startswith("_")), key=lambda one: one.__name__)


BODIES = _by_name(_below(Body))
# What a generic answer was made for elsewhere depends on what was imported before: it counts as it is written.
ANSWERS = [one for one in _by_name(_below(Answer)) if one.__pydantic_generic_metadata__["origin"] is None]
EVERY = BODIES + ANSWERS
FIELDS = [(model, name) for model in EVERY for name in model.model_fields]

# Numbers whose names carry no unit: ratios and chances, counts over time, the three words of an
# instrument's errors, and what is in the unit of another field.
WITHOUT_UNIT = {
    "mole_fraction", "acentric_factor", "srk_acentric_factor",
    "poisson_ratio", "compressibility_factor", "p_value", "score",
    "statistic", "false_alarm_rate", "false_alarms_per_month", "pct_of_throughput", "kg",
    "random", "systematic", "offset", "local",
    "value", "standard_uncertainty", "difference", "sensitivity",
    "reconciled", "uncertainty", "adjustment", "imbalance", "magnitude", "interval", "share",
    "liquid_composition", "vapour_composition", "composition", "quality", "before", "after",
    "covariance",
    "shell_factor", "temperature_factor", "temperature_factor_table", "pressure_factor", "api_gravity",
    "relative_density_60_60",
}  # fmt: skip
# Lists of numbers, and maps of bodies or of numbers by quantity, whose description has the units.
LISTS = {"rows", "courses", "deadwood"}


def _holds_number(annotation: object) -> bool:
    if annotation is float:
        return True
    if get_origin(annotation) is not None or isinstance(annotation, types.UnionType):
        return any(_holds_number(one) for one in get_args(annotation))
    alias = getattr(annotation, "__value__", None)
    return alias is not None and _holds_number(alias)


def test_all_are_found() -> None:
    names = {model.__name__ for model in EVERY}
    assert len(EVERY) >= 60
    assert names >= {"Site", "Substance", "Vessel", "Reading", "Meter", "Transfer", "Inventory", "Reconciliation"}


@pytest.mark.parametrize("model", EVERY, ids=lambda model: model.__name__)
def test_is_described_strict_closed_and_frozen(model: type[BaseModel]) -> None:
    assert model.__doc__ and model.__doc__ != getattr(BaseModel, "__doc__", None)
    for name in ("strict", "frozen"):
        assert model.model_config.get(name) is True
    assert model.model_config.get("extra") == "forbid"
    assert model.model_config.get("allow_inf_nan") is False


@pytest.mark.parametrize("model", EVERY, ids=lambda model: model.__name__)
def test_examples_hold(model: type[BaseModel]) -> None:
    extra: Any = model.model_config.get("json_schema_extra")
    assert extra and extra["examples"]
    for example in extra["examples"]:
        read = model.model_validate_json(json.dumps(example))
        again = model.model_validate_json(canonical(read))
        assert again == read and canonical(again) == canonical(read)
        assert model.model_validate_json(read.model_dump_json(exclude_unset=True)) == read


@pytest.mark.parametrize(("model", "name"), FIELDS, ids=lambda one: getattr(one, "__name__", one))
def test_fields_are_described_with_their_unit(model: type[BaseModel], name: str) -> None:
    field = model.model_fields[name]
    said = field.description
    assert said and len(said) >= 5
    if not _holds_number(field.annotation):
        return
    bracket = re.search(r"\[([^\]]+)\]$", said)
    assert bracket or name in ("quality",), f"{name}: no unit at the end of: {said}"
    if name in WITHOUT_UNIT or name in LISTS:
        return
    unit = unit_of(name)
    assert unit, f"{name} is a number whose name has no unit"
    assert bracket and unit.split(" ")[0] in bracket[1], f"{name}: {unit} is not in {said}"


def test_nothing_is_exempt_for_nothing() -> None:
    names = {name for _, name in FIELDS}
    assert names >= (WITHOUT_UNIT | LISTS)


def test_longest_ending_gives_the_unit() -> None:
    assert unit_of("density_kg_m3") == "kg/m³"
    assert unit_of("volume_m3") == "m³"
    assert unit_of("pressure_kpa_abs") == "kPa absolute"
    assert unit_of("compressibility_per_kpa") == "1/kPa"
    assert unit_of("expected_loss_kg_per_day") == "kg/day"
    assert unit_of("name") == ""
    assert len(UNITS) >= 16


@pytest.mark.parametrize("model", EVERY, ids=lambda model: model.__name__)
def test_schema_can_be_written(model: type[BaseModel]) -> None:
    modes: tuple[JsonSchemaMode, ...] = ("validation", "serialization")
    for mode in modes:
        schema = model.model_json_schema(mode=mode)
        assert schema["description"]
        assert schema["additionalProperties"] is False


@pytest.mark.parametrize("model", BODIES, ids=lambda model: model.__name__)
def test_unknown_key_is_refused(model: type[BaseModel]) -> None:
    extra: Any = model.model_config.get("json_schema_extra")
    with pytest.raises(ValidationError) as refused:
        model.model_validate_json(json.dumps({**extra["examples"][0], "colour": "red"}))
    assert ("colour",) in {error["loc"] for error in refused.value.errors() if error["type"] == "extra_forbidden"}


def test_known_is_a_number_or_null() -> None:
    assert Union[float, None] == get_args(Known)[0]  # noqa: UP007
