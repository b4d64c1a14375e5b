"""Signs of life on a terminal, for work that lasts: on standard error, nothing where it is no terminal."""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from threading import Timer

PATIENCE_S = 2.0


@contextmanager
def waiting(name: str) -> Iterator[None]:
    """Show after two seconds that something is being worked out, until the block ends."""
    if not sys.stderr.isatty():
        yield
        return
    from rich.console import Console

    status = Console(stderr=True).status(f"{name}: working")
    timer = Timer(PATIENCE_S, status.start)
    timer.daemon = True
    timer.start()
    try:
        yield
    finally:
        timer.cancel()
        timer.join()
        status.stop()


def teller(name: str) -> Callable[[str], None]:
    """Return a function that tells each step of a long piece of work as it begins."""

    def tell(step: str) -> None:
        if sys.stderr.isatty():
            print(f"{name}: {step}", file=sys.stderr, flush=True)

    return tell
