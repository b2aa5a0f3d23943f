"""Bodies: read only as what they say they are, counted against the limit, validated from their bytes.

A handler takes one with ``body: Annotated[VesselBody, Depends(json_body(VesselBody))]``. The bytes are
received on the event loop; inflating and validating them is work, so it is done in the handler's thread.
FastAPI's own parsing is passed by: it builds Python objects first, and strict validation then refuses
every instant, while lax validation takes ``"1.5"`` and ``true`` for numbers.
"""

# No deferred annotations here: FastAPI reads those of a callable object as they are.
import zlib
from collections.abc import Callable
from typing import Annotated, Any, Generic, TypeVar

import pydantic_core
from fastapi import Depends, Request
from pydantic import BaseModel, ValidationError

from app.edge import json_text
from app.errors import BadRequest, FieldError, Sentence, TooLarge, Unprocessable, UnsupportedMedia, field_errors

JSON = "application/json"
MEGABYTE = 1_000_000
# Times the limit that is received, and dropped, of a body that is too large: a client that is cut off in
# the middle of sending never gets to read why.
PATIENCE = 4

M = TypeVar("M", bound=BaseModel)


class ReceivedBytes:
    """Dependency: the bytes of a body of one of these media types, still encoded as they came."""

    def __init__(self, *media_types: str) -> None:
        self.media_types = media_types

    async def __call__(self, request: Request) -> bytes:
        """The whole body, never more than the limit."""
        _check_media_type(request, self.media_types)
        _encoding(request)
        limit = _limit(request)
        patience = PATIENCE * limit
        announced = _announced(request)
        if announced > patience or (announced > limit and "expect" in request.headers):
            raise _too_large(limit)  # before a byte of it is read
        received, length = bytearray(), 0
        async for block in request.stream():
            length += len(block)
            if length <= limit:
                received += block
            elif length > patience:
                break
        if length > limit:
            raise _too_large(limit)
        return bytes(received)


class JsonBody(Generic[M]):
    """Dependency: a JSON body, strictly validated; OpenAPI shows its model as the request's body."""

    def __init__(self, model: type[M], say: Sentence | None = None) -> None:
        self.model = model
        self.say = say

    def __call__(self, request: Request, received: Annotated[bytes, Depends(ReceivedBytes(JSON))]) -> M:
        """The validated body."""
        return parse(self.model, decoded(request, received), self.say)


def json_body(model: type[M], say: Sentence | None = None) -> JsonBody[M]:
    """Dependency that reads a JSON body of this model; ``say`` makes the sentences of its refusals."""
    return JsonBody(model, say)


class BatchBody(JsonBody[M]):
    """Dependency: a JSON body of many rows, each judged on its own by ``read``, which names the bad ones."""

    def __init__(self, model: type[M], read: Callable[[bytes], Any], say: Sentence | None = None) -> None:
        super().__init__(model, say)
        self.read = read

    def __call__(self, request: Request, received: Annotated[bytes, Depends(ReceivedBytes(JSON))]) -> Any:
        """What ``read`` makes of the rows."""
        text = decoded(request, received)
        try:
            rows = self.read(text)
        except ValidationError as refused:
            raise _refusal(refused, text, self.say) from None
        try:
            json_text.check(text, rows_judged_alone=True)
        except (ValueError, RecursionError):
            raise _malformed("The body cannot be read as JSON.") from None
        return rows


def batch_body(model: type[M], read: Callable[[bytes], Any], say: Sentence | None = None) -> BatchBody[M]:
    """Dependency that reads a JSON batch; OpenAPI shows ``model`` as its body."""
    return BatchBody(model, read, say)


def decoded(request: Request, received: bytes) -> bytes:
    """The body as its sender wrote it: inflated where it came as gzip, never past the limit."""
    if not _encoding(request):
        return received
    limit = _limit(request)
    inflated = bytearray()
    rest = received
    try:
        while rest:  # a gzip body may hold several members, one after the other
            member = zlib.decompressobj(wbits=31)
            inflated += member.decompress(rest, limit + 1 - len(inflated))
            if len(inflated) > limit:
                raise _too_large(limit)
            if not member.eof:
                raise BadRequest("The gzip body ends too early.", code="malformed_gzip")
            rest = member.unused_data
    except zlib.error:
        raise BadRequest("The body is not the gzip that it says it is.", code="malformed_gzip") from None
    return bytes(inflated)


def parse(model: type[M], text: bytes, say: Sentence | None = None) -> M:
    """A model from JSON text, or a refusal that names every mistake and repeats none."""
    try:
        body = model.model_validate_json(text)  # strict by its own configuration
    except ValidationError as refused:
        raise _refusal(refused, text, say) from None
    try:
        json_text.check(text)
    except (ValueError, RecursionError):
        raise _malformed("The body cannot be read as JSON.") from None
    return body


def _refusal(
    refused: ValidationError, text: bytes, say: Sentence | None = None
) -> BadRequest | Unprocessable:  # fmt: skip
    first = refused.errors(include_url=False, include_input=False)[0]
    if first["type"] == "json_invalid" and not first["loc"]:
        return _malformed(first["msg"])
    errors = field_errors(refused, pydantic_core.from_json(text), say=say)
    return Unprocessable(f"The body has {len(errors)} error{'' if len(errors) == 1 else 's'}.", errors=errors)


def _malformed(detail: str) -> BadRequest:
    return BadRequest(detail, code="malformed_json", errors=[FieldError("", "malformed_json", detail)])


def _check_media_type(request: Request, media_types: tuple[str, ...]) -> None:
    kind, *parameters = request.headers.get("content-type", "").split(";")
    said = {parameter.strip().lower().replace('"', "") for parameter in parameters}
    charsets = {parameter for parameter in said if parameter.startswith("charset")}
    if kind.strip().lower() in media_types and charsets <= {"charset=utf-8"}:
        return
    detail = f"Send the body as {' or '.join(media_types)}, in UTF-8."
    raise UnsupportedMedia(detail, headers={"Accept": ", ".join(media_types)})


def _encoding(request: Request) -> str:
    """``gzip``, or nothing."""
    encoding = request.headers.get("content-encoding", "").strip().lower()
    if encoding in ("", "identity"):
        return ""
    if encoding in ("gzip", "x-gzip"):
        return "gzip"
    raise UnsupportedMedia("Send the body plain or as gzip.", headers={"Accept-Encoding": "gzip, identity"})


def _announced(request: Request) -> int:
    length = request.headers.get("content-length", "")
    return int(length[:20]) if length.isdecimal() else 0


def _limit(request: Request) -> int:
    return int(request.app.state.settings.max_body_mb * MEGABYTE)


def _too_large(limit: int) -> TooLarge:
    # The rest of the body is still on its way and nobody will read it.
    headers = {"Connection": "close"}
    return TooLarge(f"A body may have {limit} bytes, inflated; send less at a time.", headers=headers)
