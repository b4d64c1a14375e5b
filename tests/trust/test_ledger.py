"""The ledger of checks in the project guide names tests that exist, for every module that computes."""

import ast
import re
from pathlib import Path

ROOT = Path(__file__).parents[2]
LAYERS = ("sky", "light", "detect", "plan")


def rows():
    """Yield the cells of every row of the ledger's table."""
    guide = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
    ledger = guide.split("\n## Ledger of checks\n", 1)[1].split("\n## ", 1)[0]
    lines = [line for line in ledger.splitlines() if line.startswith("|")]
    for line in lines[2:]:
        yield [cell.strip() for cell in line.strip("|").split("|")]


def names_in(file):
    tree = ast.parse((ROOT / "tests" / file).read_text(encoding="utf-8"))
    return {node.name for node in ast.walk(tree) if isinstance(node, ast.FunctionDef)}


def test_every_test_of_the_ledger_exists():
    count = 0
    for row in rows():
        assert len(row) == 5, row
        assert row[2], row
        assert row[3], row
        file, name = re.fullmatch(r"`([\w/]+\.py)::(test_\w+)`", row[4]).groups()
        assert name in names_in(file), row[4]
        count += 1
    assert count > 50


def test_every_module_of_the_ledger_exists():
    for row in rows():
        for name in re.findall(r"`([a-z_/]+)`", row[0]):
            assert (ROOT / "src" / "coldglow" / f"{name}.py").is_file(), name


PARTS = {  # no formula of their own: parts of the modules that stand in the ledger
    "sky/lattice": "sky/place",
    "sky/vectors": "sky/place",
    "light/average": "light/atmosphere",
    "light/table": "light/atmosphere",
    "detect/bench": "detect/exposure",
    "detect/detail": "detect/counts",
    "plan/compare": "plan/goal",
    "plan/demand": "plan/cover",
    "plan/multicover": "plan/cover",
    "plan/reach": "plan/cover",
}


def test_every_module_that_computes_has_a_row():
    listed = {name for row in rows() for name in re.findall(r"`([a-z_/]+)`", row[0])}
    assert set(PARTS.values()) <= listed
    for layer in LAYERS:
        for path in (ROOT / "src" / "coldglow" / layer).glob("*.py"):
            name = f"{layer}/{path.stem}"
            assert path.stem == "__init__" or name in listed or name in PARTS, name
