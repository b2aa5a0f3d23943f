"""The demo's files: the same to the last byte when made again, of a decent size, and valid as bodies."""

from __future__ import annotations

import ast
import csv
import json
from collections import Counter
from datetime import datetime
from pathlib import Path
from typing import Any
from zoneinfo import ZoneInfo

import pytest

from app.schemas.meter import Meter
from app.schemas.reading import Reading, validate_rows
from app.schemas.site import Site
from app.schemas.substance import Substance
from app.schemas.transfer import TransferBatch
from app.schemas.types import Body
from app.schemas.vessel import Vessel
from demo_data import make
from demo_data.terminal import SITE_ID

FOLDER = Path(make.__file__).resolve().parent
SITE = FOLDER / SITE_ID
MODELS: dict[str, type[Body]] = {"substances": Substance, "vessels": Vessel, "meters": Meter}
DEFINITIONS = [path for kind in MODELS for path in sorted((SITE / kind).glob("*.json"))]
WORDS = {"vessel", "taken_at", "source", "sample", "sample_holds_from", "observed_density_by"}


def rows_of(name: str) -> list[dict[str, Any]]:
    """Rows of a file of readings as a client would send them: numbers as numbers, blanks left out."""
    with (SITE / "readings" / f"{name}.csv").open(encoding="utf-8", newline="") as text:
        return [
            {key: value if key in WORDS else float(value) for key, value in row.items() if value}
            for row in csv.DictReader(text)
        ]


READINGS = sorted(path.stem for path in (SITE / "readings").glob("*.csv"))


def test_made_again_it_is_the_same_to_the_last_byte(tmp_path: Path) -> None:
    make.write(tmp_path)
    made = {path.relative_to(tmp_path): path.read_bytes() for path in tmp_path.rglob("*") if path.is_file()}
    kept = {path.relative_to(FOLDER): path.read_bytes() for path in SITE.rglob("*") if path.is_file()}
    kept[Path("key.json")] = (FOLDER / "key.json").read_bytes()
    assert set(made) == set(kept)
    assert [str(name) for name in made if made[name] != kept[name]] == []


def test_the_folder_stays_small() -> None:
    sizes = {path.name: path.stat().st_size for path in SITE.rglob("*") if path.is_file()}
    assert sum(sizes.values()) < 4_000_000
    assert len(list((SITE / "vessels").iterdir())) == 13


@pytest.mark.parametrize("path", DEFINITIONS, ids=lambda path: f"{path.parent.name}/{path.stem}")
def test_every_definition_is_a_valid_body(path: Path) -> None:
    assert MODELS[path.parent.name].model_validate_json(path.read_bytes())


def test_the_site_is_a_valid_body() -> None:
    site = Site.model_validate_json((SITE / "site.json").read_bytes())
    assert (site.time_zone, site.false_alarms_per_month) == ("Europe/Lisbon", 0.2)


def test_every_ticket_is_a_valid_body_with_known_ends() -> None:
    batch = TransferBatch.model_validate_json((SITE / "transfers.json").read_bytes())
    known = {path.stem for path in DEFINITIONS}
    ids = Counter(one.id for one in batch.transfers)
    assert max(ids.values()) == 1
    for one in batch.transfers:
        for end in (one.from_, one.to):
            assert end.startswith("boundary:") or end in known
        assert one.meter is None or one.meter in known


@pytest.mark.parametrize("name", READINGS)
def test_every_reading_is_a_valid_body(name: str) -> None:
    rows = rows_of(name)
    good, errors = validate_rows(rows)
    assert (len(good), errors) == (len(rows), [])
    keys = Counter((row.vessel, row.source, row.taken_at) for _, row in good)
    assert max(keys.values()) == 1
    assert all(isinstance(row, Reading) for _, row in good)


def test_every_vessel_names_what_is_defined_and_read() -> None:
    known = {path.stem for path in DEFINITIONS if path.parent.name == "substances"}
    read = {(row.get("vessel"), row["source"]) for name in READINGS for row in rows_of(name)}
    for path in (SITE / "vessels").glob("*.json"):
        body = json.loads(path.read_bytes())
        assert body["substance"] in known
        assert {(path.stem, one["source"]) for one in body["sources"]} <= read


def test_readings_bear_the_offset_that_the_clocks_had() -> None:
    zone = ZoneInfo("Europe/Lisbon")
    offsets = set()
    for name in READINGS:
        for row in rows_of(name):
            taken = datetime.fromisoformat(row["taken_at"])
            assert taken.replace(tzinfo=zone).utcoffset() == taken.utcoffset()
            offsets.add(taken.isoformat()[-6:])
    assert offsets == {"+00:00", "+01:00"}


def test_the_truth_is_made_without_the_program_that_it_judges() -> None:
    for path in FOLDER.glob("*.py"):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            named = [alias.name for alias in node.names] if isinstance(node, ast.Import) else []
            named += [node.module or ""] if isinstance(node, ast.ImportFrom) else []
            assert not [name for name in named if name.split(".")[0] in ("app", "models", "tests")], path
