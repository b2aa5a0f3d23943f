"""One holder at a time, among threads and among processes."""

from __future__ import annotations

import multiprocessing
import os
import threading
import time
from pathlib import Path
from typing import Any

import pytest

from app.store.lock import LockTimeout, LockUnusable, WriterLock


def add(path: Path, counter: Path, times: int) -> None:
    lock = WriterLock(path, 30)
    for _ in range(times):
        with lock.held():
            value = int(counter.read_text())
            time.sleep(0.0005)
            counter.write_text(str(value + 1))


def test_processes_and_threads_take_turns(tmp_path: Path) -> None:
    path, counter = tmp_path / "lock", tmp_path / "counter"
    counter.write_text("0")
    context = multiprocessing.get_context("fork")
    processes = [context.Process(target=add, args=(path, counter, 20)) for _ in range(3)]
    for process in processes:
        process.start()
    threads = [threading.Thread(target=add, args=(path, counter, 20)) for _ in range(3)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join(timeout=30)
    for process in processes:
        process.join(timeout=30)
    assert counter.read_text() == "120"


def test_a_lock_that_is_kept_is_waited_for_no_longer_than_agreed(tmp_path: Path) -> None:
    holder, same, other = WriterLock(tmp_path / "lock", 1), None, WriterLock(tmp_path / "lock", 0.05)
    with holder.held(), pytest.raises(LockTimeout), other.held():
        pass
    same = WriterLock(tmp_path / "lock", 0.05)
    refused: list[Any] = []

    def second() -> None:
        try:
            with same.held():
                refused.append(False)
        except LockTimeout:
            refused.append(True)

    with same.held():
        thread = threading.Thread(target=second)
        thread.start()
        thread.join(timeout=5)
    assert refused == [True]
    with same.held(), pytest.raises(LockTimeout), other.held():
        pass
    with other.held():
        pass


def hold_and_die(path: Path, ready: Any) -> None:
    with WriterLock(path, 5).held():
        ready.set()
        os._exit(9)  # as a kill would: nothing is cleaned up


def test_a_holder_that_dies_gives_the_lock_back(tmp_path: Path) -> None:
    context = multiprocessing.get_context("fork")
    ready = context.Event()
    process = context.Process(target=hold_and_die, args=(tmp_path / "lock", ready))
    process.start()
    assert ready.wait(10)
    process.join(timeout=10)
    with WriterLock(tmp_path / "lock", 1).held():
        pass


def test_a_lock_file_that_cannot_be_made_says_so(tmp_path: Path) -> None:
    with pytest.raises(LockUnusable), WriterLock(tmp_path / "no" / "folder", 1).held():
        pass
