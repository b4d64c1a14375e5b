"""What must not matter does not: units, the grid, the order of things, where on Earth, which year."""

import dataclasses
import re

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from coldglow.answers import hours, sky
from coldglow.describe.load import load_instrument, load_request, load_target
from coldglow.describe.records import Site
from coldglow.scenario import scenario, watch
from coldglow.sky.clock import span_grid
from coldglow.sky.track import make_track

relaxed = settings(
    max_examples=8,
    deadline=None,
    suppress_health_check=[HealthCheck.too_slow, HealthCheck.function_scoped_fixture],
)
OTHER_UNITS = [  # the same quantity twice, and how far a float may carry the difference
    ("step: 5 min", "step: 300 s"),
    ("time_limit: 20 s", "time_limit: 0.333333333333333333 min"),
    ("probability: 90 %         # that the measured", "probability: 0.9 # that the measured"),
    ("clear_fraction: 70 %", "clear_fraction: 0.70"),
]
INSTRUMENT_UNITS = """name: the same in other units
telescope:
  aperture: 820 cm
  temperature: 283.15 K
"""


def test_the_same_request_in_other_units_gives_the_same_words(write):
    request = write()
    assert str(hours(write(*OTHER_UNITS, name="other.yaml"))) == str(hours(request))


@pytest.mark.parametrize(
    ("key", "first", "second"),
    [
        ("seeing", "0.8 arcsec", "0.01333333333333333 arcmin"),
        ("seeing", "0.8 arcsec", "800 mas"),
        ("water", "3 mm", "0.3 cm"),
        ("water", "3 mm", "3000 um"),
    ],
)
def test_conditions_in_other_units_give_the_same_information(write, key, first, second):
    found = []
    for index, text in enumerate((first, second)):
        change = ("  name: median              # good", f"  {key}: {text}\n  name: median # good")
        found.append(hours(write(change, name=f"{index}.yaml")))
    np.testing.assert_allclose(found[1]["snr"], found[0]["snr"], rtol=1e-9)


def test_a_target_in_other_units_gives_the_same_light(write, variant):
    first = variant("target", "uranus", "emission:\n  column: 1e15 m-2\n  temperature: 400 K\n")
    request = write(("target: uranus              #", f"target: {first} #"))
    one = hours(request)
    variant("target", "uranus", "emission:\n  column: 1e11 cm-2\n  temperature: 126.85 degC\n")
    np.testing.assert_allclose(hours(request)["snr"], one["snr"], rtol=1e-9)


@relaxed
@given(st.permutations(range(3)), st.integers(0, 2))
def test_the_order_of_nights_and_lines_does_not_matter(write, order, cut):
    nights = ["2027-11-20", "2027-11-21", "2027-11-22"]
    names = ["Q(1,0)", "Q(3,0)", "Q(2,1)l"]

    def asked(sequence):
        listed = ", ".join(nights[i] for i in sequence if i != cut)
        lines = ", ".join(f'"{names[i]}"' for i in sequence)
        text = write(("  unit: half-night", f"  offered: [{listed}]\n  unit: half-night")).read_text(
            encoding="utf-8"
        )
        path = write(name="asked.yaml")
        path.write_text(
            text.replace("goal:\n  snr: 30", f"goal:\n  lines: [{lines}]\n  snr: 30"), encoding="utf-8"
        )
        return hours(path)

    one, other = asked(range(3)), asked(order)
    assert list(other["night"]) == list(one["night"])
    np.testing.assert_allclose(other["snr"], one["snr"], rtol=1e-12)


def whole(request):
    """Return the information of all steps of the first use, before any floor."""
    seen = scenario(request, request.uses[0], watch(request, request.uses[0]))
    steps = seen.steps
    return float((steps.matrix[:, 0, 0] * steps.shutter_share * steps.step_s * steps.observable).sum())


def test_a_season_is_the_sum_of_its_parts(write):
    request = load_request(write())

    def part(first, last):
        return whole(
            dataclasses.replace(request, dates=dataclasses.replace(request.dates, first=first, last=last))
        )

    parts = [part(night, night) for night in ("2027-11-20", "2027-11-21", "2027-11-22")]
    assert part("2027-11-20", "2027-11-22") == pytest.approx(sum(parts), rel=2e-3)
    assert min(parts) > 0.0


@pytest.mark.parametrize("step_s", [60.0, 120.0, 600.0])
def test_the_step_of_the_grid_does_not_matter(write, step_s):
    request = load_request(write())
    finer = dataclasses.replace(request, dates=dataclasses.replace(request.dates, step_s=step_s))
    # a stretch begins and ends on a step: two edges a night of some five hours
    assert whole(finer) == pytest.approx(whole(request), rel=2.5 * (step_s + 300.0) / 18000.0)


def test_longitudes_wrap_and_stay_in_a_turn():
    answer = sky("jupiter", site=("0deg", "20deg", "0m"), first="2027-03-01", last="2027-03-03", step="20min")
    longitude = np.asarray(answer["sub_observer_longitude"])
    assert longitude.min() >= 0.0
    assert longitude.max() < 360.0
    steps = np.diff(longitude)
    forward = np.where(steps < -180.0, steps + 360.0, steps)
    np.testing.assert_allclose(forward, forward.mean(), rtol=2e-3)


def test_a_longitude_of_a_site_means_the_same_a_turn_further():
    words = {"first": "2027-11-20", "last": "2027-11-21", "step": "2h"}
    east = sky("uranus", site=("190deg", "20deg", "0m"), **words)
    west = sky("uranus", site=("-170deg", "20deg", "0m"), **words)
    for name in ("altitude", "azimuth", "ra", "dec", "range_rate", "sub_observer_longitude"):
        np.testing.assert_allclose(west[name], east[name], rtol=0.0, atol=1e-7)


PLACES = {
    "north pole": (0.0, 90.0),
    "south pole": (0.0, -90.0),
    "polar circle": (25.0, 67.0),
    "equator": (-78.0, 0.0),
    "date line, east of it": (-180.0, -17.0),
    "date line, west of it": (180.0, -17.0),
    "southern winter": (-68.0, -54.0),
}


@pytest.mark.parametrize("name", PLACES)
@pytest.mark.parametrize("night", ["2027-06-21", "2027-12-21", "2028-02-29", "2027-03-20"])
def test_every_place_and_season_has_a_sane_answer(write, name, night):
    longitude, latitude = np.radians(PLACES[name])
    request = load_request(write(nights=(night, night)))
    use = request.uses[0]
    place = Site(float(longitude), float(latitude), 3000.0)
    moved = dataclasses.replace(use.instrument, place=place)
    answer = hours(dataclasses.replace(request, uses=(dataclasses.replace(use, instrument=moved),)))
    snr = np.asarray(answer["snr"], dtype=float)
    assert np.all(np.isfinite(snr))
    assert np.all(snr >= 0.0)
    assert answer.feasible is bool(snr.size)
    assert snr.size or re.search(r"never|cannot", " ".join(answer.sentences))
    assert {str(each) for each in answer["night"]} <= {night}


def test_a_target_behind_the_sun_is_an_answer(write):
    """Uranus stands in conjunction in May: nothing to observe, and the reason is the Sun."""
    grid = span_grid("2027-05-01T00:00", "2027-06-10T00:00", 3600.0)
    target, instrument = load_target("uranus"), load_instrument("echelle-8m")
    system = target.rotation.systems[0]
    track = make_track(target, instrument.place, instrument.limits, grid, system)
    nearest = int(np.argmin(track.solar_elongation_rad))
    assert np.degrees(track.solar_elongation_rad[nearest]) < 1.0
    day = str(grid.start_utc)[:4] + "-05-2"
    answer = hours(write(nights=(f"{day}0", f"{day}5")))
    assert answer.feasible is False
    assert "sun" in " ".join(answer.sentences).lower() or "daylight" in " ".join(answer.sentences).lower()
    for name in ("range_rate_m_s", "sub_observer_longitude_rad", "distance_m", "ra_rad"):
        assert np.all(np.isfinite(getattr(track, name))), name


def test_no_hour_is_lost_or_doubled_where_clocks_change(write):
    """UTC knows no summer time: the nights around the changes of clocks are as long as their neighbours."""
    for first, last in (("2028-03-24", "2028-03-27"), ("2027-10-29", "2027-11-01")):
        answer = sky("uranus", site=("10deg", "50deg", "0m"), first=first, last=last, step="1h")
        assert len(answer["time"]) == 73
        assert len(set(answer["time"])) == 73
