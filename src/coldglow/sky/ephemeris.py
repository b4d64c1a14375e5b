"""Where the bodies of the solar system are: barycentric states from a kernel or from ERFA's series.

Kernels hold the barycentres of the planet systems, not the planets' centres: up to 320 km (0.1 arcsec)
and 2.3 m/s apart (Jupiter and Saturn with their heavy moons). The packaged DE421 differs from DE440 by at
most 0.22 arcsec, 1951 km and 0.03 m/s for the giant planets in 2020-2040.
"""

from __future__ import annotations

import difflib
from dataclasses import dataclass, field
from functools import lru_cache
from importlib.util import find_spec
from pathlib import Path
from typing import Any, Protocol

import erfa
import numpy as np
from jplephem.daf import DAF
from jplephem.spk import SPK

from coldglow.errors import DateError, NotFoundError, RangeError
from coldglow.sky.clock import DAY_S, Floats, iso_from_tt

AU_M = erfa.DAU
_KM_M = 1000.0
_SEGMENT_TYPES = (2, 3, 9)  # those that jplephem reads
_J2000_JD = 2451545.0
_CODES = {
    "sun": (10,),
    "moon": (301,),
    "earth": (399,),
    # the planet itself where the kernel has it, else the barycentre of its system
    "jupiter": (599, 5),
    "saturn": (699, 6),
    "uranus": (799, 7),
    "neptune": (899, 8),
}
PLANETS = ("jupiter", "saturn", "uranus", "neptune")


class Ephemeris(Protocol):
    """Anything that gives barycentric states; a stored table of one body fits in here as well."""

    @property
    def name(self) -> str:
        """Return the name that reports and errors use."""
        ...

    def state(self, body: str, tdb_s: Floats) -> tuple[Floats, Floats]:
        """Return position (m) and velocity (m/s), ndarray[time, xyz], ICRS axes, solar-system barycentre.

        `tdb_s` is ndarray[time], TDB seconds from J2000. Raises DateError outside `span`.
        """
        ...

    def span(self, body: str) -> tuple[float, float]:
        """Return the first and last TDB second from J2000 that `state` answers for this body."""
        ...


def check_span(ephemeris: Ephemeris, body: str, tdb_s: Floats, margin_s: float = 0.0) -> None:
    """Raise DateError if an instant ndarray[time] lies outside the span less a margin at both ends."""
    first, last = ephemeris.span(body)
    first, last = first + margin_s, last - margin_s
    outside = (tdb_s < first) | (tdb_s > last)
    if outside.any():
        begin, end, offending = (str(text)[:10] for text in iso_from_tt([first, last, tdb_s[outside][0]]))
        raise DateError(
            f"{offending} lies outside the span of the ephemeris {ephemeris.name} for {body}: "
            f"it answers {begin} to {end}",
            "dates",
        )


def _unknown(body: str, known: list[str], name: str) -> NotFoundError:
    near = difflib.get_close_matches(body.lower(), known, 1, 0.5)
    hint = f"; did you mean {near[0]}?" if near else ""
    return NotFoundError(f"the ephemeris {name} has no body {body!r}; it has {', '.join(known)}{hint}")


@dataclass(frozen=True, slots=True)
class Kernel:
    """A binary SPK kernel."""

    name: str
    segments: dict[tuple[int, int], list[Any]] = field(repr=False)  # (target, centre) -> in order of time

    def _chain(self, body: str) -> list[tuple[int, int]]:
        """Return the pairs (target, centre) that lead from the body to the barycentre."""
        centres = {target: centre for target, centre in self.segments}
        for code in _CODES.get(body, ()):
            chain = []
            while code in centres:
                chain.append((code, centres[code]))
                code = centres[code]
            if chain and code == 0:
                return chain
        known = [name for name, codes in _CODES.items() if any(code in centres for code in codes)]
        raise _unknown(body, known, self.name)

    def span(self, body: str) -> tuple[float, float]:
        """Return the seconds that every pair of the chain holds."""
        chain = [self.segments[pair] for pair in self._chain(body)]
        first = max(min(segment.start_jd for segment in pair) for pair in chain)
        last = min(max(segment.end_jd for segment in pair) for pair in chain)
        return (first - _J2000_JD) * DAY_S, (last - _J2000_JD) * DAY_S

    def state(self, body: str, tdb_s: Floats) -> tuple[Floats, Floats]:
        """Return barycentric position (m) and velocity (m/s), ndarray[time, xyz]."""
        check_span(self, body, tdb_s)
        day = np.floor(tdb_s / DAY_S)
        fraction = tdb_s / DAY_S - day
        jd = _J2000_JD + tdb_s / DAY_S
        position = np.zeros((tdb_s.size, 3))
        velocity = np.zeros((tdb_s.size, 3))
        for pair in self._chain(body):
            left = np.ones(tdb_s.size, dtype=bool)
            for segment in self.segments[pair]:
                here = left & (jd >= segment.start_jd) & (jd <= segment.end_jd)
                if here.any():
                    km, km_day = segment.compute_and_differentiate(_J2000_JD + day[here], fraction[here])
                    position[here] += _KM_M * km[:3].T
                    velocity[here] += _KM_M / DAY_S * km_day[:3].T
                    left &= ~here
        return position, velocity


@dataclass(frozen=True, slots=True)
class Builtin:
    """ERFA's own series: planets to 68 arcsec (Simon et al. 1994), Earth (epv00), Moon (moon98).

    Only for use without a kernel. The Earth's series covers 1900-2100.
    Source: Simon et al. 1994, Astron. Astrophys. 282, 663; ERFA functions plan94, epv00, moon98.
    """

    name: str = "builtin"

    def span(self, body: str) -> tuple[float, float]:
        """Return 1900-2100 in TDB seconds from J2000."""
        if body not in _CODES:
            raise _unknown(body, list(_CODES), self.name)
        return -36524.0 * DAY_S, 36524.0 * DAY_S

    def state(self, body: str, tdb_s: Floats) -> tuple[Floats, Floats]:
        """Return barycentric position (m) and velocity (m/s), ndarray[time, xyz]."""
        check_span(self, body, tdb_s)
        days = tdb_s / DAY_S
        heliocentric, state = erfa.epv00(_J2000_JD, days)
        if body == "moon":
            state = erfa.pvppv(state, erfa.moon98(_J2000_JD, days))
        elif body != "earth":
            state = erfa.pvmpv(state, heliocentric)
            if body in PLANETS:
                state = erfa.pvppv(state, erfa.plan94(_J2000_JD, days, PLANETS.index(body) + 5))
        return state["p"] * AU_M, state["v"] * (AU_M / DAY_S)


def _packaged_kernel() -> Path:
    """Return the kernel file of the skyfield-data package, found without importing it.

    Importing the package and asking it for its path warns once another of its files is old.
    """
    spec = find_spec("skyfield_data")
    for folder in (spec.submodule_search_locations or []) if spec else []:
        path = Path(folder) / "data" / "de421.bsp"
        if path.is_file():
            return path
    raise NotFoundError("the packaged ephemeris DE421 is missing; install the package skyfield-data")


@lru_cache(maxsize=8)
def load_ephemeris(name: str = "") -> Ephemeris:
    """Return the ephemeris: '' the packaged DE421, 'builtin' ERFA's series, else the path of an SPK file.

    Raises:
        NotFoundError: there is no such file.
        RangeError: the file is not an SPK kernel that holds Sun, Earth and Moon.

    """
    if name == "builtin":
        return Builtin()
    path = Path(name) if name else _packaged_kernel()
    if not path.is_file():
        raise NotFoundError(
            f"there is no ephemeris file {name!r}; leave it out for DE421, write builtin, "
            "or give the path of an SPK kernel (.bsp)"
        )
    segments: dict[tuple[int, int], list[Any]] = {}
    try:
        with path.open("rb") as stream:
            for segment in SPK(DAF(stream)).segments:
                if segment.data_type in _SEGMENT_TYPES:
                    segment.compute(segment.start_jd)  # maps the file; the map outlives the open file
                    segments.setdefault((segment.target, segment.center), []).append(segment)
    except (ValueError, OSError) as error:
        raise RangeError(f"{name} is not an SPK kernel: {error}", "ephemeris") from error
    kernel = Kernel(path.stem.upper() if not name else path.name, segments)
    try:
        for body in ("sun", "earth", "moon"):
            kernel.span(body)
    except NotFoundError as error:
        raise RangeError(f"{name} cannot be used alone: {error}", "ephemeris") from error
    return kernel
