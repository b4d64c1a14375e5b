from __future__ import annotations

import os
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

from coldglow.errors import OutputError
from coldglow.report.folder import check_free, report_files, write_folder
from coldglow.report.reading import read_result

CONTENTS = {"report.html": "<p>é</p>", "figures/a.pdf": b"%PDF\x00", "tables/x.ecsv": "a\n"}


class Interrupted(dict):
    """Contents that are broken off after the first file."""

    def items(self) -> Iterator:  # type: ignore[override]
        yield "report.html", "half"
        raise KeyboardInterrupt


def names(folder) -> list[str]:
    return sorted(path.name for path in folder.iterdir())


def test_a_folder_holds_what_was_given(tmp_path):
    path = write_folder(tmp_path / "plans" / "uranus", CONTENTS)
    assert (path / "report.html").read_text(encoding="utf-8") == "<p>é</p>"
    assert (path / "figures" / "a.pdf").read_bytes() == b"%PDF\x00"
    assert names(tmp_path / "plans") == ["uranus"]


def test_permissions_follow_the_umask(tmp_path):
    old = os.umask(0o027)
    try:
        path = write_folder(tmp_path / "plan", CONTENTS)
    finally:
        os.umask(old)
    assert path.stat().st_mode & 0o777 == 0o750
    assert (path / "report.html").stat().st_mode & 0o777 == 0o640


@pytest.mark.parametrize("taken", ["folder", "empty", "file", "broken link"])
def test_what_stands_there_is_refused_and_left_alone(tmp_path, taken):
    path = tmp_path / "plan"
    if taken == "file":
        path.write_text("mine")
    elif taken == "broken link":
        path.symlink_to(tmp_path / "plan2")
        path = tmp_path / "plan"
    else:
        path.mkdir()
        if taken == "folder":
            (path / "mine").write_text("mine")
    if taken == "broken link":
        # the link is followed: its target is free
        write_folder(path, CONTENTS)
        assert (tmp_path / "plan2" / "report.html").exists()
        return
    before = names(tmp_path)
    with pytest.raises(OutputError, match=r"exists already.*--force"):
        check_free(path)
    with pytest.raises(OutputError, match=r"exists already.*--force"):
        write_folder(path, CONTENTS)
    assert names(tmp_path) == before


def test_force_moves_the_old_one_aside_with_a_number(tmp_path):
    for run in range(3):
        write_folder(tmp_path / "plan", {"report.html": str(run)}, force=True)
    assert names(tmp_path) == ["plan", "plan.1", "plan.2"]
    texts = [(tmp_path / name / "report.html").read_text() for name in names(tmp_path)]
    assert texts == ["2", "0", "1"]


@pytest.mark.parametrize("force", [False, True])
def test_an_interrupted_run_leaves_nothing_half_written(tmp_path, force):
    if force:
        write_folder(tmp_path / "plan", CONTENTS)
    with pytest.raises(KeyboardInterrupt):
        write_folder(tmp_path / "plan", Interrupted(), force)
    assert names(tmp_path) == (["plan"] if force else [])
    if force:
        assert (tmp_path / "plan" / "report.html").read_text(encoding="utf-8") == "<p>é</p>"


def test_a_failing_last_step_puts_the_old_folder_back(tmp_path, monkeypatch):
    path = write_folder(tmp_path / "plan", CONTENTS)
    rename = type(path).rename

    def fail(self, target):
        if self.name.startswith("."):
            raise OSError(28, "No space left on device")
        return rename(self, target)

    monkeypatch.setattr(type(path), "rename", fail)
    with pytest.raises(OutputError, match="No space left on device"):
        write_folder(path, {"report.html": "new"}, force=True)
    assert names(tmp_path) == ["plan"]
    assert (path / "report.html").read_text(encoding="utf-8") == "<p>é</p>"


def test_a_place_that_cannot_be_written_says_why(tmp_path):
    (tmp_path / "file").write_text("")
    with pytest.raises(OutputError, match="Cannot write"):
        write_folder(tmp_path / "file" / "plan", CONTENTS)


def test_the_working_folder_is_never_moved(tmp_path, monkeypatch):
    (tmp_path / "deep").mkdir()
    monkeypatch.chdir(tmp_path / "deep")
    for place in (tmp_path / "deep", tmp_path):
        with pytest.raises(OutputError, match="the folder you work in"):
            write_folder(place, CONTENTS, force=True)


def test_a_report_becomes_the_same_files_twice(tmp_path, invented_report):
    first = report_files(invented_report(few=True))
    assert report_files(invented_report(few=True)) == first
    assert {"report.html", "figures/season.svg", "figures/season.pdf", "tables/hours.ecsv"} <= set(first)
    folder = write_folder(tmp_path / "plan", first)
    back = read_result(folder / "tables" / "hours.ecsv")
    assert len(back.table()) == 184
    assert back.header["temperature"].value == 480.0


def test_another_process_writes_the_same_bytes(tmp_path):
    script = f"""
import hashlib, importlib.util, sys
spec = importlib.util.spec_from_file_location("invented", {str(Path(__file__).with_name("conftest.py"))!r})
invented = importlib.util.module_from_spec(spec)
spec.loader.exec_module(invented)
from coldglow.report.folder import report_files
files = report_files(invented.make_report(few=True))
for name, content in sorted(files.items()):
    print(name, hashlib.sha256(content if isinstance(content, bytes) else content.encode()).hexdigest())
"""
    runs = [
        subprocess.run(
            [sys.executable, "-c", script],
            env={**os.environ, "PYTHONHASHSEED": seed, "TZ": zone, "LC_ALL": "C"},
            cwd=tmp_path,
            capture_output=True,
            text=True,
            check=True,
        ).stdout
        for seed, zone in (("1", "UTC"), ("2", "Pacific/Auckland"))
    ]
    assert runs[0] == runs[1]
    assert len(runs[0].splitlines()) == 1 + 2 * 3 + 1
