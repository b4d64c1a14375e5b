"""Counts and noise by hand and by an equation of a library: the CCD equation, nod patterns, rates."""

import math

import numpy as np
import pytest
from astropy.stats import signal_to_noise_oir_ccd
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.constants import c, h, k
from scipy.integrate import quad

from coldglow.detect.beam import Beam
from coldglow.detect.bench import Glow
from coldglow.detect.detail import expose_one
from coldglow.detect.exposure import expose_moments
from coldglow.detect.information import nod_noise
from coldglow.detect.systematics import systematic_errors
from coldglow.errors import NotFoundError, RangeError
from coldglow.light.emission import photon_radiance_s_m2_sr
from coldglow.light.lines import load_lines
from coldglow.plan.goal import marginalise, temperature_error

ARCSEC = math.pi / 648000.0
BAND_M = (3.94e-6, 3.97e-6)
LINES = load_lines()


def camera(make, **changes):
    """A warm imager in space: its sky is the telescope's own Planck radiation, known in closed form."""
    return make.instrument(
        "space",
        opening={"kind": "imager", "pixel_rad": 0.2 * ARCSEC},
        telescope={"temperature_k": 200.0, "emissivity": 0.1},
        sky={"zodiacal_scale": 0.0},
        settings={"band_m": BAND_M, "resolving_power": 0.0, "continuum_prior": 1e-6, **changes},
        operation={"nod": "stare", "on_fraction": 1.0},
        detector={"longest_s": 60.0},
    )


def box(pixels=49.0, path_factor=2.0):
    """A box aperture of 49 pixels of 0.2 arcsec, all of it filled evenly."""
    one = np.ones(1)
    return Beam(
        pixels * (0.2 * ARCSEC) ** 2 * one,
        path_factor * one,
        one,
        one,
        0 * one,
        0 * one,
        pixels * one,
    )


def test_snr_of_one_integration_is_that_of_the_ccd_equation(make):
    """Howell 1989, PASP 101, 616, as in the library: source, sky, dark and read noise of n pixels."""
    made = camera(make)
    moments = make.moments_of(made, beam=box())
    exposure = expose_moments(moments, Glow(LINES, 600.0, 3e15, make.dark), None, made, made.settings[0])
    t = exposure.integration_s[0]
    # by hand, from Planck's law and the line list
    etendue = math.pi / 4 * 4.0**2 * (1 - 0.2**2) * 49 * (0.2 * ARCSEC) ** 2
    inside = LINES.within(*BAND_M)
    source = etendue * 0.9 * 0.1 * photon_radiance_s_m2_sr(inside, 600.0, 2.0 * 3e15).sum()

    def planck(x):
        return 2 * c / x**4 / math.expm1(h * c / (x * k * 200.0))

    sky = etendue / 49 * 0.1 * 0.1 * quad(planck, *BAND_M, epsrel=1e-10)[0]
    expected = signal_to_noise_oir_ccd(t, source, sky, 0.05, 20.0, 49)
    assert t == 60.0
    assert 3.0 < expected < 300.0
    # continuum known (to 1e-6 of nothing), nothing else free
    assert math.sqrt(exposure.matrix[0, 0, 0] * t) == pytest.approx(expected, rel=1e-6)
    with_prior = marginalise(exposure.matrix[0] * t + exposure.prior)
    assert math.sqrt(with_prior[0, 0]) == pytest.approx(expected, rel=1e-6)


def test_on_band_and_off_band_by_hand(make):
    """Two filters: the continuum is measured in one and taken from the other."""
    off = (3.90e-6, 3.901e-6)  # between lines of any strength
    made = camera(make, off_band_m=off, on_band_share=0.6, continuum_prior=math.inf)
    moments = make.moments_of(made, beam=box())
    detail = expose_one(moments, Glow(LINES, 600.0, 3e15, make.grey), None, made, made.settings[0])
    t = 3600.0
    snr = math.sqrt(marginalise(detail.matrix * t)[0, 0])
    # N = on - r * off, r the ratio of the widths in continuum photons; variances of the two rates
    ratio = detail.efficiency[0] * (BAND_M[1] - BAND_M[0]) / (detail.efficiency[1] * (off[1] - off[0]))
    signal = detail.line_e_s[0] - ratio * detail.line_e_s[1]
    variance = detail.variance[0] / (0.6 * t) + ratio**2 * detail.variance[1] / (0.4 * t)
    assert snr == pytest.approx(signal / math.sqrt(variance), rel=1e-6)


def test_one_band_alone_is_refused(make):
    made = camera(make, continuum_prior=math.inf)
    with pytest.raises(RangeError, match="cannot tell lines from continuum") as caught:
        expose_moments(
            make.moments_of(made, beam=box()),
            Glow(LINES, 600.0, 1e15, make.grey),
            None,
            made,
            made.settings[0],
        )
    assert caught.value.key == "settings.L.off_band"


def test_no_line_in_the_setting(make):
    made = make.instrument("space", settings={"band_m": (4.00012e-6, 4.00025e-6)})
    with pytest.raises(RangeError, match="no line"):
        expose_moments(
            make.moments_of(made), Glow(LINES, 600.0, 1e15, make.grey), None, made, made.settings[0]
        )


def test_a_goal_line_outside_the_setting(make):
    made = make.instrument("space")
    with pytest.raises(NotFoundError, match=r"Q\(1,5\)"):
        expose_moments(
            make.moments_of(made),
            Glow(LINES, 600.0, 1e15, make.grey),
            None,
            made,
            made.settings[0],
            ("Q(1,5)",),
        )


@pytest.mark.parametrize(
    ("nod", "fraction", "rows"), [("on-slit", 1.0, 1.0), ("off-slit", 0.4, 1.0), ("stare", 1.0, 3.0)]
)
def test_nod_patterns_as_simulated(make, nod, fraction, rows):
    """Counts of target and background drawn, differenced as an observer would, and their scatter."""
    noise = nod_noise(
        make.instrument(operation={"nod": nod, "on_fraction": fraction, "background_rows": rows}).operation
    )
    rng = np.random.default_rng(5)
    t, source, background, trials = 1000.0, 3.0, 7.0, 200000
    if nod == "on-slit":  # half of the time at each position, each position the other one's background
        first = rng.poisson((source + background) * t / 2, trials) - rng.poisson(background * t / 2, trials)
        second = rng.poisson((source + background) * t / 2, trials) - rng.poisson(background * t / 2, trials)
        result = first + second
    elif nod == "off-slit":
        on = rng.poisson((source + background) * t * fraction, trials)
        result = on - rng.poisson(background * t * (1 - fraction), trials) * fraction / (1 - fraction)
    else:
        on = rng.poisson((source + background) * t, trials)
        result = on - rng.poisson(background * t * rows, trials) / rows
    assert result.mean() / t == pytest.approx(noise.signal * source, rel=5e-3)
    expected = noise.source * source + noise.background * background
    assert result.var() / t == pytest.approx(expected, rel=5 * math.sqrt(2 / trials))


def test_the_parts_of_the_variance_make_the_whole(make):
    made = make.instrument("ifu", detector={"sampling": "ramp", "reads": 10})
    one = expose_one(make.moments_of(made), Glow(LINES, 700.0, 1e16, make.grey), None, made, made.settings[0])
    factor = 6 * 101 / (5 * 10 * 11)
    expected = 0.5 * factor * (one.line_e_s + one.continuum_e_s) + 1.0 * (
        factor * (one.sky_e_s + one.telescope_e_s + one.dark_e_s) + one.readout_e2_s
    )
    assert one.variance == pytest.approx(expected, rel=1e-12)
    assert one.variance_share.sum() == pytest.approx(1.0)


@given(scale=st.floats(1.1, 30.0))
@settings(max_examples=15, deadline=None)
def test_more_ions_never_lower_the_snr(make, scale):
    made = make.instrument("ifu")
    moments = make.moments_of(made)
    low, high = (
        marginalise(
            expose_moments(moments, Glow(LINES, 550.0, n, make.grey), None, made, made.settings[0]).matrix
        )[0, 0, 0]
        for n in (1e15, 1e15 * scale)
    )
    assert high > low
    # background-limited: the information grows with the square, source-limited with the first power
    assert scale < high / low <= scale**2 * (1 + 1e-6)


@given(cold=st.floats(250.0, 900.0), step=st.floats(5.0, 100.0))
@settings(max_examples=15, deadline=None)
def test_warmer_is_brighter_below_1000_k(make, cold, step):
    made = make.instrument("ifu")
    moments = make.moments_of(made)
    low, high = (
        marginalise(
            expose_moments(moments, Glow(LINES, t, 1e15, make.grey), None, made, made.settings[0]).matrix
        )[0, 0, 0]
        for t in (cold, min(cold + step, 1000.0))
    )
    assert high > low


def test_snr_grows_with_the_root_of_the_time_and_halves_add(make):
    made = make.instrument("ifu")
    moments = make.moments_of(made, range_rate_m_s=(-20e3, 1e3, 15e3))
    exposure = expose_moments(moments, Glow(LINES, 550.0, 1e15, make.grey), None, made, made.settings[0])
    whole = (exposure.matrix * 600.0).sum(axis=0)
    halves = (exposure.matrix * 300.0).sum(axis=0) + (exposure.matrix * 300.0).sum(axis=0)
    assert halves == pytest.approx(whole, rel=1e-12)
    one, four = (math.sqrt(marginalise(exposure.matrix[0] * t)[0, 0]) for t in (100.0, 400.0))
    assert four == pytest.approx(2.0 * one, rel=1e-9)


def test_an_imager_tells_no_temperature_whatever_its_lines(make):
    made = camera(make, band_m=(3.4e-6, 4.0e-6))
    moments = make.moments_of(made, beam=box())
    detail = expose_one(moments, Glow(LINES, 600.0, 3e15, make.grey), None, made, made.settings[0])
    assert len(detail.lines) > 10
    assert detail.temperature_share == pytest.approx(0.0)
    assert temperature_error(marginalise(detail.matrix * 3600.0 + detail.prior)) == math.inf
    errors = systematic_errors(
        detail.lines.wavelength_m,
        detail.line_information,
        detail.temperature_slope,
        np.zeros(len(detail.lines)),
        made.operation,
    )
    assert errors.temperature_total_k == math.inf
