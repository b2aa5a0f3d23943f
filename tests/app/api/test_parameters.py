"""Parameters of paths and queries are read strictly, and every refusal says what would have been right."""

from __future__ import annotations

import pytest


def mistakes(answer):
    return [(one["pointer"], one["code"]) for one in answer["errors"]]


@pytest.mark.parametrize(
    ("instant", "code", "said"),
    [
        ("2026-05-01T00:00:00", "no_offset", "2026-03-14T06:00:00+01:00"),
        ("2026-05-01", "not_an_instant", "2026-03-14T06:00:00+01:00"),
        ("1777593600", "not_an_instant", "2026-03-14T06:00:00+01:00"),
        ("2026-02-30T00:00:00Z", "not_an_instant", "no such date"),
        ("9999-01-01T00:00:00Z", "not_an_instant", "1970 to 2200"),
        ("now", "not_an_instant", "2026-03-14T06:00:00+01:00"),
        ("", "not_an_instant", "2026-03-14T06:00:00+01:00"),
    ],
)
def test_an_instant_needs_its_offset_and_a_date_that_exists(site, instant, code, said):
    answer = site.get("/inventory", at=instant, status=422)
    assert mistakes(answer) == [("/query/at", code)]
    assert said in answer["errors"][0]["detail"]


def test_a_plus_that_was_not_encoded_is_still_an_offset(site):
    asked = site.client.get(f"{site.path}/inventory?at=2026-05-01T02:00:00+02:00")
    assert asked.status_code == 200
    assert asked.json()["at"] == "2026-05-01T00:00:00Z"


@pytest.mark.parametrize("name", ["TK-1", "-tk", "tk 1", "tänk", "x" * 64, "%2e%2e"])
def test_ids_with_capitals_and_other_signs_are_refused(site, name):
    answer = site.ask("GET", f"/vessels/{name}", status=422).json()
    assert mistakes(answer) == [("/path/vessel", "wrong_form")]
    assert "a-z" in answer["errors"][0]["detail"]
    assert name not in site.ask("GET", f"/vessels/{name}").text


@pytest.mark.parametrize("limit", ["0", "10001", "-1", "many", "1e3", "NaN"])
def test_a_limit_is_a_number_from_1_to_10_000(site, limit):
    answer = site.get("/vessels", limit=limit, status=422)
    assert [pointer for pointer, _ in mistakes(answer)] == ["/query/limit"]


@pytest.mark.parametrize("cursor", ["x", "~", "tk-1", "TK~1", "1~~", "tk-1~x", "9" * 19 + "~a~1", "1~a~" + "9" * 30])
def test_a_cursor_that_is_no_cursor_is_refused(site, cursor):
    period = {"from": "2026-05-01T00:00:00Z", "to": "2026-06-01T00:00:00Z"}
    paths = [("/vessels", {}), ("/substances", {}), ("/meters", {}), ("/vessels/tk-1/readings", period)]
    paths += [(f"/{name}", period) for name in ("transfers", "reconciliations", "imbalances")]
    for path, query in paths:
        answer = site.get(path, cursor=cursor, status=422, **query)
        assert mistakes(answer) == [("/query/cursor", "not_a_cursor")], path


def test_a_cursor_of_one_listing_is_refused_by_another(site):
    period = {"from": "2026-05-01T00:00:00Z", "to": "2026-06-01T00:00:00Z"}
    for path in ("/reconciliations", "/imbalances"):
        assert site.get(path, cursor="1~radar~2", status=422, **period)["code"] == "not_a_cursor"


def test_a_period_ends_after_it_begins(site):
    period = {"from": "2026-05-02T00:00:00Z", "to": "2026-05-01T00:00:00Z"}
    for path in ("/vessels/tk-1/readings", "/transfers", "/vessels/tk-1/inventory", "/reconciliations", "/imbalances"):
        assert site.get(path, status=422, **period)["errors"] == [
            {"pointer": "/query/to", "code": "impossible", "detail": "to is after from"}
        ], path


def test_what_a_query_must_say_is_named(site):
    for path in ("/vessels/tk-1/readings", "/transfers", "/vessels/tk-1/inventory", "/reconciliations", "/imbalances"):
        assert mistakes(site.get(path, status=422)) == [("/query/from", "missing"), ("/query/to", "missing")]


def test_a_form_is_told_in_words(site):
    (one,) = site.get("/vessels/TK", status=422)["errors"]
    assert one["detail"] == "It is 1 to 63 of a-z, 0-9, dot, underscore and hyphen, a letter or digit first"
    (one,) = site.get("/reconciliations/today", status=422)["errors"]
    assert "2026-03-14.2" in one["detail"]
