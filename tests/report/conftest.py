"""Invented numbers in the shape of every figure, for the tests of the report."""

from __future__ import annotations

from collections.abc import Callable
from datetime import date, timedelta

import numpy as np
import pytest
from matplotlib.figure import Figure

from coldglow.report.figures import (
    chance,
    compare,
    coverage,
    disk,
    exposure,
    fade,
    lightcurve,
    nights,
    season,
    spectrum,
    state,
)
from coldglow.report.record import Assumption, Picture, Report, Section
from coldglow.report.results import Entry, column, table


def snr_against_time() -> Figure:
    clock_h = np.linspace(0, 8, 100)
    snr = 5 * np.sqrt(clock_h / 3.3)
    shares = {
        "sky": 0.61,
        "telescope": 0.22,
        "dark current": 0.08,
        "read noise": 0.05,
        "planet": 0.03,
        "lines": 0.01,
    }
    return exposure.snr_against_time(clock_h, snr, shares, 5.0, 3.3, 0.8 * snr, 1.2 * snr)


def season_chart(count: int = 184) -> Figure:
    evenings = [(date(2027, 8, 1) + timedelta(days=i)).isoformat() for i in range(count)]
    hour = np.arange(21.125, 36, 0.25)
    culmination = 33 - 12 * np.arange(count) / 184
    rate = (
        3
        * np.exp(-(((hour - culmination[:, None]) / 3.5) ** 2))
        * (1 + 0.2 * np.sin(np.arange(count) / 9)[:, None])
    )
    start, end = np.full(count, 23.2), np.full(count, 33.5)
    dark = (hour > start[:, None]) & (hour < end[:, None]) & (np.abs(hour - culmination[:, None]) < 4.5)
    framed = [(i, 27.0, 30.0) for i in range(count // 2, min(count // 2 + 3, count))]
    return season.season_chart(evenings, hour, np.where(dark, rate, np.nan), start, end, framed)


def chosen_nights(count: int = 5) -> Figure:
    hour = np.linspace(23, 34, 133)
    curves = [
        nights.NightCurve(
            (date(2027, 11, 20) + timedelta(days=2 * i)).isoformat(),
            hour,
            65 - 3.2 * (hour - 28 + 0.13 * i) ** 2,
            (100.0 + 260 * i + 20.9 * (hour - 23)) % 360,
            np.abs(hour - 28) < 2.5,
        )
        for i in range(count)
    ]
    return nights.chosen_nights(curves, 30.0)


def covered(count: int = 7) -> Figure:
    edges = np.linspace(0, 360, 13)
    visits = []
    for i in range(count):
        longitude = (30 + 97 * i + np.linspace(0, 100, 60)) % 360
        visits.append(coverage.VisitTrack(f"{5 + i} Nov 2027, A", longitude, 2 - np.linspace(-1, 1, 60) ** 2))
    reached = np.array([5.2, 6.1, 7, 5.1, 4.2, 5, 6, 8, 5.5, 0, 0, 5.1])
    return coverage.coverage(visits, edges, reached, 5.0, reached > 0)


def probability() -> Figure:
    count = np.arange(1, 13)
    one = 1 - np.exp(-count / 3.0)
    return chance.probability_against_nights(
        [
            chance.ChanceCurve("independent nights", count, one),
            chance.ChanceCurve("weather lasts", count, one**1.5, np.full(12, 0.01)),
        ],
        0.9,
        9,
    )


def fading() -> Figure:
    year = np.arange(2027, 2042)
    middle = 480.0 - 6 * (year - 2027)
    light = np.exp((middle - 480) / 30)
    cost = 2 / light**2
    cost_high = np.where(year > 2036, np.inf, cost * 3)
    return fade.fade(
        year,
        (middle - 20, middle, middle + 20),
        (light * 0.6, light, light * 1.5),
        (cost / 3, cost, cost_high),
        12.0,
        2034.0,
    )


def fading_in_space() -> Figure:
    year = np.arange(2028, 2051)
    middle, light = 391.0 - 6.5 * (year - 2028), np.exp(-(year - 2028) / 4.0)
    days = 8e-5 / light
    return fade.fade(
        year,
        (middle - 20, middle, middle + 20),
        (light * 0.6, light, light * 1.5),
        (days, days, days * 3),
        1.67,
        unit="day",
    )


def nights_map() -> Figure:
    temperature = np.linspace(300, 700, 41)
    column = np.geomspace(1e14, 1e16, 31)
    needed = 3 * (np.exp(-(temperature[None, :] - 480) / 30) * 1e15 / column[:, None]) ** 2
    needed[needed > 3e4] = np.inf
    path = 480 - 7.0 * np.arange(10)
    return state.nights_map(
        temperature,
        column,
        needed,
        (480.0, 1e15),
        (25.0, 3e14),
        "2027",
        [str(2027 + i) for i in range(10)],
        path,
        np.full(10, 1e15) * 0.97 ** np.arange(10),
        10,
    )


def ellipse() -> Figure:
    return state.error_ellipse(480.0, 1.1e15, np.array([[0.02, -1.5], [-1.5, 180.0]]), (0.1, 9.0))


def comparison() -> Figure:
    labels = ["echelle-8m, lband", "echelle-4m, lband", "ifu-8m, kband", "grating-8m, lband"]
    labels += ["longslit-4m, kband", "narrowband-3m, h3p"]
    return compare.comparison(
        labels,
        np.array([0.8, 4.1, 6.2, 11.0, 120.0, np.inf]),
        [
            "sky",
            "read noise of the detector",
            "telescope",
            "sky",
            "sky",
            "continuum cannot be told from the lines",
        ],
        np.array([True, True, True, True, False, False]),
    )


def line_spectrum(in_air: bool = True) -> Figure:
    rng = np.random.default_rng(3)
    wave = np.linspace(3.4, 4.1, 6000)
    lines = np.sort(np.concatenate([rng.uniform(3.4, 4.1, 60), 3.95 + 0.002 * np.arange(8)]))
    weight = rng.exponential(size=68)
    signal = sum(w * np.exp(-(((wave - c) / 1e-4) ** 2)) for c, w in zip(lines, weight, strict=True)) + 1e-9
    air = np.clip(0.9 - 0.8 * np.abs(np.sin(200 * wave) * np.sin(37 * wave)), 0, 1)
    return spectrum.spectrum(
        wave,
        signal,
        0.05 + 0 * wave,
        2 + 30 * (1 - air),
        wave if in_air else wave[:0],
        air if in_air else air[:0],
        lines,
        [f"tR({i},{i % 5})" for i in range(68)],
        weight,
    )


def crowded_spectrum() -> Figure:
    wave = np.linspace(3.9, 4.0, 300)
    flat, lines = np.ones(300), 3.9995 + 1e-5 * np.arange(20)
    labels = [f"2v2(l2)-v2 tR({i},{i})u" for i in range(20)]
    return spectrum.spectrum(wave, flat, flat, flat, wave, 0.9 * flat, lines, labels, np.ones(20))


def long_comparison() -> Figure:
    labels = [f"an-instrument-of-mine-{i}, high-resolution" for i in range(14)]
    hours = np.geomspace(0.001, 5e4, 14)
    return compare.comparison(labels, hours, ["the background of the warm telescope"] * 14, hours < 1e3)


def beam(diameter: float = 3.7, slit: float = 0.8) -> Figure:
    view = disk.DiskView(diameter, 0.977, 62.0, 143.0, 262.0, False)
    spots = [disk.SpotView("northern oval", 65.0, 120.0, 12.0, 6.0), disk.SpotView("spot", 10.0, 190.0, 9.0)]
    return disk.beam_on_disk(view, disk.OpeningView("slit", slit, 12.0, 262.0), 0.6, spots)


def turning() -> Figure:
    longitude = (100.0 + np.arange(73) * 5.0) % 360
    share = np.clip(np.cos(np.radians(longitude - 200.0)), 0, None) * 0.2
    return lightcurve.light_curve(longitude, 0.95 + share, share, "northern oval")


def two_pixels() -> Figure:
    wave = np.array([3.43, 3.5])
    air, lines = np.linspace(3.43, 3.5, 50), np.linspace(3.44, 3.49, 9)
    labels = ["", *(f"R({i},{i})" for i in range(8))]
    level = np.array([1e6, 1e5])
    return spectrum.spectrum(wave, level, 10 * level, 1e3 * level, air, air / 4, lines, labels, np.ones(9))


FIGURES: dict[str, Callable[[], Figure]] = {
    "snr": snr_against_time,
    "season": season_chart,
    "nights": chosen_nights,
    "coverage": covered,
    "probability": probability,
    "fade": fading,
    "map": nights_map,
    "ellipse": ellipse,
    "comparison": comparison,
    "spectrum": line_spectrum,
    "disk": beam,
    "turn": turning,
}


@pytest.fixture(scope="session")
def figures() -> dict[str, Callable[[], Figure]]:
    """Return the drawing functions by name: each figure once, then the sizes that are hard to fit."""
    return FIGURES | {
        "season-short": lambda: season_chart(12),
        "nights-many": lambda: chosen_nights(22),
        "coverage-many": lambda: covered(33),
        "coverage-one": lambda: covered(1),
        "spectrum-space": lambda: line_spectrum(False),
        "spectrum-crowded": crowded_spectrum,
        "spectrum-imager": two_pixels,
        "comparison-long": long_comparison,
        "fade-space": fading_in_space,
        "disk-large": lambda: beam(46.0, 1.0),
    }


def make_report(
    title: str = "Uranus with echelle-4m, August 2027 to January 2028", few: bool = False
) -> Report:
    """Return a report of invented numbers with every figure in it, or with three."""
    count = 184
    hours = table(
        column("night", [(date(2027, 8, 1) + timedelta(days=i)).isoformat() for i in range(count)]),
        column("duration", np.linspace(1, 5, count), "h", decimals=2, description="length of the stretch"),
        column("range_rate", np.linspace(-30, 30, count), "km s-1", decimals=2),
        column("photon_rate", np.geomspace(1e-5, 1e9, count), "s-1 m-2"),
        column("time_to_goal", np.where(np.arange(count) % 3, 2.5, np.inf), "h", infinite="never"),
        column("note", ["<b>&" if i == 0 else "" for i in range(count)]),
        caption="Best stretches of the season",
    )
    pictures = [
        Picture(
            name, draw(), f"Text that stands for the {name} figure.", f"What to see in the {name} figure."
        )
        for name, draw in list(FIGURES.items())[: 3 if few else None]
    ]
    return Report(
        title=title,
        verdict="Feasible: ask for 9 nights",
        feasible=True,
        answer=[
            "One night of 4 h 20 min reaches SNR 5 in the lines of the setting; the sky limits it.",
            "Nine nights give 92 % of success with the weather of the site.",
        ],
        figures_of_merit={
            "time_to_goal": Entry(3.3, "h", random_error=0.4, systematic_error=0.3),
            "temperature": Entry(480.0, "K", random_error=12.0, systematic_error=9.0),
            "setting": Entry("lband"),
        },
        sections=[
            Section("How long", ["The goal needs 3 h 20 min."], pictures[:1]),
            Section("When", ["The best nights are in November."], pictures[1:3], {"hours": hours}),
            Section("The rest", [], pictures[3:]),
        ],
        inputs={"Target": "uranus", "Instrument": "echelle-4m"},
        assumptions=[Assumption("seeing", "0.8″ at 0.5 µm", "median of the site, instrument file line 12")],
        sources=["Archinal et al. 2018, Celest. Mech. Dyn. Astron. 130, 22"],
        cautions=["The observatory's own rules come first."],
        versions={"coldglow": "0.1.0"},
        seed=1,
    )


@pytest.fixture(scope="session")
def invented_report() -> Callable[..., Report]:
    return make_report
