"""Whether the service can work."""

from __future__ import annotations

from app.errors import Unavailable
from app.store.engine import Store
from app.store.schema import is_current


def require_ready(store: Store) -> None:
    """Raise ``Unavailable`` (or the store's own refusal) unless requests can be answered."""
    with store.reading() as connection:
        current = is_current(connection)
    if not current:
        raise Unavailable("The store's tables are not up to date; run brimbook migrate.", code="not_migrated")
