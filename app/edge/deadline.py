"""A deadline for whoever sends slowly: the server itself waits for ever for the rest of a request.

A connection that never finishes its head, or sends its body a byte at a time, holds a place that a
reading needs. The head must be complete one deadline after the connection opened (or after the first
byte, on one that is kept alive); a body has one deadline more, and one for each 20 kB that did come.
"""

from __future__ import annotations

import asyncio
import socket

from uvicorn.protocols.http.h11_impl import H11Protocol

STATE_KEY = "receive_deadline_s"
BODY_STEP = 20_000  # bytes that earn a body another deadline
DEFAULT_S = 20.0


class DeadlineProtocol(H11Protocol):
    """uvicorn's HTTP/1.1, with a deadline for receiving."""

    _timer: asyncio.TimerHandle | None = None
    _since = 0.0  # when the head began, or the body
    _of_body: int | None = None  # bytes of the body that came; None while the head is awaited

    def connection_made(self, transport: asyncio.Transport) -> None:  # type: ignore[override]
        """A connection opens: its head is awaited from now on."""
        super().connection_made(transport)
        # asyncio does this only for sockets that it made itself, not for the one that workers share; head
        # and body of an answer go out in two writes, and without it the second waits 40 ms for the first.
        connection = transport.get_extra_info("socket")
        if connection.family in (socket.AF_INET, socket.AF_INET6):
            connection.setsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY, 1)
        self._deadline_s = float(self.app_state.get(STATE_KEY, DEFAULT_S))
        self._await_head()

    def data_received(self, data: bytes) -> None:
        """Bytes came: of a head, of a body, or both."""
        if self._timer is None:
            self._await_head()
        super().data_received(data)
        if self.cycle is None or self.cycle.response_complete:
            return  # still the head
        if not self.cycle.more_body:
            self._stop()
        elif self._of_body is None:
            self._since, self._of_body = self.loop.time(), len(data)
        else:
            self._of_body += len(data)

    def on_response_complete(self) -> None:
        """An answer is sent: from here the keep-alive time holds, until the next byte."""
        self._stop()
        super().on_response_complete()
        if not self.cycle.response_complete and self.cycle.more_body:  # the next one came along with it
            self._await_head()
            self._of_body = 0

    def connection_lost(self, exc: Exception | None) -> None:
        """The connection is gone, and its timer with it."""
        self._stop()
        super().connection_lost(exc)

    def _await_head(self) -> None:
        self._stop()
        self._since = self.loop.time()
        self._timer = self.loop.call_later(self._deadline_s, self._look)

    def _stop(self) -> None:
        if self._timer is not None:
            self._timer.cancel()
        self._timer, self._of_body = None, None

    def _look(self) -> None:
        """Close the connection if it is late, else look again when it would be."""
        allowed = self._deadline_s * (1 + (self._of_body or 0) // BODY_STEP)
        left = self._since + allowed - self.loop.time()
        if self.flow.read_paused:  # we are the slow one
            left = self._deadline_s
        if left > 0:
            self._timer = self.loop.call_later(left, self._look)
        else:
            self.transport.close()
