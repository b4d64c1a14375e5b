"""A headless browser driven through a pipe by the DevTools protocol, with the standard library only."""

from __future__ import annotations

import contextlib
import fcntl
import json
import os
import select
import shutil
import subprocess
import sys
import time
from collections.abc import Iterator
from pathlib import Path
from typing import Any

FLAGS = (
    "--headless", "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run",
    "--disable-background-networking", "--disable-component-update", "--disable-sync", "--hide-scrollbars",
    "--remote-debugging-pipe",
)  # fmt: skip

_START = """
import os, sys
os.dup2(int(sys.argv[1]), 3)
os.dup2(int(sys.argv[2]), 4)
os.execvp(sys.argv[3], sys.argv[3:])
"""


def find_browser() -> str | None:
    """Return the path of a browser that speaks the protocol, or None."""
    return next((path for name in ("chromium", "chromium-browser") if (path := shutil.which(name))), None)


class Tab:
    """One page: calls are answered in order, events are collected."""

    def __init__(self, to: int, answers: int) -> None:
        """Open an empty page and ask for its events."""
        self.to, self.answers, self.buffer, self.last = to, answers, b"", 0
        self.session = ""
        self.events: list[dict[str, Any]] = []
        target = self.call("Target.createTarget", url="about:blank")["targetId"]
        self.session = self.call("Target.attachToTarget", targetId=target, flatten=True)["sessionId"]
        for domain in ("Page", "Runtime", "Log", "Network"):
            self.call(f"{domain}.enable")

    def call(self, method: str, **parameters: Any) -> dict[str, Any]:
        """Send a command and return its result."""
        self.last += 1
        message: dict[str, Any] = {"id": self.last, "method": method, "params": parameters}
        if self.session:
            message["sessionId"] = self.session
        os.write(self.to, json.dumps(message).encode() + b"\0")
        while True:
            answer = self._read(30.0)
            if answer.get("id") == self.last:
                assert "error" not in answer, answer
                return dict(answer["result"])
            self.events.append(answer)

    def _read(self, wait_s: float) -> dict[str, Any]:
        while b"\0" not in self.buffer:
            ready, _, _ = select.select([self.answers], [], [], wait_s)
            if not ready:
                raise TimeoutError("the browser does not answer")
            part = os.read(self.answers, 1 << 20)
            if not part:
                raise EOFError("the browser has gone")
            self.buffer += part
        message, _, self.buffer = self.buffer.partition(b"\0")
        return dict(json.loads(message))

    def open(self, path: Path) -> None:
        """Load a file and wait until it is there."""
        self.call("Page.navigate", url=path.resolve().as_uri())
        end = time.monotonic() + 60
        while self.value("document.readyState + location.protocol") != "completefile:":
            if time.monotonic() > end:
                raise TimeoutError(f"{path} does not load")
            time.sleep(0.05)

    def value(self, expression: str) -> Any:
        """Return the value of an expression in the page."""
        answer = self.call("Runtime.evaluate", expression=expression, returnByValue=True, awaitPromise=True)
        assert "exceptionDetails" not in answer, answer
        return answer["result"].get("value")

    def named(self, method: str) -> list[dict[str, Any]]:
        """Return the parameters of the events of one kind so far."""
        return [event["params"] for event in self.events if event.get("method") == method]


@contextlib.contextmanager
def browser_tab(program: str, profile: Path) -> Iterator[Tab]:
    """Run the browser with a profile of its own and yield a tab; the browser is ended afterwards."""
    from_us, to_browser = os.pipe()
    from_browser, to_us = os.pipe()
    # the browser reads its commands from descriptor 3 and answers on 4
    ends = [fcntl.fcntl(end, fcntl.F_DUPFD_CLOEXEC, 10) for end in (from_us, to_us)]
    process = subprocess.Popen(
        [sys.executable, "-c", _START, *map(str, ends), program, *FLAGS, f"--user-data-dir={profile}"],
        pass_fds=ends,
        stdin=subprocess.DEVNULL,
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
    )
    for end in ends:
        os.close(end)
    os.close(from_us)
    os.close(to_us)
    try:
        yield Tab(to_browser, from_browser)
    finally:
        os.close(to_browser)  # the browser ends when its pipe does
        try:
            process.wait(10)
        except subprocess.TimeoutExpired:
            process.kill()
            process.wait()
        os.close(from_browser)
