"""One JSON line a request, one id in all of its lines, a fault with its trace."""

from __future__ import annotations

import asyncio
import io
import json
import logging
import sys

import pytest
from fastapi.testclient import TestClient
from starlette.requests import ClientDisconnect
from starlette.types import Message, Receive, Scope, Send

from app.edge.log import JsonLines, Requests, configure


def test_a_record_is_one_line_of_json() -> None:
    try:
        raise ValueError("two\nlines")
    except ValueError:
        record = logging.LogRecord("x", logging.ERROR, __file__, 1, "said %s", ('"so"\n',), sys.exc_info())
    record.fields = {"took_ms": 1.5}
    line = JsonLines().format(record)
    assert "\n" not in line
    parsed = json.loads(line)
    assert (parsed["level"], parsed["message"], parsed["took_ms"]) == ("error", 'said "so"\n', 1.5)
    assert parsed["at"].endswith("Z") and "ValueError: two" in parsed["trace"]


def test_every_request_is_logged_under_the_id_that_its_answer_carries(
    client: TestClient, caplog: pytest.LogCaptureFixture
) -> None:
    written = io.StringIO()
    handler = logging.StreamHandler(written)
    handler.setFormatter(JsonLines())
    caplog.set_level(logging.INFO, "brimbook")
    logging.getLogger("brimbook").addHandler(handler)
    try:
        ids = [client.get(path).headers["x-request-id"] for path in ("/things/a", "/raise/fault")]
    finally:
        logging.getLogger("brimbook").removeHandler(handler)
    assert len(set(ids)) == 2
    lines = [json.loads(line) for line in written.getvalue().splitlines()]
    told = [(line["request"], line["message"], line.get("status")) for line in lines]
    assert told == [(ids[0], "request", 200), (ids[1], "fault", None), (ids[1], "request", 500)]


def test_the_log_goes_to_stderr_from_the_level_on(capsys: pytest.CaptureFixture[str]) -> None:
    root = logging.getLogger()
    before = root.handlers[:], root.level
    try:
        root.handlers = []
        configure("warning")
        logging.getLogger("brimbook.x").info("quiet")
        logging.getLogger("brimbook.x").warning("loud")
    finally:
        root.handlers = before[0]
        root.setLevel(before[1])
    assert [json.loads(line)["message"] for line in capsys.readouterr().err.splitlines()] == ["loud"]


def test_a_client_that_leaves_is_no_fault(caplog: pytest.LogCaptureFixture) -> None:
    sent: list[Message] = []

    async def left(scope: Scope, receive: Receive, send: Send) -> None:
        raise ClientDisconnect

    async def receive() -> Message:
        return {"type": "http.disconnect"}

    async def send(message: Message) -> None:
        sent.append(message)

    caplog.set_level(logging.INFO, "brimbook")
    asyncio.run(Requests(left)({"type": "http", "method": "POST", "path": "/x"}, receive, send))
    assert sent == []
    assert [record.levelname for record in caplog.records] == ["INFO", "INFO"]


def test_an_answer_that_fails_half_way_is_cut_short() -> None:
    sent: list[Message] = []

    async def fails(scope: Scope, receive: Receive, send: Send) -> None:
        await send({"type": "http.response.start", "status": 200, "headers": []})
        raise RuntimeError("half way")

    async def receive() -> Message:
        return {"type": "http.disconnect"}

    async def send(message: Message) -> None:
        sent.append(message)

    with pytest.raises(RuntimeError, match="half way"):
        asyncio.run(Requests(fails)({"type": "http", "method": "GET", "path": "/x"}, receive, send))
    assert [message["type"] for message in sent] == ["http.response.start"]
