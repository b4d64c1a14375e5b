import math
import warnings

import numpy as np
import pytest
from astropy import units as u
from astropy.coordinates import AltAz, EarthLocation, SkyCoord
from astropy.time import Time
from astropy.utils import iers

from coldglow.describe.records import Site
from coldglow.errors import NotFoundError, RangeError
from coldglow.sky.clock import times_grid
from coldglow.sky.stars import load_standards, star_altaz

SITE = Site(math.radians(-68.0), math.radians(-25.0), 4300.0)
ARCSEC = math.radians(1 / 3600)


def test_the_packaged_list():
    stars = load_standards()
    assert len(stars.designation) == stars.ra_rad.size == stars.magnitude.size > 40
    assert len(set(stars.designation)) == len(stars.designation)
    assert "HR 1038 (2 xi Tau)" in stars.designation
    assert "HR 1367" in stars.designation  # one without a name
    assert all(kind[:2] in {"B9", "A0", "A1"} for kind in stars.spectral_type)


@pytest.mark.parametrize(
    ("name", "ra", "dec", "motion_yr"),
    [
        # Hipparcos catalogue (ESA 1997, SP-1200), ICRS, epoch 1991.25, from memory to 0.1 arcmin
        ("HR 1038 (2 xi Tau)", (3, 27, 10.15), (9, 43, 57.6), 0.07),
        ("HR 3314", (8, 25, 39.63), (-3, 54, 23.1), 0.07),
    ],
)
def test_places_of_two_bright_stars(name, ra, dec, motion_yr):
    stars = load_standards()
    i = stars.designation.index(name)
    expected_ra = math.radians(15 * (ra[0] + ra[1] / 60 + ra[2] / 3600))
    sign = -1 if dec[0] < 0 else 1
    expected_dec = sign * math.radians(abs(dec[0]) + dec[1] / 60 + dec[2] / 3600)
    close = (6 + 25 * motion_yr) * ARCSEC
    assert (stars.ra_rad[i] - expected_ra) * math.cos(expected_dec) == pytest.approx(0, abs=close)
    assert stars.dec_rad[i] == pytest.approx(expected_dec, abs=close)


def test_altitude_and_azimuth_against_astropy():
    # astropy's own chain (apio13, diurnal aberration included) with its bundled UT1; no refraction
    stars = load_standards()
    times = ["2025-03-01T02:00:00", "2025-09-14T07:30:00", "2026-05-05T23:10:00"]
    altitude, azimuth = star_altaz(stars, SITE, times_grid(times).tt_s)
    location = EarthLocation.from_geodetic(-68.0 * u.deg, -25.0 * u.deg, 4300.0 * u.m)
    with (
        iers.conf.set_temp("auto_download", False),
        iers.conf.set_temp("auto_max_age", None),
        warnings.catch_warnings(),
    ):
        warnings.simplefilter("ignore")
        frame = AltAz(obstime=Time(times)[None, :], location=location)
        seen = SkyCoord(stars.ra_rad[:, None] * u.rad, stars.dec_rad[:, None] * u.rad).transform_to(frame)
    assert altitude.shape == (stars.ra_rad.size, 3)
    east = (azimuth - seen.az.rad + np.pi) % (2 * np.pi) - np.pi
    assert np.abs(altitude - seen.alt.rad).max() < 1.0 * ARCSEC
    assert np.abs(east * np.cos(altitude)).max() < 1.0 * ARCSEC


def test_one_time_is_a_column_of_many():
    stars = load_standards()
    tt_s = times_grid(["2027-11-25T05:00:00", "2027-11-25T06:00:00"]).tt_s
    together, _ = star_altaz(stars, SITE, tt_s)
    alone, _ = star_altaz(stars, SITE, tt_s[1])
    np.testing.assert_allclose(together[:, 1:], alone, atol=1e-13)


def user(tmp_path, text):
    path = tmp_path / "stars.csv"
    path.write_text(text, encoding="utf-8")
    return str(path)


def test_a_list_of_the_users_own(tmp_path):
    stars = load_standards(
        user(
            tmp_path,
            "# ours\n\ndesignation, ra_deg, dec_deg, magnitude, colour\nStar one, 10.5, -20, 6.5, 0\n\n"
            '"Star, two", -30, 5e-1, 7, 1\n',
        )
    )
    assert stars.designation == ("Star one", "Star, two")
    np.testing.assert_allclose(np.degrees(stars.ra_rad), [10.5, 330.0])
    np.testing.assert_allclose(np.degrees(stars.dec_rad), [-20.0, 0.5])
    assert stars.magnitude.tolist() == [6.5, 7.0]
    assert stars.spectral_type == ("", "")


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("designation,ra_deg,dec_deg\nx,1,2\n", "has no column magnitude"),
        ("", "names nothing"),
        ("designation,ra_deg,dec_deg,magnitude\n", "holds no star"),
        (
            "# c\ndesignation,ra_deg,dec_deg,magnitude\na,1,2,3\nx,1h,2,3\n",
            r":4: ra_deg is '1h'; write a number",
        ),
        ("designation,ra_deg,dec_deg,magnitude\nx,1,2\n", ":2: magnitude is ''"),
        ("designation,ra_deg,dec_deg,magnitude\nx,1,nan,3\n", ":2: dec_deg is 'nan'"),
        ("designation,ra_deg,dec_deg,magnitude\nx,1,91,3\n", ":2: a star at ra_deg 1, dec_deg 91"),
    ],
)
def test_wrong_lists_are_told_with_their_line(tmp_path, text, words):
    with pytest.raises(RangeError, match=words):
        load_standards(user(tmp_path, text))


def test_a_missing_list_is_told(tmp_path):
    with pytest.raises(NotFoundError, match="no list of standard stars"):
        load_standards(str(tmp_path / "no.csv"))
