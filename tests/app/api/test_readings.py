"""Readings come in by batches: good rows are kept, bad ones named, and nothing that was said is lost."""

from __future__ import annotations

import gzip
import itertools
import json

import pytest

AT = "2026-05-01T06:00:00Z"
MAY = {"from": "2026-05-01T00:00:00Z", "to": "2026-06-01T00:00:00Z"}


def row(level_m=2.0, **more):
    return {"vessel": "tk-1", "taken_at": AT, "level_m": level_m} | more


def post(site, *rows):
    return site.post("/readings", {"readings": list(rows)})


def counts(answer):
    return [answer[name] for name in ("stored", "revised", "unchanged", "rejected")]


def stored(site, **query):
    return site.get("/vessels/tk-1/readings", **MAY, **query)["items"]


def levels(site, **query):
    return [(one["value"], one["quality"], one["revision"]) for one in stored(site, **query)]


# --- what is stored ------------------------------------------------------------------------------


def test_a_reading_is_kept_as_one_value_for_each_quantity(site):
    answer = post(site, row(liquid_temperature_c=15.5, source="radar", quality={"level_m": "uncertain"}))
    assert counts(answer) == [1, 0, 0, 0]
    assert answer["errors"] == []
    assert stored(site) == [
        {
            "vessel": "tk-1", "quantity": quantity, "source": "radar", "taken_at": AT, "value": value,
            "quality": quality, "recorded_at": answer["known_at"], "revision": 1,
        }
        for quantity, value, quality in (("level_m", 2.0, "uncertain"), ("liquid_temperature_c", 15.5, "good"))
    ]  # fmt: skip


def test_quantities_of_one_instant_may_come_in_many_posts(site):
    assert counts(post(site, row())) == [1, 0, 0, 0]
    assert counts(post(site, {"vessel": "tk-1", "taken_at": AT, "pressure_kpa": 3.0, "level_m": None})) == [1, 0, 0, 0]
    assert {one["quantity"]: one["value"] for one in stored(site)} == {"level_m": 2.0, "pressure_kpa": 3.0}


def test_instants_are_kept_in_utc_to_the_microsecond(site):
    post(site, row(taken_at="2026-05-01T08:00:00.1234567+02:00"))
    assert [one["taken_at"] for one in stored(site)] == ["2026-05-01T06:00:00.123456Z"]


def test_a_sample_is_read_back_with_what_was_said_of_it(site):
    post(
        site,
        row(
            None, source="lab", observed_density_kg_m3=998.0, observed_density_temperature_c=20.0,
            observed_density_by="hydrometer", sediment_water_pct=0.1, density_basis="wet", sample="s-1",
            sample_holds_from="2026-05-01T05:00:00Z", liquid_temperature_c=15.0,
        ),
    )  # fmt: skip
    found = {one["quantity"]: one for one in stored(site)}
    assert sorted(found) == [
        "liquid_temperature_c", "observed_density_kg_m3", "observed_density_temperature_c", "sediment_water_pct",
    ]  # fmt: skip
    density = found["observed_density_kg_m3"]
    assert (density["value"], density["sample"], density["sample_holds_from"]) == (998.0, "s-1", "2026-05-01T05:00:00Z")
    assert (density["observed_density_by"], density["density_basis"]) == ("hydrometer", "wet")
    assert "sample" not in found["liquid_temperature_c"]
    assert "observed_density_by" not in found["sediment_water_pct"]


def test_a_composition_is_read_back_as_one(site):
    post(site, row(None, vapour_composition={"propane": 0.75, "methane": 0.25}))
    (one,) = stored(site)
    assert one["composition"] == {"methane": 0.25, "propane": 0.75}
    assert one["value"] is None


def test_the_sites_own_readings_name_no_vessel(site):
    assert counts(post(site, {"taken_at": AT, "barometric_pressure_kpa_abs": 100.9})) == [1, 0, 0, 0]
    refused = post(site, {"taken_at": AT, "level_m": 2.0}, row(barometric_pressure_kpa_abs=100.9))
    assert [(one["index"], one["field"]) for one in refused["errors"]] == [
        (0, "vessel"), (1, "barometric_pressure_kpa_abs"),
    ]  # fmt: skip


def test_a_body_may_come_as_gzip(site):
    body = gzip.compress(json.dumps({"readings": [row()]}).encode())
    headers = {"Content-Type": "application/json", "Content-Encoding": "gzip"}
    answer = site.ask("POST", "/readings", content=body, headers=headers, status=200)
    assert counts(answer.json()) == [1, 0, 0, 0]


# --- repeats, corrections, withdrawals -----------------------------------------------------------


def test_the_same_again_changes_nothing(site):
    post(site, row())
    before = stored(site)
    assert counts(post(site, row())) == [0, 0, 1, 0]
    assert stored(site) == before


def test_another_value_is_a_revision_and_a_late_retry_does_not_undo_it(site):
    post(site, row(2.0))
    assert counts(post(site, row(2.5))) == [0, 1, 0, 0]
    assert counts(post(site, row(2.0))) == [0, 0, 1, 0]
    assert levels(site) == [(2.5, "good", 2)]


def test_a_reading_is_revised_if_any_value_was_else_stored_if_any_was(site):
    post(site, row(2.0))
    assert counts(post(site, row(2.0, pressure_kpa=1.0))) == [1, 0, 0, 0]
    assert counts(post(site, row(2.1, liquid_temperature_c=15.0))) == [0, 1, 0, 0]


def test_bad_withdraws_a_value_and_the_mass_with_it(site):
    site.read(AT, 2.0)
    assert site.get("/inventory", at=AT)["vessels"][0]["mass_kg"] == 100_000.0
    assert counts(post(site, row(2.0, quality="bad"))) == [0, 1, 0, 0]
    assert levels(site)[0] == (2.0, "bad", 2)
    gone = site.get("/inventory", at=AT)["vessels"][0]
    assert (gone["status"], gone["mass_kg"]) == ("unmeasured", None)


def test_an_earlier_value_is_restored_by_saying_what_it_corrects(site):
    post(site, row(2.0))
    wrong = post(site, row(2.5))["known_at"]
    assert counts(post(site, row(2.0, corrects=wrong))) == [0, 1, 0, 0]
    assert levels(site) == [(2.0, "good", 3)]
    late = post(site, row(2.5, corrects=wrong))
    assert counts(late) == [0, 0, 0, 1]
    assert [(one["index"], one["field"], one["code"]) for one in late["errors"]] == [
        (0, "corrects", "stale_correction")
    ]
    assert levels(site) == [(2.0, "good", 3)]


def test_the_same_key_twice_in_one_batch_is_taken_in_order(site):
    assert counts(post(site, row(2.0), row(2.5), row(2.5))) == [1, 1, 1, 0]
    assert levels(site) == [(2.5, "good", 2)]


def test_parts_of_a_batch_may_be_replayed_in_any_order(place, client, clock):
    """Six posts of three hours, each sent twice, in three orders: what stands is the same."""
    posts = [[row(1.0 + hour, taken_at=f"2026-05-01T0{hour}:00:00Z"), row(2.0, taken_at="2026-05-01T09:00:00Z")]
             for hour in range(3)]  # fmt: skip
    seen = []
    for number, order in enumerate(itertools.permutations(range(3))):
        site = type(place)(client, clock, f"{place.name}-{number}")
        site.define()
        site.substance()
        site.vessel()
        for which in (*order, *reversed(order)):
            post(site, *posts[which])
        seen.append(levels(site))
    assert seen == [[(1.0, "good", 1), (2.0, "good", 1), (3.0, "good", 1), (2.0, "good", 1)]] * 6


# --- bad rows ------------------------------------------------------------------------------------

BAD = [
    ({"liquid_temperature_c": 1e6}, "liquid_temperature_c", "out_of_range"),
    ({"liquid_temperature_c": -274}, "liquid_temperature_c", "out_of_range"),
    ({"level_m": 1e6}, "level_m", "out_of_range"),
    ({"level_m": "2.0"}, "level_m", "wrong_type"),
    ({"level_m": True}, "level_m", "wrong_type"),
    ({"vessel": "no-such-vessel"}, "vessel", "unknown_vessel"),
    ({"vessel": "TK-1"}, "vessel", "wrong_form"),
    ({"taken_at": "2026-05-01T06:00:00"}, "taken_at", "no_offset"),
    ({"taken_at": 1777615200}, "taken_at", "not_an_instant"),
    ({"taken_at": "2026-06-01T12:05:01Z"}, "taken_at", "future"),
    ({"taken_at": "1999-12-31T23:59:59Z"}, "taken_at", "too_old"),
    ({"level": 2.0}, "level", "unknown_field"),
    ({"ullage_m": 3.0}, "ullage_m", "one_of"),
    ({"quality": "fine"}, "quality", "not_one_of"),
    ({"vapour_composition": {"propane": 0.5, "methane": 0.3}}, "vapour_composition", "fractions_sum"),
    ({"corrects": "yesterday"}, "corrects", "not_an_instant"),
    ({"observed_density_kg_m3": 0.0}, "observed_density_kg_m3", "out_of_range"),
]


def test_seventeen_bad_rows_of_ten_thousand_are_named_and_the_others_kept(site):
    rows = [
        row(1.0 + index / 10_000, taken_at=f"2026-05-{1 + index // 1440:02}T{index // 60 % 24:02}:{index % 60:02}:00Z")
        for index in range(10_000)
    ]
    expected = []
    for number, (change, field, code) in enumerate(BAD):
        index = 587 * number + 3
        rows[index] = rows[index] | change
        expected.append((index, field, code))
    answer = post(site, *rows)
    assert [(one["index"], one["field"], one["code"]) for one in answer["errors"]] == expected
    assert counts(answer) == [10_000 - len(BAD), 0, 0, len(BAD)]
    assert all(one["detail"].endswith((".", "id", "clock", "2000")) for one in answer["errors"])
    again = post(site, *rows)
    assert counts(again) == [0, 0, 10_000 - len(BAD), len(BAD)]


def test_every_bad_row_has_a_sentence_with_the_limit_and_its_unit(site):
    answer = post(site, *(row() | change for change, _, _ in BAD))
    said = {one["index"]: one["detail"] for one in answer["errors"]}
    assert said[0] == "liquid_temperature_c is at most 1000 °C."
    assert said[2] == "level_m is at most 150 m."
    assert "number, in m" in said[3]
    assert "300 s" in said[9]
    assert "1e6" not in json.dumps(answer) and "no-such-vessel" not in json.dumps(answer)


def test_of_many_bad_rows_the_first_thousand_are_listed_and_all_are_counted(site):
    answer = post(site, *[row(taken_at="now")] * 1_500, row(vessel="none"), row())
    assert counts(answer) == [1, 0, 0, 1_501]
    assert [one["index"] for one in answer["errors"]] == list(range(1_000))


@pytest.mark.parametrize("text", ["NaN", "Infinity", "-Infinity", "1e999"])
def test_what_is_no_number_is_no_value(site, text):
    body = f'{{"readings": [{{"vessel": "tk-1", "taken_at": "{AT}", "level_m": {text}}}, {json.dumps(row())}]}}'
    answer = site.ask("POST", "/readings", content=body, headers={"Content-Type": "application/json"}, status=200)
    (error,) = answer.json()["errors"]
    assert (error["index"], error["field"], error["code"]) == (0, "level_m", "not_finite")
    assert counts(answer.json()) == [1, 0, 0, 1]
    assert text not in answer.text


def test_a_reading_up_to_300_s_ahead_of_the_servers_clock_is_kept(site):
    ahead = post(site, row(taken_at="2026-06-01T12:05:00Z"), row(taken_at="2026-06-01T12:05:00.000001Z"))
    assert counts(ahead) == [1, 0, 0, 1]
    site.clock.set("2026-06-01T12:00:01Z")
    assert counts(post(site, row(taken_at="2026-06-01T12:05:00.000001Z"))) == [1, 0, 0, 0]


def test_a_level_above_the_vessel_is_stored_and_answered_as_unmeasured(site):
    assert counts(post(site, row(4.2, liquid_temperature_c=15.0))) == [1, 0, 0, 0]
    assert levels(site)[0] == (4.2, "good", 1)
    found = site.get("/inventory", at=AT)
    (vessel,) = found["vessels"]
    assert (vessel["status"], vessel["mass_kg"], vessel["reason"]["code"]) == ("unmeasured", None, "outside_vessel")
    assert "4.2" in vessel["reason"]["detail"] and "4.0" in vessel["reason"]["detail"].replace("4 m", "4.0 m")
    assert found["totals"][0]["missing"] == ["tk-1"] and not found["totals"][0]["complete"]


def test_an_analysis_names_components_that_are_known(site):
    """One that no calculation could use would otherwise leave the whole site without an inventory."""
    good, bad = {"propane": 0.5, "n-butane": 0.5}, {"propane": 0.5, "unobtainium": 0.5}
    answer = post(site, row(vapour_composition=good), row(source="lab", liquid_composition=bad))
    assert counts(answer) == [1, 0, 0, 1]
    (error,) = answer["errors"]
    assert (error["index"], error["field"], error["code"]) == (1, "liquid_composition", "unknown_component")
    assert "unobtainium" not in str(answer)
    assert site.get("/inventory", at=AT)["vessels"]


def test_a_batch_is_one_object_with_one_list(site):
    for body in ([], {"readings": {}}, {"rows": []}, {"readings": [], "more": 1}, 3, "x"):
        answer = site.post("/readings", body, status=422)
        assert answer["errors"], body
    assert counts(post(site)) == [0, 0, 0, 0]
    assert counts(post(site, 1, None, "x", [])) == [0, 0, 0, 4]


def test_a_batch_for_a_site_that_is_not_there_is_404(place):
    answer = place.post("/readings", {"readings": [row()]}, status=404)
    assert (answer["code"], "site" in answer["detail"]) == ("unknown_site", True)


def test_bodies_of_another_type_and_from_elsewhere_are_turned_away(site):
    text = json.dumps({"readings": [row()]})
    for kind in ("text/plain", "application/x-www-form-urlencoded", "application/xml", "multipart/form-data"):
        answer = site.ask("POST", "/readings", content=text, headers={"Content-Type": kind}, status=415)
        assert answer.headers["content-type"] == "application/problem+json"
    foreign = {"Content-Type": "application/json", "Origin": "https://elsewhere.example"}
    assert site.ask("POST", "/readings", content=text, headers=foreign).status_code == 403
    host = {"Content-Type": "application/json", "Host": "elsewhere.example"}
    assert site.ask("POST", "/readings", content=text, headers=host).status_code == 421
    assert stored(site) == []


# --- reading back --------------------------------------------------------------------------------


def test_as_of_gives_what_was_known_then(site):
    first = post(site, row(2.0))["known_at"]
    second = post(site, row(2.5))["known_at"]
    post(site, row(2.5, quality="bad"))
    assert levels(site, as_of=first) == [(2.0, "good", 1)]
    assert levels(site, as_of=second) == [(2.5, "good", 2)]
    assert levels(site) == [(2.5, "bad", 3)]


def test_pages_agree_while_writes_go_on(site):
    post(site, *(row(hour / 10, taken_at=f"2026-05-01T{hour:02}:00:00Z", source=s) for hour in range(9) for s in "ab~"))
    whole = stored(site)
    pages, cursor, known = [], None, set()
    for turn in range(100):
        page = site.get("/vessels/tk-1/readings", **MAY, limit=4, cursor=cursor)
        pages += page["items"]
        known.add(page["known_at"])
        cursor = page["next"]
        if cursor is None:
            break
        post(
            site,
            row(3.0 + turn / 100, taken_at="2026-05-01T08:00:00Z", source="b"),
            row(taken_at="2026-05-01T08:30:00Z"),
        )
    assert pages == whole
    assert len(known) == 1 and turn > 4


def test_only_one_source_and_only_the_period(site):
    post(site, row(1.0, source="a"), row(2.0, source="b"), row(3.0, taken_at="2026-06-01T00:00:00Z"),
         row(4.0, taken_at="2026-05-01T00:00:00Z"))  # fmt: skip
    assert [one["value"] for one in stored(site)] == [4.0, 1.0, 2.0]
    assert [one["value"] for one in stored(site, source="b")] == [2.0]


def test_readings_of_a_vessel_that_is_not_there_are_404(site):
    assert site.get("/vessels/tk-9/readings", **MAY, status=404)["code"] == "unknown_vessel"
