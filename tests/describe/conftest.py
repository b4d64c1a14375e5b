"""What the tests of this folder share: the strategies beside it, and a scratch folder to work in."""

import sys
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parent.parent))

REPOSITORY = Path(__file__).parents[2]


@pytest.fixture
def repository():
    return REPOSITORY


@pytest.fixture
def write(tmp_path, monkeypatch):
    """Return a function that writes a description into the (empty) working folder and gives its path."""
    monkeypatch.chdir(tmp_path)
    monkeypatch.delenv("COLDGLOW_PATH", raising=False)

    def write(name, text):
        path = tmp_path / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(text, encoding="utf-8")
        return path

    return write
