"""``brimbook``: every verb is a few lines here; what it does stands in ``services``.

Exit codes: 0 done, and balanced where that is the question; 10 done, an imbalance was flagged;
11 done, incomplete; 64 usage; 69 the store cannot be reached; 70 a fault.
"""

from __future__ import annotations

import os
import sys
import traceback
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from datetime import date
from pathlib import Path

import click
import uvicorn

from app.clock import Clock
from app.errors import AppError
from app.services import close, report, show
from app.services.load import FolderError, Loaded, rows_in
from app.services.load import load as load_folder
from app.settings import PREFIX, Settings, data_folder, from_environment, listing, without_password
from app.store.engine import DiskFull, Store, StoreUnavailable

DONE, FLAGGED, INCOMPLETE, USAGE, UNREACHABLE, FAULT = 0, 10, 11, 64, 69, 70
ERRORS_SHOWN = 20  # of a folder; all are counted

HELP = """Readings of tanks and pressure vessels in; mass with its uncertainty, and books closed
every night, out.

\b
A first look, on a site that is made up:
  brimbook demo                    loads a month, closes it, serves it

\b
The same with your own:
  brimbook serve                   then PUT sites, substances, vessels; POST readings
  brimbook load FOLDER             or load them all from definitions and CSV files
  brimbook close --site S --day D  the nightly job: 0 balanced, 10 flagged, 11 incomplete

Nothing has to be set: the store is one SQLite file in your data folder. `brimbook settings`
lists what can be set, `http://127.0.0.1:8321/openapi.json` every path of the service.

\b
Exit codes: 0 done, 10 an imbalance was flagged, 11 incomplete, 64 usage,
69 the store cannot be reached, 70 a fault.
"""


@click.group(help=HELP, context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
def brimbook() -> None:
    """The group that all verbs hang on."""


@brimbook.command()
@click.option("--host", default="127.0.0.1", show_default=True, help="Address to listen on.")
@click.option("--port", default=8321, show_default=True, type=click.IntRange(0, 65535), help="Port.")
@click.option("--workers", default=1, show_default=True, type=click.IntRange(1), help="Processes.")
def serve(host: str, port: int, workers: int) -> None:
    """Serve the REST API until stopped (Ctrl-C).

    Requests must name this host by one of BRIMBOOK_HOSTS: loopback names, unless set. More than one
    worker needs PostgreSQL: an SQLite file has one writer.
    """
    _serve(host, port, workers)


def _serve(host: str, port: int, workers: int) -> None:
    settings = _settings()
    if workers > 1 and settings.is_sqlite:
        raise click.UsageError(
            "--workers above 1 needs PostgreSQL: SQLite takes one process at a time. "
            "Leave --workers out, or set BRIMBOOK_DATABASE_URL to postgresql+psycopg://…"
        )
    if settings.migrate_at_start:
        _migrate(settings)  # in this process, so that a store out of reach is an exit code and a sentence
    uvicorn.run(
        "app.main:served",
        factory=True,
        host=host,
        port=port,
        workers=workers,
        http="app.edge.deadline:DeadlineProtocol",
        ws="none",
        limit_concurrency=settings.max_connections,
        log_config=None,
        access_log=False,
        server_header=False,
    )


@brimbook.command()
def migrate() -> None:
    """Bring the store's tables up to date; harmless when they are."""
    settings = _settings()
    _migrate(settings)
    click.echo(f"The tables of {without_password(settings.database_url)} are up to date.")


@brimbook.command()
@click.argument("folder", type=click.Path(exists=True, file_okay=False, path_type=Path))
def load(folder: Path) -> int:
    """Load a site from FOLDER: its definitions, its CSV readings, its transfers.

    The folder's name is the site's id. It holds site.json, substances/, vessels/ and meters/ (the file's
    name is the id), readings/*.csv with columns named as the fields of a reading, and transfers.json.
    Loading it again changes nothing.
    """
    with _store(_settings()) as store:
        loaded = _load(store, folder)
    return FAULT if loaded.rejected else DONE


@brimbook.command("close")
@click.option("--site", required=True, help="The site's id.")
@click.option("--day", required=True, help="The local date on which the day began: 2026-03-14.")
def close_day(site: str, day: str) -> int:
    """Close a day: the nightly job. 0 balanced, 10 an imbalance was flagged, 11 incomplete."""
    try:
        date.fromisoformat(day)
    except ValueError:
        raise click.UsageError("--day is a date such as 2026-03-14") from None
    with _store(_settings()) as store:
        body, _ = close.close(store, Clock(), site, day)
    for line in (*report.night(body), *report.table(body)):
        click.echo(line)
    return FLAGGED if body["status"] == "imbalanced" else DONE if body["complete"] else INCOMPLETE


@brimbook.command()
@click.option("--serve/--no-serve", "and_serve", default=True, help="Serve the demo until stopped, or end.")
@click.option("--port", default=8321, show_default=True, type=click.IntRange(0, 65535), help="Port.")
def demo(and_serve: bool, port: int) -> int:
    """Load an invented site, close its month, say what stands out, and serve it.

    It lives in a database of its own, made anew each time, unless BRIMBOOK_DATABASE_URL is set.
    """
    if f"{PREFIX}DATABASE_URL" not in os.environ:
        os.environ[f"{PREFIX}DATABASE_URL"] = f"sqlite:///{show.fresh_file(data_folder())}"
    with _store(_settings()) as store:
        _load(store, show.FOLDER)
        for line in show.close_month(store, Clock()):
            click.echo(line)
    if and_serve:
        click.echo(f"Serving http://127.0.0.1:{port}/v1/sites/{show.FOLDER.name}/inventory until stopped (Ctrl-C).")
        _serve("127.0.0.1", port, 1)
    return DONE


def _load(store: Store, folder: Path) -> Loaded:
    """Load a folder under a bar with its rate and the time that remains; on a pipe, a line at the end."""
    total = rows_in(folder)
    hidden = not sys.stderr.isatty()
    with click.progressbar(length=total, label=f"Loading {folder.name}", hidden=hidden, file=sys.stderr,
                           show_pos=True, show_eta=True) as bar:  # fmt: skip
        try:
            loaded = load_folder(store, Clock(), folder, lambda _, rows: bar.update(rows))
        except FolderError as refused:
            raise click.ClickException(str(refused)) from None
    done, moves = loaded.readings, loaded.transfers
    click.echo(
        f"Loaded {loaded.site}: {sum(loaded.definitions.values())} definitions, {done.stored:,} readings stored, "
        f"{done.revised:,} revised, {done.unchanged:,} unchanged, {sum(moves.values()):,} transfers, "
        f"{loaded.rejected:,} rows rejected."
    )
    for line in loaded.errors[:ERRORS_SHOWN]:
        click.echo(f"  {line}", err=True)
    return loaded


@contextmanager
def _store(settings: Settings) -> Iterator[Store]:
    """The store, brought up to date and closed at the end; refusals of the service become sentences."""
    store = Store.open(settings.database_url)
    try:
        store.migrate()
        yield store
    except AppError as refused:
        raise click.ClickException(refused.detail) from None
    finally:
        store.close()


@brimbook.command("settings")
def show_settings() -> None:
    """List every setting: its value now, its default and its unit. Passwords are not shown."""
    for name, value, default, description in listing(_settings()):
        click.echo(f"{name}={value}")
        click.echo(f"    {description}; default: {default}")


def _settings() -> Settings:
    try:
        return from_environment()
    except ValueError as refused:
        raise click.UsageError(str(refused)) from None


def _migrate(settings: Settings) -> None:
    store = Store.open(settings.database_url)
    try:
        store.migrate()
    finally:
        store.close()


def run(arguments: Sequence[str] | None = None) -> int:
    """Run one verb; its exit code.

    Parameters
    ----------
    arguments : sequence of str, optional
        The words after ``brimbook``; those of the command line if left out.
    """
    try:
        code = brimbook.main(args=arguments, prog_name="brimbook", standalone_mode=False)
    except click.UsageError as mistake:
        mistake.show()
        return USAGE
    except click.ClickException as failure:
        failure.show()
        return FAULT
    except (click.Abort, KeyboardInterrupt):
        click.echo("Stopped.", err=True)
        return 130
    except (StoreUnavailable, DiskFull) as failure:
        click.echo(f"The store cannot be reached: {failure}", err=True)
        return UNREACHABLE
    except SystemExit as stopped:  # the server's own: a port in use, a start that failed
        return FAULT if stopped.code else DONE
    except Exception:
        traceback.print_exc()
        return FAULT
    return code if isinstance(code, int) else DONE


def main() -> None:
    """The program ``brimbook``."""
    sys.exit(run())


if __name__ == "__main__":
    main()
