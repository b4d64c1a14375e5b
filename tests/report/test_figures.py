from __future__ import annotations

import io
import itertools
import re
import xml.etree.ElementTree as ET

import matplotlib
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.text import Text

from coldglow.report.figures import (
    chance,
    compare,
    coverage,
    disk,
    exposure,
    fade,
    look,
    nights,
    season,
    spectrum,
    state,
)

NAMES = (
    "snr", "season", "nights", "coverage", "probability", "fade", "map", "ellipse", "comparison", "spectrum",
    "disk", "turn",
    "season-short", "nights-many", "coverage-many", "coverage-one", "comparison-long", "spectrum-space",
    "spectrum-crowded", "spectrum-imager", "disk-large",
)  # fmt: skip


def tick_outside(figure: Figure) -> set[str]:
    """Return the labels of ticks beyond the limits of their axis, which are kept but not drawn."""
    hidden = set()
    for axes in figure.axes:
        for axis in (axes.xaxis, axes.yaxis):
            low, high = sorted(axis.get_view_interval())
            slack = 1e-9 * (high - low)
            for tick in itertools.chain(axis.get_major_ticks(), axis.get_minor_ticks()):
                if not low - slack <= tick.get_loc() <= high + slack:
                    hidden |= {id(tick.label1), id(tick.label2)}
    return hidden


@pytest.mark.parametrize("name", NAMES)
def test_no_text_is_cut_off_and_none_overlaps_another(figures, name):
    figure = figures[name]()
    canvas = FigureCanvasAgg(figure)
    canvas.draw()
    hidden = tick_outside(figure)
    axes_off = {id(text) for axes in figure.axes if not axes.axison for text in axes.findobj(Text)} - {
        id(text) for axes in figure.axes for text in (axes._left_title, axes._right_title)
    }
    legends = {
        id(text) for axes in figure.axes if axes.get_legend() for text in axes.get_legend().get_texts()
    }
    boxes = []
    for text in figure.findobj(Text):
        unseen = id(text) in hidden or (id(text) in axes_off and id(text) not in legends)
        if unseen or not text.get_visible() or not text.get_text().strip():
            continue
        box = Text.get_window_extent(text, canvas.get_renderer())  # without the arrow of an annotation
        assert box.x0 >= 0, text.get_text()
        assert box.y0 >= 0, text.get_text()
        assert box.x1 <= figure.bbox.x1, text.get_text()
        assert box.y1 <= figure.bbox.y1, text.get_text()
        if "\n" not in text.get_text().strip("\n") and text.get_rotation() in (0, 90):
            boxes.append((text, box.padded(-1)))
    assert len(boxes) > 3
    for (one, box), (other, beside) in itertools.combinations(boxes, 2):
        two_lines = one.get_text().endswith("\n") and other.get_text().startswith("\n")
        assert two_lines or not box.overlaps(beside), (one.get_text(), other.get_text())


@pytest.mark.parametrize("name", NAMES)
def test_every_panel_names_its_axes_with_units_where_they_have_some(figures, name):
    figure = figures[name]()
    texts = " ".join(text.get_text() for text in figure.findobj(Text))
    expected = {
        "snr": "(h)", "season": "UTC", "nights": "UTC", "coverage": "(°)", "probability": "%", "fade": "(K)",
        "map": "(m⁻²)", "ellipse": "(m⁻²)", "comparison": " h", "spectrum": "(µm)", "disk": "(″)",
        "turn": "(°)",
    }[name.split("-")[0]]  # fmt: skip
    assert expected in texts


@pytest.mark.parametrize("name", NAMES[:12])
def test_the_same_numbers_give_the_same_bytes_whatever_the_users_settings(figures, name):
    first = figures[name]()
    svg, pdf = look.as_svg(first), look.as_pdf(first)
    with matplotlib.rc_context({"font.size": 20, "svg.hashsalt": None, "axes.facecolor": "red"}):
        second = figures[name]()
        assert look.as_svg(second) == svg
        assert look.as_pdf(second) == pdf
    assert "<dc:date>" not in svg
    assert b"CreationDate" not in pdf
    ET.fromstring(svg)


def test_drawing_leaves_the_users_settings_alone(figures):
    before = dict(matplotlib.rcParams)
    look.as_svg(figures["snr"]())
    assert dict(matplotlib.rcParams) == before


def luminance(colour):
    """Relative luminance (0-1) of a colour such as ``#1d5596`` (IEC 61966-2-1, sRGB)."""
    channels = np.array(matplotlib.colors.to_rgb(colour))
    linear = np.where(channels <= 0.04045, channels / 12.92, ((channels + 0.055) / 1.055) ** 2.4)
    return float(linear @ [0.2126, 0.7152, 0.0722])


def test_series_stay_apart_in_grey_and_the_scale_of_colours_is_monotone():
    # IEC 61966-2-1: luminance of pure red, green, blue and white in sRGB (also WCAG 2, relative luminance)
    for colour, expected in {"#ff0000": 0.2126, "#00ff00": 0.7152, "#0000ff": 0.0722, "#ffffff": 1.0}.items():
        assert luminance(colour) == pytest.approx(expected)
    paper = luminance(look.PAPER)
    for colour in (look.INK, look.SOFT, look.BLUE, look.BRICK, look.PLUM):
        contrast = (paper + 0.05) / (luminance(colour) + 0.05)
        assert contrast >= 4.5, colour  # WCAG 2.1, criterion 1.4.3, for text
    first_two = sorted((luminance(look.BLUE), luminance(look.AMBER)))
    assert (first_two[1] + 0.05) / (first_two[0] + 0.05) > 2.5
    shades = [luminance(matplotlib.colors.to_hex(look.GLOW(x))) for x in np.linspace(0, 1, 64)]
    assert np.all(np.diff(shades) > 0)


def test_inline_svg_has_its_own_ids_and_the_pages_colours(figures):
    svg = look.as_svg(figures["season"]())
    inline = look.inline_svg(svg, "season")
    assert inline.startswith("<svg")
    ids = re.findall(r'\bid="([^"]+)"', inline)
    assert ids
    assert all(name.startswith("season-") for name in ids)
    assert len(set(ids)) == len(ids)
    used = set(re.findall(r'href="#([^"]+)"', inline)) | set(re.findall(r"url\(#([^)]+)\)", inline))
    assert used <= set(ids)
    assert f": var(--figure-ink, {look.INK})" in inline
    assert not re.search(rf": {look.INK}\b", inline)
    assert "width=" not in inline[: inline.index(">")]
    ET.parse(io.StringIO(inline))


@given(
    st.lists(st.floats(0, 1), min_size=1, max_size=12),
    st.floats(0.001, 0.08),
)
def test_labels_are_spread_in_order_and_no_further_than_needed(positions, gap):
    wanted = np.sort(positions)
    places = spectrum.spread(wanted, gap, 0.0, 1.0)
    assert np.all(np.diff(places) >= gap * (1 - 1e-9))
    assert places[0] >= -1e-12
    assert places[-1] <= 1 + 1e-9 or gap * (len(places) - 1) > 1
    if np.all(np.diff(wanted) >= gap) and len(wanted):
        np.testing.assert_allclose(places, wanted, atol=1e-12)


@pytest.mark.parametrize("name", ["spectrum", "spectrum-crowded"])
def test_names_of_lines_stay_between_the_panels(figures, name):
    figure = figures[name]()
    canvas = FigureCanvasAgg(figure)
    canvas.draw()
    air, main = figure.axes
    boxes = [
        Text.get_window_extent(text, canvas.get_renderer())
        for text in main.texts
        if text.get_rotation() == 90
    ]
    assert len(boxes) == 12
    assert max(box.y1 for box in boxes) < air.get_window_extent().y0
    assert min(box.y0 for box in boxes) > main.get_window_extent().y1


def test_two_labels_at_one_place_move_apart_evenly():
    np.testing.assert_allclose(spectrum.spread(np.array([0.5, 0.5]), 0.1, 0.0, 1.0), [0.45, 0.55])


def test_the_envelope_keeps_every_narrow_line():
    x = np.linspace(0, 1, 50_000)
    y = np.zeros_like(x)
    y[31_234] = 7.0
    y[12_345] = -3.0
    grid, low, high = spectrum.envelope(x, y, (0.0, 1.0))
    assert len(grid) <= 900
    assert high.max() == 7.0
    assert low.min() == -3.0


def test_the_disk_is_projected_as_a_spheroid():
    # Orthographic projection of a spheroid: the pole stands at polar radius x cos(B), B the planetocentric
    # latitude of the centre, along the position angle of the axis; the outline is an ellipse with minor
    # semi-axis sqrt(c^2 cos^2 B + a^2 sin^2 B) (Urban & Seidelmann 2013, Explanatory Supplement, 3rd ed.,
    # section 10.3, apparent disk).
    view = disk.DiskView(40.0, 0.9, 25.0, 100.0, 30.0, True)
    centric = np.arctan(0.81 * np.tan(np.radians(25.0)))
    east, north, facing = disk._project(view, np.array([np.pi / 2]), np.array([0.0]))
    assert facing[0]
    assert np.hypot(east[0], north[0]) == pytest.approx(20 * 0.9 * np.cos(centric))
    assert np.degrees(np.arctan2(east[0], north[0])) == pytest.approx(30.0)
    # the point under the observer is the centre
    east, north, facing = disk._project(view, np.array([centric]), np.array([100.0]))
    assert (east[0], north[0]) == pytest.approx((0.0, 0.0), abs=1e-12)
    assert facing[0]
    # west longitudes beyond the central one lie on the east limb: they come into view as the planet turns
    east, north, _ = disk._project(view, np.zeros(2), np.array([130.0, 70.0]))
    right = np.array([-np.cos(np.radians(30.0)), np.sin(np.radians(30.0))])  # towards celestial west
    assert east[0] * right[0] + north[0] * right[1] < 0 < east[1] * right[0] + north[1] * right[1]
    # no visible point lies outside the outline
    latitude, longitude = np.meshgrid(np.linspace(-1.5, 1.5, 41), np.arange(0.0, 360.0, 5.0))
    east, north, facing = disk._project(view, latitude.ravel(), longitude.ravel())
    up = east * np.sin(np.radians(30)) + north * np.cos(np.radians(30))
    along = east * right[0] + north * right[1]
    minor = np.sqrt(0.81 * np.cos(centric) ** 2 + np.sin(centric) ** 2)
    size = np.hypot(along / 20, up / (20 * minor))
    assert size.max() <= 1 + 1e-9
    assert size[facing].max() > 0.99


def test_an_ellipse_of_errors_has_the_axes_of_its_covariance():
    covariance = np.array([[0.02, -1.5], [-1.5, 180.0]])
    figure = state.error_ellipse(480.0, 1e15, covariance)
    ellipse = figure.axes[0].patches[1]  # 1 sigma
    turn = np.radians(ellipse.angle)
    across = np.array([[np.cos(turn), -np.sin(turn)], [np.sin(turn), np.cos(turn)]])
    drawn = across @ np.diag([ellipse.width**2 / 4, ellipse.height**2 / 4]) @ across.T
    np.testing.assert_allclose(drawn, covariance[::-1, ::-1], rtol=1e-9)


NEVER, ZERO = np.full(2, np.inf), np.zeros(2)
YEARS = np.array([2027.0, 2028.0])
EDGES, NONE = np.linspace(0, 360, 13), np.zeros(12)
HOURS = np.linspace(20.0, 30.0, 9)
TK, NM2 = np.linspace(300, 600, 4), np.geomspace(1e14, 1e16, 3)
HARD = {
    "no SNR": lambda: exposure.snr_against_time(HOURS, np.full(9, np.nan), {}, 5.0),
    "no noise": lambda: exposure.snr_against_time(HOURS, 0 * HOURS, {"sky": 1.0}, 5.0, np.inf),
    "no goal": lambda: exposure.snr_against_time(HOURS, HOURS, {"sky": 1.0}),
    "no visit": lambda: coverage.coverage([], EDGES, NONE, 5.0, NONE > 0),
    "no bin": lambda: coverage.coverage(
        [coverage.VisitTrack("a", np.array([3.0, 4.0]), ZERO)], EDGES, np.full(12, np.nan), 5.0, NONE == 0
    ),
    "never again": lambda: fade.fade(
        YEARS, (ZERO + 400,) * 3, (ZERO, ZERO + 0.9, ZERO + 1), (NEVER,) * 3, 5.0
    ),
    "one year": lambda: fade.fade(YEARS[:1], (YEARS[:1],) * 3, (np.ones(1),) * 3, (np.ones(1),) * 3),
    "none feasible": lambda: compare.comparison(["a"], np.array([np.inf]), ["never up"], np.array([False])),
    "no chance": lambda: chance.probability_against_nights(
        [chance.ChanceCurve("x", np.ones(1), np.zeros(1), np.zeros(1))], 0.9
    ),
    "below the horizon": lambda: nights.chosen_nights(
        [nights.NightCurve("2027-01-01", HOURS, np.nan * HOURS, HOURS, HOURS < 0)]
    ),
    "no error": lambda: state.error_ellipse(480.0, 1e15, np.zeros((2, 2))),
    "huge error": lambda: state.error_ellipse(480.0, 1e15, np.diag([400.0, 1e6]), (0.1, 9.0)),
    "never anywhere": lambda: state.nights_map(
        TK, NM2, np.full((3, 4), np.inf), (480.0, 1e15), (0.0, 0.0), "2027", budget_nights=3
    ),
    "same anywhere": lambda: state.nights_map(
        TK, NM2, np.ones((3, 4)), (480.0, 1e15), (0.0, 0.0), "2027", budget_nights=1
    ),
    "never up": lambda: season.season_chart(["2027-11-01"], HOURS, np.full((1, 9), np.nan)),
    "three years": lambda: season.season_chart(
        [str(np.datetime64("2027-01-01") + i) for i in range(1100)], HOURS, np.ones((1100, 9))
    ),
    "no light": lambda: spectrum.spectrum(
        np.array([3.9, 4.0]), ZERO, ZERO, ZERO, ZERO[:0], ZERO[:0], np.array([3.95]), ["a"], np.zeros(1)
    ),
    "pole on": lambda: disk.beam_on_disk(
        disk.DiskView(3.7, 0.97, -90.0, 10.0, 0.0, True),
        disk.OpeningView("field", 3.2, 3.2, 0.0),
        0.0,
        [disk.SpotView("seen", -90.0, 0.0, 20.0, 10.0), disk.SpotView("hidden", 90.0, 0.0, 20.0)],
    ),
}


@pytest.mark.parametrize("name", HARD)
def test_hard_cases_draw_without_a_warning(name):
    figure = HARD[name]()
    assert look.as_pdf(figure).startswith(b"%PDF")


def test_a_faint_line_over_a_bright_sky_stays_on_the_scale():
    wave = np.linspace(3.9, 4.0, 300)
    lines = 1e-4 * np.exp(-(((wave - 3.95) / 0.001) ** 2))
    sky, sun, none = np.full(300, 1e4), np.full(300, 1e-9), wave[:0]
    figure = spectrum.spectrum(wave, lines, sun, sky, none, none, np.array([3.95]), ["Q(1,0)"], np.ones(1))
    low, high = figure.axes[0].get_ylim()
    assert low < 0.1 * lines.max()
    assert high > sky.max()
    names = [text.get_text() for text in figure.axes[0].get_legend().get_texts()]
    assert names == ["background", "reflected sunlight (off scale)", "H₃⁺ lines"]
    dark = spectrum.spectrum(wave, 0 * wave, 0 * wave, 0 * wave, none, none, np.array([]), [], np.array([]))
    look.as_pdf(dark)


def test_rates_that_hardly_differ_fill_the_scale_of_colours():
    evenings, hours = ["2027-11-01", "2027-11-02"], np.arange(22.0, 26.0)
    flat = season.season_chart(evenings, hours, np.linspace(8.0, 10.0, 8).reshape(2, 4))
    steep = season.season_chart(evenings, hours, np.linspace(1.0, 10.0, 8).reshape(2, 4))
    assert flat.axes[0].images[0].get_clim() == (8.0, 10.0)
    assert steep.axes[0].images[0].get_clim() == (0.0, 10.0)


def test_the_mark_stands_on_the_curve_where_the_goal_is_sure():
    # an SNR of 5 with 90 % needs an expected SNR of 6.3: the mark belongs there, not on the line of the goal
    clock = np.linspace(0.5, 8, 50)
    figure = exposure.snr_against_time(clock, 5 * np.sqrt(clock / 2), {"sky": 1.0}, 5.0, 3.2, probability=0.9)
    mark = next(line for line in figure.axes[0].lines if line.get_marker() == "o")
    assert mark.get_ydata() == pytest.approx([5 * np.sqrt(1.6)], rel=1e-2)
    assert figure.axes[0].get_title(loc="right") == "goal 5 after 3 h 12 min (with 90 %)"


def test_frames_of_successive_nights_join_and_others_do_not():
    outlines = season._outlines([(3, 26.0, 28.0), (4, 26.5, 28.5), (9, 25.0, 27.0), (10, 28.0, 29.0)])
    assert [len(outline) for outline in outlines] == [8, 4, 4]
    assert outlines[0][0] == (2.5, 26.0)
    assert outlines[0][3] == (4.5, 26.5)
