"""The folder of `plan`: complete, readable, and saying what was found."""

import re
from dataclasses import replace
from html.parser import HTMLParser
from pathlib import Path

import numpy as np
import pytest

from coldglow.answers import plan
from coldglow.answers.asking.chosen import requested
from coldglow.answers.common.scenes import restricted, scenes
from coldglow.answers.planning.findings import find_out
from coldglow.answers.planning.headline import answer, verdict
from coldglow.answers.planning.paperwork import assumptions_of
from coldglow.describe.load import load_request
from coldglow.describe.resolved import assumed
from coldglow.errors import RangeError
from coldglow.report.reading import read_result
from coldglow.sky.stars import load_standards

ROOT = Path(__file__).parents[2]


class Text(HTMLParser):
    """The words of a page that people see."""

    def __init__(self):
        super().__init__()
        self.parts, self.hidden = [], 0

    def handle_starttag(self, tag, attrs):
        self.hidden += tag in ("style", "svg")

    def handle_endtag(self, tag):
        self.hidden -= tag in ("style", "svg")

    def handle_data(self, data):
        if not self.hidden:
            self.parts.append(data)


@pytest.fixture(scope="module")
def page(small):
    return (small.folder / "report.html").read_text(encoding="utf-8")


@pytest.fixture(scope="module")
def seen(page):
    reader = Text()
    reader.feed(page)
    return " ".join(" ".join(reader.parts).split())


def quiet(request):
    return find_out(request, load_standards(), lambda step: None)


def test_the_folder_is_complete(small):
    files = {str(path.relative_to(small.folder)) for path in small.folder.rglob("*") if path.is_file()}
    assert {
        "report.html",
        "nights.html",
        "observing.ics",
        "justification.tex",
        "justification.md",
        "references.bib",
        "request.yaml",
    } <= files
    figures = {"spectrum", "snr-time", "disk", "errors", "season", "nights-one-by-one", "coverage"}
    figures |= {"probability", "fade", "nights-map", "comparison"}
    assert {f"figures/{name}.{kind}" for name in figures for kind in ("svg", "pdf")} <= files
    tables = {
        "exposure-time",
        "hours",
        "longitude-bins",
        "nights",
        "requested",
        "time-account",
        "fade",
        "map",
    }
    assert {f"tables/{name}.ecsv" for name in tables} <= files
    assert sorted(small.result["file"].tolist()) == sorted(files)


def test_every_table_can_be_read_back(small):
    for path in (small.folder / "tables").iterdir():
        assert len(read_result(path).table().columns) > 1


def test_each_figure_has_a_text_in_its_stead_and_a_caption(page):
    figures = re.findall(r'<figure id="figure-([\w-]+)">(.*?)</figure>', page, re.DOTALL)
    assert len(figures) >= 11
    for name, body in figures:
        assert re.search(r'role="img" aria-label="[^"]{30,}"', body), name
        assert re.search(r"<figcaption>.{30,}</figcaption>", body, re.DOTALL), name


def test_the_first_screen_answers_in_plain_words(small, seen):
    said = answer(small.found)
    for begin in ("How long:", "How many nights:", "What limits:", "Assumed:", "Rotation:", "Outlook:"):
        assert sum(sentence.startswith(begin) for sentence in said) == 1, begin
    assert verdict(small.found) in seen
    for sentence in said:
        assert " ".join(sentence.split()) in seen
    assert "nan" not in re.findall(r"\w+", seen)


def test_headline_numbers_carry_their_errors(small):
    merit = small.result.header
    assert "random" in str(merit["time_to_goal"])
    assert "systematic" in str(merit["time_to_goal"])
    for name in ("temperature", "column"):
        assert merit[name].random_error > 0.0
        assert merit[name].systematic_error > 0.0


def test_every_default_is_told(small, seen):
    listed = assumptions_of(small.found)
    told = " ".join(each.origin for each in listed)
    for record in (small.request, small.request.target, small.request.uses[0].instrument):
        for key, _ in assumed(record):
            assert f"`{key}`" in told
    for each in listed:
        assert each.value
        assert each.origin
    assert "seed" in seen


def test_steps_are_told_in_order(small):
    assert small.steps[0].startswith("sky")
    assert small.steps[-1] == "writing"
    assert len(small.steps) == len(set(small.steps)) >= 6


def test_a_planet_out_of_sight_is_an_answer(small):
    dates = replace(small.request.dates, first="2028-05-20", last="2028-05-23")
    found = quiet(replace(small.request, dates=dates))
    assert not found.visible
    assert not found.feasible
    assert verdict(found) == "Not feasible: Uranus cannot be observed on these nights"
    assert found.stretches == ()
    assert "never" in answer(found)[0]


def test_a_goal_beyond_the_budget_is_not_feasible(small):
    request = replace(small.request, budget=replace(small.request.budget, nights=0.5))
    found = quiet(request)
    assert not found.feasible
    assert "more than the budget" in verdict(found) or "not enough" in verdict(found)


def test_what_a_brighter_planet_makes_of_the_request_is_ordered(small):
    spread = small.found.range
    assert spread is not None
    bright, faint = spread.probability
    chosen = float(small.found.nights.header["probability"].value)
    assert faint <= chosen + 1e-9
    assert chosen <= bright + 1e-9


def test_a_further_constraint_leaves_out_what_it_forbids(small):
    def late(track):
        return np.arange(track.observable.size) % 2 == 0

    (scene,) = scenes(small.request, also=late)
    (free,) = scenes(small.request)
    assert scene.usable.sum() < free.usable.sum()
    assert not scene.usable[1::2].any()
    np.testing.assert_array_equal(scene.usable[::2], free.usable[::2])
    mask = np.zeros(free.track.observable.size, dtype=bool)
    assert requested(small.request, also=mask) == ()
    assert "further constraint" in restricted(free.track, mask).why_not


def test_a_mask_of_another_length_is_refused(small):
    with pytest.raises(RangeError, match="one value for each step"):
        scenes(small.request, also=np.ones(3, dtype=bool))


def test_a_request_without_coverage_has_no_chapter_of_it(tmp_path):
    request = load_request(ROOT / "examples" / "cold-giant-limit.yaml")
    files = plan(replace(request, fade=replace(request.fade, last_year=2028)), tmp_path / "cold")["file"]
    assert {"figures/fade.svg", "figures/season.svg", "figures/disk-2.svg"} <= set(files.tolist())
    assert not {"figures/coverage.svg", "figures/light-curve.svg"} & set(files.tolist())
