"""Sites are put, dated and listed; their day changes only where no day is closed by it."""

from __future__ import annotations

import pytest

BODY = {"name": "a place", "time_zone": "Europe/Oslo", "day_starts_at": "06:00"}


def refused(place, change):
    answer = place.put("", BODY | change, status=422)
    return [(one["pointer"], one["code"]) for one in answer["errors"]]


def test_a_site_is_created_revised_or_unchanged(place):
    assert place.put("", BODY, status=201)["outcome"] == "created"
    assert place.put("", BODY, status=200)["outcome"] == "unchanged"
    renamed = BODY | {"name": "renamed"}
    assert refused(place, renamed) == [("/effective_from", "missing")]
    dated = renamed | {"effective_from": "2026-04-01T00:00:00+02:00"}
    assert place.put("", dated, status=200)["outcome"] == "revised"
    assert place.get("", at="2026-03-31T21:59:59Z")["definition"]["name"] == "a place"
    assert place.get("", at="2026-03-31T22:00:00Z")["definition"]["name"] == "renamed"


def test_known_at_says_when_it_was_written_and_as_of_takes_it_back(place):
    known = place.put("", BODY)["known_at"]
    place.put("", BODY | {"name": "renamed", "effective_from": "2026-04-01T00:00:00Z"})
    assert place.get("", as_of=known)["definition"]["name"] == "a place"
    assert place.get("")["definition"]["name"] == "renamed"


@pytest.mark.parametrize(
    ("change", "expected"),
    [
        ({"time_zone": "Europe/Atlantis"}, ("/time_zone", "unknown_zone")),
        ({"time_zone": "../../etc/passwd"}, ("/time_zone", "wrong_form")),
        ({"time_zone": "localtime"}, ("/time_zone", "unknown_zone")),
        ({"day_starts_at": "24:00"}, ("/day_starts_at", "wrong_form")),
        ({"day_starts_at": "6:00"}, ("/day_starts_at", "wrong_form")),
        ({"base_temperature_c": 1e6}, ("/base_temperature_c", "out_of_range")),
        ({"base_temperature_c": "15"}, ("/base_temperature_c", "wrong_type")),
        ({"elevation_m": 9000.0}, ("/elevation_m", "out_of_range")),
        ({"elevation_m": 0.0, "atmospheric_pressure_kpa_abs": 101.0}, ("/atmospheric_pressure_kpa_abs", "one_of")),
        ({"imbalance_limit": {}}, ("/imbalance_limit", "missing")),
        ({"false_alarms_per_month": 0}, ("/false_alarms_per_month", "out_of_range")),
        ({"name": "two\nlines"}, ("/name", "wrong_form")),
        ({"colour": "blue"}, ("/colour", "unknown_field")),
    ],
)
def test_what_cannot_be_is_named_with_its_place(place, change, expected):
    assert refused(place, change) == [expected]
    assert place.get("", status=404)["code"] == "unknown_site"


def test_sites_are_listed_by_id_in_pages(place, client, clock):
    names = [f"{place.name}-{number}" for number in range(5)]
    for name in names:
        type(place)(client, clock, name).define()
    found, cursor = [], None
    while True:
        params = {"limit": 2} | ({"cursor": cursor} if cursor else {})
        page = client.get("/v1/sites", params=params).json()
        assert len(page["items"]) <= 2
        found += [one["id"] for one in page["items"]]
        cursor = page["next"]
        if cursor is None:
            break
    assert [name for name in found if name.startswith(place.name)] == names
    assert found == sorted(found) and len(found) == len(set(found))


def test_the_day_changes_only_from_the_end_of_the_last_closed_day(site):
    body = {"name": "a place", "time_zone": "UTC", "day_starts_at": "00:00", "elevation_m": 0.0}
    site.close("2026-05-30")
    early = site.put("", body | {"day_starts_at": "06:00", "effective_from": "2026-05-30T00:00:00Z"}, status=409)
    assert early["code"] == "zone_in_use"
    renamed = {"name": "renamed", "effective_from": "2026-05-01T00:00:00Z"}
    assert site.put("", body | renamed)["outcome"] == "revised"
    later = {"day_starts_at": "06:00", "effective_from": "2026-05-31T00:00:00Z"}
    assert site.put("", body | later)["outcome"] == "revised"


def test_bodies_of_another_type_and_from_elsewhere_are_turned_away(place):
    assert place.ask("PUT", content=b"name=a", headers={"Content-Type": "text/plain"}).status_code == 415
    assert place.ask("PUT", json=BODY, headers={"Origin": "https://elsewhere.example"}).status_code == 403
    assert place.ask("PUT", json=BODY, headers={"Origin": "null"}).status_code == 403
    assert place.ask("PUT", json=BODY, headers={"Host": "elsewhere.example"}).status_code == 421
    assert place.ask("PUT", json=BODY, headers={"Origin": "http://localhost"}).status_code == 201
