"""Substances are put, dated and read back; what no model could compute is refused with its place."""

from __future__ import annotations

import pytest

LIQUID = {"model": "expansivity", "density_kg_m3": 840.0, "expansivity_per_k": 8.3e-4}
PROPANE = {"model": "virial", "components": [{"id": "propane", "mole_fraction": 1.0}]}
OIL = {"name": "an oil", "liquid": LIQUID}


@pytest.fixture
def bare(place):
    """A site in which nothing is defined."""
    place.define()
    return place


def refused(site, body):
    answer = site.put("/substances/s", body, status=422)
    return [(one["pointer"], one["code"]) for one in answer["errors"]]


def mixture(*fractions, **more):
    components = [{"id": name, "mole_fraction": share} for name, share in fractions]
    return {"name": "a gas", "vapour": PROPANE | {"components": components} | more}


def test_a_substance_is_created_revised_or_unchanged(bare):
    assert bare.put("/substances/s", OIL, status=201)["outcome"] == "created"
    assert bare.put("/substances/s", OIL, status=200)["outcome"] == "unchanged"
    lighter = {"name": "an oil", "liquid": LIQUID | {"density_kg_m3": 830.0}}
    assert refused(bare, lighter) == [("/effective_from", "missing")]
    dated = lighter | {"effective_from": "2026-05-01T00:00:00Z"}
    assert bare.put("/substances/s", dated, status=200)["outcome"] == "revised"
    densities = [
        bare.get("/substances/s", at=at)["definition"]["liquid"]["density_kg_m3"]
        for at in ("2026-04-30T23:59:59Z", "2026-05-01T00:00:00Z", None)
    ]
    assert densities == [840.0, 830.0, 830.0]


@pytest.mark.parametrize(
    "body",
    [
        OIL,
        {"name": "a gas", "vapour": PROPANE},
        {"name": "both", "liquid": LIQUID, "vapour": PROPANE},
        mixture(("propane", 0.5), ("n-butane", 0.504)),
        {"name": "by a polynomial", "liquid": LIQUID | {"expansivity_per_k": [8e-4, 1e-6]}},
        {"name": "in pressure, two terms", "vapour": PROPANE | {"form": "pressure", "terms": 2}},
    ],
)
def test_what_was_sent_is_what_is_read_back(bare, body):
    bare.put("/substances/s", body, status=201)
    assert bare.get("/substances/s")["definition"] == body


@pytest.mark.parametrize(
    ("body", "expected"),
    [
        ({"name": "nothing"}, ("", "missing")),
        (mixture(("propane", 0.5), ("methane", 0.3)), ("/vapour/components", "fractions_sum")),
        (mixture(("propane", 0.5), ("propane", 0.5)), ("/vapour/components", "twice")),
        (mixture(("propane", 1.0), form="cubic"), ("/vapour/form", "not_one_of")),
        (mixture(("propane", 1.0), terms=4), ("/vapour/terms", "not_one_of")),
        (mixture(("propane", 1.0), coefficients="measured"), ("/vapour/second_virial_cm3_mol", "missing")),
        (mixture(("propane", -0.1), ("methane", 1.1)), ("/vapour/components/0/mole_fraction", "out_of_range")),
        ({"name": "x", "liquid": LIQUID | {"density_kg_m3": 0}}, ("/liquid/density_kg_m3", "out_of_range")),
        ({"name": "x", "liquid": LIQUID | {"density_kg_m3": "840"}}, ("/liquid/density_kg_m3", "wrong_type")),
        ({"name": "x", "liquid": LIQUID | {"at_temperature_c": 1e6}}, ("/liquid/at_temperature_c", "out_of_range")),
        ({"name": "x", "liquid": {"model": "magic"}}, ("/liquid", "not_computed")),
        ({"name": "x", "liquid": {}}, ("/liquid", "not_computed")),
        ({"name": "x", "liquid": LIQUID | {"expansivity_per_k": 1.0}}, ("/liquid/expansivity_per_k", "out_of_range")),
    ],
)
def test_what_cannot_be_is_named_with_its_place(bare, body, expected):
    found = refused(bare, body)
    assert expected in found
    assert bare.get("/substances")["items"] == []


def test_an_unknown_component_is_refused_and_not_echoed(bare):
    answer = bare.put("/substances/s", mixture(("propane", 0.5), ("unobtainium", 0.5)), status=422)
    (error,) = answer["errors"]
    assert (error["pointer"], error["code"]) == ("/vapour/components/1/id", "unknown_component")
    assert "critical_temperature_k" in error["detail"] and "n-butane" in error["detail"]
    assert "unobtainium" not in str(answer)


def test_a_component_that_is_not_in_the_table_may_be_given_in_full(bare):
    """Propane's constants under another name, from memory."""
    constants = {
        "critical_temperature_k": 369.8, "critical_pressure_kpa_abs": 4250.0, "acentric_factor": 0.152,
        "molar_mass_g_mol": 44.1,
    }  # fmt: skip
    own = {"id": "unobtainium", "mole_fraction": 1.0} | constants
    body = {"name": "a gas", "vapour": PROPANE | {"components": [own]}}
    assert bare.put("/substances/s", body, status=201)["outcome"] == "created"


def test_substances_are_listed_by_id_and_pages_agree_while_writes_go_on(bare):
    for number in range(5):
        bare.put(f"/substances/s-{number}", OIL)
    first = bare.get("/substances", limit=2)
    bare.put("/substances/s-3", OIL | {"name": "renamed", "effective_from": "2026-05-01T00:00:00Z"})
    bare.put("/substances/s-21", OIL)
    second = bare.get("/substances", limit=2, cursor=first["next"])
    third = bare.get("/substances", limit=2, cursor=second["next"])
    found = [(one["id"], one["definition"]["name"]) for page in (first, second, third) for one in page["items"]]
    assert found == [(f"s-{number}", "an oil") for number in range(5)]
    assert third["next"] is None and first["known_at"] == second["known_at"] == third["known_at"]
    assert len(bare.get("/substances")["items"]) == 6


def test_what_is_not_there_is_404_and_says_which(bare):
    assert bare.get("/substances/none", status=404)["code"] == "unknown_substance"
    assert bare.client.put("/v1/sites/no-such-site/substances/s", json=OIL).json()["code"] == "unknown_site"


def test_a_vessel_of_a_vapour_alone_cannot_have_a_level(bare):
    bare.put("/substances/gas", {"name": "a gas", "vapour": PROPANE})
    answer = bare.put("/vessels/v", {"name": "v", "substance": "gas", "shape": {"kind": "sphere", "diameter_m": 4.0}})
    assert answer["outcome"] == "created"
