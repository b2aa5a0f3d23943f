"""The demo's own database, its month, and what it says at the end."""

from datetime import date

from app.services import show


def test_the_demo_begins_with_an_empty_file(tmp_path):
    for name in ("demo.db", "demo.db-wal", "brimbook.db"):
        (tmp_path / name).write_text("old")
    path = show.fresh_file(tmp_path)
    assert path == tmp_path / "demo.db"
    assert sorted(one.name for one in tmp_path.iterdir()) == ["brimbook.db"]


def test_the_month_is_march_2026():
    days = show.days()
    assert (days[0], days[-1], len(days)) == (date(2026, 3, 1), date(2026, 3, 31), 31)


def test_a_planted_fault_is_told_with_its_size_and_unit():
    fault = {"first_night": "2026-03-09", "kind": "level_bias", "subject": "tk-21", "size": 18.0, "unit": "mm"}
    said = show.planted(fault)
    assert said == "2026-03-09: level_bias, tk-21, 18 mm"
