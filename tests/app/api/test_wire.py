"""The whole wire at once: everything is described, and nothing that a client can send is a fault.

Each operation is sent mutations of its own documented examples, at a site that has vessels, readings
and a closed night; what is refused is a problem document that repeats nothing of what was sent.
"""

from __future__ import annotations

import copy
import json
import re
from collections.abc import Iterator
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from app.main import create_app
from app.settings import Settings

APP = create_app(Settings(database_url="sqlite:///never-opened.db"))
DOCUMENT: dict[str, Any] = APP.openapi()
SCHEMAS: dict[str, Any] = DOCUMENT["components"]["schemas"]
OPERATIONS = {
    operation["operationId"]: (method, path, operation)
    for path, methods in DOCUMENT["paths"].items()
    for method, operation in methods.items()
}
BODIES = [name for name, (_, _, operation) in OPERATIONS.items() if "requestBody" in operation]
MARK = "zq7echo7qz"
KEY = f"<{MARK}>"  # a key that looks like a name stands in the pointer: that is where the mistake is
FUZZ = settings(
    max_examples=50, derandomize=True, deadline=None,
    suppress_health_check=[HealthCheck.function_scoped_fixture, HealthCheck.too_slow, HealthCheck.data_too_large],
)  # fmt: skip


# --- described -----------------------------------------------------------------------------------


def schema_of(operation: dict[str, Any]) -> dict[str, Any]:
    reference = operation["requestBody"]["content"]["application/json"]["schema"]["$ref"]
    found: dict[str, Any] = SCHEMAS[reference.rpartition("/")[2]]
    return found


def fields() -> Iterator[tuple[str, str, dict[str, Any]]]:
    for name, schema in SCHEMAS.items():
        for field, described in schema.get("properties", {}).items():
            yield name, field, described


def numbers(described: Any) -> bool:
    """Whether a field is a number or a list of them, itself and not in a model of its own."""
    if isinstance(described, dict):
        return described.get("type") == "number" or any(
            numbers(described.get(key)) for key in ("anyOf", "oneOf", "items", "prefixItems", "additionalProperties")
        )
    return isinstance(described, list) and any(numbers(one) for one in described)


def test_every_model_and_every_field_has_a_description() -> None:
    bare = [name for name, schema in SCHEMAS.items() if not schema.get("description")]
    bare += [f"{name}.{field}" for name, field, described in fields() if not described.get("description")]
    assert not bare


def test_every_number_says_its_unit() -> None:
    """In square brackets at the end of its description: ``[kg]``, ``[1]``, ``[unit of the quantity]``."""
    silent = [
        f"{name}.{field}"
        for name, field, described in fields()
        if numbers(described) and not re.search(r"\[[^\]]+\]", described["description"])
    ]
    assert not silent


def test_every_body_and_every_answer_has_an_example() -> None:
    lacking = [name for name in BODIES if not schema_of(OPERATIONS[name][2]).get("examples")]
    for name, schema in SCHEMAS.items():
        fields_have = all(one.get("examples") for one in schema.get("properties", {}).values())
        if schema.get("type") == "object" and not (schema.get("examples") or fields_have):
            lacking.append(name)
    assert not lacking


def test_every_parameter_has_a_description() -> None:
    bare = [
        f"{name}: {one['name']}"
        for name, (_, _, operation) in OPERATIONS.items()
        for one in operation.get("parameters", [])
        if not one.get("description")
    ]
    assert not bare


# --- sent ----------------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def world(service: Any) -> Any:
    """A client, and a site that has everything: the fuzz's own, which nobody cleans."""
    client, clock = service
    clock.set("2026-06-01T12:00:00Z")
    site = "/v1/sites/fuzzed"
    box = {"kind": "box", "length_m": 10.0, "width_m": 5.0, "height_m": 4.0}
    liquid = {"model": "expansivity", "density_kg_m3": 1000.0, "expansivity_per_k": 0.0}
    ticket = {"from": "boundary:jetty", "to": "x1", "by": "meter", "meter": "x1", "mass_kg": 10.0}
    for path, body in (
        ("", {"name": "fuzzed", "time_zone": "Europe/Oslo"}),
        ("/substances/x1", {"name": "liquid", "liquid": liquid}),
        ("/vessels/x1", {"name": "box", "substance": "x1", "shape": box}),
        ("/meters/x1", {"name": "meter"}),
        ("/transfers/x1", ticket | {"started_at": "2026-05-28T06:00:00Z", "ended_at": "2026-05-28T09:00:00Z"}),
    ):
        assert client.put(site + path, json=body).status_code in (200, 201)
    reading = {"vessel": "x1", "taken_at": "2026-05-29T00:00:00Z", "level_m": 2.0, "liquid_temperature_c": 15.0}
    client.post(f"{site}/readings", json={"readings": [reading]})
    assert client.post(f"{site}/reconciliations", json={"day": "2026-05-28"}).status_code in (200, 201)
    return client


def places(node: Any, here: tuple[Any, ...] = ()) -> Iterator[tuple[Any, ...]]:
    yield here
    inside = node.items() if isinstance(node, dict) else enumerate(node) if isinstance(node, list) else ()
    for key, value in inside:
        yield from places(value, (*here, key))


HOSTILE = st.one_of(
    st.none(), st.booleans(), st.integers(), st.floats(), st.text(max_size=8).map(lambda text: MARK + text),
    st.sampled_from([
        [], {}, [[]], {KEY: 1}, -0.0, 1e308, 5e-324, -1, 0, 2**63, 10**40, "", "\x00", "\ud800", "x" * 300, "x1",
        "1970-01-01T00:00:00Z", "2200-12-31T23:59:59.999999999+14:00", "2026-05-28T06:00:00", "2026-05-28", "٣", "TK-1",
        "boundary:x", "x1 ", "NaN", "1e400", MARK,
    ]),
)  # fmt: skip


def mutated(data: st.DataObject, example: Any) -> Any:
    """The example with one or three places replaced, removed or added to."""
    body = copy.deepcopy(example)
    for _ in range(data.draw(st.sampled_from([1, 1, 1, 3]))):
        place = data.draw(st.sampled_from(list(places(body))))
        value = copy.deepcopy(data.draw(HOSTILE))
        if not place:
            if data.draw(st.integers(0, 9)) == 0:
                return value
            continue
        holder = body
        for step in place[:-1]:
            holder = holder[step]
        action = data.draw(st.sampled_from(["replace", "replace", "remove", "add"]))
        if action == "remove":
            del holder[place[-1]]
        elif action == "add" and isinstance(holder, list):
            holder.append(holder[place[-1]])
        elif action == "add":
            holder[KEY] = value
        else:
            holder[place[-1]] = value
    return body


def check(answer: Any, sent: Any) -> None:
    assert answer.status_code < 500, (answer.text, sent)
    if answer.status_code >= 400:
        assert answer.headers["content-type"] == "application/problem+json", (answer.text, sent)
        problem = answer.json()
        assert problem["status"] == answer.status_code and problem["detail"] and problem["title"]
        assert all(one["detail"] and one["code"] for one in problem["errors"])
        assert MARK not in answer.text, (answer.text, sent)
    assert not re.search(r"Traceback|SELECT |sqlalchemy|pydantic", answer.text)


def path_of(data: st.DataObject, path: str) -> str:
    """The path with its parameters filled in: usually with what is there."""
    path = path.replace("{site}", "fuzzed", 1).replace("{reconciliation}", "2026-05-28", 1)
    odd = [MARK, "TK", "..", "%00", "%ff", "2026-02-30", "1.1", "x" * 70, "a%2Fb", "2026-05-28.99", "x2", *["x1"] * 8]
    return re.sub(r"\{\w+\}", lambda _: data.draw(st.sampled_from(odd)), path)


@pytest.mark.parametrize("name", BODIES)
@given(data=st.data())
@FUZZ
def test_no_body_is_a_fault(world: Any, name: str, data: st.DataObject) -> None:
    method, path, operation = OPERATIONS[name]
    example = data.draw(st.sampled_from(schema_of(operation)["examples"]))
    text = json.dumps(mutated(data, example), ensure_ascii=True)
    for place, value in (("tk-12", "x1"), ("tk-14", "x1"), ("m-7", "x1"), ("gasoline-95", "x1")):
        text = text.replace(f'"{place}"', f'"{value}"')
    filled = path_of(data, path)
    answer = world.request(method, filled, content=text, headers={"Content-Type": "application/json"})
    check(answer, (filled, text))


@pytest.mark.parametrize("name", BODIES)
@given(content=st.binary(max_size=40) | st.text(max_size=20).map(lambda text: (MARK + text).encode()))
@FUZZ
def test_no_bytes_are_a_fault(world: Any, name: str, content: bytes) -> None:
    method, path, _ = OPERATIONS[name]
    filled = re.sub(r"\{\w+\}", "x1", path.replace("{site}", "fuzzed"))
    answer = world.request(method, filled, content=content, headers={"Content-Type": "application/json"})
    check(answer, (filled, content))
    assert answer.status_code in (400, 413, 422)


TEXTS = st.text(max_size=8).map(lambda text: MARK + text) | st.sampled_from([
    "", "NaN", "inf", "-1", "0", "1", "10000", "1e400", "true", "x1", "0~x~0", "x1~0", "1~2~3", "9" * 40,
    "2026-05-28T00:00:00Z", "2026-06-01T00:00:00+02:00", "1970-01-01T00:00:00Z", "2200-12-31T23:59:59Z",
    "2026-05-28T00:00:00",
])  # fmt: skip


@pytest.mark.parametrize("name", sorted(OPERATIONS))
@given(data=st.data())
@FUZZ
def test_no_parameter_is_a_fault(world: Any, name: str, data: st.DataObject) -> None:
    method, path, operation = OPERATIONS[name]
    asked = [one["name"] for one in operation.get("parameters", []) if one["in"] == "query"]
    params = {one: data.draw(TEXTS) for one in asked if data.draw(st.booleans())}
    if data.draw(st.booleans()):
        params |= {one: value for one, value in (("from", "2026-05-28T00:00:00Z"), ("to", "2026-05-30T00:00:00Z"))
                   if one in asked}  # fmt: skip
    filled = path_of(data, path)
    headers = {"Content-Type": "application/json"}
    answer = world.request(method, filled, params=params, content="{}", headers=headers)
    check(answer, (filled, params))


# --- accepted ------------------------------------------------------------------------------------

MAGNITUDES = st.sampled_from([0.0, 1e-300, 1e-9, 1e-3, 0.1, 0.5, 0.999, 1.0, 1.001, 2.0, 10.0, 99.0, 1e3, 1e5, 1e9])
ROW = {
    "level_m": 1.2, "liquid_temperature_c": 21.0, "free_water_level_m": 0.1, "pressure_kpa": 1.0,
    "vapour_temperature_c": 20.0, "ambient_temperature_c": 10.0, "observed_density_kg_m3": 840.0,
    "observed_density_temperature_c": 15.0, "sediment_water_pct": 0.1, "barometric_pressure_kpa_abs": 100.0,
}  # fmt: skip
LIQUID = {
    "model": "expansivity", "density_kg_m3": 840.0, "density_uncertainty_kg_m3": 1.0, "at_temperature_c": 15.0,
    "at_pressure_kpa_abs": 101.325, "expansivity_per_k": 8.3e-4, "compressibility_per_kpa": 7.5e-7,
}  # fmt: skip
VAPOUR = {"model": "virial", "components": [{"id": "propane", "mole_fraction": 1.0}]}
SHAPES = [
    {"kind": "box", "length_m": 6.0, "width_m": 2.5, "height_m": 2.0},
    {"kind": "sphere", "diameter_m": 3.0},
    {"kind": "vertical_cylinder", "diameter_m": 3.0, "height_m": 4.0, "bottom": {"kind": "cone", "depth_m": 0.3}},
    {"kind": "horizontal_cylinder", "diameter_m": 2.0, "length_m": 6.0, "tilt_deg": 0.5, "gauge_at_m": 3.0,
     "left_head": {"kind": "torispherical", "crown_radius_m": 2.0, "knuckle_radius_m": 0.2}},
    {"kind": "capacity_table", "rows": [[0.0, 0.0], [1.0, 5.0], [2.0, 11.0]], "total_volume_m3": 12.0},
    {"kind": "fixed_volume", "volume_m3": 5.0},
]  # fmt: skip
SHELL = {"expansion_per_k": 1.1e-5, "thickness_m": 0.01, "elastic_modulus_gpa": 207.0, "at_temperature_c": 15.0}


def stretched(data: st.DataObject, body: Any) -> Any:
    """The body with a few of its numbers made very large, very small, zero or negative."""
    body = copy.deepcopy(body)
    found = [place for place in places(body) if isinstance(_at(body, place), float)]
    for place in data.draw(st.lists(st.sampled_from(found), max_size=3)):
        value = data.draw(MAGNITUDES) * data.draw(st.sampled_from([1.0, 1.0, -1.0]))
        _at(body, place[:-1])[place[-1]] = value
    return body


def _at(node: Any, place: tuple[Any, ...]) -> Any:
    for step in place:
        node = node[step]
    return node


@given(data=st.data())
@FUZZ
def test_no_number_that_is_accepted_is_a_fault_later(world: Any, data: st.DataObject) -> None:
    """Defined, read, asked for, closed and only calculated: an answer, or a refusal."""
    substance = {"name": "s"} | data.draw(st.sampled_from(
        [{"liquid": LIQUID}, {"liquid": LIQUID, "vapour": VAPOUR}, {"vapour": VAPOUR}]))  # fmt: skip
    vessel = {"name": "v", "shape": data.draw(st.sampled_from(SHAPES)), "shell": SHELL}
    body = stretched(data, {"vessel": vessel, "substance": substance, "readings": [ROW]})
    check(world.post("/v1/calculations/inventory?working=true&budget=true", json=body), body)
    known = {key: value for key, value in body["readings"][0].items() if key != "level_m"}
    alone = data.draw(st.sets(st.sampled_from(["pressure_kpa", "vapour_temperature_c", "free_water_level_m"])))
    sought = {key: value for key, value in known.items() if key not in alone}
    sought |= {"vessel": body["vessel"], "substance": body["substance"], "mass_kg": data.draw(MAGNITUDES)}
    check(world.post("/v1/calculations/expected-reading", json=sought), sought)
    name = f"/v1/sites/fuzzed-{data.draw(st.integers(0, 10**9))}"
    world.put(name, json={"name": "n", "time_zone": "UTC"})
    for path, sent in (("substances/s", body["substance"]), ("vessels/v", body["vessel"] | {"substance": "s"})):
        check(world.put(f"{name}/{path}", json=sent), body)
    row = {key: value for key, value in body["readings"][0].items() if key != "barometric_pressure_kpa_abs"}
    rows = [row | {"vessel": "v", "taken_at": f"2026-05-{day}T00:00:00Z"} for day in (28, 29)]
    check(world.post(f"{name}/readings", json={"readings": rows}), body)
    check(world.get(f"{name}/inventory", params={"at": "2026-05-29T00:00:00Z"}), body)
    period = {"from": "2026-05-28T00:00:00Z", "to": "2026-05-29T00:00:01Z", "every": 3600}
    check(world.get(f"{name}/vessels/v/inventory", params=period), body)
    check(world.post(f"{name}/reconciliations", json={"day": "2026-05-28"}), body)


# --- ten thousand, on demand ---------------------------------------------------------------------

LONG = settings(FUZZ, max_examples=10_000, derandomize=False, print_blob=True)


@pytest.mark.long
@given(data=st.data())
@LONG
def test_no_body_of_ten_thousand_is_a_fault(world: Any, data: st.DataObject) -> None:
    test_no_body_is_a_fault.hypothesis.inner_test(world, data.draw(st.sampled_from(BODIES)), data)


@pytest.mark.long
@given(data=st.data())
@LONG
def test_no_parameter_of_ten_thousand_is_a_fault(world: Any, data: st.DataObject) -> None:
    test_no_parameter_is_a_fault.hypothesis.inner_test(world, data.draw(st.sampled_from(sorted(OPERATIONS))), data)


@pytest.mark.long
@given(data=st.data())
@LONG
def test_no_number_of_ten_thousand_that_is_accepted_is_a_fault_later(world: Any, data: st.DataObject) -> None:
    test_no_number_that_is_accepted_is_a_fault_later.hypothesis.inner_test(world, data)
