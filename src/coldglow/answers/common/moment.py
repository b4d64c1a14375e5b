"""One use of an instrument at one moment, in full: what it records, and what that is worth."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from coldglow.answers.common.visit import LONGEST_S, Visit
from coldglow.describe.records import Instrument, Request, Use
from coldglow.detect.detail import Detail, expose_one
from coldglow.detect.exposure import Exposure, Moments, expose_moments
from coldglow.detect.integration import Integrations
from coldglow.detect.systematics import SystematicErrors, systematic_errors
from coldglow.light.atmosphere import transmission_error
from coldglow.scenario import Air, State, air_of, air_over, glow_in, moments_of, state_of
from coldglow.sky.clock import iso_from_tt
from coldglow.sky.track import Track


@dataclass(frozen=True, slots=True)
class Look:
    """One use of an instrument at one moment, in full."""

    request: Request
    use: Use
    track: Track  # of one instant
    state: State
    air: Air
    moment: Moments
    detail: Detail
    telluric_error: NDArray[np.float64]  # ndarray[line], relative

    @property
    def when(self) -> str:
        """The moment as ISO text, UTC."""
        return str(iso_from_tt(self.track.grid.tt_s, "m")[0])

    @property
    def visit(self) -> Visit:
        """The visit in the state of the description."""
        detail = self.detail
        share = float(detail.plan.shutter_share[0])
        operation = self.use.instrument.operation
        return Visit(detail.matrix, detail.prior, share, operation, self._cycle_s(detail.plan))

    def _cycle_s(self, plan: Integrations | Exposure) -> float:
        """Return the open shutter of one cycle: each nod position, of an imager in each of its filters."""
        positions = 1 if self.use.instrument.operation.nod == "stare" else 2
        filters = 1 if self.use.setting.off_band_m is None else 2
        return positions * filters * float(plan.coadds[0] * plan.integration_s[0])

    def systematic(self, open_s: float = 3600.0) -> SystematicErrors:
        """Return the errors from elsewhere than counting, in a fit to so much open shutter.

        The longer the exposure, the more lines have a say, and the less those errors count that are
        independent from line to line.
        """
        detail = self.detail
        return systematic_errors(
            detail.lines.wavelength_m,
            np.where(detail.wanted, detail.line_information, 0.0),
            detail.temperature_slope,
            self.telluric_error,
            self.use.instrument.operation,
            open_shutter_s=min(open_s, LONGEST_S),
        )

    def visit_in(self, temperature_k: float, column_m2: float) -> Visit:
        """Return the visit in another state of the ionosphere."""
        instrument = self.use.instrument
        exposure = expose_moments(
            self.moment,
            glow_in(self.request.target, State(temperature_k, column_m2, self.state.lte_fraction)),
            air_over(instrument),
            instrument,
            self.use.setting,
            self.request.goal.lines,
        )
        share = float(exposure.shutter_share[0])
        return Visit(exposure.matrix[0], exposure.prior, share, instrument.operation, self._cycle_s(exposure))


def look(request: Request, use: Use, track: Track) -> Look:
    """Return a use of an instrument at the one instant of a track, in full."""
    target, instrument = request.target, use.instrument
    state, air = state_of(request), air_of(instrument.sky, request.conditions)
    moment = moments_of(target, instrument, use.setting, track, air)
    detail = expose_one(
        moment,
        glow_in(target, state),
        air_over(instrument),
        instrument,
        use.setting,
        request.goal.lines,
    )
    telluric_error = _telluric_error(detail, instrument, moment)
    return Look(request, use, track, state, air, moment, detail, telluric_error)


def _telluric_error(detail: Detail, instrument: Instrument, moment: Moments) -> NDArray[np.float64]:
    """Return the relative error of each line's transmission, ndarray[line]; zero in space."""
    atmosphere = air_over(instrument)
    if atmosphere is None:
        return np.zeros(len(detail.lines))
    absolute = transmission_error(
        atmosphere,
        detail.lines.wavelength_m,
        float(moment.airmass[0]),
        float(moment.water_m[0]),
        float(moment.range_rate_m_s[0]),
    )
    relative: NDArray[np.float64] = absolute / np.maximum(detail.line_transmission, absolute)
    return relative
