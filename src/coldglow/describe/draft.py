"""A first request for a target and an instrument: valid, commented, ready to be edited."""

from __future__ import annotations

import json
import re

from coldglow.describe.load import load_instrument, load_target
from coldglow.describe.records import Site

_TEXT = """\
# A request for coldglow, drafted for {target_name} with {instrument_name}: change whatever does not fit.
#
# Every quantity carries its unit (5 min, 20 K, 10 %, 0.8 arcsec). Lines that begin with # say nothing to
# the program; remove the # to use them. `coldglow check FILE` says what was understood.
format: coldglow-request/1
name: {name}
target: {target}                    # the name of a target that ships, or the path of a file of yours

instruments:
  - instrument: {instrument}        # a name, or the path of a file of yours
    setting: {setting}              # {settings}
    cost: 1                         # of one night, in whatever you count
  # - instrument: NAME              # a second instrument or site makes it a campaign

longitudes: {system}                # {systems}

dates:                              # evening dates, as the site's local mean solar time has them
  first: {first}
  last: {last}
  unit: night                     # night or half-night: what the telescope gives
  step: 5 min                       # of the geometry
  # forbidden: [2027-12-24 to 2027-12-26]
  # offered: [2027-10-01 to 2027-10-10]
  # fixed: [2027-10-03]

# limits:                           # laid over the instrument's own
#   {limit}

goal:
  snr: 5                            # 1/sigma of the logarithm of the column, in all lines of the setting
  # lines: ["Q(1,0)"]               # or only in these
  # temperature_error: 20 K
  # column_error: 10 %
  probability: 90 %                 # that the measured value reaches the goal (at expectation: one half)

coverage:                           # of a turn of the planet
  bins: 12                          # of longitude
  snr: 5                            # in each of them; or temperature_error: 30 K; or time: 30 min
  candidates: night               # night, half-night or stretch
  # {spot}

conditions:
  name: median                      # good, median or poor quartile of the site
  # seeing: 0.7 arcsec              # or a stated value instead

weather:
  clear_fraction: {clear}                    # share of clear nights
  correlation: {correlation}        # from one night to the next
  probability: 90 %                 # that the whole request succeeds
  scatter: no                       # natural scatter of the planet and the conditions too
  seed: 1

budget:
  nights: 10                        # the most that can be asked for

fade:                               # the outlook as the planet cools
  first_year: {first_year}
  last_year: {last_year}
  significance: 3                   # the SNR that counts as a detection
"""


def draft(target: str, instrument: str, first: str = "2027-09-01", last: str = "2028-02-29") -> str:
    """Return the text of a request for a target and an instrument, given by name or path.

    `first` and `last` are evening dates of the season; the draft never looks at the clock.

    Raises `NotFoundError` or `DescriptionError` for a target or instrument that cannot be loaded.
    """
    planet, machine = load_target(target), load_instrument(instrument)
    systems = [system.name for system in planet.rotation.systems]
    settings = [setting.name for setting in machine.settings]
    spots = [spot.name for spot in planet.emission.spots]
    ground = isinstance(machine.place, Site)
    text = _TEXT.format(
        target_name=planet.name,
        instrument_name=machine.name,
        name=_scalar(f"{planet.name} with {machine.name}"),
        target=_scalar(target),
        instrument=_scalar(instrument),
        setting=_scalar(settings[0]),
        settings="one of " + ", ".join(settings),
        system=_scalar(systems[0]),
        systems="one of " + ", ".join(systems),
        first=first,
        last=last,
        limit="airmass_max: 1.8" if ground else "longest_visit: 12 h",
        spot=f"spot: {_scalar(spots[0])}"
        if spots
        else "latitude: 45 deg  # with a time for each bin, not an snr",
        clear="70 %" if ground else "100 %",
        correlation="0.3" if ground else "0",
        first_year=first[:4],
        last_year=int(first[:4]) + 20,
    )
    return re.sub(r"^(?! *#)(.*\S) {2,}# ", lambda line: f"{line[1]:<35} # ", text, flags=re.MULTILINE)


def _scalar(text: str) -> str:
    """Return a text as YAML reads it back, in quotes where it needs them."""
    return text if re.fullmatch(r"\w[\w./+-]*( [\w./+-]+)*", text) else json.dumps(text, ensure_ascii=False)
