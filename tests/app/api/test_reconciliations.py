"""Periods are closed over HTTP: days of 23 to 25 hours, books that chain, verdicts by hand arithmetic.

A level of 1 m is 50 000 kg; a reading is worth 150 kg of its own and 200 kg that all of them share.
"""

from __future__ import annotations

from statistics import NormalDist

import pytest

MAY = {"from": "2026-05-01T00:00:00Z", "to": "2026-06-01T00:00:00Z"}
OWN = 150.0


@pytest.fixture
def oslo(place):
    """A site whose days begin at six in Oslo, with one box."""
    place.define(time_zone="Europe/Oslo", day_starts_at="06:00")
    place.substance()
    place.vessel()
    return place


def nights(site, *levels, first=28, vessel="tk-1"):
    """A level at each midnight of May from the first day on."""
    for day, level in enumerate(levels, start=first):
        site.read(f"2026-05-{day:02}T00:00:00Z", level, vessel=vessel)


def only(reconciliation):
    (vessel,) = reconciliation["vessels"]
    return vessel


# --- days ----------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("day", "opening", "closing", "hours"),
    [
        ("2026-03-28", "2026-03-28T05:00:00Z", "2026-03-29T04:00:00Z", 23),
        ("2026-03-27", "2026-03-27T05:00:00Z", "2026-03-28T05:00:00Z", 24),
        ("2025-10-25", "2025-10-25T04:00:00Z", "2025-10-26T05:00:00Z", 25),
    ],
)
def test_a_local_day_has_23_24_or_25_hours(oslo, day, opening, closing, hours):
    """Clocks in Oslo go forward on 29 March 2026 and back on 26 October 2025, at 01:00 UTC."""
    oslo.read(opening, 2.0)
    oslo.read(closing, 2.0)
    last_hour = int(closing[11:13]) - 1
    ticket = {"mass_kg": 100.0, "started_at": f"{closing[:11]}{last_hour:02}:30:00Z"}
    oslo.move("within", "boundary:a", "tk-1", ended_at=f"{closing[:11]}{last_hour:02}:59:59Z", **ticket)
    oslo.move("after", "boundary:a", "tk-1", mass_kg=1000.0, started_at=closing,
              ended_at=f"{closing[:11]}{last_hour + 2:02}:00:00Z")  # fmt: skip
    found = oslo.close(day)
    assert (found["id"], found["opening"], found["closing"]) == (f"{day}.1", opening, closing)
    assert hours == (24 * (int(closing[8:10]) - int(opening[8:10])) + int(closing[11:13]) - int(opening[11:13]))
    books = only(found)
    assert (books["received_kg"], books["opening_mass_kg"]) == (pytest.approx(100.0), pytest.approx(100_000.0))
    assert (books["opening_read_at"], books["closing_read_at"]) == (opening, closing)


def test_days_over_a_clock_change_chain_without_a_gap(oslo):
    for instant in ("2026-03-27T05:00:00Z", "2026-03-28T05:00:00Z", "2026-03-29T04:00:00Z", "2026-03-30T04:00:00Z"):
        oslo.read(instant, 2.0)
    closed = [oslo.close(f"2026-03-{day}") for day in (27, 28, 29)]
    assert [one["closing"] for one in closed[:-1]] == [one["opening"] for one in closed[1:]]


@pytest.mark.parametrize(
    ("starts", "day", "edge"),
    [
        ("02:30", "2026-03-29", "2026-03-29T01:00:00Z"),  # does not exist: the first instant after the gap
        ("02:30", "2025-10-26", "2025-10-26T00:30:00Z"),  # occurs twice: the first
    ],
)
def test_an_hour_that_is_skipped_or_comes_twice_is_one_instant(place, starts, day, edge):
    place.define(time_zone="Europe/Oslo", day_starts_at=starts)
    assert place.close(day)["opening"] == edge


def test_two_instants_are_a_period_too(site):
    nights(site, 2.0, 2.0, 2.0)
    body = {"opening": "2026-05-28T02:00:00+02:00", "closing": "2026-05-30T00:00:00Z"}
    found = site.post("/reconciliations", body, status=201)
    assert found["id"] == "20260528T000000Z--20260530T000000Z.1"
    assert site.get("/reconciliations/20260528T000000Z--20260530T000000Z") == found


# --- arithmetic ----------------------------------------------------------------------------------


def test_a_quiet_night_is_balanced(site):
    """400 kg of 0.4 m · 50 000 kg/m are missing of 20 000 kg: −400 kg."""
    nights(site, 2.0, 2.392)
    site.move("t", "boundary:a", "tk-1", mass_kg=20_000.0, mass_uncertainty_kg=100.0,
              started_at="2026-05-28T01:00:00Z", ended_at="2026-05-28T02:00:00Z")  # fmt: skip
    found = site.close("2026-05-28")
    books = only(found)
    assert books["opening_mass_kg"] == pytest.approx(100_000.0)
    assert books["closing_mass_kg"] == pytest.approx(119_600.0)
    assert (books["received_kg"], books["delivered_kg"]) == (20_000.0, 0.0)
    assert books["book_mass_kg"] == pytest.approx(120_000.0)
    assert books["imbalance_kg"] == pytest.approx(-400.0)
    density = 1.0 * 19.6  # kg/m³ by the m³ between both readings: the gauge's shared error cancels out
    uncertainty = (2 * OWN**2 + density**2 + 100.0**2) ** 0.5
    assert books["imbalance_uncertainty_kg"] == pytest.approx(uncertainty, rel=1e-9)
    assert books["score"] == pytest.approx(-400.0 / uncertainty, rel=1e-6)
    normal = NormalDist()
    assert books["p_value"] == pytest.approx(2 * normal.cdf(-400.0 / uncertainty), rel=1e-6)
    critical = normal.inv_cdf(1 - 0.5 / 30.44 / 2)  # half a false alarm in a month of 30.44 nights, two-sided
    assert books["detectable_imbalance_kg"] == pytest.approx((critical + 1.645) * uncertainty, rel=1e-4)
    assert (books["flagged"], books["verdict"], found["status"], found["complete"]) == (False, "pass", "balanced", True)


def test_a_loss_is_negative_flagged_and_what_hides_smaller_ones_is_named(site):
    nights(site, 2.0, 1.98)
    found = site.close("2026-05-28")
    books = only(found)
    uncertainty = (2 * OWN**2 + 1.0) ** 0.5
    assert (books["imbalance_kg"], books["flagged"], books["verdict"]) == (pytest.approx(-1000.0), True, "fail")
    assert books["score"] == pytest.approx(-1000.0 / uncertainty, rel=1e-6)
    assert found["status"] == "imbalanced"
    assert "level" in books["limited_by"][0]["instrument"]
    listed = site.get("/imbalances", **MAY, flagged="true")["items"]
    assert [(one["reconciliation"], one["vessel"]) for one in listed] == [("2026-05-28.1", "tk-1")]
    assert site.get("/imbalances", **MAY, flagged="false")["items"] == []


def test_a_limit_that_the_instruments_cannot_see_is_inconclusive(place):
    place.define(imbalance_limit={"kg": 100.0})
    place.substance()
    place.vessel()
    nights(place, 2.0, 2.001)
    books = only(place.close("2026-05-28"))
    assert (books["imbalance_kg"], books["over_limit"]) == (pytest.approx(50.0), False)
    assert books["detectable_imbalance_kg"] > 100.0
    assert (books["flagged"], books["verdict"]) == (False, "inconclusive")


def test_a_limit_grows_with_the_throughput(place):
    """100 kg and 10 % of 20 000 kg: 2 100 kg, which the instruments can see; 500 kg are within it."""
    place.define(imbalance_limit={"kg": 100.0, "pct_of_throughput": 10.0})
    place.substance()
    place.vessel()
    nights(place, 2.0, 2.41)
    place.move("t", "boundary:a", "tk-1", mass_kg=20_000.0, started_at="2026-05-28T01:00:00Z",
               ended_at="2026-05-28T02:00:00Z")  # fmt: skip
    books = only(place.close("2026-05-28"))
    assert (books["imbalance_kg"], books["over_limit"]) == (pytest.approx(500.0), False)
    assert (books["flagged"], books["verdict"]) == (False, "pass")


def test_totals_of_a_substance_are_those_of_the_whole_site(site):
    """Two boxes lose 100 kg each; the density's error acts on both, 1 kg/m³ on 4 m³."""
    site.vessel("tk-2")
    nights(site, 2.0, 1.998)
    nights(site, 1.0, 0.998, vessel="tk-2")
    (total,) = site.close("2026-05-28")["totals"]
    assert (total["substance"], total["complete"]) == ("liquid", True)
    assert total["opening_mass_kg"] == pytest.approx(150_000.0)
    assert total["closing_mass_kg"] == pytest.approx(149_800.0)
    assert total["imbalance_kg"] == pytest.approx(-200.0)
    assert total["imbalance_uncertainty_kg"] == pytest.approx((4 * OWN**2 + 0.2**2) ** 0.5, rel=1e-6)


def test_a_vessel_out_of_service_is_nothing_with_certainty_and_no_night_is_incomplete_for_it(site):
    site.vessel("tk-2", service="out")
    nights(site, 2.0, 2.0)
    found = site.close("2026-05-28")
    idle = next(one for one in found["vessels"] if one["vessel"] == "tk-2")
    assert (idle["status"], idle["closing_mass_kg"]) == ("out_of_service", 0.0)
    assert (found["complete"], found["status"]) == (True, "balanced")


# --- what was missing ----------------------------------------------------------------------------


def test_an_incomplete_night_is_closed_and_names_which_vessel(site):
    site.vessel("tk-2")
    nights(site, 2.0, 2.0)
    found = site.close("2026-05-28")
    assert not found["complete"]
    assert {one["vessel"]: one["status"] for one in found["vessels"]} == {"tk-1": "measured", "tk-2": "unmeasured"}
    missing = next(one for one in found["vessels"] if one["vessel"] == "tk-2")
    assert missing["imbalance_kg"] is None and missing["verdict"] == "inconclusive" and not missing["flagged"]
    (total,) = found["totals"]
    assert (total["complete"], total.get("imbalance_kg")) == (False, None)


def test_a_period_that_has_not_ended_is_refused(site):
    site.clock.set("2026-05-31T23:59:59Z")
    assert site.close("2026-05-31", status=409)["code"] == "period_open"
    site.clock.set("2026-06-01T00:00:00Z")
    assert site.close("2026-05-31")["id"] == "2026-05-31.1"


@pytest.mark.parametrize(
    ("body", "pointer"),
    [
        ({}, ""),
        ({"day": "2026-02-30"}, "/day"),
        ({"day": "14.3.2026"}, "/day"),
        ({"day": 20260314}, "/day"),
        ({"day": "2026-05-28", "opening": "2026-05-28T00:00:00Z"}, ""),
        ({"opening": "2026-05-28T00:00:00Z"}, "/closing"),
        ({"opening": "2026-05-28T00:00:00", "closing": "2026-05-29T00:00:00Z"}, "/opening"),
        ({"opening": "2026-05-29T00:00:00Z", "closing": "2026-05-28T00:00:00Z"}, "/closing"),
        ({"night": "2026-05-28"}, "/night"),
    ],
)
def test_a_period_that_cannot_be_is_named_with_its_place(site, body, pointer):
    answer = site.post("/reconciliations", body, status=422)
    assert pointer in [one["pointer"] for one in answer["errors"]]
    assert site.get("/reconciliations", **MAY)["items"] == []


def test_what_is_not_there_is_404_and_says_which(site, client):
    site.close("2026-05-28")
    for name in ("2026-05-29", "2026-05-28.2", "20260528T000000Z--20260530T000000Z"):
        assert site.get(f"/reconciliations/{name}", status=404)["code"] == "unknown_reconciliation", name
    assert client.post("/v1/sites/no-such-site/reconciliations", json={"day": "2026-05-28"}).status_code == 404


@pytest.mark.parametrize(
    "name", ["2026-02-30", "2026-13-01.1", "0000-01-01", "9999-12-31", "20261301T000000Z--20260530T000000Z"]
)
def test_an_id_of_no_date_is_refused(site, name):
    assert site.get(f"/reconciliations/{name}", status=422)["code"] == "not_a_period"


# --- kept for ever -------------------------------------------------------------------------------


def test_books_chain_and_an_opening_is_the_closing_before(site):
    nights(site, 2.0, 2.002, 2.004, 2.006)
    closed = [site.close(f"2026-05-{day}") for day in (28, 29, 30)]
    assert [only(one)["opening_mass_kg"] for one in closed[1:]] == [only(one)["closing_mass_kg"] for one in closed[:-1]]
    assert [only(one)["opening_read_at"] for one in closed[1:]] == [only(one)["closing_read_at"] for one in closed[:-1]]


def test_the_same_inputs_make_no_second_revision(site):
    nights(site, 2.0, 2.0)
    first = site.close("2026-05-28")
    assert site.close("2026-05-28", status=200) == first
    site.read("2026-05-20T00:00:00Z", 3.0)  # of another night
    assert site.close("2026-05-28", status=200)["id"] == first["id"]


def test_late_data_make_the_next_revision_and_the_former_stays(site):
    nights(site, 2.0, 2.0)
    first = site.close("2026-05-28")
    site.read("2026-05-29T00:00:00Z", 2.1)
    second = site.close("2026-05-28")
    assert (second["id"], second["revision"]) == ("2026-05-28.2", 2)
    assert only(second)["imbalance_kg"] == pytest.approx(5_000.0)
    assert site.get("/reconciliations/2026-05-28") == second
    assert site.get("/reconciliations/2026-05-28.1") == first
    assert site.get("/reconciliations/2026-05-28", as_of=first["known_at"], status=404)["status"] == 404
    third = site.move("t", "boundary:a", "tk-1", mass_kg=5_000.0, started_at="2026-05-28T01:00:00Z",
                      ended_at="2026-05-28T02:00:00Z")["outcome"]  # fmt: skip
    assert third == "created" and only(site.close("2026-05-28"))["imbalance_kg"] == pytest.approx(0.0, abs=1e-6)


def test_a_revision_moves_the_opening_of_the_night_after(site):
    nights(site, 2.0, 2.0, 2.0)
    site.close("2026-05-28")
    site.close("2026-05-29")
    site.read("2026-05-29T00:00:00Z", 2.1)
    site.close("2026-05-28")
    after = site.close("2026-05-29")
    assert (after["revision"], only(after)["opening_mass_kg"]) == (2, pytest.approx(105_000.0))


# --- listings ------------------------------------------------------------------------------------


def test_reconciliations_are_listed_by_their_close_at_their_newest_revision(site):
    nights(site, 2.0, 2.0, 2.0, 2.0)
    for day in (30, 28, 29):
        site.close(f"2026-05-{day}")
    site.read("2026-05-29T00:00:00Z", 2.1)
    site.close("2026-05-28")
    found = site.get("/reconciliations", **MAY)
    assert [one["id"] for one in found["items"]] == ["2026-05-28.2", "2026-05-29.1", "2026-05-30.1"]
    period = {"from": "2026-05-29T00:00:00Z", "to": "2026-05-30T00:00:00Z"}
    assert [one["id"] for one in site.get("/reconciliations", **period)["items"]] == ["2026-05-29.1"]


def test_pages_agree_while_nights_are_closed_anew(site):
    nights(site, 2.0, 2.0, 2.0, 2.0)
    for day in (28, 29, 30):
        site.close(f"2026-05-{day}")
    for path, of in (("/reconciliations", "id"), ("/imbalances", "reconciliation")):
        before = [one[of] for one in site.get(path, **MAY)["items"]]
        first = site.get(path, **MAY, limit=1)
        site.read("2026-05-31T00:00:00Z", 2.1 + len(path) / 1000)
        site.close("2026-05-30")
        second = site.get(path, **MAY, limit=1, cursor=first["next"])
        third = site.get(path, **MAY, limit=1, cursor=second["next"])
        assert [one[of] for page in (first, second, third) for one in page["items"]] == before
        assert third["next"] is None and third["known_at"] == first["known_at"]


def test_imbalances_are_the_vessels_of_the_nights(site):
    site.vessel("tk-2")
    nights(site, 2.0, 1.98, 1.98)
    nights(site, 1.0, 1.0, 1.0, vessel="tk-2")
    closed = [site.close(f"2026-05-{day}") for day in (28, 29)]
    found = site.get("/imbalances", **MAY)["items"]
    assert [(one["reconciliation"], one["vessel"], one["flagged"]) for one in found] == [
        ("2026-05-28.1", "tk-1", True), ("2026-05-28.1", "tk-2", False),
        ("2026-05-29.1", "tk-1", False), ("2026-05-29.1", "tk-2", False),
    ]  # fmt: skip
    assert found[0]["imbalance_kg"] == closed[0]["vessels"][0]["imbalance_kg"]
    assert (found[0]["opening"], found[0]["closing"]) == ("2026-05-28T00:00:00Z", "2026-05-29T00:00:00Z")


def test_statistics_come_where_they_are_asked_for(site):
    nights(site, 2.0, 2.0)
    assert "statistic" not in site.close("2026-05-28")["groups"][0]
    found = site.get("/reconciliations/2026-05-28", detail="true")["groups"][0]
    assert found["members"] == ["tk-1"] and found["statistic"] == pytest.approx(0.0, abs=1e-9)


# --- what a revision changed ---------------------------------------------------------------------


def test_a_revision_says_what_it_changed_and_why(site):
    """20 mm more at the close: 1 000 kg; the first revision has nothing before it, and changed nothing."""
    nights(site, 2.0, 2.0)
    site.close("2026-05-28")
    first = site.get("/reconciliations/2026-05-28.1/changes")
    assert first == {"id": "2026-05-28.1", "before": None, "changes": [], "words": []}
    site.read("2026-05-29T00:00:00Z", 2.02)
    site.close("2026-05-28")
    found = site.get("/reconciliations/2026-05-28/changes")
    assert (found["id"], found["before"]) == ("2026-05-28.2", "2026-05-28.1")
    assert [(one["vessel"], one["field"]) for one in found["changes"]] == [
        ("tk-1", "closing_mass_kg"), ("tk-1", "imbalance_kg"), ("tk-1", "flagged"), ("tk-1", "verdict"),
    ]  # fmt: skip
    closing = found["changes"][0]
    assert (closing["before"], closing["after"]) == (pytest.approx(100_000.0), pytest.approx(101_000.0))
    (cause,) = closing["because"]
    assert (cause["kind"], cause["subject"]) == ("revised_reading", "tk-1 level_m 2026-05-29T00:00:00Z")
    assert cause["recorded_at"].endswith("Z") and "transfer" not in closing
    assert (found["changes"][2]["before"], found["changes"][2]["after"]) == (False, True)
    assert len(found["words"]) == 4
    line = "tk-1: closing mass 100,000 → 101,000 kg because the level of tk-1 of 2026-05-29T00:00:00Z was revised on "
    assert found["words"][0].startswith(line)


@pytest.mark.parametrize("name", ["2026-05-29", "2026-05-28.2"])
def test_what_was_never_closed_changed_nothing(site, name):
    site.close("2026-05-28")
    assert site.get(f"/reconciliations/{name}/changes", status=404)["code"] == "unknown_reconciliation"
