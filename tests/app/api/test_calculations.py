"""The same arithmetic with nothing stored: each reading stands alone, and a network is one request."""

from __future__ import annotations

import math
from statistics import NormalDist

import pytest

BOX = {"kind": "box", "length_m": 6.0, "width_m": 2.5, "height_m": 2.0}
OIL = {"model": "expansivity", "density_kg_m3": 840.0, "at_temperature_c": 15, "expansivity_per_k": 8.3e-4}
REQUEST = {
    "vessel": {"name": "box", "shape": BOX, "shell": {"expansion_per_k": 0.0}},
    "substance": {"name": "an oil", "liquid": OIL},
    "readings": [{"level_m": 1.2, "liquid_temperature_c": 21.0}],
}
STREAMS = [
    {"id": "1", "from": "boundary:feed", "to": "A", "value": 101.9, "random": 1.0},
    {"id": "2", "from": "A", "to": "boundary:product", "value": 99.2, "random": 1.0},
]


def inventory(client, status=200, query=None, **changes):
    answer = client.post("/v1/calculations/inventory", json=REQUEST | changes, params=query)
    assert answer.status_code == status, answer.text
    return answer.json()


def balance(client, status=200, **changes):
    answer = client.post("/v1/calculations/balance", json={"nodes": ["A"], "streams": STREAMS} | changes)
    assert answer.status_code == status, answer.text
    return answer.json()


def places(answer):
    return [(one["pointer"], one["code"]) for one in answer["errors"]]


# --- inventory -----------------------------------------------------------------------------------


def test_a_mass_is_volume_by_density_at_the_liquids_temperature(client):
    """6 m by 2.5 m by 1.2 m of oil that is 6 K warmer than its density's temperature."""
    (found,) = inventory(client)["results"]
    density = 840.0 * math.exp(-8.3e-4 * 6.0)
    assert found["status"] == "measured"
    assert found["liquid_density_kg_m3"] == pytest.approx(density, rel=1e-12)
    assert found["mass_kg"] == pytest.approx(18.0 * density, rel=1e-12)
    assert found["gross_standard_volume_m3"] == pytest.approx(18.0 * density / 840.0, rel=1e-12)
    assert not {"vessel", "substance", "at", "working", "budget"} & set(found)


def test_a_mass_does_not_depend_on_the_base_temperature(client):
    masses = [inventory(client, site={"base_temperature_c": base})["results"][0]["mass_kg"] for base in (15.0, 20.0)]
    assert masses[0] == pytest.approx(masses[1], rel=1e-12)


def test_each_reading_stands_alone_and_a_bad_one_hides_no_other(client):
    readings = [
        {"level_m": 1.2, "liquid_temperature_c": 15.0}, {"level_m": 1.2}, {"liquid_temperature_c": 15.0},
        {"level_m": 2.5, "liquid_temperature_c": 15.0}, {"level_m": 1.0, "liquid_temperature_c": 15.0},
        {"level_m": 1.0, "liquid_temperature_c": 15.0, "quality": "bad"},
    ]  # fmt: skip
    found = inventory(client, readings=readings)["results"]
    assert [one["status"] for one in found] == [
        "measured", "unmeasured", "unmeasured", "unmeasured", "measured", "unmeasured",
    ]  # fmt: skip
    assert [one["mass_kg"] for one in found if one["mass_kg"]] == [pytest.approx(18 * 840.0), pytest.approx(15 * 840.0)]
    assert found[3]["reason"]["code"] == "outside_vessel"
    assert all(one["reason"]["detail"] for one in found if one["status"] == "unmeasured")


def test_working_and_budget_come_where_they_are_asked_for(client):
    (found,) = inventory(client, query={"working": "true", "budget": "true"})["results"]
    assert {one["symbol"] for one in found["working"]} >= {"V(h)", "K", "ρ", "M_liquid"}
    squares = sum(one["contribution_kg"] ** 2 for one in found["budget"])
    assert found["mass_uncertainty_kg"] == pytest.approx(squares**0.5, rel=1e-12)


def test_a_statement_comes_where_it_is_asked_for_and_without_an_instant_that_nobody_said(client):
    (plain,) = inventory(client)["results"]
    (found,) = inventory(client, query={"statement": "true"})["results"]
    statement = found.pop("statement")
    assert found == plain and "at" not in statement
    assert statement["mass_kg"] == found["liquid_mass_kg"]
    dated = [{"taken_at": "2026-05-01T06:00:00Z", "level_m": 1.2, "liquid_temperature_c": 21.0}]
    (found,) = inventory(client, query={"statement": "true"}, readings=dated)["results"]
    assert found["statement"] == {"at": "2026-05-01T06:00:00Z"} | statement


def test_a_gas_of_a_fixed_volume_is_an_ideal_gas_where_it_is_thin(client):
    """Helium at 10 kPa and 0 °C by P V m / (R T), 4.0026 g/mol; its second coefficient, 12 cm³/mol, is a 5e-5 of it."""
    components = [{"id": "helium", "mole_fraction": 1.0}]
    (found,) = inventory(
        client,
        vessel={"shape": {"kind": "fixed_volume", "volume_m3": 5.0}, "shell": {"expansion_per_k": 0.0}},
        substance={"name": "helium", "vapour": {"model": "virial", "components": components}},
        readings=[{"pressure_kpa_abs": 10.0, "vapour_temperature_c": 0.0}],
    )["results"]
    assert found["mass_kg"] == pytest.approx(10e3 * 5.0 * 4.0026e-3 / (8.314462618 * 273.15), rel=2e-4)


@pytest.mark.parametrize(
    ("change", "pointer"),
    [
        ({"readings": [{"level_m": 1.0}, {"level_m": 1e6}]}, "/readings/1/level_m"),
        ({"readings": [{"liquid_temperature_c": "15"}]}, "/readings/0/liquid_temperature_c"),
        ({"readings": [{"taken_at": "2026-05-01T06:00:00"}]}, "/readings/0/taken_at"),
        ({"readings": [{"vapour_composition": {"unobtainium": 1.0}}]}, "/readings/0/vapour_composition"),
        ({"vessel": {"shape": BOX | {"height_m": 0}}}, "/vessel/shape/height_m"),
        ({"vessel": {"shape": {"kind": "capacity_table", "rows": [[0, 1], [1, 0]]}}}, "/vessel/shape/rows/1"),
        ({"vessel": {"shape": BOX, "shell": {"courses": [[1, 0.01]]}}}, "/vessel/shell/courses"),
        ({"substance": {"name": "x", "liquid": OIL | {"density_kg_m3": -1}}}, "/substance/liquid/density_kg_m3"),
        ({"substance": {"name": "x", "vapour": {"model": "virial", "components": [
            {"id": "unobtainium", "mole_fraction": 1.0}]}}}, "/substance/vapour/components/0/id"),
        ({"site": {"base_temperature_c": 1e6}}, "/site/base_temperature_c"),
        ({"tank": {}}, "/tank"),
    ],
)  # fmt: skip
def test_what_cannot_be_is_named_with_its_place(client, change, pointer):
    answer = inventory(client, 422, **change)
    assert pointer in [one for one, _ in places(answer)]
    assert "unobtainium" not in str(answer)


def test_nothing_is_stored(site):
    before = site.client.get("/v1/sites", params={"limit": 10_000}).json()
    inventory(site.client)
    balance(site.client)
    assert site.client.get("/v1/sites", params={"limit": 10_000}).json() == before


# --- balance -------------------------------------------------------------------------------------


def test_a_node_with_one_way_in_and_one_way_out(client):
    """Both uncertainties are 1, so each gives half of the 2.7 that are missing; u = 1/√2, √2 for the node."""
    found = balance(client)
    one, two = found["streams"]
    assert (one["reconciled"], two["reconciled"]) == (pytest.approx(100.55), pytest.approx(100.55))
    assert (one["adjustment"], two["adjustment"]) == (pytest.approx(1.35), pytest.approx(-1.35))
    assert one["uncertainty"] == two["uncertainty"] == pytest.approx(2**-0.5)
    assert abs(one["score"]) == pytest.approx(2.7 / 2**0.5)
    assert {one["observability"], two["observability"]} == {"redundant"}
    (node,) = found["nodes"]
    assert (node["imbalance"], node["uncertainty"]) == (pytest.approx(-2.7), pytest.approx(2**0.5))
    (group,) = found["groups"]
    assert (group["members"], group["degrees_of_freedom"]) == (["A"], 1)
    assert group["statistic"] == pytest.approx(2.7**2 / 2)
    assert group["p_value"] == pytest.approx(2 * NormalDist().cdf(-2.7 / 2**0.5), rel=1e-9)


def test_a_shared_error_is_one_and_the_same(client):
    """In and out by one meter: its error of 5 stands in both and leaves the balance, which keeps √2."""
    streams = [one | {"systematic": [{"instrument": "m", "value": 5.0}]} for one in STREAMS]
    (node,) = balance(client, streams=streams)["nodes"]
    assert node["uncertainty"] == pytest.approx(2**0.5)


def test_what_is_not_measured_is_found_where_the_others_say_it(client):
    streams = [STREAMS[0], STREAMS[1] | {"value": None}]
    found = balance(client, streams=streams)
    assert found["streams"][1]["reconciled"] == pytest.approx(101.9)
    assert [one["observability"] for one in found["streams"]] == ["nonredundant", "observable"]
    assert found["nodes"][0]["imbalance"] is None


@pytest.mark.parametrize(
    ("change", "expected"),
    [
        ({"nodes": []}, ("/nodes", "wrong_length")),
        ({"nodes": ["A", "A"]}, ("/nodes", "twice")),
        ({"nodes": ["B"]}, ("/streams/0/to", "unknown_node")),
        ({"streams": [STREAMS[0], STREAMS[0]]}, ("/streams", "twice")),
        ({"streams": [STREAMS[0] | {"random": 0.0}]}, ("/streams/0/random", "missing")),
        ({"streams": [STREAMS[0] | {"from": "A"}]}, ("/streams/0/to", "impossible")),
        ({"streams": [STREAMS[0] | {"value": "much"}]}, ("/streams/0/value", "wrong_type")),
        ({"false_alarm_rate": 0.0}, ("/false_alarm_rate", "out_of_range")),
    ],
)
def test_a_network_that_cannot_be_is_named_with_its_place(client, change, expected):
    assert expected in places(balance(client, 422, **change))


# --- expansivity ---------------------------------------------------------------------------------


def expansivity(client, status=200, **body):
    answer = client.post("/v1/calculations/expansivity", json=body)
    assert answer.status_code == status, answer.text
    return answer.json()


def densities(celsius, kpa=(101.325,)):
    """Rows of a liquid of 840 kg/m³ at 15 °C and one atmosphere, β = 8.3e-4 + 1e-6 (t − 15) /K, κ = 7.5e-7 /kPa."""
    return [
        [t, p, 840.0 * math.exp(-8.3e-4 * (t - 15) - 1e-6 * (t - 15) ** 2 / 2 + 7.5e-7 * (p - 101.325))]
        for t in celsius
        for p in kpa
    ]


def test_densities_make_the_substance_that_gives_them_back(site):
    """What is answered is put as it is, and an inventory at each row has the density of the row."""
    rows = densities((5.0, 15.0, 25.0, 35.0, 45.0), (101.325, 2101.325))
    found = expansivity(site.client, rows=rows, degree=1, name="house grade")
    assert found["expansivity_per_k"] == pytest.approx([8.3e-4, 1e-6], rel=1e-6)
    assert found["compressibility_per_kpa"] == pytest.approx(7.5e-7, rel=1e-9)
    assert found["degrees_of_freedom"] == 6
    assert found["residuals_kg_m3"] == pytest.approx([0.0] * 10, abs=1e-9)
    site.put("/substances/house", found["substance"], status=201)
    assert site.get("/substances/house")["definition"]["liquid"]["density_kg_m3"] == pytest.approx(840.0, rel=1e-12)
    readings = [{"level_m": 1.0, "liquid_temperature_c": t, "pressure_kpa_abs": p} for t, p, _ in rows]
    vessel = REQUEST["vessel"] | {"vapour_space": {"kind": "blanketed", "blanket": "nitrogen"}}
    answered = inventory(site.client, substance=found["substance"], vessel=vessel, readings=readings)["results"]
    assert [one["liquid_density_kg_m3"] for one in answered] == pytest.approx([row[2] for row in rows], rel=1e-9)


def test_a_constant_expansivity_is_one_number(client):
    found = expansivity(client, rows=densities((10.0, 20.0)), compressibility_per_kpa=7.5e-7)
    assert found["expansivity_per_k"] == pytest.approx(8.3e-4, rel=1e-3)
    assert found["compressibility_per_kpa"] == found["substance"]["liquid"]["compressibility_per_kpa"] == 7.5e-7
    assert (found["covariance"], found["residual_deviation_kg_m3"]) == (None, None)
    assert [one["standard_uncertainty"] for one in found["parameters"]] == [None, None]
    assert set(found["substance"]) == {"name", "liquid"}


@pytest.mark.parametrize(
    ("body", "expected"),
    [
        ({}, ("/rows", "missing")),
        ({"rows": [[15, 101, 840]]}, ("/rows", "wrong_length")),
        ({"rows": [[15, 101, 840], [25, 101]]}, ("/rows/1/2", "missing")),
        ({"rows": [[15, 101, 840], [25, -1, 830]]}, ("/rows/1/1", "out_of_range")),
        ({"rows": [[15, 101, 840], [25, 101, 0]]}, ("/rows/1/2", "out_of_range")),
        ({"rows": [[15, 101, 840], ["25", 101, 830]]}, ("/rows/1/0", "wrong_type")),
        ({"rows": [[15, 101, 840], [15, 101, 840]]}, ("/rows", "impossible_definition")),
        ({"rows": [[15, 101, 840], [25, 101, 833]], "degree": 1}, ("/rows", "impossible_definition")),
        ({"rows": [[15, 101, 840], [25, 1101, 833]]}, ("/rows", "impossible_definition")),
        ({"rows": [[15, 101, 840], [25, 1101, 833], [35, 2101, 826]]}, ("/rows", "impossible_definition")),
        ({"rows": [[15, 101, 840], [25, 101, 833], [25, 1101, 830]]}, ("/rows", "impossible_fit")),
        ({"rows": [[15, 101, 840], [16, 101, 400]]}, ("/rows", "impossible_fit")),
        ({"rows": [[15, 101, 840], [25, 101, 833]], "degree": 4}, ("/degree", "out_of_range")),
        ({"rows": [[15, 101, 840], [25, 101, 833]], "at_pressure_kpa_abs": 500},
         ("/compressibility_per_kpa", "missing")),
        ({"rows": [[15, 101, 840], [25, 101, 833]], "density_uncertainty_kg_m3": 0},
         ("/density_uncertainty_kg_m3", "out_of_range")),
    ],
)  # fmt: skip
def test_densities_that_tell_no_expansivity_are_refused_with_their_place(client, body, expected):
    assert expected in places(expansivity(client, 422, **body))


def test_bodies_of_another_type_and_from_elsewhere_are_turned_away(client):
    for name in ("inventory", "balance", "expansivity"):
        path = f"/v1/calculations/{name}"
        assert client.post(path, content=b"x", headers={"Content-Type": "text/csv"}).status_code == 415
        assert client.post(path, json={}, headers={"Origin": "https://elsewhere.example"}).status_code == 403
        assert client.post(path, json={}, headers={"Host": "elsewhere.example"}).status_code == 421
