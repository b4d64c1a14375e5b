"""For every test: no network beyond this machine, no settings of the user's, a working folder of its own."""

import os
import socket

import pytest
from hypothesis import settings

# A busy machine is no failure. Continuous integration tries the same cases each time, so that it judges the
# change before it; everybody else's runs go on looking for new ones.
settings.register_profile("busy", deadline=None, derandomize="CI" in os.environ)
settings.load_profile("busy")

LOCAL = {"127.0.0.1", "::1", "localhost"}


@pytest.fixture(autouse=True)
def no_network(monkeypatch):
    """Refuse every connection that leaves the machine."""
    connect = socket.socket.connect

    def guarded(self, address):
        if self.family != socket.AF_UNIX and address[0] not in LOCAL:
            raise AssertionError(f"a test tried to reach {address}")
        return connect(self, address)

    monkeypatch.setattr(socket.socket, "connect", guarded)


@pytest.fixture(autouse=True)
def own_folder(monkeypatch, tmp_path):
    """Work in an empty folder, without the user's own descriptions."""
    monkeypatch.delenv("COLDGLOW_PATH", raising=False)
    monkeypatch.chdir(tmp_path)
    os.environ.setdefault("HOME", str(tmp_path))
