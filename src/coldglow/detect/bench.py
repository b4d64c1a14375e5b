"""A setting made ready for many moments: its pixels, its table of backgrounds, the lines that count.

All that depends on instrument, state and range of conditions, and not on the single moment, is here.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.ndimage import maximum_filter1d, uniform_filter1d

from coldglow.describe.records import Continuum, Instrument, Setting
from coldglow.detect.background import PixelTable, pixel_table
from coldglow.detect.beam import Beam
from coldglow.detect.information import NodNoise, nod_noise
from coldglow.detect.integration import photon_variance_factor
from coldglow.detect.pixels import Pixels, make_pixels
from coldglow.errors import NotFoundError, RangeError
from coldglow.light.atmosphere import Atmosphere
from coldglow.light.average import FWHM_PER_SIGMA
from coldglow.light.emission import log_temperature_slope, photon_radiance_s_m2_sr, thermal_sigma_m_s
from coldglow.light.lines import LineList

NOISE_SOURCES = ("lines", "planet continuum", "sky", "telescope", "dark", "read-out")
LINES_KEPT = 0.999  # share of the information on N and on T; the faintest lines are left out
SMOOTHED = 2e-4  # in ln(wavelength), +-30 km/s: what the Earth's motion does to a line in a season
NOTHING = 1e-6  # share of the light; less of it is none at all


@dataclass(frozen=True, slots=True)
class Moments:
    """Conditions of the moments to be forecast; every field is an ndarray[moment], `beam` a record of such.

    `range_rate_m_s` positive receding; `airmass` and `water_m` are ignored in space.
    """

    airmass: np.ndarray
    range_rate_m_s: np.ndarray
    water_m: np.ndarray
    sun_distance_m: np.ndarray
    beam: Beam

    def take(self, index: np.ndarray | slice) -> Moments:
        """Return the moments that an index or a mask selects."""
        return Moments(
            self.airmass[index],
            self.range_rate_m_s[index],
            self.water_m[index],
            self.sun_distance_m[index],
            self.beam.take(index),
        )


@dataclass(frozen=True, slots=True)
class Glow:
    """What shines: ions in a state, and the target's continuum under their lines.

    `column_m2` is the mean *vertical* column of ions in local equilibrium.
    """

    lines: LineList
    temperature_k: float
    column_m2: float
    continuum: Continuum


@dataclass(frozen=True, slots=True)
class Bench:
    """All that stays the same from moment to moment: pixels, table, lines kept and what they emit.

    `radiance` ndarray[line] is per unit column (s-1 sr-1); `wanted` ndarray[line] marks those measured.
    `rows` ndarray[load, pixel] are the table's rates and ones, `source` ndarray[load] the place in
    NOISE_SOURCES that each belongs to, and `noise` ndarray[source] the variance per electron.
    """

    instrument: Instrument
    setting: Setting
    pixels: Pixels
    table: PixelTable
    atmosphere: Atmosphere | None
    lines: LineList
    radiance: np.ndarray
    slope: np.ndarray
    wanted: np.ndarray
    column_m2: float
    thermal_m_s: float
    nod: NodNoise
    rows: np.ndarray
    source: np.ndarray
    noise: np.ndarray


def goal_mask(lines: LineList, goal_lines: tuple[str, ...]) -> np.ndarray:
    """Return ndarray[line]: the lines asked for; all of them if none is named.

    Raises:
        NotFoundError: a name that is no line of the setting.

    """
    if not goal_lines:
        return np.ones(len(lines), dtype=bool)
    mask = np.zeros(len(lines), dtype=bool)
    try:
        mask[[lines.find(name) for name in goal_lines]] = True
    except NotFoundError as error:
        raise NotFoundError(str(error), "goal.lines") from None
    return mask


def set_up(
    moments: Moments,
    glow: Glow,
    atmosphere: Atmosphere | None,
    instrument: Instrument,
    setting: Setting,
    goal_lines: tuple[str, ...] = (),
) -> Bench:
    """Prepare a setting for some moments; arguments and errors as in `expose_moments`."""
    if not np.any(moments.beam.light_share > NOTHING):
        raise RangeError(
            "The opening sees nothing of the planet: less than a millionth of its light falls in.",
            "opening.offset",
        )
    lines, pixels = glow.lines, make_pixels(setting)
    table = pixel_table(
        instrument,
        setting,
        pixels,
        atmosphere,
        glow.continuum,
        moments.airmass,
        moments.water_m,
        float(np.median(moments.sun_distance_m)),
    )
    inside = np.zeros(len(lines), dtype=bool)
    whole = [(pixels.low_m[0], pixels.high_m[-1])]
    for low, high in whole if pixels.step else zip(pixels.low_m, pixels.high_m, strict=True):
        inside |= (lines.wavelength_m >= low) & (lines.wavelength_m <= high)
    band = lines.take(inside)
    if not len(band):
        raise RangeError(
            f"The setting {setting.name!r} holds no line of H3+ between {setting.band_m[0] * 1e6:g} and "
            f"{setting.band_m[1] * 1e6:g} micron.",
            "settings.band",
        )
    wanted = goal_mask(band, goal_lines)
    if not np.any(_clearest(band.take(wanted), pixels, table) > NOTHING):
        raise RangeError(
            f"None of the light of these lines arrives: in the setting {setting.name!r} the air lets less "
            "than a millionth of it pass.",
            "settings.band",
        )
    radiance = photon_radiance_s_m2_sr(band, glow.temperature_k, 1.0)
    slope = log_temperature_slope(band, glow.temperature_k)
    kept = _lines_that_count(band, radiance, slope, pixels, table) | (wanted if goal_lines else False)
    band = band.take(kept)
    nod, factor = nod_noise(instrument.operation), photon_variance_factor(instrument.detector)
    nodes, ones = len(table.sky), np.ones((2, pixels.low_m.size))
    return Bench(
        instrument,
        setting,
        pixels,
        table,
        atmosphere,
        band,
        radiance[kept],
        slope[kept],
        wanted[kept].astype(float),
        glow.column_m2,
        float(thermal_sigma_m_s(glow.temperature_k)),
        nod,
        np.concatenate([table.continuum, table.sky, table.telescope[None, :], ones]),
        np.array([1] * nodes + [2] * nodes + [3, 4, 5]),
        np.array([nod.source * factor] * 2 + [nod.background * factor] * 3 + [nod.background]),
    )


def _clearest(lines: LineList, pixels: Pixels, table: PixelTable) -> np.ndarray:
    """Return ndarray[line]: the largest transmission of the air near each line, over the moments' nodes."""
    clear = table.unit_continuum.max(axis=0) / pixels.width_m / table.efficiency
    if pixels.step == 0.0:
        return np.full(len(lines), clear.max())
    clear = maximum_filter1d(clear, max(int(SMOOTHED / pixels.step), 1))
    place = np.log(lines.wavelength_m / pixels.low_m[0]) / pixels.step
    largest: np.ndarray = clear[np.clip(place.astype(int), 0, pixels.low_m.size - 1)]
    return largest


def _lines_that_count(
    lines: LineList, radiance: np.ndarray, slope: np.ndarray, pixels: Pixels, table: PixelTable
) -> np.ndarray:
    """Return ndarray[line]: the lines without which less than 1 - LINES_KEPT of the information is lost.

    In a resolution element e lines add up to M_e = sum of m_l, m_l = signal over background noise; the
    information is the sum of M_e², and a faint line contributes 2 M_e m_l to it. The same is asked of the
    information on T, where a line counts with its slope. The air is taken at its clearest, smoothed, so
    that no line is lost that another velocity would uncover.
    """
    if pixels.step == 0.0:
        return np.ones(len(lines), dtype=bool)
    background = table.sky.min(axis=0) + table.telescope
    clear = table.unit_continuum.max(axis=0) / pixels.width_m
    clear = uniform_filter1d(clear, max(int(SMOOTHED / pixels.step), 1))
    place = np.log(lines.wavelength_m / pixels.low_m[0]) / pixels.step
    pixel = np.clip(place.astype(int), 0, pixels.low_m.size - 1)
    element = (place * pixels.step / (pixels.instrument_sigma * FWHM_PER_SIGMA)).astype(int)
    merit = radiance * clear[pixel] / np.sqrt(np.maximum(background[pixel], background.max() * 1e-12))
    mean_slope = float(np.square(merit) @ slope) / float(np.sum(np.square(merit)))
    kept = np.zeros(len(lines), dtype=bool)
    for weighted in (merit, merit * np.abs(slope - mean_slope)):
        gain = weighted * np.bincount(element, weighted)[element]
        order = np.argsort(-gain)
        total = np.cumsum(gain[order])
        kept[order[: int(np.searchsorted(total, total[-1] * (1.0 - 0.5 * (1.0 - LINES_KEPT)))) + 1]] = True
    return kept
