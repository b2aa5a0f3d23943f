"""Who is let in: requests that name this service as their host, and changes that no other site sent.

A page of another site, open in the browser of someone who can reach this service, can post to it and,
by pointing a name of its own at this address, read it. Naming the hosts ends the second, comparing the
origin of a change with the host ends the first; neither needs a password or a cookie.
"""

from __future__ import annotations

from collections.abc import Iterable
from urllib.parse import urlsplit

from starlette.datastructures import Headers
from starlette.types import ASGIApp, Receive, Scope, Send

from app.edge.problems import answer
from app.errors import AppError, BadRequest, Forbidden, Misdirected

READING = {"GET", "HEAD", "OPTIONS"}
DEFAULT_PORTS = {"http": 80, "https": 443}


class Hosts:
    """Turns away foreign hosts (421) and changes sent by other sites (403), before anything is read."""

    def __init__(self, app: ASGIApp, names: Iterable[str]) -> None:
        self.app = app
        self.names = frozenset(name.lower().strip("[]") for name in names)

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        """Answer, or pass on."""
        if scope["type"] == "http" and (refusal := self.refusal(scope)) is not None:
            await answer(scope, refusal)(scope, receive, send)
        else:
            await self.app(scope, receive, send)

    def refusal(self, scope: Scope) -> AppError | None:
        """Why this request is turned away, or nothing."""
        headers = Headers(scope=scope)
        named = headers.getlist("host")
        place = _place(f"//{named[0]}") if len(named) == 1 else None
        if place is None or place[0] not in self.names:
            return Misdirected("This service does not answer to this Host; BRIMBOOK_HOSTS lists its names.")
        if scope["method"] not in READING and _foreign(headers, place):
            return Forbidden("A page of another site may not change anything here.", code="foreign_origin")
        if b"%00" in scope.get("raw_path", b"") + scope["query_string"]:
            return BadRequest("The address may not hold the character NUL.", code="control_character")
        return None


def _place(url: str) -> tuple[str, int | None] | None:
    """Host name and port, or nothing where there is none to be read."""
    try:
        parts = urlsplit(url)
        return (parts.hostname.rstrip("."), parts.port) if parts.hostname and not parts.path else None
    except ValueError:
        return None


def _foreign(headers: Headers, place: tuple[str, int | None]) -> bool:
    """Whether a browser says that another site sent this; a program that is no browser says nothing."""
    if headers.get("sec-fetch-site", "same-origin") not in ("same-origin", "none"):
        return True
    origin = headers.get("origin")
    if origin is None:
        return False
    theirs = _place(origin)
    # A proxy that ends TLS hides our own scheme, so a port left out means the one of the origin's.
    default = DEFAULT_PORTS.get(origin.partition(":")[0])
    return theirs is None or (theirs[0], theirs[1] or default) != (place[0], place[1] or default)
