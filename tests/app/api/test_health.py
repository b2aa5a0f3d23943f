"""Alive is not the same as able to work."""

from __future__ import annotations

from pathlib import Path

from fastapi.testclient import TestClient

from app.main import create_app
from app.settings import Settings


def test_a_migrated_store_is_ready(tmp_path: Path) -> None:
    settings = Settings(database_url=f"sqlite:///{tmp_path}/b.db")
    with TestClient(create_app(settings), base_url="http://localhost") as client:
        assert client.get("/health").json() == {"status": "ok"}
        assert client.get("/ready").json() == {"status": "ok"}


def test_a_store_that_was_not_migrated_is_not_ready_but_the_process_is_alive(tmp_path: Path) -> None:
    settings = Settings(database_url=f"sqlite:///{tmp_path}/b.db", migrate_at_start=False)
    with TestClient(create_app(settings), base_url="http://localhost") as client:
        assert client.get("/health").status_code == 200
        answer = client.get("/ready")
        assert (answer.status_code, answer.json()["code"]) == (503, "not_migrated")
        assert int(answer.headers["retry-after"]) > 0


def test_a_store_that_went_away_is_not_ready() -> None:
    settings = Settings(
        database_url="postgresql+psycopg://127.0.0.1:1/none?connect_timeout=1", migrate_at_start=False
    )
    with TestClient(create_app(settings), base_url="http://localhost") as client:
        assert client.get("/health").status_code == 200
        answer = client.get("/ready")
        assert (answer.status_code, answer.json()["code"]) == (503, "store_unavailable")
        assert "127.0.0.1" not in answer.text
