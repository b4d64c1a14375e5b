"""Every hypothesis strategy that more than one test module may use: records, quantities, texts."""

import dataclasses
import datetime
import math

from hypothesis import strategies as st

from coldglow.describe.records import (
    Budget,
    Conditions,
    Continuum,
    Cooling,
    Coverage,
    Dates,
    Detector,
    Emission,
    Estimate,
    Fade,
    Figure,
    Goal,
    ImageQuality,
    Instrument,
    Limits,
    LongitudeSystem,
    Opening,
    Operation,
    Orbit,
    PeriodicTerm,
    Quartiles,
    Request,
    Rotation,
    Setting,
    Site,
    Sky,
    Spot,
    Target,
    Telescope,
    Use,
    Weather,
)
from coldglow.describe.request_schema import ANGLE_MAX_RAD
from coldglow.units import KINDS


def floats(low, high):
    return st.floats(low, high, allow_nan=False, allow_infinity=False)


words = st.from_regex(r"[A-Za-z][A-Za-z0-9 +_-]{0,20}[A-Za-z0-9]", fullmatch=True)
sources = st.text(st.characters(codec="utf-8", exclude_categories=["C", "Z"]), min_size=1, max_size=40)
angles = floats(-math.pi, math.pi)
latitudes = floats(-math.pi / 2, math.pi / 2)
dates = st.dates(datetime.date(1900, 1, 1), datetime.date(2150, 12, 31))
kinds = st.sampled_from(sorted(KINDS))


@st.composite
def estimates(draw, low, high, uncertain=True):
    value = draw(floats(low, high))
    spread = floats(0, abs(value)) if uncertain else st.just(0.0)
    return Estimate(value, draw(spread), draw(spread))


@st.composite
def longitude_systems(draw, name):
    grows = draw(st.sampled_from(["west", "east"]))
    rate = draw(floats(1e-6, 1e-3)) * (1 if grows == "west" else -1)
    days = draw(st.integers(-36000, 54000))
    return LongitudeSystem(
        name=name,
        prime_meridian_rad=draw(floats(0, 2 * math.pi)),
        rate_rad_s=rate,
        grows=grows,
        period_s=2 * math.pi / abs(rate),
        period_uncertainty_s=draw(floats(0, 3600)),
        tie_epoch_s=(days - 0.5) * 86400.0,
        source=draw(sources),
    )


@st.composite
def rotations(draw):
    names = draw(st.lists(words, min_size=1, max_size=3, unique=True))
    small = floats(-0.01, 0.01)
    terms = st.builds(PeriodicTerm, angles, floats(-100, 100), small, small, small)
    return Rotation(
        pole_ra_rad=(draw(angles), draw(small)),
        pole_dec_rad=(draw(latitudes), draw(small)),
        terms=tuple(draw(st.lists(terms, max_size=3))),
        systems=tuple(draw(longitude_systems(name)) for name in names),
        source=draw(sources),
        reason=draw(sources),
    )


@st.composite
def figures(draw):
    radius = draw(floats(2e6, 1e8))
    return Figure(radius, radius * draw(floats(0.75, 1)), radius * draw(floats(0, 0.5)), draw(sources))


@st.composite
def emissions(draw, systems):
    names = draw(st.lists(words, max_size=3, unique=True))
    spots = []
    for name in names:
        radius = draw(floats(0.01, 1.5))
        spots.append(
            Spot(
                name=name,
                latitude_rad=draw(latitudes),
                longitude_rad=draw(angles),
                system=draw(st.sampled_from(systems)),
                radius_rad=radius,
                inner_radius_rad=radius * draw(st.sampled_from([0.0, 0.5])),
                share=draw(floats(0, 0.33)),
            )
        )
    return Emission(
        temperature_k=draw(estimates(101, 2999)),
        column_m2=draw(estimates(1e9, 1e19)),
        given_as="vertical",
        lte_fraction=draw(estimates(0.01, 1)),
        spots=tuple(spots),
        source=draw(sources),
    )


@st.composite
def continua(draw):
    def table(values, least):
        wavelengths = draw(st.lists(floats(1.01e-6, 9.99e-6), min_size=least, max_size=5, unique=True))
        return tuple(sorted(wavelengths)), tuple(draw(values) for _ in wavelengths)

    albedo_wavelength_m, albedo = table(floats(0, 1), 1)
    thermal_wavelength_m, thermal = table(floats(0, 1e9), 0)
    return Continuum(albedo_wavelength_m, albedo, thermal_wavelength_m, thermal, draw(sources))


@st.composite
def coolings(draw, temperature_k):
    law = draw(st.sampled_from(["constant", "linear", "exponential", "table"]))
    days = sorted(draw(st.lists(dates, min_size=2, max_size=4, unique=True)))
    rows = [day.isoformat() for day in days] if law == "table" else []
    floor = draw(estimates(51, temperature_k)) if law in ("linear", "exponential") else None
    return Cooling(
        law=law,
        epoch=days[0].isoformat(),
        rate_k_s=draw(estimates(-1e-6, -1e-12)) if law == "linear" else Estimate(0.0),
        floor_k=floor,
        time_scale_s=draw(estimates(1e6, 1e11)) if law == "exponential" else None,
        column_rate_s=Estimate(0.0) if law == "table" else draw(estimates(-3e-8, 3e-8)),
        table_dates=tuple(rows),
        table_temperature_k=tuple(draw(floats(101, 2999)) for _ in rows),
        table_column_m2=tuple(draw(floats(1e9, 1e19)) for _ in rows),
        valid_until=draw(st.none() | st.just(days[-1].isoformat())),
        source=draw(sources),
    )


@st.composite
def targets(draw):
    rotation = draw(rotations())
    emission = draw(emissions([system.name for system in rotation.systems]))
    return Target(
        name=draw(words),
        body=draw(st.sampled_from(["jupiter", "saturn", "uranus", "neptune"])),
        rotation=rotation,
        figure=draw(figures()),
        emission=emission,
        continuum=draw(continua()),
        cooling=draw(coolings(emission.temperature_k.value)),
    )


@st.composite
def quartiles(draw, low, high):
    return Quartiles(*sorted(draw(floats(low, high)) for _ in range(3)))


@st.composite
def skies(draw, ground):
    nothing = Quartiles(0.0, 0.0, 0.0)
    return Sky(
        water_m=draw(quartiles(0, 0.05)) if ground else nothing,
        seeing_rad=draw(quartiles(3e-7, 4e-5)) if ground else nothing,
        temperature_k=draw(floats(151, 319)) if ground else 0.0,
        airglow_photon_s_m2_sr_m=draw(floats(0, 1e21)) if ground else 0.0,
        zodiacal_scale=0.0 if ground else draw(floats(0, 100)),
        source=draw(sources),
    )


@st.composite
def limits(draw, ground):
    ours = Limits(
        airmass_max=2.0,
        altitude_min_rad=0.0,
        altitude_max_rad=math.pi / 180 * 88,
        sun_altitude_max_rad=-math.pi / 180 * 12,
        daytime=False,
        sun_separation_min_rad=draw(floats(0.1, 3)),
        moon_separation_min_rad=draw(floats(0, 3)),
        elongation_min_rad=0.0,
        elongation_max_rad=math.pi,
        longest_visit_s=math.inf,
    )
    if ground:
        return dataclasses.replace(
            ours,
            airmass_max=draw(floats(1, 39) | st.just(math.inf)),
            altitude_min_rad=draw(floats(0, 0.7)),
            altitude_max_rad=draw(floats(0.8, 1.57)),
            sun_altitude_max_rad=draw(floats(-1, 1)),
            daytime=draw(st.booleans()),
        )
    return dataclasses.replace(
        ours,
        elongation_min_rad=draw(floats(0, 1.5)),
        elongation_max_rad=draw(floats(1.6, 3.14)),
        longest_visit_s=draw(floats(400, 1e6) | st.just(math.inf)),
    )


@st.composite
def settings_of(draw, name, imager):
    def band():
        return tuple(sorted(draw(st.lists(floats(1.91e-6, 5.49e-6), min_size=2, max_size=2, unique=True))))

    off = band() if imager and draw(st.booleans()) else None
    prior = draw(floats(0.01, 10)) if imager and off is None else math.inf
    return Setting(
        name=name,
        band_m=band(),
        resolving_power=0.0 if imager else draw(floats(10, 1e6)),
        pixels_per_element=draw(floats(0.5, 20)),
        throughput=draw(floats(1e-6, 1)),
        off_band_m=off,
        on_band_share=1.0 if off is None else draw(floats(0.01, 0.99)),
        continuum_prior=prior,
        source=draw(sources),
    )


@st.composite
def openings(draw):
    kind = draw(st.sampled_from(["slit", "ifu", "imager"]))
    width = draw(floats(1e-7, 1e-4))
    angle = draw(st.sampled_from(["rotation-axis", "equator", "position-angle"]))
    return Opening(
        kind=kind,
        width_rad=width,
        length_rad=width * draw(floats(1, 10)),
        pixel_rad=width * draw(floats(0.1, 1)),
        angle=angle,
        position_angle_rad=draw(angles) if angle == "position-angle" else 0.0,
        offset_rad=draw(floats(-1e-3, 1e-3)),
    )


@st.composite
def images(draw, ground):
    kind = draw(st.sampled_from(["seeing", "adaptive"])) if ground else "diffraction"
    return ImageQuality(
        kind=kind,
        core_share={"seeing": 0.0, "diffraction": 1.0}.get(kind)
        if kind != "adaptive"
        else draw(floats(0.01, 1)),
        core_fwhm_rad=0.0 if kind == "seeing" else draw(floats(0, 2e-5)),
        drift_rad=draw(floats(0, 2e-4)),
    )


@st.composite
def detectors(draw):
    shortest = draw(floats(1e-3, 1e3))
    return Detector(
        dark_e_s=draw(floats(0, 1e5)),
        read_noise_pair_e=draw(floats(0, 1e3)),
        reads=2 * draw(st.integers(1, 500)),
        sampling=draw(st.sampled_from(["pairs", "ramp"])),
        full_well_e=draw(floats(1e3, 1e6)),
        usable_fraction=draw(floats(0.01, 1)),
        shortest_s=shortest,
        longest_s=shortest * draw(floats(1, 100)),
        readout_s=draw(floats(0, 100)),
        source=draw(sources),
    )


@st.composite
def operations(draw):
    nod = draw(st.sampled_from(["off-slit", "stare"]))
    share = floats(0, 0.9)
    return Operation(
        nod=nod,
        on_fraction=draw(floats(0.01, 0.99)) if nod == "off-slit" else 1.0,
        background_rows=draw(floats(0.1, 100) | st.just(math.inf)) if nod == "stare" else math.inf,
        nod_time_s=draw(floats(1, 1e4)),
        nod_overhead_s=draw(floats(0, 1e4)),
        acquisition_s=draw(floats(0, 1e4)),
        calibration_share=draw(share),
        standards_s=draw(floats(0, 1e4)),
        visit_floor=draw(share),
        common_floor=draw(share),
        flux_error=draw(share),
        relative_error=draw(share),
        source=draw(sources),
    )


@st.composite
def instruments(draw):
    ground = draw(st.booleans())
    opening = draw(openings())
    names = draw(st.lists(words, min_size=1, max_size=3, unique=True))
    emissivity = draw(floats(0, 0.9))
    return Instrument(
        name=draw(words),
        place=draw(st.builds(Site, angles, latitudes, floats(-400, 8000))) if ground else Orbit(),
        sky=draw(skies(ground)),
        limits=draw(limits(ground)),
        telescope=Telescope(
            draw(floats(0.1, 50)),
            draw(floats(0, 0.9)),
            draw(floats(5, 320)),
            emissivity,
            (1 - emissivity) * draw(floats(0.1, 1)),
            draw(sources),
        ),
        opening=opening,
        image=draw(images(ground)),
        settings=tuple(draw(settings_of(name, opening.kind == "imager")) for name in names),
        detector=draw(detectors()),
        operation=draw(operations()),
        atmosphere="",
    )


@st.composite
def requests(draw):
    """A request for one target and up to two instruments, with every block drawn."""
    target = draw(targets())
    uses = []
    for _ in range(draw(st.integers(1, 2))):
        instrument = draw(instruments())
        uses.append(Use(instrument, draw(st.sampled_from(instrument.settings)), draw(floats(0, 100))))
    first = draw(st.dates(datetime.date(1950, 1, 1), datetime.date(2049, 1, 1)))
    nights = [(first + datetime.timedelta(days=day)).isoformat() for day in range(10)]
    unit = draw(st.sampled_from(["night", "half-night"]))
    bin_goal = draw(st.sampled_from(["snr", "temperature_error_k", "minutes"]))
    goals = {"snr": None, "temperature_error_k": None, "minutes": None}
    goals[bin_goal] = draw(floats(1.01, 999))
    spots = [spot.name for spot in target.emission.spots]
    latitude = draw(latitudes) if bin_goal == "minutes" and draw(st.booleans()) else None
    return Request(
        name=draw(words),
        target=target,
        uses=tuple(uses),
        longitudes=draw(st.sampled_from([system.name for system in target.rotation.systems])),
        dates=Dates(
            first=nights[0],
            last=nights[-1],
            offered=(),
            forbidden=tuple(draw(st.lists(st.sampled_from(nights[:5]), unique=True))),
            fixed=tuple(draw(st.lists(st.sampled_from(nights[5:]), unique=True))),
            unit=unit,
            step_s=draw(floats(10, 3600)),
        ),
        goal=Goal(
            draw(floats(1, 100)),
            tuple(draw(st.lists(words, max_size=2))),
            draw(st.none() | floats(0.1, 100)),
            draw(st.none() | floats(0.01, 1)),
            draw(floats(0.01, 0.99)),
        ),
        coverage=Coverage(
            bins=draw(st.integers(1, 72)),
            latitude_rad=latitude,
            angle_max_rad=ANGLE_MAX_RAD if latitude is None else draw(floats(0.1, 1.5)),
            lit="any" if latitude is None else draw(st.sampled_from(["any", "day", "night"])),
            spot="" if latitude is not None else draw(st.sampled_from(["", *spots])),
            candidates=draw(st.sampled_from(["night", "stretch", unit])),
            stretch_s=draw(floats(61, 86000)),
            consecutive=draw(st.booleans()),
            block_nights=draw(st.integers(1, 60)),
            nights_max=draw(st.none() | floats(1, 100)),
            half_night_cost=draw(floats(0.1, 1)),
            time_limit_s=draw(floats(1, 3600)),
            asked=True,
            **goals,
        ),
        conditions=Conditions(
            draw(st.sampled_from(["good", "median", "poor"])),
            draw(st.none() | floats(1e-6, 1e-5)),
            draw(st.none() | floats(0, 0.05)),
        ),
        weather=Weather(
            draw(floats(0, 1)),
            draw(floats(0, 0.99)),
            draw(floats(0.01, 0.99)),
            draw(st.booleans()),
            draw(st.integers(10, 1000000)),
            draw(st.integers(0, 2**32 - 1)),
        ),
        budget=Budget(draw(st.none() | floats(0.1, 100)), draw(st.none() | floats(0.1, 100))),
        fade=Fade(first.year, first.year + draw(st.integers(0, 99)), 100, draw(floats(0.1, 100))),
        ephemeris=draw(st.sampled_from(["", "builtin"])),
    )
