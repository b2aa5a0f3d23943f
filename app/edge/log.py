"""One JSON line for each thing that happens, and one id for each request that all its lines carry."""

from __future__ import annotations

import json
import logging
import sys
import time
import traceback
import uuid
from contextvars import ContextVar
from typing import Any

from starlette.requests import ClientDisconnect
from starlette.types import ASGIApp, Message, Receive, Scope, Send

from app.edge.problems import fault

HEADER = b"x-request-id"
_request_id: ContextVar[str | None] = ContextVar("request_id", default=None)
_log = logging.getLogger("brimbook.requests")


class JsonLines(logging.Formatter):
    """A record as one JSON object; what was passed as ``extra={"fields": {...}}`` stands beside it."""

    def format(self, record: logging.LogRecord) -> str:
        """The record's line."""
        moment = time.gmtime(record.created)
        line: dict[str, Any] = {
            "at": f"{time.strftime('%Y-%m-%dT%H:%M:%S', moment)}.{int(record.msecs):03d}Z",
            "level": record.levelname.lower(),
            "logger": record.name,
            "message": record.getMessage(),
        }
        if (request := _request_id.get()) is not None:
            line["request"] = request
        line |= getattr(record, "fields", {})
        if record.exc_info and record.exc_info[0] is not None:
            line["trace"] = "".join(traceback.format_exception(*record.exc_info))
        return json.dumps(line, default=str)


def configure(level: str) -> None:
    """Send the log of this process to stderr as JSON lines."""
    handler = logging.StreamHandler(sys.stderr)
    handler.setFormatter(JsonLines())
    logging.basicConfig(level=level.upper(), handlers=[handler], force=True)


class Requests:
    """Outermost layer: gives a request its id, logs how it went, and answers for what nobody foresaw."""

    def __init__(self, app: ASGIApp) -> None:
        self.app = app

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        """Pass a request on and see it through."""
        if scope["type"] != "http":
            await self.app(scope, receive, send)
            return
        request = uuid.uuid4().hex
        scope.setdefault("state", {})["request_id"] = request
        token = _request_id.set(request)
        seen = _Seen(send, request)
        started = time.perf_counter()
        try:
            await self.app(scope, receive, seen)
        except ClientDisconnect:
            _log.info("the client left before its request was read")
        except Exception:
            _log.exception("fault")
            if seen.status is not None:
                raise  # too late to say so: an answer cut short cannot pass for a whole one
            await fault(scope)(scope, receive, seen)
        finally:
            fields = {"method": scope["method"], "path": scope["path"], "status": seen.status}
            fields["took_ms"] = round((time.perf_counter() - started) * 1e3, 2)
            _log.info("request", extra={"fields": fields})
            _request_id.reset(token)


class _Seen:
    """``send`` that notes the status and adds the request's id."""

    def __init__(self, send: Send, request: str) -> None:
        self.send = send
        self.request = request
        self.status: int | None = None

    async def __call__(self, message: Message) -> None:
        if message["type"] == "http.response.start":
            self.status = message["status"]
            message["headers"] = [*message.get("headers", []), (HEADER, self.request.encode())]
        await self.send(message)
