"""At the telescope: the chosen stretches as a calendar, and a plain page for each night."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from itertools import groupby

import numpy as np
from scipy.constants import arcsec

from coldglow import __version__
from coldglow.answers.asking.chosen import Stretch
from coldglow.answers.common.scenes import conditions_words
from coldglow.answers.planning.standards import Standard, sexagesimal, standards_table
from coldglow.describe.records import Orbit, Request, Site
from coldglow.detect.beam import Disk, slit_angle
from coldglow.report import words
from coldglow.report.calendar import Event, StretchFacts, calendar_text, describe_stretch
from coldglow.report.nightpage import NightPlan, night_pages
from coldglow.report.results import Entry, Table, column, table
from coldglow.scenario import Scenario
from coldglow.sky.clock import iso_from_tt
from coldglow.sky.events import night_events
from coldglow.sky.track import Track

Pairs = Sequence[tuple[Stretch, tuple[Standard, ...]]]


# ---------------------------------------------------------------- calendar


def calendar_of(request: Request, pairs: Pairs) -> str:
    """Return the stretches as a calendar, one event each.

    The stamp of making is the first evening of the request, so that the same plan gives the same bytes.
    """
    events = [_event(request, stretch, stars) for stretch, stars in pairs]
    return calendar_text(events, request.name, f"{request.dates.first}T00:00:00", __version__)


def _event(request: Request, stretch: Stretch, stars: Sequence[Standard]) -> Event:
    scene, track = stretch.scene, stretch.scene.track
    inside = slice(stretch.first, stretch.end)
    middle = (stretch.first + stretch.end - 1) // 2
    airmass = track.airmass[inside]
    longitude = stretch.longitudes_deg
    integration_s, coadds, _ = stretch.setup
    facts = StretchFacts(
        airmass_start=float(airmass[0]),
        airmass_end=float(airmass[-1]),
        airmass_min=float(airmass.min()),
        longitude_start_deg=longitude[0],
        longitude_end_deg=longitude[1],
        longitude_system=track.system.name,
        integration_s=integration_s,
        coadds=coadds,
        setting=scene.use.setting.name,
        ra_rate_arcsec_h=3600.0 / arcsec * float(track.ra_rate_rad_s[middle]),
        dec_rate_arcsec_h=3600.0 / arcsec * float(track.dec_rate_rad_s[middle]),
        standards_before=tuple(str(star) for star in stars if star.when == "before"),
        standards_after=tuple(str(star) for star in stars if star.when == "after"),
    )
    place, name = scene.use.instrument.place, scene.use.instrument.name
    standard = " and standard star" if any(star.when == "before" for star in stars) else ""
    where = "" if isinstance(place, Orbit) else f", {_site_words(place)}"
    return Event(
        str(iso_from_tt(stretch.start_tt_s)),
        str(iso_from_tt(stretch.end_tt_s)),
        f"{request.target.name}, {name} ({scene.use.setting.name})",
        (
            f"First integration {_clock(stretch.exposing_tt_s)} UTC, after acquisition{standard}",
            *describe_stretch(facts),
            f"{scene.use.instrument.operation.nod}: {frames_words(stretch)}; "
            f"expected SNR {words.number(stretch.snr)}",
        ),
        f"{name}{where}",
    )


def _clock(tt_s: float) -> str:
    """Return an instant as hours and minutes, UTC."""
    return str(iso_from_tt(tt_s, "m"))[11:16]


def _site_words(site: Site) -> str:
    longitude, latitude = np.degrees([site.longitude_rad, site.latitude_rad])
    return f"longitude {longitude:.4f} deg, latitude {latitude:.4f} deg, {site.height_m:.0f} m"


def frames_words(stretch: Stretch) -> str:
    """Return what to take in a stretch: positions, integrations at each, open shutter in all."""
    integration_s, coadds, _ = stretch.setup
    operation = stretch.scene.use.instrument.operation
    positions = int(stretch.open_s / (integration_s * coadds) + 1e-9)
    if operation.nod == "on-slit" and positions > 1:
        positions -= positions % 2  # A and B alike
    each = f"{words.count(coadds, 'integration')} of {words.short(integration_s)} s"
    total = f"{words.duration(positions * coadds * integration_s)} of open shutter"
    if operation.nod == "stare":
        return f"{words.count(positions, 'integration')} of {words.short(integration_s)} s ({total})"
    if operation.nod == "on-slit":
        alike = ", the target in A and B alike" if positions > 1 else ""
        return f"{words.count(positions, 'position')}, {each} in each{alike} ({total})"
    share = words.percent(operation.on_fraction)
    return f"{words.count(positions, 'position')}, {each} in each, {share} of them on the target ({total})"


# ---------------------------------------------------------------- pages


def pages_of(request: Request, pairs: Pairs) -> str:
    """Return one sheet for each night of each instrument, as a page."""

    def sheet(pair: tuple[Stretch, tuple[Standard, ...]]) -> tuple[str, str]:
        return pair[0].night, pair[0].scene.use.instrument.name

    plans = [_plan(request, list(group)) for _, group in groupby(sorted(pairs, key=sheet), sheet)]
    return night_pages(request.name, plans)


def _plan(request: Request, pairs: Pairs) -> NightPlan:
    scene, night = pairs[0][0].scene, pairs[0][0].night
    instrument = scene.use.instrument
    in_space = isinstance(instrument.place, Orbit)
    facts = {} if in_space else _events(request, scene, night)
    settings = words.listing(list(dict.fromkeys(stretch.scene.use.setting.name for stretch, _ in pairs)))
    facts["setting"] = Entry(settings)
    facts["conditions"] = Entry(conditions_words(scene.use, scene.air), label="conditions planned for")
    steps = [step for stretch, stars in pairs for step in _steps(stretch, stars)]
    kind = "seen from the point that the telescope orbits" if in_space else "topocentric"
    notes = [
        f"Times are UTC. Right ascension and declination are astrometric (ICRS) and {kind}; rates are "
        "relative to the stars, that of right ascension times the cosine of the declination; the longitude "
        f"is planetographic in system {scene.track.system.name}."
    ]
    if not in_space:
        charged = words.duration(scene.overhead_s)
        notes.append(
            f"The forecast charges {charged} of acquisition and standard stars before the first integration "
            "of each stretch; the star after the last one is best taken at once, in twilight if need be."
        )
    notes.append("The observatory's own rules and the people at the telescope come first.")
    return NightPlan(
        night,
        instrument.name,
        facts,
        steps,
        _track_table([s for s, _ in pairs]),
        standards_table(pairs),
        notes,
    )


def _events(request: Request, scene: Scenario, night: str) -> dict[str, Entry]:
    place = scene.use.instrument.place
    assert isinstance(place, Site)
    body = request.target.body
    stored = body.endswith(".ecsv")
    events = night_events(place, [night], "" if stored else body, request.ephemeris)
    names: Mapping[str, str] = {
        "sunset": "sunset",
        "astronomical_dusk": "Sun below −18° from",
        "astronomical_dawn": "Sun below −18° until",
        "sunrise": "sunrise",
        "rise": f"{request.target.name} rises",
        "transit": "transit",
        "set": f"{request.target.name} sets",
    }
    found = {}
    for name, label in names.items():
        iso = str(iso_from_tt(getattr(events, f"{name}_tt_s"), "m")[0])
        if iso or (name in ("astronomical_dusk", "astronomical_dawn")):
            found[name] = Entry(iso, text=f"{iso[11:16]} UTC" if iso else "never", label=label)
    return found


def _steps(stretch: Stretch, stars: Sequence[Standard]) -> list[str]:
    instrument, (_, _, fill) = stretch.scene.use.instrument, stretch.setup
    before = [star for star in stars if star.when == "before"]
    after = [star for star in stars if star.when == "after"]

    first = f"{_clock(stretch.start_tt_s)} acquisition"
    if before:
        first = f"{_clock(stretch.start_tt_s)} standard star {before[0].designation}, then acquisition"
    taking = (
        f"{_clock(stretch.exposing_tt_s)} first integration ({stretch.scene.use.setting.name}, "
        f"{instrument.operation.nod}): {frames_words(stretch)}; the brightest pixel fills "
        f"{words.percent(fill)} of the well; {_longitudes(stretch)}, "
        f"expected SNR {words.number(stretch.snr)}"
    )
    last = f"{_clock(stretch.end_tt_s)} end of the stretch"
    if after:
        last += f", standard star {after[0].designation}"
    return [f"{first}.", f"{taking}.", f"{last}."]


def _longitudes(stretch: Stretch) -> str:
    """Return which longitudes become central while exposing."""
    begin, end = stretch.longitudes_deg
    turns = (stretch.end_tt_s - stretch.exposing_tt_s) / stretch.scene.track.system.period_s
    if turns >= 1.0:
        return f"{words.number(turns, 3)} turns from central longitude {begin:.0f}°"
    return f"central longitude {begin:.0f}° to {end:.0f}°"


def _track_table(stretches: Sequence[Stretch]) -> Table:
    scene = stretches[0].scene
    index = np.concatenate([stretch.marks() for stretch in stretches])
    track = scene.track.take(index)
    rate = 3600.0 / arcsec
    in_space = isinstance(scene.use.instrument.place, Orbit)
    times = [str(text) for text in iso_from_tt(track.grid.tt_s, "m")]
    columns = [
        column("time", [text[11:] for text in times]),
        column("airmass", track.airmass, decimals=2, shown=not in_space),
        column("altitude", np.degrees(track.altitude_rad), "deg", decimals=0, shown=not in_space),
        column(
            "longitude", np.round(np.degrees(track.sub_observer_longitude_rad)) % 360.0, "deg", decimals=0
        ),
        column("ra", [sexagesimal(float(angle), hours=True) for angle in track.ra_icrs_rad]),
        column("dec", [sexagesimal(float(angle)) for angle in track.dec_icrs_rad]),
        column("ra_rate", rate * track.ra_rate_rad_s, "arcsec h-1", decimals=2),
        column("dec_rate", rate * track.dec_rate_rad_s, "arcsec h-1", decimals=2),
        column("range_rate", 1e-3 * track.range_rate_m_s, "km s-1", decimals=2),
        column(
            "moon", np.degrees(track.moon_separation_rad), "deg", decimals=0, description="from the target"
        ),
    ]
    if scene.use.instrument.opening.kind == "slit":
        columns.append(column("slit_angle", _slit_angles(scene, track), "deg", decimals=0))
    return table(
        *columns, caption=f"Hour by hour, UTC of {words.days(times[0], times[-1])}", rows=range(index.size)
    )


def _slit_angles(scene: Scenario, track: Track) -> list[float]:
    """Return the position angle of the slit, north through east of date, 0 to 180 degrees."""
    turned = np.nan_to_num(track.parallactic_angle_rad)
    disks = [Disk(1.0, 1.0, float(a), float(b)) for a, b in zip(track.pole_angle_rad, turned, strict=True)]
    opening = scene.use.instrument.opening
    return [float(np.degrees(slit_angle(opening, disk) + disk.pole_angle_rad) % 180.0) for disk in disks]
