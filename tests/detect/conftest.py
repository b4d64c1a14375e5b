"""Instruments, targets and moments for these tests: round invented numbers unless a test says otherwise."""

import dataclasses
import math

import numpy as np
import pytest

from coldglow.describe.records import (
    Continuum,
    Detector,
    Figure,
    ImageQuality,
    Instrument,
    Limits,
    LongitudeSystem,
    Opening,
    Operation,
    Orbit,
    Quartiles,
    Setting,
    Site,
    Sky,
    Telescope,
)
from coldglow.detect.beam import Beam, Disk, join_beams, point_spread, see_disk
from coldglow.detect.exposure import Moments
from coldglow.light.shell import view_of, visible_points

ARCSEC = math.pi / 648000.0
AU_M = 149597870700.0


def instrument(kind="slit", **changes):
    """A ground-based spectrograph on a 4 m telescope; `changes` are keyed by record, then by field."""
    space = kind == "space"
    made = Instrument(
        name="test",
        place=Orbit() if space else Site(0.3, -0.5, 4200.0),
        sky=Sky(
            Quartiles(0.001, 0.002, 0.004),
            Quartiles(0.5 * ARCSEC, 0.7 * ARCSEC, 1.0 * ARCSEC),
            258.0,
            3.0e18,
            1.0,
            "invented",
        ),
        limits=Limits(2.0, 0.0, 1.5, -0.2, False, 0.0, 0.0, 0.0, math.pi, math.inf),
        telescope=Telescope(4.0, 0.2, 40.0 if space else 273.0, 0.1, 0.9, "invented"),
        opening=Opening("slit", 0.75 * ARCSEC, 15.0 * ARCSEC, 0.15 * ARCSEC, "rotation-axis", 0.0, 0.0),
        image=ImageQuality("seeing", 0.0, 0.0, 0.0),
        settings=(Setting("L", (3.90e-6, 4.05e-6), 30000.0, 2.5, 0.1, None, 1.0, math.inf, "invented"),),
        detector=Detector(0.05, 20.0, 2, "pairs", 1.0e5, 0.8, 0.1, 1200.0, 0.5, "invented"),
        operation=Operation(
            "on-slit", 1.0, math.inf, 120.0, 10.0, 600.0, 0.05, 600.0, 0.0, 0.0, 0.1, 0.03, "invented"
        ),
        atmosphere="",
    )
    if kind in ("ifu", "space"):
        changes = {
            "opening": {
                "kind": "ifu",
                "width_rad": 5.0 * ARCSEC,
                "length_rad": 5.0 * ARCSEC,
                "pixel_rad": 0.1 * ARCSEC,
            },
            "operation": {"nod": "off-slit", "on_fraction": 0.5},
            **changes,
        }
    for record, values in changes.items():
        old = getattr(made, record)
        if record == "settings":
            made = dataclasses.replace(made, settings=(dataclasses.replace(old[0], **values),))
        else:
            made = dataclasses.replace(made, **{record: dataclasses.replace(old, **values)})
    return made


# radii of Uranus: Archinal et al. 2018, Celest. Mech. Dyn. Astron. 130, 22, table 4
URANUS = Figure(25559e3, 24973e3, 2000e3, "Archinal et al. 2018")
TURN = LongitudeSystem(
    "test", 0.0, -2.0 * math.pi / 62064.0, "east", 62064.0, 36.0, 0.0, "Archinal et al. 2018"
)
DARK = Continuum((1.9e-6, 5.3e-6), (0.0, 0.0), (), (), "none")
GREY = Continuum((1.9e-6, 5.3e-6), (1e-4, 1e-4), (), (), "invented")


def beam_of(
    made,
    radius_rad=1.85 * ARCSEC,
    seeing_rad=0.7 * ARCSEC,
    airmass=1.2,
    latitude_rad=0.9,
    wavelength_m=None,
    spacing=0.08,
    figure=URANUS,
):
    band = made.settings[0].band_m
    wavelength_m = wavelength_m or 0.5 * (band[0] + band[1])
    disk = Disk(radius_rad, radius_rad * view_of(figure, latitude_rad).outline_pole, 0.4)
    points = visible_points(figure, (), latitude_rad, 0.0, TURN, spacing)
    spread = point_spread(made.image, made.telescope, wavelength_m, seeing_rad, airmass)
    return see_disk(points, disk, made.opening, made.operation, spread)


def moments_of(made, airmass=(1.2,), range_rate_m_s=(0.0,), water_m=0.002, beam=None, **beam_options):
    airmass, rate = np.broadcast_arrays(np.asarray(airmass, float), np.asarray(range_rate_m_s, float))
    if beam is None:
        one = beam_of(made, airmass=float(airmass.mean()), **beam_options)
        beam = join_beams([one] * airmass.size)
    assert isinstance(beam, Beam)
    return Moments(airmass, rate, np.full(airmass.shape, water_m), np.full(airmass.shape, 19.2 * AU_M), beam)


@pytest.fixture(scope="session")
def make():
    """The builders of this file, for tests that are imported without a package."""
    from types import SimpleNamespace

    return SimpleNamespace(
        instrument=instrument,
        beam_of=beam_of,
        moments_of=moments_of,
        dark=DARK,
        grey=GREY,
        uranus=URANUS,
        turn=TURN,
        arcsec=ARCSEC,
        au_m=AU_M,
    )
