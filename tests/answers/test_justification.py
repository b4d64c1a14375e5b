"""The text for the proposal says what was found, and TeX takes it."""

import re
import shutil
import subprocess

import numpy as np
import pytest

from coldglow.answers.planning.headline import measured, quickest, time_entry
from coldglow.answers.planning.justification import justification_of
from coldglow.report import words
from coldglow.report.proposal import justification_markdown


@pytest.fixture(scope="module")
def markdown(small):
    return (small.folder / "justification.md").read_text(encoding="utf-8")


def test_it_holds_the_numbers_of_the_answers(small, markdown):
    best = quickest(small.found.exposed)
    assert words.duration(best.needs[0].clock_s) in markdown
    assert str(small.found.nights.header["nights"]) in markdown
    entry = measured(best)["temperature"]
    assert entry.random_error == pytest.approx(
        float(
            np.interp(
                best.needs[0].clock_s / 3600.0, best.result["clock_time"], best.result["temperature_error"]
            )
        ),
        rel=0.1,
    )
    assert f"± {words.quantity(entry.random_error, 'K', 2)} (random)" in markdown
    assert f"± {words.quantity(entry.systematic_error, 'K', 2)} (systematic)" in markdown


def test_every_method_that_it_names_is_in_the_bibliography(small, markdown):
    text = justification_of(small.found)
    bibliography = (small.folder / "references.bib").read_text(encoding="utf-8")
    keys = set(re.findall(r"@article\{(\w+),", bibliography))
    assert keys == {reference.key for reference in text.cited()}
    assert {"archinal2018", "drossart1989", "young1994", "tegmark1997", "gabriel1962"} <= keys
    for reference in text.cited():
        assert reference.full in markdown


def test_it_speaks_to_a_committee_not_to_a_user(markdown):
    assert "coldglow" not in markdown
    assert "We request" in markdown


def test_it_lists_the_stretches(small, markdown):
    for stretch in small.found.stretches:
        assert stretch.start in markdown


def test_a_brighter_planet_takes_less_time(small):
    for each in small.found.exposed:
        for need, (bright, faint) in zip(each.needs, each.brightness.random_s, strict=True):
            assert bright < need.clock_s < faint
        for need, (bright, faint) in zip(each.needs, each.brightness.systematic_s, strict=True):
            assert bright < need.clock_s < faint
        entry = time_entry(each, 0)
        assert "random" in entry.text
        assert "systematic" in entry.text


def test_a_hopeless_request_says_so(small):
    from dataclasses import replace

    from coldglow.answers.planning.findings import find_out
    from coldglow.sky.stars import load_standards

    goal = replace(small.request.goal, snr=1e6, probability=0.5)
    deep = replace(small.request, goal=goal, coverage=replace(small.request.coverage, asked=False))
    text = justification_markdown(justification_of(find_out(deep, load_standards(), lambda step: None)))
    assert "never reached" in text
    assert "The goal is not reached" in text


@pytest.mark.skipif(
    shutil.which("pdflatex") is None or shutil.which("bibtex") is None,
    reason="no TeX installation is present",
)
@pytest.mark.parametrize("alone", [True, False])
def test_tex_takes_it_alone_and_by_input(small, tmp_path, alone):
    for name in ("justification.tex", "references.bib"):
        shutil.copy(small.folder / name, tmp_path)
    (tmp_path / "outer.tex").write_text(
        "\\documentclass{article}\\usepackage[utf8]{inputenc}\\usepackage[T1]{fontenc}\\begin{document}\n"
        "Before.\\input{justification}After.\\bibliographystyle{plain}\\bibliography{references}\\end{document}\n",
        encoding="utf-8",
    )
    name = "justification" if alone else "outer"
    latex = ["pdflatex", "-interaction=nonstopmode", "-halt-on-error", "-no-shell-escape", name]
    for command in (latex, ["bibtex", name], latex, latex):
        run = subprocess.run(
            command, cwd=tmp_path, capture_output=True, text=True, errors="replace", check=False
        )
        assert run.returncode == 0, run.stdout[-2000:]
    assert "undefined" not in run.stdout
    assert (tmp_path / f"{name}.pdf").stat().st_size > 5000
