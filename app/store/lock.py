"""One writer at a time beside a SQLite file: threads of this process, and processes of this machine."""

from __future__ import annotations

import os
import sys
import threading
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

POLL_S = 0.002


class LockTimeout(Exception):  # noqa: N818
    """Another writer kept the lock for longer than this one could wait."""


class LockUnusable(Exception):  # noqa: N818
    """The lock file cannot be made or opened; the cause says why."""


class WriterLock:
    """A lock file; it is held from before the transaction begins until after it is committed.

    SQLite alone lets a waiting writer starve (its busy handler only polls) and, in versions before
    3.51.3, two connections that write and checkpoint at once can lose pages. The file stays: removing
    it would let two processes hold locks on two files of one name.
    """

    def __init__(self, path: Path, timeout_s: float) -> None:
        self._path = path
        self._timeout_s = timeout_s
        self._threads = threading.Lock()

    @contextmanager
    def held(self) -> Iterator[None]:
        """Wait for the lock, and hold it."""
        deadline = time.monotonic() + self._timeout_s
        if not self._threads.acquire(timeout=self._timeout_s):
            raise LockTimeout
        try:
            handle = _opened(self._path)
            try:
                while not _try(handle):
                    if time.monotonic() > deadline:
                        raise LockTimeout
                    time.sleep(POLL_S)
                yield
            finally:
                os.close(handle)  # which releases it
        finally:
            self._threads.release()


def _opened(path: Path) -> int:
    try:
        return os.open(path, os.O_RDWR | os.O_CREAT | getattr(os, "O_CLOEXEC", 0), 0o666)
    except OSError as error:
        raise LockUnusable from error


if sys.platform == "win32":
    import msvcrt

    def _try(handle: int) -> bool:
        try:
            msvcrt.locking(handle, msvcrt.LK_NBLCK, 1)
        except OSError:
            return False
        return True
else:
    import fcntl

    def _try(handle: int) -> bool:
        try:
            fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except BlockingIOError:
            return False
        return True
