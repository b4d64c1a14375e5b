"""What the tests of this folder share: the module `sky_bodies`, and a closed network."""

import socket
import sys
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parent))


@pytest.fixture(autouse=True)
def _no_network(monkeypatch):
    def refuse(self, address):
        raise AssertionError(f"a test tried to reach {address}")

    monkeypatch.setattr(socket.socket, "connect", refuse)
