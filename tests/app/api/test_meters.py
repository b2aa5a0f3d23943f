"""Meters are put, dated and read back; a ticket names one that is there."""

from __future__ import annotations

import pytest

BODY = {"name": "jetty 1", "random_pct": 0.03, "systematic_pct": 0.1}
PROVED = {"at": "2026-02-01T00:00:00Z", "systematic_pct": 0.05, "as_found_pct": 0.1, "as_found_uncertainty_pct": 0.03}


@pytest.fixture
def bare(place):
    """A site in which nothing is defined."""
    place.define()
    return place


def test_a_meter_is_created_revised_or_unchanged(bare):
    assert bare.put("/meters/m", BODY, status=201)["outcome"] == "created"
    assert bare.put("/meters/m", BODY, status=200)["outcome"] == "unchanged"
    proved = BODY | {"provings": [PROVED]}
    answer = bare.put("/meters/m", proved, status=422)
    assert [(one["pointer"], one["code"]) for one in answer["errors"]] == [("/effective_from", "missing")]
    dated = proved | {"effective_from": "2026-02-01T00:00:00Z"}
    assert bare.put("/meters/m", dated, status=200)["outcome"] == "revised"
    assert bare.get("/meters/m")["definition"]["provings"] == [PROVED]
    assert "provings" not in bare.get("/meters/m", at="2026-01-31T00:00:00Z")["definition"]


@pytest.mark.parametrize(
    ("change", "expected"),
    [
        ({"random_pct": -0.1}, ("/random_pct", "out_of_range")),
        ({"random_pct": "0.1"}, ("/random_pct", "wrong_type")),
        ({"provings": [PROVED, PROVED]}, ("/provings/1/at", "impossible")),
        ({"provings": [PROVED | {"at": "2026-02-01"}]}, ("/provings/0/at", "not_an_instant")),
        (
            {"provings": [{"at": PROVED["at"], "as_found_pct": 0.1}]},
            ("/provings/0/as_found_uncertainty_pct", "missing"),
        ),
        ({"k_factor": 1.0}, ("/k_factor", "unknown_field")),
    ],
)
def test_what_cannot_be_is_named_with_its_place(bare, change, expected):
    answer = bare.put("/meters/m", BODY | change, status=422)
    assert [(one["pointer"], one["code"]) for one in answer["errors"]] == [expected]


def test_meters_are_listed_by_id_in_pages(bare):
    for name in ("m-b", "m-a", "m-c"):
        bare.put(f"/meters/{name}", BODY)
    first = bare.get("/meters", limit=2)
    assert [one["id"] for one in first["items"]] == ["m-a", "m-b"]
    second = bare.get("/meters", limit=2, cursor=first["next"])
    assert ([one["id"] for one in second["items"]], second["next"]) == (["m-c"], None)
    assert bare.get("/meters", as_of=bare.get("/meters")["known_at"])["items"] == bare.get("/meters")["items"]


def test_what_is_not_there_is_404_and_says_which(bare):
    assert bare.get("/meters/none", status=404)["code"] == "unknown_meter"


def test_a_systematic_error_of_a_meter_is_shared_by_its_tickets(site):
    """Two receipts of 10 000 kg by one meter of 0.3 %: 60 kg together, not 30 √2; random 0.4 %: 40 √2."""
    site.put("/meters/m", {"name": "m", "random_pct": 0.4, "systematic_pct": 0.3})
    site.read("2026-05-30T00:00:00Z", 2.0)
    site.read("2026-05-31T00:00:00Z", 2.4)
    for hour in (1, 2):
        site.move(
            f"t-{hour}", "boundary:ship", "tk-1", by="meter", meter="m", mass_kg=10_000.0,
            started_at=f"2026-05-30T0{hour}:00:00Z", ended_at=f"2026-05-30T0{hour}:30:00Z",
        )  # fmt: skip
    (books,) = site.close("2026-05-30")["vessels"]
    level = 2 * (0.003 * 50_000) ** 2  # two readings; the systematic part is one and the same
    density = (1.0 * 0.4 * 50) ** 2  # 1 kg/m³ of the 20 m³ between the two levels
    meter = 60.0**2 + 2 * 40.0**2
    assert books["imbalance_kg"] == pytest.approx(0.0, abs=1e-6)
    assert books["imbalance_uncertainty_kg"] == pytest.approx((level + density + meter) ** 0.5, rel=1e-9)
