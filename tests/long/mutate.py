"""Small faults put into the program one by one: how many of them do the tests notice?

Not part of the normal run: ``python tests/long/mutate.py [--seconds S] [--seed N] [--state FILE]
[PACKAGE ...]`` (1500, 1, mutants.jsonl, and `light detect plan`). Every comparison, sum, product, number,
truth value and `return` of the packages can be made wrong; the sample is drawn from all of them by the seed
and worked through until the time is up. Each fault lives in a child process alone, no file is changed, and
the tests of its layer are run on it: first those of its own module, then the others. Results are appended to
the state file, from which an interrupted run goes on; lines left over from another program are passed over.
At the end the score and the faults that nothing noticed are printed.
"""

from __future__ import annotations

import argparse
import ast
import copy
import importlib.abc
import importlib.util
import json
import os
import random
import resource
import signal
import sys
import time
from collections.abc import Iterator
from dataclasses import asdict, dataclass
from pathlib import Path

ROOT = Path(__file__).parents[2]
SOURCE = ROOT / "src" / "coldglow"
CHILD_S = 60  # of processor time; the tests of a layer take 10 to 20
CLOCKS = "not fast and not little_time and not takes_little"  # tests that measure time say nothing here
COMPARE = {
    ast.Lt: ast.LtE,
    ast.LtE: ast.Lt,
    ast.Gt: ast.GtE,
    ast.GtE: ast.Gt,
    ast.Eq: ast.NotEq,
    ast.NotEq: ast.Eq,
    ast.Is: ast.IsNot,
    ast.IsNot: ast.Is,
    ast.In: ast.NotIn,
    ast.NotIn: ast.In,
}
ARITHMETIC = {
    ast.Add: ast.Sub,
    ast.Sub: ast.Add,
    ast.Mult: ast.Div,
    ast.Div: ast.Mult,
    ast.FloorDiv: ast.Mult,
    ast.Mod: ast.Mult,
    ast.Pow: ast.Mult,
    ast.MatMult: None,
    ast.BitAnd: ast.BitOr,
    ast.BitOr: ast.BitAnd,
}


@dataclass(frozen=True)
class Fault:
    """One change of one expression."""

    file: str  # below the package's source
    line: int
    column: int
    kind: str
    before: str
    after: str


def faults(file: str) -> Iterator[tuple[Fault, tuple[int, int]]]:
    """Yield every fault that the module can have, with its place in the tree and which way it is."""
    tree = ast.parse((SOURCE / file).read_text(encoding="utf-8"))
    silent = {id(part) for node in ast.walk(tree) for part in _silent(node)}
    for place, node in enumerate(ast.walk(tree)):
        for way in range(2):
            changed = copy.deepcopy(node)
            kind = "" if id(node) in silent else _change(changed, way)
            if not kind:
                break
            before, after = ast.unparse(node)[:120], ast.unparse(changed)[:120]
            yield Fault(file, node.lineno, node.col_offset, kind, before, after), (place, way)


def faulty(file: str, where: tuple[int, int]) -> ast.Module:
    """Return the tree of a module that has the fault at that place."""
    tree = ast.parse((SOURCE / file).read_text(encoding="utf-8"))
    for node in [node for place, node in enumerate(ast.walk(tree)) if place == where[0]]:
        _change(node, where[1])
    return ast.fix_missing_locations(tree)


def _silent(node: ast.AST) -> Iterator[ast.AST]:
    """Yield what no test can notice: annotations, docstrings, and sentences for people."""
    annotated = [getattr(node, "annotation", None), getattr(node, "returns", None)]
    if isinstance(node, ast.JoinedStr):
        annotated.append(node)
    if isinstance(node, ast.If) and ast.unparse(node.test) == "TYPE_CHECKING":
        annotated.append(node)
    for part in annotated:
        if part is not None:
            yield from ast.walk(part)


def _change(node: ast.AST, way: int) -> str:
    """Change the node in place in one of its ways; return the kind, '' when there is no such way."""
    if isinstance(node, ast.Compare) and way == 0 and type(node.ops[0]) in COMPARE:
        node.ops[0] = COMPARE[type(node.ops[0])]()
        return "comparison"
    if isinstance(node, ast.BinOp) and way == 0 and ARITHMETIC.get(type(node.op)):
        node.op = ARITHMETIC[type(node.op)]()
        return "arithmetic"
    if isinstance(node, ast.BoolOp) and way == 0:
        node.op = ast.Or() if isinstance(node.op, ast.And) else ast.And()
        return "and/or"
    if isinstance(node, ast.UnaryOp) and way == 0 and isinstance(node.op, ast.USub | ast.Not | ast.Invert):
        node.op = ast.UAdd() if isinstance(node.op, ast.USub) else node.op
        if not isinstance(node.op, ast.UAdd):
            node.operand = ast.UnaryOp(type(node.op)(), node.operand)
        return "sign or not"
    if isinstance(node, ast.Constant) and type(node.value) is bool and way == 0:
        node.value = not node.value
        return "truth value"
    if isinstance(node, ast.Constant) and type(node.value) in (int, float) and way < 2:
        exact = type(node.value) is int or node.value in (0.0, 0.5, 1.0, 2.0, 4.0)
        changed = node.value + (1, -1)[way] if exact else node.value * (1.5, 0.7)[way]
        node.value = changed
        return "number"
    if isinstance(node, ast.Return) and node.value is not None and way == 0:
        node.value = ast.Constant(None)
        return "return"
    if isinstance(node, ast.IfExp) and way == 0:
        node.body, node.orelse = node.orelse, node.body
        return "condition"
    return ""


class Changed(importlib.abc.MetaPathFinder, importlib.abc.Loader):
    """Imports one module from a changed tree instead of its file."""

    def __init__(self, name: str, path: Path, tree: ast.Module) -> None:
        self.name, self.path, self.tree = name, path, tree

    def find_spec(self, name, path=None, target=None):
        if name != self.name:
            return None
        return importlib.util.spec_from_file_location(name, self.path, loader=self)

    def create_module(self, spec):
        return None

    def exec_module(self, module):
        exec(compile(self.tree, str(self.path), "exec"), module.__dict__)


def noticed(fault: Fault, where: tuple[int, int] | None) -> str:
    """Return how the tests took the fault: 'killed', 'late' (it ran for ever) or 'survived'.

    Without a place nothing is changed.
    """
    child = os.fork()
    if child == 0:
        resource.setrlimit(resource.RLIMIT_AS, (6 << 30, 6 << 30))
        resource.setrlimit(resource.RLIMIT_CPU, (CHILD_S, CHILD_S))
        quiet = os.open(os.devnull, os.O_WRONLY)
        os.dup2(quiet, 1)
        os.dup2(quiet, 2)
        os._exit(_tests(fault, faulty(fault.file, where or (-1, 0))))
    _, status = os.waitpid(child, 0)
    if os.WIFSIGNALED(status) and os.WTERMSIG(status) in (signal.SIGXCPU, signal.SIGKILL):
        return "late"
    return "survived" if os.waitstatus_to_exitcode(status) == 0 else "killed"


def _tests(fault: Fault, tree: ast.Module) -> int:
    """Run the tests of the fault's module, then those of its layer; return 0 when all of them pass."""
    import pytest

    os.chdir(ROOT)
    name = "coldglow." + fault.file.removesuffix(".py").replace("/", ".")
    sys.meta_path.insert(0, Changed(name, SOURCE / fault.file, tree))
    layer, module = fault.file.split("/")
    own = ROOT / "tests" / layer / f"test_{module}"
    words = ["-x", "-q", "-p", "no:cacheprovider", "-p", "no:xdist", "-k", CLOCKS]
    folder = [str(ROOT / "tests" / layer)]
    if own.is_file():
        folder = [str(own), *sorted(str(path) for path in own.parent.glob("test_*.py") if path != own)]
    return int(pytest.main([*words, *folder], [Profile()]))


class Profile:
    """Properties are tried on the same examples every time."""

    def pytest_configure(self):
        from hypothesis import settings

        settings.register_profile("mutants", database=None, derandomize=True, deadline=None)
        settings.load_profile("mutants")


def sample(packages: list[str], seed: int) -> list[tuple[Fault, tuple[int, int]]]:
    """Return every fault of the packages in the order of the seed."""
    files = [f"{p}/{path.name}" for p in packages for path in sorted((SOURCE / p).glob("*.py"))]
    every = [fault for file in files if file.split("/")[1] != "__init__.py" for fault in faults(file)]
    random.Random(seed).shuffle(every)
    return every


def main() -> None:
    """Work through the sample and print the score."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("packages", nargs="*", default=["light", "detect", "plan"])
    parser.add_argument("--seconds", type=float, default=1500.0)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--state", type=Path, default=Path("mutants.jsonl"))
    parser.add_argument("--survivors", action="store_true", help="try again those that survived before")
    asked = parser.parse_args()
    import astropy.table  # noqa: F401 - what every child needs is loaded once
    import pydantic  # noqa: F401
    import scipy.interpolate
    import scipy.optimize
    import scipy.stats  # noqa: F401

    before = {}
    if asked.state.is_file():
        for row in map(json.loads, asked.state.read_text(encoding="utf-8").splitlines()):
            before[Fault(**row["fault"])] = row["end"]
    every, ends, started = sample(asked.packages, asked.seed), {}, time.monotonic()
    for file in {fault.file.split("/")[0]: fault.file for fault, _ in every}.values():
        if noticed(Fault(file, 0, 0, "nothing", "", ""), None) != "survived":
            sys.exit(f"the tests of {file.split('/')[0]} do not pass as it is")
    with asked.state.open("a", encoding="utf-8") as state:
        for fault, where in every:
            again = asked.survivors and before.get(fault) == "survived"
            if fault in before and not again:
                ends[fault] = before[fault]
                continue
            if (asked.survivors and not again) or time.monotonic() - started > asked.seconds:
                continue
            ends[fault] = noticed(fault, where)
            state.write(json.dumps({"fault": asdict(fault), "end": ends[fault]}) + "\n")
            state.flush()
    for package in asked.packages:
        of_it = [end for fault, end in ends.items() if fault.file.startswith(f"{package}/")]
        killed = sum(end != "survived" for end in of_it)
        print(f"{package}: {killed} of {len(of_it)} noticed ({100 * killed / max(len(of_it), 1):.0f} %)")
    killed = sum(end != "survived" for end in ends.values())
    print(f"in all {killed} of {len(ends)}, {len(every)} possible, seed {asked.seed}")
    for fault, end in sorted(ends.items(), key=lambda item: (item[0].file, item[0].line)):
        if end == "survived":
            print(f"  {fault.file}:{fault.line}: {fault.kind}: {fault.before}  ->  {fault.after}")


if __name__ == "__main__":
    main()
