"""Inventories over HTTP: the mass by hand arithmetic, which value counts, and the same answer for ever.

A box of 10 m by 5 m holds 50 m³ for every metre of level; its liquid weighs 1 000 kg/m³ and neither it
nor the wall expands, so a level of 2 m is 100 000 kg.
"""

from __future__ import annotations

import pytest

AT = "2026-05-01T06:00:00Z"
HOUR = "2026-05-01T{:02}:{:02}:00Z"


def stock(site, at=AT, vessel="tk-1", **query):
    return {one["vessel"]: one for one in site.get("/inventory", at=at, **query)["vessels"]}[vessel]


def used(answer, quantity):
    return next(one for one in answer["inputs"] if one["quantity"] == quantity)


def codes(answer):
    return [one["code"] for one in answer["warnings"]]


# --- the mass ------------------------------------------------------------------------------------


def test_a_level_becomes_a_mass_with_its_uncertainty(site):
    """u² = (3 mm, 4 mm of level by 50 000 kg/m)² + (1 kg/m³ of density by 100 m³)²; buoyancy by OIML D 28."""
    site.read(AT, 2.0)
    found = stock(site)
    assert found["status"] == "measured"
    assert found["mass_kg"] == found["liquid_mass_kg"] == pytest.approx(100_000.0, rel=1e-12)
    assert found["gross_observed_volume_m3"] == found["net_standard_volume_m3"] == pytest.approx(100.0, rel=1e-12)
    assert found["fill_pct"] == pytest.approx(50.0)
    assert found["mass_uncertainty_kg"] == pytest.approx((150.0**2 + 200.0**2 + 100.0**2) ** 0.5, rel=1e-9)
    assert found["weight_in_air_kg"] == pytest.approx(100_000.0 * (1 - 1.2 / 1000.0) / (1 - 1.2 / 8000.0), rel=1e-9)
    assert [one["kind"] for one in found["definitions"]] == ["site", "vessel", "substance"]


def test_free_water_sediment_and_a_sample_are_counted(site):
    """(2.0 − 0.1) m of 50 m²; a dry sample of 990 kg/m³; 2 % of sediment and water: 95 m³ · 0.98 · 990 kg/m³."""
    site.read(AT, 2.0, free_water_level_m=0.1, observed_density_kg_m3=990.0, sediment_water_pct=2.0,
              density_basis="dry")  # fmt: skip
    found = stock(site)
    assert found["free_water_volume_m3"] == pytest.approx(5.0)
    assert found["gross_observed_volume_m3"] == pytest.approx(95.0)
    assert found["mass_kg"] == pytest.approx(95.0 * 0.98 * 990.0, rel=1e-9)


def test_the_budget_adds_up_to_the_uncertainty_and_the_working_to_the_mass(site):
    site.read(AT, 2.0)
    found = site.get("/vessels/tk-1/working", at=AT)
    lines = {(one["input"], one["kind"]): one for one in found["budget"]}
    assert sorted(lines) == [("density_kg_m3", "systematic"), ("level_m", "random"), ("level_m", "systematic")]
    assert lines["level_m", "random"]["contribution_kg"] == pytest.approx(150.0)
    assert lines["level_m", "systematic"]["contribution_kg"] == pytest.approx(200.0)
    assert lines["level_m", "systematic"]["sensitivity"] == pytest.approx(50_000.0)
    assert lines["density_kg_m3", "systematic"]["contribution_kg"] == pytest.approx(100.0)
    squares = sum(one["contribution_kg"] ** 2 for one in found["budget"])
    assert found["mass_uncertainty_kg"] == pytest.approx(squares**0.5, rel=1e-12)
    steps = {one["symbol"]: one["value"] for one in found["working"]}
    assert (steps["V(h)"], steps["K"], steps["M_liquid"]) == (pytest.approx(100.0), 1.0, pytest.approx(100_000.0))
    assert all(one["method"] and one["reference"] and one["unit"] for one in found["working"])


def test_working_budget_and_statement_come_only_where_they_are_asked_for(site):
    site.read(AT, 2.0)
    assert not {"working", "budget", "statement"} & set(stock(site))
    plain = site.get("/vessels/tk-1/working", at=AT, working="false", budget="false", statement="false")
    assert not {"working", "budget", "statement"} & set(plain)
    assert plain == stock(site)
    assert {"working", "budget", "statement"} <= set(site.get("/vessels/tk-1/working", at=AT))


def test_a_statement_is_of_the_reading_and_not_of_what_moved_since(site):
    """2 m of 50 000 kg/m at six; by half past six 19 t have left by a ticket."""
    site.read(AT, 2.0)
    times = {"started_at": HOUR.format(6, 5), "ended_at": HOUR.format(6, 20)}
    site.move("t-1", "tk-1", "boundary:out", mass_kg=19_000.0, **times)
    found = site.get("/vessels/tk-1/working", at=HOUR.format(6, 30))
    assert (found["mass_kg"], found["moved_kg"]) == (pytest.approx(81_000.0), pytest.approx(-19_000.0))
    statement = found["statement"]
    assert (statement["at"], statement["level_m"]) == (AT, 2.0)
    assert statement["mass_kg"] == pytest.approx(100_000.0)
    assert statement["at_15_c"]["net_standard_volume_m3"] == pytest.approx(100.0)
    assert statement["at_60_f"]["net_standard_volume_bbl"] == pytest.approx(628.9811, abs=5e-5)


def test_a_vessel_found_empty_has_no_statement(site):
    site.post("/readings", {"readings": [{"vessel": "tk-1", "taken_at": AT, "empty": True}]})
    found = site.get("/vessels/tk-1/working", at=AT)
    assert (found["mass_kg"], "statement" in found) == (0.0, False)


def test_a_default_uncertainty_is_marked_as_not_declared(site):
    site.vessel("tk-2", instruments={})
    site.read(AT, 2.0, vessel="tk-2")
    found = site.get("/vessels/tk-2/working", at=AT)["budget"]
    assert not any(one["declared"] for one in found if one["input"] == "level_m")


def test_totals_by_substance_add_shared_errors_as_shared(site):
    """The density's error is one and the same in both vessels: 100 kg + 50 kg of it, the rest in squares."""
    site.vessel("tk-2")
    site.read(AT, 2.0)
    site.read(AT, 1.0, vessel="tk-2")
    (total,) = site.get("/inventory", at=AT)["totals"]
    assert total["mass_kg"] == pytest.approx(150_000.0)
    own = 2 * (150.0**2 + 200.0**2)
    assert total["mass_uncertainty_kg"] == pytest.approx((own + 150.0**2) ** 0.5, rel=1e-9)
    assert (total["vessels"], total["missing"], total["complete"]) == (["tk-1", "tk-2"], [], True)


# --- which value counts --------------------------------------------------------------------------


def test_the_first_source_that_has_a_usable_value_wins(site):
    site.vessel("tk-2", sources=[{"source": "radar"}, {"source": "hand"}])
    site.read(HOUR.format(6, 0), 1.0, vessel="tk-2", source="radar")
    site.read(HOUR.format(6, 30), 2.0, vessel="tk-2", source="hand")
    assert used(stock(site, HOUR.format(6, 45), "tk-2"), "level_m")["source"] == "radar"
    late = stock(site, HOUR.format(7, 15), "tk-2")
    assert (used(late, "level_m")["source"], used(late, "level_m")["age_s"]) == ("hand", 2700.0)
    assert late["mass_kg"] == pytest.approx(100_000.0)
    assert "two_sources" not in codes(late)


def test_without_an_order_the_newest_wins_and_two_sources_are_said(site):
    site.read(HOUR.format(6, 0), 1.0, source="radar")
    site.read(HOUR.format(6, 30), 2.0, source="hand")
    found = stock(site, HOUR.format(6, 45))
    assert (used(found, "level_m")["source"], found["mass_kg"]) == ("hand", pytest.approx(100_000.0))
    assert "two_sources" in codes(found)


def test_a_value_counts_for_as_long_as_it_may(site):
    site.vessel("tk-2", max_age_s={"level_m": 900, "liquid_temperature_c": 86400})
    site.read(AT, 2.0, vessel="tk-2")
    found = stock(site, "2026-05-01T06:15:00Z", "tk-2")
    assert (found["status"], used(found, "level_m")["age_s"]) == ("measured", 900.0)
    old = stock(site, "2026-05-01T06:15:00.000001Z", "tk-2")
    assert (old["status"], old["mass_kg"]) == ("unmeasured", None)
    assert "level" in old["reason"]["detail"]


def test_between_two_values_the_level_is_interpolated(site):
    """2.0 m at six and 2.4 m at seven: 2.1 m at a quarter past; a gap of more than the age is not bridged."""
    site.read(HOUR.format(6, 0), 2.0)
    site.read(HOUR.format(7, 0), 2.4)
    site.read(HOUR.format(8, 1), 3.0)
    assert stock(site, HOUR.format(6, 15))["mass_kg"] == pytest.approx(105_000.0)
    assert stock(site, HOUR.format(7, 30))["mass_kg"] == pytest.approx(120_000.0)


def test_what_is_assumed_stands_in_the_inputs_as_assumed(site):
    site.vessel("tk-2", assumed={"liquid_temperature_c": {"value": 15.0, "standard_uncertainty": 0.5}})
    site.post("/readings", {"readings": [{"vessel": "tk-2", "taken_at": AT, "level_m": 2.0}]})
    found = stock(site, AT, "tk-2")
    assert used(found, "liquid_temperature_c") == {
        "quantity": "liquid_temperature_c", "value": 15.0, "age_s": None, "source": None, "quality": "assumed",
    }  # fmt: skip
    assert used(found, "free_water_level_m")["quality"] == "assumed"
    assert "input_assumed" in codes(found)


def test_an_uncertain_value_makes_an_uncertain_mass(site):
    site.read(AT, 2.0, quality={"level_m": "uncertain"})
    found = stock(site)
    assert (found["status"], found["mass_kg"]) == ("uncertain", pytest.approx(100_000.0))
    assert "input_uncertain" in codes(found)


def test_a_vessel_without_a_reading_is_unmeasured_and_never_zero(site):
    found = stock(site)
    assert (found["status"], found["mass_kg"], found["mass_uncertainty_kg"]) == ("unmeasured", None, None)
    assert found["reason"]["code"] and found["reason"]["detail"]


def test_an_ullage_is_taken_from_the_reference_height(site):
    site.vessel("tk-2", gauging={"reference_height_m": 4.5})
    row = {"vessel": "tk-2", "taken_at": AT, "ullage_m": 2.5, "liquid_temperature_c": 15.0}
    site.post("/readings", {"readings": [row]})
    assert stock(site, AT, "tk-2")["mass_kg"] == pytest.approx(100_000.0)


def test_a_level_is_corrected_by_the_instruments_known_offset(site):
    site.vessel("tk-2", instruments={"level_m": {"random": 0.0, "systematic": 0.0, "offset": -0.1}})
    site.read(AT, 2.1, vessel="tk-2")
    assert stock(site, AT, "tk-2")["mass_kg"] == pytest.approx(100_000.0)


def test_out_of_service_is_nothing_with_certainty(site):
    box = {"kind": "box", "length_m": 10.0, "width_m": 5.0, "height_m": 4.0}
    site.put("/vessels/tk-1", {"name": "a box", "substance": "liquid", "shape": box, "service": "out",
                               "effective_from": "2026-05-01T06:00:00Z"})  # fmt: skip
    site.read("2026-05-01T05:30:00Z", 2.0)
    assert stock(site, "2026-05-01T05:59:59Z")["status"] == "measured"
    found = stock(site, AT)
    assert (found["status"], found["mass_kg"], found["mass_uncertainty_kg"]) == ("out_of_service", 0.0, 0.0)
    assert site.get("/inventory", at=AT)["totals"] == []


# --- as known then -------------------------------------------------------------------------------


def test_asking_again_with_known_at_gives_the_same_answer_after_later_posts(site):
    site.read(AT, 2.0)
    course = {"from": HOUR.format(5, 0), "to": HOUR.format(8, 0), "every": 1800}
    before = site.get("/inventory", at=AT)
    working, path = site.get("/vessels/tk-1/working", at=AT), site.get("/vessels/tk-1/inventory", **course)
    known = before["known_at"]
    site.read(AT, 2.2)
    site.read(HOUR.format(5, 30), 1.0)
    site.vessel("tk-1", name="renamed", effective_from="2026-04-01T00:00:00Z")
    site.vessel("tk-2")
    assert stock(site)["mass_kg"] == pytest.approx(110_000.0)
    assert site.get("/inventory", at=AT, as_of=known) == before
    assert site.get("/vessels/tk-1/working", at=AT, as_of=known) == working
    assert site.get("/vessels/tk-1/inventory", as_of=known, **course) == path


def test_now_is_what_the_clock_says(site):
    site.read("2026-06-01T11:30:00Z", 2.0)
    found = site.get("/inventory")
    assert found["at"] == "2026-06-01T12:00:00Z"
    assert found["vessels"][0]["mass_kg"] == pytest.approx(100_000.0)


# --- the course ----------------------------------------------------------------------------------


def test_a_course_gives_at_each_instant_what_the_inventory_of_that_instant_gives(site):
    site.read(HOUR.format(6, 0), 2.0)
    site.read(HOUR.format(7, 0), 2.4)
    site.vessel("tk-1", name="renamed", effective_from=HOUR.format(6, 30))
    answer = site.get("/vessels/tk-1/inventory", from_=HOUR.format(5, 30), to=HOUR.format(8, 30), every=900)
    assert len(answer["items"]) == 12 and answer["next"] is None
    for one in answer["items"]:
        whole = stock(site, one["at"])
        assert whole.pop("moved_kg", 0.0) == one.pop("moved_kg", 0.0) == 0.0  # no ticket stands in between
        assert whole.pop("reason", {}).get("code") == one.pop("reason", {}).get("code")
        assert one == whole
    masses = [one["mass_kg"] for one in answer["items"]]
    assert masses[:2] == [None, None]
    assert masses[2:7] == [pytest.approx(mass) for mass in (100e3, 105e3, 110e3, 115e3, 120e3)]


def test_a_course_of_too_many_points_is_refused_at_once(site):
    period = {"from": "1970-01-01T00:00:00Z", "to": "2200-01-01T00:00:00Z"}
    answer = site.get("/vessels/tk-1/inventory", **period, every=1, status=422)
    assert (answer["code"], "10,000" in answer["detail"]) == ("too_many_points", True)
    one_too_many = {"from": HOUR.format(0, 0), "to": "2026-05-01T02:46:40.000001Z"}
    assert site.get("/vessels/tk-1/inventory", **one_too_many, every=1, status=422)["code"] == "too_many_points"


@pytest.mark.parametrize("every", ["0", "-1", "nan", "inf", "1e9", "hour"])
def test_a_step_is_a_number_of_seconds(site, every):
    period = {"from": HOUR.format(0, 0), "to": HOUR.format(1, 0)}
    answer = site.get("/vessels/tk-1/inventory", **period, every=every, status=422)
    assert [one["pointer"] for one in answer["errors"]] == ["/query/every"]


# --- why it changed, and what else was measured -------------------------------------------------


def test_a_change_is_told_by_input_and_adds_up(site):
    """0.4 m of 50 000 kg/m, of which a ticket brought 19 000 kg."""
    site.read(HOUR.format(0, 0), 2.0)
    site.read(HOUR.format(6, 0), 2.4)
    site.move("t", "boundary:a", "tk-1", mass_kg=19_000.0, started_at=HOUR.format(1, 0), ended_at=HOUR.format(2, 0))
    found = site.get("/vessels/tk-1/change", from_=HOUR.format(0, 0), to=HOUR.format(6, 0))
    assert (found["mass_before_kg"], found["mass_after_kg"]) == (pytest.approx(100_000.0), pytest.approx(120_000.0))
    assert found["difference_kg"] == pytest.approx(20_000.0)
    assert sum(one["contribution_kg"] for one in found["steps"]) == pytest.approx(found["difference_kg"])
    level = next(one for one in found["steps"] if one["input"] == "level_m")
    assert (level["before"], level["after"], level["unit"]) == (2.0, 2.4, "m")
    assert level["contribution_kg"] == pytest.approx(20_000.0)
    assert found["transfers"] == [{"transfer": "t", "mass_kg": pytest.approx(19_000.0)}]
    assert found["unexplained_kg"] == pytest.approx(1_000.0)


def test_a_mass_is_moved_from_its_reading_to_the_instant_by_the_tickets_in_between(site):
    """Read at six, 100 000 kg; 5 000 kg left by half past; at a quarter to seven 95 000 kg are there."""
    site.read(HOUR.format(6, 0), 2.0)
    site.move("t", "tk-1", "boundary:a", mass_kg=5_000.0, started_at=HOUR.format(6, 10), ended_at=HOUR.format(6, 30))
    found = stock(site, HOUR.format(6, 45))
    assert (found["mass_kg"], found["moved_kg"]) == (pytest.approx(95_000.0), pytest.approx(-5_000.0))
    course = site.get("/vessels/tk-1/inventory", from_=HOUR.format(6, 0), to=HOUR.format(7, 0), every=2700)["items"]
    assert [one["mass_kg"] for one in course] == [pytest.approx(100_000.0), pytest.approx(95_000.0)]


def test_a_lower_source_is_a_check_of_the_one_that_counts(site):
    site.vessel("tk-2", sources=[{"source": "radar"}, {"source": "hand"}])
    site.read(AT, 2.0, vessel="tk-2", source="radar")
    site.read(AT, 1.99, vessel="tk-2", source="hand")
    found = stock(site, AT, "tk-2")
    assert found["mass_kg"] == pytest.approx(100_000.0)
    (check,) = [one for one in found["checks"] if one["quantity"] == "level_m"]
    assert (check["source"], check["at"], check["value"]) == ("hand", AT, 1.99)
    assert check["difference"] == pytest.approx(-0.01)
    assert check["standard_uncertainty"] > 0.0


# --- what is not there ---------------------------------------------------------------------------


def test_what_is_not_there_is_404_and_says_which(site, client):
    period = {"from": HOUR.format(0, 0), "to": HOUR.format(1, 0)}
    assert client.get("/v1/sites/no-such-site/inventory").json()["code"] == "unknown_site"
    assert site.get("/vessels/tk-9/working", at=AT, status=404)["code"] == "unknown_vessel"
    assert site.get("/vessels/tk-9/inventory", **period, status=404)["code"] == "unknown_vessel"


def test_a_junction_has_no_inventory(site):
    site.put("/vessels/j-1", {"name": "a manifold", "shape": {"kind": "junction"}})
    assert site.get("/vessels/j-1/working", at=AT, status=422)["code"] == "junction"
    assert [one["vessel"] for one in site.get("/inventory", at=AT)["vessels"]] == ["tk-1"]
