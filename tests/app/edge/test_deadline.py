"""Who sends slowly is closed; who sends steadily, or waits for an answer, is not."""

from __future__ import annotations

import asyncio
import socket
from collections.abc import Awaitable, Callable
from typing import Any

import uvicorn

from app.edge.deadline import BODY_STEP, STATE_KEY, DeadlineProtocol

DEADLINE_S = 0.4
HEAD = b"POST / HTTP/1.1\r\nHost: localhost\r\nContent-Length: %d\r\n\r\n"

Client = Callable[[asyncio.StreamReader, asyncio.StreamWriter], Awaitable[bytes]]


async def slow_answer(scope: Any, receive: Any, send: Any) -> None:
    """Reads the whole body, thinks for longer than the deadline, answers with the body's length."""
    if scope["type"] != "http":
        return
    length, more = 0, True
    while more:
        message = await receive()
        if message["type"] == "http.disconnect":
            return
        length, more = length + len(message["body"]), message["more_body"]
    await asyncio.sleep(2 * DEADLINE_S)
    body = str(length).encode()
    headers = [(b"content-length", str(len(body)).encode())]
    await send({"type": "http.response.start", "status": 200, "headers": headers})
    await send({"type": "http.response.body", "body": body})


def talk(client: Client) -> bytes:
    """What one client hears from a server with a deadline of 0.4 s."""

    async def scene() -> bytes:
        config = uvicorn.Config(
            slow_answer, http=DeadlineProtocol, ws="none", lifespan="off", log_config=None
        )
        config.load()
        state = uvicorn.server.ServerState()
        loop = asyncio.get_running_loop()
        server = await loop.create_server(
            lambda: DeadlineProtocol(config, state, {STATE_KEY: DEADLINE_S}), "127.0.0.1", 0
        )
        port = server.sockets[0].getsockname()[1]
        reader, writer = await asyncio.open_connection("127.0.0.1", port)
        try:
            return await asyncio.wait_for(client(reader, writer), 10)
        finally:
            writer.close()
            server.close()

    return asyncio.run(scene())


async def dribble(writer: asyncio.StreamWriter, *, size: int, times: int, pause: float) -> None:
    for _ in range(times):
        if writer.is_closing():
            return
        writer.write(b"x" * size)
        await asyncio.sleep(pause)


async def rest(reader: asyncio.StreamReader) -> bytes:
    try:
        return await reader.read()
    except ConnectionError:
        return b""


def test_a_connection_that_says_nothing_is_closed() -> None:
    async def silent(reader: asyncio.StreamReader, writer: asyncio.StreamWriter) -> bytes:
        return await rest(reader)

    assert talk(silent) == b""


def test_a_dribbled_head_is_closed_however_steady() -> None:
    async def dribbled(reader: asyncio.StreamReader, writer: asyncio.StreamWriter) -> bytes:
        writer.write(b"GET / HTTP/1.1\r\nX-Slow: ")
        await dribble(writer, size=1, times=30, pause=DEADLINE_S / 4)
        return await rest(reader)

    assert talk(dribbled) == b""


def test_a_dribbled_body_is_closed() -> None:
    async def dribbled(reader: asyncio.StreamReader, writer: asyncio.StreamWriter) -> bytes:
        writer.write(HEAD % 10_000)
        await dribble(writer, size=10, times=30, pause=DEADLINE_S / 4)
        return await rest(reader)

    assert talk(dribbled) == b""


def test_a_large_body_that_comes_steadily_is_read_and_a_slow_answer_is_awaited() -> None:
    async def steady(reader: asyncio.StreamReader, writer: asyncio.StreamWriter) -> bytes:
        writer.write(HEAD % (6 * BODY_STEP))
        await dribble(writer, size=BODY_STEP, times=6, pause=DEADLINE_S / 2)
        return await reader.readuntil(b"120000")

    assert talk(steady).startswith(b"HTTP/1.1 200")


def test_a_request_on_a_kept_connection_has_the_deadline_too() -> None:
    async def again(reader: asyncio.StreamReader, writer: asyncio.StreamWriter) -> bytes:
        writer.write(HEAD % 1 + b"x")
        await reader.readuntil(b"\r\n\r\n1")
        writer.write(b"GET / HTTP")
        return await rest(reader)

    assert talk(again) == b""


def test_an_answer_does_not_wait_for_an_acknowledgement_on_a_socket_made_for_workers() -> None:
    async def scene() -> int:
        config = uvicorn.Config(
            slow_answer, http=DeadlineProtocol, ws="none", lifespan="off", log_config=None
        )
        config.load()
        made: list[DeadlineProtocol] = []

        def make() -> DeadlineProtocol:
            made.append(DeadlineProtocol(config, uvicorn.server.ServerState(), {}))
            return made[0]

        listening = socket.socket()  # as uvicorn makes the one that its workers share
        listening.bind(("127.0.0.1", 0))
        server = await asyncio.get_running_loop().create_server(make, sock=listening)
        _, writer = await asyncio.open_connection(*listening.getsockname())
        while not made or made[0].transport is None:
            await asyncio.sleep(0.01)
        option = made[0].transport.get_extra_info("socket").getsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY)
        made[0].transport.close()
        writer.close()
        server.close()
        await asyncio.sleep(0)
        return int(option)

    assert asyncio.run(scene()) == 1
