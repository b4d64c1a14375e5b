"""Rows of the reference files of these tests."""

from __future__ import annotations

import csv
from pathlib import Path

import pytest

FOLDER = Path(__file__).parents[1] / "data" / "light"


@pytest.fixture(scope="session")
def light_rows():
    def rows(name: str) -> list[dict[str, str]]:
        with (FOLDER / name).open(encoding="utf-8") as file:
            return list(csv.DictReader(line for line in file if not line.startswith("#")))

    return rows
