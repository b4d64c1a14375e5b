import math
import socket
from dataclasses import replace

import numpy as np
import pytest
from astropy.table import QTable
from skyfield_places import SITE, skyfield_place
from stand_in import BOTTOM, TOP, answer, serving

from coldglow.bridges.horizons import fetch
from coldglow.describe.records import Orbit
from coldglow.errors import RangeError, ServiceError
from coldglow.sky.stored import load_stored


def asked_for(query):
    start, stop = (np.datetime64(query[key].replace(" ", "T")) for key in ("START_TIME", "STOP_TIME"))
    return answer(start, stop, int(query["STEP_SIZE"].removesuffix("m")))


@pytest.fixture
def local(monkeypatch):
    """Point astroquery at a stand-in, and never wait between tries."""
    from astroquery.jplhorizons import Conf

    def at(url):
        monkeypatch.setattr(Conf, "horizons_server", url)

    return at


def ask(body="uranus", place=SITE, **options):
    return fetch(body, place, "2027-11-20", "2027-11-22T12:00", 360, pause=lambda _: None, **options)


def test_the_question_says_what_is_wanted(local):
    with serving(asked_for) as (url, asked):
        local(url)
        ask()
    (query,) = asked
    assert query["COMMAND"] == "799"  # the planet's centre, not its system
    assert query["QUANTITIES"] == "1,3,19,20"
    assert query["EXTRA_PREC"] == "YES"
    assert query["CENTER"] == "coord@399"
    assert [float(part) for part in query["SITE_COORD"].split(",")] == pytest.approx([292.0, -25.0, 4.3])
    assert (query["START_TIME"], query["STOP_TIME"]) == ("2027-11-16 00:00", "2027-11-26 12:00")


def test_the_answer_is_stored_with_its_origin_and_read_back(local, tmp_path):
    with serving(asked_for) as (url, _):
        local(url)
        table = ask()
    path = tmp_path / "uranus.ecsv"
    table.write(path, format="ascii.ecsv")
    assert QTable.read(path, format="ascii.ecsv")["distance"].unit == "AU"
    stored = load_stored(str(path), SITE)
    moments = np.arange("2027-11-16T00:00", "2027-11-26T12:01", 360, dtype="datetime64[m]")
    ra, dec, distance, rate, ra_rate, dec_rate, sun = skyfield_place(moments)
    assert stored.tt_s.size == moments.size
    np.testing.assert_allclose(np.diff(stored.tt_s), 6 * 3600.0)
    np.testing.assert_allclose(stored.ra_icrs_rad, ra, atol=1e-11)  # printed to 1e-9 deg
    np.testing.assert_allclose(stored.dec_icrs_rad, dec, atol=1e-11)
    np.testing.assert_allclose(stored.distance_m, distance * 149597870700.0, rtol=1e-13)
    np.testing.assert_allclose(stored.sun_distance_m, sun * 149597870700.0, rtol=1e-12)
    np.testing.assert_allclose(stored.range_rate_m_s, rate * 1e3, atol=1e-3)
    np.testing.assert_allclose(stored.ra_rate_rad_s, ra_rate * np.cos(dec), atol=2e-15)
    np.testing.assert_allclose(stored.dec_rate_rad_s, dec_rate, atol=2e-15)
    assert stored.body == "uranus"
    assert stored.answered == "2027-09-06"  # the date of the service's own answer
    assert stored.query.startswith(url)
    assert table.meta["service_body"] == "Uranus (799)"


def test_a_place_in_space_asks_for_the_lagrange_point(local, tmp_path):
    with serving(asked_for) as (url, asked):
        local(url)
        ask(place=Orbit()).write(tmp_path / "x.ecsv", format="ascii.ecsv")
    assert asked[0]["CENTER"] == "500@32"
    assert load_stored(str(tmp_path / "x.ecsv"), Orbit()).place == Orbit()


def test_a_body_that_we_do_not_know_goes_to_the_service_as_it_is(local):
    with serving(asked_for) as (url, asked):
        local(url)
        ask("DES=2003 EL61;")
    assert asked[0]["COMMAND"] == "DES=2003 EL61;"


def test_a_short_failure_is_survived(local):
    waits = []
    with serving(503, 500, asked_for) as (url, asked):
        local(url)
        table = fetch("uranus", SITE, "2027-11-20", "2027-11-21", 360, pause=waits.append)
    assert len(asked) == 3
    assert waits == [2.0, 4.0]
    assert len(table) == 37


def test_offline_is_a_sentence(local):
    with socket.socket() as closed:  # a port on which nobody listens
        closed.bind(("127.0.0.1", 0))
        local(f"http://127.0.0.1:{closed.getsockname()[1]}/api")
        with pytest.raises(ServiceError, match=r"could not be reached in 2 tries.*online\?"):
            ask(tries=2)


def test_a_silent_service_is_given_up_in_time(local):
    with serving(0.6) as (url, asked):
        local(url)
        with pytest.raises(ServiceError, match=r"tries of at most 0.1 s \(\w*Timeout"):
            ask(timeout_s=0.1, tries=2)
    assert len(asked) == 2


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ('No ephemeris for target "Uranus" after A.D. 2027-JAN-01\n', "No ephemeris for target"),
        ('Cannot interpret date. Type "?!" or try YYYY-Mon-Dy format.\n', "Cannot interpret date"),
        ("<html>maintenance</html>\n", "maintenance"),
        ("", "gave no table"),
        (TOP + BOTTOM, "gave no table"),
    ],
)
def test_a_refusal_is_told_in_the_services_own_words_and_not_repeated(local, text, words):
    with serving(text) as (url, asked):
        local(url)
        with pytest.raises(ServiceError, match=words):
            ask()
    assert len(asked) == 1


@pytest.mark.parametrize(
    ("start", "stop", "step"),
    [("2027-11-20", "2027-11-19", 60), ("2027-01-01", "2029-01-01", 1), ("2027-01-01", "2027-01-02", 0)],
)
def test_senseless_spans_are_refused_before_anything_is_asked(start, stop, step):
    with pytest.raises(RangeError, match="rows"):
        fetch("uranus", SITE, start, stop, step)


def test_a_wrong_date_is_named():
    with pytest.raises(RangeError, match=r"'2027-11-31' is no ISO date"):
        fetch("uranus", SITE, "2027-11-31", "2027-12-02")


def test_sites_west_and_east_are_the_same_place(local, tmp_path):
    with serving(asked_for) as (url, _):
        local(url)
        ask().write(tmp_path / "x.ecsv", format="ascii.ecsv")
    turned = replace(SITE, longitude_rad=SITE.longitude_rad + 2 * math.pi)
    assert load_stored(str(tmp_path / "x.ecsv"), turned).body == "uranus"
