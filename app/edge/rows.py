"""Batches of more than one media type: JSON, and texts of one row a line, whose rows are judged alone."""

# No deferred annotations here: FastAPI reads those of a callable object as they are.
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Annotated, Any, TypeVar

from fastapi import Depends, Request
from pydantic import BaseModel

from app.edge.body import JSON, BatchBody, JsonBody, ReceivedBytes, decoded
from app.errors import Sentence

NDJSON = "application/x-ndjson"
CSV = "text/csv"

M = TypeVar("M", bound=BaseModel)


@dataclass(frozen=True)
class RowsText:
    """How a text of rows is read, and what the service's description says of it."""

    read: Callable[[bytes], Any]
    description: str
    example: str


class RowsBody(BatchBody[M]):
    """Dependency: a batch as JSON, or as one of the texts, told apart by the content type."""

    def __init__(
        self, model: type[M], read: Callable[[bytes], Any], texts: Mapping[str, RowsText], say: Sentence | None = None
    ) -> None:
        super().__init__(model, read, say)
        self.texts = texts

    def __call__(
        self, request: Request, received: Annotated[bytes, Depends(ReceivedBytes(JSON, NDJSON, CSV))]
    ) -> Any:
        """What the reader of this media type makes of the rows."""
        kind = request.headers["content-type"].partition(";")[0].strip().lower()
        if kind == JSON:
            return super().__call__(request, received)
        return self.texts[kind].read(decoded(request, received))


def rows_body(
    model: type[M], read: Callable[[bytes], Any], *, ndjson: RowsText, csv: RowsText, say: Sentence | None = None
) -> RowsBody[M]:  # fmt: skip
    """Dependency that reads a batch of any of three media types; OpenAPI shows all of them.

    Parameters
    ----------
    model : type
        The whole body, where it is JSON.
    read : callable
        Makes rows of that body.
    ndjson, csv : RowsText
        The other two.
    say : callable, optional
        Makes the sentences of a body that is no batch.
    """
    return RowsBody(model, read, {NDJSON: ndjson, CSV: csv}, say)


class TableBody(JsonBody[M]):
    """Dependency: a JSON body, or a table as CSV in its place, told apart by the content type."""

    def __init__(self, model: type[M], csv: RowsText, say: Sentence | None = None) -> None:
        super().__init__(model, say)
        self.texts = {CSV: csv}

    def __call__(self, request: Request, received: Annotated[bytes, Depends(ReceivedBytes(JSON, CSV))]) -> Any:
        """The validated body, or what the reader of the table makes of it."""
        if request.headers["content-type"].partition(";")[0].strip().lower() == JSON:
            return super().__call__(request, received)
        return self.texts[CSV].read(decoded(request, received))


def table_body(model: type[M], csv: RowsText, say: Sentence | None = None) -> TableBody[M]:
    """Dependency that reads a JSON body of this model, or a CSV table; OpenAPI shows both."""
    return TableBody(model, csv, say)
