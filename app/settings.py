"""Every setting of the service: ``BRIMBOOK_…`` in the environment, listed by ``brimbook settings``."""

from __future__ import annotations

import os
import re
import sys
from pathlib import Path
from typing import Annotated, Any, Literal

from pydantic import Field, ValidationError, field_validator
from pydantic_settings import BaseSettings, NoDecode, SettingsConfigDict

PREFIX = "BRIMBOOK_"
LOOPBACK = ("localhost", "127.0.0.1", "::1")
_URL = re.compile(
    r"(?P<scheme>[\w+.-]+)://(?:[^@/?#]*@)?(?P<place>(?:[\w.-]*|\[[\da-f:]+\])(?::\d+)?(?:/[\w.-]*)?)(?:\?[^@]*)?"
)


def data_folder() -> Path:
    """The folder in which programs of this user keep their data, by the custom of the system."""
    if sys.platform == "win32":
        parent = Path(os.environ.get("LOCALAPPDATA", Path.home() / "AppData" / "Local"))
    elif sys.platform == "darwin":
        parent = Path.home() / "Library" / "Application Support"
    else:
        parent = Path(os.environ.get("XDG_DATA_HOME") or Path.home() / ".local" / "share")
    return parent / "brimbook"


def default_database_url() -> str:
    """SQLite in the user's data folder."""
    return f"sqlite:///{data_folder() / 'brimbook.db'}"


class Settings(BaseSettings):
    """What can be set, each with its unit in the name or in its description."""

    model_config = SettingsConfigDict(env_prefix=PREFIX, frozen=True, extra="forbid")

    database_url: str = Field(
        default_factory=default_database_url,
        repr=False,  # it may hold a password
        pattern=r"^(sqlite(\+pysqlite)?:///.+|postgres(ql)?(\+psycopg)?://.+)$",
        description="sqlite:///FILE or postgresql+psycopg://USER@HOST/DATABASE",
    )
    hosts: Annotated[tuple[str, ...], NoDecode] = Field(
        default=LOOPBACK, description="names that requests may call this host by, separated by commas"
    )
    max_body_mb: float = Field(default=32.0, gt=0, le=4096, description="largest body, inflated [MB]")
    receive_deadline_s: float = Field(
        default=20.0, gt=0, description="time for a head, and for each 20 kB of a body [s]"
    )
    max_connections: int = Field(default=1000, ge=1, description="connections at a time; more get 503 [1]")
    migrate_at_start: bool = Field(default=True, description="bring the tables up to date before serving")
    log_level: Literal["debug", "info", "warning", "error"] = Field(
        default="info", description="least level logged: debug, info, warning or error"
    )

    @field_validator("hosts", mode="before")
    @classmethod
    def _split(cls, value: Any) -> Any:
        if not isinstance(value, str):
            return value
        return tuple(part.strip().lower() for part in value.split(",") if part.strip())

    @property
    def is_sqlite(self) -> bool:
        """Whether the store is the embedded one, which takes one process at a time."""
        return self.database_url.startswith("sqlite")


def from_environment() -> Settings:
    """The settings of this process; ``ValueError`` names what cannot be, never its value."""
    try:
        return Settings()
    except ValidationError as refused:
        errors = refused.errors(include_url=False, include_input=False)
        named = "; ".join(f"{PREFIX}{str(error['loc'][0]).upper()}: {error['msg']}" for error in errors)
        raise ValueError(f"a setting cannot be: {named}") from None


def without_password(url: str) -> str:
    """A database's URL as it may be printed: who asks, and every option, are left out."""
    if url.startswith("sqlite"):
        return url.partition("?")[0]
    parts = _URL.fullmatch(url)
    if parts is None:
        return f"{url.partition(':')[0]}://(not shown)"
    return f"{parts['scheme']}://{parts['place']}"


def listing(settings: Settings) -> list[tuple[str, str, str, str]]:
    """Name, value, default and description of each setting, as text that holds no password."""
    rows = []
    for name, field in Settings.model_fields.items():
        value = _text(name, getattr(settings, name))
        default = _text(name, field.get_default(call_default_factory=True))
        rows.append((PREFIX + name.upper(), value, default, field.description or ""))
    return rows


def _text(name: str, value: Any) -> str:
    if name == "database_url":
        return without_password(value)
    return ",".join(value) if isinstance(value, tuple) else str(value)
