"""Each pitfall that the developers' page lists has a test that carries its number, and none carries another."""

from __future__ import annotations

import re
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2]
NAME = re.compile(r"^def (test_pitfall_\w*)\(", re.MULTILINE)


def test_every_pitfall_has_its_test() -> None:
    page = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
    listed = page.split("The pitfalls of the trade")[1].split("\n\n")[1]
    numbers = [int(line.partition(".")[0]) for line in listed.splitlines()]
    assert numbers == list(range(1, 19))
    files = sorted((ROOT / "tests").rglob("test_*.py"))
    names = [name for file in files for name in NAME.findall(file.read_text(encoding="utf-8"))]
    found = [re.match(r"test_pitfall_(\d+)_", name) for name in names]
    unnumbered = [name for name, match in zip(names, found, strict=True) if match is None]
    assert not unnumbered
    assert {int(match[1]) for match in found if match} == set(numbers)
