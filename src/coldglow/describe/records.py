"""Frozen records in SI: all that the rest of the program sees of a description.

Angles in radians, times in seconds, lengths in metres; `Estimate` holds a value in the unit that the
name of its field ends with. Dates stay ISO strings (``2027-11-25``): the evening date of a night is the
date of local mean noon before it.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal


@dataclass(frozen=True, slots=True)
class Origin:
    """Where each value of a description was written: key path -> (file, line)."""

    file: str = ""
    lines: Mapping[str, tuple[str, int]] = field(default_factory=dict)

    def locate(self, key: str) -> tuple[str, int] | None:
        """Return file and line of a key path or of what encloses it; None where there is neither."""
        parts = key.split(".")
        while parts:
            where = self.lines.get(".".join(parts))
            if where is not None:
                return where
            parts.pop()
        return None


@dataclass(frozen=True, slots=True)
class Estimate:
    """A value, the 1-sigma uncertainty of its mean, and its natural 1-sigma scatter from night to night."""

    value: float
    uncertainty: float = 0.0
    scatter: float = 0.0


# ---------------------------------------------------------------- target


@dataclass(frozen=True, slots=True)
class LongitudeSystem:
    """A prime meridian and a rotation rate: W = prime_meridian + rate * t (plus the periodic terms).

    `rate_rad_s` keeps the sign of the pole convention (negative for Uranus). `grows` says in which sense
    the planetographic longitude of this system grows; the sub-observer longitude increases with time in
    every system here, as a distant observer sees it.
    """

    name: str
    prime_meridian_rad: float  # W at J2000 TDB, the angle that the periodic terms are added to
    rate_rad_s: float
    grows: Literal["west", "east"]
    period_s: float
    period_uncertainty_s: float
    tie_epoch_s: float  # TDB seconds from J2000 at which the phase of this system is known
    source: str


@dataclass(frozen=True, slots=True)
class PeriodicTerm:
    """One periodic term of the pole and prime meridian, angle = angle + rate * T (Julian centuries)."""

    angle_rad: float
    rate_rad_century: float
    ra_rad: float = 0.0  # times sin(angle)
    dec_rad: float = 0.0  # times cos(angle)
    meridian_rad: float = 0.0  # times sin(angle)


@dataclass(frozen=True, slots=True)
class Rotation:
    """Pole in ICRS axes (constant, rate per Julian century) and the longitude systems, default first."""

    pole_ra_rad: tuple[float, float]
    pole_dec_rad: tuple[float, float]
    terms: tuple[PeriodicTerm, ...]
    systems: tuple[LongitudeSystem, ...]
    source: str
    reason: str = ""  # why the first system is the default


@dataclass(frozen=True, slots=True)
class Figure:
    """Radii of the opaque body (1-bar level) and height of the emitting shell above it."""

    equatorial_radius_m: float
    polar_radius_m: float
    shell_height_m: float
    source: str


@dataclass(frozen=True, slots=True)
class Spot:
    """A round spot, or an oval when `inner_radius_rad` > 0, fixed to the body; `share` of all ions."""

    name: str
    latitude_rad: float  # planetographic
    longitude_rad: float  # in the named system, in the sense in which it grows
    system: str
    radius_rad: float  # seen from the planet's centre
    inner_radius_rad: float
    share: float


@dataclass(frozen=True, slots=True)
class Emission:
    """State of the ionosphere: temperature and *vertical* column, mean over the whole shell.

    `given_as` names the kind that the description held; a line-of-sight column (mean over the visible
    disk) has been turned into a vertical one by the closed form for a uniform shell.
    """

    temperature_k: Estimate
    column_m2: Estimate
    given_as: Literal["vertical", "line-of-sight"]
    lte_fraction: Estimate
    spots: tuple[Spot, ...]
    source: str


@dataclass(frozen=True, slots=True)
class Continuum:
    """Light under the lines: geometric albedo against wavelength, and the body's own thermal radiance."""

    albedo_wavelength_m: tuple[float, ...]
    albedo: tuple[float, ...]
    thermal_wavelength_m: tuple[float, ...]  # empty when the body has none
    thermal_radiance_w_m2_m_sr: tuple[float, ...]
    source: str


@dataclass(frozen=True, slots=True)
class Cooling:
    """How temperature and column go on from the epoch of the emission block.

    `constant`; `linear` (rate); `exponential` to `floor_k` with `time_scale_s`; `table` (dates, values).
    `valid_until` is an ISO date; `floor_k` of a linear law stops it there instead of refusing.
    Column: `column_rate_s` is the fractional change of the column per second (0 = constant).
    """

    law: Literal["constant", "linear", "exponential", "table"]
    epoch: str
    rate_k_s: Estimate
    floor_k: Estimate | None
    time_scale_s: Estimate | None
    column_rate_s: Estimate
    table_dates: tuple[str, ...]
    table_temperature_k: tuple[float, ...]
    table_column_m2: tuple[float, ...]
    valid_until: str | None
    source: str


@dataclass(frozen=True, slots=True)
class Target:
    """A planet that glows."""

    name: str
    body: str  # name in the ephemeris (jupiter, saturn, uranus, neptune) or path of a stored table
    rotation: Rotation
    figure: Figure
    emission: Emission
    continuum: Continuum
    cooling: Cooling
    origin: Origin = field(default_factory=Origin, compare=False, repr=False)


# ---------------------------------------------------------------- instrument


@dataclass(frozen=True, slots=True)
class Site:
    """A place on the Earth: geodetic WGS84, longitude positive east."""

    longitude_rad: float
    latitude_rad: float
    height_m: float


@dataclass(frozen=True, slots=True)
class Orbit:
    """A place in space."""

    kind: Literal["sun-earth-l2"] = "sun-earth-l2"


@dataclass(frozen=True, slots=True)
class Quartiles:
    """Lower quartile, median, upper quartile over the nights of the site; low is good."""

    good: float
    median: float
    poor: float


@dataclass(frozen=True, slots=True)
class Sky:
    """What lies between the target and the telescope. `water_m` is precipitable water (0.002 = 2 mm)."""

    water_m: Quartiles
    seeing_rad: Quartiles  # FWHM at 0.5 micron at the zenith
    temperature_k: float  # of the radiating air
    airglow_photon_s_m2_sr_m: float  # mean OH radiance in 1.95-2.3 micron
    zodiacal_scale: float  # space only: multiple of the low-background level
    source: str


@dataclass(frozen=True, slots=True)
class Limits:
    """When the telescope may look. None = no such limit."""

    airmass_max: float
    altitude_min_rad: float
    altitude_max_rad: float  # zenith gap
    sun_altitude_max_rad: float  # Sun altitude that ends the night
    daytime: bool  # True: the Sun's altitude does not matter, its separation does
    sun_separation_min_rad: float
    moon_separation_min_rad: float
    elongation_min_rad: float  # space
    elongation_max_rad: float  # space
    longest_visit_s: float  # space; inf where none


@dataclass(frozen=True, slots=True)
class Telescope:
    """Collecting area and warmth."""

    aperture_m: float
    obstruction: float  # share of the diameter that is blocked
    temperature_k: float
    emissivity: float
    transmission: float
    source: str


@dataclass(frozen=True, slots=True)
class Opening:
    """What part of the sky reaches the detector, for slit, IFU and imager alike.

    `width_rad` x `length_rad` is the slit, or the field of an IFU or imager; `pixel_rad` the side of a
    detector pixel along the slit, of a spaxel, or of an imager's pixel. `angle` orients the long side.
    """

    kind: Literal["slit", "ifu", "imager"]
    width_rad: float
    length_rad: float
    pixel_rad: float
    angle: Literal["rotation-axis", "equator", "position-angle", "parallactic"]
    position_angle_rad: float
    offset_rad: float  # of the slit centre from the disk centre, perpendicular to the long side


@dataclass(frozen=True, slots=True)
class ImageQuality:
    """Blur of the image: seeing, adaptive optics (core plus seeing halo) or diffraction; plus drift."""

    kind: Literal["seeing", "adaptive", "diffraction"]
    core_share: float  # of the light in the core; 0 for seeing, 1 for diffraction
    core_fwhm_rad: float  # 0: the diffraction limit 1.03 lambda/D
    drift_rad: float  # rms guiding drift during one integration


@dataclass(frozen=True, slots=True)
class Setting:
    """One way to use the instrument. For an imager the band is the filter's box."""

    name: str
    band_m: tuple[float, float]
    resolving_power: float  # for a filled slit; 0 for an imager
    pixels_per_element: float
    throughput: float  # from after the telescope to electrons, quantum efficiency included
    off_band_m: tuple[float, float] | None  # imager: the filter that measures the continuum
    on_band_share: float  # share of the open-shutter time in the band (1 without off-band filter)
    continuum_prior: float  # relative 1-sigma prior on the continuum level; inf = none
    source: str

    @property
    def middle_m(self) -> float:
        """Middle of the band, at which the blur of the image is taken."""
        return 0.5 * (self.band_m[0] + self.band_m[1])


@dataclass(frozen=True, slots=True)
class Detector:
    """Electrons and their noise. `read_noise_pair_e` is that of one correlated *pair* of reads."""

    dark_e_s: float
    read_noise_pair_e: float
    reads: int
    sampling: Literal["pairs", "ramp"]
    full_well_e: float
    usable_fraction: float
    shortest_s: float
    longest_s: float
    readout_s: float
    source: str


@dataclass(frozen=True, slots=True)
class Operation:
    """How an observation runs, what it costs, and what it can never average away."""

    nod: Literal["on-slit", "off-slit", "stare"]
    on_fraction: float  # share of the open-shutter time on the target (off-slit); 1 otherwise
    background_rows: float  # stare: background rows per source row; inf = a modelled background
    nod_time_s: float  # open-shutter time at one position
    nod_overhead_s: float  # per move
    acquisition_s: float  # per visit
    calibration_share: float  # calibration seconds per second of clock time
    standards_s: float  # per visit
    visit_floor: float  # relative error of one visit that does not average down within it
    common_floor: float  # relative error that nothing averages down
    flux_error: float  # relative error of the flux scale, on N
    relative_error: float  # relative error between lines far apart, on T
    source: str


@dataclass(frozen=True, slots=True)
class Instrument:
    """A telescope, a place and a machine behind it."""

    name: str
    place: Site | Orbit
    sky: Sky
    limits: Limits
    telescope: Telescope
    opening: Opening
    image: ImageQuality
    settings: tuple[Setting, ...]
    detector: Detector
    operation: Operation
    atmosphere: str  # path of the user's own transmission table, empty for the packaged one
    origin: Origin = field(default_factory=Origin, compare=False, repr=False)


# ---------------------------------------------------------------- request


@dataclass(frozen=True, slots=True)
class Use:
    """One instrument in one setting, as the request asks for it."""

    instrument: Instrument
    setting: Setting
    cost_per_night: float = 1.0


@dataclass(frozen=True, slots=True)
class Dates:
    """Evening dates (ISO) of the nights asked about, first and last included, and the time step."""

    first: str
    last: str
    offered: tuple[str, ...]  # empty: all
    forbidden: tuple[str, ...]
    fixed: tuple[str, ...]
    unit: Literal["night", "half-night"]
    step_s: float


@dataclass(frozen=True, slots=True)
class Goal:
    """What counts as done. None = not asked for. `lines`: labels or empty for all lines of the setting.

    `probability` is the wanted probability that the *measured* SNR reaches the goal: at an expected SNR
    equal to the goal it is about one half.
    """

    snr: float | None
    lines: tuple[str, ...]
    temperature_error_k: float | None
    column_error: float | None
    probability: float


@dataclass(frozen=True, slots=True)
class Coverage:
    """Goal per longitude bin; exactly one of snr, temperature_error_k and minutes is set."""

    bins: int
    snr: float | None
    temperature_error_k: float | None
    minutes: float | None
    latitude_rad: float | None  # latitude of interest, planetographic
    angle_max_rad: float  # largest angle of that place from the sub-observer point
    lit: Literal["any", "day", "night"]
    spot: str  # name of the target's spot to be covered; empty = the whole rotation
    candidates: Literal["night", "half-night", "stretch"]
    stretch_s: float
    consecutive: bool
    block_nights: int  # nights come in blocks of this many; 1 = free
    nights_max: float | None
    half_night_cost: float
    time_limit_s: float
    asked: bool = False  # the request has a block `coverage`; without one the rest are defaults


@dataclass(frozen=True, slots=True)
class Conditions:
    """The night assumed: a quartile of the site, or stated values that replace it."""

    name: Literal["good", "median", "poor"]
    seeing_rad: float | None
    water_m: float | None


@dataclass(frozen=True, slots=True)
class Weather:
    """Two-state weather: share of clear nights, correlation from one night to the next."""

    clear_fraction: float
    correlation: float
    probability: float  # wanted probability that the request succeeds
    scatter: bool  # natural scatter of column, seeing and water over the nights too
    trials: int
    seed: int


@dataclass(frozen=True, slots=True)
class Budget:
    """The most that can be asked for."""

    nights: float | None
    hours: float | None

    def allows(self, nights: float, hours: float) -> bool:
        """Return whether so many nights, with so many hours in them, stay within the budget."""
        return (self.nights is None or nights <= self.nights + 1e-9) and (
            self.hours is None or hours <= self.hours + 1e-9
        )


@dataclass(frozen=True, slots=True)
class Fade:
    """Years for the outlook, both included, and the trials of its Monte Carlo."""

    first_year: int
    last_year: int
    trials: int
    significance: float  # SNR that counts as a detection


@dataclass(frozen=True, slots=True)
class Request:
    """Everything that one proposal asks."""

    name: str
    target: Target
    uses: tuple[Use, ...]
    longitudes: str  # longitude system
    dates: Dates
    goal: Goal
    coverage: Coverage
    conditions: Conditions
    weather: Weather
    budget: Budget
    fade: Fade
    ephemeris: str  # '' packaged DE421; 'builtin'; or path of an SPK file
    origin: Origin = field(default_factory=Origin, compare=False, repr=False)

    @property
    def in_space(self) -> bool:
        """Whether all its instruments are in space."""
        return all(isinstance(use.instrument.place, Orbit) for use in self.uses)
