"""The Earth's transmission: regression, known bands, direct averaging, limits, a table of one's own."""

from __future__ import annotations

import math
import re
import time

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.constants import c
from scipy.integrate import trapezoid
from scipy.ndimage import gaussian_filter1d

from coldglow.errors import NotFoundError, RangeError
from coldglow.light import atmosphere
from coldglow.light.lines import load_lines

AIR = atmosphere.load_atmosphere(4200.0)


def smoothed(air, wavelength_m, airmass, water_m, resolving_power):
    """T at one wavelength, the samples of the table blurred by a Gaussian of FWHM lambda/R."""
    sigma = 1.0 / (resolving_power * 2.0 * math.sqrt(2.0 * math.log(2.0)))
    middle, reach = int(air.position(wavelength_m)), math.ceil(5.0 * sigma / air.log_step) + 2
    part = slice(middle - reach, middle + reach)
    blurred = gaussian_filter1d(np.exp(-airmass * air.tau(water_m, part)), sigma / air.log_step, truncate=5.0)
    return np.interp(air.position(wavelength_m) - part.start, np.arange(blurred.size), blurred)


def test_band_means_and_points_against_the_makers_own(light_rows):
    # regression only: see the head of the file
    count = 0
    for row in light_rows("transmission_regression.csv"):
        air = atmosphere.load_atmosphere(float(row["height_m"]))
        airmass, water_m = float(row["airmass"]), 1e-3 * float(row["water_mm"])
        low, high = 1e-6 * float(row["low_um"]), 1e-6 * float(row["high_um"])
        if row["kind"] == "mean":
            grid = air.wavelength_m
            ours = air.transmission(grid[(grid >= low) & (grid <= high)], airmass, water_m).mean()
        else:
            ours = smoothed(air, low, airmass, water_m, 60_000.0)
        assert ours == pytest.approx(float(row["transmission"]), abs=float(row["tolerance"])), row
        count += 1
    assert count == 84


def test_carbon_dioxide_and_methane_are_opaque_where_known():
    # CO2 nu3: T < 0.005 at 4.22-4.38 um from the ground; CH4 nu3 Q branch, 3017-3019 cm-1 (3.313-3.317 um):
    # T < 0.1 (known band facts, e.g. Herzberg 1945, Infrared and Raman Spectra, p. 274 and 306; from
    # memory)
    carbon_dioxide = np.linspace(4.22e-6, 4.38e-6, 4000)
    assert AIR.pixel_means([4.22e-6, 4.38e-6], 1.0, 0.001)[0] < 0.005
    assert np.quantile(AIR.transmission(carbon_dioxide, 1.0, 0.001), 0.95) < 0.005
    assert AIR.pixel_means([1e-2 / 3019.0, 1e-2 / 3017.0], 1.0, 0.001)[0] < 0.1


def test_depth_of_nitrogen_between_the_lines():
    # collision-induced absorption of N2 at 2400 cm-1 from 4.2 km: 0.183, from 2.6 km: 0.263 (Karman et al.
    # 2019, Icarus 328, 160, integrated over the US Standard profile): the table's dry depth cannot be
    # smaller
    for height_m, depth in ((4200.0, 0.183), (2600.0, 0.263)):
        air = atmosphere.load_atmosphere(height_m)
        band = np.linspace(1e-2 / 2410.0, 1e-2 / 2390.0, 500)
        smallest = -np.log(air.transmission(band, 1.0, 0.0).max())
        assert depth * 0.95 < smallest < depth + 0.2


def _direct(air, wavelength_m, sigma_m_s, rate_m_s, airmass, water_m):
    """Return T averaged over the samples' own cells by summing over a fine grid, nothing interpolated."""
    offset = np.linspace(-6.0, 6.0, 60001)
    weight = np.exp(-0.5 * offset**2)
    place = np.log(wavelength_m / air.first_wavelength_m) + np.log1p((rate_m_s + offset * sigma_m_s) / c)
    cell = np.clip(np.rint(place / air.log_step).astype(int), 0, air.tau_dry.size - 1)
    sample = np.exp(-airmass * (air.tau_dry[cell] + water_m * air.tau_water_per_m[cell]))
    return float((sample * weight).sum() / weight.sum())


@pytest.mark.parametrize(("water", "bound"), [("one", 1e-4), ("quartiles", 1e-4), ("any", 2e-3)])
def test_error_of_the_interpolation_over_shifted_lines(water, bound):
    # This measures the figure that `line_transmission` states.
    rng = np.random.default_rng(7)
    band = load_lines().within(3.2e-6, 4.1e-6)
    lines = band.take(rng.choice(len(band), 60, replace=False))
    sigma = np.hypot(1200.0, lines.position_sigma_m_s())
    times = 400
    rate, airmass = rng.uniform(-30e3, 30e3, times), rng.uniform(1.0, 2.5, times)
    water_m = {
        "one": np.full(times, 0.002),
        "quartiles": rng.choice([0.001, 0.002, 0.004], times),
        "any": rng.uniform(0.001, 0.004, times),
    }[water]
    ours = atmosphere.line_transmission(AIR, lines.wavelength_m, sigma, rate, airmass, water_m)
    assert ours.shape == (times, 60)
    worst = max(
        abs(ours[t, k] - _direct(AIR, lines.wavelength_m[k], sigma[k], rate[t], airmass[t], water_m[t]))
        for t in range(0, times, 16)
        for k in range(0, 60, 3)
    )
    assert worst < bound


def test_a_receding_line_moves_to_the_red():
    # the deepest lonely feature of 3.55-3.60 um is met only by the line that the motion carries onto it
    grid = AIR.wavelength_m
    window = np.flatnonzero((grid > 3.55e-6) & (grid < 3.60e-6))
    deep = grid[window[np.argmax(AIR.tau(0.002, slice(window[0], window[-1] + 1)))]]
    rest = deep / (1.0 + 20e3 / c)
    away, toward, still = atmosphere.line_transmission(AIR, rest, 1000.0, [20e3, -20e3, 0.0], 1.2, 0.002)[
        :, 0
    ]
    assert away < 0.5 < toward
    assert away == pytest.approx(
        atmosphere.line_transmission(AIR, deep, 1000.0, 0.0, 1.2, 0.002)[0, 0], abs=1e-3
    )
    assert still > away


def test_transmission_is_averaged_before_the_instrument_smooths():
    # a line on a deep narrow feature loses its light although the band looks clear at low resolution
    grid = AIR.wavelength_m
    window = np.flatnonzero((grid > 3.55e-6) & (grid < 3.60e-6))
    deep = grid[window[np.argmax(AIR.tau(0.002, slice(window[0], window[-1] + 1)))]]
    seen = atmosphere.line_transmission(AIR, deep, 1100.0, 0.0, 1.0, 0.002)[0, 0]
    assert smoothed(AIR, deep, 1.0, 0.002, 2500.0) > 0.8 > 0.5 > seen


def test_a_badly_placed_line_sees_the_mean_of_its_neighbourhood():
    lines = load_lines()
    index = np.array(
        [i for i in range(len(lines)) if lines.quality[i] == "D" and 3.5e-6 < lines.wavelength_m[i] < 3.7e-6]
    )
    chosen = lines.take(index[::40])
    sigma = np.hypot(1100.0, chosen.position_sigma_m_s())
    still = atmosphere.line_transmission(AIR, chosen.wavelength_m, sigma, 0.0, 1.3, 0.002)[0]
    for k in range(len(chosen)):
        edges = chosen.wavelength_m[k] * np.exp(np.linspace(-6, 6, 400) * sigma[k] / c)
        weight = np.exp(-0.5 * np.linspace(-5.985, 5.985, 399) ** 2)
        mean = AIR.pixel_means(edges, 1.3, 0.002) @ weight / weight.sum()
        assert still[k] == pytest.approx(mean, abs=2e-3)


def test_300_lines_over_2800_moments_are_fast():
    lines = load_lines().within(3.3e-6, 4.0e-6).take(np.arange(300))
    rng = np.random.default_rng(1)
    rate, airmass = 30e3 * np.sin(np.linspace(0.0, 6.0, 2800)), rng.uniform(1.0, 2.2, 2800)
    best = math.inf
    for _ in range(3):
        start = time.process_time()
        atmosphere.line_transmission(AIR, lines.wavelength_m, 1200.0, rate, airmass, 0.002)
        best = min(best, time.process_time() - start)
    assert best < 0.6  # 0.1 s measured


def test_arrays_equal_scalars():
    lines = load_lines().within(3.95e-6, 3.96e-6)
    rate, airmass = np.array([-12e3, 3e3, 25e3]), np.array([1.1, 1.9, 1.4])
    together = atmosphere.line_transmission(AIR, lines.wavelength_m, 1200.0, rate, airmass, 0.002)
    for row, v, x in zip(together, rate, airmass, strict=True):
        alone = atmosphere.line_transmission(AIR, lines.wavelength_m, 1200.0, v, x, 0.002)
        assert row == pytest.approx(alone[0], abs=2e-4)


def test_below_the_horizon_there_is_no_transmission():
    got = atmosphere.line_transmission(AIR, 3.953e-6, 1200.0, [1e3, 2e3], [1.2, math.nan], 0.002)
    assert 0.9 < got[0, 0] < 1.0
    assert math.isnan(got[1, 0])
    assert np.isnan(atmosphere.line_transmission(AIR, 3.953e-6, 1200.0, 0.0, math.nan, 0.002)).all()


def test_pixels_finer_than_the_table_are_means_of_straight_lines_between_its_samples():
    # 40 pixels in three samples of the table, against a fine sum over the interpolated samples
    step = AIR.log_step
    middle = round(np.log(3.95e-6 / AIR.first_wavelength_m) / step)
    place = middle + np.linspace(0.2, 3.1, 41)
    edges = AIR.first_wavelength_m * np.exp(step * place)
    samples = AIR.first_wavelength_m * np.exp(step * np.arange(middle, middle + 6))
    clear = AIR.transmission(samples, 1.5, 0.002)
    fine = np.linspace(place[:-1], place[1:], 401)
    weight = np.interp(
        fine, np.arange(middle, middle + 6), samples * clear
    )  # the mean is one over wavelength
    by_hand = step * trapezoid(weight, fine, axis=0) / np.diff(edges)
    np.testing.assert_allclose(AIR.pixel_means(edges, 1.5, 0.002), by_hand, rtol=3e-7)


def test_the_heights_that_are_said_to_be_served_are_served():
    with pytest.raises(RangeError) as refused:
        atmosphere.load_atmosphere(9000.0)
    low, high = (float(text) for text in re.search(r"serves (\d+) to (\d+) m", str(refused.value)).groups())
    assert 0.0 < low < 2600.0 < 4200.0 < high < 9000.0
    for height in (low + 1.0, high - 1.0):
        assert atmosphere.load_atmosphere(height).span_m[0] < 2e-6
    for height in (low - 1.0, high + 1.0):
        with pytest.raises(RangeError, match="does not reach"):
            atmosphere.load_atmosphere(height)


def test_pixel_means_are_additive_and_meet_the_monochromatic_mean():
    edges = np.linspace(3.30e-6, 3.32e-6, 41)
    fine = AIR.pixel_means(edges, 1.5, 0.002)
    assert fine.mean() == pytest.approx(AIR.pixel_means(edges[[0, -1]], 1.5, 0.002)[0], rel=1e-9)
    dense = np.linspace(3.30e-6, 3.32e-6, 400_001)
    assert AIR.transmission(dense, 1.5, 0.002).mean() == pytest.approx(fine.mean(), abs=1e-3)
    both = AIR.pixel_means(edges, [1.0, 1.5], 0.002)
    assert both.shape == (2, 40)
    assert both[1] == pytest.approx(fine, rel=1e-14)


@settings(deadline=None)  # a busy machine is no failure
@given(st.floats(1.0, 3.0), st.floats(0.0, 0.5), st.floats(0.0002, 0.008), st.floats(0.0, 0.002))
def test_more_air_or_water_never_lets_more_light_through(airmass, more_air, water_m, more_water):
    wavelength = np.linspace(3.2e-6, 3.4e-6, 500)
    less = AIR.transmission(wavelength, airmass, water_m)
    assert np.all((less >= 0.0) & (less <= 1.0))
    assert np.all(AIR.transmission(wavelength, airmass + more_air, water_m) <= less)
    assert np.all(AIR.transmission(wavelength, airmass, water_m + more_water) <= less)


def test_a_height_between_lies_between_and_the_ends_are_the_table():
    band = np.linspace(3.4e-6, 3.6e-6, 2000)
    low, middle, high = (
        atmosphere.load_atmosphere(h).transmission(band, 1.0, 0.001) for h in (2600.0, 3400.0, 4200.0)
    )
    assert low.mean() < middle.mean() < high.mean()
    # ln(tau) linear in ln(pressure): the middle height holds the geometric mean
    both = np.sqrt(np.log(low) * np.log(high))
    clear = (low > 0.01) & (low < 0.99)
    assert -np.log(middle)[clear] == pytest.approx(both[clear], rel=0.02)
    assert atmosphere.validity_warnings(atmosphere.load_atmosphere(3400.0), 2.0, 0.001) == []


@pytest.mark.parametrize("height_m", [0.0, 1900.0, 5000.0])
def test_a_height_beyond_the_table_is_refused(height_m):
    with pytest.raises(RangeError, match="hPa") as caught:
        atmosphere.load_atmosphere(height_m)
    assert caught.value.key == "site.height"


def test_what_goes_beyond_the_table_is_said():
    assert "extrapolated" in atmosphere.validity_warnings(atmosphere.load_atmosphere(2200.0), 2.0, 0.001)[0]
    water, airmass = atmosphere.validity_warnings(AIR, 3.5, 0.012)
    assert "12 mm" in water
    assert "3.5" in airmass


def test_stated_error_of_the_table():
    # 0.03 in clear K and L, 0.05 at 3.15-3.45, 0.1 at deep telluric lines (data/atmosphere.md)
    clear = atmosphere.transmission_error(AIR, [2.15e-6, 3.953e-6], 1.0, 0.001)
    assert list(clear) == [0.03, 0.03]
    assert atmosphere.transmission_error(AIR, [3.3145e-6], 1.0, 0.001)[0] == 0.1
    assert atmosphere.transmission_error(AIR, [2.5e-6], 1.0, 0.001)[0] == 0.1


def test_a_wavelength_outside_the_table_is_refused():
    with pytest.raises(RangeError, match=r"1\.900 to 5\.500 um"):
        AIR.transmission(1.2e-6, 1.0, 0.002)


def _write(path, text):
    path.write_text(text, encoding="utf-8")
    return str(path)


def _own_rows():
    grid = np.linspace(3.9e-6, 4.0e-6, 30_000)
    dry = -np.log(AIR.transmission(grid, 1.0, 0.0))
    water = -np.log(AIR.transmission(grid, 1.0, 0.001)) - dry
    return grid, dry, water


def test_own_table_of_depths_gives_the_same_as_the_packaged_one_it_repeats(tmp_path):
    grid, dry, water = _own_rows()
    text = "# made for a test\nwavelength_um,tau_dry,tau_h2o_per_mm\n"
    text += "\n".join(f"{1e6 * w:.9f},{d:.6f},{v:.6f}" for w, d, v in zip(grid, dry, water, strict=True))
    own = atmosphere.load_atmosphere(
        100.0, _write(tmp_path / "own.csv", text)
    )  # any height: the user's table rules
    probe = np.linspace(3.92e-6, 3.98e-6, 777)
    assert own.transmission(probe, 1.7, 0.003) == pytest.approx(
        AIR.transmission(probe, 1.7, 0.003), abs=0.01
    )  # sampled elsewhere
    line = atmosphere.line_transmission(own, 3.953e-6, 1200.0, [0.0, 2e4], [1.2, 1.5], 0.003)
    same = atmosphere.line_transmission(AIR, 3.953e-6, 1200.0, [0.0, 2e4], [1.2, 1.5], 0.003)
    assert line == pytest.approx(same, abs=5e-3)
    assert "own table" in atmosphere.validity_warnings(own, 2.0, 0.02)[0]


def test_own_table_of_one_transmission_scales_with_airmass_and_refuses_water(tmp_path):
    text = (
        "# %ECSV 1.0\n# ---\n# meta: !!omap\n# - {airmass: 2.0}\n# - {pwv_mm: 3.0}\n# - {altitude_m: 3900}\n"
    )
    text += "wavelength_um transmission\n" + "\n".join(f"{3.9 + 0.001 * i:.3f} 0.49" for i in range(100))
    own = atmosphere.load_atmosphere(3000.0, _write(tmp_path / "own.ecsv", text))
    assert float(own.transmission(np.array([3.95e-6]), 2.0, 0.003)[0]) == pytest.approx(0.49, rel=1e-9)
    assert float(own.transmission(np.array([3.95e-6]), 1.0, 0.003)[0]) == pytest.approx(0.7, rel=1e-9)
    with pytest.raises(RangeError, match="3 mm") as caught:
        own.transmission(np.array([3.95e-6]), 1.0, 0.001)
    assert caught.value.key == "sky.water"
    notes = " ".join(atmosphere.validity_warnings(own, 2.0, 0.003))
    assert "cannot place telluric lines" in notes  # 76 km/s per row
    assert "3900 m" in notes


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("wavelength_um,tau_dry\n3.9,0.1\n4.0,0.1\n", "tau_h2o_per_mm"),
        ("lambda,transmission\n3.9,0.1\n4.0,0.1\n", "no column wavelength_um"),
        ("wavelength_um,transmission\n3.9,0.1\n4.0,0.1\n", "airmass"),
        ("# airmass: 1\nwavelength_um,transmission\n3.9,1.1\n4.0,0.1\n", "outside 0 to 1"),
        ("# airmass: 1\nwavelength_um,transmission\n4.0,0.1\n3.9,0.1\n", "grow"),
        ("# airmass: 1\nwavelength_um,transmission\n3900,0.1\n4000,0.1\n", "micron"),
        ("wavelength_um,tau_dry,tau_h2o_per_mm\n3.9,-0.1,0\n4.0,0.1,0\n", "negative"),
        ("wavelength_um,tau_dry,tau_h2o_per_mm\n3.9,0.1,0\n4.0,x,0\n", ":3:"),
        ("wavelength_um,tau_dry,tau_h2o_per_mm\n3.9,0.1,0\n4.0,0.1\n", ":3:"),
        ("# nothing\n", "at least two rows"),
    ],
)
def test_a_wrong_own_table_is_refused_with_its_reason(tmp_path, text, said):
    with pytest.raises(RangeError, match=said) as caught:
        atmosphere.load_atmosphere(3000.0, _write(tmp_path / "wrong.csv", text))
    assert caught.value.key == "atmosphere"
    assert "wrong.csv" in str(caught.value)


def test_a_missing_own_table_is_named():
    with pytest.raises(NotFoundError, match=r"nowhere\.csv"):
        atmosphere.load_atmosphere(3000.0, "nowhere.csv")


def test_an_edited_own_table_is_read_again(tmp_path):
    path = tmp_path / "own.csv"
    head = "# airmass: 1\n# pwv_mm: 1\nwavelength_um,transmission\n"
    _write(path, head + "3.9,0.5\n4.0,0.5\n")
    first = atmosphere.load_atmosphere(3000.0, str(path))
    time.sleep(0.02)
    _write(path, head + "3.9,0.7\n4.0,0.7\n")
    second = atmosphere.load_atmosphere(3000.0, str(path))
    assert (first.tau_dry[0], second.tau_dry[0]) == (
        pytest.approx(-math.log(0.5)),
        pytest.approx(-math.log(0.7)),
    )


@pytest.mark.parametrize(
    ("water_m", "beyond"), [(0.00019, True), (0.00021, False), (0.0079, False), (0.0081, True)]
)
def test_the_span_of_water_that_was_checked(water_m, beyond):
    # 0.2 to 8 mm: the notes of the table, data/atmosphere.md
    assert bool(atmosphere.validity_warnings(AIR, 2.0, water_m)) is beyond
