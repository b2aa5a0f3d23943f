"""The whole story on the demo's month, over HTTP: definitions and readings in, nights closed, faults found.

The data are invented and their faults were planted by ``demo_data/make.py``, which shares no code with the
service; ``demo_data/key.json`` is the key. The service has to flag those nights and only those.
"""

from __future__ import annotations

import csv
import json
from datetime import date, timedelta
from pathlib import Path

import pytest
from fastapi.testclient import TestClient

from app.main import create_app
from app.settings import Settings

DATA = Path(__file__).resolve().parents[1] / "demo_data"
KEY = json.loads((DATA / "key.json").read_text(encoding="utf-8"))
SITE = DATA / KEY["site"]
V1 = f"/v1/sites/{KEY['site']}"
TEXTS = {"vessel", "source", "sample", "taken_at", "sample_holds_from", "observed_density_by"}


@pytest.fixture(scope="module")
def month(tmp_path_factory):
    """A client of a service that was told of the whole month, and every night as it was closed."""
    url = f"sqlite:///{tmp_path_factory.mktemp('flow') / 'flow.db'}"
    with TestClient(create_app(Settings(database_url=url)), base_url="http://localhost") as client:
        define(client)
        counts = post_readings(client)
        answer = client.post(f"{V1}/transfers", json=json.loads((SITE / "transfers.json").read_text()))
        assert answer.status_code == 200 and answer.json()["rejected"] == 0, answer.text
        yield client, counts, close_all(client)


def define(client):
    assert client.put(V1, json=json.loads((SITE / "site.json").read_text())).status_code == 201
    for kind in ("substances", "vessels", "meters"):
        for path in sorted((SITE / kind).glob("*.json")):
            answer = client.put(f"{V1}/{kind}/{path.stem}", json=json.loads(path.read_text()))
            assert answer.status_code == 201, answer.text


def rows(path):
    with path.open(newline="", encoding="utf-8") as file:
        for cells in csv.DictReader(file):
            yield {
                name: text if name in TEXTS else float(text) for name, text in cells.items() if text
            }


def post_readings(client):
    counts = {"stored": 0, "revised": 0, "unchanged": 0, "rejected": 0}
    for path in sorted((SITE / "readings").glob("*.csv")):
        every = list(rows(path))
        for start in range(0, len(every), 10_000):
            answer = client.post(f"{V1}/readings", json={"readings": every[start : start + 10_000]})
            assert answer.status_code == 200, answer.text
            for name in counts:
                counts[name] += answer.json()[name]
    return counts


def close_all(client):
    nights, day = {}, date.fromisoformat(KEY["first_day"])
    while day <= date.fromisoformat(KEY["last_day"]):
        answer = client.post(f"{V1}/reconciliations", json={"day": day.isoformat()})
        assert answer.status_code == 201, answer.text
        nights[day.isoformat()] = answer.json()
        day += timedelta(days=1)
    return nights


def test_every_reading_is_kept_once(month):
    _, counts, _ = month
    lines = sum(1 for path in (SITE / "readings").glob("*.csv") for _ in rows(path))
    assert counts == {"stored": lines, "revised": 0, "unchanged": 0, "rejected": 0}


def test_the_planted_faults_are_flagged_and_nothing_else_is(month):
    _, _, nights = month
    found = {(day, one["vessel"]) for day, night in nights.items() for one in night["vessels"] if one["flagged"]}
    assert found == {(one["day"], one["vessel"]) for fault in KEY["faults"] for one in fault["flagged"]}


def test_each_flag_has_the_size_that_was_planted(month):
    """The key's own arithmetic gives the imbalance; both are within what the instruments allow of the fault."""
    _, _, nights = month
    for fault in KEY["faults"]:
        for expected in fault["flagged"]:
            vessels = {one["vessel"]: one for one in nights[expected["day"]]["vessels"]}
            seen = vessels[expected["vessel"]]
            assert seen["imbalance_kg"] == pytest.approx(expected["imbalance_kg"], abs=2.0)
            assert seen["score"] == pytest.approx(expected["score"], abs=0.15)
            assert seen["verdict"] == "fail"


def test_every_night_is_complete_and_the_clock_change_makes_one_of_23_hours(month):
    _, _, nights = month
    assert all(night["complete"] for night in nights.values())
    assert nights["2026-03-28"]["opening"] == "2026-03-28T06:00:00Z"
    assert nights["2026-03-28"]["closing"] == "2026-03-29T05:00:00Z"


def test_books_chain(month):
    _, _, nights = month
    for before, after in zip(list(nights.values()), list(nights.values())[1:], strict=False):
        closing = {one["vessel"]: one["closing_mass_kg"] for one in before["vessels"]}
        assert {one["vessel"]: one["opening_mass_kg"] for one in after["vessels"]} == closing


def test_vessels_joined_by_an_unmetered_transfer_are_judged_together(month):
    _, _, nights = month
    for said in KEY["judged_together"]:
        for one in nights[said["day"]]["vessels"]:
            if one["vessel"] in said["vessels"]:
                assert [one["vessel"], *one["judged_with"]] and set(one["judged_with"]) < set(said["vessels"])
                assert one["judged_with"]


def test_clean_nights_score_like_chance(month):
    """Errors were drawn as declared: the scores of clean vessel-nights have a spread of one, within 10 %."""
    _, _, nights = month
    guilty = {(one["day"], one["vessel"]) for fault in KEY["faults"] for one in fault["flagged"]}
    scores = [
        one["score"] for day, night in nights.items() for one in night["vessels"]
        if (day, one["vessel"]) not in guilty and one["score"] is not None
    ]  # fmt: skip
    spread = (sum(score**2 for score in scores) / len(scores)) ** 0.5
    assert len(scores) > 390 and 0.9 < spread < 1.1


def test_a_closed_day_stands_and_a_repeated_month_changes_nothing(month):
    client, counts, nights = month
    again = post_readings(client)
    assert again == {"stored": 0, "revised": 0, "unchanged": counts["stored"], "rejected": 0}
    answer = client.post(f"{V1}/reconciliations", json={"day": "2026-03-10"})
    assert answer.status_code == 200
    assert answer.json()["id"] == nights["2026-03-10"]["id"]
    assert answer.json()["vessels"] == nights["2026-03-10"]["vessels"]
