"""A slice of the long runs of `tests/long/`: wrong files and wrong words end in sentences."""

import importlib
import socket
import subprocess
import sys
from pathlib import Path

import pytest

from coldglow.describe.load import load_any
from coldglow.errors import DescriptionError


@pytest.fixture
def long_run(monkeypatch):
    """Return a function that gives one of the long runs as a module."""
    monkeypatch.setattr(sys, "path", [str(Path(__file__).parents[1] / "long"), *sys.path])
    return importlib.import_module


def test_random_files_are_records_or_problems_with_a_place(long_run, tmp_path):
    ended, slowest = long_run("fuzz").run(200, 7, 100, tmp_path / "case.yaml")
    assert sum(count for word, count in ended.items() if not word.startswith(" ")) == 200
    assert [word for word in ended if "FAULT" in word] == []
    assert ended["record"] > 10
    assert ended["problems with file and line"] > 50
    assert slowest < 60.0


def test_random_words_end_with_a_promised_status(long_run, tmp_path, monkeypatch):
    folder = tmp_path / "inside"
    folder.mkdir()
    monkeypatch.chdir(folder)
    ended, _ = long_run("fuzz_words").run(150, 11, 1000)
    assert set(ended) <= {0, 1, 2}
    assert ended[0] > 10
    assert ended[2] > 50


@pytest.mark.parametrize("event", ["writing", "starting", "compiling", "connecting"])
def test_the_guard_of_the_long_runs_can_fail(long_run, tmp_path, event):
    fuzz = long_run("fuzz")
    line = socket.socket()
    tries = {
        "writing": lambda: (tmp_path / "new").write_text("x", encoding="utf-8"),
        "starting": lambda: subprocess.run(["true"], check=True),
        "compiling": lambda: eval("1 + 1"),
        "connecting": lambda: line.connect(("127.0.0.1", 9)),
    }
    with (
        fuzz.guarded((*fuzz.FORBIDDEN, *fuzz.EXECUTION)),
        pytest.raises(AssertionError, match="a case tried"),
    ):
        tries[event]()
    line.close()


LONGEST = {
    "10 000 nights": ("  last: 2028-03-02", "  last: 2055-01-17", "at most 1100 nights"),
    "100 000 bins": ("  bins: 12", "  bins: 100000", "72"),
    "a step of a millisecond": ("  step: 5 min", "  step: 0.001 s", "10 s"),
    "the end before the start": ("  last: 2028-03-02", "  last: 2027-08-31", "before the first"),
    "billions of trials": ("  seed: 20270901", "  seed: 1\n  trials: 1000000000", "1000000"),
}


@pytest.mark.parametrize("name", LONGEST)
def test_what_would_take_endless_time_or_memory_is_refused(name, tmp_path):
    old, new, said = LONGEST[name]
    text = (Path(__file__).parents[2] / "examples" / "uranus-season.yaml").read_text(encoding="utf-8")
    assert text.count(old) == 1
    path = tmp_path / "long.yaml"
    path.write_text(text.replace(old, new), encoding="utf-8")
    line = text[: text.index(old)].count("\n") + 1 + new.count("\n")
    with pytest.raises(DescriptionError) as refused:
        load_any(path)
    assert any(problem.line == line and said in str(problem) for problem in refused.value.problems)
