"""A shape as a capacity table over the wire, and a table from CSV."""

from __future__ import annotations

import pytest

PATH = "/v1/calculations/capacity-table"
BOX = {"kind": "box", "length_m": 6.0, "width_m": 2.5, "height_m": 2.0}
CSV = {"Content-Type": "text/csv"}


def test_a_box_is_tabulated_and_its_table_can_be_put(client, site):
    answer = client.post(PATH, json={"shape": BOX, "step_m": 0.5})
    assert answer.status_code == 200, answer.text
    found = answer.json()
    assert found["rows"] == [[0.0, 0.0], [0.5, 7.5], [1.0, 15.0], [1.5, 22.5], [2.0, 30.0]]
    assert found["total_volume_m3"] == 30.0
    assert [one["interpolation"] for one in found["interpolation_errors"]] == ["linear", "monotone_cubic"]
    assert "findings" not in found
    site.vessel("tk-2", shape=found["shape"])
    site.read("2026-06-01T11:00:00Z", 1.25, vessel="tk-2")
    (mass,) = [
        one["mass_kg"] for one in site.get("/inventory", at="2026-06-01T11:00:00Z")["vessels"]
        if one["vessel"] == "tk-2"
    ]  # fmt: skip
    assert mass == pytest.approx(18.75 * 1000.0)


def test_a_table_in_the_client_s_units_is_checked_and_comes_back_in_cubic_metres(client):
    text = "level [ft-in-16],volume [bbl]\n00-00-00,0\n01-00-00,100\n02-00-00,200.0\n"
    answer = client.post(PATH, content=text, headers=CSV, params={"of": "box", "interpolation": "monotone_cubic"})
    assert answer.status_code == 200, answer.text
    found = answer.json()
    barrels = 100 * 9702 * 0.0254**3  # 42 US gallons of 231 cubic inches
    assert found["rows"][1] == pytest.approx([0.3048, barrels])
    assert found["findings"] == []
    assert found["shape"]["rows"] == found["rows"]
    assert (found["shape"]["of"], found["shape"]["interpolation"]) == ("box", "monotone_cubic")
    assert "interpolation_errors" not in found


def test_a_table_that_falls_has_findings_and_no_shape(client):
    answer = client.post(PATH, content="level_m,volume_m3\n0,0\n1,15\n2,14\n", headers=CSV)
    found = answer.json()
    assert answer.status_code == 200
    assert [(one["code"], one["index"]) for one in found["findings"]] == [("volume_falls", 1)]
    assert "shape" not in found


@pytest.mark.parametrize(
    ("sent", "status", "place"),
    [
        ({"json": {"shape": BOX, "step_m": 0.0}}, 422, ("/step_m", "out_of_range")),
        ({"json": {"shape": BOX | {"kind": "barrel"}, "step_m": 1.0}}, 422, ("/shape/kind", "not_one_of")),
        ({"json": {"shape": BOX, "step_m": 1.0}, "params": {"of": "box"}}, 422, ("/query/of", "conflicting")),
        ({"content": "level_m,volume_m3\n0,x\n1,2\n", "headers": CSV}, 422, ("/0/volume_m3", "wrong_type")),
        ({"content": "level_m,volume_m3\n0,1\n1,2\n", "headers": CSV, "params": {"diameter": "3"}}, 422,
         ("/query/diameter", "unknown_field")),
        ({"content": b"\xff", "headers": CSV}, 400, ("", "malformed_csv")),
    ],
)  # fmt: skip
def test_what_cannot_be_is_named_with_its_place(client, sent, status, place):
    answer = client.post(PATH, **sent)
    assert answer.status_code == status, answer.text
    assert place in [(one["pointer"], one["code"]) for one in answer.json()["errors"]]


def test_rows_of_json_are_of_no_other_type(client):
    answer = client.post(PATH, content=b"{}", headers={"Content-Type": "application/x-ndjson"})
    assert answer.status_code == 415
    assert answer.headers["accept"] == "application/json, text/csv"
