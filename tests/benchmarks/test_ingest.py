"""Ingest over HTTP against the same rows by the driver alone, into the same table in the same transactions."""

from __future__ import annotations

import json
import os
import socket
import subprocess
import sys
import time
from collections.abc import Iterator
from concurrent.futures import ThreadPoolExecutor
from contextlib import contextmanager
from itertools import count
from pathlib import Path
from typing import Any

import httpx
import pytest

from app.store.engine import Store
from tests.benchmarks import many_vessels
from tests.benchmarks.conftest import Ratio
from tests.benchmarks.many_vessels import CLOSING, STEP, VALUES, insert, name_of
from tests.conftest import Fresh

ROOT = Path(__file__).parents[2]
VESSELS, READINGS = 1_000, 5_000
SINGLE, IN_FLIGHT = 320, 32
SITE = "site"
JSON = {"content-type": "application/json"}


@contextmanager
def served(url: str) -> Iterator[httpx.Client]:
    """The service in a process of its own on loopback, stopped by its own process at the end."""
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        port = probe.getsockname()[1]
    words = [sys.executable, "-m", "app.cli", "serve", "--port", str(port)]
    environment = os.environ | {"BRIMBOOK_DATABASE_URL": url, "PYTHONPATH": str(ROOT), "BRIMBOOK_LOG_LEVEL": "error"}
    with subprocess.Popen(words, env=environment, cwd=ROOT, stderr=subprocess.DEVNULL) as process:
        try:
            limits = httpx.Limits(max_connections=IN_FLIGHT)
            with httpx.Client(base_url=f"http://127.0.0.1:{port}", timeout=60, limits=limits) as client:
                ready(client, process)
                yield client
        finally:
            process.terminate()


def ready(client: httpx.Client, process: subprocess.Popen[bytes]) -> None:
    end = time.monotonic() + 30
    while time.monotonic() < end and process.poll() is None:
        try:
            if client.get("/ready").status_code == 200:
                return
        except httpx.TransportError:
            time.sleep(0.1)
    pytest.fail("the server did not start")


@pytest.fixture(params=["sqlite", "postgresql"])
def url(request: pytest.FixtureRequest, tmp_path: Path) -> str:
    """An empty database; a PostgreSQL of the tests does not sync its disk, and the summary says so."""
    if request.param == "sqlite":
        return f"sqlite:///{tmp_path}/ingest.db"
    fresh: Fresh = request.getfixturevalue("fresh_postgresql")
    return fresh()


@pytest.fixture
def store(url: str) -> Iterator[Store]:
    """A store with 1,000 vessels, all of whose series are there."""
    store = Store.open(url)
    store.migrate()
    many_vessels.make(store, SITE, VESSELS, 0)
    yield store
    store.close()


steps = count(1)


def body() -> dict[str, Any]:
    """Five readings of each vessel, later than all before."""
    readings = []
    for _ in range(READINGS // VESSELS):
        step = next(steps)
        at = many_vessels.at_text(CLOSING + step * STEP // 100)
        readings += [
            {"vessel": name_of(number), "taken_at": at, "source": "gauge"} | many_vessels.values(number, step)
            for number in range(VESSELS)
        ]
    return {"readings": readings}


def tuples(store: Store) -> list[list[Any]]:
    """The newest 20,000 rows as they were stored, in the order of the key, without when they were recorded."""
    with store.reading() as connection:
        found = connection.exec_driver_sql(
            "SELECT site_id, series_id, taken_at, revision, recorded_at, value, cited_id, quality FROM reading"
            f" ORDER BY taken_at DESC, series_id LIMIT {READINGS * VALUES}"
        )
        return sorted(list(row) for row in found)


def test_five_thousand_readings_over_http(ratio: Ratio, store: Store, url: str) -> None:
    with served(url) as client:
        bodies = iter([json.dumps(body()).encode() for _ in range(6)])

        def post() -> None:
            answer = client.post(f"/v1/sites/{SITE}/readings", content=next(bodies), headers=JSON)
            assert answer.status_code == 200, answer.text
            assert answer.json()["stored"] == READINGS

        post()
        rows = tuples(store)
        assert len({(row[1], row[2]) for row in rows}) == READINGS * VALUES
        shift = count(1)

        def bare() -> None:
            moved = next(shift) * 30 * STEP
            with store.writing(SITE, deed="bare") as writing:
                insert(writing, ((*row[:2], row[2] + moved, 1, writing.recorded_at, *row[5:]) for row in rows))

        what = f"5,000 readings of 4 values by HTTP to bare rows, {store.dialect}"
        slower = ratio(what, post, bare, target="<= 2", units=READINGS, rounds=5)
    print(f"\n{store.dialect}: ingest by HTTP runs at {1.0 / slower:.2f} of the bare rows' speed (target >= 0.5)")


def test_single_posts(ratio: Ratio, store: Store, url: str) -> None:
    with served(url) as client, ThreadPoolExecutor(IN_FLIGHT) as pool:

        def post(reading: dict[str, Any]) -> int:
            return client.post(f"/v1/sites/{SITE}/readings", json={"readings": [reading]}).status_code

        def each(workers: int) -> None:
            some = body()["readings"][:SINGLE]
            answers = list(pool.map(post, some)) if workers > 1 else [post(one) for one in some]
            assert answers == [200] * SINGLE

        with store.reading() as connection:
            before = connection.exec_driver_sql("SELECT count(*) FROM recording").scalar_one()
        each(IN_FLIGHT)
        with store.reading() as connection:
            commits = connection.exec_driver_sql("SELECT count(*) FROM recording").scalar_one() - before
        print(f"\n{store.dialect}: {SINGLE} posts, {IN_FLIGHT} in flight: {commits} commits (target <= {SINGLE // 8})")
        what = f"320 single posts, 32 in flight to one at a time, {store.dialect}"
        ratio(what, lambda: each(IN_FLIGHT), lambda: each(1), units=SINGLE, rounds=1)
