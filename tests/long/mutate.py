"""Small faults put into the program one by one: how many of them do the tests notice?

Not part of the normal run: ``python tests/long/mutate.py [--seconds S] [--seed N] [--state FILE]
[PACKAGE ...]`` (1500, 1, mutants.jsonl, and `light detect plan`). Every comparison, sum, product, number,
truth value and `return` of the packages can be made wrong; the sample is drawn from all of them by the seed
and worked through until the time is up. Each fault lives in a child process alone, no file is changed, and
the tests of its layer are run on it: first the quickest of those that reach its line (measured once, before
all faults), then all others that could notice it. Results are appended to the state file, from which an
interrupted run goes on; lines left over from another program are passed over. At the end the score and the
faults that nothing noticed are printed.
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
import tempfile
import time
from collections.abc import Callable, Iterator
from dataclasses import asdict, dataclass
from importlib import import_module
from pathlib import Path

ROOT = Path(__file__).parents[2]
SOURCE = ROOT / "src" / "coldglow"
CHILD_S = 60  # of processor time; the tests of a layer take 10 to 20
QUICK = 12  # tests that are tried before all the others
KEEPS_NOTHING = ("plan",)  # no caches, no shared fixtures: who does not reach a line cannot notice it
CLOCKS = "not fast and not little_time and not takes_little"  # tests that measure time say nothing here
PRELOADED = (  # what every child needs is loaded once
    "astropy.table",
    "hypothesis.strategies",
    "pydantic",
    "pytest",
    "scipy.interpolate",
    "scipy.optimize",
    "scipy.stats",
)
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


def in_child(task: Callable[[], int], seconds: int) -> int:
    """Run the task in a silent child process with so much processor time; return its wait status."""
    child = os.fork()
    if child == 0:
        resource.setrlimit(resource.RLIMIT_AS, (6 << 30, 6 << 30))
        resource.setrlimit(resource.RLIMIT_CPU, (seconds, seconds))
        quiet = os.open(os.devnull, os.O_WRONLY)
        os.dup2(quiet, 1)
        os.dup2(quiet, 2)
        os.chdir(ROOT)
        os._exit(task())
    return os.waitpid(child, 0)[1]


def noticed(fault: Fault, where: tuple[int, int], reached: list[str]) -> str:
    """Return how the tests took the fault: 'killed', 'late' (it ran for ever) or 'survived'."""

    def task() -> int:
        name = "coldglow." + fault.file.removesuffix(".py").replace("/", ".")
        sys.meta_path.insert(0, Changed(name, SOURCE / fault.file, faulty(fault.file, where)))
        layer = fault.file.split("/")[0]
        if reached and layer in KEEPS_NOTHING:
            return run(reached)
        return (run(reached[:QUICK]) if reached else 0) or run([str(ROOT / "tests" / layer)])

    status = in_child(task, CHILD_S)
    if os.WIFSIGNALED(status) and os.WTERMSIG(status) in (signal.SIGXCPU, signal.SIGKILL):
        return "late"
    return "survived" if os.waitstatus_to_exitcode(status) == 0 else "killed"


def run(tests: list[str], *plugins: object) -> int:
    """Run tests until one fails; return 0 when all of them pass."""
    import pytest

    words = ["-x", "-q", "-p", "no:cacheprovider", "-p", "no:xdist", "-k", CLOCKS]
    words += ["--hypothesis-seed=1", "-W", "ignore:Module already imported:pytest.PytestAssertRewriteWarning"]
    return int(pytest.main([*words, *tests], [Profile(), *plugins]))


def reaching(layer: str) -> dict[str, dict[int, list[str]]]:
    """Return the tests of a layer that reach each line of each of its files, the quickest first."""
    from coverage import Coverage

    with tempfile.TemporaryDirectory() as folder:
        seconds = Path(folder) / "seconds.json"

        def task() -> int:
            coverage = Coverage(data_file=f"{folder}/lines", source=[str(SOURCE / layer)], config_file=False)
            watch = Watch(coverage)
            coverage.start()
            end = run([str(ROOT / "tests" / layer)], watch)
            coverage.stop()
            coverage.save()
            seconds.write_text(json.dumps(watch.seconds), encoding="utf-8")
            return end

        if in_child(task, 10 * CHILD_S) != 0:
            sys.exit(f"the tests of {layer} do not pass as it is")
        taken = json.loads(seconds.read_text(encoding="utf-8"))
        coverage = Coverage(data_file=f"{folder}/lines", config_file=False)
        coverage.load()
        data = coverage.get_data()
        return {
            str(Path(file).relative_to(SOURCE)): {
                line: sorted((test for test in tests if test), key=taken.__getitem__)
                for line, tests in data.contexts_by_lineno(file).items()
            }
            for file in data.measured_files()
        }


class Watch:
    """Notes for each test which lines it reaches, and how long it takes."""

    def __init__(self, coverage) -> None:
        self.coverage, self.seconds = coverage, {}

    def pytest_runtest_logstart(self, nodeid):
        self.coverage.switch_context(nodeid)
        self.seconds[nodeid] = time.monotonic()

    def pytest_runtest_logfinish(self, nodeid):
        self.seconds[nodeid] = time.monotonic() - self.seconds[nodeid]


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
    for module in PRELOADED:
        import_module(module)

    before = {}
    if asked.state.is_file():
        for row in map(json.loads, asked.state.read_text(encoding="utf-8").splitlines()):
            before[Fault(**row["fault"])] = row["end"]
    every, ends, started = sample(asked.packages, asked.seed), {}, time.monotonic()
    lines = {file: tests for layer in asked.packages for file, tests in reaching(layer).items()}
    with asked.state.open("a", encoding="utf-8") as state:
        for fault, where in every:
            again = asked.survivors and before.get(fault) == "survived"
            if fault in before and not again:
                ends[fault] = before[fault]
                continue
            if (asked.survivors and not again) or time.monotonic() - started > asked.seconds:
                continue
            ends[fault] = noticed(fault, where, lines.get(fault.file, {}).get(fault.line, []))
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
