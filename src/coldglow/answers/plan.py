"""`plan`: everything for one proposal, as a folder with a report."""

from __future__ import annotations

import os
from pathlib import Path

import numpy as np

from coldglow.answers.chapters.exposure import exposure_chapter
from coldglow.answers.chapters.nights import nights_chapter
from coldglow.answers.chapters.season import season_chapter
from coldglow.answers.expose import expose_of, look, median_moment
from coldglow.answers.hours import hours_of
from coldglow.answers.inputs import NamePath, as_request, described, place_errors
from coldglow.answers.nights import nights_of
from coldglow.answers.paperwork import assumptions_of, cautions_of, inputs_of, sources_of, versions_of
from coldglow.answers.scenes import scenes
from coldglow.describe.records import Request
from coldglow.describe.resolved import resolved_text
from coldglow.report import words
from coldglow.report.folder import check_free, report_files, write_folder
from coldglow.report.record import Report, Section
from coldglow.report.results import Entry, Result, column, table
from coldglow.scenario import Scenario


def plan(request: NamePath | Request, out: str | os.PathLike[str], force: bool = False) -> Result:
    """Answer everything the request asks and write it into a folder.

    Args:
        request: path or record.
        out: folder to be made; nothing half-written is left when the run is interrupted.
        force: move an existing folder aside first.

    Returns:
        The headline numbers and the tables of the report, as a result.

    Raises:
        OutputError: the folder exists, or cannot be written.

    """
    record, place = as_request(request), Path(out)
    check_free(place, force)
    with place_errors(*described(record)):
        report = make_report(record)
    contents = report_files(report)
    contents["request.yaml"] = _resolved(record, report)
    write_folder(place, contents, force)
    return Result(
        "plan",
        {"files": table(column("file", sorted(contents)), caption=f"Written to {place}", rows=())},
        {"page": Entry(str(place / "report.html")), **report.figures_of_merit},
        [f"{report.verdict}.", *report.answer],
        report.cautions,
        report.feasible,
    )


def make_report(request: Request) -> Report:
    """Return the report of a request as a record, nothing written."""
    found = scenes(request)
    hours, nights = hours_of(request, found), nights_of(request, found)
    requested = nights.header["nights"].value if "nights" in nights.header else 3
    sections, sentences, exposed = [], [], []
    for i, scene in enumerate(found):
        if not scene.usable.any():
            continue
        seen = look(request, scene.use, scene.track.take([median_moment(scene)]))
        result = expose_of(seen, "the median of the observable steps")
        exposed.append(result)
        sections.append(exposure_chapter(seen, result, f"-{i + 1}" if i else ""))
        sentences += [*result.sentences[:1]]
    feasible = bool(exposed) and nights.feasible and any(result.feasible for result in exposed)
    sections = [
        season_chapter(found, hours, int(np.ceil(float(requested)))),
        *sections,
        nights_chapter(request, nights),
    ]
    return Report(
        title=request.name,
        verdict=_verdict(request, found, nights, feasible),
        feasible=feasible,
        answer=[*sentences, *nights.sentences, *hours.sentences],
        figures_of_merit=_merit(exposed, nights),
        sections=[section for section in sections if isinstance(section, Section)],
        inputs=inputs_of(request),
        assumptions=assumptions_of(request),
        sources=sources_of(request),
        cautions=cautions_of(found),
        versions=versions_of(),
        seed=request.weather.seed,
    )


def _verdict(request: Request, found: tuple[Scenario, ...], nights: Result, feasible: bool) -> str:
    name = request.target.name
    if not any(scene.usable.any() for scene in found):
        return f"Not feasible: {name} cannot be observed on these nights"
    if feasible:
        return f"Feasible: ask for {nights.header['nights']}"
    return f"Not feasible as it stands: {name} does not reach the goal within the budget"


def _merit(exposed: list[Result], nights: Result) -> dict[str, Entry]:
    """Return the headline numbers of the first instrument and of the request."""
    wanted = ("time_to_goal", "time_to_temperature_error", "time_to_column_error")
    merit = {name: entry for result in exposed[:1] for name, entry in result.header.items() if name in wanted}
    for name in ("nights", "probability", "weather"):
        if name in nights.header:
            merit[name] = nights.header[name]
    for result in exposed[:1]:
        merit |= {name: result.header[name] for name in ("temperature", "column", "conditions")}
    return merit


def _resolved(request: Request, report: Report) -> str:
    """Return the resolved request, with versions and seed in comments on top."""
    versions = ", ".join(f"{name} {number}" for name, number in report.versions.items())
    return f"# resolved by {versions}\n# seed {words.number(report.seed or 0, 10)}\n{resolved_text(request)}"
