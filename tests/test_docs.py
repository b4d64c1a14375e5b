"""The examples in the docstrings of what is public run, and print what they say they print."""

import doctest
import importlib
import inspect
import re
from pathlib import Path

import pytest

import coldglow
from coldglow import answers

ROOT = Path(__file__).parent.parent
FLAGS = doctest.NORMALIZE_WHITESPACE | doctest.ELLIPSIS
PUBLIC = {f"coldglow.{name}": getattr(coldglow, name) for name in coldglow.__all__}
PUBLIC |= {f"coldglow.answers.{name}": getattr(answers, name) for name in ("plan", "sky")}
NETWORK = {"coldglow.fetch"}  # asks a service: its tests have a stand-in


@pytest.fixture
def examples(monkeypatch, tmp_path):
    """A working folder with the shipped examples in it."""
    (tmp_path / "examples").symlink_to(ROOT / "examples")
    monkeypatch.chdir(tmp_path)


def run(test):
    runner = doctest.DocTestRunner(verbose=False, optionflags=FLAGS)
    said = []
    runner.run(test, out=said.append)
    assert not runner.failures, "".join(said)
    return runner.tries


@pytest.mark.parametrize("name", sorted(set(PUBLIC) - NETWORK))
def test_the_example_of_a_public_function_runs(name, examples):
    function = PUBLIC[name]
    names = importlib.import_module(function.__module__).__dict__
    found = doctest.DocTestFinder(recurse=False).find(function, name, globs=dict(names))
    assert sum(run(test) for test in found) > 0, f"{name} has no example"


@pytest.mark.parametrize("name", ["coldglow", "coldglow.report.results", "coldglow.bridges.astroplan"])
def test_the_examples_of_a_module_run(name, examples):
    module = importlib.import_module(name)
    found = [test for test in doctest.DocTestFinder().find(module) if test.examples]
    assert sum(run(test) for test in found) > 0


def test_the_python_of_the_readme_runs(examples):
    text = (ROOT / "README.md").read_text(encoding="utf-8")
    blocks = re.findall(r"^```python\n(.*?)^```$", text, re.DOTALL | re.MULTILINE)
    assert len(blocks) >= 3
    assert all(block.startswith(">>> ") for block in blocks)
    assert run(doctest.DocTestParser().get_doctest("".join(blocks), {}, "README.md", None, 0)) > 15


def test_every_public_function_says_what_it_takes_and_gives():
    for name, function in PUBLIC.items():
        assert inspect.getdoc(function), name
        assert inspect.signature(function).return_annotation is not inspect.Signature.empty, name
