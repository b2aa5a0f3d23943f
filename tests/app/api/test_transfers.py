"""Tickets are kept, revised and struck; each night takes its part of them, and the parts add up."""

from __future__ import annotations

import pytest

MAY = {"from": "2026-05-01T00:00:00Z", "to": "2026-06-01T00:00:00Z"}
TICKET = {
    "from": "boundary:jetty-1", "to": "tk-1", "by": "statement", "mass_uncertainty_kg": 10.0, "mass_kg": 20_000.0,
    "started_at": "2026-05-30T01:00:00Z", "ended_at": "2026-05-30T02:00:00Z",
}  # fmt: skip


def without(*names, **changes):
    return {name: value for name, value in TICKET.items() if name not in names} | changes


def refused(site, body):
    answer = site.put("/transfers/t", body, status=422)
    return [(one["pointer"], one["code"]) for one in answer["errors"]]


def night(site, *, opening=2.0, closing=2.4, day="2026-05-30", **query):
    site.read(f"{day}T00:00:00Z", opening)
    site.read(f"{day[:-2]}{int(day[-2:]) + 1:02}T00:00:00Z", closing)
    return site.close(day, **query)


def received(books):
    return {one["vessel"]: one["received_kg"] for one in books["vessels"]}


# --- kept, revised, struck -----------------------------------------------------------------------


def test_a_ticket_is_created_revised_or_unchanged(site):
    assert site.put("/transfers/t", TICKET, status=201)["outcome"] == "created"
    assert site.put("/transfers/t", TICKET, status=200)["outcome"] == "unchanged"
    known = site.put("/transfers/t", TICKET, status=200)["known_at"]
    assert site.put("/transfers/t", TICKET | {"mass_kg": 21_000.0}, status=200)["outcome"] == "revised"
    found = site.get("/transfers/t")
    assert (found["id"], found["revision"], found["transfer"]["mass_kg"]) == ("t", 2, 21_000.0)
    assert site.get("/transfers/t", as_of=known)["transfer"] == TICKET


def test_void_strikes_a_ticket_and_it_stays_readable(site):
    site.put("/transfers/t", TICKET)
    assert received(night(site))["tk-1"] == 20_000.0
    assert site.put("/transfers/t", TICKET | {"void": True})["outcome"] == "revised"
    assert received(site.close("2026-05-30"))["tk-1"] == 0.0
    assert site.get("/transfers/t")["transfer"]["void"] is True
    assert [one["id"] for one in site.get("/transfers", **MAY)["items"]] == ["t"]


def test_a_batch_keeps_good_tickets_and_names_the_others(site):
    rows = [
        TICKET | {"id": "a"},
        TICKET,
        TICKET | {"id": "b", "to": "tk-9"},
        TICKET | {"id": "c", "started_at": "2026-05-30T01:00:00"},
        TICKET | {"id": "d", "mass_kg": "heavy"},
        TICKET | {"id": "e"},
        TICKET | {"id": "a"},
        TICKET | {"id": "E"},
    ]
    answer = site.post("/transfers", {"transfers": rows})
    assert [answer[name] for name in ("stored", "revised", "unchanged", "rejected")] == [2, 0, 1, 5]
    assert [(one["index"], one["field"], one["code"]) for one in answer["errors"]] == [
        (1, "id", "missing"), (2, "to", "unknown_vessel"), (3, "started_at", "no_offset"), (4, "mass_kg", "wrong_type"),
        (7, "id", "wrong_form"),
    ]  # fmt: skip
    assert "tk-9" not in str(answer) and "heavy" not in str(answer)
    assert [one["id"] for one in site.get("/transfers", **MAY)["items"]] == ["a", "e"]


def test_of_many_bad_tickets_the_first_thousand_are_listed_and_all_are_counted(site):
    answer = site.post("/transfers", {"transfers": [TICKET | {"id": "A"}, *[{"id": "t"}] * 1_500]})
    assert answer["rejected"] == 1_501 and len(answer["errors"]) == 1_000
    assert answer["errors"][0]["index"] == 0


@pytest.mark.parametrize(
    ("body", "expected"),
    [
        (without("mass_kg"), ("", "missing")),
        (without(standard_volume_m3=1.0), ("/standard_volume_m3", "one_of")),
        (without(unmetered=True), ("/unmetered", "one_of")),
        (without("mass_uncertainty_kg"), ("/mass_uncertainty_kg", "missing")),
        (without(by="meter"), ("/meter", "missing")),
        (without(meter="m"), ("/meter", "conflicting")),
        (without(by="meter", meter="none"), ("/meter", "unknown_meter")),
        (without(to="tk-9"), ("/to", "unknown_vessel")),
        (without(to="boundary:ship"), ("/to", "impossible")),
        (without(to="TK-1"), ("/to", "wrong_form")),
        (without(**{"from": "tk-1"}), ("/to", "impossible")),
        (without(ended_at="2026-05-30T00:59:59Z"), ("/ended_at", "impossible")),
        (without(ended_at="2026-07-01T00:00:00Z"), ("/ended_at", "out_of_range")),
        (without(started_at="2026-05-30 01:00:00Z"), ("/started_at", "not_an_instant")),
        (without(mass_kg=-1.0), ("/mass_kg", "out_of_range")),
        (without("mass_kg", observed_volume_m3=20.0), ("/temperature_c", "missing")),
        (without("mass_kg", standard_volume_m3=20.0, density_kg_m3=1.0), ("/density_temperature_c", "missing")),
        (without(progress=[{"at": "2026-05-30T01:30:00Z", "mass_kg": 2e5}]), ("/progress/0/mass_kg", "impossible")),
        (without(progress=[{"at": "2026-05-30T03:00:00Z", "mass_kg": 2.0}]), ("/progress/0/at", "impossible")),
        (without(tonnes=20), ("/tonnes", "unknown_field")),
    ],
)
def test_what_cannot_be_is_named_with_its_place(site, body, expected):
    assert refused(site, body) == [expected]
    assert site.get("/transfers", **MAY)["items"] == []


def test_what_is_not_there_is_404_and_says_which(site, place):
    assert site.get("/transfers/none", status=404)["code"] == "unknown_transfer"
    answer = site.client.put("/v1/sites/no-such-site/transfers/t", json=TICKET)
    assert (answer.status_code, answer.json()["code"]) == (404, "unknown_site")


def test_tickets_are_listed_by_their_end_and_pages_agree_while_writes_go_on(site):
    for number in range(7):
        site.put(f"/transfers/t-{number}", TICKET | {"ended_at": f"2026-05-30T0{9 - number}:00:00Z"})
    found, cursor, known = [], None, set()
    for turn in range(9):
        page = site.get("/transfers", **MAY, limit=3, cursor=cursor)
        found += [(one["id"], one["revision"]) for one in page["items"]]
        known.add(page["known_at"])
        cursor = page["next"]
        if cursor is None:
            break
        site.put("/transfers/t-0", TICKET | {"ended_at": "2026-05-30T09:00:00Z", "mass_kg": 1.0 + turn})
        site.put(f"/transfers/u-{turn}", TICKET | {"ended_at": "2026-05-30T08:30:00Z"})
    assert found == [(f"t-{number}", 1) for number in reversed(range(7))]
    assert len(known) == 1


# --- what a night takes of a ticket --------------------------------------------------------------


def test_a_ticket_in_standard_volume_brings_its_own_density(site):
    """20 m³ at 1 010 kg/m³ are 20 200 kg; β is 0, so the density's own temperature changes nothing."""
    site.put("/transfers/t", without("mass_kg", standard_volume_m3=20.0, density_kg_m3=1010.0,
                                     density_temperature_c=30.0))  # fmt: skip
    (books,) = night(site)["vessels"]
    assert (books["received_kg"], books["book_mass_kg"]) == (pytest.approx(20_200.0), pytest.approx(120_200.0))
    assert books["imbalance_kg"] == pytest.approx(-200.0)


def test_a_ticket_in_standard_volume_without_a_density_takes_the_vessels(site):
    """20 m³ of 1 000 kg/m³; the density's error is one for the vessel and the ticket, and cancels out."""
    site.put("/transfers/t", without("mass_kg", standard_volume_m3=20.0))
    (books,) = night(site)["vessels"]
    assert books["received_kg"] == pytest.approx(20_000.0)
    assert books["imbalance_uncertainty_kg"] == pytest.approx((2 * 150.0**2 + 10.0**2) ** 0.5)


def test_sediment_and_water_are_taken_off(site):
    site.put("/transfers/t", TICKET | {"sediment_water_pct": 0.5})
    assert received(night(site))["tk-1"] == pytest.approx(19_900.0)


def test_water_is_no_part_of_the_balance(site):
    site.put("/transfers/t", TICKET)
    site.put("/transfers/w", without(**{"from": "tk-1", "to": "boundary:drain", "of": "water"}))
    (books,) = night(site)["vessels"]
    assert (books["received_kg"], books["delivered_kg"]) == (20_000.0, 0.0)


def test_a_ticket_over_a_close_is_split_by_its_progress_and_the_parts_add_up(site):
    site.put("/transfers/t", TICKET | {
        "started_at": "2026-05-29T20:00:00Z", "ended_at": "2026-05-30T04:00:00Z",
        "progress": [{"at": "2026-05-29T22:00:00Z", "mass_kg": 3_000.0},
                     {"at": "2026-05-30T00:00:00Z", "mass_kg": 7_000.0}],
    })  # fmt: skip
    first, second = night(site, closing=2.14, day="2026-05-29"), night(site, opening=2.14, closing=2.4)
    assert (received(first)["tk-1"], received(second)["tk-1"]) == (7_000.0, 13_000.0)
    assert first["transfers"][0]["measured_mass_kg"] + second["transfers"][0]["measured_mass_kg"] == 20_000.0
    assert [one["vessels"][0]["imbalance_kg"] for one in (first, second)] == [pytest.approx(0.0, abs=1e-6)] * 2


def test_without_progress_a_ticket_is_split_by_time_with_an_uncertainty_of_five_percent(site):
    """A quarter of its time before the close: 5 000 kg; 5 % of 20 000 kg is 1 000 kg, less than half of it."""
    site.put("/transfers/t", TICKET | {"started_at": "2026-05-29T22:00:00Z", "ended_at": "2026-05-30T06:00:00Z"})
    first, second = night(site, closing=2.1, day="2026-05-29"), night(site, opening=2.1, closing=2.4)
    (one,), (other,) = first["vessels"], second["vessels"]
    assert (one["received_kg"], other["received_kg"]) == (5_000.0, 15_000.0)
    level, split = 2 * 150.0**2, 1_000.0**2
    for books, moved, share in ((one, 5.0, 0.25), (other, 15.0, 0.75)):
        expected = level + split + moved**2 + (10.0 * share) ** 2
        assert books["imbalance_uncertainty_kg"] == pytest.approx(expected**0.5, rel=1e-6)


def test_a_ticket_that_ends_at_a_close_belongs_to_the_day_that_it_ends(site):
    site.put("/transfers/t", TICKET | {"started_at": "2026-05-29T22:00:00Z", "ended_at": "2026-05-30T00:00:00Z"})
    first, second = night(site, day="2026-05-29"), night(site, opening=2.4)
    assert (received(first)["tk-1"], received(second)["tk-1"]) == (20_000.0, 0.0)
    assert second["transfers"] == []


def test_between_two_vessels_what_one_lost_the_other_gained(site):
    site.vessel("tk-2")
    site.read("2026-05-30T00:00:00Z", 2.0, vessel="tk-2")
    site.read("2026-05-31T00:00:00Z", 1.6, vessel="tk-2")
    site.move("t", "tk-2", "tk-1", mass_kg=20_000.0, started_at=TICKET["started_at"], ended_at=TICKET["ended_at"])
    books = night(site)
    assert {one["vessel"]: (one["received_kg"], one["delivered_kg"]) for one in books["vessels"]} == {
        "tk-1": (20_000.0, 0.0), "tk-2": (0.0, 20_000.0),
    }  # fmt: skip
    (total,) = books["totals"]
    assert (total["received_kg"], total["delivered_kg"]) == (0.0, 0.0)
    assert total["imbalance_kg"] == pytest.approx(0.0, abs=1e-6)


@pytest.mark.parametrize("how", [{"by": "statement", "unmetered": True}, {"by": "gauging", "mass_kg": 20_000.0}])
def test_vessels_joined_by_an_unmetered_transfer_are_judged_together(site, how):
    """200 kg are missing of both together: 100 + 100 000 kg before, 99 800 kg after; neither is told apart."""
    site.vessel("tk-2")
    site.read("2026-05-30T00:00:00Z", 2.0, vessel="tk-2")
    site.read("2026-05-31T00:00:00Z", 1.596, vessel="tk-2")
    site.move("t", "tk-2", "tk-1", started_at=TICKET["started_at"], ended_at=TICKET["ended_at"], **how)
    books = night(site)
    for one, other in zip(books["vessels"], ("tk-2", "tk-1"), strict=True):
        assert one["judged_with"] == [other]
        assert one["imbalance_kg"] == pytest.approx(-200.0)
        assert one["book_mass_kg"] == pytest.approx(200_000.0)
    assert books["transfers"][0]["measured_mass_kg"] is None
