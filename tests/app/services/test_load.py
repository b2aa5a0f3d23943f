"""A folder goes in by the same verbs as over HTTP; what is wrong with it is said by file and line."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest

from app.services import load, read_back, take_stock
from app.store.engine import Store
from tests.app.services.plant import BOX, OIL, SITE, Still, instant

HEADER = (
    "vessel,taken_at,source,quality,level_m,observed_density_kg_m3,observed_density_temperature_c,vapour_composition"
)
FROM, TO = instant("2026-03-14T00:00"), instant("2026-03-15T00:00")
TICKET = {"id": "t-1", "from": "boundary:x", "to": "tk-1", "by": "weighbridge", "mass_kg": 5.0,
          "mass_uncertainty_kg": 1.0, "started_at": "2026-03-14T07:00:00Z",
          "ended_at": "2026-03-14T08:00:00Z"}  # fmt: skip


def write(path: Path, body: Any) -> None:
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_text(body if isinstance(body, str) else json.dumps(body), encoding="utf-8")


@pytest.fixture
def folder(tmp_path: Path, site_id: str) -> Path:
    """A site of one tank, two readings and one ticket, in a folder named as the site."""
    place = tmp_path / site_id
    write(place / "site.json", SITE)
    write(place / "substances" / "oil.json", OIL)
    write(place / "vessels" / "tk-1.json", BOX)
    write(place / "meters" / "m-1.json", {"name": "m"})
    write(place / "readings" / "a.csv", f"{HEADER}\ntk-1,2026-03-14T06:00:00Z,radar,,5.0,,,\n"
                                        "tk-1,2026-03-14T06:30:00+01:00,laboratory,,,810,15,\n")  # fmt: skip
    write(place / "transfers.json", {"transfers": [TICKET]})
    return place


def run(store: Store, folder: Path, heard: list[tuple[str, int]] | None = None) -> load.Loaded:
    def progress(name: str, rows: int) -> None:
        if heard is not None:
            heard.append((name, rows))

    return load.load(store, Still(), folder, progress)


def counts(loaded: load.Loaded) -> tuple[int, int, int, int]:
    one = loaded.readings
    return one.stored, one.revised, one.unchanged, loaded.rejected


def test_a_folder_becomes_a_site_and_loading_it_again_changes_nothing(store: Store, folder: Path) -> None:
    heard: list[tuple[str, int]] = []
    first = run(store, folder, heard)
    assert (first.site, first.errors) == (folder.name, [])
    assert first.definitions == {"created": 4, "revised": 0, "unchanged": 0}
    assert counts(first) == (2, 0, 0, 0)
    assert first.transfers == {"created": 1, "revised": 0, "unchanged": 0}
    assert heard == [("a.csv", 2), ("transfers.json", 0)]
    assert load.rows_in(folder) == 2
    mass = take_stock.vessel_inventory(store, folder.name, "tk-1", instant("2026-03-14T06:30"), None)["mass_kg"]
    assert mass == pytest.approx(500.0 * 810.0, rel=1e-12)
    again = run(store, folder)
    assert again.definitions == {"created": 0, "revised": 0, "unchanged": 4}
    assert counts(again) == (0, 0, 2, 0)
    assert again.transfers == {"created": 0, "revised": 0, "unchanged": 1}


def test_cells_are_numbers_words_and_objects_and_blanks_were_not_read(store: Store, folder: Path) -> None:
    write(folder / "readings" / "a.csv",
          f"{HEADER}\ntk-1,2026-03-14T06:00:00Z,radar,uncertain,5.0,,,\n"
          'tk-1,2026-03-14T07:00:00Z,lab,"{""vapour_composition"": ""good""}",,,,"{""propane"": 1.0}"\n')  # fmt: skip
    assert counts(run(store, folder)) == (2, 0, 0, 0)
    found, _, _ = read_back.values(store, folder.name, "tk-1", (FROM, TO), None, None, 10, None)
    assert [(one["quantity"], one["quality"], one.get("composition", one["value"])) for one in found] == [
        ("level_m", "uncertain", 5.0), ("vapour_composition", "good", {"propane": 1.0}),
    ]  # fmt: skip


def test_refused_lines_are_named_and_the_others_are_kept(store: Store, folder: Path) -> None:
    write(folder / "readings" / "b.csv",
          "vessel,taken_at,level_m,empty\n"
          "tk-1,2026-03-14T08:00:00Z,5.0,\n"
          "tk-9,2026-03-14T08:00:00Z,5.0,\n"
          "tk-1,2026-03-14T08:00:00,5.0,\n"
          "tk-1,2026-03-14T08:30:00Z,five,\n"
          "tk-1,2026-03-14T08:40:00Z,nan,\n"
          "tk-1,2026-03-14T08:50:00Z,,true\n")  # fmt: skip
    write(folder / "transfers.json", {"transfers": [TICKET, TICKET | {"id": "t-2", "to": "tk-9"}]})
    found = run(store, folder)
    assert counts(found) == (4, 0, 0, 5)
    places = [": ".join(one.split(": ")[:2]) for one in found.errors]
    assert sorted(places) == [
        "b.csv, line 3: vessel", "b.csv, line 4: taken_at", "b.csv, line 5: level_m", "b.csv, line 6: level_m",
        "transfers.json, ticket 1: to",
    ]  # fmt: skip
    assert found.transfers["created"] == 1


def test_lines_of_later_blocks_are_counted_on(store: Store, folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    # Blocks of 5,000 rows; the same at 2.
    monkeypatch.setattr(load, "BLOCK", 2)
    lines = [f"tk-1,2026-03-14T09:{minute:02}:00Z,5.0" for minute in range(5)]
    lines[3] = "tk-9,2026-03-14T09:03:00Z,5.0"
    write(folder / "readings" / "a.csv", "\n".join(["vessel,taken_at,level_m", *lines]) + "\n")
    heard: list[tuple[str, int]] = []
    found = run(store, folder, heard)
    assert heard[:3] == [("a.csv", 2), ("a.csv", 2), ("a.csv", 1)]
    assert [one.split(":")[0] for one in found.errors] == ["a.csv, line 5"]
    assert counts(found) == (4, 0, 0, 1)


@pytest.mark.parametrize(
    ("path", "text", "said"),
    [
        ("site.json", None, "site.json is not there"),
        ("site.json", "{", "site.json: the body"),
        ("vessels/tk-1.json", json.dumps(BOX | {"shape": {"kind": "box"}}), "vessels/tk-1.json: /shape"),
        ("vessels/tk-1.json", json.dumps(BOX | {"substance": "tea"}), "put the substance first"),
        ("readings/a.csv", "vessel,taken_at,depth_m\n", "readings/a.csv: Column 3: It is no field of a reading"),
        ("readings/a.csv", HEADER + "\ntk-1,2026-03-14T06:00:00Z,lab,,,,,{propane\n", "a.csv"),
        ("readings/a.csv", b"vessel,taken_at\n\xff\xfe\n", "a.csv"),
        ("transfers.json", "[]", "transfers.json"),
    ],
)  # fmt: skip
def test_a_file_that_cannot_be_loaded_is_named(
    store: Store, folder: Path, path: str, text: str | bytes | None, said: str
) -> None:
    if text is None:
        (folder / path).unlink()
    elif isinstance(text, bytes):
        (folder / path).write_bytes(text)
    else:
        write(folder / path, text)
    try:
        found = run(store, folder)
    except load.FolderError as refused:
        assert said in str(refused)
    else:
        assert any(said in one for one in found.errors), found.errors
