"""Vessels are put, dated, revised and read back as they were in force and as they were known."""

from __future__ import annotations

import pytest

BOX = {"kind": "box", "length_m": 10.0, "width_m": 5.0, "height_m": 4.0}
BODY = {"name": "a tank", "substance": "liquid", "shape": BOX}
MARCH, APRIL, MAY = (f"2026-0{month}-01T00:00:00Z" for month in (3, 4, 5))


@pytest.fixture
def bare(place):
    """A site with a substance and no vessel."""
    place.define()
    place.substance()
    return place


def refused(site, body, name="tk-1"):
    answer = site.put(f"/vessels/{name}", body, status=422)
    assert answer["status"] == 422 and answer["detail"]
    return [(one["pointer"], one["code"]) for one in answer["errors"]]


def name_at(site, at=None, as_of=None, vessel="tk-1"):
    return site.get(f"/vessels/{vessel}", at=at, as_of=as_of)["definition"]["name"]


# --- created, revised, unchanged -----------------------------------------------------------------


def test_the_first_is_created_the_same_again_changes_nothing(bare):
    first = bare.put("/vessels/tk-1", BODY, status=201)
    assert first["outcome"] == "created"
    again = bare.put("/vessels/tk-1", dict(reversed(BODY.items())), status=200)
    assert again["outcome"] == "unchanged"
    assert len(bare.get("/vessels/tk-1/revisions")["items"]) == 1


def test_what_was_sent_is_what_is_read_back(bare):
    bare.put("/vessels/tk-1", BODY)
    assert bare.get("/vessels/tk-1")["definition"] == BODY
    assert bare.get("/vessels/tk-1")["effective_from"] is None


def test_another_body_says_from_when_it_holds(bare):
    bare.put("/vessels/tk-1", BODY)
    assert refused(bare, BODY | {"name": "renamed"}) == [("/effective_from", "missing")]
    answer = bare.put("/vessels/tk-1", BODY | {"name": "renamed", "effective_from": APRIL}, status=200)
    assert answer["outcome"] == "revised"


def test_a_definition_holds_from_its_instant_until_the_next(bare):
    bare.put("/vessels/tk-1", BODY | {"name": "first"})
    bare.put("/vessels/tk-1", BODY | {"name": "third", "effective_from": MAY})
    bare.put("/vessels/tk-1", BODY | {"name": "second", "effective_from": "2026-04-01T02:00:00+02:00"})
    instants = ("2000-01-01T00:00:00Z", "2026-03-31T23:59:59.999999Z", APRIL, "2026-04-30T23:59:59Z", MAY, None)
    assert [name_at(bare, at) for at in instants] == ["first", "first", "second", "second", "third", "third"]


def test_the_same_effective_from_again_corrects_that_one_and_the_former_stays_readable(bare):
    bare.put("/vessels/tk-1", BODY | {"name": "first"})
    known = bare.put("/vessels/tk-1", BODY | {"name": "secnod", "effective_from": APRIL})["known_at"]
    assert bare.put("/vessels/tk-1", BODY | {"name": "second", "effective_from": APRIL})["outcome"] == "revised"
    assert (name_at(bare), name_at(bare, as_of=known)) == ("second", "secnod")
    assert bare.get("/vessels/tk-1")["revision"] == 2


def test_revisions_are_everything_that_was_said_in_the_order_in_which_it_was_said(bare):
    bare.put("/vessels/tk-1", BODY | {"name": "first"})
    bare.put("/vessels/tk-1", BODY | {"name": "later", "effective_from": MAY})
    known = bare.put("/vessels/tk-1", BODY | {"name": "between", "effective_from": APRIL})["known_at"]
    bare.put("/vessels/tk-1", BODY | {"name": "corrected", "effective_from": MAY})
    said = bare.get("/vessels/tk-1/revisions")["items"]
    assert [(one["definition"]["name"], one["effective_from"], one["revision"]) for one in said] == [
        ("first", None, 1), ("later", MAY, 1), ("between", APRIL, 1), ("corrected", MAY, 2),
    ]  # fmt: skip
    assert [one["recorded_at"] for one in said] == sorted({one["recorded_at"] for one in said})
    assert len(bare.get("/vessels/tk-1/revisions", as_of=known)["items"]) == 3


def test_a_vessel_that_begins_later_is_not_there_before(bare):
    bare.put("/vessels/tk-1", BODY | {"effective_from": APRIL})
    assert bare.get("/vessels/tk-1", at=MARCH, status=404)["code"] == "unknown_vessel"
    assert bare.get("/vessels", at=MARCH)["items"] == []
    assert bare.get("/inventory", at=MARCH)["vessels"] == []


# --- listings ------------------------------------------------------------------------------------


def test_vessels_are_listed_by_id_and_pages_agree_while_writes_go_on(bare):
    for number in range(7):
        bare.put(f"/vessels/tk-{number}", BODY)
    pages, cursor, known = [], None, set()
    for turn in range(100):
        page = bare.get("/vessels", limit=3, cursor=cursor)
        pages += [(one["id"], one["definition"]["name"]) for one in page["items"]]
        known.add(page["known_at"])
        cursor = page["next"]
        if cursor is None:
            break
        bare.put(f"/vessels/tk-5{turn}", BODY)
        bare.put("/vessels/tk-6", BODY | {"name": f"renamed {turn}", "effective_from": APRIL})
    assert pages == [(f"tk-{number}", "a tank") for number in range(7)]
    assert len(known) == 1 and turn == 2
    assert len(bare.get("/vessels")["items"]) == 9


# --- refusals ------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("change", "expected"),
    [
        ({"shape": {"kind": "capacity_table", "rows": [[0, 0], [1, 50], [1, 60]]}}, ("/shape/rows/2", "table_falls")),
        ({"shape": {"kind": "capacity_table", "rows": [[0, 0], [1, 50], [2, 40]]}}, ("/shape/rows/2", "table_falls")),
        ({"shape": {"kind": "capacity_table", "rows": [[0, 0]]}}, ("/shape/rows", "wrong_length")),
        ({"shape": {"kind": "pyramid"}}, ("/shape/kind", "not_one_of")),
        ({"shape": {}}, ("/shape/kind", "missing")),
        ({"shape": {"kind": "box", "length_m": 10.0, "width_m": 5.0}}, ("/shape/height_m", "missing")),
        ({"shape": BOX | {"height_m": -1}}, ("/shape/height_m", "out_of_range")),
        ({"shape": BOX | {"height_m": 1e-300}}, ("/shape/height_m", "out_of_range")),
        ({"shell": {"thickness_m": 1e-9}}, ("/shell/thickness_m", "out_of_range")),
        ({"shape": BOX | {"height_m": "4"}}, ("/shape/height_m", "wrong_type")),
        ({"shape": BOX | {"diameter_m": 4.0}}, ("/shape/diameter_m", "unknown_field")),
        ({"substance": "nothing-of-this-name"}, ("/substance", "unknown_substance")),
        ({"substance": None}, ("/substance", "missing")),
        ({"name": ""}, ("/name", "wrong_length")),
        ({"effective_from": "2026-03-14"}, ("/effective_from", "not_an_instant")),
        ({"effective_from": "2026-03-14T06:00:00"}, ("/effective_from", "no_offset")),
        ({"max_age_s": {"level_m": None}}, ("/max_age_s/level_m", "impossible")),
        ({"max_age_s": {"pressure_kpa": 4_000_000}}, ("/max_age_s/pressure_kpa", "out_of_range")),
        ({"assumed": {"pressure_kpa": {"value": -200}}}, ("/assumed/pressure_kpa/value", "out_of_range")),
        ({"instruments": {"level_m": {"random": -0.1}}}, ("/instruments/level_m/random", "out_of_range")),
        ({"sources": [{"source": "a"}, {"source": "a"}]}, ("/sources/1/source", "twice")),
        ({"gauging": {"datum_m": 50.0}}, ("/gauging/datum_m", "impossible_definition")),
        ({"deadwood": [[2.0, 1.0, 0.5]]}, ("/deadwood/0", "impossible")),
        ({"vapour_space": {"kind": "blanketed"}}, ("/vapour_space/blanket", "missing")),
        ({"floating_roof": {"mass_kg": 9e4, "lands_at_m": 1.0, "floats_at_m": 1.2}}, ("/floating_roof", "conflicting")),
    ],
)  # fmt: skip
def test_what_cannot_be_is_named_with_its_place(bare, change, expected):
    assert refused(bare, BODY | change) == [expected]
    assert bare.get("/vessels")["items"] == []


def test_every_mistake_is_named_at_once(bare):
    body = {"name": 3, "shape": BOX | {"height_m": 0}, "substance": "LIQUID", "colour": "blue"}
    assert sorted(refused(bare, body)) == [
        ("/colour", "unknown_field"), ("/name", "wrong_type"), ("/shape/height_m", "out_of_range"),
        ("/substance", "wrong_form"),
    ]  # fmt: skip


def test_courses_that_do_not_reach_the_top_are_refused(bare):
    courses = BODY | {"shell": {"courses": [[2.0, 0.01]]}}
    assert ("/shell/courses", "impossible_definition") in refused(bare, courses)


@pytest.mark.parametrize("text", ['{"name": NaN}', "{", "[]", '"x"', '{"name": "a", "name": "b"}', "\ufeff{}", "\x00"])
def test_what_is_no_json_is_said_to_be_none(bare, text):
    answer = bare.ask("PUT", "/vessels/tk-1", content=text, headers={"Content-Type": "application/json"})
    assert answer.status_code in (400, 422)
    assert answer.headers["content-type"] == "application/problem+json"


def test_bodies_of_another_type_and_from_elsewhere_are_turned_away(bare):
    assert bare.ask("PUT", "/vessels/tk-1", content=b"{}", headers={"Content-Type": "text/csv"}).status_code == 415
    assert bare.ask("PUT", "/vessels/tk-1", json=BODY, headers={"Sec-Fetch-Site": "cross-site"}).status_code == 403
    assert bare.ask("PUT", "/vessels/tk-1", json=BODY, headers={"Host": "10.0.0.1"}).status_code == 421
    assert bare.get("/vessels")["items"] == []


def test_what_is_not_there_is_404_and_says_which(bare, place):
    assert bare.get("/vessels/tk-9", status=404)["code"] == "unknown_vessel"
    assert bare.get("/vessels/tk-9/revisions", status=404)["code"] == "unknown_vessel"
    elsewhere = bare.client.get("/v1/sites/no-such-site/vessels/tk-1")
    assert (elsewhere.status_code, elsewhere.json()["code"]) == (404, "unknown_site")
    assert bare.client.put("/v1/sites/no-such-site/vessels/tk-1", json=BODY).json()["code"] == "unknown_site"
