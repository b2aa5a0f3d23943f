"""Readings as they come out of a spreadsheet: in feet, °F, psi and °API, and kept in the units of the fields."""

from __future__ import annotations

import gzip
import json
from typing import Any

import pytest
from fastapi.testclient import TestClient

from tests.app.api.conftest import Site

SIX, SEVEN = "2026-05-31T06:00:00Z", "2026-05-31T07:00:00Z"
CSV, NDJSON = "text/csv", "application/x-ndjson"


def send(site: Site, text: str | bytes, kind: str = CSV, *, status: int = 200, **headers: str) -> Any:
    """The answer to a text of readings."""
    said = {"Content-Type": kind} | {name.replace("_", "-"): value for name, value in headers.items()}
    return site.ask("POST", "/readings", content=text, headers=said, status=status).json()


def kept(site: Site) -> dict[str, float]:
    """Numbers of tk-1, by quantity and hour."""
    found = site.get("/vessels/tk-1/readings", from_="2026-05-31T00:00:00Z", to="2026-06-01T00:00:00Z")
    return {f"{one['quantity']} {one['taken_at'][11:13]}": one["value"] for one in found["items"]}


def counts(answer: dict[str, Any]) -> tuple[int, int, int, int]:
    return answer["stored"], answer["revised"], answer["unchanged"], answer["rejected"]


def test_a_table_in_feet_fahrenheit_psi_and_api_is_kept_in_the_units_of_the_fields(site: Site) -> None:
    answer = send(
        site,
        "vessel,taken_at,level [ft-in-16],liquid_temperature [degF],pressure [psi],observed_density [degAPI],"
        "observed_density_temperature [degF],liquid_volume [bbl]\r\n"
        f"tk-1,{SIX},3-03-06,59,0.5,10,60,100\r\n"
        f"tk-1,{SEVEN},3-03-07,,,,,\r\n",
    )
    assert counts(answer) == (2, 0, 0, 0)
    assert kept(site) == {
        "level_m 06": 630 * 0.0015875,  # 39 6/16 in = 630 sixteenths; exact in both
        "level_m 07": 631 * 0.0015875,
        "liquid_temperature_c 06": pytest.approx(15.0, abs=1e-14),
        "pressure_kpa 06": 0.5 * 6.894757293168361,  # gauge
        "observed_density_kg_m3 06": 999.016,
        "observed_density_temperature_c 06": pytest.approx(140 / 9, abs=1e-14),
        "liquid_volume_m3 06": 100 * 0.158987294928,
    }


def test_absolute_pressure_is_said_by_the_name_of_the_quantity(site: Site) -> None:
    send(site, f"vessel,taken_at,pressure_abs [psi]\ntk-1,{SIX},14.7\n")
    assert kept(site) == {"pressure_kpa_abs 06": 14.7 * 6.894757293168361}
    send(site, f"taken_at,barometric_pressure_abs [mbar]\n{SIX},1000\n")  # the site's
    assert kept(site) == {"pressure_kpa_abs 06": 14.7 * 6.894757293168361}


def test_the_same_again_is_unchanged_in_every_type(site: Site) -> None:
    table = f"vessel,taken_at,level [in],liquid_temperature [degF]\ntk-1,{SIX},33.1,63.3\n"
    assert counts(send(site, table)) == (1, 0, 0, 0)
    assert counts(send(site, table)) == (0, 0, 1, 0)
    numbers = kept(site)
    row = {"vessel": "tk-1", "taken_at": SIX, "level_m": numbers["level_m 06"],
           "liquid_temperature_c": numbers["liquid_temperature_c 06"]}  # fmt: skip
    assert counts(send(site, json.dumps(row), NDJSON)) == (0, 0, 1, 0)
    assert counts(site.post("/readings", {"readings": [row]})) == (0, 0, 1, 0)


def test_a_zero_has_no_sign(site: Site) -> None:
    send(site, f"vessel,taken_at,level_m,liquid_temperature [degF]\ntk-1,{SIX},-0,32\n")
    assert {name: str(value) for name, value in kept(site).items()} == {
        "level_m 06": "0.0", "liquid_temperature_c 06": "0.0",
    }  # fmt: skip


def test_good_rows_are_kept_and_bad_ones_named(site: Site) -> None:
    answer = send(
        site,
        "vessel,taken_at,level [ft-in-16],source\n"
        f"tk-1,{SIX},3-0-0,hand\n"
        f"tk-1,{SEVEN},3-12-0,hand\n"
        f"tk-9,{SEVEN},3-0-0,hand\n"
        f"tk-1,{SEVEN},3-0-0\n"
        f"tk-1,2026-06-02T12:00:00Z,3-0-0,hand\n"
        f"tk-1,{SEVEN},3-1-0,hand\n",
    )
    assert counts(answer) == (2, 0, 0, 4)
    assert [(one["index"], one["field"], one["code"]) for one in answer["errors"]] == [
        (1, "level_m", "wrong_type"), (2, "vessel", "unknown_vessel"), (3, "", "wrong_length"),
        (4, "taken_at", "future"),
    ]  # fmt: skip
    assert kept(site) == {"level_m 06": 0.9144, "level_m 07": 0.9398}  # 3 ft; 37 in


@pytest.mark.parametrize(
    ("column", "code"),
    [("level [degF]", "other_dimension"), ("level [cubits]", "unknown_unit"), ("pressure [psig]", "unknown_unit"),
     ("lvl", "unknown_column"), ("<b>x</b>", "unknown_column"), ("ullage_m", "repeated_column")],
)  # fmt: skip
def test_a_header_that_cannot_be_refuses_the_whole(site: Site, column: str, code: str) -> None:
    text = f"vessel,taken_at,ullage [ft],{column}\ntk-1,{SIX},3,3\n"
    problem = send(site, text, status=422)
    assert [(one["pointer"], one["code"]) for one in problem["errors"]] == [("/header/3", code)]
    assert problem["errors"][0]["detail"].startswith("Column 4: ")
    assert "<b>" not in json.dumps(problem) and "cubits" not in json.dumps(problem)
    assert kept(site) == {}


@pytest.mark.parametrize("text", [b"vessel,taken_at,level_m\n\xff", b'vessel,taken_at,level_m\n"tk-1'])
def test_what_is_no_csv_refuses_the_whole(site: Site, text: bytes) -> None:
    assert send(site, text, status=400)["code"] == "malformed_csv"


def test_lines_of_json_are_rows_judged_alone(site: Site) -> None:
    good = json.dumps({"vessel": "tk-1", "taken_at": SIX, "level_m": 1.5})
    answer = send(site, f'{good}\n\n{{"vessel"\n{good.replace("1.5", "true")}\n', NDJSON)
    assert counts(answer) == (1, 0, 0, 2)
    assert [(one["index"], one["field"], one["code"]) for one in answer["errors"]] == [
        (1, "", "malformed_json"), (2, "level_m", "wrong_type"),
    ]  # fmt: skip


@pytest.mark.parametrize(
    ("kind", "text"),
    [(CSV, f"vessel,taken_at,level_m\ntk-1,{SIX},1.5\n"),
     (NDJSON, json.dumps({"vessel": "tk-1", "taken_at": SIX, "level_m": 1.5}))],
)  # fmt: skip
def test_a_packed_text_is_read(site: Site, kind: str, text: str) -> None:
    assert counts(send(site, gzip.compress(text.encode()), kind, Content_Encoding="gzip")) == (1, 0, 0, 0)
    assert kept(site) == {"level_m 06": 1.5}


def test_no_rows_are_no_error(site: Site) -> None:
    assert counts(send(site, "vessel,taken_at,level_m\n")) == (0, 0, 0, 0)
    assert counts(send(site, "", NDJSON)) == (0, 0, 0, 0)


def test_the_description_shows_the_three_types(client: TestClient) -> None:
    operation = client.get("/openapi.json").json()["paths"]["/v1/sites/{site}/readings"]["post"]
    content = operation["requestBody"]["content"]
    assert set(content) == {"application/json", NDJSON, CSV}
    assert "ft-in-16" in content[CSV]["schema"]["description"]


@pytest.mark.parametrize("kind", [CSV, NDJSON])
def test_the_example_of_the_description_is_taken(site: Site, client: TestClient, kind: str) -> None:
    operation = client.get("/openapi.json").json()["paths"]["/v1/sites/{site}/readings"]["post"]
    example = operation["requestBody"]["content"][kind]["example"]
    answer = send(site, example.replace("tk-12", "tk-1"), kind)
    assert counts(answer) == (1, 0, 0, 0)
