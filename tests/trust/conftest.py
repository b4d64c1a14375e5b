"""What the tests of this folder share: small requests made of the shipped ones."""

import re
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]


@pytest.fixture
def write(tmp_path):
    """Return a function that writes a request of some nights of Uranus, with texts replaced, and its path."""

    def _write(*changes, name="request.yaml", nights=("2027-11-20", "2027-11-22"), extra=""):
        text = (ROOT / "examples" / "uranus-season.yaml").read_text(encoding="utf-8")
        text = re.sub(r"  forbidden:.*?(?=\n  step:)", "", text, flags=re.DOTALL)
        for old, new in [
            ("first: 2027-09-01", f"first: {nights[0]}"),
            ("last: 2028-03-02", f"last: {nights[1]}"),
            *changes,
        ]:
            assert text.count(old) == 1, old
            text = text.replace(old, new)
        path = tmp_path / name
        path.write_text(text + extra, encoding="utf-8")
        return path

    return _write


@pytest.fixture
def variant(tmp_path):
    """Return a function that writes a target or instrument extending a shipped one, and its path."""

    def _variant(kind, base, body):
        path = tmp_path / f"{kind}.yaml"
        path.write_text(f"format: coldglow-{kind}/1\nextends: {base}\n{body}", encoding="utf-8")
        return path

    return _variant
