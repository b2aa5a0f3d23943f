"""Readings: what was measured on a vessel or on the site at an instant."""

from __future__ import annotations

from typing import Annotated, Any

from fastapi import APIRouter, Depends, Query, Request

from app.api.parameters import AsOf, Cursor, Limit, PathId, QueryInstant, cursor_of, open_cursor
from app.edge.rows import RowsText, rows_body
from app.schemas.batch import BatchAnswer
from app.schemas.errors import sentence
from app.schemas.lines import validate_lines
from app.schemas.listing import LIMIT, Page
from app.schemas.reading import Reading, ReadingBatch, StoredValue, validate_batch
from app.services import ingest, read_back, read_csv

router = APIRouter(prefix="/v1/sites/{site}", tags=["readings"])

READINGS = rows_body(
    ReadingBatch,
    validate_batch,
    say=sentence,
    ndjson=RowsText(
        lambda text: validate_lines(Reading, text),
        "One reading a line, each a JSON object with the fields of a row of the JSON batch.",
        '{"vessel": "tk-12", "taken_at": "2026-03-14T06:00:00+01:00", "level_m": 8.231}\n',
    ),
    csv=RowsText(
        read_csv.readings,
        "RFC 4180 with commas, in UTF-8; the first line names the columns. A column is a field of a reading "
        "(level_m), or a quantity with the unit that it stands in: level [ft-in-16] (23-04-11), level [ft-in-8], "
        "liquid_temperature [degF], pressure [psi] (gauge), pressure_abs [psi], observed_density [degAPI], "
        "observed_density [RD60/60], liquid_volume [bbl], liquid_volume [%]. A barrel has 42 US gallons; gal is "
        "the US gallon. A blank cell was not read; compositions and quality may be JSON objects. Errors count "
        "rows from 0, without the header and empty lines.",
        "vessel,taken_at,level [ft-in-16],liquid_temperature [degF]\n"
        "tk-12,2026-03-14T06:00:00+01:00,23-04-11,63.3\n",
    ),
)
"""The body of a batch of readings in its three media types."""


@router.post("/readings")
def post_readings(
    request: Request, site: PathId, body: Annotated[Any, Depends(READINGS)]
) -> BatchAnswer:  # fmt: skip
    """Keep a batch: good rows are stored, bad ones named, all counted; a repeat is harmless."""
    rows, errors = body
    state = request.app.state
    done = ingest.ingest(state.store, state.clock, site, rows, errors, request=request.state.request_id)
    return BatchAnswer(
        stored=done.stored, revised=done.revised, unchanged=done.unchanged, rejected=done.rejected,
        errors=tuple(ingest.listed(errors)), known_at=done.known_at,
    )  # fmt: skip


@router.get("/vessels/{vessel}/readings")
def list_readings(
    request: Request, site: PathId, vessel: PathId,
    first: Annotated[QueryInstant, Query(alias="from", description="From this instant on")],
    last: Annotated[QueryInstant, Query(alias="to", description="To before this instant")],
    source: Annotated[str | None, Query(max_length=63, description="Only this source")] = None,
    cursor: Cursor = None, limit: Limit = LIMIT, as_of: AsOf = None,
) -> Page[StoredValue]:  # fmt: skip
    """The values of a vessel as stored, oldest first, with what revised them last."""
    place = open_cursor(cursor)
    store = request.app.state.store
    values, following, known = read_back.values(store, site, vessel, (first, last), source, place, limit, as_of)
    after = None if following is None else cursor_of(*following, known)
    return Page[StoredValue].model_validate({"items": values, "next": after, "known_at": known})
