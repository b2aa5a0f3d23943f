"""The one place that asks what time it is, so that a test can say it."""

from __future__ import annotations

import time


class Clock:
    """The machine's clock; a test hands its own to ``create_app``."""

    def now(self) -> int:
        """Instant in microseconds since 1970-01-01T00:00:00Z."""
        return time.time_ns() // 1_000
