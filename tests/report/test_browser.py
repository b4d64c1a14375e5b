"""The page in a real browser: nothing from the network, every figure seen, at any width and on paper."""

from __future__ import annotations

import base64
import importlib.util
import os
import re
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

from coldglow.report.folder import report_files, write_folder
from coldglow.report.nightpage import NightPlan, night_pages
from coldglow.report.results import Entry, column, table

_spec = importlib.util.spec_from_file_location("coldglow_browser", Path(__file__).with_name("browser.py"))
assert _spec is not None
assert _spec.loader is not None
browser = importlib.util.module_from_spec(_spec)
sys.modules[_spec.name] = browser
_spec.loader.exec_module(browser)

PROGRAM = browser.find_browser()
REQUIRED = "COLDGLOW_BROWSER_REQUIRED" in os.environ  # where none may be skipped
pytestmark = pytest.mark.skipif(
    PROGRAM is None and not REQUIRED, reason="no chromium browser is found on PATH"
)

FIGURES = """[...document.querySelectorAll("figure")].map(figure => {
  const svg = figure.querySelector("svg"), box = svg.getBoundingClientRect(), style = getComputedStyle(svg);
  const marks = [...svg.querySelectorAll("path, use, image, polygon, rect")];
  const size = mark => mark.getBoundingClientRect().width + mark.getBoundingClientRect().height;
  const painted = marks.filter(mark => size(mark) > 0);
  const frame = figure.querySelector(".scroll");
  return {width: box.width, height: box.height, left: box.left, painted: painted.length,
          seen: style.visibility == "visible" && style.display != "none" && style.opacity == "1",
          reachable: frame.scrollWidth <= frame.clientWidth || getComputedStyle(frame).overflowX == "auto",
          caption: figure.querySelector("figcaption").getBoundingClientRect().height};
})"""


@pytest.fixture(scope="module")
def tab(tmp_path_factory) -> Iterator[object]:
    with browser.browser_tab(PROGRAM, tmp_path_factory.mktemp("profile")) as opened:
        yield opened


@pytest.fixture(scope="module")
def folder(tmp_path_factory, invented_report) -> Path:
    report = invented_report("Uranus <script>document.title = 'broken'; fetch('http://127.0.0.1/')</script>")
    return write_folder(tmp_path_factory.mktemp("report") / "plan", report_files(report))


@pytest.fixture(scope="module")
def page(tab, folder):
    tab.events.clear()
    tab.open(folder / "report.html")
    return tab


def resize(tab, width: int, height: int = 900) -> None:
    tab.call(
        "Emulation.setDeviceMetricsOverride",
        width=width,
        height=height,
        deviceScaleFactor=1,
        mobile=width < 500,
    )


def luminance(colour: str) -> float:
    """Relative luminance of ``rgb(r, g, b)`` (WCAG 2.1, definition of relative luminance)."""
    channels = [int(part) / 255 for part in re.findall(r"\d+", colour)[:3]]
    linear = [part / 12.92 if part <= 0.04045 else ((part + 0.055) / 1.055) ** 2.4 for part in channels]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def test_no_console_message_and_no_request_but_the_file_itself(page, folder):
    requests = [event["request"]["url"] for event in page.named("Network.requestWillBeSent")]
    outside = [url for url in requests if not url.startswith("data:")]
    assert outside == [(folder / "report.html").resolve().as_uri()]
    assert page.named("Runtime.consoleAPICalled") == []
    assert page.named("Runtime.exceptionThrown") == []
    assert page.named("Log.entryAdded") == []
    assert "fetch" in page.value("document.title")


@pytest.mark.parametrize("width", [360, 800, 1400])
def test_every_figure_is_seen_at_any_width_and_the_page_never_scrolls_sideways(page, width):
    resize(page, width)
    assert page.value("document.documentElement.scrollWidth") <= width
    figures = page.value(FIGURES)
    assert len(figures) == 12
    for figure in figures:
        assert figure["seen"]
        assert figure["reachable"]
        assert figure["width"] >= min(width - 40, 480)
        assert figure["height"] > 0.3 * figure["width"]
        assert figure["painted"] > 10
        assert figure["caption"] > 10
        assert 0 <= figure["left"] < width


def test_the_answer_is_on_the_first_screen_of_a_phone(page):
    resize(page, 390, 844)
    page.value("scrollTo(0, 0)")
    bottoms = page.value(
        "[...document.querySelectorAll('.answer p')].map(p => p.getBoundingClientRect().bottom)"
    )
    assert len(bottoms) >= 3
    assert max(bottoms) < 844


def test_figures_fit_on_paper(page):
    resize(page, 700)
    page.call("Emulation.setEmulatedMedia", media="print")
    figures = page.value(FIGURES)
    assert all(figure["seen"] and figure["width"] <= 700 and figure["painted"] > 10 for figure in figures)
    assert page.value("getComputedStyle(document.querySelector('nav')).display") == "none"
    page.call("Emulation.setEmulatedMedia", media="")
    paper = base64.b64decode(page.call("Page.printToPDF", preferCSSPageSize=True)["data"])
    assert paper.startswith(b"%PDF")
    assert 5 <= len(re.findall(rb"/Type\s*/Page\b", paper)) <= 14


@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_words_and_figures_stand_out_in_light_and_in_dark(page, scheme):
    page.call("Emulation.setEmulatedMedia", features=[{"name": "prefers-color-scheme", "value": scheme}])
    resize(page, 1000)
    colours = page.value(
        """(() => {
        const all = [...document.querySelectorAll("p, h1, h2, dt, dd, figcaption, td, th, li, a")];
        return [getComputedStyle(document.body).backgroundColor,
                [...new Set(all.map(part => getComputedStyle(part).color))]]; })()"""
    )
    paper = luminance(colours[0])
    assert (paper > 0.8) == (scheme == "light")
    for colour in colours[1]:
        low, high = sorted((luminance(colour), paper))
        assert (high + 0.05) / (low + 0.05) >= 4.5, colour  # WCAG 2.1, criterion 1.4.3
    drawn = page.value(
        """(() => { const svg = document.querySelector("figure svg");
        return [getComputedStyle(svg.querySelector("#snr-patch_1 path")).fill,
                [...new Set([...svg.querySelectorAll("[id*=text_] g")].map(g => getComputedStyle(g).fill))]];
        })()"""
    )
    assert (luminance(drawn[0]) > 0.8) == (scheme == "light")
    assert drawn[1]
    for colour in drawn[1]:
        low, high = sorted((luminance(colour), luminance(drawn[0])))
        assert (high + 0.05) / (low + 0.05) >= 4.5, colour
    page.call("Emulation.setEmulatedMedia", features=[])


def test_the_keyboard_reaches_links_figures_and_tables_and_screen_readers_get_names(page):
    tree = page.call("Accessibility.getFullAXTree")["nodes"]
    roles = [node.get("role", {}).get("value") for node in tree if not node.get("ignored")]
    names = {
        node.get("name", {}).get("value")
        for node in tree
        if node.get("role", {}).get("value") in ("image", "img")
    }
    assert "Text that stands for the season figure." in names
    assert {"main", "navigation", "heading", "table", "columnheader", "rowheader"} <= set(roles)
    focusable = page.value("document.querySelectorAll('a[href], [tabindex=\"0\"]').length")
    assert focusable >= 11 + 2


def test_the_night_pages_show_and_print_one_night_on_each_sheet(tab, tmp_path):
    track = table(
        column("time", ["04:00", "04:30"]), column("airmass", [1.2, 1.1]), caption="Through the night"
    )
    plans = [
        NightPlan(f"2027-11-0{i}", "echelle-4m", {"dark_from": Entry("00:12 UTC")}, ["Go."], track)
        for i in (5, 6, 7)
    ]
    path = tmp_path / "nights.html"
    path.write_text(night_pages("Uranus", plans), encoding="utf-8")
    tab.events.clear()
    tab.open(path)
    resize(tab, 390)
    assert tab.value("document.documentElement.scrollWidth") <= 390
    assert tab.named("Log.entryAdded") == []
    paper = base64.b64decode(tab.call("Page.printToPDF", preferCSSPageSize=True)["data"])
    assert len(re.findall(rb"/Type\s*/Page\b", paper)) == 3


def test_a_page_that_asks_or_complains_would_be_noticed(tab, tmp_path):
    path = tmp_path / "loud.html"
    path.write_text("<img src='http://127.0.0.1:9/x.png'><script>console.error('loud'); none()</script>")
    tab.events.clear()
    tab.open(path)
    assert len(tab.named("Network.requestWillBeSent")) == 2
    assert len(tab.named("Runtime.consoleAPICalled")) == 1
    assert len(tab.named("Runtime.exceptionThrown")) == 1


@pytest.fixture(scope="module")
def planned(tab, tmp_path_factory):
    """The page of a shipped example, planned for real."""
    from coldglow.answers import plan

    place = tmp_path_factory.mktemp("planned") / "plan"
    plan(Path(__file__).parents[2] / "examples" / "uranus-season.yaml", place)
    return place


def test_the_page_of_a_shipped_example_is_quiet_and_whole(tab, planned):
    tab.events.clear()
    tab.open(planned / "report.html")
    outside = [event["request"]["url"] for event in tab.named("Network.requestWillBeSent")]
    assert [url for url in outside if not url.startswith("data:")] == [(planned / "report.html").as_uri()]
    assert tab.named("Runtime.consoleAPICalled") + tab.named("Log.entryAdded") == []
    assert tab.named("Runtime.exceptionThrown") == []
    names = {path.stem for path in (planned / "figures").glob("*.svg")}
    for width in (360, 800, 1400):
        resize(tab, width)
        assert tab.value("document.documentElement.scrollWidth") <= width
        figures = tab.value(FIGURES)
        assert len(figures) == len(names) >= 11
        for figure in figures:
            assert figure["seen"]
            assert figure["reachable"]
            assert figure["painted"] > 10
            assert figure["width"] >= min(width - 40, 480)
    resize(tab, 700)
    tab.call("Emulation.setEmulatedMedia", media="print")
    assert all(figure["seen"] and figure["width"] <= 700 for figure in tab.value(FIGURES))
    tab.call("Emulation.setEmulatedMedia", media="")


def test_the_answer_of_a_shipped_example_is_on_the_first_screen_of_a_phone(tab, planned):
    tab.open(planned / "report.html")
    resize(tab, 390, 844)
    tab.value("scrollTo(0, 0)")
    said = tab.value(
        "[...document.querySelectorAll('.answer p')]"
        ".map(p => [p.textContent, p.getBoundingClientRect().bottom])"
    )
    bottoms = {text.split(":")[0]: bottom for text, bottom in said}
    for begin in ("Feasible", "How long", "How many nights", "What limits", "Assumed"):
        assert bottoms[begin] < 844, (begin, bottoms)


def test_the_night_pages_of_a_shipped_example_show_on_a_phone_and_print(tab, planned):
    tab.events.clear()
    tab.open(planned / "nights.html")
    resize(tab, 390)
    assert tab.value("document.documentElement.scrollWidth") <= 390
    assert tab.named("Log.entryAdded") + tab.named("Runtime.exceptionThrown") == []
    sheets = tab.value("document.querySelectorAll('.sheet').length")
    paper = base64.b64decode(tab.call("Page.printToPDF", preferCSSPageSize=True)["data"])
    assert sheets <= len(re.findall(rb"/Type\s*/Page\b", paper)) <= sheets + 1
