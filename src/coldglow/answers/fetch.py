"""`fetch`: an online ephemeris into a file. The only command that touches the network."""

from __future__ import annotations

import io
from collections.abc import Sequence
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from coldglow.answers.common.inputs import NamePath, Quantity, as_instrument, as_target, in_si
from coldglow.answers.sky import place_words, site_of
from coldglow.describe.records import Instrument, Site, Target
from coldglow.errors import OutputError, RangeError
from coldglow.report import words
from coldglow.report.files import write_text
from coldglow.report.results import Entry, Result, column, table
from coldglow.sky.clock import tt_from_iso

ANGLES = ("ra_icrs", "dec_icrs")


def fetch(
    target: NamePath | Target,
    instrument: NamePath | Instrument | None = None,
    site: Sequence[Quantity] | Site | None = None,
    first: str | None = None,
    last: str | None = None,
    step: Quantity = "1h",
    write: NamePath | None = None,
) -> Result:
    """Ask the JPL service for the ephemeris of a target and store it as ECSV.

    Args:
        target: name, path or record.
        instrument: from whose place it is seen; or
        site: longitude (east positive), latitude and height, or a `Site`.
        first: first instant, ISO, UTC.
        last: last instant; four days are added at either end.
        step: between rows, whole minutes (text without a unit: minutes).
        write: path of the file, ``.ecsv``; what a target's `body` may name.

    Returns:
        A result with table ``ephemeris``, the rows that were stored.

    Raises:
        ServiceError: the service cannot be reached or has no such table.
        RangeError: something is missing or senseless.
        OutputError: the file cannot be written.

    """
    record = as_target(target)
    if record.body.endswith(".ecsv"):
        raise RangeError(f"{record.name} follows the stored table {record.body}; name the planet as its body")
    if not (first and last):
        raise RangeError("give --from and --to: the first and the last time")
    if tt_from_iso(last) < tt_from_iso(first):
        raise RangeError(f"the end {last} comes before the beginning {first}")
    if write is None or Path(write).suffix != ".ecsv":
        raise RangeError("give --write FILE.ecsv: the file to store the ephemeris in")
    path = Path(write)
    if not path.parent.is_dir():
        raise OutputError(f"Cannot write {str(path)!r}: there is no folder {str(path.parent)!r}.")
    if instrument is not None:
        place = as_instrument(instrument).place
    elif site is not None:
        place = site_of(site)
    else:
        raise RangeError("give an instrument or a site")
    minutes = in_si(step, "time", "step", "min") / 60.0
    if abs(minutes - round(minutes)) > 1e-9 or minutes < 1.0:
        raise RangeError(f"a step of {minutes:g} min; the service takes whole minutes, 1 or more")

    from coldglow.bridges import horizons  # nothing else ever loads what can reach the network

    answer = horizons.fetch(record.body, place, first, last, round(minutes))
    text = io.StringIO()
    answer.write(text, format="ascii.ecsv")
    write_text(path, text.getvalue())
    times: NDArray[np.str_] = np.asarray(answer["time"], dtype=str)
    numbers = [name for name in answer.colnames if name != "time"]
    return Result(
        "fetch",
        {
            "ephemeris": table(
                column("time", times, description="UTC"),
                *(
                    column(
                        name, answer[name].value, str(answer[name].unit), digits=9 if name in ANGLES else 6
                    )
                    for name in numbers
                ),
                caption=f"{answer.meta['service_body']} from {place_words(place)}, astrometric",
                rows=range(min(len(times), 5)),
            )
        },
        {
            "target": Entry(record.name),
            "file": Entry(str(path)),
            "answered": Entry(str(answer.meta["answered"])),
            "query": Entry(str(answer.meta["query"])),
        },
        [
            f"Stored {words.count(len(times), 'row')} from {words.moment(times[0])} to "
            f"{words.moment(times[-1])}; write `body: {path.name}` in a target description to use them "
            "(for this place only)."
        ],
    )
