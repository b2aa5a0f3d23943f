"""The README's first hour is typed as it stands, and its answers are compared; so are its tables."""

from __future__ import annotations

import json
import math
import re
import shlex
from decimal import Decimal
from pathlib import Path
from typing import get_args

import pytest
from fastapi.testclient import TestClient

from app.main import create_app
from app.schemas.liquid import Liquid
from app.schemas.types import Warned
from app.settings import Settings
from models import instruments
from models.liquid.costald import DEPARTURES
from models.saturation import WAGNER

README = (Path(__file__).resolve().parents[1] / "README.md").read_text(encoding="utf-8")
PAIR = re.compile(r"```sh\n(curl .*?)\n```\n```json\n(.*?)\n```", re.DOTALL)
HOUR = PAIR.findall(README)


def typed(client, command):
    """The request that a curl command line makes, made by our own client."""
    words = shlex.split(command)[1:]
    method, body, headers, url = None, None, {}, ""
    while words:
        word = words.pop(0)
        if word == "-X":
            method = words.pop(0)
        elif word == "-H":
            name, _, value = words.pop(0).partition(": ")
            headers[name] = value
        elif word == "-d":
            body = words.pop(0)
        elif word != "-s":
            url = word
    assert url.startswith("localhost:8321/"), url
    path = url.removeprefix("localhost:8321")
    return client.request(method or ("GET" if body is None else "POST"), path, content=body, headers=headers)


def says(shown, answered, place="answer"):
    """Whether an abridged, rounded answer agrees with the real one: numbers to the last digit shown."""
    if isinstance(shown, dict):
        for name, value in shown.items():
            assert name in answered, f"{place} has no {name}"
            says(value, answered[name], f"{place}/{name}")
    elif isinstance(shown, list):
        rest = list(answered)
        for one in shown:
            while rest and not _same_thing(one, rest[0]):
                rest.pop(0)
            assert rest, f"{place} lacks {one}"
            says(one, rest.pop(0), place)
    elif isinstance(shown, Decimal):
        step = Decimal(1).scaleb(shown.as_tuple().exponent)
        assert abs(Decimal(repr(float(answered))) - shown) <= step / 2, f"{place}: {answered}, shown {shown}"
    else:
        assert answered == shown, f"{place}: {answered!r}, shown {shown!r}"


def _same_thing(shown, answered):
    names = ("symbol", "input", "vessel", "substance", "index")
    return all(shown[name] == answered.get(name) for name in names if name in shown)


def test_the_first_hour_is_there():
    assert len(HOUR) == README.count("```sh\ncurl") == 11


def test_the_first_hour_answers_as_the_readme_shows(tmp_path):
    app = create_app(Settings(database_url=f"sqlite:///{tmp_path}/hour.db"))
    with TestClient(app, base_url="http://localhost:8321") as client:
        for command, shown in HOUR:
            answer = typed(client, command)
            assert answer.status_code in (200, 201), answer.text
            says(json.loads(shown, parse_float=Decimal, parse_int=int), answer.json())


@pytest.mark.parametrize("quantity", [name for name in instruments.DEFAULTS if name != "vapour_composition"])
def test_the_table_of_defaults_is_the_one_that_counts(quantity):
    cells = next(line for line in README.splitlines() if line.startswith(f"| `{quantity}` |")).split("|")
    default = instruments.DEFAULTS[quantity]
    for text, value in zip(cells[2:4], (default.random, default.systematic), strict=True):
        shown = float(text)
        assert math.isclose(shown, value, rel_tol=5e-3), (quantity, shown, value)
    assert cells[4].strip() == default.source


def test_each_command_of_the_top_is_one_line_that_sets_itself_up():
    lines = [line.strip() for line in README.splitlines() if line.strip().startswith("python3 -m venv")]
    assert len(lines) == 2
    assert all("&&" in line and ".venv/bin/pip install" in line for line in lines)


def test_every_warning_has_its_line_in_the_glossary():
    section = README.split("## Warnings, and what to do about each")[1].split("\n## ")[0]
    rows = [line.split("|") for line in section.splitlines() if line.startswith("| `")]
    said = set(re.findall(r"`([a-z_]+)`", "".join(row[1] for row in rows)))
    assert said >= set(get_args(Warned))
    assert all(len(row) == 5 and row[3].strip() for row in rows)


def test_every_day_is_linked():
    days = sorted(path.name for path in (Path(__file__).parent / "days").glob("test_day_*.py"))
    assert re.findall(r"\(tests/days/(test_day_\w+\.py)\)", README) == days


def how_true():
    section = README.split("## How true")[1].split("\n## ")[0]
    lines = [line for line in section.splitlines() if line.startswith("| ")]
    return [[cell.strip() for cell in line.split("|")[1:-1]] for line in lines[2:]]


def test_every_method_says_how_true_it_is():
    rows = how_true()
    named = {word for row in rows for word in re.findall(r"`(\w+)`", row[0])}
    models = {get_args(one.model_fields["model"].annotation)[0] for one in get_args(get_args(Liquid)[0])}
    assert named == models | {"fitted", "correlation", "capacity_table"}
    assert all(len(row) == 4 and all(row) and "TO BE FILLED" not in "".join(row) for row in rows)


def test_what_is_said_to_be_true_is_held_by_a_test_that_is_there():
    root = Path(__file__).resolve().parents[1]
    for row in how_true():
        linked = re.findall(r"\]\((tests/[\w/]+\.py)\)", row[3])
        assert linked, row
        assert all((root / path).is_file() for path in linked), row


def test_the_worst_deviations_that_the_models_carry_are_the_ones_that_are_told():
    lines = {row[0]: row[2] for row in how_true()}
    saturation = sorted((line[-1], name) for name, line in WAGNER.items())[-2:]
    assert lines["vapour pressure"] == ", ".join(f"{100 * off:.2f} % ({name})" for off, name in reversed(saturation))
    pure = lines["`light_hydrocarbon` by composition, pure"]
    for name in ("propane", "o-xylene", "ethanol"):
        off = 100 * DEPARTURES[name]
        assert f"{off:.2f} %" in pure or f"{off:.1f} % ({name})" in pure, name
    assert max(DEPARTURES, key=DEPARTURES.__getitem__) == "ethanol"
