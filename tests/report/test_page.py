from __future__ import annotations

import re
from html.parser import HTMLParser

import numpy as np
import pytest

from coldglow.report.figures import look
from coldglow.report.nightpage import NightPlan, night_pages
from coldglow.report.page import ROWS, render_page, view
from coldglow.report.record import Report
from coldglow.report.results import Entry, column, table

VOID = {"meta", "link", "br", "img", "hr", "input"}


class Outline(HTMLParser):
    """The elements of a page in order, with a check that they nest."""

    def __init__(self, page: str) -> None:
        super().__init__()
        self.elements: list[tuple[str, dict[str, str | None]]] = []
        self.texts: list[str] = []
        self.open: list[str] = []
        self.feed(page)
        assert self.open == []

    def handle_starttag(self, tag, attrs):
        self.elements.append((tag, dict(attrs)))
        if tag not in VOID:
            self.open.append(tag)

    def handle_startendtag(self, tag, attrs):
        self.elements.append((tag, dict(attrs)))

    def handle_endtag(self, tag):
        assert self.open.pop() == tag

    def handle_data(self, data):
        self.texts.append(data.strip())

    def named(self, tag: str) -> list[dict[str, str | None]]:
        return [attributes for name, attributes in self.elements if name == tag]


@pytest.fixture(scope="module")
def report(invented_report) -> Report:
    return invented_report("Uranus <script>alert(1)</script> & 'co'")


@pytest.fixture(scope="module")
def page(report) -> str:
    return render_page(report, {picture.name: look.as_svg(picture.figure) for picture in report.pictures()})


def test_what_the_user_wrote_shows_as_text(page):
    outline = Outline(page)
    assert outline.named("script") == []
    assert "Uranus <script>alert(1)</script> & 'co'" in outline.texts
    assert "<b>&" in outline.texts


def test_nothing_comes_from_outside(page):
    outline = Outline(page)
    for _, attributes in outline.elements:
        for name in ("src", "href", "xlink:href", "action", "data", "srcset"):
            target = attributes.get(name) or "#"
            assert target.startswith(("#", "data:")), target
        assert not any(name.startswith("on") for name in attributes)
    assert "@import" not in page
    assert not re.search(r"url\((?!#)", page)
    policy = next(a for a in outline.named("meta") if a.get("http-equiv") == "Content-Security-Policy")
    assert (policy["content"] or "").startswith("default-src 'none'")


def test_the_answer_comes_first_then_every_figure_with_words(page, report):
    outline = Outline(page)
    order = [
        outline.texts.index(text) for text in (report.verdict, report.answer[0], report.sections[0].title)
    ]
    assert order == sorted(order)
    alts = [a["aria-label"] for a in outline.named("div") if a.get("role") == "img"]
    assert alts == [picture.alt for picture in report.pictures()]
    captions = [picture.caption for picture in report.pictures()]
    assert [text for text in outline.texts if text in captions] == captions


def test_headings_tables_and_ids_are_in_order(page):
    outline = Outline(page)
    levels = [int(name[1]) for name, _ in outline.elements if re.fullmatch(r"h[1-6]", name)]
    assert levels[0] == 1
    assert levels.count(1) == 1
    assert len(outline.named("main")) == 1
    for heading in outline.named("th"):
        assert heading.get("scope") in ("col", "row")
    assert len(outline.named("caption")) == len(outline.named("table")) > 0
    ids = [attributes["id"] for _, attributes in outline.elements if "id" in attributes]
    assert len(set(ids)) == len(ids)
    links = [attributes["href"] for attributes in outline.named("a")]
    assert {(link or "#")[1:] for link in links} <= set(ids)
    assert outline.elements[0] == ("html", {"lang": "en"})


def test_the_page_is_the_same_for_the_same_report(page, invented_report):
    again = invented_report("Uranus <script>alert(1)</script> & 'co'")
    drawings = {picture.name: look.as_svg(picture.figure) for picture in again.pictures()}
    assert render_page(again, drawings) == page


def test_inputs_assumptions_sources_and_versions_are_listed(page):
    texts = Outline(page).texts
    for expected in ("uranus", "seeing", "median of the site, instrument file line 12"):
        assert expected in texts
    assert any(text.startswith("Archinal et al. 2018") for text in texts)
    assert "coldglow 0.1.0; random seed 1." in texts


def test_a_page_without_figures_or_assumptions_is_whole():
    page = render_page(Report("Nothing", "Not feasible", False, ["The target is never up."]), {})
    texts = Outline(page).texts
    assert "None: the request states every value." in texts
    assert 'class="verdict no"' in page


def test_a_long_table_says_where_the_rest_is():
    shown = view(table(column("a", np.arange(ROWS + 5))), "tables/a.ecsv")
    assert len(shown.rows) == ROWS
    assert shown.note == f"{ROWS} of {ROWS + 5} rows; all of them are in tables/a.ecsv"
    assert view(table(column("a", [1.0]))).note == ""


def test_night_pages_have_a_sheet_for_each_night():
    track = table(
        column("time", ["04:00", "04:30"]),
        column("airmass", [1.2, 1.1], decimals=2),
        caption="Through the night",
    )
    stars = table(column("star", ["<HD> 1"]), caption="Standard stars")
    plans = [
        NightPlan(
            "2027-11-05", "echelle-4m", {"dark_from": Entry("00:12 UTC")}, ["04:00 take & go"], track, stars
        ),
        NightPlan("2027-11-06", "echelle-4m", notes=["No standard star is up."]),
    ]
    page = night_pages("Uranus", plans)
    outline = Outline(page)
    assert [text for text in outline.texts if text.startswith("Night of")] == [
        "Night of 5 Nov 2027, echelle-4m",
        "Night of 6 Nov 2027, echelle-4m",
    ]
    assert {"<HD> 1", "04:00 take & go", "1.20", "No standard star is up."} <= set(outline.texts)
    assert night_pages("Uranus", plans) == page
