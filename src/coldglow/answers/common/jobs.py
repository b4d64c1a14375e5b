"""Work side by side, and how far it is."""

from __future__ import annotations

import signal
import sys
import time
from collections.abc import Iterable, Iterator
from concurrent.futures import Executor, ProcessPoolExecutor
from contextlib import contextmanager
from multiprocessing import get_context
from typing import TypeVar

from coldglow.errors import RangeError

Item = TypeVar("Item")

PATIENCE_S = 2.0


@contextmanager
def processes(jobs: int) -> Iterator[Executor | None]:
    """Give an executor of so many fresh processes; None, which means this process alone, for one job.

    Raises:
        RangeError: fewer than one job.

    """
    if jobs < 1:
        raise RangeError(f"{jobs} jobs; give 1 or more")
    if jobs == 1:
        yield None
        return
    executor = ProcessPoolExecutor(jobs, get_context("spawn"), signal.signal, (signal.SIGINT, signal.SIG_IGN))
    try:
        yield executor
    finally:
        executor.shutdown(cancel_futures=True)


def progress(items: Iterable[Item], total: int, what: str) -> Iterator[Item]:
    """Yield the items; on a terminal tell how far they are, on standard error, after two seconds."""
    if not sys.stderr.isatty():
        yield from items
        return
    from rich.console import Console
    from rich.progress import Progress

    begin, shown = time.monotonic(), Progress(console=Console(stderr=True), transient=True)
    task = shown.add_task(what, total=total)
    try:
        for item in items:
            shown.advance(task)
            if time.monotonic() - begin > PATIENCE_S:
                shown.start()
            yield item
    finally:
        shown.stop()
