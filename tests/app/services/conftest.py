"""A site of each test's own, on both databases."""

from __future__ import annotations

import pytest

from app.store.engine import Store
from tests.app.services.plant import Plant


@pytest.fixture
def plant(store: Store, site_id: str) -> Plant:
    return Plant(store, site_id)
