"""`check`, `show` and `draft`: what is in the files, what ships, and how to begin one."""

from __future__ import annotations

import json
import os
from collections.abc import Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from coldglow.answers.common.inputs import NamePath, described, placed
from coldglow.describe.draft import draft as draft_text
from coldglow.describe.load import load_any, load_instrument, load_target, names
from coldglow.describe.records import Instrument, Request, Target
from coldglow.describe.resolved import resolved
from coldglow.describe.summary import summary
from coldglow.errors import ColdglowError, DescriptionError, NotFoundError, Problem, RangeError
from coldglow.report import words
from coldglow.report.files import write_text
from coldglow.report.results import Entry, Result, column, table

LISTS = ("targets", "instruments")


@dataclass(frozen=True, slots=True, eq=False)
class Described(Result):
    """A result that is one description: its JSON file is the resolved description itself."""

    resolved: dict[str, Any] = field(default_factory=dict)

    def write(self, path: str | Path, table: str = "") -> Path:
        """Write the resolved description (.json) or the table of what was understood (other formats)."""
        place = Path(path)
        if place.suffix != ".json":
            return Result.write(self, place, table)
        write_text(place, json.dumps(self.resolved, indent=2, ensure_ascii=False) + "\n")
        return place


def check(files: Sequence[NamePath]) -> Result:
    """Read descriptions, work out whether what they ask is possible at all, and say what was understood.

    Raises:
        DescriptionError: with every mistake of every file.

    >>> check(["examples/uranus-season.yaml"]).sentences
    ['1 file read; nothing is wrong.']

    """
    problems: list[Problem] = []
    rows: list[tuple[str, str, str]] = []
    unseen: list[str] = []
    for file in files:
        name = os.fspath(file)
        try:
            record = load_any(file)
            rows += [(name, label, value) for label, value in summary(record)]
            if isinstance(record, Request):
                unseen += _worked_out(record)
        except DescriptionError as error:
            problems += error.problems
        except ColdglowError as error:
            problems.append(Problem(name, 1, "", str(error).removeprefix(f"{name}: ")))
    if problems:
        raise DescriptionError(problems)
    return Result(
        "check",
        {
            "check": table(
                column("file", [row[0] for row in rows], shown=len(files) > 1),
                column("item", [row[1] for row in rows]),
                column("understood", [row[2] for row in rows]),
                rows=range(len(rows)),
            )
        },
        {},
        [f"{words.count(len(files), 'file')} read; nothing is wrong.", *unseen],
    )


def _worked_out(request: Request) -> list[str]:
    """Go through a request's season as far as its answers share it; say where nothing can be observed.

    Raises:
        DescriptionError: what is asked cannot be worked out.

    """
    from coldglow.answers.common.scenes import unseen_words
    from coldglow.answers.covering.coverage import view_of_bins
    from coldglow.scenario import scenario, watch

    try:
        found = [scenario(request, use, watch(request, use)) for use in request.uses]
        for scene in found if request.coverage.asked else ():
            view_of_bins(request, scene)
    except (RangeError, NotFoundError) as error:
        problem = placed(error, *described(request))
        raise DescriptionError([problem or Problem(request.origin.file, 1, "", str(error))]) from None
    return [unseen_words(scene) for scene in found if not scene.usable.any()]


def show(name: str = "") -> Result:
    """Return what ships (``targets``, ``instruments``, or both without a name), or one description.

    Raises:
        NotFoundError: there is no target or instrument of that name.

    >>> "uranus" in show("targets")["name"]
    True

    """
    if name and name not in LISTS:
        return _one(name)
    found: list[tuple[str, str, str]] = []
    if name != "instruments":
        found += [("target", each, _about(load_target(each))) for each in names("target")]
    if name != "targets":
        found += [("instrument", each, _about(load_instrument(each))) for each in names("instrument")]
    return Result(
        "show",
        {
            "show": table(
                column("kind", [row[0] for row in found]),
                column("name", [row[1] for row in found]),
                column("about", [row[2] for row in found]),
                rows=range(len(found)),
            )
        },
        {},
        ["`coldglow show NAME` tells all about one of them; they serve as `extends:` of your own."],
    )


def _one(name: str) -> Described:
    if name not in {*names("target"), *names("instrument")} and not Path(name).is_file():
        from difflib import get_close_matches

        near = get_close_matches(name, [*LISTS, *names("target"), *names("instrument")], 1)
        hint = f"; did you mean `{near[0]}`?" if near else ""
        raise NotFoundError(f"no target or instrument `{name}`{hint} (`coldglow show` lists them)")
    record = load_any(name)
    rows = summary(record)
    return Described(
        "show",
        {
            "show": table(
                column("item", [row[0] for row in rows]),
                column("value", [row[1] for row in rows]),
                rows=range(len(rows)),
            )
        },
        {"name": Entry(record.name)},
        resolved=resolved(record),
    )


def _about(record: Target | Instrument | Request) -> str:
    if isinstance(record, Target):
        emission = record.emission
        temperature = words.quantity(emission.temperature_k.value, "K")
        return f"{temperature}, {words.quantity(emission.column_m2.value, 'm-2')} vertical"
    if isinstance(record, Instrument):
        kind = {"slit": "slit spectrograph", "ifu": "integral-field spectrograph", "imager": "imager"}
        settings = words.listing([setting.name for setting in record.settings])
        aperture = words.quantity(record.telescope.aperture_m, "m", 2)
        return f"{kind[record.opening.kind]}, {aperture}; settings {settings}"
    return record.name


def draft(target: str, instrument: str) -> str:
    """Return the text of a commented, valid request for a target and an instrument.

    >>> "format: coldglow-request/1" in draft("uranus", "echelle-4m")
    True

    """
    return draft_text(target, instrument)
