"""Ready means: reached, and with the newest tables."""

from __future__ import annotations

from pathlib import Path

import pytest

from app.errors import Unavailable
from app.services.ready import require_ready
from app.store.engine import Store


def test_a_store_is_ready_from_its_migration_on(tmp_path: Path) -> None:
    store = Store.open(f"sqlite:///{tmp_path}/b.db")
    try:
        with pytest.raises(Unavailable, match="brimbook migrate"):
            require_ready(store)
        store.migrate()
        require_ready(store)
    finally:
        store.close()
